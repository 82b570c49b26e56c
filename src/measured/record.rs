//! A record: channels sampled together at one rate.

use crate::problems::{Problem, Problems};

/// What a channel measures, after calibration.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Quantity {
    /// Pressure fluctuation (Pa).
    Pressure,
    /// Velocity (m/s).
    Velocity,
    /// Light of the flame, in the unit of its detector: in proportion to heat release only where the
    /// flame is fully premixed.
    Light,
    /// Heat release (W).
    HeatRelease,
    /// Voltage (V), of an excitation signal or of a sensor without calibration.
    Voltage,
    /// A number without unit.
    Number,
}

impl Quantity {
    /// The SI unit samples are in; `1` where there is none.
    pub fn unit(self) -> &'static str {
        match self {
            Quantity::Pressure => "Pa",
            Quantity::Velocity => "m/s",
            Quantity::HeatRelease => "W",
            Quantity::Voltage => "V",
            Quantity::Light | Quantity::Number => "1",
        }
    }

    /// The word for it.
    pub fn noun(self) -> &'static str {
        match self {
            Quantity::Pressure => "pressure",
            Quantity::Velocity => "velocity",
            Quantity::Light => "light",
            Quantity::HeatRelease => "heat release",
            Quantity::Voltage => "voltage",
            Quantity::Number => "number",
        }
    }
}

/// One channel of a record.
#[derive(Clone, Debug, PartialEq)]
pub struct Channel {
    /// Its name, one of its kind in the record.
    pub name: String,
    /// What it measures.
    pub quantity: Quantity,
    /// Samples in the SI unit of the quantity.
    pub samples: Vec<f64>,
}

/// Channels sampled together.
#[derive(Clone, Debug, PartialEq)]
pub struct Record {
    /// Sampling rate (Hz).
    pub rate_hz: f64,
    /// Time of the first sample (s), on the record's own clock.
    pub start: f64,
    /// The channels, each of the same length.
    pub channels: Vec<Channel>,
}

impl Record {
    /// Number of samples of each channel.
    pub fn len(&self) -> usize {
        self.channels.first().map_or(0, |c| c.samples.len())
    }

    /// Whether there is no sample.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Duration (s).
    pub fn duration(&self) -> f64 {
        self.len() as f64 / self.rate_hz
    }

    /// The samples of each channel, as the accumulators take them.
    pub fn blocks(&self) -> Vec<&[f64]> {
        self.channels.iter().map(|c| c.samples.as_slice()).collect()
    }

    /// Every fault that forbids an analysis: a rate that is none, channels of unequal length, no
    /// samples, samples that are not finite (first place and count of each channel).
    ///
    /// # Errors
    /// Where there is at least one.
    pub fn check(&self) -> Result<(), Problems> {
        let mut problems = Problems::new();
        if !(self.rate_hz.is_finite() && self.rate_hz > 0.0) {
            problems.push(
                Problem::error(
                    "record.rate",
                    format!("a sampling rate of {} Hz is none", self.rate_hz),
                )
                .hint("state how many samples each second has"),
            );
        }
        if self.is_empty() {
            problems.push(Problem::error("record", "the record has no samples"));
        }
        let length = self.len();
        for (i, channel) in self.channels.iter().enumerate() {
            let n = channel.samples.len();
            if n != length {
                let what = format!("has {n} samples where the first channel has {length}");
                problems.push(
                    Problem::error(channel.name.clone(), what)
                        .hint("every channel of a record is sampled at the same instants"),
                );
            }
            if self.channels[..i].iter().any(|c| c.name == channel.name) {
                problems.push(
                    Problem::error(channel.name.clone(), "two channels have this name")
                        .hint("give each a name of its own"),
                );
            }
            let bad = channel.samples.iter().filter(|x| !x.is_finite()).count();
            if let Some(first) = channel.samples.iter().position(|x| !x.is_finite()) {
                let time = self.start + first as f64 / self.rate_hz;
                let what = format!(
                    "{bad} of {n} samples are not finite, the first at sample {} ({time:.6} s)",
                    first + 1
                );
                problems.push(
                    Problem::error(channel.name.clone(), what).hint(
                        "cut the record there: a gap cannot be filled without inventing data",
                    ),
                );
            }
        }
        if problems.any_error() {
            return Err(problems);
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn channel(name: &str, samples: &[f64]) -> Channel {
        Channel {
            name: name.to_owned(),
            quantity: Quantity::Pressure,
            samples: samples.to_vec(),
        }
    }

    #[test]
    fn every_fault_is_told_at_once() {
        let record = Record {
            rate_hz: f64::NAN,
            start: 0.0,
            channels: vec![
                channel("a", &[0.0, 1.0]),
                channel("a", &[0.0]),
                channel("b", &[0.0, f64::INFINITY]),
            ],
        };
        let told = record.check().unwrap_err();
        assert_eq!(told.0.len(), 4, "{told}");
        let sound = Record {
            rate_hz: 10.0,
            start: 0.0,
            channels: vec![channel("a", &[0.0, 1.0])],
        };
        assert!(sound.check().is_ok());
        assert_eq!(sound.duration(), 0.2);
    }
}
