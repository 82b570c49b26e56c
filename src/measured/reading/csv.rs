//! Records as text in columns: one of time, or a rate that is stated, and one for each channel.

use std::path::Path;

use super::clock::{self, Clock, Step};
use super::columns::Raw;
use super::open::{Asked, Format, Head};
use super::samples::{Samples, Tally};
use super::table::Table;
use super::{BLOCK, MOST_PROBLEMS, unit};
use crate::problems::{Problem, Problems};

/// What a column holds.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Column {
    Left,
    /// Times, with seconds per unit.
    Time(f64),
    /// A channel, by its number among those read.
    Channel(usize),
}

struct Rows {
    table: Table,
    columns: Vec<Column>,
    clock: Option<Clock>,
    /// Digits of the last field of the row before.
    digits: f64,
    /// Stretch of time that is wanted (s), by the times of the rows or by their number.
    span: (f64, f64),
    rate_hz: f64,
    rows: u64,
    over: bool,
    ragged: Tally,
    gaps: Tally,
    bad: Vec<Tally>,
}

/// Opens a record of which the header is read.
pub(super) fn head(path: &Path, table: Table, name: &str, asked: &Asked) -> Result<Head, Problems> {
    let time = time_column(&table);
    let mut peeked = table;
    let begun = peeked.bytes();
    let (mut times, mut quantum, mut rows) = (Vec::new(), f64::INFINITY, 0_u64);
    while rows < BLOCK as u64 && peeked.row()? {
        rows += 1;
        if let Some((column, factor)) = time
            && !peeked.cut()
        {
            let Some(t) = peeked.number(column).filter(|t| t.is_finite()) else {
                return Err(no_time(&peeked, column).into());
            };
            quantum = quantum.min(factor * clock::quantum(peeked.field(column)));
            times.push(t * factor);
        }
    }
    if rows == 0 {
        let problem = Problem::error(name, "there is a header and no row of samples");
        return Err(problem.into());
    }
    let (rate_hz, start) = match (time, asked.rate_hz) {
        (None, None) => {
            let what = "there is no column of time and no sampling rate";
            return Err(Problem::error(name, what)
                .hint("name the column, as in \"time [s]\", or give --rate")
                .into());
        }
        (None, Some(rate)) => (rate, 0.0),
        (Some((column, _)), _) => {
            let rate = clock::rate(&times, quantum).ok_or_else(|| {
                let what = format!(
                    "the times in column {} tell no sampling rate: they do not rise, or there are fewer than two",
                    column + 1
                );
                Problem::error(name, what).hint("times rise by one step from row to row")
            })?;
            (rate, times.first().copied().unwrap_or(0.0))
        }
    };
    let per_row = ((peeked.bytes() - begun) as f64 / rows as f64).max(1.0);
    let length = std::fs::metadata(path).map_or(0, |m| m.len());
    let expected = if rows < BLOCK as u64 {
        rows
    } else {
        ((length.saturating_sub(begun)) as f64 / per_row) as u64
    };
    // What was looked at is read again from the top.
    let table = Table::open(path, name, asked.names.as_deref())?;
    let channels = (table.heads.iter().enumerate())
        .map(|(i, h)| Raw {
            skipped: h.label.name == "-" || time.is_some_and(|(c, _)| c == i),
            ..Raw::new(h.label.clone(), h.place.clone())
        })
        .collect();
    let mut columns = vec![Column::Left; table.heads.len()];
    if let Some((i, factor)) = time
        && let Some(column) = columns.get_mut(i)
    {
        *column = Column::Time(factor);
    }
    let notes = table.notes.clone();
    let rows = Rows {
        clock: time.map(|_| Clock::new(rate_hz, quantum)),
        table,
        columns,
        digits: 0.0,
        span: asked.span.unwrap_or((f64::NEG_INFINITY, f64::INFINITY)),
        rate_hz,
        rows: 0,
        over: false,
        ragged: Tally::default(),
        gaps: Tally::default(),
        bad: Vec::new(),
    };
    Ok(Head {
        format: Format::Csv,
        rate_hz,
        start,
        channels,
        expected,
        notes,
        samples: Box::new(rows),
        cuts_itself: true,
        warnings: Vec::new(),
    })
}

/// The column of time with seconds per unit: the first one with a unit of time, or called so without a unit.
fn time_column(table: &Table) -> Option<(usize, f64)> {
    let heads = || {
        table
            .heads
            .iter()
            .enumerate()
            .filter(|(_, h)| h.label.name != "-")
    };
    let by_unit = heads().find_map(|(i, h)| Some((i, unit::time(h.label.unit.as_deref()?)?)));
    by_unit.or_else(|| {
        let called = |name: &str| matches!(name.to_lowercase().as_str(), "time" | "t");
        let (i, _) = heads().find(|(_, h)| h.label.unit.is_none() && called(&h.label.name))?;
        Some((i, 1.0))
    })
}

fn no_time(table: &Table, column: usize) -> Problem {
    let mut problem = table.bad(column);
    if table.field(column).contains(':') {
        problem = problem
            .hint("write times in seconds, or leave the column out with --names and give --rate");
    }
    problem
}

impl Samples for Rows {
    fn select(&mut self, wanted: &[usize]) {
        for (i, column) in wanted.iter().enumerate() {
            if let Some(slot) = self.columns.get_mut(*column) {
                *slot = Column::Channel(i);
            }
        }
        self.bad = self.columns.iter().map(|_| Tally::default()).collect();
    }

    fn next(&mut self, blocks: &mut [Vec<f64>], problems: &mut Vec<Problem>) {
        let before = blocks.first().map_or(0, Vec::len);
        // Rows left out fill no block, and an empty one would be the end.
        while !self.over && blocks.first().map_or(0, Vec::len) < before + BLOCK {
            match self.table.row() {
                Ok(true) => self.row(blocks, problems),
                Ok(false) => self.over = true,
                Err(problem) => {
                    problems.push(problem);
                    self.over = true;
                }
            }
        }
    }

    fn finish(&mut self, problems: &mut Vec<Problem>) {
        self.ragged.close(problems);
        self.gaps.close(problems);
        for tally in &self.bad {
            tally.close(problems);
        }
        if let Some(clock) = &self.clock {
            problems.extend(clock.remarks(&self.table.file));
        }
    }
}

impl Rows {
    /// Whether the row lies in the stretch asked for; what lies outside is not judged.
    fn wanted(&mut self) -> bool {
        let times = |c: &Column| matches!(c, Column::Time(_));
        let column = self.columns.iter().position(times);
        let time = match column.and_then(|i| Some((i, self.columns.get(i)?))) {
            Some((i, Column::Time(factor))) => self.table.number(i).map(|t| t * factor),
            _ => Some(self.rows as f64 / self.rate_hz),
        };
        self.rows += 1;
        let half = 0.5 / self.rate_hz;
        let Some(time) = time.filter(|t| t.is_finite()) else {
            return true;
        };
        self.over = time >= self.span.1 - half;
        time >= self.span.0 - half && !self.over
    }

    fn row(&mut self, blocks: &mut [Vec<f64>], problems: &mut Vec<Problem>) {
        if !self.wanted() {
            return;
        }
        if problems.len() >= MOST_PROBLEMS {
            self.over = true;
            return;
        }
        let table = &self.table;
        let width = self.columns.len();
        let last = width.saturating_sub(1);
        if table.cut() && (table.width() < width || self.is_cut_short(last)) {
            let what = format!(
                "the file ends in the middle of line {}: that row is left out",
                table.line()
            );
            problems.push(
                Problem::warning(table.file.as_str(), what)
                    .hint("the recording was cut off, or the disk was full")
                    .at(table.place(None)),
            );
            return;
        }
        // A delimiter behind the last number makes an empty field.
        let trailing = table.width() == width + 1 && table.field(width).is_empty();
        if table.width() != width && !trailing {
            self.ragged.meet(problems, || table.ragged());
            return;
        }
        self.digits = clock::quantum(table.field(last));
        for (i, column) in self.columns.iter().enumerate() {
            let factor = match column {
                Column::Left => continue,
                Column::Time(factor) => Some(*factor),
                Column::Channel(_) => None,
            };
            let value = table.number(i).filter(|x| x.is_finite());
            let Some(value) = value else {
                if let Some(tally) = self.bad.get_mut(i) {
                    tally.meet(problems, || table.bad(i));
                }
                if let Column::Channel(k) = column
                    && let Some(block) = blocks.get_mut(*k)
                {
                    block.push(0.0);
                }
                continue;
            };
            match (factor, column, &mut self.clock) {
                (Some(factor), _, Some(clock)) => {
                    let wrong = match clock.tick(value * factor) {
                        Step::Sound => continue,
                        Step::Gap(missing) => {
                            format!(
                                "{missing:.0} samples are missing before line {}",
                                table.line()
                            )
                        }
                        Step::Back => format!(
                            "time does not rise from the line before to line {}",
                            table.line()
                        ),
                    };
                    self.gaps.meet(problems, || {
                        Problem::error(table.file.as_str(), wrong)
                            .hint("a gap cannot be filled without inventing data; take a stretch without it with --span")
                            .at(table.place(Some(i)))
                    });
                }
                (_, Column::Channel(k), _) => {
                    if let Some(block) = blocks.get_mut(*k) {
                        block.push(value);
                    }
                }
                _ => {}
            }
        }
    }

    /// Whether the last field of a row without a line end has fewer digits than the one above.
    fn is_cut_short(&self, last: usize) -> bool {
        let text = self.table.field(last);
        text.is_empty()
            || self.table.number(last).is_none()
            || clock::quantum(text) > 1.5 * self.digits
    }
}
