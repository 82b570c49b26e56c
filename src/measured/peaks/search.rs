//! Which resonances there are: candidates where the spectrum exceeds the fit, kept where the likelihood
//! betters by more than chance and the freedom of four parameters would.

use std::f64::consts::{PI, TAU};

use num_complex::Complex64;

use super::fit::{Data, EACH, Fitted, Model, Other, Resonance, Score, covariance, minimise};

/// Gain in twice the log-likelihood a resonance must bring where it could lie at `places` places side by side: its four
/// parameters alone bring 4 by chance at one place, and the best of many brings more.
fn least_gain(places: f64) -> f64 {
    13.0 + 3.0 * places.ln()
}

/// The same for a resonance hidden under others. Less is asked: one too many widens intervals, one too few biases its
/// neighbours.
fn least_hidden_gain(places: f64) -> f64 {
    6.0 + 2.0 * (places / 4.0).max(1.0).ln()
}

/// Narrowest hidden resonance looked for (bins), and how many of the best places a fit is started from.
const HIDDEN_NARROWEST: f64 = 12.0;
const STARTS: usize = 4;

/// Reach of the window about a line (bins).
pub(super) const LOBE: f64 = 4.0;

/// Deviation of a mean square over its value from which on a resonance is put to the test.
const LEAST_DOUBT: f64 = 0.4;

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

/// The fit chosen, and others that describe the spectrum about as well.
pub(super) struct Chosen {
    pub(super) fitted: Fitted,
    pub(super) others: Vec<Other>,
}

/// Fits as many resonances as the spectrum asks for, at most `most`.
pub(super) fn search(data: &Data, most: usize) -> Option<Chosen> {
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
            Some(next)
                if 2.0 * (best.q - next.q) / inflation > least_gain(n as f64 / found.width) =>
            {
                best = next;
                refused.clear();
            }
            _ => refused.push((found.bin, found.width)),
        }
    }
    best = minimise(data, best, LAST_STEPS, 1e-3);
    let mut others = Vec::new();
    while best.model.resonances.len() < most {
        let mut found = hidden(data, &best);
        found.sort_by(|a, b| b.q.total_cmp(&a.q));
        let Some(next) = found.pop() else {
            break;
        };
        others.extend(found.iter().map(|f| Other::new(data, f)));
        let width = next.model.resonances.last().map_or(1.0, |r| r.decay() / PI);
        let places = n as f64 * data.bins.width() / width;
        if 2.0 * (best.q - next.q) / inflation <= least_hidden_gain(places) {
            others.push(Other::new(data, &next));
            break;
        }
        others.push(Other::new(data, &best));
        best = next;
    }
    best = minimise(data, best, LAST_STEPS, 1e-7);
    prune(data, &mut best, &mut others);
    Some(Chosen {
        fitted: minimise(data, best, LAST_STEPS, 1e-7),
        others,
    })
}

/// Takes out, weakest first, resonances whose mean square is not told from zero and that the likelihood hardly misses:
/// two that share one peak between them, or one that was overtaken by a later one.
fn prune(data: &Data, best: &mut Fitted, others: &mut [Other]) {
    let mut kept: Vec<Resonance> = Vec::new();
    for _ in 0..best.model.resonances.len() {
        let Some(covariance) = covariance(data, best) else {
            return;
        };
        let doubt = |(k, r): (usize, &Resonance)| {
            let at = EACH * k + 2;
            (k, covariance[(at, at)].max(0.0).sqrt() / r.c.re)
        };
        let resonances = &best.model.resonances;
        let weakest = resonances
            .iter()
            .enumerate()
            .filter(|(_, r)| !kept.iter().any(|k| k.frequency() == r.frequency()))
            .map(doubt)
            .filter(|(_, doubt)| *doubt > LEAST_DOUBT)
            .max_by(|a, b| a.1.total_cmp(&b.1));
        let Some((k, _)) = weakest else { return };
        let mut model = best.model.clone();
        let gone = model.resonances.remove(k);
        let Some(without) = Fitted::of(data, model) else {
            kept.push(gone);
            continue;
        };
        let without = minimise(data, without, LAST_STEPS, 1e-3);
        let places = data.bins.width() * data.power.len() as f64 * PI / gone.decay();
        if 2.0 * (without.q - best.q) / data.inflation() < least_hidden_gain(places) {
            *best = without;
            for other in others.iter_mut() {
                other.forget(k);
            }
        } else {
            kept.push(gone);
        }
    }
}

/// Fits with a resonance more where one promises most, by the score of its mean square beside all other parameters: finds
/// what lies under a wider or stronger neighbour and leaves no excess of its own.
fn hidden(data: &Data, fitted: &Fitted) -> Vec<Fitted> {
    let Some(score) = Score::new(data, fitted) else {
        return Vec::new();
    };
    let bins = data.bins;
    let span = bins.width() * bins.count() as f64;
    let mut tried: Vec<(f64, Resonance)> = Vec::new();
    let mut width = HIDDEN_NARROWEST * bins.width();
    while width < span / 2.0 {
        let places = (2.0 * span / width).floor() as usize;
        for i in 0..=places {
            let frequency = bins.frequency(0) + span * i as f64 / places as f64;
            let s = Complex64::new(-PI * width, TAU * frequency);
            if let Some((gain, c)) = score.of(data, fitted, s) {
                let c = Complex64::from(c);
                tried.push((gain, Resonance { s, c }));
            }
        }
        width *= WIDER;
    }
    tried.sort_by(|a, b| b.0.total_cmp(&a.0));
    let mut found: Vec<Fitted> = Vec::new();
    let mut begun: Vec<Resonance> = Vec::new();
    for (_, resonance) in tried {
        let (f, width) = (resonance.frequency(), resonance.decay() / PI);
        let alike = |r: &Resonance| {
            let wider = width.max(r.decay() / PI);
            (r.frequency() - f).abs() < 0.5 * wider && r.decay() / PI > 0.4 * wider
        };
        if begun.len() == STARTS || begun.iter().any(alike) {
            continue;
        }
        let start = [1.0, 0.3, 0.1].iter().find_map(|part| {
            let mut model = fitted.model.clone();
            model.resonances.push(Resonance {
                c: resonance.c * *part,
                ..resonance
            });
            Fitted::of(data, model)
        });
        let Some(start) = start else { continue };
        begun.push(resonance);
        let next = minimise(data, start, LAST_STEPS, 1e-2);
        let last = next.model.resonances.last();
        if last.is_some_and(|r| r.decay() < 0.5 * PI * HIDDEN_NARROWEST * bins.width()) {
            continue;
        }
        found.push(next);
    }
    found
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
    // Lines the window does not resolve: what differs from the fit within its lobe is not another one.
    let lines: Vec<f64> = fitted
        .model
        .resonances
        .iter()
        .filter(|r| r.decay() < PI * data.bins.width())
        .map(|r| (r.frequency() - data.bins.frequency(0)) / data.bins.width())
        .collect();
    let beside_a_line = |bin: usize| lines.iter().any(|l| (l - bin as f64).abs() <= LOBE);
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
            if refused.iter().any(near) || (width < 2.0 * LOBE && beside_a_line(bin)) {
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
