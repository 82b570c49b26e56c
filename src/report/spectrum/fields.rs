//! The report of a record in JSON.

use serde::Serialize;

use super::{SpectrumReport, verdict};
use crate::measured::Interval;
use crate::measured::nature::Evidence;
use crate::measured::peaks::Peak;
use crate::report::Document;
use crate::studies::record::Studied;

/// A number, where it is one.
fn finite(x: f64) -> Option<f64> {
    Some(x).filter(|x| x.is_finite())
}

#[derive(Clone, Copy, Debug, Serialize)]
pub(super) struct IntervalFields {
    value: Option<f64>,
    low: Option<f64>,
    high: Option<f64>,
}

impl From<&Interval> for IntervalFields {
    fn from(i: &Interval) -> Self {
        IntervalFields {
            value: finite(i.value),
            low: finite(i.low),
            high: finite(i.high),
        }
    }
}

#[derive(Clone, Debug, Serialize)]
struct EvidenceFields {
    verdict: &'static str,
    envelope_ratio: Option<f64>,
    kurtosis: Option<f64>,
    log_deficit: Option<f64>,
    log_likelihood_gain: Option<f64>,
    independent_observations: Option<f64>,
    phase_coherence: Option<f64>,
    width_in_resolutions: Option<f64>,
    bandwidth_hz: f64,
}

impl From<&Evidence> for EvidenceFields {
    fn from(e: &Evidence) -> Self {
        EvidenceFields {
            verdict: verdict(e.verdict),
            envelope_ratio: finite(e.ratio),
            kurtosis: finite(e.kurtosis),
            log_deficit: finite(e.log_deficit),
            log_likelihood_gain: finite(e.gain),
            independent_observations: finite(e.independent),
            phase_coherence: finite(e.coherence),
            width_in_resolutions: finite(e.width_in_resolutions),
            bandwidth_hz: e.bandwidth,
        }
    }
}

#[derive(Clone, Debug, Serialize)]
struct PeakFields {
    frequency_hz: IntervalFields,
    rms: IntervalFields,
    full_width_at_half_power_hz: IntervalFields,
    decay_rate_per_s: IntervalFields,
    share_of_power: Option<f64>,
    separation: Option<f64>,
    resolved: bool,
    divided_by: Option<f64>,
    evidence: Option<EvidenceFields>,
}

impl PeakFields {
    fn new(channel: &Studied, peak: &Peak, evidence: Option<&Evidence>) -> Self {
        PeakFields {
            frequency_hz: (&peak.frequency).into(),
            rms: (&SpectrumReport::corrected(channel, peak)).into(),
            full_width_at_half_power_hz: (&peak.width).into(),
            decay_rate_per_s: (&peak.decay).into(),
            share_of_power: finite(peak.share),
            separation: finite(peak.separation),
            resolved: peak.resolved,
            divided_by: finite(channel.correction.at(peak.frequency.value).norm()),
            evidence: evidence.map(Into::into),
        }
    }
}

#[derive(Clone, Debug, Serialize)]
struct SensorFields<'a> {
    element: &'a str,
    distance_m: f64,
    recess_length_m: Option<f64>,
}

#[derive(Clone, Debug, Serialize)]
struct ChannelFields<'a> {
    name: &'a str,
    quantity: &'static str,
    unit: &'static str,
    written_in: &'a str,
    factor: f64,
    sensor: Option<SensorFields<'a>>,
    mean: Option<f64>,
    rms_about_mean: Option<f64>,
    lowest: Option<f64>,
    highest: Option<f64>,
    skewness: Option<f64>,
    kurtosis: Option<f64>,
    clipped_samples: u64,
    corrected: bool,
    fit_misfit: Option<f64>,
    peaks: Vec<PeakFields>,
    density: Vec<f64>,
}

#[derive(Clone, Debug, Serialize)]
struct PairFields<'a> {
    first: &'a str,
    second: &'a str,
    coherence: Vec<f64>,
    phase_rad: Vec<f64>,
    at_peaks: Vec<AtPeak>,
}

#[derive(Clone, Debug, Serialize)]
struct AtPeak {
    frequency_hz: f64,
    coherence: f64,
    coherence_by_chance: f64,
    gain: IntervalFields,
    phase_rad: IntervalFields,
}

#[derive(Clone, Debug, Serialize)]
struct RecordFields<'a> {
    file: &'a str,
    format: &'static str,
    notes: &'a [String],
    rate_hz: f64,
    start_s: f64,
    duration_s: f64,
    samples: u64,
}

#[derive(Clone, Debug, Serialize)]
struct AnalysisFields {
    window: &'static str,
    segment_samples: usize,
    overlap_samples: usize,
    segments: usize,
    independent_averages: f64,
    relative_deviation: f64,
    bin_width_hz: f64,
    resolution_hz: f64,
    density_low_factor: f64,
    density_high_factor: f64,
    band_hz: (f64, f64),
}

#[derive(Clone, Debug, Serialize)]
struct Body<'a> {
    record: RecordFields<'a>,
    analysis: AnalysisFields,
    channels: Vec<ChannelFields<'a>>,
    together: Option<TogetherFields<'a>>,
    frequency_hz: Vec<f64>,
    pairs: Vec<PairFields<'a>>,
}

/// What channels of pressure share.
#[derive(Clone, Debug, Serialize)]
struct TogetherFields<'a> {
    channels: Vec<&'a str>,
    fit_misfit: Option<f64>,
    peaks: Vec<SharedPeak<'a>>,
}

#[derive(Clone, Debug, Serialize)]
struct SharedPeak<'a> {
    loudest: &'a str,
    #[serde(flatten)]
    peak: PeakFields,
}

impl SpectrumReport<'_> {
    /// As JSON.
    ///
    /// # Errors
    /// Where it has no form in JSON.
    pub fn json(&self) -> std::io::Result<String> {
        let survey = self.survey;
        let (spectra, plan) = (&survey.spectra, survey.spectra.plan());
        let (low, high) = spectra.band(survey.bins().start.max(1));
        let body = Body {
            record: RecordFields {
                file: &survey.file,
                format: survey.format.noun(),
                notes: &survey.notes,
                rate_hz: plan.rate_hz,
                start_s: survey.start,
                duration_s: survey.duration(),
                samples: survey.samples,
            },
            analysis: AnalysisFields {
                window: plan.window.noun(),
                segment_samples: plan.segment,
                overlap_samples: plan.overlap,
                segments: spectra.segments(),
                independent_averages: spectra.averages(),
                relative_deviation: spectra.random_error(),
                bin_width_hz: plan.bin_width(),
                resolution_hz: plan.resolution(),
                density_low_factor: low,
                density_high_factor: high,
                band_hz: survey.band,
            },
            channels: (0..survey.channels.len())
                .filter_map(|i| self.channel(i))
                .collect(),
            together: self.shared(),
            frequency_hz: survey.bins().map(|j| spectra.frequency(j)).collect(),
            pairs: (0..survey.pairs.len())
                .filter_map(|i| self.pair(i))
                .collect(),
        };
        Document::new("stillflame/spectrum", &self.heading(), body, self.warnings).to_json()
    }

    fn shared(&self) -> Option<TogetherFields<'_>> {
        let (channels, found) = self.survey.together.as_ref()?;
        let at = |i: &usize| self.survey.channels.get(*i);
        let peak = |peak: &Peak| {
            let loudest = channels.get(peak.loudest).and_then(at)?;
            Some(SharedPeak {
                loudest: &loudest.signal.name,
                peak: PeakFields::new(loudest, peak, None),
            })
        };
        Some(TogetherFields {
            channels: channels
                .iter()
                .filter_map(at)
                .map(|c| c.signal.name.as_str())
                .collect(),
            fit_misfit: finite(found.misfit),
            peaks: found.peaks.iter().filter_map(peak).collect(),
        })
    }

    fn channel(&self, i: usize) -> Option<ChannelFields<'_>> {
        let channel = self.survey.channels.get(i)?;
        let level = &channel.level;
        let sensor = self.sensor(channel).and_then(|(network, sensor)| {
            Some(SensorFields {
                element: &network.layout.elements.get(sensor.element.0)?.name,
                distance_m: network.values[sensor.distance],
                recess_length_m: sensor.recess.map(|r| network.values[r.length]),
            })
        });
        let peaks = channel.peaks.as_ref().ok();
        let told = peaks.iter().flat_map(|p| &p.peaks).zip(&channel.evidence);
        Some(ChannelFields {
            name: &channel.signal.name,
            quantity: channel.signal.quantity.noun(),
            unit: channel.signal.quantity.unit(),
            written_in: &channel.signal.written_in,
            factor: channel.signal.factor,
            sensor,
            mean: finite(level.mean),
            rms_about_mean: finite(level.deviation()),
            lowest: finite(level.lowest.0),
            highest: finite(level.highest.0),
            skewness: finite(level.skewness()),
            kurtosis: finite(level.kurtosis()),
            clipped_samples: channel.clipped,
            corrected: channel.correction.any(),
            fit_misfit: peaks.and_then(|p| finite(p.misfit)),
            peaks: told
                .map(|(p, e)| PeakFields::new(channel, p, e.as_ref()))
                .collect(),
            density: self
                .survey
                .bins()
                .map(|j| self.survey.density(i, j))
                .collect(),
        })
    }

    fn pair(&self, i: usize) -> Option<PairFields<'_>> {
        let (a, b) = *self.survey.pairs.get(i)?;
        let name = |k: usize| self.survey.channels.get(k).map(|c| c.signal.name.as_str());
        let rows = self.related(a, b)?;
        let (first, second) = (name(a)?, name(b)?);
        let at = self.at_peaks().into_iter().filter(|r| r.pair == (a, b));
        Some(PairFields {
            first,
            second,
            coherence: rows.iter().map(|r| r.coherence).collect(),
            phase_rad: rows.iter().map(|r| r.phase).collect(),
            at_peaks: at
                .map(|r| AtPeak {
                    frequency_hz: r.frequency,
                    coherence: r.relation.coherence,
                    coherence_by_chance: r.relation.chance_coherence,
                    gain: (&r.relation.gain()).into(),
                    phase_rad: (&r.relation.phase_interval()).into(),
                })
                .collect(),
        })
    }
}
