//! Power density over time: one row for every so many segments.

use num_complex::Complex64;

use super::engine::{Engine, Plan, Sink, too_short};
use super::spectra::Scale;
use crate::problems::Problem;

struct Rows {
    per_row: usize,
    taken: usize,
    sum: Vec<f64>,
    /// Sums of the rows done, one after the other.
    done: Vec<f64>,
}

impl Sink for Rows {
    fn take(&mut self, transform: &[Complex64]) {
        for (s, x) in self.sum.iter_mut().zip(transform) {
            *s += x.norm_sqr();
        }
        self.taken += 1;
        if self.taken == self.per_row {
            self.done.append(&mut self.sum.clone());
            self.sum.fill(0.0);
            self.taken = 0;
        }
    }
}

/// One row of a spectrogram.
#[derive(Clone, Debug, PartialEq)]
pub struct Row {
    /// Middle of the stretch (s) after the first sample.
    pub time: f64,
    /// One-sided power density at every bin (unit squared per hertz).
    pub density: Vec<f64>,
}

/// Accumulates spectrograms of several channels, block by block. Segments that fill no row are left out.
pub struct Spectrogram {
    engine: Engine<Rows>,
    per_row: usize,
}

impl Spectrogram {
    /// For so many channels, averaging so many segments for a row.
    ///
    /// # Errors
    /// Where the plan is none or a row holds no segment.
    pub fn new(plan: Plan, channels: usize, per_row: usize) -> Result<Spectrogram, Problem> {
        if per_row == 0 {
            return Err(Problem::error("averages", "a row averages no segment")
                .hint("at least one segment for a row"));
        }
        let sinks = (0..channels)
            .map(|_| Rows {
                per_row,
                taken: 0,
                sum: vec![0.0; plan.bins()],
                done: Vec::new(),
            })
            .collect();
        Ok(Spectrogram {
            engine: Engine::new(plan, sinks)?,
            per_row,
        })
    }

    /// Takes the next samples: `blocks[i]` of channel `i`, all of one length.
    ///
    /// # Errors
    /// Where the blocks do not fit the channels.
    pub fn feed(&mut self, blocks: &[&[f64]]) -> Result<(), Problem> {
        self.engine.feed(blocks, |_| ())
    }

    /// The rows of every channel.
    ///
    /// # Errors
    /// Where the record filled no row.
    pub fn finish(mut self) -> Result<Vec<Vec<Row>>, Problem> {
        self.engine.finish(|_| ());
        let (plan, per_row) = (*self.engine.plan(), self.per_row);
        if self.engine.segments() < per_row {
            return Err(too_short(&plan, self.engine.samples(), per_row));
        }
        let scale = Scale::new(&plan, self.engine.weights(), per_row);
        let (step, length) = (plan.step() as f64, plan.segment as f64);
        let spanned = (per_row - 1) as f64 * step + length;
        let rows = |r: Rows| -> Vec<Row> {
            let sums = r.done.chunks_exact(plan.bins()).enumerate();
            sums.map(|(i, sum)| Row {
                time: ((i * per_row) as f64 * step + spanned / 2.0) / plan.rate_hz,
                density: scale.density(sum.to_vec()),
            })
            .collect()
        };
        Ok(self.engine.into_sinks().into_iter().map(rows).collect())
    }
}
