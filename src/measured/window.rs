//! Windows of a segment, `w_m = a_0 - a_1 cos(2 pi m/N) + a_2 cos(4 pi m/N) - ...`, `m = 0 .. N-1`: the
//! periodic form, as spectral estimates want it.
//!
//! Segments of `N` samples that begin `D` samples apart see in part the same samples. For noise whose
//! spectrum is smooth over a bin the power estimates of two segments `m` steps apart correlate by
//!
//! ```text
//! rho_m = (sum_i w_i w_{i+mD} / sum_i w_i^2)^2
//! ```
//!
//! and the variance of the mean over `K` segments is (Welch 1967, IEEE Trans. Audio Electroacoust. 15, 70)
//!
//! ```text
//! eps^2 = 1/n_d = (1/K) [1 + 2 sum_{m=1}^{K-1} (1 - m/K) rho_m]
//! ```
//!
//! relative to the square of the mean; `n_d` is the number of independent averages it amounts to.

use std::f64::consts::TAU;

use num_complex::Complex64;

/// The weight given to the samples of a segment.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub enum Window {
    /// Raised cosine: the default.
    #[default]
    Hann,
    /// All samples alike: finest resolution, worst leakage.
    Boxcar,
    /// Five-term flat-top: amplitudes of lines between bins, at the price of resolution.
    FlatTop,
}

/// Coefficients of the flat-top window (D'Antona & Ferrero 2006, Digital Signal Processing for
/// Measurement Systems; the digits are those general-purpose libraries carry).
const FLAT_TOP: [f64; 5] = [
    0.215_578_95,
    0.416_631_58,
    0.277_263_158,
    0.083_578_947,
    0.006_947_368,
];

impl Window {
    /// The word for it.
    pub fn noun(self) -> &'static str {
        match self {
            Window::Hann => "Hann",
            Window::Boxcar => "boxcar",
            Window::FlatTop => "flat-top",
        }
    }

    /// The weights of a segment of `n` samples.
    pub fn weights(self, n: usize) -> Vec<f64> {
        let terms: &[f64] = match self {
            Window::Hann => &[0.5, 0.5],
            Window::Boxcar => &[1.0],
            Window::FlatTop => &FLAT_TOP,
        };
        let weight = |m: usize| {
            let angle = TAU * m as f64 / n as f64;
            let signed = |(k, a): (usize, &f64)| {
                let sign = if k % 2 == 0 { 1.0 } else { -1.0 };
                sign * a * (angle * k as f64).cos()
            };
            terms.iter().enumerate().map(signed).sum()
        };
        (0..n).map(weight).collect()
    }
}

/// Equivalent noise bandwidth in bins, `N sum w^2 / (sum w)^2`.
pub(super) fn noise_bandwidth(weights: &[f64]) -> f64 {
    let sum: f64 = weights.iter().sum();
    weights.len() as f64 * squares(weights) / (sum * sum)
}

/// `sum w^2`.
pub(super) fn squares(weights: &[f64]) -> f64 {
    weights.iter().map(|w| w * w).sum()
}

/// `1/n_d` of the mean over `count` segments `step` samples apart.
pub(super) fn variance_of_mean(weights: &[f64], step: usize, count: usize) -> f64 {
    covariance_of_bins(weights, step, count, 0)
}

/// The same between two bins `apart` of each other, relative to the product of their means.
pub(super) fn covariance_of_bins(weights: &[f64], step: usize, count: usize, apart: usize) -> f64 {
    let (n, k) = (weights.len(), count as f64);
    let power = squares(weights);
    let mut sum = 0.0;
    for lag in 0..count {
        let shift = lag * step;
        if shift >= n {
            break;
        }
        let overlap: Complex64 = (0..n - shift)
            .map(|i| {
                let angle = TAU * (apart * i % n) as f64 / n as f64;
                Complex64::cis(angle) * (weights[i] * weights[i + shift])
            })
            .sum();
        let rho = (overlap / power).norm_sqr();
        let times = if lag == 0 { 1.0 } else { 2.0 };
        sum += times * (1.0 - lag as f64 / k) * rho;
    }
    sum / k
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Overlap correlations of the Hann window and its bandwidth: computed with scipy 1.17.1 (see
    /// `tests/data/signal_checks.json`).
    #[test]
    fn hann_overlaps_as_published() {
        let w = Window::Hann.weights(1024);
        assert!((noise_bandwidth(&w) - 1.5).abs() < 1e-12);
        let rho = |step: usize, lag: usize| {
            let overlap: f64 = (0..1024 - lag * step)
                .map(|i| w[i] * w[i + lag * step])
                .sum();
            (overlap / squares(&w)).powi(2)
        };
        assert!((rho(512, 1) - 0.027_777_777_777_777_776).abs() < 1e-14);
        let want = [
            0.434_485_239_004_132_3,
            0.027_777_777_777_777_776,
            5.642_599_104_494_595e-5,
        ];
        for (lag, want) in (1..).zip(want) {
            assert!((rho(256, lag) - want).abs() < 1e-12, "{lag}");
        }
        let eps = variance_of_mean(&w, 512, 16).sqrt();
        assert!((eps - 0.256_427_783_856_066_07).abs() < 1e-12);
        let eps = variance_of_mean(&w, 512, 64).sqrt();
        assert!((eps - 0.128_372_474_415_273_3).abs() < 1e-12);
    }

    #[test]
    fn bins_of_a_hann_window_correlate_by_its_kernel() {
        let w = Window::Hann.weights(256);
        for (apart, want) in [(0, 1.0), (1, 4.0 / 9.0), (2, 1.0 / 36.0), (3, 0.0)] {
            assert!((covariance_of_bins(&w, 256, 1, apart) - want).abs() < 1e-12);
        }
    }

    #[test]
    fn boxcar_averages_are_independent() {
        let w = Window::Boxcar.weights(64);
        assert!((variance_of_mean(&w, 64, 10) - 0.1).abs() < 1e-15);
    }
}
