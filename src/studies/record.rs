//! A record in one pass: spectra, spectrogram, levels, and what its peaks are.

mod correction;
mod lines;

pub use correction::Correction;
pub use lines::{Maximum, maxima};

use rayon::prelude::*;

use crate::measured::nature::{self, Evidence};
use crate::measured::peaks::{self, Peaks, Search};
use crate::measured::reading::{Format, Recording, Signal};
use crate::measured::{
    Detrend, Envelopes, Level, Plan, Quantity, Row, Spectra, Spectrogram, Welch, Window,
};
use crate::problems::{Problem, Problems};

/// How a record is analysed, where something else is asked for.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Settings {
    /// Distance of bins (Hz).
    pub bin_width: Option<f64>,
    /// Weight of the samples of a segment.
    pub window: Window,
    /// Part of a segment it shares with the next; half where it is not said.
    pub overlap: Option<f64>,
    /// Frequencies looked at (Hz).
    pub band: Option<(f64, f64)>,
}

/// Segments a record is cut into, end to end, where nothing else is asked for.
const PARTS: u64 = 32;

/// Longest segment by default (s): bins a quarter of a hertz apart.
const LONGEST: f64 = 4.0;

/// Shortest segment (samples).
const SHORTEST: usize = 64;

/// Fewest segments of a spectrum, end to end.
const FEWEST: u64 = 2;

/// Band looked at by default (Hz): combustion oscillations of plane waves lie in it (common practice).
const BAND: (f64, f64) = (10.0, 1000.0);

/// Part of the sampling rate up to which a record is trusted: the filters before a converter need the rest (common practice).
const TRUSTED: f64 = 1.0 / 2.56;

/// Part of a bin that is rounding.
const EDGE: f64 = 1e-6;

/// Part of the samples of a channel that may be clipped before noise and cycle are not told apart.
const CLIPPED: f64 = 1e-3;

/// Most resonances fitted in a spectrum.
const RESONANCES: usize = 20;

/// Segments of the envelopes (s).
const BANKS: [f64; 4] = [1.0 / 16.0, 1.0 / 8.0, 1.0 / 4.0, 1.0 / 2.0];

/// Rows of a spectrogram, at most about twice as many, and values it may hold in all.
const ROWS: u64 = 120;
const VALUES: usize = 4_000_000;

/// How many channels of pressure are fitted together: more tell little more, and cost with the square of their number.
const TOGETHER: std::ops::RangeInclusive<usize> = 2..=4;

/// Most channels between which every pair is looked at; of more, each with the first.
const ALL_PAIRS: usize = 6;

/// One channel as analysed.
#[derive(Clone, Debug)]
pub struct Studied {
    /// Its name, quantity and scale.
    pub signal: Signal,
    /// Mean, rms, moments and extremes (unit).
    pub level: Level,
    /// Samples at a limit it is clipped at.
    pub clipped: u64,
    /// What lies between the wall and the samples.
    pub correction: Correction,
    /// Its peaks as measured, or why there are none.
    pub peaks: Result<Peaks, Problem>,
    /// Noise or cycle, for each peak.
    pub evidence: Vec<Option<Evidence>>,
}

/// A record as analysed.
#[derive(Clone, Debug)]
pub struct Survey {
    /// The file as it was named.
    pub file: String,
    /// Its format.
    pub format: Format,
    /// What it says of itself.
    pub notes: Vec<String>,
    /// Time of the first sample (s).
    pub start: f64,
    /// Samples of each channel.
    pub samples: u64,
    /// The channels.
    pub channels: Vec<Studied>,
    /// Channels of pressure fitted together, and the peaks they share; `None` where there are fewer than two or more than four.
    pub together: Option<(Vec<usize>, Peaks)>,
    /// Pairs of channels with a cross-spectrum.
    pub pairs: Vec<(usize, usize)>,
    /// Power densities and cross-spectra as measured.
    pub spectra: Spectra,
    /// How the spectrogram is cut, and segments averaged for a row.
    pub row_plan: (Plan, usize),
    /// Spectrogram of each channel as measured; empty where the record fills no row.
    pub rows: Vec<Vec<Row>>,
    /// Frequencies looked at (Hz).
    pub band: (f64, f64),
    /// What qualifies it.
    pub warnings: Vec<Problem>,
}

impl Survey {
    /// Duration (s).
    pub fn duration(&self) -> f64 {
        self.samples as f64 / self.spectra.plan().rate_hz
    }

    /// Bins of the spectra within the band.
    pub fn bins(&self) -> std::ops::Range<usize> {
        let width = self.spectra.plan().bin_width();
        // A bin at the very edge belongs to the band whatever the rounding.
        let first = (self.band.0 / width - EDGE).ceil() as usize;
        let last = (self.band.1 / width + EDGE).floor() as usize;
        first.max(1)..(last + 1).min(self.spectra.plan().bins())
    }

    /// Power density of a channel at a bin, corrected.
    pub fn density(&self, channel: usize, bin: usize) -> f64 {
        let raw = self
            .spectra
            .density(channel)
            .get(bin)
            .copied()
            .unwrap_or(0.0);
        let gain = self.channels.get(channel).map_or(1.0, |c| {
            c.correction.at(self.spectra.frequency(bin)).norm_sqr()
        });
        raw / gain
    }
}

/// Reads a record to its end and analyses it. `corrections` has one for each channel.
///
/// # Errors
/// Every problem that forbids an answer.
pub fn survey(
    mut record: Recording,
    corrections: Vec<Correction>,
    settings: &Settings,
) -> Result<Survey, Problems> {
    let plan = plan(&record, settings)?;
    let rate_hz = record.rate_hz;
    let count = record.signals.len();
    let band = band(rate_hz, settings)?;
    let pairs = pairs(count);
    let mut passes = Passes {
        welch: Welch::new(plan, count, &pairs)?,
        rows: None,
        banks: Vec::new(),
        levels: vec![Level::new(); count],
    };
    let row_plan = row_plan(&plan, record.expected, count);
    if let Some((plan, per_row)) = row_plan {
        passes.rows = Some(Spectrogram::new(plan, count, per_row)?);
    }
    if settings.window == Window::Hann {
        for seconds in BANKS {
            let segment = even((seconds * rate_hz) as usize);
            if segment >= 16 && segment as u64 * 8 <= record.expected {
                passes
                    .banks
                    .push(Envelopes::new(Plan::hann(rate_hz, segment), count)?);
            }
        }
    }
    while let Some(blocks) = record.block() {
        passes.feed(&blocks)?;
        while record.failed() && record.block().is_some() {}
    }
    let (file, format, notes) = (record.file.clone(), record.format, record.notes.clone());
    let (start, samples, signals) = (record.start, record.read(), record.signals.clone());
    let clipped: Vec<u64> = record.health().iter().map(|h| h.clipped()).collect();
    let constant: Vec<bool> = record.health().iter().map(|h| h.constant()).collect();
    let mut warnings = record.finish()?;
    if constant.iter().all(|c| *c) {
        let what = "every channel of it is constant: there is no spectrum";
        let mut problems = Problems::from(Problem::error(file, what));
        problems.0.extend(warnings);
        return Err(problems);
    }
    let spectra = passes.welch.finish()?;
    let rows = passes.rows.map_or(Ok(Vec::new()), |r| {
        r.finish().or(Ok::<_, Problem>(Vec::new()))
    })?;
    let banks: Vec<Vec<Vec<_>>> = (passes.banks.into_iter())
        .filter_map(|b| b.finish().ok())
        .collect();
    let search = Search {
        low: band.0,
        high: band.1,
        most: RESONANCES,
    };
    let cut_off = |i: usize| {
        clipped
            .get(i)
            .is_some_and(|n| *n as f64 > CLIPPED * samples as f64)
    };
    let found: Vec<_> = (0..count)
        .into_par_iter()
        .map(|i| {
            if constant.get(i) == Some(&true) {
                return (Err(Problem::error("channel", "it is constant")), Vec::new());
            }
            let found = peaks::find(&spectra, i, search);
            let evidence = match &found {
                // A clipped envelope is steady whatever drives it.
                Ok(found) if cut_off(i) => vec![None; found.peaks.len()],
                Ok(found) => evidence(found, &banks, i, spectra.plan().resolution()),
                Err(_) => Vec::new(),
            };
            (found, evidence)
        })
        .collect();
    let shared: Vec<usize> = (signals.iter().enumerate())
        .filter(|(i, s)| {
            s.quantity == Quantity::Pressure && !cut_off(*i) && constant.get(*i) == Some(&false)
        })
        .map(|(i, _)| i)
        .collect();
    let together = match TOGETHER.contains(&shared.len()) {
        true => peaks::find_together(&spectra, &shared, search).ok(),
        false => None,
    };
    let together = together.map(|found| (shared, found));
    let mut channels = Vec::with_capacity(count);
    let parts = signals
        .into_iter()
        .zip(passes.levels)
        .zip(clipped)
        .zip(corrections)
        .zip(found);
    for ((((signal, level), clipped), correction), (peaks, evidence)) in parts {
        // That a channel is constant has been told.
        if let Err(mut problem) = peaks.as_ref().map_err(Clone::clone)
            && !level.constant()
        {
            problem.severity = crate::problems::Severity::Warning;
            problem.what = format!("no peaks are fitted: {}", problem.what);
            problem.subject.clone_from(&signal.name);
            warnings.push(problem);
        }
        warnings.extend(correction.remarks(&signal.name, band, peaks.as_ref().ok()));
        channels.push(Studied {
            signal,
            level,
            clipped,
            correction,
            peaks,
            evidence,
        });
    }
    warnings.extend(remarks(&spectra, &channels));
    Ok(Survey {
        file,
        format,
        notes,
        start,
        samples,
        channels,
        together,
        pairs,
        spectra,
        row_plan: row_plan.unwrap_or((plan, 1)),
        rows,
        band,
        warnings,
    })
}

/// What takes the samples as they come.
struct Passes {
    welch: Welch,
    rows: Option<Spectrogram>,
    banks: Vec<Envelopes>,
    levels: Vec<Level>,
}

impl Passes {
    fn feed(&mut self, blocks: &[&[f64]]) -> Result<(), Problem> {
        for (level, block) in self.levels.iter_mut().zip(blocks) {
            level.feed(block);
        }
        self.welch.feed(blocks)?;
        if let Some(rows) = &mut self.rows {
            rows.feed(blocks)?;
        }
        self.banks.iter_mut().try_for_each(|b| b.feed(blocks))
    }
}

fn even(n: usize) -> usize {
    n / 2 * 2
}

/// The largest number not above with at most three binary digits before its zeros: quick to transform.
fn quick(n: usize) -> usize {
    let shift = usize::BITS
        .saturating_sub(n.leading_zeros())
        .saturating_sub(3);
    (n >> shift) << shift
}

fn plan(record: &Recording, settings: &Settings) -> Result<Plan, Problem> {
    let rate_hz = record.rate_hz;
    let segment = match settings.bin_width {
        Some(width) => {
            let segment = (rate_hz / width).round();
            if !(8.0..1e8).contains(&segment) {
                let what =
                    format!("bins of {width} Hz make no segment of a record at {rate_hz} Hz");
                return Err(Problem::error("--bin-width", what));
            }
            segment as usize
        }
        None => {
            let longest = (LONGEST * rate_hz) as u64;
            let wanted = (record.expected / PARTS).min(longest) as usize;
            quick(wanted.max(SHORTEST))
        }
    };
    if (segment as u64).saturating_mul(FEWEST) > record.expected {
        let what = format!(
            "the record is too short: {} samples ({:.4} s) where {FEWEST} segments of {segment} need {}",
            record.expected,
            record.expected as f64 / rate_hz,
            segment as u64 * FEWEST
        );
        return Err(Problem::error(record.file.as_str(), what)
            .hint("record for longer, or ask for wider bins with --bin-width"));
    }
    let overlap = settings.overlap.unwrap_or(0.5);
    Ok(Plan {
        rate_hz,
        segment,
        overlap: ((segment as f64 * overlap) as usize).min(segment - 1),
        window: settings.window,
        detrend: Detrend::Constant,
    })
}

fn band(rate_hz: f64, settings: &Settings) -> Result<(f64, f64), Problem> {
    let Some((low, high)) = settings.band else {
        let top = BAND.1.min(TRUSTED * rate_hz);
        return Ok((BAND.0.min(top / 50.0), top));
    };
    if low >= 0.5 * rate_hz {
        let what = format!(
            "a record at {rate_hz} Hz holds nothing above {} Hz",
            0.5 * rate_hz
        );
        return Err(Problem::error("--frequency", what));
    }
    Ok((low, high.min(0.5 * rate_hz)))
}

fn pairs(count: usize) -> Vec<(usize, usize)> {
    let firsts = if count <= ALL_PAIRS { count } else { 1 };
    (0..firsts)
        .flat_map(|a| (a + 1..count).map(move |b| (a, b)))
        .collect()
}

/// How the spectrogram is cut and how many segments make a row; `None` where the record is too short for one.
fn row_plan(plan: &Plan, expected: u64, channels: usize) -> Option<(Plan, usize)> {
    let most = 2 * VALUES / (2 * ROWS as usize * channels.max(1));
    let segment = quick((plan.segment / 2).min(most)).max(16);
    let plan = Plan {
        segment,
        overlap: segment / 2,
        ..*plan
    };
    let segments = plan.segments_in(usize::try_from(expected).ok()?) as u64;
    let per_row = (segments / ROWS).max(1);
    (segments >= 2).then_some((plan, per_row as usize))
}

fn evidence(
    found: &Peaks,
    banks: &[Vec<Vec<crate::measured::Envelope>>],
    channel: usize,
    resolution: f64,
) -> Vec<Option<Evidence>> {
    let all: Vec<f64> = found.peaks.iter().map(|p| p.frequency.value).collect();
    let own: Vec<Vec<_>> = banks
        .iter()
        .filter_map(|b| b.get(channel).cloned())
        .collect();
    (found.peaks.iter())
        .map(|peak| nature::weigh(peak, &all, &own, resolution))
        .collect()
}

/// Least coherence and deviations of the phase that are worth a word.
fn remarks(spectra: &Spectra, channels: &[Studied]) -> Vec<Problem> {
    let mut found = Vec::new();
    let averages = spectra.averages();
    if averages < 8.0 {
        let what = format!(
            "only {averages:.1} independent averages: bands are wide and a peak may be chance"
        );
        found.push(
            Problem::warning("record", what)
                .hint("record for longer, or ask for wider bins with --bin-width"),
        );
    }
    for (i, channel) in channels.iter().enumerate() {
        let Ok(peaks) = &channel.peaks else { continue };
        found.extend(misjudged(spectra, i, channel, peaks));
        if !(0.7..1.4).contains(&peaks.misfit) {
            let what = format!(
                "the fit describes its spectrum poorly: scatter about it is {:.2} times that of chance",
                peaks.misfit
            );
            found.push(
                Problem::warning(channel.signal.name.as_str(), what)
                    .hint("the record may drift: look at the spectrogram, and take a steady stretch with --span"),
            );
        }
    }
    found
}

/// Ratio of fitted to measured power about a peak beyond which its amplitude is not to be trusted, either way.
const MISJUDGED: f64 = 1.33;

/// Bins on either side of a peak that its power is summed over, at least.
const ABOUT: f64 = 3.0;

/// Peaks wider than a bin about which the fit has another power than the estimate.
fn misjudged(spectra: &Spectra, channel: usize, studied: &Studied, peaks: &Peaks) -> Vec<Problem> {
    let width = spectra.plan().bin_width();
    let density = spectra.density(channel);
    let mut found = Vec::new();
    // The amplitude of a line is read off the spectrum itself.
    for peak in peaks.peaks.iter().filter(|p| p.width.value > width) {
        let f = peak.frequency.value;
        let reach = (ABOUT * width).max(2.0 * peak.width.value);
        let (mut measured, mut fitted) = (0.0, 0.0);
        for (at, fit) in peaks.frequency.iter().zip(peaks.fitted.iter().flatten()) {
            if (at - f).abs() <= reach {
                fitted += fit;
                measured += density
                    .get((at / width).round() as usize)
                    .copied()
                    .unwrap_or(0.0);
            }
        }
        let ratio = fitted / measured;
        if !(1.0 / MISJUDGED..MISJUDGED).contains(&ratio) {
            let what = format!(
                "about {f:.2} Hz the fit has {ratio:.2} times the power that is there, {:.4} {} rms: its amplitude and width are not to be trusted",
                (measured * width).sqrt(),
                studied.signal.quantity.unit()
            );
            found.push(Problem::warning(studied.signal.name.as_str(), what).hint(
                "look at the spectrogram: the record may drift, or the peak be none of a resonance",
            ));
        }
    }
    found
}
