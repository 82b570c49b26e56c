//! What the readers of the formats have in common.

use crate::problems::{Place, Problem};

/// Samples of a file, block by block, in the units of the file.
pub(super) trait Samples: Send {
    /// Chooses the channels that are read, by their number in the file; before anything is read.
    fn select(&mut self, wanted: &[usize]);

    /// Appends the next samples of every channel to its block, none at the end, and notes problems.
    fn next(&mut self, blocks: &mut [Vec<f64>], problems: &mut Vec<Problem>);

    /// Notes what only the whole file tells.
    fn finish(&mut self, _problems: &mut Vec<Problem>) {}
}

/// Longest part of a line kept with a place (bytes).
const SHOWN: usize = 400;

/// A place in a file; `start` and `end` are bytes of the line.
pub(super) fn place(file: &str, line: u64, text: &str, start: usize, end: usize) -> Place {
    let characters = |to: usize| {
        text.char_indices()
            .take_while(|(i, _)| *i < to.min(text.len()))
            .count()
    };
    let (first, last) = (characters(start), characters(end.max(start)));
    // Of a very long line nothing is shown, rather than a part that hides the place.
    let text = if text.len() > SHOWN { "" } else { text };
    Place {
        source: file.to_owned(),
        line: usize::try_from(line).unwrap_or(usize::MAX),
        column: first + 1,
        width: (last - first).max(1),
        text: text.to_owned(),
    }
}

/// Text of a file, safe and short enough for a sentence.
pub(super) fn shown(text: &str) -> String {
    let clean = |c: char| if c.is_control() { '\u{fffd}' } else { c };
    let short: String = text.chars().take(40).map(clean).collect();
    if text.chars().nth(40).is_some() {
        format!("{short}...")
    } else {
        short
    }
}

/// Problems of one kind: the first few are told each, the others counted.
#[derive(Debug, Default)]
pub(super) struct Tally {
    count: u64,
    last: usize,
}

/// Problems of one kind that are told each.
const EACH: u64 = 3;

impl Tally {
    /// Meets one more.
    pub fn meet(&mut self, problems: &mut Vec<Problem>, problem: impl FnOnce() -> Problem) {
        self.count += 1;
        if self.count <= EACH {
            self.last = problems.len();
            problems.push(problem());
        }
    }

    /// Says how many more there were.
    pub fn close(&self, problems: &mut [Problem]) {
        if let (more @ 1.., Some(last)) =
            (self.count.saturating_sub(EACH), problems.get_mut(self.last))
        {
            last.what += &format!(", and {more} more like it further on");
        }
    }
}

/// Whether values make sense in one byte order only, and that is the other: of numbers in the wrong order two in
/// three have exponents no rig knows.
pub(super) fn is_other_order(as_told: &[f64], swapped: &[f64]) -> bool {
    let sane = |x: &&f64| **x == 0.0 || (1e-12..1e12).contains(&x.abs());
    let part = |all: &[f64]| all.iter().filter(sane).count() as f64 / all.len().max(1) as f64;
    !as_told.is_empty() && part(as_told) < 0.9 && part(swapped) > 0.99
}
