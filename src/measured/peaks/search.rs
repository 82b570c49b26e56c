//! Which resonances there are: candidates where the spectrum exceeds the fit, kept where the likelihood
//! betters by more than chance and the freedom of four parameters would.

use std::f64::consts::{PI, TAU};

use nalgebra::DMatrix;
use num_complex::Complex64;
use statrs::distribution::{ChiSquared, ContinuousCDF};

use super::fit::{Other, Score, covariance, minimise, place_of_square, top};
use super::fitted::{Fitted, sandwich};
use super::model::{Data, Model, Resonance};

/// Gain in twice the log-likelihood a resonance must bring where it could lie at `places` places side by side: its four
/// parameters alone bring 4 by chance at one place, and the best of many brings more.
fn least_gain(data: &Data, places: f64) -> f64 {
    9.0 + data.each() as f64 + 3.0 * places.ln()
}

/// The same for a resonance hidden under others. Less is asked: one too many widens intervals, one too few biases its
/// neighbours.
fn least_hidden_gain(data: &Data, places: f64) -> f64 {
    if data.sensors > 1 {
        return chance(data.each(), 0.05 / places.max(1.0));
    }
    6.0 + 2.0 * (places / 4.0).max(1.0).ln()
}

/// What a chi-square variate of so many degrees of freedom exceeds with a probability.
fn chance(degrees: usize, probability: f64) -> f64 {
    ChiSquared::new(degrees as f64).map_or(f64::INFINITY, |c| c.inverse_cdf(1.0 - probability))
}

/// Narrowest hidden resonance looked for (bins), and how many of the best places a fit is started from.
const HIDDEN_NARROWEST: f64 = 12.0;
const STARTS: usize = 4;

/// Reach of the window about a line (bins).
pub(super) const LOBE: f64 = 4.0;

/// Deviation of a mean square over its value from which on a resonance is put to the test.
const LEAST_DOUBT: f64 = 0.4;
const LEAST_DOUBT_TOGETHER: f64 = 0.08;

/// Candidates refused one after the other before the search ends.
const REFUSALS: usize = 3;

/// Widths of candidates (bins, full width at half power), and the step between them.
const NARROWEST: f64 = 1.5;
const WIDER: f64 = 2.0;

/// Bins in a group while several sensors are searched.
const GROUP: usize = 4;

/// Steps of a fit while resonances are added, and at the end.
const STEPS: usize = 12;
const LAST_STEPS: usize = 60;

/// A place where a resonance may be missing.
#[derive(Clone)]
struct Candidate {
    /// Excess over what chance gives, in standard deviations.
    score: f64,
    bin: usize,
    /// Full width at half power (bins).
    width: f64,
    /// Mean excess over the fit, relative to it.
    excess: f64,
    /// Unit vector of the excess, whitened.
    direction: Vec<Complex64>,
}

/// The fit chosen, and others that describe the spectrum about as well.
pub(super) struct Chosen {
    pub(super) fitted: Fitted,
    pub(super) others: Vec<Other>,
}

/// Fits as many resonances as the spectrum asks for, at most `most`.
pub(super) fn search(full: &Data, most: usize) -> Option<Chosen> {
    let n = full.bins.count();
    let floor = (0..full.sensors).map(|a| {
        let own = |j: usize| full.at(j)[a * full.sensors + a].re;
        let mut sorted: Vec<f64> = (0..n).map(own).collect();
        sorted.sort_by(f64::total_cmp);
        sorted[n / 10]
    });
    let empty = Model {
        resonances: Vec::new(),
        floor: floor.collect(),
    };
    let coarse = full.grouped(if full.sensors == 1 { 1 } else { GROUP });
    let data = &coarse;
    let mut best = Fitted::of(data, empty)?;
    let inflation = data.inflation();
    let mut refused: Vec<(usize, f64)> = Vec::new();
    while best.model.resonances.len() < most && refused.len() < REFUSALS {
        let seen = Fitted::mended(full, &best.model)?;
        let Some(found) = strongest(full, &seen, &refused) else {
            break;
        };
        let tried = with(full, data, &seen, &found).map(|start| minimise(data, start, STEPS, 0.1));
        match tried {
            Some(next)
                if 2.0 * (best.q - next.q) / inflation
                    > least_gain(data, n as f64 / found.width) =>
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
        if 2.0 * (best.q - next.q) / inflation <= least_hidden_gain(data, places) {
            others.push(Other::new(data, &next));
            break;
        }
        others.push(Other::new(data, &best));
        best = next;
    }
    best = minimise(data, best, LAST_STEPS, 1e-7);
    prune(data, &mut best, &mut others);
    best = Fitted::mended(full, &best.model)?;
    Some(Chosen {
        fitted: minimise(
            full,
            best,
            LAST_STEPS,
            if full.sensors == 1 { 1e-7 } else { 1e-3 },
        ),
        others,
    })
}

/// Takes out, weakest first, resonances whose mean square is not told from zero and that the likelihood hardly misses:
/// two that share one peak between them, or one that was overtaken by a later one.
fn prune(data: &Data, best: &mut Fitted, others: &mut [Other]) {
    let least_doubt = if data.sensors == 1 {
        LEAST_DOUBT
    } else {
        LEAST_DOUBT_TOGETHER
    };
    let mut kept: Vec<Resonance> = Vec::new();
    for _ in 0..best.model.resonances.len() {
        let covariance = covariance(data, best);
        let doubt = |(k, r): (usize, &Resonance)| {
            let at = place_of_square(data, k, r);
            (k, covariance[(at, at)].max(0.0).sqrt() / r.square())
        };
        let resonances = &best.model.resonances;
        let weakest = resonances
            .iter()
            .enumerate()
            .filter(|(_, r)| !kept.iter().any(|k| k.frequency() == r.frequency()))
            .map(doubt)
            .filter(|(_, doubt)| *doubt > least_doubt)
            .max_by(|a, b| a.1.total_cmp(&b.1));
        let Some((k, _)) = weakest else { return };
        let mut model = best.model.clone();
        let gone = model.resonances.remove(k);
        let Some(without) = Fitted::of(data, model) else {
            kept.push(gone);
            continue;
        };
        let without = minimise(data, without, LAST_STEPS, 1e-3);
        let places = data.bins.width() * data.bins.count() as f64 * PI / gone.decay();
        if 2.0 * (without.q - best.q) / data.inflation() < least_hidden_gain(data, places) {
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
    let bins = &data.bins;
    let span = bins.width() * bins.count() as f64;
    let mut tried: Vec<(f64, Resonance)> = Vec::new();
    let mut width = HIDDEN_NARROWEST * bins.width();
    while width < span / 2.0 {
        let places = (2.0 * span / width).floor() as usize;
        for i in 0..=places {
            let frequency = bins.frequency(0) + span * i as f64 / places as f64;
            let s = Complex64::new(-PI * width, TAU * frequency);
            tried.extend(score.of(data, fitted, s));
        }
        width *= WIDER;
    }
    tried.sort_by(|a, b| b.0.total_cmp(&a.0));
    let mut found: Vec<Fitted> = Vec::new();
    let mut begun: Vec<Resonance> = Vec::new();
    tried.splice(0..0, feet(data, fitted, &score));
    for (_, resonance) in &tried {
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
            let mut quieter = resonance.clone();
            quieter.drive.iter_mut().for_each(|b| *b *= *part);
            model.resonances.push(quieter);
            Fitted::of(data, model)
        });
        let Some(start) = start else { continue };
        begun.push(resonance.clone());
        let next = minimise(data, start, LAST_STEPS, 1e-2);
        let last = next.model.resonances.last();
        if last.is_some_and(|r| r.decay() < 0.5 * PI * HIDDEN_NARROWEST * bins.width()) {
            continue;
        }
        found.push(next);
    }
    found
}

/// Feet of lines: a cycle's amplitude wavers, in the shape of the cycle.
fn feet(data: &Data, fitted: &Fitted, score: &Score) -> Vec<(f64, Resonance)> {
    let mut all = Vec::new();
    let lines = fitted.model.resonances.iter();
    for line in lines.filter(|r| r.decay() < PI * data.bins.width()) {
        let mut best: Option<(f64, Resonance)> = None;
        let mut width = HIDDEN_NARROWEST * data.bins.width();
        while width < 0.5 * line.frequency() {
            let s = Complex64::new(-PI * width, line.s.im);
            if let Some(next) = score.with(data, fitted, s, &line.shape)
                && best.as_ref().is_none_or(|b| next.0 > b.0)
            {
                best = Some(next);
            }
            width *= WIDER;
        }
        all.extend(best);
    }
    all
}

/// The candidate with the highest score beside those refused.
fn strongest(data: &Data, fitted: &Fitted, refused: &[(usize, f64)]) -> Option<Candidate> {
    let (n, sensors, cells) = (data.bins.count(), data.sensors, data.cells());
    let mut excess = vec![Complex64::ZERO; n * cells];
    let parts = excess
        .chunks_exact_mut(cells)
        .zip(fitted.whitener.chunks_exact(cells));
    for (j, (part, g)) in parts.enumerate() {
        sandwich(g, data.at(j), sensors, part);
        for i in 0..sensors {
            part[i * sensors + i].re -= 1.0;
        }
    }
    // Lines the window does not resolve: what differs from the fit within its lobe is not another one.
    let lines: Vec<f64> = fitted
        .model
        .resonances
        .iter()
        .filter(|r| r.decay() < PI * data.bins.width())
        .map(|r| (r.frequency() - data.bins.frequency(0)) / data.bins.width())
        .collect();
    let beside_a_line = |bin: usize| lines.iter().any(|l| (l - bin as f64).abs() <= LOBE);
    // Largest eigenvalue of a matrix of noise of unit variance (Wigner 1958), and one more.
    let least = 1.0 + 2.0 * (sensors as f64).sqrt();
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
            let mut sum = DMatrix::zeros(sensors, sensors);
            let mut squares = 0.0;
            for j in bin.saturating_sub(reach)..(bin + reach + 1).min(n) {
                let h = shape[j.abs_diff(bin)];
                for (s, e) in sum.iter_mut().zip(&excess[j * cells..(j + 1) * cells]) {
                    *s += e * h;
                }
                squares += h * h;
            }
            let scale = (data.inflation() * squares).sqrt();
            let over = best.as_ref().map_or(least, |b| b.score);
            // No eigenvalue exceeds the root of the sum of squares.
            if sum.norm() <= over * scale {
                continue;
            }
            // The matrix stands transposed.
            let (size, vector) = top(sum.transpose());
            if size > over * scale {
                best = Some(Candidate {
                    score: size / scale,
                    bin,
                    width,
                    excess: size / squares,
                    direction: vector,
                });
            }
        }
        width *= WIDER;
    }
    best
}

/// The model with a resonance more where a candidate lies.
fn with(full: &Data, data: &Data, fitted: &Fitted, found: &Candidate) -> Option<Fitted> {
    let decay = PI * found.width * full.bins.width();
    let n = full.sensors;
    let g = &fitted.whitener[found.bin * n * n..(found.bin + 1) * n * n];
    // Back through the lower triangle: G c = direction.
    let mut shape = found.direction.clone();
    for i in 0..n {
        let before: Complex64 = (0..i).map(|a| g[i * n + a] * shape[a]).sum();
        shape[i] = (shape[i] - before) / g[i * n + i].re;
    }
    let mut model = fitted.model.clone();
    let s = Complex64::new(-decay, TAU * full.bins.frequency(found.bin));
    model
        .resonances
        .push(Resonance::alone(s, shape, 0.5 * found.excess * decay));
    Fitted::of(data, model)
}
