//! An axis: value to position, and where its ticks stand.

use plotters::coord::ranged1d::{KeyPointHint, Ranged};
use plotters::coord::types::RangedCoordf64;

use super::DrawError;
use super::text::{tick_labels, tidy};

/// Spacing of an axis.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Scale {
    /// Equal steps for equal differences.
    #[default]
    Linear,
    /// Equal steps for equal ratios; samples must be positive.
    Logarithmic,
}

/// What an axis shows.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Axis {
    /// The quantity, without unit.
    pub label: String,
    /// The unit its values are scaled to; empty for a pure number.
    pub unit: String,
    /// Spacing.
    pub scale: Scale,
}

impl Axis {
    /// A linear axis.
    pub fn new(label: impl Into<String>, unit: impl Into<String>) -> Self {
        Axis {
            label: label.into(),
            unit: unit.into(),
            scale: Scale::Linear,
        }
    }

    /// "label (unit)", or the label alone for a pure number.
    pub(super) fn caption(&self) -> String {
        caption(&self.label, &self.unit)
    }
}

/// "label (unit)", or the label alone for a pure number.
pub(super) fn caption(label: &str, unit: &str) -> String {
    let (label, unit) = (tidy(label), tidy(unit));
    if unit.is_empty() {
        label
    } else {
        format!("{label} ({unit})")
    }
}

/// An interval of values laid on an interval of px.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Span {
    low: f64,
    high: f64,
    scale: Scale,
    start: f64,
    end: f64,
    /// The one sample, where there is only one.
    only: Option<f64>,
}

/// A tick: its position in px and its label.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Tick {
    pub at: f64,
    pub label: String,
}

impl Span {
    /// Puts `low` at `start` and `high` at `end`; a single value is given room on both sides.
    pub fn new(low: f64, high: f64, scale: Scale, start: f64, end: f64) -> Self {
        let only = (low == high).then_some(low);
        let (low, high) = match scale {
            _ if high > low => (low, high),
            Scale::Logarithmic => (low / 2.0, low * 2.0),
            Scale::Linear if low == 0.0 => (-0.5, 0.5),
            Scale::Linear => (low - 0.1 * low.abs(), low + 0.1 * low.abs()),
        };
        Span {
            low,
            high,
            scale,
            start,
            end,
            only,
        }
    }

    pub fn at(&self, value: f64) -> f64 {
        let fraction = match self.scale {
            Scale::Linear => (value - self.low) / (self.high - self.low),
            Scale::Logarithmic => (value / self.low).ln() / (self.high / self.low).ln(),
        };
        self.start + fraction * (self.end - self.start)
    }

    pub fn covers(&self, value: f64) -> bool {
        (self.low..=self.high).contains(&value)
    }

    /// Ticks at round values, at most one for each `room` px.
    pub fn ticks(&self, room: f64) -> Vec<Tick> {
        let most = (((self.end - self.start).abs() / room).floor() as usize).max(3);
        let values: Vec<f64> = match (self.only, self.scale) {
            (Some(value), _) => vec![value],
            (None, Scale::Linear) => round_values(self.low, self.high, most),
            (None, Scale::Logarithmic) => decade_values(self.low, self.high, most),
        };
        let slack = 1e-9 * (self.high - self.low);
        let inside = |v: &f64| (self.low - slack..=self.high + slack).contains(v);
        let values: Vec<f64> = values.into_iter().filter(inside).collect();
        let labels = match self.scale {
            Scale::Linear => tick_labels(&values),
            Scale::Logarithmic => values.iter().flat_map(|&v| tick_labels(&[v])).collect(),
        };
        let place = |(&v, label): (&f64, String)| Tick {
            at: self.at(v),
            label,
        };
        values.iter().zip(labels).map(place).collect()
    }
}

/// At most `most` round values (1, 2 or 5 times a power of ten apart) in `low..=high`.
pub(super) fn round_values(low: f64, high: f64, most: usize) -> Vec<f64> {
    // plotters compares with an absolute epsilon and adds its steps up: ask it about an interval
    // of ordinary size, then count in whole steps.
    let size = 10f64.powf(low.abs().max(high.abs()).max(high - low).log10().floor());
    let coord: RangedCoordf64 = (low / size..high / size).into();
    let points = coord.key_points(KeyPointHintOf(most));
    let step = match points.as_slice() {
        [a, b, ..] => b - a,
        _ => return points.into_iter().map(|p| p * size).collect(),
    };
    let power = 10f64.powf(step.log10().round());
    let step = [0.2, 0.5, 1.0, 2.0, 5.0]
        .map(|m| m * power)
        .into_iter()
        .min_by(|a, b| (a - step).abs().total_cmp(&(b - step).abs()))
        .unwrap_or(step)
        * size;
    let slack = 1e-9 * (high - low);
    let first = ((low - slack) / step).ceil() as i64;
    let last = ((high + slack) / step).floor() as i64;
    (first..=last)
        .map(|k| (k as f64 * step).clamp(low, high))
        .collect()
}

/// Powers of ten in `low..=high`, with their 2- and 5-fold, or all multiples, as far as `most` allows.
fn decade_values(low: f64, high: f64, most: usize) -> Vec<f64> {
    let slack = 1e-9;
    let decades = low.log10().floor() as i32..=high.log10().ceil() as i32;
    let among = |multiples: &[f64]| -> Vec<f64> {
        let all = decades
            .clone()
            .flat_map(|k| multiples.iter().map(move |m| m * 10f64.powi(k)));
        all.filter(|v| (low * (1.0 - slack)..=high * (1.0 + slack)).contains(v))
            .collect()
    };
    let choices: [&[f64]; 3] = [
        &[1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0, 9.0],
        &[1.0, 2.0, 5.0],
        &[1.0],
    ];
    let fitting = choices.iter().map(|c| among(c)).find(|v| v.len() <= most);
    let sparse = || {
        let powers = among(&[1.0]);
        let stride = powers.len().div_ceil(most.max(1)).max(1);
        powers.into_iter().step_by(stride).collect()
    };
    fitting.unwrap_or_else(sparse)
}

struct KeyPointHintOf(usize);

impl KeyPointHint for KeyPointHintOf {
    fn max_num_points(&self) -> usize {
        self.0
    }
    fn weight(&self) -> plotters::coord::ranged1d::KeyPointWeight {
        plotters::coord::ranged1d::KeyPointWeight::Any
    }
    fn bold_points(&self) -> usize {
        self.0
    }
}

/// Checks that samples are finite, strictly increasing and fit for the scale.
pub(super) fn check_samples(
    axis: &'static str,
    samples: &[f64],
    scale: Scale,
) -> Result<(), DrawError> {
    let first = *samples.first().ok_or(DrawError::NoSamples { axis })?;
    let mut before = f64::NEG_INFINITY;
    for (index, &value) in samples.iter().enumerate() {
        if !value.is_finite() || value <= before {
            return Err(DrawError::Samples { axis, index, value });
        }
        before = value;
    }
    if scale == Scale::Logarithmic && first <= 0.0 {
        return Err(DrawError::NotPositive { axis, value: first });
    }
    Ok(())
}
