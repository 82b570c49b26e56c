//! Which resonances there are: candidates where the spectrum exceeds the fit, kept where the likelihood
//! betters by more than chance and the freedom of four parameters would.

use std::f64::consts::{PI, TAU};

use num_complex::Complex64;

use super::fit::{Data, Fitted, Model, Resonance, minimise};

/// Gain in twice the log-likelihood a resonance must bring. Its four parameters alone bring 4 by chance at a given
/// place; the best of some hundred places brings about 2 ln(100) more.
const LEAST_GAIN: f64 = 20.0;

/// Candidates refused one after the other before the search ends.
const REFUSALS: usize = 3;

/// Widths of candidates (bins, full width at half power), and the step between them.
const NARROWEST: f64 = 1.5;
const WIDER: f64 = 2.0;

/// Steps of a fit while resonances are added, and at the end.
const STEPS: usize = 12;
const LAST_STEPS: usize = 60;

/// A place where a resonance may be missing.
#[derive(Clone, Copy)]
struct Candidate {
    /// Excess over what chance gives, in standard deviations.
    score: f64,
    bin: usize,
    /// Full width at half power (bins).
    width: f64,
    /// Mean excess over the fit, relative to it.
    excess: f64,
}

/// Fits as many resonances as the spectrum asks for, at most `most`.
pub(super) fn search(data: &Data, most: usize) -> Option<Fitted> {
    let n = data.power.len();
    let mut sorted = data.power.to_vec();
    sorted.sort_by(f64::total_cmp);
    let floor = sorted[n / 10];
    let empty = Model {
        resonances: Vec::new(),
        floor,
    };
    let mut best = Fitted::of(data, empty)?;
    let inflation = data.inflation();
    let mut refused: Vec<(usize, f64)> = Vec::new();
    while best.model.resonances.len() < most && refused.len() < REFUSALS {
        let Some(found) = strongest(data, &best, &refused) else {
            break;
        };
        let tried = with(data, &best, &found).map(|start| minimise(data, start, STEPS, 0.1));
        match tried {
            Some(next) if 2.0 * (best.q - next.q) / inflation > LEAST_GAIN => {
                best = next;
                refused.clear();
            }
            _ => refused.push((found.bin, found.width)),
        }
    }
    Some(minimise(data, best, LAST_STEPS, 1e-7))
}

/// The candidate with the highest score beside those refused.
fn strongest(data: &Data, fitted: &Fitted, refused: &[(usize, f64)]) -> Option<Candidate> {
    let n = data.power.len();
    let ratio: Vec<f64> = data
        .power
        .iter()
        .zip(&fitted.mean)
        .map(|(p, m)| p / m - 1.0)
        .collect();
    let mut best: Option<Candidate> = None;
    let mut width = NARROWEST;
    while width < n as f64 / 4.0 {
        let half = width / 2.0;
        let reach = (4.0 * half).ceil() as usize;
        let shape: Vec<f64> = (0..=reach)
            .map(|i| 1.0 / (1.0 + (i as f64 / half).powi(2)))
            .collect();
        let stride = (half / 2.0).floor().max(1.0) as usize;
        for bin in (0..n).step_by(stride) {
            let near = |(b, w): &(usize, f64)| (b.abs_diff(bin) as f64) < 2.0 * w.max(width);
            if refused.iter().any(near) {
                continue;
            }
            let (mut sum, mut squares) = (0.0, 0.0);
            for j in bin.saturating_sub(reach)..(bin + reach + 1).min(n) {
                let h = shape[j.abs_diff(bin)];
                sum += h * ratio[j];
                squares += h * h;
            }
            let score = sum / (data.inflation() * squares).sqrt();
            if score > best.map_or(3.0, |b| b.score) {
                best = Some(Candidate {
                    score,
                    bin,
                    width,
                    excess: sum / squares,
                });
            }
        }
        width *= WIDER;
    }
    best
}

/// The model with a resonance more where a candidate lies.
fn with(data: &Data, fitted: &Fitted, found: &Candidate) -> Option<Fitted> {
    let decay = PI * found.width * data.bins.width();
    let height = found.excess * fitted.mean[found.bin];
    let mut model = fitted.model.clone();
    model.resonances.push(Resonance {
        s: Complex64::new(-decay, TAU * data.bins.frequency(found.bin)),
        c: Complex64::new(0.5 * height * decay, 0.0),
    });
    Fitted::of(data, model)
}
