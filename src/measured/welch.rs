//! Welch's average of modified periodograms (Welch 1967), for channels and pairs of them.
//!
//! ```text
//! S_xy(f_j) = (c/K) sum_k conj(X_kj) Y_kj,   X_kj = sum_m w_m (x_{kD+m} - mean_k) exp(-2 pi i j m/N)
//! ```
//!
//! over segments `k` of `N` samples, `D` apart; `c` makes it a one-sided density (per hertz) or a spectrum, see
//! [`Scaling`](super::Scaling).

use num_complex::Complex64;
use rayon::prelude::*;

use super::engine::{Engine, Plan, Sink, too_short};
use super::spectra::{Scale, Spectra};
use super::window;
use crate::problems::Problem;

/// Power sums of one channel, and the transforms of a batch for its pairs.
struct Powers {
    sum: Vec<f64>,
    /// Transforms of the batch; empty where no pair wants them.
    batch: Vec<Complex64>,
    keeps: bool,
}

impl Sink for Powers {
    fn take(&mut self, transform: &[Complex64]) {
        for (s, x) in self.sum.iter_mut().zip(transform) {
            *s += x.norm_sqr();
        }
        if self.keeps {
            self.batch.extend_from_slice(transform);
        }
    }
}

struct Pair {
    first: usize,
    second: usize,
    sum: Vec<Complex64>,
}

/// Accumulates power densities of channels and cross-spectra of pairs, block by block.
pub struct Welch {
    engine: Engine<Powers>,
    pairs: Vec<Pair>,
}

impl Welch {
    /// For so many channels, with the cross-spectra of the pairs named.
    ///
    /// # Errors
    /// Where the plan is none or a pair names a channel that is not there.
    pub fn new(plan: Plan, channels: usize, pairs: &[(usize, usize)]) -> Result<Welch, Problem> {
        plan.check()?;
        if let Some((a, b)) = pairs.iter().find(|(a, b)| a.max(b) >= &channels) {
            let what = format!("no channels {a} and {b} in a record of {channels}");
            return Err(Problem::error("channels", what));
        }
        let keeps = |i: usize| pairs.iter().any(|(a, b)| *a == i || *b == i);
        let sinks = (0..channels)
            .map(|i| Powers {
                sum: vec![0.0; plan.bins()],
                batch: Vec::new(),
                keeps: keeps(i),
            })
            .collect();
        let mut welch = Welch {
            engine: Engine::new(plan, sinks)?,
            pairs: Vec::with_capacity(pairs.len()),
        };
        welch
            .pairs
            .extend(pairs.iter().map(|&(first, second)| Pair {
                first,
                second,
                sum: vec![Complex64::ZERO; plan.bins()],
            }));
        Ok(welch)
    }

    /// For so many channels with the cross-spectrum of every two.
    ///
    /// # Errors
    /// Where the plan is none.
    pub fn of_all_pairs(plan: Plan, channels: usize) -> Result<Welch, Problem> {
        let pairs: Vec<(usize, usize)> = (0..channels)
            .flat_map(|a| (a + 1..channels).map(move |b| (a, b)))
            .collect();
        Welch::new(plan, channels, &pairs)
    }

    /// Takes the next samples: `blocks[i]` of channel `i`, all of one length.
    ///
    /// # Errors
    /// Where the blocks do not fit the channels.
    pub fn feed(&mut self, blocks: &[&[f64]]) -> Result<(), Problem> {
        let (pairs, bins) = (&mut self.pairs, self.engine.plan().bins());
        self.engine
            .feed(blocks, |powers| cross(pairs, powers, bins))
    }

    /// Ends the record; samples that fill no segment are left out.
    ///
    /// # Errors
    /// Where the record filled no segment.
    pub fn finish(mut self) -> Result<Spectra, Problem> {
        let (pairs, bins) = (&mut self.pairs, self.engine.plan().bins());
        self.engine.finish(|powers| cross(pairs, powers, bins));
        let (plan, samples) = (*self.engine.plan(), self.engine.samples());
        let count = self.engine.segments();
        if count == 0 {
            return Err(too_short(&plan, samples, 1));
        }
        let weights = self.engine.weights().to_vec();
        let scale = Scale::new(&plan, &weights, count);
        let averages = 1.0 / window::variance_of_mean(&weights, plan.step(), count);
        let powers: Vec<Vec<f64>> = self
            .engine
            .into_sinks()
            .into_iter()
            .map(|p| scale.density(p.sum))
            .collect();
        if powers.iter().flatten().any(|p| !p.is_finite()) {
            return Err(
                Problem::error("record", "a spectrum is not finite: samples are not finite, or so large that their squares overflow")
                    .hint("look for gaps in the record and for a wrong unit"),
            );
        }
        let crosses = self
            .pairs
            .into_iter()
            .map(|p| (p.first, p.second, scale.cross_density(p.sum)))
            .collect();
        Ok(Spectra::new(
            plan, samples, count, averages, powers, crosses,
        ))
    }
}

/// Adds the products of a batch to the cross-spectra of every pair, and clears it.
fn cross(pairs: &mut [Pair], powers: &mut [&mut Powers], bins: usize) {
    let held: &[&mut Powers] = powers;
    pairs.par_iter_mut().for_each(|pair| {
        let first = held[pair.first].batch.chunks_exact(bins);
        let second = held[pair.second].batch.chunks_exact(bins);
        for (x, y) in first.zip(second) {
            for ((s, x), y) in pair.sum.iter_mut().zip(x).zip(y) {
                *s += x.conj() * y;
            }
        }
    });
    for p in powers {
        p.batch.clear();
    }
}
