//! The response of a transducer as a table: frequency, gain, phase.

use std::path::Path;

use num_complex::Complex64;

use super::table::Table;
use super::unit;
use crate::problems::{Problem, Problems};
use crate::units::{self, Dimension};

/// Measured over true, against frequency; between rows by straight lines of gain and phase, beyond the ends by
/// nothing.
#[derive(Clone, Debug, PartialEq)]
pub struct Transducer {
    /// The file.
    pub file: String,
    rows: Vec<(f64, f64, f64)>,
}

impl Transducer {
    /// Reads columns of frequency, gain (a number, or dB) and, where it is there, phase (deg or rad).
    ///
    /// # Errors
    /// Every problem of the file.
    pub fn read(path: &Path) -> Result<Transducer, Problems> {
        let file = path.display().to_string();
        let mut table = Table::open(path, &file, None)?;
        let heads = table.heads.clone();
        let unit_of = |i: usize| {
            heads
                .get(i)
                .and_then(|h| h.label.unit.clone())
                .unwrap_or_default()
        };
        let Some(hertz) = unit::frequency(&unit_of(0)) else {
            let what = "the first column is no frequency";
            return Err(Problem::error(file, what)
                .hint("head it with \"frequency [Hz]\"")
                .into());
        };
        let decibel = unit_of(1) == "dB";
        let angle = match unit_of(2).as_str() {
            "" if heads.len() < 3 => 0.0,
            text => units::parse(&format!("1 {text}"), Dimension::Angle).map_err(|_| {
                Problem::error(file.as_str(), "the third column is no phase")
                    .hint("head it with \"phase [deg]\"")
            })?,
        };
        if heads.len() < 2 || !(decibel || matches!(unit_of(1).as_str(), "" | "1" | "-")) {
            let what = "the second column is no gain";
            return Err(Problem::error(file, what)
                .hint("head it with \"gain\" or \"gain [dB]\"")
                .into());
        }
        let mut problems = Problems::new();
        let mut rows: Vec<(f64, f64, f64)> = Vec::new();
        while table.row()? && problems.0.len() < super::MOST_PROBLEMS {
            if table.width() != heads.len() {
                problems.push(table.ragged());
                continue;
            }
            let of = |i: usize| table.number(i).filter(|x| x.is_finite());
            let columns = heads.len().min(3);
            if let Some(i) = (0..columns).find(|i| of(*i).is_none()) {
                problems.push(table.bad(i));
                continue;
            }
            let f = of(0).unwrap_or(0.0) * hertz;
            let gain = of(1).unwrap_or(0.0);
            let gain = if decibel {
                10f64.powf(gain / 20.0)
            } else {
                gain
            };
            let phase = if columns > 2 {
                of(2).unwrap_or(0.0) * angle
            } else {
                0.0
            };
            if rows.last().is_some_and(|(last, ..)| f <= *last) || f < 0.0 {
                let what = format!("the frequency on line {} does not rise", table.line());
                problems.push(Problem::error(file.as_str(), what).at(table.place(Some(0))));
            } else if gain <= 0.0 {
                let what = format!("the gain on line {} is not positive", table.line());
                problems.push(Problem::error(file.as_str(), what).at(table.place(Some(1))));
            } else {
                rows.push((f, gain, phase));
            }
        }
        if rows.is_empty() && !problems.any_error() {
            problems.push(Problem::error(file.as_str(), "there is no row in it"));
        }
        if problems.any_error() {
            return Err(problems);
        }
        Ok(Transducer { file, rows })
    }

    /// Measured over true at a frequency (Hz); `None` outside the table.
    pub fn at(&self, frequency: f64) -> Option<Complex64> {
        let (first, last) = (self.rows.first()?, self.rows.last()?);
        if frequency < first.0 || frequency > last.0 {
            return None;
        }
        let k = self.rows.partition_point(|r| r.0 <= frequency);
        let (a, b) = (
            self.rows.get(k.checked_sub(1)?)?,
            self.rows.get(k).unwrap_or(last),
        );
        let t = if b.0 > a.0 {
            (frequency - a.0) / (b.0 - a.0)
        } else {
            0.0
        };
        Some(Complex64::from_polar(
            a.1 + t * (b.1 - a.1),
            a.2 + t * (b.2 - a.2),
        ))
    }

    /// Lowest and highest frequency of the table (Hz).
    pub fn span(&self) -> (f64, f64) {
        let first = self.rows.first().map_or(0.0, |r| r.0);
        (first, self.rows.last().map_or(first, |r| r.0))
    }
}
