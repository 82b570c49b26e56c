//! Amplitude statistics of every narrow band, in one pass.
//!
//! A short-time transform is a bank of narrow-band filters; `P = |X|^2` at a bin is the squared envelope of the
//! signal in that band. Over segments `k` are accumulated
//!
//! ```text
//! <P>, <P^2>, <P_k P_{k+1}>, <ln P>, <X_{k+1} conj X_k>, <X_{k+2} conj X_k>
//! ```
//!
//! For Gaussian noise `X` is complex Gaussian, so `P` is exponential (its root Rayleigh): `<P^2>/<P>^2 = 2`. For a
//! steady cycle it is 1. The ratio is the kurtosis of the narrow-band signal over 1.5.

use num_complex::Complex64;

use super::engine::{Engine, Plan, Sink, too_short};
use crate::problems::Problem;

struct Sums {
    segments: usize,
    first: Vec<f64>,
    second: Vec<f64>,
    logarithm: Vec<f64>,
    lagged: Vec<f64>,
    turn: Vec<Complex64>,
    turn_twice: Vec<Complex64>,
    before: [Vec<Complex64>; 2],
}

impl Sums {
    fn new(bins: usize) -> Sums {
        let (real, complex) = (vec![0.0; bins], vec![Complex64::ZERO; bins]);
        Sums {
            segments: 0,
            first: real.clone(),
            second: real.clone(),
            logarithm: real.clone(),
            lagged: real,
            turn: complex.clone(),
            turn_twice: complex.clone(),
            before: [complex.clone(), complex],
        }
    }
}

impl Sink for Sums {
    fn take(&mut self, transform: &[Complex64]) {
        let [last, earlier] = &mut self.before;
        for (j, x) in transform.iter().enumerate() {
            let p = x.norm_sqr();
            self.first[j] += p;
            self.second[j] += p * p;
            self.logarithm[j] += p.max(f64::MIN_POSITIVE).ln();
            self.lagged[j] += p * last[j].norm_sqr();
            self.turn[j] += x * last[j].conj();
            self.turn_twice[j] += x * earlier[j].conj();
            earlier[j] = last[j];
            last[j] = *x;
        }
        self.segments += 1;
    }
}

/// What is known of the envelope in one band.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Envelope {
    /// Middle of the band (Hz).
    pub frequency: f64,
    /// Equivalent noise bandwidth (Hz).
    pub bandwidth: f64,
    /// Segments seen.
    pub segments: usize,
    /// Time between neighbouring segments (s).
    pub step: f64,
    /// `<P^2>/<P>^2`: 2 for noise, 1 for a steady cycle.
    pub ratio: f64,
    /// `<ln P> - ln <P>`: minus Euler's constant 0.577 for noise, 0 for a steady cycle.
    pub log_deficit: f64,
    /// Correlation of `P` in neighbouring segments.
    pub memory: f64,
    /// Correlation of `X` in neighbouring segments, absolute value.
    pub coherence: f64,
    /// The same two segments apart.
    pub coherence_twice: f64,
}

impl Envelope {
    /// Number of independent observations of the envelope, `K (1 - r)/(1 + r)` with `r` the correlation of
    /// neighbours and geometric decay beyond.
    pub fn independent(&self) -> f64 {
        let r = self.memory.clamp(0.0, 0.999);
        (self.segments as f64 * (1.0 - r) / (1.0 + r)).max(1.0)
    }
}

/// Accumulates envelope statistics of several channels at one segment length, block by block.
pub struct Envelopes {
    engine: Engine<Sums>,
}

impl Envelopes {
    /// For so many channels.
    ///
    /// # Errors
    /// Where the plan is none.
    pub fn new(plan: Plan, channels: usize) -> Result<Envelopes, Problem> {
        let sinks = (0..channels).map(|_| Sums::new(plan.bins())).collect();
        Ok(Envelopes {
            engine: Engine::new(plan, sinks)?,
        })
    }

    /// Takes the next samples: `blocks[i]` of channel `i`, all of one length.
    ///
    /// # Errors
    /// Where the blocks do not fit the channels.
    pub fn feed(&mut self, blocks: &[&[f64]]) -> Result<(), Problem> {
        self.engine.feed(blocks, |_| ())
    }

    /// The statistics at every bin of every channel.
    ///
    /// # Errors
    /// Where there were fewer than four segments.
    pub fn finish(mut self) -> Result<Vec<Vec<Envelope>>, Problem> {
        self.engine.finish(|_| ());
        let plan = *self.engine.plan();
        if self.engine.segments() < 4 {
            return Err(too_short(&plan, self.engine.samples(), 4));
        }
        let bandwidth = plan.resolution();
        let told = |s: Sums| -> Vec<Envelope> {
            (0..plan.bins())
                .map(|j| envelope(&plan, bandwidth, &s, j))
                .collect()
        };
        Ok(self.engine.into_sinks().into_iter().map(told).collect())
    }
}

fn envelope(plan: &Plan, bandwidth: f64, sums: &Sums, j: usize) -> Envelope {
    let n = sums.segments as f64;
    let mean = sums.first[j] / n;
    let square = sums.second[j] / n;
    let spread = square - mean * mean;
    let lagged = sums.lagged[j] / (n - 1.0) - mean * mean;
    Envelope {
        frequency: j as f64 * plan.bin_width(),
        bandwidth,
        segments: sums.segments,
        step: plan.step() as f64 / plan.rate_hz,
        ratio: square / (mean * mean),
        log_deficit: sums.logarithm[j] / n - mean.ln(),
        memory: if spread > 0.0 { lagged / spread } else { 0.0 },
        coherence: sums.turn[j].norm() / ((n - 1.0) * mean),
        coherence_twice: sums.turn_twice[j].norm() / ((n - 2.0) * mean),
    }
}
