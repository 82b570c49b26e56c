//! The peaks of a spectrum: frequency, rms amplitude, width and decay rate, each with its uncertainty.
//!
//! Resonances are added one after the other where the spectrum exceeds the fit so far, all are fitted again
//! together, and one that does not better the likelihood enough is dropped. What is fitted is the exact mean of the
//! estimate (`line`), so the window widens no peak and overlapping peaks do not widen each other. A full width at
//! half power `w` means a decay rate `nu = pi w`. Channels fitted together ([`find_together`]) share frequencies and decay rates, and what one hardly tells,
//! because a neighbour hides it there, the shape over several does. Intervals hold the scatter of the record and that between fits with one resonance
//! more or less that describe it about as well.

mod fit;
mod fitted;
mod line;
mod model;
mod search;

use std::f64::consts::PI;

use num_complex::Complex64;

use super::average::{Interval, normal_quantile};
use super::spectra::Spectra;
use super::window;
use crate::problems::Problem;

use fit::{Asked, place_of_square};
use fitted::Fitted;
use line::Bins;
use model::{Data, MOST_SENSORS};
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
    /// Root mean square of this resonance alone where it is loudest (unit).
    pub rms: Interval,
    /// Part of the power density at the peak that is this resonance's, at the channel where that is most.
    pub share: f64,
    /// Distance to the nearest other resonance fitted that has a twentieth of this one's power, over the mean of both full widths at
    /// half power. Below 1 they are told apart by the shape of their sum alone: a mode more may hide there, and the
    /// intervals hold the true values less often than they say.
    pub separation: f64,
    /// Whether the width exceeds the resolution of the spectrum; where not, the decay rate is told by its
    /// upper end alone.
    pub resolved: bool,
    /// The channel where it is loudest, of those fitted together.
    pub loudest: usize,
}

/// Peaks with how well the fit describes the spectrum.
#[derive(Clone, Debug, PartialEq)]
pub struct Peaks {
    /// By increasing frequency.
    pub peaks: Vec<Peak>,
    /// Frequencies of the bins fitted (Hz).
    pub frequency: Vec<f64>,
    /// The fit of each channel at each (unit squared per hertz).
    pub fitted: Vec<Vec<f64>>,
    /// Power density between the peaks that no resonance explains, of each channel (unit squared per hertz).
    pub floor: Vec<f64>,
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

/// Likeness of two shapes from which on they are one.
const SAME_SHAPE: f64 = 0.9;

/// Most damping ratio of a peak; above, a resonance is taken for background.
const MOST_DAMPING: f64 = 0.6;

/// Finds and fits the peaks of a channel.
///
/// # Errors
/// Where the spectra are not of Hann windows, the band is empty or the channel constant.
pub fn find(spectra: &Spectra, channel: usize, search: Search) -> Result<Peaks, Problem> {
    find_together(spectra, &[channel], search)
}

/// Finds and fits the peaks that several channels of one unit share: their frequencies and decay rates are common, their
/// amplitudes and phases are not. `rms` is that of the loudest.
///
/// # Errors
/// As [`find`]; and where a cross-spectrum was not accumulated.
pub fn find_together(
    spectra: &Spectra,
    channels: &[usize],
    search: Search,
) -> Result<Peaks, Problem> {
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
    let count = last + 1 - first;
    let sensors = channels.len();
    if sensors == 0 || sensors > MOST_SENSORS {
        let what = format!("{sensors} channels cannot be fitted together");
        return Err(Problem::error("channels", what).hint("name one to eight"));
    }
    let constant = || {
        Problem::error(
            "channel",
            "the channel is constant, or filtered to exactly nothing in the band",
        )
    };
    let mut power = vec![Complex64::ZERO; count * sensors * sensors];
    for (a, x) in channels.iter().enumerate() {
        let own = spectra.density(*x).get(first..=last).unwrap_or_default();
        if own.is_empty() || own.iter().any(|p| *p <= 0.0) {
            return Err(constant());
        }
        for (b, y) in channels.iter().enumerate() {
            let cross = spectra.cross(*y, *x).ok_or_else(|| {
                let what = format!("no cross-spectrum of channels {y} and {x} was accumulated");
                Problem::error("channels", what)
            })?;
            for (j, p) in cross
                .get(first..=last)
                .unwrap_or_default()
                .iter()
                .enumerate()
            {
                power[(j * sensors + a) * sensors + b] = *p;
            }
        }
    }
    let bins = Bins::new(plan.rate_hz, plan.segment, first, count);
    let weights = plan.window.weights(plan.segment);
    let kappa: Vec<f64> = (0..3)
        .map(|apart| window::covariance_of_bins(&weights, plan.step(), spectra.segments(), apart))
        .collect();
    let data = Data {
        bins,
        sensors,
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
    let squares: f64 = fitted.misfit(data).iter().map(|e| e * e).sum();
    let covariance = fit::covariance(data, fitted);
    let resonances = &fitted.model.resonances;
    let mut peaks: Vec<(Peak, usize)> = Vec::new();
    for (k, r) in resonances.iter().enumerate() {
        let square = place_of_square(data, k, r);
        let deviation = |asked: Asked| {
            let at = match asked {
                Asked::Decay => data.each() * k,
                Asked::Frequency => data.each() * k + 1,
                Asked::Square => square,
            };
            let between = fit::between(data, fitted, &chosen.others, k, asked);
            (covariance[(at, at)].max(0.0) + between).sqrt()
        };
        // Of one sensor; together, the search has asked more of each than that.
        if data.sensors == 1
            && r.square() <= normal_quantile() * covariance[(square, square)].max(0.0).sqrt()
        {
            continue;
        }
        peaks.extend(peak(data, fitted, k, deviation).map(|p| (p, k)));
    }
    // What surrounds a stronger, narrower peak at the same place and in the same shape is its foot: a cycle's amplitude wavers too.
    let is_foot = |(p, k): &(Peak, usize), (of, l): &(Peak, usize)| {
        let off = (p.frequency.value - of.frequency.value).abs();
        let louder = of.rms.value / p.rms.value;
        let reach = if louder > 3.0 { 2.0 * LOBE } else { 2.0 };
        louder > 1.0
            && of.width.value < p.width.value
            && (data.sensors == 1 || !of.resolved)
            && off < (0.5 * p.width.value).max(reach * data.bins.width())
            && resonances[*k].likeness(&resonances[*l]) > SAME_SHAPE
    };
    let own = |p: &&(Peak, usize)| !peaks.iter().any(|of| is_foot(p, of));
    let mut peaks: Vec<Peak> = peaks.iter().filter(own).map(|(p, _)| *p).collect();
    peaks.sort_by(|a, b| a.frequency.value.total_cmp(&b.frequency.value));
    Peaks {
        peaks,
        frequency: (0..data.bins.count())
            .map(|j| data.bins.frequency(j))
            .collect(),
        fitted: (0..data.sensors)
            .map(|a| fitted.of_sensor(data, a))
            .collect(),
        floor: fitted.model.floor.clone(),
        resonances: resonances.len(),
        misfit: squares / ((data.cells() * data.bins.count()) as f64 * data.kappa[0]),
    }
}

/// A resonance as a peak; `None` where it is none: it has less than half of the power at its frequency or is damped too much. It
/// need not make a maximum: on the foot of another it may be a shoulder.
fn peak(data: &Data, fitted: &Fitted, k: usize, deviation: impl Fn(Asked) -> f64) -> Option<Peak> {
    let (bins, z) = (&data.bins, normal_quantile());
    let r = fitted.model.resonances.get(k)?;
    let (nu, f, c) = (r.decay(), r.frequency(), r.square());
    let at = ((f - bins.frequency(0)) / bins.width()).round();
    if at < 0.0 || at >= bins.count() as f64 || nu > MOST_DAMPING * r.s.norm() {
        return None;
    }
    let at = at as usize;
    let mut mean = vec![Complex64::ZERO; data.cells()];
    fitted.mean(at, &mut mean);
    let shares = (0..data.sensors).map(|a| fitted.own(k, at, a) / mean[a * data.sensors + a].re);
    let share = shares.fold(f64::NEG_INFINITY, f64::max);
    if data.sensors == 1 && share < LEAST_SHARE {
        return None;
    }
    let others = fitted
        .model
        .resonances
        .iter()
        .filter(|o| *o != r && o.square() > 0.05 * c);
    let separation = others
        .map(|o| (o.frequency() - f).abs() / ((o.decay() + nu) / (2.0 * PI)))
        .fold(f64::INFINITY, f64::min);
    let spread = (z * deviation(Asked::Decay)).exp();
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
    let mut rms = c.sqrt();
    let mut middle = f;
    if width <= bins.width()
        && let Some((square, place)) = tone(data, r.loudest, at)
    {
        (rms, middle) = (square.sqrt(), place);
    }
    Some(Peak {
        frequency: about(middle, z * deviation(Asked::Frequency)),
        decay,
        width: Interval {
            value: width,
            low: over_pi(decay.low),
            high: over_pi(decay.high),
        },
        rms: about(rms, rms * z * deviation(Asked::Square) / (2.0 * c)),
        share,
        separation,
        resolved,
        loudest: r.loudest,
    })
}

/// Mean square and frequency (Hz) of a line that the window does not resolve: a tone does not waver as the noise does that a fit takes it for, but the
/// power it leaves in the bins about it is exact wherever it lies between them (Parseval), and so is their centre. What lies beside it is taken off.
fn tone(data: &Data, sensor: usize, at: usize) -> Option<(f64, f64)> {
    let reach = LOBE as usize;
    let power = |j: usize| data.at(j)[sensor * data.sensors + sensor].re;
    let last = data.bins.count().checked_sub(1)?;
    let around = |j: usize, by: usize| j.saturating_sub(by)..=(j + by).min(last);
    let top = around(at, reach).max_by(|a, b| power(*a).total_cmp(&power(*b)))?;
    let mut beside: Vec<f64> = around(top, 2 * reach)
        .filter(|j| j.abs_diff(top) > reach)
        .map(power)
        .collect();
    beside.sort_by(f64::total_cmp);
    let background = beside.get(beside.len() / 2).copied()?;
    let (mut sum, mut moment) = (0.0, 0.0);
    for j in around(top, reach) {
        let own = power(j) - background;
        sum += own;
        moment += own * data.bins.frequency(j);
    }
    (sum > 0.0).then(|| (sum * data.bins.width(), moment / sum))
}
