//! Whether a peak is a resonance driven by noise or a self-sustained cycle, as evidence with its numbers.
//!
//! In a narrow band the squared envelope `P` of a noisy oscillator with growth rate `sigma` and saturation `kappa`
//! (stochastic van der Pol; Noiray & Schuermans 2013, Int. J. Non-Linear Mech. 50, 152) has the density
//!
//! ```text
//! p(P) ~ exp(a P - b P^2),   a ~ sigma, b ~ kappa >= 0
//! ```
//!
//! A damped linear mode has `b = 0`: `P` exponential, its root Rayleigh, `<P^2>/<P>^2 = 2`, kurtosis of the signal 3. At
//! `sigma = 0` the ratio is `pi/2`; far above, the envelope is steady and the ratio 1, kurtosis 1.5. `<P>` and `<P^2>` are
//! sufficient for `a` and `b`, so the ratio holds all that the distribution tells. With `n` independent observations
//! the likelihood ratio of the two laws is
//!
//! ```text
//! ln L = n [h_exp - h(a, b)],   h the entropy of each law at the measured moments
//! ```
//!
//! Line width tells the same from another side: a cycle's is the diffusion of its phase, most often below the
//! resolution, and its phase stays coherent over many segments.

use std::f64::consts::{FRAC_PI_2, PI};

use statrs::function::erf::erfc;

use super::envelope::Envelope;
use super::peaks::Peak;

/// What the evidence says.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Verdict {
    /// A damped resonance, driven by noise.
    Noise,
    /// A self-sustained cycle.
    Cycle,
    /// The record does not tell.
    Undecided,
}

/// The evidence for one peak.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Evidence {
    /// What it says.
    pub verdict: Verdict,
    /// `<P^2>/<P>^2`: 2 for noise, `pi/2` where growth turns to decay, 1 for a steady cycle.
    pub ratio: f64,
    /// Kurtosis of the narrow-band signal, 1.5 times the ratio.
    pub kurtosis: f64,
    /// `<ln P> - ln <P>`: -0.577 for noise, 0 for a steady cycle.
    pub log_deficit: f64,
    /// Gain in log-likelihood of the law with saturation over the exponential one.
    pub gain: f64,
    /// Independent observations of the envelope.
    pub independent: f64,
    /// Correlation of the signal two segments apart, absolute value: near 1 where the phase holds.
    pub coherence: f64,
    /// Full width at half power over the resolution of the spectrum the peak was found in.
    pub width_in_resolutions: f64,
    /// Equivalent noise bandwidth of the band looked at (Hz).
    pub bandwidth: f64,
}

/// Gain in log-likelihood from which on the envelope is called steady. Noise reaches it by chance less than once in ten thousand
/// records (a chi-square variate of one degree of freedom above 16).
const TOLD: f64 = 8.0;

/// Fewest independent observations a verdict is based on.
const FEWEST: f64 = 4.0;

/// Deviations by which the ratio of noise stays above the turning point.
const DEVIATIONS: f64 = 3.0;

/// Spread of the squared envelope (relative, a variance) below which it hardly moves during the record. A resonance that noise
/// moves so little in the time `T` would have to decay no faster than `spread/(4 T)`.
const STEADY: f64 = 0.05;

/// Quality factor no column of gas comes near (common practice: hundreds at most).
const HIGHEST_QUALITY: f64 = 1e6;

/// Weighs the evidence for a peak: `envelopes` are those of its channel at one or more segment lengths,
/// `others` the frequencies of the other peaks (Hz), `resolution` that of the spectrum the peak was found in (Hz). Of the
/// lengths the shortest is taken whose band keeps the neighbours out. `None` where there is no envelope.
pub fn weigh(
    peak: &Peak,
    others: &[f64],
    envelopes: &[Vec<Envelope>],
    resolution: f64,
) -> Option<Evidence> {
    let f = peak.frequency.value;
    let gap = others
        .iter()
        .map(|o| (o - f).abs())
        .filter(|d| *d > 0.0)
        .fold(f, f64::min);
    let at = |bank: &Vec<Envelope>| {
        bank.iter()
            .min_by(|a, b| (a.frequency - f).abs().total_cmp(&(b.frequency - f).abs()))
            .copied()
    };
    let mut banks: Vec<Envelope> = envelopes.iter().filter_map(at).collect();
    // Widest band first.
    banks.sort_by(|a, b| b.bandwidth.total_cmp(&a.bandwidth));
    let apart = |e: &&Envelope| 1.5 * e.bandwidth <= gap;
    let envelope = *banks.iter().find(apart).or(banks.last())?;
    Some(judge(&envelope, peak.width.value / resolution))
}

fn judge(e: &Envelope, width_in_resolutions: f64) -> Evidence {
    let independent = e.independent();
    let gain = independent * gain_for(e.ratio);
    // Of n exponential observations the ratio spreads by 2/sqrt(n) (delta method).
    let spread = 2.0 / independent.sqrt();
    let duration = e.segments as f64 * e.step;
    let steadiness = (e.ratio - 1.0).max(f64::EPSILON);
    let quality = PI * e.frequency * 4.0 * duration / steadiness;
    let verdict = if steadiness < STEADY && quality > HIGHEST_QUALITY {
        Verdict::Cycle
    } else if independent < FEWEST {
        Verdict::Undecided
    } else if e.ratio < FRAC_PI_2 && gain > TOLD {
        Verdict::Cycle
    } else if e.ratio > FRAC_PI_2 || e.ratio + DEVIATIONS * spread > 2.0 {
        Verdict::Noise
    } else {
        Verdict::Undecided
    };
    Evidence {
        verdict,
        ratio: e.ratio,
        kurtosis: 1.5 * e.ratio,
        log_deficit: e.log_deficit,
        gain,
        independent,
        coherence: e.coherence_twice,
        width_in_resolutions,
        bandwidth: e.bandwidth,
    }
}

/// Entropy of the exponential law less that of `exp(a P - b P^2)` with mean 1 and the given second moment; zero
/// where the ratio is 2 or above.
///
/// With `P` a normal deviate of mean `m` and width `w` cut off below zero, `x = m/w` and
/// `l = phi(x)/Phi(x)`: `<P>/w = x + l`, `<P^2>/w^2 = 1 + x (x + l)`; `h = ln(w sqrt(2 pi) Phi) + (1 - x l)/2`.
fn gain_for(ratio: f64) -> f64 {
    if ratio >= 2.0 {
        return 0.0;
    }
    let (mut low, mut high) = (-30.0, 1e4);
    let ratio_at = |x: f64| {
        let mean = x + mills(x);
        (1.0 + x * mean) / (mean * mean)
    };
    if ratio <= ratio_at(high) {
        low = high;
    }
    for _ in 0..200 {
        let middle = 0.5 * (low + high);
        if ratio_at(middle) > ratio {
            low = middle;
        } else {
            high = middle;
        }
    }
    let x = 0.5 * (low + high);
    let l = mills(x);
    let w = 1.0 / (x + l);
    let below = 0.5 * erfc(-x / 2.0_f64.sqrt());
    let entropy = (w * (2.0 * PI).sqrt() * below).ln() + 0.5 * (1.0 - x * l);
    (1.0 - entropy).max(0.0)
}

/// Standard normal density over distribution at `x`.
fn mills(x: f64) -> f64 {
    let density = (-0.5 * x * x).exp() / (2.0 * PI).sqrt();
    if x < -25.0 {
        // Continued fraction of the tail; `erfc` would underflow.
        let y = -x;
        return y + 1.0 / (y + 2.0 / (y + 3.0 / y));
    }
    density / (0.5 * erfc(-x / 2.0_f64.sqrt()))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Entropy by quadrature of the density itself.
    fn by_quadrature(a: f64, b: f64) -> (f64, f64) {
        let n = 200_000;
        let top = 60.0;
        let (mut z, mut m1, mut m2, mut e) = (0.0, 0.0, 0.0, 0.0);
        let peak = if a > 0.0 { a * a / (4.0 * b) } else { 0.0 };
        for i in 0..n {
            let p = (f64::from(i) + 0.5) * top / f64::from(n);
            let energy = a * p - b * p * p - peak;
            let d = energy.exp();
            z += d;
            m1 += p * d;
            m2 += p * p * d;
            e += energy * d;
        }
        let h = top / f64::from(n);
        let (mean, square) = (m1 / z, m2 / z);
        let entropy = (z * h).ln() - e / z - mean.ln();
        (square / (mean * mean), 1.0 - entropy)
    }

    #[test]
    fn the_gain_is_the_difference_of_entropies() {
        for (a, b) in [
            (-1.0, 0.02),
            (-0.5, 0.1),
            (0.0, 0.2),
            (2.0, 0.3),
            (6.0, 0.5),
        ] {
            let (ratio, want) = by_quadrature(a, b);
            let got = gain_for(ratio);
            assert!((got - want).abs() < 1e-4, "{a} {b} {ratio}: {got} {want}");
        }
        let (turning, _) = by_quadrature(0.0, 0.2);
        assert!((turning - FRAC_PI_2).abs() < 1e-6);
        assert_eq!(gain_for(2.1), 0.0);
        assert!(gain_for(1.0 + 1e-6) > 5.0);
    }
}
