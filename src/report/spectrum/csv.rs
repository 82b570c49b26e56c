//! The tables of a record as CSV, in SI, and its channels in pairs.

use std::io;

use serde::Serialize;

use super::{SpectrumReport, verdict};
use crate::measured::{Interval, Relation};
use crate::report::csv_of;

/// A pair of channels at a peak of the first.
pub(super) struct AtPeak<'a> {
    pub pair: (usize, usize),
    pub first: &'a str,
    pub second: &'a str,
    pub frequency: f64,
    pub relation: Relation,
}

#[derive(Serialize)]
struct PeakRow<'a> {
    channel: &'a str,
    unit: &'static str,
    frequency_hz: f64,
    frequency_low_hz: f64,
    frequency_high_hz: f64,
    rms: f64,
    rms_low: f64,
    rms_high: f64,
    width_hz: f64,
    width_low_hz: f64,
    width_high_hz: f64,
    decay_rate_per_s: f64,
    decay_rate_low_per_s: f64,
    decay_rate_high_per_s: f64,
    resolved: bool,
    verdict: &'static str,
    envelope_ratio: Option<f64>,
    log_likelihood_gain: Option<f64>,
    independent_observations: Option<f64>,
}

impl SpectrumReport<'_> {
    /// The relation of two channels at every bin of the band, corrected.
    pub(super) fn related(&self, a: usize, b: usize) -> Option<Vec<Relation>> {
        let survey = self.survey;
        let mut all = survey.spectra.relation(a, b)?;
        let of = |i: usize| survey.channels.get(i).map(|c| &c.correction);
        let (x, y) = (of(a)?, of(b)?);
        for (j, r) in all.iter_mut().enumerate().filter(|_| x.any() || y.any()) {
            let f = survey.spectra.frequency(j);
            let ratio = x.at(f) / y.at(f);
            r.transfer *= ratio;
            r.radius *= ratio.norm();
            r.phase = r.transfer.arg();
        }
        Some(all.get(survey.bins())?.to_vec())
    }

    /// Every pair at the peaks of its first channel.
    pub(super) fn at_peaks(&self) -> Vec<AtPeak<'_>> {
        let survey = self.survey;
        let bins = survey.bins();
        let mut found = Vec::new();
        for &(a, b) in &survey.pairs {
            let (Some(first), Some(second)) = (survey.channels.get(a), survey.channels.get(b))
            else {
                continue;
            };
            if first.level.constant() || second.level.constant() {
                continue;
            }
            let Some(rows) = self.related(a, b) else {
                continue;
            };
            for peak in first.peaks.iter().flat_map(|p| &p.peaks) {
                let bin =
                    (peak.frequency.value / survey.spectra.plan().bin_width()).round() as usize;
                let Some(relation) = bin.checked_sub(bins.start).and_then(|j| rows.get(j)) else {
                    continue;
                };
                found.push(AtPeak {
                    pair: (a, b),
                    first: &first.signal.name,
                    second: &second.signal.name,
                    frequency: survey.spectra.frequency(bin),
                    relation: *relation,
                });
            }
        }
        found
    }

    /// The peaks.
    ///
    /// # Errors
    /// Where a row cannot be written.
    pub fn peaks_csv(&self) -> io::Result<Vec<u8>> {
        let mut rows = Vec::new();
        for channel in &self.survey.channels {
            let peaks = channel.peaks.iter().flat_map(|p| &p.peaks);
            for (peak, evidence) in peaks.zip(&channel.evidence) {
                let rms = Self::corrected(channel, peak);
                let ends = |i: &Interval| (i.value, i.low, i.high);
                let (frequency_hz, frequency_low_hz, frequency_high_hz) = ends(&peak.frequency);
                let (width_hz, width_low_hz, width_high_hz) = ends(&peak.width);
                let (decay_rate_per_s, decay_rate_low_per_s, decay_rate_high_per_s) =
                    ends(&peak.decay);
                rows.push(PeakRow {
                    channel: &channel.signal.name,
                    unit: channel.signal.quantity.unit(),
                    frequency_hz,
                    frequency_low_hz,
                    frequency_high_hz,
                    rms: rms.value,
                    rms_low: rms.low,
                    rms_high: rms.high,
                    width_hz,
                    width_low_hz,
                    width_high_hz,
                    decay_rate_per_s,
                    decay_rate_low_per_s,
                    decay_rate_high_per_s,
                    resolved: peak.resolved,
                    verdict: evidence.map_or("not weighed", |e| verdict(e.verdict)),
                    envelope_ratio: evidence.map(|e| e.ratio),
                    log_likelihood_gain: evidence.map(|e| e.gain),
                    independent_observations: evidence.map(|e| e.independent),
                });
            }
        }
        csv_of(rows)
    }

    /// Densities with their bands, and coherence and phase of every pair, a row for each bin.
    ///
    /// # Errors
    /// Where a row cannot be written.
    pub fn spectra_csv(&self) -> io::Result<Vec<u8>> {
        let survey = self.survey;
        let mut head = vec!["frequency_hz".to_owned()];
        for channel in &survey.channels {
            let (name, unit) = (&channel.signal.name, channel.signal.quantity.unit());
            let squared = if unit == "1" {
                "1/Hz".to_owned()
            } else {
                format!("({unit})^2/Hz")
            };
            head.extend(["", " low", " high"].map(|end| format!("{name}{end} [{squared}]")));
        }
        let pairs: Vec<_> = (survey.pairs.iter())
            .filter_map(|&(a, b)| Some(((a, b), self.related(a, b)?)))
            .collect();
        let name = |i: usize| {
            survey
                .channels
                .get(i)
                .map_or("", |c| c.signal.name.as_str())
        };
        for ((a, b), _) in &pairs {
            let of = format!("{} to {}", name(*a), name(*b));
            head.extend([
                format!("coherence {of}"),
                format!("coherence by chance {of}"),
                format!("phase {of} [rad]"),
            ]);
        }
        let mut writer = csv::Writer::from_writer(Vec::new());
        let fail = io::Error::other;
        writer.write_record(&head).map_err(fail)?;
        for (k, j) in survey.bins().enumerate() {
            let mut row = vec![survey.spectra.frequency(j).to_string()];
            let (low, high) = survey.spectra.band(j);
            for i in 0..survey.channels.len() {
                let p = survey.density(i, j);
                row.extend([p, p * low, p * high].map(|x| x.to_string()));
            }
            for (_, relations) in &pairs {
                if let Some(r) = relations.get(k) {
                    row.extend([r.coherence, r.chance_coherence, r.phase].map(|x| x.to_string()));
                }
            }
            writer.write_record(&row).map_err(fail)?;
        }
        writer
            .into_inner()
            .map_err(|e| io::Error::other(e.to_string()))
    }

    /// The spectrogram of a channel: a row for each time, a column for each bin of the band.
    ///
    /// # Errors
    /// Where a row cannot be written.
    pub fn spectrogram_csv(&self, channel: usize) -> io::Result<Vec<u8>> {
        let mut writer = csv::Writer::from_writer(Vec::new());
        let fail = io::Error::other;
        let (frequencies, columns) = self.waterfall(channel);
        let head = frequencies.iter().map(|f| format!("{f} Hz"));
        writer
            .write_record(std::iter::once("time_s".to_owned()).chain(head))
            .map_err(fail)?;
        for (time, densities) in columns {
            let row = std::iter::once(time.to_string());
            writer
                .write_record(row.chain(densities.iter().map(|d| format!("{d:.6e}"))))
                .map_err(fail)?;
        }
        writer
            .into_inner()
            .map_err(|e| io::Error::other(e.to_string()))
    }

    /// Frequencies of the band and, for each row, its time and corrected densities.
    pub(super) fn waterfall(&self, channel: usize) -> (Vec<f64>, Vec<(f64, Vec<f64>)>) {
        let survey = self.survey;
        let width = survey.row_plan.0.bin_width();
        let first = ((survey.band.0 / width).ceil() as usize).max(1);
        let last = ((survey.band.1 / width).floor() as usize).min(survey.row_plan.0.bins() - 1);
        let frequencies: Vec<f64> = (first..=last).map(|j| j as f64 * width).collect();
        let gains: Vec<f64> = match survey.channels.get(channel) {
            Some(c) => frequencies
                .iter()
                .map(|f| c.correction.at(*f).norm_sqr())
                .collect(),
            None => Vec::new(),
        };
        let rows = survey.rows.get(channel).map_or(&[][..], Vec::as_slice);
        let told = rows.iter().map(|row| {
            let part = row.density.get(first..=last).unwrap_or_default();
            let corrected = part.iter().zip(&gains).map(|(d, g)| d / g).collect();
            (survey.start + row.time, corrected)
        });
        (frequencies, told.collect())
    }
}
