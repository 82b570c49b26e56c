//! A record as analysed: levels, spectra, peaks with what they are, and how its channels hang together.

mod csv;
mod fields;
mod figure;
mod lines;

pub use lines::LinesReport;

use super::table::{Lean, Table};
use super::{Heading, closing, counted};
use crate::measured::Interval;
use crate::measured::nature::Verdict;
use crate::measured::peaks::Peak;
use crate::network::Network;
use crate::network::sensors::Sensor;
use crate::problems::Problem;
use crate::studies::record::{Studied, Survey};
use crate::units::{Dimension, write_decimals, write_rounded};

/// A record to report.
#[derive(Clone, Copy, Debug)]
pub struct SpectrumReport<'a> {
    /// The network its sensors sit in, where one is named.
    pub network: Option<(&'a Network, Heading<'a>)>,
    /// The record.
    pub survey: &'a Survey,
    /// What qualifies it.
    pub warnings: &'a [Problem],
}

/// What a peak is taken for.
fn verdict(v: Verdict) -> &'static str {
    match v {
        Verdict::Noise => "resonance driven by noise",
        Verdict::Cycle => "self-sustained cycle",
        Verdict::Undecided => "undecided",
    }
}

/// A number to so many significant digits.
fn significant(x: f64, digits: usize) -> String {
    write_rounded(x, Dimension::Number, digits)
}

/// A value with its 95 % interval, to the digits that the interval leaves.
fn with_interval(i: &Interval) -> String {
    let half = 0.5 * i.width();
    let decimals = (1.0 - half.max(1e-9).log10().floor()).clamp(0.0, 6.0) as usize;
    let w = |x: f64| write_decimals(x, decimals);
    format!("{} ({} to {})", w(i.value), w(i.low), w(i.high))
}

impl SpectrumReport<'_> {
    /// The sensor of a channel.
    fn sensor(&self, channel: &Studied) -> Option<(&Network, &Sensor)> {
        let (network, _) = self.network?;
        let mut sensors = network.layout.sensors.iter();
        Some((network, sensors.find(|s| s.name == channel.signal.name)?))
    }

    fn heading(&self) -> Heading<'_> {
        let none = Heading {
            network: "",
            title: "",
        };
        self.network.map_or(none, |(_, heading)| heading)
    }

    /// A peak's rms as it was at the wall.
    fn corrected(channel: &Studied, peak: &Peak) -> Interval {
        let gain = channel.correction.at(peak.frequency.value).norm();
        Interval {
            value: peak.rms.value / gain,
            low: peak.rms.low / gain,
            high: peak.rms.high / gain,
        }
    }

    /// For people.
    pub fn text(&self) -> String {
        let survey = self.survey;
        let mut text = String::new();
        if let Some((_, heading)) = &self.network {
            text.push_str(&heading.text());
            text.push('\n');
        }
        text.push_str(&format!(
            "Record {} ({}): {} at {} Hz, {:.3} s from {} s on\n",
            super::problems::visible(&survey.file),
            survey.format.noun(),
            counted(survey.channels.len(), "channel"),
            survey.spectra.plan().rate_hz,
            survey.duration(),
            significant(survey.start, 9)
        ));
        for note in &survey.notes {
            text.push_str(&format!("  \"{}\"\n", super::problems::visible(note)));
        }
        text.push_str(&format!("\n{}\n\n", self.how()));
        text.push_str(&self.levels());
        text.push_str(&self.peaks());
        text.push_str(&self.together());
        if !survey.pairs.is_empty() {
            text.push_str(&self.relations());
        }
        text.push_str(&closing(self.warnings));
        text
    }

    /// How the spectra were made, in a sentence.
    fn how(&self) -> String {
        let spectra = &self.survey.spectra;
        let plan = spectra.plan();
        let (low, high) = spectra.band(self.survey.bins().start.max(1));
        format!(
            "Welch power density: {} window of {} samples ({} s), overlap {:.0} %, mean of each segment taken out,\n\
             {} worth {} independent averages; bins {} Hz apart, resolution {} Hz.\n\
             95 % band of a density: {} to {} times the estimate.",
            plan.window.noun(),
            plan.segment,
            significant(plan.segment as f64 / plan.rate_hz, 4),
            100.0 * plan.overlap as f64 / plan.segment as f64,
            counted(spectra.segments(), "segment"),
            write_decimals(spectra.averages(), 1),
            significant(plan.bin_width(), 4),
            significant(plan.resolution(), 4),
            write_decimals(low, 2),
            write_decimals(high, 2),
        )
    }

    fn levels(&self) -> String {
        use Lean::{Left, Right};
        let mut table = Table::new(&[Left, Left, Left, Right, Right, Right, Right, Right]);
        table.heading(&[
            "channel",
            "unit",
            "sensor",
            "mean",
            "rms about",
            "lowest",
            "highest",
            "kurtosis",
        ]);
        table.heading(&["", "", "", "", "the mean", "", "", ""]);
        for channel in &self.survey.channels {
            let level = &channel.level;
            let digits = |x: f64| significant(x, 4);
            table.row(vec![
                super::problems::visible(&channel.signal.name),
                channel.signal.quantity.unit().to_owned(),
                self.place(channel),
                digits(level.mean),
                digits(level.deviation()),
                digits(level.lowest.0),
                digits(level.highest.0),
                if level.constant() {
                    "none".to_owned()
                } else {
                    write_decimals(level.kurtosis(), 2)
                },
            ]);
        }
        format!("{}\n", table.text())
    }

    /// Where a channel's sensor sits.
    fn place(&self, channel: &Studied) -> String {
        let Some((network, sensor)) = self.sensor(channel) else {
            return "-".to_owned();
        };
        let element = network.layout.elements.get(sensor.element.0);
        let distance = write_rounded(network.values[sensor.distance], Dimension::Length, 4);
        let recess = if sensor.recess.is_some() {
            ", recessed"
        } else {
            ""
        };
        format!("{} at {distance}{recess}", element.map_or("", |e| &e.name))
    }

    fn peaks(&self) -> String {
        use Lean::{Left, Right};
        let (low, high) = self.survey.band;
        let title = format!(
            "Peaks, {} to {} Hz, with 95 % intervals",
            significant(low, 4),
            significant(high, 4)
        );
        let mut table = Table::new(&[Left, Right, Right, Right, Right, Left]);
        table.heading(&[
            "channel",
            "frequency",
            "rms",
            "full width at",
            "decay rate",
            "evidence: envelope",
        ]);
        table.heading(&[
            "",
            "Hz",
            "",
            "half power, Hz",
            "1/s",
            "ratio (noise 2, cycle 1)",
        ]);
        let mut any = false;
        for channel in &self.survey.channels {
            let Ok(found) = &channel.peaks else { continue };
            for (peak, evidence) in found.peaks.iter().zip(&channel.evidence) {
                any = true;
                let bounded = |i: &Interval| match peak.resolved {
                    true => with_interval(i),
                    false => format!("below {}", significant(i.high, 2)),
                };
                let refused = match channel.clipped {
                    0 => "not weighed".to_owned(),
                    n => format!(
                        "not weighed: {n} samples are clipped, and a clipped envelope is steady"
                    ),
                };
                let told = evidence.as_ref().map_or(refused, |e| {
                    format!(
                        "{}: {} from {} independent, log-likelihood gain {}",
                        verdict(e.verdict),
                        write_decimals(e.ratio, 2),
                        write_decimals(e.independent, 0),
                        write_decimals(e.gain, 1)
                    )
                });
                let unit = channel.signal.quantity.unit();
                table.row(vec![
                    super::problems::visible(&channel.signal.name),
                    with_interval(&peak.frequency),
                    format!("{} {unit}", with_interval(&Self::corrected(channel, peak))),
                    bounded(&peak.width),
                    bounded(&peak.decay),
                    told,
                ]);
            }
        }
        if !any {
            return format!("{title}: none stands out.\n");
        }
        let corrected = match self.survey.channels.iter().any(|c| c.correction.any()) {
            true => {
                "\nAmplitudes and densities are those at the wall, corrected for recess and transducer.\n"
            }
            false => "",
        };
        format!("{title}\n\n{}{corrected}", table.text())
    }

    /// Peaks that the channels of pressure share.
    fn together(&self) -> String {
        use Lean::{Left, Right};
        let Some((channels, found)) = &self.survey.together else {
            return String::new();
        };
        let mut table = Table::new(&[Right, Right, Right, Left]);
        table.heading(&[
            "frequency",
            "full width at",
            "decay rate",
            "loudest, rms there",
        ]);
        table.heading(&["Hz", "half power, Hz", "1/s", ""]);
        for peak in &found.peaks {
            let Some(loudest) = channels
                .get(peak.loudest)
                .and_then(|i| self.survey.channels.get(*i))
            else {
                continue;
            };
            let bounded = |i: &Interval| match peak.resolved {
                true => with_interval(i),
                false => format!("below {}", significant(i.high, 2)),
            };
            table.row(vec![
                with_interval(&peak.frequency),
                bounded(&peak.width),
                bounded(&peak.decay),
                format!(
                    "{}, {} {}",
                    super::problems::visible(&loudest.signal.name),
                    with_interval(&Self::corrected(loudest, peak)),
                    loudest.signal.quantity.unit()
                ),
            ]);
        }
        if found.peaks.is_empty() {
            return String::new();
        }
        format!(
            "\nModes that the {} share, fitted to all of them together, with 95 % intervals: one that a neighbour hides\n\
             at one place its shape may tell; rely on these frequencies and decay rates rather than on those of one channel\n\n{}",
            format_args!("{} channels of pressure", channels.len()),
            table.text()
        )
    }

    /// Coherence and phase of every pair at the peaks of its first channel.
    fn relations(&self) -> String {
        use Lean::{Left, Right};
        let mut table = Table::new(&[Left, Right, Right, Right, Right]);
        table.heading(&[
            "pair",
            "frequency",
            "coherence",
            "gain",
            "phase of the second",
        ]);
        table.heading(&["", "Hz", "", "", "after the first, deg"]);
        let mut any = false;
        for row in self.at_peaks() {
            any = true;
            let (gain, phase) = (row.relation.gain(), row.relation.phase_interval());
            let degrees = |x: f64| write_decimals(x.to_degrees(), 1);
            let coherent = row.relation.coherence > row.relation.chance_coherence;
            table.row(vec![
                format!("{} to {}", row.first, row.second),
                write_decimals(row.frequency, 2),
                format!(
                    "{}{}",
                    write_decimals(row.relation.coherence, 3),
                    if coherent { "" } else { " (chance)" }
                ),
                if coherent {
                    with_interval(&gain)
                } else {
                    "-".to_owned()
                },
                if coherent {
                    format!(
                        "{} ({} to {})",
                        degrees(phase.value),
                        degrees(phase.low),
                        degrees(phase.high)
                    )
                } else {
                    "-".to_owned()
                },
            ]);
        }
        if !any {
            return String::new();
        }
        format!(
            "\nChannels together at the peaks, with 95 % intervals\n\n{}",
            table.text()
        )
    }
}
