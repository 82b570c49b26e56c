//! The values of a dataset 58, read as they are asked for: text in fixed columns, or binary in either byte order.
//!
//! ```text
//! real, single  6E13.5     real, double  4E20.12     double over an uneven abscissa  2(E13.5,E20.12)
//! ```

use std::fs::File;
use std::io::{BufReader, Read, Seek, SeekFrom};
use std::path::Path;

use super::lines::{Found, Lines};
use super::samples::{place, shown};
use super::universal::Dataset;
use super::universal_header::{Function, Storage};
use crate::problems::Problem;

/// Widths of the fields of a line of values.
pub(super) fn pattern(f: &Function) -> &'static [usize] {
    match (f.double, f.even) {
        (false, _) => &[13; 6],
        (true, true) => &[20; 4],
        (true, false) => &[13, 20, 13, 20],
    }
}

pub(super) fn values_in(text: &str, pattern: &[usize]) -> u64 {
    let text = text.trim_end();
    let mut at = 0;
    let full = pattern.iter().take_while(|w| {
        at += **w;
        at <= text.len()
    });
    full.count() as u64
}

/// Reads the values of one channel.
pub(super) struct Cursor {
    name: String,
    pub function: Function,
    source: Source,
}

enum Source {
    Text {
        lines: Lines<BufReader<File>>,
        before: u64,
        values: Vec<f64>,
        used: usize,
    },
    Binary {
        file: BufReader<File>,
        bytes: Vec<u8>,
        left: u64,
    },
}

impl Cursor {
    pub fn open(path: &Path, set: &Dataset) -> std::io::Result<Cursor> {
        let mut file = File::open(path)?;
        file.seek(SeekFrom::Start(set.at))?;
        let file = BufReader::with_capacity(1 << 16, file);
        let source = match set.function.storage {
            Storage::Text => Source::Text {
                lines: Lines::new(file),
                before: set.line - 1,
                values: Vec::with_capacity(8),
                used: 0,
            },
            Storage::Binary { .. } => Source::Binary {
                file,
                bytes: Vec::new(),
                left: set.there,
            },
        };
        Ok(Cursor {
            name: path.display().to_string(),
            function: set.function.clone(),
            source,
        })
    }

    /// Appends so many values, or as many as there are; of an uneven abscissa in pairs.
    pub fn fill(&mut self, count: usize, out: &mut Vec<f64>) -> Result<(), Problem> {
        let fail = |what: String| Problem::error(self.name.as_str(), what);
        match &mut self.source {
            Source::Binary { file, bytes, left } => {
                let size = if self.function.double { 8 } else { 4 };
                let Storage::Binary { big, .. } = self.function.storage else {
                    return Ok(());
                };
                let count = count.min(usize::try_from(*left).unwrap_or(usize::MAX));
                bytes.resize(count * size, 0);
                file.read_exact(bytes)
                    .map_err(|e| fail(format!("cannot be read on: {e}")))?;
                *left -= count as u64;
                out.extend(bytes.chunks_exact(size).map(|b| float(b, big)));
                Ok(())
            }
            Source::Text {
                lines,
                before,
                values,
                used,
            } => {
                let wanted = out.len() + count;
                while out.len() < wanted {
                    if let Some(x) = values.get(*used) {
                        out.push(*x);
                        *used += 1;
                        continue;
                    }
                    match lines.next() {
                        Found::Line if lines.text().trim() != "-1" && lines.ended() => {}
                        Found::Line | Found::End => return Ok(()),
                        Found::Fault(what) => return Err(fail(what)),
                    }
                    (*used, *values) = (0, std::mem::take(values));
                    values.clear();
                    if let Err((start, end)) = parse(lines.text(), pattern(&self.function), values)
                    {
                        let line = *before + lines.number();
                        let bad = lines.text().get(start..end).unwrap_or_default();
                        let what = format!("`{}` on line {line} is no number", shown(bad.trim()));
                        return Err(Problem::error(self.function.name.as_str(), what).at(place(
                            &self.name,
                            line,
                            lines.text(),
                            start,
                            end,
                        )));
                    }
                }
                Ok(())
            }
        }
    }
}

fn float(bytes: &[u8], big: bool) -> f64 {
    if let Ok(b) = <[u8; 8]>::try_from(bytes) {
        return if big {
            f64::from_be_bytes(b)
        } else {
            f64::from_le_bytes(b)
        };
    }
    match <[u8; 4]>::try_from(bytes) {
        Ok(b) if big => f64::from(f32::from_be_bytes(b)),
        Ok(b) => f64::from(f32::from_le_bytes(b)),
        Err(_) => f64::NAN,
    }
}

/// Reads the fields of a line of values by their columns, or where that fails by words.
fn parse(text: &str, pattern: &[usize], out: &mut Vec<f64>) -> Result<(), (usize, usize)> {
    let text = text.trim_end();
    let number = |t: &str| -> Option<f64> {
        let t = t.trim();
        t.parse()
            .ok()
            .or_else(|| t.replace(['D', 'd'], "E").parse().ok())
    };
    let before = out.len();
    let (mut at, mut bad) = (0, None);
    for width in pattern {
        if at >= text.len() {
            break;
        }
        let end = (at + width).min(text.len());
        match text.get(at..end).and_then(number) {
            Some(x) => out.push(x),
            None => {
                bad = Some((at, end));
                break;
            }
        }
        at = end;
    }
    // A line longer than its fields was written in another layout.
    if bad.is_some() || at < text.len() {
        out.truncate(before);
        let words: Option<Vec<f64>> = text.split_ascii_whitespace().map(number).collect();
        match words {
            Some(words) => out.extend(words),
            None => return Err(bad.unwrap_or((at.min(text.len()), text.len()))),
        }
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn fields_are_read_by_column_and_by_word() {
        let mut out = Vec::new();
        parse(" -1.00000E+00  2.50000E+00 -3.0000E-01", &[13; 6], &mut out).unwrap();
        assert_eq!(out, [-1.0, 2.5, -0.3]);
        out.clear();
        parse("  1.5D+01 2", &[20; 4], &mut out).unwrap();
        assert_eq!(out, [15.0, 2.0]);
        assert_eq!(parse("  1.0 x", &[13; 6], &mut out), Err((0, 7)));
    }
}
