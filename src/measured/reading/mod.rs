//! Records and spectra from files, block by block.
//!
//! ```text
//! bytes -> format (by content) -> columns with units -> calibration -> blocks in SI
//! ```
//!
//! A file is read in one pass and with memory that does not grow with it. What is wrong with it is collected, each
//! with its line and column, and told at the end; what is doubtful qualifies the answer. No sample is made up:
//! a gap or a sample that is no number forbids an analysis across it.

mod clock;
mod columns;
mod csv;
mod health;
mod lines;
mod open;
mod samples;
mod spectrum;
mod table;
mod transducer;
mod universal;
mod universal_header;
mod universal_values;
mod wav;

pub mod unit;

pub use health::Health;
pub use open::{Asked, Format, Opened, open};
pub use spectrum::{Column, Line, MeasuredSpectrum};
pub use transducer::Transducer;

use crate::measured::Quantity;
use crate::problems::{Problem, Problems};
use samples::Samples;

/// Most problems of a file that are told; reading stops there.
pub const MOST_PROBLEMS: usize = 20;

/// Samples of each channel read at a time.
pub const BLOCK: usize = 8192;

/// A channel as it is read.
#[derive(Clone, Debug, PartialEq)]
pub struct Signal {
    /// Its name, one of its kind in the record.
    pub name: String,
    /// What it measures, after calibration.
    pub quantity: Quantity,
    /// SI unit of a sample over one in the file.
    pub factor: f64,
    /// What one in the file stands for, for people: `kPa`, `full scale`.
    pub written_in: String,
}

/// A record that is being read.
pub struct Recording {
    /// The file as it was named.
    pub file: String,
    /// Its format.
    pub format: Format,
    /// Sampling rate (Hz).
    pub rate_hz: f64,
    /// Time of the first sample handed out (s), on the record's own clock.
    pub start: f64,
    /// The channels.
    pub signals: Vec<Signal>,
    /// Samples of each channel to come; an estimate where the file does not say.
    pub expected: u64,
    /// What the file says of itself: comments, titles.
    pub notes: Vec<String>,
    samples: Box<dyn Samples>,
    /// Samples still to be left out at the beginning, and to be handed out then.
    skip: u64,
    take: u64,
    blocks: Vec<Vec<f64>>,
    health: Vec<Health>,
    read: u64,
    problems: Vec<Problem>,
    done: bool,
    /// Copy of a pipe, which lasts as long as it is read.
    _spooled: Option<tempfile::NamedTempFile>,
}

impl Recording {
    /// The next samples of every channel in SI, all of one length; `None` at the end. Once a problem forbids an answer
    /// the file is read on for further ones, and what is handed out is no longer sound.
    pub fn block(&mut self) -> Option<Vec<&[f64]>> {
        while !self.done {
            for block in &mut self.blocks {
                block.clear();
            }
            self.samples.next(&mut self.blocks, &mut self.problems);
            let n = self.blocks.iter().map(Vec::len).min().unwrap_or(0);
            self.done = n == 0 || self.too_many();
            let from = usize::try_from(self.skip).unwrap_or(usize::MAX).min(n);
            self.skip -= from as u64;
            let left = usize::try_from(self.take - self.read).unwrap_or(usize::MAX);
            let to = from + left.min(n - from);
            if to == from {
                self.done |= left == 0;
                continue;
            }
            for ((block, signal), health) in self
                .blocks
                .iter_mut()
                .zip(&self.signals)
                .zip(&mut self.health)
            {
                let part = block.get_mut(from..to).unwrap_or_default();
                health.feed(part);
                for x in part {
                    *x *= signal.factor;
                }
            }
            self.read += (to - from) as u64;
            let parts = self
                .blocks
                .iter()
                .map(|b| b.get(from..to).unwrap_or_default());
            return Some(parts.collect());
        }
        None
    }

    fn too_many(&self) -> bool {
        self.problems.len() >= MOST_PROBLEMS && self.failed()
    }

    /// Whether a problem forbids an answer already.
    pub fn failed(&self) -> bool {
        let errors = |p: &Problem| p.severity == crate::problems::Severity::Error;
        self.problems.iter().any(errors)
    }

    /// Samples of each channel handed out so far.
    pub fn read(&self) -> u64 {
        self.read
    }

    /// What was seen of each channel's samples, as they stand in the file.
    pub fn health(&self) -> &[Health] {
        &self.health
    }

    /// Ends the reading: what qualifies the record.
    ///
    /// # Errors
    /// Every problem, where one forbids an answer.
    pub fn finish(mut self) -> Result<Vec<Problem>, Problems> {
        if !self.too_many() {
            self.samples.finish(&mut self.problems);
        }
        for (signal, health) in self.signals.iter().zip(&self.health) {
            self.problems
                .extend(health.remarks(&signal.name, self.rate_hz, self.start));
        }
        if self.read == 0 && !self.failed() {
            let what = "there are no samples in it, or none in the stretch asked for";
            self.problems.push(Problem::error(self.file.clone(), what));
        }
        let (failed, problems) = (self.failed(), Problems(self.problems));
        if failed {
            Err(problems)
        } else {
            Ok(problems.0)
        }
    }
}
