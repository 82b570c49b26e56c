//! Flame response from records of velocity `u`, light or heat release `q`, and an excitation signal `r`.
//!
//! In a rig the flame's sound returns as velocity, so noise of the flame is in `u` as well and the direct estimate
//! `S_uq/S_uu` is biased, however long the record. A reference that the rig does not feed back to, such as the
//! excitation signal, is correlated with neither noise, and
//!
//! ```text
//! H = S_rq/S_ru
//! ```
//!
//! is not. Its uncertainty is the set of all `H` for which `e = q - H u` shows no more coherence with `r` than chance would
//! in 95 % of records (Fieller 1954, for complex ratios): with `c = 1 - 0.05^(1/(n_d - 1))`,
//!
//! ```text
//! |S_rq - H S_ru|^2 <= c S_rr S_ee(H),   S_ee = S_qq - 2 Re[conj(H) S_uq] + |H|^2 S_uu
//! ```
//!
//! which is a disc where `u` follows `r` at all, `|S_ru|^2 > c S_rr S_uu`, and no bound otherwise.

use num_complex::Complex64;

use super::average::{Interval, TAIL};
use super::spectra::Spectra;
use crate::problems::Problem;

/// Which channels are what.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Channels {
    /// Velocity at the response's reference plane.
    pub velocity: usize,
    /// Light or heat release.
    pub heat: usize,
    /// Excitation signal, where there is one.
    pub excitation: Option<usize>,
}

/// Means that make the response a ratio of relative fluctuations, `(q'/q) / (u'/u)`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Means {
    /// Mean velocity (its channel's unit).
    pub velocity: f64,
    /// Mean light or heat release (its channel's unit).
    pub heat: f64,
}

/// The response at one frequency.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Point {
    /// Frequency (Hz).
    pub frequency: f64,
    /// Gain and phase; phase negative where heat release lags.
    pub response: Complex64,
    /// Middle of the disc that holds the true response with 95 %, not quite the estimate itself.
    pub middle: Complex64,
    /// Radius of the disc; infinite where the record gives no bound.
    pub radius: f64,
    /// Coherence of excitation and velocity (of velocity and heat release without excitation).
    pub coherence: f64,
    /// Coherence of excitation and heat release (the same as `coherence` without excitation).
    pub heat_coherence: f64,
}

impl Point {
    /// Whether the disc holds a value.
    pub fn holds(&self, response: Complex64) -> bool {
        (response - self.middle).norm() <= self.radius
    }

    /// Gain with its 95 % band.
    pub fn gain(&self) -> Interval {
        let middle = self.middle.norm();
        Interval {
            value: self.response.norm(),
            low: (middle - self.radius).max(0.0),
            high: middle + self.radius,
        }
    }

    /// Phase (rad) with its 95 % band about it; the whole circle where the disc holds zero.
    pub fn phase(&self) -> Interval {
        let value = self.response.arg();
        let middle = self.middle.norm();
        if self.radius >= middle {
            let half = std::f64::consts::PI;
            return Interval {
                value,
                low: value - half,
                high: value + half,
            };
        }
        let half = (self.radius / middle).asin();
        let centre = value + (self.middle * self.response.conj()).arg();
        Interval {
            value,
            low: centre - half,
            high: centre + half,
        }
    }
}

/// A response with what is to be said beside it.
#[derive(Clone, Debug, PartialEq)]
pub struct Measured {
    /// By frequency, zero left out.
    pub points: Vec<Point>,
    /// Cautions.
    pub warnings: Vec<Problem>,
}

/// The response of a flame from spectra that hold the cross-spectra of its channels.
///
/// # Errors
/// Where a cross-spectrum is not there, there are too few averages, or a mean is none.
pub fn measure(spectra: &Spectra, channels: Channels, means: Means) -> Result<Measured, Problem> {
    let scale = means.velocity / means.heat;
    if !(scale.is_finite() && scale != 0.0) {
        let what = format!(
            "means of {} and {} make no relative fluctuation",
            means.velocity, means.heat
        );
        return Err(Problem::error("means", what)
            .hint("state mean velocity and mean heat release or light"));
    }
    let averages = spectra.averages();
    if averages <= 2.0 {
        let what = format!("{averages:.1} averages give no bounds");
        return Err(
            Problem::error("segment", what).hint("shorten the segments or record for longer")
        );
    }
    let Channels {
        velocity,
        heat,
        excitation,
    } = channels;
    let reference = excitation.unwrap_or(velocity);
    let cross = |a: usize, b: usize| {
        spectra.cross(a, b).ok_or_else(|| {
            let what = format!("no cross-spectrum of channels {a} and {b} was accumulated");
            Problem::error("channels", what)
        })
    };
    let (ru, rq, uq) = (
        cross(reference, velocity)?,
        cross(reference, heat)?,
        cross(velocity, heat)?,
    );
    let (rr, uu, qq) = (
        spectra.density(reference),
        spectra.density(velocity),
        spectra.density(heat),
    );
    let chance = 1.0 - (2.0 * TAIL).powf(1.0 / (averages - 1.0));
    let last = (spectra.plan().segment - 1) / 2;
    let points = (1..=last).map(|j| {
        let (middle, radius) = disc(chance, rr[j], uu[j], qq[j], ru[j], rq[j], uq[j]);
        let coherence = |s: Complex64, a: f64, b: f64| (s.norm_sqr() / (a * b)).min(1.0);
        Point {
            frequency: spectra.frequency(j),
            response: rq[j] / ru[j] * scale,
            middle: middle * scale,
            radius: radius * scale.abs(),
            coherence: match excitation {
                Some(_) => coherence(ru[j], rr[j], uu[j]),
                None => coherence(uq[j], uu[j], qq[j]),
            },
            heat_coherence: coherence(rq[j], rr[j], qq[j]),
        }
    });
    let points: Vec<Point> = points.filter(|p| p.response.is_finite()).collect();
    let mut warnings = Vec::new();
    if excitation.is_none() {
        warnings.push(
            Problem::warning(
                "excitation",
                "without an excitation signal the response is a direct cross-spectrum of velocity and heat release: where sound \
                 of the flame returns to it the estimate is biased, and no band tells by how much",
            )
            .hint("record the signal that drives the excitation beside the others"),
        );
    }
    let loose = points.iter().filter(|p| p.radius.is_infinite()).count();
    if loose > 0 {
        let what = format!(
            "at {loose} of {} frequencies the velocity follows the excitation no better than chance would: no bound there",
            points.len()
        );
        warnings.push(
            Problem::warning("excitation", what)
                .hint("excite these frequencies, or leave them out"),
        );
    }
    Ok(Measured { points, warnings })
}

/// The disc of responses compatible with the record.
fn disc(
    chance: f64,
    rr: f64,
    uu: f64,
    qq: f64,
    ru: Complex64,
    rq: Complex64,
    uq: Complex64,
) -> (Complex64, f64) {
    let c = chance * rr;
    let a = ru.norm_sqr() - c * uu;
    if a.is_nan() || a <= 0.0 {
        return (rq / ru, f64::INFINITY);
    }
    let middle = (ru.conj() * rq - uq * c) / a;
    let square = middle.norm_sqr() - (rq.norm_sqr() - c * qq) / a;
    (middle, square.max(0.0).sqrt())
}
