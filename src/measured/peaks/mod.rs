//! The peaks of a spectrum: frequency, rms amplitude, width and decay rate, each with its uncertainty.
//!
//! Resonances are added one after the other where the spectrum exceeds the fit so far, all are fitted again
//! together, and one that does not better the likelihood enough is dropped. What is fitted is the exact mean of the
//! estimate (`line`), so the window widens no peak and overlapping peaks do not widen each other. A full width at
//! half power `w` means a decay rate `nu = pi w`. Intervals hold the scatter of the record and that between fits with one resonance
//! more or less that describe it about as well.

mod fit;
mod line;
mod search;

use std::f64::consts::PI;

use super::average::{Interval, normal_quantile};
use super::spectra::Spectra;
use super::window;
use crate::problems::Problem;

use fit::{Data, EACH, Fitted, Resonance};
use line::Bins;
use search::{Chosen, LOBE};

/// What is fitted.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Search {
    /// Lowest frequency (Hz).
    pub low: f64,
    /// Highest frequency (Hz).
    pub high: f64,
    /// Most resonances, those that shape the background among them.
    pub most: usize,
}

/// A peak of a spectrum.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Peak {
    /// Frequency of the oscillation (Hz).
    pub frequency: Interval,
    /// Decay rate (1/s), positive: minus the growth rate.
    pub decay: Interval,
    /// Full width at half power (Hz), decay rate over pi.
    pub width: Interval,
    /// Root mean square of this resonance alone (unit).
    pub rms: Interval,
    /// Part of the power density at the peak that is this resonance's.
    pub share: f64,
    /// Distance to the nearest other resonance fitted that has a twentieth of this one's power, over the mean of both full widths at
    /// half power. Below 1 they are told apart by the shape of their sum alone: a mode more may hide there, and the
    /// intervals hold the true values less often than they say.
    pub separation: f64,
    /// Whether the width exceeds the resolution of the spectrum; where not, the decay rate is told by its
    /// upper end alone.
    pub resolved: bool,
}

/// Peaks with how well the fit describes the spectrum.
#[derive(Clone, Debug, PartialEq)]
pub struct Peaks {
    /// By increasing frequency.
    pub peaks: Vec<Peak>,
    /// Frequencies of the bins fitted (Hz).
    pub frequency: Vec<f64>,
    /// The fit at each (unit squared per hertz).
    pub fitted: Vec<f64>,
    /// Power density between the peaks that no resonance explains (unit squared per hertz).
    pub floor: f64,
    /// Resonances fitted, with those that are no peaks.
    pub resonances: usize,
    /// Mean square of estimate over fit less one, over what chance gives: 1 where the fit describes the spectrum.
    pub misfit: f64,
}

/// Fewest averages a fit is asked of.
const FEWEST: f64 = 4.0;

/// First bin that removing the mean leaves alone.
const FIRST: usize = 3;

/// Least part of the power at its own frequency a resonance has to be called a peak.
const LEAST_SHARE: f64 = 0.5;

/// Most damping ratio of a peak; above, a resonance is taken for background.
const MOST_DAMPING: f64 = 0.6;

/// Finds and fits the peaks of a channel.
///
/// # Errors
/// Where the spectra are not of Hann windows, the band is empty or the channel constant.
pub fn find(spectra: &Spectra, channel: usize, search: Search) -> Result<Peaks, Problem> {
    let plan = spectra.plan();
    if plan.window != window::Window::Hann {
        let what = format!(
            "peaks are fitted to spectra of Hann windows, not {}",
            plan.window.noun()
        );
        return Err(Problem::error("window", what).hint("accumulate with the Hann window"));
    }
    if spectra.averages() < FEWEST {
        let what = format!(
            "{:.1} averages are too few to fit peaks",
            spectra.averages()
        );
        return Err(Problem::error("segment", what).hint("shorten the segments"));
    }
    let width = plan.bin_width();
    let first = ((search.low / width).ceil() as usize).max(FIRST);
    let last = ((search.high / width).floor() as usize).min(plan.bins().saturating_sub(3));
    let wanted = 8;
    if first + wanted > last {
        let what = format!(
            "{} to {} Hz holds fewer than {wanted} bins of {width:.3} Hz",
            search.low, search.high
        );
        return Err(Problem::error("peaks", what).hint("widen the band or lengthen the segments"));
    }
    let power = spectra
        .density(channel)
        .get(first..=last)
        .unwrap_or_default();
    if power.is_empty() || power.iter().any(|p| *p <= 0.0) {
        return Err(Problem::error(
            "channel",
            "the channel is constant, or filtered to exactly nothing in the band",
        ));
    }
    let bins = Bins::new(plan.rate_hz, plan.segment, first, power.len());
    let weights = plan.window.weights(plan.segment);
    let kappa: Vec<f64> = (0..3)
        .map(|apart| window::covariance_of_bins(&weights, plan.step(), spectra.segments(), apart))
        .collect();
    let data = Data {
        bins: &bins,
        power,
        kappa: &kappa,
    };
    let chosen = search::search(&data, search.most).ok_or_else(|| {
        Problem::error("peaks", "no fit of the spectrum settles").hint("narrow the band")
    })?;
    Ok(told(&data, &chosen))
}

fn told(data: &Data, chosen: &Chosen) -> Peaks {
    let fitted = &chosen.fitted;
    let n = data.power.len() as f64;
    let squares: f64 = data
        .power
        .iter()
        .zip(&fitted.mean)
        .map(|(p, m)| (p / m - 1.0).powi(2))
        .sum();
    let covariance = fit::covariance(data, fitted);
    let resonances = &fitted.model.resonances;
    let mut peaks: Vec<Peak> = Vec::new();
    if let Some(covariance) = &covariance {
        for (k, r) in resonances.iter().enumerate() {
            let deviation = |parameter: usize| {
                let at = EACH * k + parameter;
                let between = fit::between(data, fitted, &chosen.others, k, parameter);
                (covariance[(at, at)].max(0.0) + between).sqrt()
            };
            let at = EACH * k + 2;
            if r.c.re <= normal_quantile() * covariance[(at, at)].max(0.0).sqrt() {
                continue;
            }
            if let Some(peak) = peak(data, fitted, r, deviation) {
                peaks.push(peak);
            }
        }
    }
    // What surrounds a stronger, narrower peak at the same place is its foot: a cycle's amplitude wavers too.
    let is_foot = |p: &Peak, of: &Peak| {
        let off = (p.frequency.value - of.frequency.value).abs();
        let louder = of.rms.value / p.rms.value;
        let reach = if louder > 3.0 { 2.0 * LOBE } else { 2.0 };
        louder > 1.0
            && of.width.value < p.width.value
            && off < (0.5 * p.width.value).max(reach * data.bins.width())
    };
    let feet: Vec<bool> = peaks
        .iter()
        .map(|p| peaks.iter().any(|of| is_foot(p, of)))
        .collect();
    let mut feet = feet.into_iter();
    peaks.retain(|_| !feet.next().unwrap_or(false));
    peaks.sort_by(|a, b| a.frequency.value.total_cmp(&b.frequency.value));
    Peaks {
        peaks,
        frequency: (0..data.bins.count())
            .map(|j| data.bins.frequency(j))
            .collect(),
        fitted: fitted.mean.clone(),
        floor: fitted.model.floor,
        resonances: resonances.len(),
        misfit: squares / (n * data.kappa[0]),
    }
}

/// A resonance as a peak; `None` where it is none: it has less than half of the power at its frequency or is damped too much. It
/// need not make a maximum: on the foot of another it may be a shoulder.
fn peak(
    data: &Data,
    fitted: &Fitted,
    r: &Resonance,
    deviation: impl Fn(usize) -> f64,
) -> Option<Peak> {
    let (bins, z) = (data.bins, normal_quantile());
    let (nu, f, c) = (r.decay(), r.frequency(), r.c.re);
    let at = ((f - bins.frequency(0)) / bins.width()).round();
    if at < 0.0 || at >= bins.count() as f64 || nu > MOST_DAMPING * r.s.norm() {
        return None;
    }
    let at = at as usize;
    let line = bins.line(r.s).value[at];
    let share = (r.c * line).re / fitted.mean[at];
    if share < LEAST_SHARE {
        return None;
    }
    let others = fitted
        .model
        .resonances
        .iter()
        .filter(|o| *o != r && o.c.re > 0.05 * c);
    let separation = others
        .map(|o| (o.frequency() - f).abs() / ((o.decay() + nu) / (2.0 * PI)))
        .fold(f64::INFINITY, f64::min);
    let spread = (z * deviation(0)).exp();
    let width = nu / PI;
    let resolved = width > bins.width() && spread < 10.0;
    let decay = Interval {
        value: nu,
        low: if resolved { nu / spread } else { 0.0 },
        high: nu * spread,
    };
    let over_pi = |x: f64| x / PI;
    let about = |value: f64, half: f64| Interval {
        value,
        low: value - half,
        high: value + half,
    };
    let rms = c.sqrt();
    Some(Peak {
        frequency: about(f, z * deviation(1)),
        decay,
        width: Interval {
            value: width,
            low: over_pi(decay.low),
            high: over_pi(decay.high),
        },
        rms: about(rms, z * deviation(2) / (2.0 * rms)),
        share,
        separation,
        resolved,
    })
}
