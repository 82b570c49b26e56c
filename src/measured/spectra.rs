//! Averaged spectra with their uncertainties.
//!
//! One-sided density (per hertz) and spectrum differ by the equivalent noise bandwidth of the window:
//!
//! ```text
//! density  c = 2/(rate sum w^2),   spectrum  c = 2/(sum w)^2      (1 for 2 at zero and half the rate)
//! ```
//!
//! Random errors from `n_d` independent averages, `g2 = |S_xy|^2/(S_xx S_yy)` the coherence (Bendat & Piersol,
//! Random Data, from memory):
//!
//! ```text
//! gain of H = S_xy/S_xx:  |H^ - H|^2 <= F(2, 2 n_d - 2) (1 - g2) S_yy/((n_d - 1) S_xx)     with 95 %
//! std(phase) = sqrt((1 - g2)/(2 n_d g2)),   std(g2)/g2 = sqrt(2/n_d) (1 - g2)/|g|
//! ```

use num_complex::Complex64;

use super::average::{self, Interval};
use super::engine::Plan;
use super::window;

/// What the values of a power spectrum are.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub enum Scaling {
    /// Square of the unit per hertz: for noise.
    #[default]
    Density,
    /// Square of the unit: the mean square of a line, for tones.
    Spectrum,
}

/// Factors from sums over segments to one-sided densities.
pub(super) struct Scale {
    inner: f64,
    real_last: bool,
}

impl Scale {
    pub(super) fn new(plan: &Plan, weights: &[f64], count: usize) -> Scale {
        Scale {
            inner: 2.0 / (plan.rate_hz * window::squares(weights) * count as f64),
            real_last: plan.segment.is_multiple_of(2),
        }
    }

    /// Of bin `j` of `n`.
    fn factor(&self, j: usize, n: usize) -> f64 {
        let real = j == 0 || (self.real_last && j + 1 == n);
        if real { self.inner / 2.0 } else { self.inner }
    }

    pub(super) fn density(&self, mut sums: Vec<f64>) -> Vec<f64> {
        let n = sums.len();
        for (j, s) in sums.iter_mut().enumerate() {
            *s *= self.factor(j, n);
        }
        sums
    }

    pub(super) fn cross_density(&self, mut sums: Vec<Complex64>) -> Vec<Complex64> {
        let n = sums.len();
        for (j, s) in sums.iter_mut().enumerate() {
            *s *= self.factor(j, n);
        }
        sums
    }
}

/// Averaged one-sided spectra of the channels of a record.
#[derive(Clone, Debug, PartialEq)]
pub struct Spectra {
    plan: Plan,
    samples: usize,
    segments: usize,
    averages: f64,
    to_spectrum: f64,
    powers: Vec<Vec<f64>>,
    crosses: Vec<(usize, usize, Vec<Complex64>)>,
}

impl Spectra {
    pub(super) fn new(
        plan: Plan,
        samples: usize,
        segments: usize,
        averages: f64,
        powers: Vec<Vec<f64>>,
        crosses: Vec<(usize, usize, Vec<Complex64>)>,
    ) -> Spectra {
        Spectra {
            plan,
            samples,
            segments,
            averages,
            to_spectrum: plan.resolution(),
            powers,
            crosses,
        }
    }

    /// How the record was cut.
    pub fn plan(&self) -> &Plan {
        &self.plan
    }

    /// Samples of the record, those left out at its end among them.
    pub fn samples(&self) -> usize {
        self.samples
    }

    /// Segments averaged over.
    pub fn segments(&self) -> usize {
        self.segments
    }

    /// Number of independent averages the overlapping segments amount to.
    pub fn averages(&self) -> f64 {
        self.averages
    }

    /// Relative standard deviation of a power estimate, `1/sqrt(n_d)`.
    pub fn random_error(&self) -> f64 {
        self.averages.sqrt().recip()
    }

    /// Frequency of a bin (Hz).
    pub fn frequency(&self, bin: usize) -> f64 {
        bin as f64 * self.plan.bin_width()
    }

    /// Frequencies of all bins (Hz).
    pub fn frequencies(&self) -> Vec<f64> {
        (0..self.plan.bins()).map(|j| self.frequency(j)).collect()
    }

    /// Number of channels.
    pub fn channels(&self) -> usize {
        self.powers.len()
    }

    /// One-sided power density of a channel (unit squared per hertz); empty where there is no such
    /// channel.
    pub fn density(&self, channel: usize) -> &[f64] {
        self.powers.get(channel).map_or(&[], Vec::as_slice)
    }

    /// Power of a channel in the scaling asked for.
    pub fn power(&self, channel: usize, scaling: Scaling) -> Vec<f64> {
        let factor = match scaling {
            Scaling::Density => 1.0,
            Scaling::Spectrum => self.to_spectrum,
        };
        self.density(channel).iter().map(|p| p * factor).collect()
    }

    /// Whether the transform at a bin is real, which halves the degrees of freedom there.
    fn real_bin(&self, bin: usize) -> bool {
        bin == 0 || 2 * bin == self.plan.segment
    }

    /// Factors on the power at a bin that bound the true power (smoothed by the window) with 95 %.
    pub fn band(&self, bin: usize) -> (f64, f64) {
        let halved = if self.real_bin(bin) { 0.5 } else { 1.0 };
        average::power_factors(self.averages * halved)
    }

    /// One-sided cross density of two channels, the mean of `conj(X) Y`; `None` where it was not asked
    /// for.
    pub fn cross(&self, x: usize, y: usize) -> Option<Vec<Complex64>> {
        if x == y {
            let power = self.powers.get(x)?;
            return Some(power.iter().map(|p| Complex64::from(*p)).collect());
        }
        self.crosses.iter().find_map(|(a, b, s)| {
            if (*a, *b) == (x, y) {
                Some(s.clone())
            } else if (*a, *b) == (y, x) {
                Some(s.iter().map(Complex64::conj).collect())
            } else {
                None
            }
        })
    }

    /// How two channels hang together at every bin; `None` where their cross-spectrum was not asked for.
    pub fn relation(&self, x: usize, y: usize) -> Option<Vec<Relation>> {
        let cross = self.cross(x, y)?;
        let (px, py) = (self.density(x), self.density(y));
        let related = |(j, s): (usize, &Complex64)| {
            let halved = if self.real_bin(j) { 0.5 } else { 1.0 };
            Relation::new(self.averages * halved, px[j], py[j], *s)
        };
        Some(cross.iter().enumerate().map(related).collect())
    }
}

/// How a channel `y` follows a channel `x` at one frequency.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Relation {
    /// `S_xy/S_xx`: gain and phase from `x` to `y` where nothing returns from `y` to `x`.
    pub transfer: Complex64,
    /// Radius (same unit) of the disc about `transfer` that holds the true value with 95 %; infinite
    /// where there are too few averages.
    pub radius: f64,
    /// Coherence, 0 to 1.
    pub coherence: f64,
    /// Its standard deviation.
    pub coherence_deviation: f64,
    /// Phase of `y` after that of `x` (rad); positive where `y` leads.
    pub phase: f64,
    /// Its standard deviation (rad), infinite without coherence.
    pub phase_deviation: f64,
    /// Coherence that two unrelated records exceed with 5 %.
    pub chance_coherence: f64,
}

impl Relation {
    pub(super) fn new(averages: f64, px: f64, py: f64, cross: Complex64) -> Relation {
        let product = px * py;
        let coherence = if product > 0.0 {
            (cross.norm_sqr() / product).min(1.0)
        } else {
            0.0
        };
        let transfer = if px > 0.0 {
            cross / px
        } else {
            Complex64::ZERO
        };
        let radius = if averages > 1.0 && px > 0.0 {
            let f = average::f_quantile(2.0, 2.0 * averages - 2.0);
            (f * (1.0 - coherence) * py / ((averages - 1.0) * px)).sqrt()
        } else {
            f64::INFINITY
        };
        let chance = if averages > 1.0 {
            1.0 - (2.0 * average::TAIL).powf(1.0 / (averages - 1.0))
        } else {
            1.0
        };
        Relation {
            transfer,
            radius,
            coherence,
            coherence_deviation: (2.0 * coherence / averages).sqrt() * (1.0 - coherence),
            phase: transfer.arg(),
            phase_deviation: ((1.0 - coherence) / (2.0 * averages * coherence)).sqrt(),
            chance_coherence: chance,
        }
    }

    /// Gain with its 95 % interval.
    pub fn gain(&self) -> Interval {
        let value = self.transfer.norm();
        Interval {
            value,
            low: (value - self.radius).max(0.0),
            high: value + self.radius,
        }
    }

    /// Phase (rad) with its 95 % interval; the whole circle where zero lies in the disc.
    pub fn phase_interval(&self) -> Interval {
        let ratio = self.radius / self.transfer.norm();
        let half = if ratio < 1.0 {
            ratio.asin()
        } else {
            std::f64::consts::PI
        };
        Interval {
            value: self.phase,
            low: self.phase - half,
            high: self.phase + half,
        }
    }
}
