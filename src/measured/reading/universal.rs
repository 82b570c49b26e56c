//! Records as datasets 58 of the universal file format, text and binary (58b), in either byte order.
//!
//! A file holds one channel after the other. They are read side by side, each with a reader of its own, so that
//! memory does not grow with the record; the file is looked through once beforehand for where they begin.

use std::fs::File;
use std::io::{BufReader, Seek, SeekFrom};
use std::path::Path;

use super::BLOCK;
use super::clock::{self, roundest};
use super::columns::{Raw, Stated, renamed};
use super::lines::{Found, Lines};
use super::open::{Asked, Format, Head};
use super::samples::{Samples, is_other_order, place, shown};
use super::universal_header::{self as header, Function, LINES, Storage};
use super::universal_values::{Cursor, pattern, values_in};
use crate::problems::{Place, Problem, Problems};

/// Most channels, each of which keeps its file open.
const MOST_CHANNELS: usize = 256;

/// A channel found in a file.
#[derive(Clone, Debug)]
pub(super) struct Dataset {
    pub function: Function,
    /// Offset and first line of its values.
    pub at: u64,
    pub line: u64,
    /// Values that are there.
    pub there: u64,
}

pub(super) fn head(path: &Path, name: &str, asked: &Asked) -> Result<Head, Problems> {
    let mut warnings = Vec::new();
    let mut sets = scan(path, name, &mut warnings)?;
    sets.retain(|set| {
        let over_time = set.function.kind == 1 || (set.function.kind == 0 && set.function.abscissa == 17);
        if !over_time {
            let what = format!(
                "the dataset 58 `{}` before line {} is no record over time (function type {}) and is left out",
                shown(&set.function.name), set.line, set.function.kind
            );
            warnings.push(Problem::warning(name, what));
        }
        over_time
    });
    let Some(first) = sets.first().cloned() else {
        let problem = Problem::error(name, "there is no dataset 58 with a record over time in it");
        return Err(problem
            .hint("functions of type 1, time response, are read")
            .into());
    };
    let mut problems = Vec::new();
    if sets.len() > MOST_CHANNELS {
        let what = format!(
            "there are {} channels in it, more than the {MOST_CHANNELS} read at a time",
            sets.len()
        );
        return Err(Problem::error(name, what).into());
    }
    let (rate_hz, start) = timing(path, name, &first)?;
    for set in &sets {
        let f = &set.function;
        let (rate, _) = timing(path, name, set)?;
        if (rate / rate_hz - 1.0).abs() > 2.0 * (f.slack + first.function.slack) {
            let what = format!("is sampled at {rate} Hz, and the first channel at {rate_hz} Hz");
            problems.push(
                Problem::error(f.name.as_str(), what)
                    .hint("channels of a record are sampled together"),
            );
        }
        if f.values != first.function.values {
            let what = format!(
                "has {} samples where the first channel has {}",
                f.values, first.function.values
            );
            problems.push(
                Problem::error(f.name.as_str(), what)
                    .hint("channels of a record are sampled together"),
            );
        }
        if f.complex {
            problems.push(Problem::error(
                f.name.as_str(),
                "holds complex values, and a record over time is real",
            ));
        }
        if set.there < f.values {
            let what = format!(
                "the file is cut: {} of the {} samples of `{}` are there",
                set.there,
                f.values,
                shown(&f.name)
            );
            warnings.push(
                Problem::warning(name, what).hint("all channels are read as far as this one goes"),
            );
        }
        problems.extend(order(path, name, set)?);
    }
    if !problems.is_empty() {
        return Err(Problems(problems));
    }
    let left = sets
        .iter()
        .map(|s| s.there.min(s.function.values))
        .min()
        .unwrap_or(0);
    let mut channels: Vec<Raw> = sets.iter().map(raw).collect();
    if let Some(names) = &asked.names {
        let labels = renamed(names, channels.len())?;
        for (raw, label) in channels.iter_mut().zip(labels) {
            let renamed = Raw::new(label, None);
            let stated = match renamed.stated {
                Stated::Nothing => raw.stated.clone(),
                other => other,
            };
            *raw = Raw { stated, ..renamed };
        }
    }
    let mut notes: Vec<String> = sets.iter().map(|s| s.function.title.clone()).collect();
    notes.dedup();
    notes.retain(|n| !n.is_empty() && !n.eq_ignore_ascii_case("none"));
    notes.truncate(8);
    Ok(Head {
        format: Format::Universal,
        rate_hz,
        start,
        channels,
        expected: left,
        notes,
        samples: Box::new(Channels {
            path: path.to_owned(),
            name: name.to_owned(),
            sets,
            cursors: Vec::new(),
            left,
        }),
        cuts_itself: false,
        warnings,
    })
}

fn raw(set: &Dataset) -> Raw {
    let f = &set.function;
    Raw {
        name: f.name.clone(),
        stated: if f.unit.is_empty() {
            Stated::Nothing
        } else {
            Stated::Unit(f.unit.clone())
        },
        place: None,
        skipped: false,
    }
}

/// Rate and time of the first sample.
fn timing(path: &Path, name: &str, set: &Dataset) -> Result<(f64, f64), Problem> {
    let f = &set.function;
    if f.even {
        return Ok((roundest(1.0 / f.step, f.slack), f.start));
    }
    let fail = |e: std::io::Error| Problem::error(name, format!("cannot be read: {e}"));
    let mut cursor = Cursor::open(path, set).map_err(fail)?;
    let mut pairs = Vec::new();
    cursor.fill(2 * BLOCK.min(set.there as usize), &mut pairs)?;
    let times: Vec<f64> = pairs.iter().step_by(2).copied().collect();
    // Six digits, as abscissas are written.
    let largest = times.iter().fold(0.0_f64, |m, t| m.max(t.abs()));
    let quantum = 10f64.powf(largest.max(f64::MIN_POSITIVE).log10().floor() - 5.0);
    let rate = clock::rate(&times, quantum).ok_or_else(|| {
        Problem::error(
            f.name.as_str(),
            "its times tell no sampling rate: they do not rise",
        )
    })?;
    let mut steps = times.windows(2).map(|w| w[1] - w[0]);
    if steps.any(|d| (d * rate - 1.0).abs() > 0.5 + quantum * rate) {
        return Err(Problem::error(
            f.name.as_str(),
            "its times do not rise by one step from sample to sample",
        )
        .hint("uneven samples have no spectrum of this kind; store evenly spaced ones"));
    }
    Ok((rate, times.first().copied().unwrap_or(0.0)))
}

/// Looks at the first values of a binary channel in both byte orders.
fn order(path: &Path, name: &str, set: &Dataset) -> Result<Option<Problem>, Problem> {
    let Storage::Binary { big, bytes } = set.function.storage else {
        return Ok(None);
    };
    let fail = |e: std::io::Error| Problem::error(name, format!("cannot be read: {e}"));
    let of = |big: bool| -> Result<Vec<f64>, Problem> {
        let storage = Storage::Binary { big, bytes };
        let set = Dataset {
            function: Function {
                storage,
                ..set.function.clone()
            },
            ..set.clone()
        };
        let mut values = Vec::new();
        Cursor::open(path, &set)
            .map_err(fail)?
            .fill(BLOCK.min(set.there as usize), &mut values)?;
        Ok(values)
    };
    Ok(is_other_order(&of(big)?, &of(!big)?).then(|| {
        let word = if big { "big-endian" } else { "little-endian" };
        let what =
            format!("the head says {word}, and the values make sense in the other byte order only");
        Problem::error(set.function.name.as_str(), what)
            .hint("mend the byte order in the line that begins with 58b: 1 is little-endian, 2 big")
    }))
}

/// Finds the datasets 58 of a file.
fn scan(path: &Path, name: &str, warnings: &mut Vec<Problem>) -> Result<Vec<Dataset>, Problems> {
    let fail = |e: std::io::Error| Problem::error(name, format!("cannot be read: {e}"));
    let length = std::fs::metadata(path).map_err(fail)?.len();
    let from = |at: u64| -> std::io::Result<Lines<BufReader<File>>> {
        let mut file = File::open(path)?;
        file.seek(SeekFrom::Start(at))?;
        Ok(Lines::new(BufReader::with_capacity(1 << 18, file)))
    };
    let (mut lines, mut base, mut line0) = (from(0).map_err(fail)?, 0_u64, 0_u64);
    let mut found = Vec::new();
    let next = |lines: &mut Lines<BufReader<File>>| match lines.next() {
        Found::Line => Ok(true),
        Found::End => Ok(false),
        Found::Fault(what) => Err(Problem::error(name, what)),
    };
    while next(&mut lines)? {
        if lines.text().trim() != "-1" {
            continue;
        }
        if !next(&mut lines)? {
            break;
        }
        let text = lines.text().to_owned();
        let place_of = |line: u64, text: &str| -> Place { place(name, line, text, 0, text.len()) };
        let storage = header::dataset(&text).map_err(|what| {
            Problem::error(name, what).at(place_of(line0 + lines.number(), &text))
        })?;
        let Some(storage) = storage else {
            // Of a dataset that is not read only the end matters.
            while next(&mut lines)? && lines.text().trim() != "-1" {}
            continue;
        };
        let first = line0 + lines.number() + 1;
        let mut head = Vec::with_capacity(LINES);
        while head.len() < LINES && next(&mut lines)? {
            head.push(lines.text().to_owned());
        }
        if head.len() < LINES {
            let what = "the file ends in the head of a dataset 58";
            return Err(Problem::error(name, what)
                .hint("it was cut while it was copied or recorded")
                .into());
        }
        let function = header::read(storage, &head, first, place_of, name)?;
        let (at, line) = (base + lines.bytes(), line0 + lines.number() + 1);
        let mut closed = false;
        let there = match storage {
            Storage::Binary { bytes, .. } => {
                let size = if function.double { 8 } else { 4 };
                if !function.even {
                    let what = "binary values over an uneven abscissa are not read";
                    return Err(Problem::error(function.name.as_str(), what)
                        .hint("store it as text, or evenly spaced")
                        .into());
                }
                let parts = if function.complex { 2 } else { 1 };
                let wanted = function.values.saturating_mul(size * parts);
                if bytes != wanted {
                    let what = format!(
                        "its head tells of {bytes} bytes, and {} values have {wanted}",
                        function.values
                    );
                    warnings.push(Problem::warning(function.name.as_str(), what));
                }
                let there = bytes.min(length.saturating_sub(at));
                (base, line0) = (at + there, line - 1);
                lines = from(base).map_err(fail)?;
                while !closed && next(&mut lines)? {
                    closed = lines.text().trim() == "-1";
                    if !closed && !lines.text().trim().is_empty() {
                        break;
                    }
                }
                there / size
            }
            Storage::Text => {
                let mut count = 0_u64;
                let pattern = pattern(&function);
                while next(&mut lines)? {
                    closed = lines.text().trim() == "-1";
                    if closed {
                        break;
                    }
                    // What has no line end may be cut within a number.
                    if lines.ended() {
                        count += values_in(lines.text(), pattern);
                    }
                }
                if function.even { count } else { count / 2 }
            }
        };
        if !closed {
            let what = "the line `-1` that closes its dataset does not follow its values";
            warnings.push(Problem::warning(function.name.as_str(), what));
        }
        found.push(Dataset {
            function,
            at,
            line,
            there,
        });
    }
    Ok(found)
}

struct Channels {
    path: std::path::PathBuf,
    name: String,
    sets: Vec<Dataset>,
    cursors: Vec<Cursor>,
    left: u64,
}

impl Samples for Channels {
    fn select(&mut self, wanted: &[usize]) {
        let sets = wanted.iter().filter_map(|i| self.sets.get(*i));
        let opened: std::io::Result<Vec<Cursor>> =
            sets.map(|s| Cursor::open(&self.path, s)).collect();
        // A file that was there a moment ago: what fails now fails at the first block.
        self.cursors = opened.unwrap_or_default();
    }

    fn next(&mut self, blocks: &mut [Vec<f64>], problems: &mut Vec<Problem>) {
        if self.cursors.len() < blocks.len() {
            problems.push(Problem::error(
                self.name.as_str(),
                "cannot be opened again for each of its channels",
            ));
            return;
        }
        let count = self.left.min(BLOCK as u64) as usize;
        for (cursor, block) in self.cursors.iter_mut().zip(blocks) {
            let first = block.len();
            let filled = if cursor.function.even {
                cursor.fill(count, block)
            } else {
                let mut pairs = Vec::with_capacity(2 * count);
                let filled = cursor.fill(2 * count, &mut pairs);
                block.extend(pairs.iter().skip(1).step_by(2));
                filled
            };
            if let Err(problem) = filled {
                problems.push(problem);
                self.left = 0;
                return;
            }
            let fresh = block.get(first..).unwrap_or_default();
            if fresh.len() < count {
                let what = format!(
                    "has {} samples fewer than its head tells",
                    count - fresh.len()
                );
                problems.push(Problem::error(cursor.function.name.as_str(), what));
            }
            if let Some(i) = fresh.iter().position(|x| !x.is_finite()) {
                let what = format!("holds {} among its samples", fresh[i]);
                problems.push(Problem::error(cursor.function.name.as_str(), what).hint(
                    "a missing sample cannot be made up; take a stretch without it with --span",
                ));
                self.left = 0;
                return;
            }
        }
        self.left = self.left.saturating_sub(count as u64);
    }
}
