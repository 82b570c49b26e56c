//! From a file to a record or a spectrum: its format by its first bytes.

use std::fs::File;
use std::io::{ErrorKind, Read};
use std::path::Path;

use tempfile::NamedTempFile;

use super::columns::{self, Raw};
use super::samples::Samples;
use super::spectrum::MeasuredSpectrum;
use super::table::Table;
use super::unit::Calibration;
use super::{Health, Recording, csv, spectrum, unit, universal, wav};
use crate::problems::{Problem, Problems};

/// What is asked of a file beyond what it says itself.
#[derive(Clone, Debug, Default)]
pub struct Asked {
    /// Names with units of its columns or channels in their order, parted by commas; `-` leaves one out.
    pub names: Option<String>,
    /// Sampling rate (Hz).
    pub rate_hz: Option<f64>,
    /// Calibrations of channels.
    pub calibrations: Vec<Calibration>,
    /// Volts at the full scale of a WAV file.
    pub full_scale: Option<f64>,
    /// Stretch of time to read (s), on the record's own clock.
    pub span: Option<(f64, f64)>,
}

/// The formats read.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Format {
    /// Text in columns.
    Csv,
    /// RIFF WAVE.
    Wav,
    /// Dataset 58 of the universal file format.
    Universal,
}

impl Format {
    /// The word for it.
    pub fn noun(self) -> &'static str {
        match self {
            Format::Csv => "CSV",
            Format::Wav => "WAV",
            Format::Universal => "universal file, dataset 58",
        }
    }
}

/// A file as opened.
pub enum Opened {
    /// Samples over time, still to be read.
    Record(Box<Recording>),
    /// A spectrum, read.
    Spectrum(MeasuredSpectrum),
}

/// What the head of a record told.
pub(super) struct Head {
    pub format: Format,
    pub rate_hz: f64,
    pub start: f64,
    pub channels: Vec<Raw>,
    pub expected: u64,
    pub notes: Vec<String>,
    pub samples: Box<dyn Samples>,
    /// Whether the samples keep to the stretch asked for themselves.
    pub cuts_itself: bool,
    pub warnings: Vec<Problem>,
}

/// Relative difference of two rates that is no rounding.
const SAME_RATE: f64 = 1e-6;

/// Opens a file.
///
/// # Errors
/// Every problem of its head, each with its place where it has one.
pub fn open(path: &Path, asked: &Asked) -> Result<Opened, Problems> {
    let given = path;
    let name = match given.as_os_str() == STANDARD_INPUT {
        true => "standard input".to_owned(),
        false => given.display().to_string(),
    };
    let spooled = spool(given).map_err(|e| unreadable(given, &name, &e))?;
    let path = spooled.as_ref().map_or(given, |file| file.path());
    let first = first_bytes(path).map_err(|e| unreadable(path, &name, &e))?;
    let trimmed = first.trim_ascii_start();
    let head = if first.is_empty() {
        let empty = Problem::error(name, "the file is empty");
        return Err(empty.hint("a record has a header and samples").into());
    } else if [b"RIFF", b"RIFX", b"RF64"]
        .iter()
        .any(|m| first.starts_with(*m))
    {
        wav::head(path, &name, asked)?
    } else if trimmed.starts_with(b"-1") && trimmed.get(2).is_some_and(u8::is_ascii_whitespace) {
        universal::head(path, &name, asked)?
    } else if let Some(at) = first.iter().position(|b| *b == 0) {
        let what = format!(
            "this is no record: it has a zero byte at offset {at}, and no head of a WAV file"
        );
        return Err(Problem::error(name, what)
            .hint("records are read from CSV, WAV and dataset 58 of universal files")
            .into());
    } else {
        let table = Table::open(path, &name, asked.names.as_deref())?;
        let is_frequency =
            |h: &super::table::Heading| h.label.unit.as_deref().and_then(unit::frequency).is_some();
        if table.heads.first().is_some_and(is_frequency) {
            return spectrum::read(table).map(Opened::Spectrum);
        }
        csv::head(path, table, &name, asked)?
    };
    let record = recording(head, name, asked)?;
    Ok(Opened::Record(Box::new(Recording {
        _spooled: spooled,
        ..record
    })))
}

/// What stands for standard input in place of a file.
const STANDARD_INPUT: &str = "-";

/// A copy on disk of what can be read only once, a pipe for instance: a format is told by its first bytes, and some are read from several places. It
/// is gone when the copy is dropped. `None` of a file.
fn spool(path: &Path) -> std::io::Result<Option<NamedTempFile>> {
    let mut source: Box<dyn Read> = if path.as_os_str() == STANDARD_INPUT {
        Box::new(std::io::stdin().lock())
    } else {
        let kind = std::fs::metadata(path)?;
        if kind.is_file() || kind.is_dir() {
            return Ok(None);
        }
        Box::new(File::open(path)?)
    };
    let mut copy = NamedTempFile::new()?;
    std::io::copy(&mut source, &mut copy)?;
    Ok(Some(copy))
}

fn first_bytes(path: &Path) -> std::io::Result<Vec<u8>> {
    if std::fs::metadata(path)?.is_dir() {
        return Err(ErrorKind::IsADirectory.into());
    }
    let mut first = Vec::with_capacity(4096);
    File::open(path)?.take(4096).read_to_end(&mut first)?;
    Ok(first)
}

fn unreadable(path: &Path, name: &str, e: &std::io::Error) -> Problem {
    match e.kind() {
        ErrorKind::NotFound => Problem::error(name, "there is no such file").hint(
            match path.parent().filter(|p| !p.as_os_str().is_empty()) {
                Some(p) if !p.is_dir() => format!("there is no directory {} either", p.display()),
                _ => "check the path".to_owned(),
            },
        ),
        ErrorKind::IsADirectory => {
            Problem::error(name, "this is a directory").hint("name a record in it")
        }
        _ => Problem::error(name, format!("cannot be read: {e}")),
    }
}

fn recording(head: Head, file: String, asked: &Asked) -> Result<Recording, Problems> {
    let mut problems = head.warnings;
    if let Some(stated) = asked.rate_hz
        && (stated / head.rate_hz - 1.0).abs() > SAME_RATE
    {
        let what = format!(
            "--rate says {stated} Hz, and the file itself {} Hz",
            head.rate_hz
        );
        problems.push(Problem::error(file.as_str(), what).hint(
            "leave --rate out; if the file is wrong, give its columns other names with --names",
        ));
    }
    let chosen = columns::resolve(head.channels, asked, &file, &mut problems);
    let mut samples = head.samples;
    let (wanted, signals): (Vec<usize>, Vec<super::Signal>) = chosen.into_iter().unzip();
    samples.select(&wanted);
    let (mut skip, mut take, mut start) = (0, u64::MAX, head.start);
    if let Some((from, to)) = asked.span {
        let samples = |t: f64| (t * head.rate_hz).round().clamp(0.0, 1e18) as u64;
        skip = samples(from - head.start);
        take = samples(to - head.start).saturating_sub(skip);
        start += skip as f64 / head.rate_hz;
    }
    let expected = head.expected.saturating_sub(skip).min(take);
    if head.cuts_itself {
        (skip, take) = (0, u64::MAX);
    }
    let read = Recording {
        file,
        format: head.format,
        rate_hz: head.rate_hz,
        start,
        expected,
        notes: head.notes,
        samples,
        skip,
        take,
        blocks: signals
            .iter()
            .map(|_| Vec::with_capacity(super::BLOCK))
            .collect(),
        health: vec![Health::default(); signals.len()],
        signals,
        read: 0,
        problems,
        done: false,
        _spooled: None,
    };
    if read.failed() {
        return Err(Problems(read.problems));
    }
    Ok(read)
}
