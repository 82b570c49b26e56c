//! `stillflame spectrum RECORD`.

use std::path::{Path, PathBuf};

use clap::{Args, ValueEnum};

use super::options::{Range, frequency};
use super::{Answer, Failure, Status};
use crate::input::{self, Loaded};
use crate::meanflow;
use crate::measured::Window;
use crate::measured::reading::unit::{Calibration, calibration};
use crate::measured::reading::{self, MeasuredSpectrum, Opened, Recording, Transducer};
use crate::problems::{Problem, Problems, nearest};
use crate::report::Heading;
use crate::report::spectrum::{LinesReport, SpectrumReport};
use crate::studies::record::{Correction, Settings, maxima, survey};
use crate::units::{self, Dimension};

/// Find what is in a record of a rig: spectra, peaks with decay rates, noise or cycle
///
/// Reads CSV, WAV and dataset 58 of universal files in one pass, whatever their length. Tells the power
/// density of each channel with its 95 % band, its peaks with frequency, rms, width and decay rate, each with
/// an interval, and whether a peak is a resonance driven by noise or a self-sustained cycle, as evidence with
/// its numbers; coherence and phase between channels; with --out the figures and tables. A CSV whose first
/// column is a frequency is taken for a spectrum, of which the maxima are told.
#[derive(Clone, Debug, Args)]
#[command(
    after_help = "Example:\n  stillflame spectrum examples/records/swirl_rig.wav --network networks/swirl_rig.toml \\\n    --names \"p1, p2\" --calibration \"p1 = 1 kPa\" --calibration \"p2 = 1 kPa\" --out results"
)]
pub(super) struct Arguments {
    /// The record (CSV, WAV or universal file); - for standard input
    #[arg(value_name = "RECORD")]
    pub record: PathBuf,

    /// The network whose [[sensor]]s bear the names of the channels: where each sits, and its recess
    #[arg(long, value_name = "NETWORK")]
    pub network: Option<PathBuf>,

    /// Lay a value over the network, as in "chamber.length = 0.9 m"; may be given again
    #[arg(
        long = "set",
        value_name = "NAME = VALUE",
        requires = "network",
        allow_hyphen_values = true
    )]
    overrides: Vec<String>,

    /// Names of columns or channels in order, with units where the file has none, as in "time [s], p1 [Pa], -"; "-"
    /// leaves one out
    #[arg(long, value_name = "NAMES", allow_hyphen_values = true)]
    names: Option<String>,

    /// Sampling rate, where there is no column of time, as in "25.6 kHz"
    #[arg(long, value_name = "RATE", value_parser = rate)]
    rate: Option<f64>,

    /// What one in the file means, as in "p1 = 12.3 Pa/V", "p1 = 81.3 mV/Pa" or, of the full scale of a WAV file,
    /// "p1 = 200 Pa"; may be given again
    #[arg(long, value_name = "NAME = VALUE", value_parser = calibration, allow_hyphen_values = true)]
    calibration: Vec<Calibration>,

    /// Voltage at the full scale of a WAV file, as in "10 V"
    #[arg(long, value_name = "VOLTAGE", value_parser = volts)]
    full_scale: Option<f64>,

    /// Response of a channel's transducer as a CSV of frequency [Hz], gain and phase [deg], as in "p1 = FILE"; may be
    /// given again
    #[arg(long, value_name = "NAME = FILE")]
    transducer: Vec<String>,

    /// Stretch of time to look at, as in "2 to 60 s"
    #[arg(long, value_name = "A to B s", value_parser = stretch, allow_hyphen_values = true)]
    span: Option<Range>,

    /// Frequencies to look at, as in "20 to 800 Hz"; else the window of the network, or 10 to 1000 Hz
    #[arg(long, value_name = "A to B Hz", value_parser = frequency, allow_hyphen_values = true)]
    frequency: Option<Range>,

    /// Distance of bins, as in "0.5 Hz"; else a thirty-second of the record makes a segment, of at most 4 s
    #[arg(long, value_name = "FREQUENCY", value_parser = rate)]
    bin_width: Option<f64>,

    /// Window of a segment; peaks are fitted with hann
    #[arg(long, value_enum, default_value_t = Weight::Hann)]
    window: Weight,

    /// Part of a segment that it shares with the next, 0 to 0.95
    #[arg(long, value_name = "PART", value_parser = overlap)]
    overlap: Option<f64>,

    /// Print one JSON object and nothing else on standard output; numbers in SI
    #[arg(long)]
    pub json: bool,

    /// Write files (SVG, CSV) into this directory
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
enum Weight {
    Hann,
    Boxcar,
    FlatTop,
}

fn rate(text: &str) -> Result<f64, String> {
    let value =
        units::parse(text, Dimension::Frequency).map_err(|e| format!("{e}; {}", e.hint()))?;
    if value > 0.0 {
        Ok(value)
    } else {
        Err("it must be above zero".to_owned())
    }
}

fn volts(text: &str) -> Result<f64, String> {
    let (number, unit) = text
        .trim()
        .split_once(char::is_whitespace)
        .unwrap_or((text, ""));
    let scale = reading::unit::scale(unit);
    match (number.parse::<f64>(), scale) {
        (Ok(x), Some(s))
            if s.quantity == crate::measured::Quantity::Voltage && x.is_finite() && x > 0.0 =>
        {
            Ok(x * s.factor)
        }
        _ => Err("write a voltage above zero, as in \"10 V\"".to_owned()),
    }
}

fn stretch(text: &str) -> Result<Range, String> {
    let (from, to) =
        units::parse_span(text, Dimension::Time).map_err(|e| format!("{e}; {}", e.hint()))?;
    if from < to {
        Ok((from, to))
    } else {
        Err("write the earlier time first".to_owned())
    }
}

fn overlap(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(x) if (0.0..=0.95).contains(&x) => Ok(x),
        _ => Err("it lies between 0 and 0.95".to_owned()),
    }
}

/// The answer for a record or a spectrum.
pub(super) fn answer(arguments: &Arguments) -> Result<Answer, Failure> {
    let loaded = match &arguments.network {
        Some(path) => Some(
            input::read(path, &arguments.overrides)
                .map_err(|Problems(problems)| Failure::of_reading(problems))?,
        ),
        None => None,
    };
    let asked = reading::Asked {
        names: arguments.names.clone(),
        rate_hz: arguments.rate,
        calibrations: arguments.calibration.clone(),
        full_scale: arguments.full_scale,
        span: arguments.span,
    };
    let opened = reading::open(&arguments.record, &asked).map_err(of_record)?;
    match opened {
        Opened::Record(record) => of_samples(arguments, *record, loaded.as_ref()),
        Opened::Spectrum(spectrum) => of_lines(arguments, &spectrum),
    }
}

/// A record that cannot be analysed: the command line is at fault where every error is about an option.
fn of_record(Problems(problems): Problems) -> Failure {
    let mut errors = problems
        .iter()
        .filter(|p| p.severity == crate::problems::Severity::Error);
    match errors.all(|p| p.subject.starts_with("--")) {
        true => Failure::usage(problems),
        false => Failure::input(problems),
    }
}

fn of_samples(
    arguments: &Arguments,
    record: Recording,
    loaded: Option<&Loaded>,
) -> Result<Answer, Failure> {
    let mut warnings = Vec::new();
    let corrections = corrections(arguments, &record, loaded, &mut warnings)?;
    let searched = loaded.and_then(|l| l.network.layout.search.frequency);
    let settings = Settings {
        bin_width: arguments.bin_width,
        window: match arguments.window {
            Weight::Hann => Window::Hann,
            Weight::Boxcar => Window::Boxcar,
            Weight::FlatTop => Window::FlatTop,
        },
        overlap: arguments.overlap,
        band: arguments.frequency.or(searched),
    };
    let survey = survey(record, corrections, &settings).map_err(of_record)?;
    warnings.splice(0..0, survey.warnings.iter().cloned());
    let path = arguments.network.as_ref().map(|p| p.display().to_string());
    let network = loaded.zip(path.as_ref()).map(|(l, path)| {
        let title = &l.network.layout.title;
        (
            &l.network,
            Heading {
                network: path,
                title,
            },
        )
    });
    let report = SpectrumReport {
        network,
        survey: &survey,
        warnings: &warnings,
    };
    let mut files = Vec::new();
    if arguments.out.is_some() {
        let draw = |e| {
            Failure::input([Problem::error(
                "spectrum",
                format!("the figure cannot be drawn: {e}"),
            )])
        };
        let named = |what: &str| file(&arguments.record, what);
        files.push((named("peaks.csv"), report.peaks_csv()?));
        files.push((named("spectra.csv"), report.spectra_csv()?));
        files.push((
            named("spectra.svg"),
            report.density_svg().map_err(draw)?.into_bytes(),
        ));
        if let Some(svg) = report.coherence_svg().map_err(draw)? {
            files.push((named("coherence.svg"), svg.into_bytes()));
        }
        for (i, channel) in survey.channels.iter().enumerate() {
            let name = plain(&channel.signal.name, i);
            if let Some(svg) = report.spectrogram_svg(i).map_err(draw)? {
                files.push((named(&format!("spectrogram_{name}.svg")), svg.into_bytes()));
                files.push((
                    named(&format!("spectrogram_{name}.csv")),
                    report.spectrogram_csv(i)?,
                ));
            }
        }
    }
    Ok(Answer {
        text: if arguments.json {
            report.json()?
        } else {
            report.text()
        },
        files,
        status: Status::Done,
    })
}

/// What lies between wall and samples, for each channel.
fn corrections(
    arguments: &Arguments,
    record: &Recording,
    loaded: Option<&Loaded>,
    warnings: &mut Vec<Problem>,
) -> Result<Vec<Correction>, Failure> {
    let names = || record.signals.iter().map(|s| s.name.as_str());
    let mut all = vec![Correction::default(); record.signals.len()];
    if let Some(loaded) = loaded {
        let network = &loaded.network;
        warnings.extend(loaded.warnings.iter().cloned());
        let mean = meanflow::solve(network).map_err(|Problems(p)| Failure::input(p))?;
        let mut met = false;
        for sensor in &network.layout.sensors {
            match names()
                .position(|n| n == sensor.name)
                .and_then(|i| all.get_mut(i))
            {
                Some(correction) => {
                    met = true;
                    *correction = Correction::of(network, &mean, sensor);
                }
                None => {
                    let problem = Problem::warning(
                        sensor.name.as_str(),
                        "the record has no channel of this sensor",
                    );
                    warnings.push(problem.hint(
                        "a sensor bears the name of its channel; name channels with --names",
                    ));
                }
            }
        }
        if !met {
            let what = "no channel of the record is a sensor of the network, which tells nothing of it then";
            warnings.push(
                Problem::warning("--network", what)
                    .hint("give the network a [[sensor]] for each channel"),
            );
        }
    }
    for text in &arguments.transducer {
        let usage = |what: String, hint: String| {
            Failure::usage([Problem::error("--transducer", what).hint(hint)])
        };
        let Some((name, path)) = text.split_once('=').map(|(a, b)| (a.trim(), b.trim())) else {
            return Err(usage(
                format!("`{text}` has no `=`"),
                "write NAME = FILE".to_owned(),
            ));
        };
        let Some(correction) = names().position(|n| n == name).and_then(|i| all.get_mut(i)) else {
            let hint = match nearest(name, names()) {
                Some(meant) => format!("did you mean `{meant}`?"),
                None => format!(
                    "the channels are {}",
                    names().collect::<Vec<_>>().join(", ")
                ),
            };
            return Err(usage(format!("no channel is named `{name}`"), hint));
        };
        let read = Transducer::read(Path::new(path)).map_err(|Problems(p)| Failure::input(p))?;
        correction.transducer = Some(read);
    }
    Ok(all)
}

/// Most maxima told of a column.
const MOST_LINES: usize = 12;

fn of_lines(arguments: &Arguments, spectrum: &MeasuredSpectrum) -> Result<Answer, Failure> {
    let ends = spectrum.frequency.first().zip(spectrum.frequency.last());
    let (first, last) = ends.map_or((0.0, 0.0), |(a, b)| (*a, *b));
    let band = arguments.frequency.unwrap_or((first, last));
    if band.1 < first || band.0 > last {
        let what =
            format!("the spectrum runs from {first} to {last} Hz, and nothing of it lies within");
        return Err(Failure::usage([Problem::error("--frequency", what)]));
    }
    let found: Vec<_> = (spectrum.columns.iter())
        .map(|c| maxima(&spectrum.frequency, &c.values, c.line, band, MOST_LINES))
        .collect();
    let report = LinesReport {
        spectrum,
        maxima: &found,
        band,
        warnings: &spectrum.warnings,
    };
    let mut files = Vec::new();
    if arguments.out.is_some() {
        let drawn = report.svg().map_err(|e| {
            Failure::input([Problem::error(
                "spectrum",
                format!("the figure cannot be drawn: {e}"),
            )])
        })?;
        files.push((file(&arguments.record, "maxima.csv"), report.csv()?));
        files.push((file(&arguments.record, "maxima.svg"), drawn.into_bytes()));
    }
    Ok(Answer {
        text: if arguments.json {
            report.json()?
        } else {
            report.text()
        },
        files,
        status: Status::Done,
    })
}

/// `run_12_peaks.csv`.
fn file(record: &Path, what: &str) -> String {
    let stem = match record.file_stem() {
        Some(stem) if stem != "-" => stem.to_string_lossy(),
        _ => "record".into(),
    };
    format!("{stem}_{what}")
}

/// A channel's name as part of a file's, with its number where nothing is left of it.
fn plain(name: &str, i: usize) -> String {
    let kept: String = name
        .chars()
        .filter(|c| c.is_ascii_alphanumeric() || *c == '_' || *c == '-')
        .collect();
    if kept == name {
        kept
    } else {
        format!("{}_{kept}", i + 1)
    }
}
