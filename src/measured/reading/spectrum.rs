//! Spectra as text: a column of frequencies, and amplitudes or power densities in the units of the trade.
//!
//! With `x` the rms of a line in SI, a unit is read as
//!
//! ```text
//! Pa, Pa rms: x      Pa peak: sqrt(2) x      Pa pp: 2 sqrt(2) x      Pa^2: x^2
//! Pa^2/Hz: density   Pa/sqrt(Hz): its root   dB re 20 uPa: 20 lg(x/20 uPa), or 10 lg of a density with /Hz
//! ```
//!
//! for every unit of a channel (kPa, psi, m/s, ...). Amplitudes without a word are rms, as levels in dB are (common
//! practice); a header that means peaks must say so.

use super::table::Table;
use super::unit::{self, EXAMPLES};
use crate::measured::Quantity;
use crate::problems::{Problem, Problems};

/// What a value of a spectrum says, in SI.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Line {
    /// Root mean square of a line (unit).
    Rms,
    /// One-sided power density (unit squared per hertz).
    Density,
}

/// One column of a spectrum.
#[derive(Clone, Debug, PartialEq)]
pub struct Column {
    /// Its name.
    pub name: String,
    /// What it measures.
    pub quantity: Quantity,
    /// What its values say.
    pub line: Line,
    /// The unit as written.
    pub written_in: String,
    /// A value for each frequency, in SI.
    pub values: Vec<f64>,
}

/// A spectrum as read.
#[derive(Clone, Debug, PartialEq)]
pub struct MeasuredSpectrum {
    /// The file as it was named.
    pub file: String,
    /// Frequencies (Hz), rising.
    pub frequency: Vec<f64>,
    /// Its columns.
    pub columns: Vec<Column>,
    /// What the file says of itself.
    pub notes: Vec<String>,
    /// What qualifies it.
    pub warnings: Vec<Problem>,
}

/// How a value becomes SI.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Reading {
    /// Times a factor.
    Linear(f64),
    /// Root of the value times a factor.
    Squared(f64),
    /// Square of the value times a factor.
    Rooted(f64),
    /// `factor 10^(value/scale)`.
    Decibel { factor: f64, scale: f64 },
}

impl Reading {
    fn si(self, x: f64) -> f64 {
        match self {
            Reading::Linear(f) => f * x,
            Reading::Squared(f) => f * x.sqrt(),
            Reading::Rooted(f) => f * x * x,
            Reading::Decibel { factor, scale } => factor * 10f64.powf(x / scale),
        }
    }
}

/// What a unit says; `None` where it is none.
fn reading(text: &str) -> Option<(Quantity, Line, Reading)> {
    let text = text.trim();
    if let Some(rest) = text.strip_prefix("dB") {
        let (rest, per_hertz) = match rest.strip_suffix("/Hz") {
            Some(rest) => (rest, true),
            None => (rest, false),
        };
        let reference = match rest.trim() {
            "" => "20 uPa",
            rest => rest.strip_prefix("re ")?.trim(),
        };
        let digits =
            reference.find(|c: char| !c.is_ascii_digit() && c != '.' && c != 'e' && c != '-')?;
        let (number, unit) = reference.split_at(digits);
        let number: f64 = if number.is_empty() {
            1.0
        } else {
            number.parse().ok()?
        };
        let scale = unit::scale(unit)?;
        let one = number * scale.factor;
        return (one > 0.0).then_some(if per_hertz {
            (
                scale.quantity,
                Line::Density,
                Reading::Decibel {
                    factor: one * one,
                    scale: 10.0,
                },
            )
        } else {
            (
                scale.quantity,
                Line::Rms,
                Reading::Decibel {
                    factor: one,
                    scale: 20.0,
                },
            )
        });
    }
    for (ending, kind) in [
        ("^2/Hz", 0),
        ("\u{b2}/Hz", 0),
        ("/sqrt(Hz)", 1),
        ("/rtHz", 1),
        ("/\u{221a}Hz", 1),
        ("^2", 2),
        ("\u{b2}", 2),
        (" rms", 3),
        (" RMS", 3),
        (" peak", 4),
        (" pk", 4),
        (" pp", 5),
        (" peak-to-peak", 5),
        (" pk-pk", 5),
    ] {
        let Some(scale) = text.strip_suffix(ending).and_then(unit::scale) else {
            continue;
        };
        let f = scale.factor;
        let (line, how) = match kind {
            0 => (Line::Density, Reading::Linear(f * f)),
            1 => (Line::Density, Reading::Rooted(f * f)),
            2 => (Line::Rms, Reading::Squared(f)),
            3 => (Line::Rms, Reading::Linear(f)),
            4 => (Line::Rms, Reading::Linear(f / 2f64.sqrt())),
            _ => (Line::Rms, Reading::Linear(f / 8f64.sqrt())),
        };
        return Some((scale.quantity, line, how));
    }
    let scale = unit::scale(text)?;
    Some((scale.quantity, Line::Rms, Reading::Linear(scale.factor)))
}

/// Fewest frequencies of a spectrum.
const FEWEST: usize = 8;

/// Reads a table whose first column is frequency.
pub(super) fn read(mut table: Table) -> Result<MeasuredSpectrum, Problems> {
    let mut problems = Problems::new();
    let heads = table.heads.clone();
    let hertz = heads
        .first()
        .and_then(|h| unit::frequency(h.label.unit.as_deref()?))
        .unwrap_or(1.0);
    let mut readings = Vec::new();
    let mut columns: Vec<Column> = Vec::new();
    let mut warnings = Vec::new();
    for (i, head) in heads
        .iter()
        .enumerate()
        .skip(1)
        .filter(|(_, h)| h.label.name != "-")
    {
        let at = |p: Problem| match head.place.clone() {
            Some(place) => p.at(place),
            None => p,
        };
        let name = head.label.name.as_str();
        let unit = head.label.unit.clone().unwrap_or_default();
        if columns.iter().any(|c| c.name == name) {
            problems
                .push(at(Problem::error(name, "two columns have this name")
                    .hint("name them with --names")));
        }
        let Some((quantity, line, how)) = reading(&unit) else {
            let what = if unit.is_empty() {
                "has no unit".to_owned()
            } else {
                format!("`{unit}` is no unit of a spectrum")
            };
            problems.push(at(Problem::error(name, what).hint(format!(
                "say unit and kind, as Pa rms, Pa peak, Pa pp, Pa^2/Hz, Pa/sqrt(Hz) or dB re 20 uPa; the unit may be {EXAMPLES}"
            ))));
            continue;
        };
        if matches!(how, Reading::Linear(_)) && line == Line::Rms && !unit.contains(' ') {
            let what = format!(
                "`{unit}` does not say whether amplitudes are rms, peak or peak-to-peak: rms is taken"
            );
            warnings.push(at(
                Problem::warning(name, what).hint("write rms, peak or pp behind the unit")
            ));
        }
        readings.push((i, how));
        columns.push(Column {
            name: name.to_owned(),
            quantity,
            line,
            written_in: unit,
            values: Vec::new(),
        });
    }
    let mut frequency: Vec<f64> = Vec::new();
    while problems.0.len() < super::MOST_PROBLEMS {
        match table.row() {
            Ok(true) => {}
            Ok(false) => break,
            Err(problem) => {
                problems.push(problem);
                break;
            }
        }
        if table.width() != heads.len() {
            if table.cut() {
                let what = format!(
                    "the file ends in the middle of line {}: that row is left out",
                    table.line()
                );
                warnings.push(Problem::warning(table.file.as_str(), what).at(table.place(None)));
                break;
            }
            problems.push(table.ragged());
            continue;
        }
        let Some(f) = table.number(0).map(|f| f * hertz).filter(|f| f.is_finite()) else {
            problems.push(table.bad(0));
            continue;
        };
        if f < 0.0 || frequency.last().is_some_and(|last| f <= *last) {
            let what = format!(
                "the frequency on line {} does not rise from zero up",
                table.line()
            );
            problems.push(Problem::error(table.file.as_str(), what).at(table.place(Some(0))));
            continue;
        }
        frequency.push(f);
        for ((i, how), column) in readings.iter().zip(&mut columns) {
            match table
                .number(*i)
                .map(|x| how.si(x))
                .filter(|x| x.is_finite() && *x >= 0.0)
            {
                Some(x) => column.values.push(x),
                None => {
                    let mut bad = table.bad(*i);
                    if table.number(*i).is_some_and(f64::is_finite) {
                        bad.what =
                            format!("`{}` on line {} is negative", table.field(*i), table.line());
                        bad.hint = Some(
                            "amplitudes and powers are not; decibels say so in their unit"
                                .to_owned(),
                        );
                    }
                    problems.push(bad);
                }
            }
        }
    }
    if columns.is_empty() && !problems.any_error() {
        problems.push(Problem::error(
            table.file.as_str(),
            "there is no column beside the frequency",
        ));
    }
    if frequency.len() < FEWEST && !problems.any_error() {
        let what = format!("a spectrum of {} frequencies is too short", frequency.len());
        problems.push(Problem::error(table.file.as_str(), what));
    }
    if problems.any_error() {
        problems.0.extend(warnings);
        return Err(problems);
    }
    Ok(MeasuredSpectrum {
        file: table.file,
        frequency,
        columns,
        notes: table.notes,
        warnings,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A pressure of 1 Pa rms is 93.98 dB re 20 uPa (common practice: the level of a calibrator at 94 dB).
    #[test]
    fn units_of_the_trade_mean_the_same_line() {
        let rms = |unit: &str, x: f64| {
            let (quantity, line, how) = reading(unit).unwrap();
            assert_eq!((quantity, line), (Quantity::Pressure, Line::Rms), "{unit}");
            how.si(x)
        };
        for (unit, x) in [
            ("Pa", 1.0),
            ("Pa rms", 1.0),
            ("Pa peak", 2f64.sqrt()),
            ("Pa pp", 2.0 * 2f64.sqrt()),
            ("Pa^2", 1.0),
            ("dB re 20 uPa", 93.979_400_086_720_37),
            ("dB", 93.979_400_086_720_37),
            ("dB re 1 Pa", 0.0),
            ("psi rms", 1.0 / 6_894.757_293_168_36),
        ] {
            assert!(
                (rms(unit, x) - 1.0).abs() < 1e-12,
                "{unit}: {}",
                rms(unit, x)
            );
        }
        for (unit, x) in [
            ("Pa^2/Hz", 4.0),
            ("Pa/sqrt(Hz)", 2.0),
            ("dB re 20 uPa/Hz", 100.0),
        ] {
            let (_, line, how) = reading(unit).unwrap();
            assert!(
                line == Line::Density && (how.si(x) - 4.0).abs() < 1e-12,
                "{unit}: {}",
                how.si(x)
            );
        }
        for unit in ["", "Hz", "Pa/Hz", "dB re", "dB re x", "dBm"] {
            assert!(reading(unit).is_none(), "{unit}");
        }
    }
}
