//! Intervals of averaged spectra (Bendat & Piersol, Random Data, from memory).
//!
//! A power estimate of `n_d` independent averages times `2 n_d` over its mean is chi-square with `2 n_d`
//! degrees of freedom (half as many at zero and at half the sampling rate, where the transform is real).

use statrs::distribution::{ChiSquared, ContinuousCDF, FisherSnedecor, Normal};

/// A value with the ends of an interval about it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Interval {
    /// The estimate.
    pub value: f64,
    /// Lower end.
    pub low: f64,
    /// Upper end.
    pub high: f64,
}

impl Interval {
    /// Whether a value lies in it.
    pub fn holds(&self, x: f64) -> bool {
        self.low <= x && x <= self.high
    }

    /// Its whole width.
    pub fn width(&self) -> f64 {
        self.high - self.low
    }
}

/// Probability outside a 95 % interval on either side.
pub(super) const TAIL: f64 = 0.025;

/// Factors on a power estimate of `averages` independent averages that bound its mean with 95 %.
pub(super) fn power_factors(averages: f64) -> (f64, f64) {
    let degrees = 2.0 * averages;
    match ChiSquared::new(degrees) {
        Ok(chi) => (
            degrees / chi.inverse_cdf(1.0 - TAIL),
            degrees / chi.inverse_cdf(TAIL),
        ),
        Err(_) => (0.0, f64::INFINITY),
    }
}

/// The value a standard normal deviate exceeds with probability 0.025.
pub(super) fn normal_quantile() -> f64 {
    Normal::standard().inverse_cdf(1.0 - TAIL)
}

/// The value an F variate of `a` and `b` degrees of freedom exceeds with probability 0.05.
pub(super) fn f_quantile(a: f64, b: f64) -> f64 {
    FisherSnedecor::new(a, b).map_or(f64::INFINITY, |f| f.inverse_cdf(1.0 - 2.0 * TAIL))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Handbook values: chi-square with 10 degrees of freedom 3.247 and 20.483; F with 2 and 10: 4.103.
    #[test]
    fn quantiles_are_those_of_the_tables() {
        let (low, high) = power_factors(5.0);
        assert!((10.0 / low - 20.483).abs() < 1e-3 && (10.0 / high - 3.247).abs() < 1e-3);
        assert!((f_quantile(2.0, 10.0) - 4.103).abs() < 1e-3);
        assert!((normal_quantile() - 1.959_964).abs() < 1e-6);
    }
}
