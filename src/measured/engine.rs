//! Segments of many channels, windowed and transformed, handed on as they fill.
//!
//! Samples come in blocks of any length. Each channel keeps the samples its next segments need, a batch of
//! segments at a time, and transforms them with buffers laid out beforehand: nothing is allocated once
//! the first batch is done. Channels are worked on in parallel; what is accumulated for a channel
//! depends on the order of its segments alone.

use std::sync::Arc;

use num_complex::Complex64;
use rayon::prelude::*;
use realfft::{RealFftPlanner, RealToComplex};

use super::window::{self, Window};
use crate::problems::Problem;

/// What is taken out of each segment before it is windowed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub enum Detrend {
    /// Its mean.
    #[default]
    Constant,
    /// Nothing.
    Nothing,
}

/// How a record is cut into segments.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Plan {
    /// Sampling rate (Hz).
    pub rate_hz: f64,
    /// Samples in a segment.
    pub segment: usize,
    /// Samples two neighbouring segments share.
    pub overlap: usize,
    /// Weight of the samples.
    pub window: Window,
    /// What is taken out first.
    pub detrend: Detrend,
}

/// Shortest segment (samples).
const SHORTEST: usize = 8;

impl Plan {
    /// Hann windows that overlap by half, each less its mean.
    pub fn hann(rate_hz: f64, segment: usize) -> Plan {
        Plan {
            rate_hz,
            segment,
            overlap: segment / 2,
            window: Window::Hann,
            detrend: Detrend::Constant,
        }
    }

    /// Distance between the beginnings of neighbouring segments (samples).
    pub fn step(&self) -> usize {
        self.segment - self.overlap
    }

    /// Number of bins of a one-sided spectrum.
    pub fn bins(&self) -> usize {
        self.segment / 2 + 1
    }

    /// Distance between bins (Hz).
    pub fn bin_width(&self) -> f64 {
        self.rate_hz / self.segment as f64
    }

    /// Equivalent noise bandwidth of a bin (Hz): the resolution.
    pub fn resolution(&self) -> f64 {
        window::noise_bandwidth(&self.window.weights(self.segment)) * self.bin_width()
    }

    /// Segments in a record of so many samples.
    pub fn segments_in(&self, samples: usize) -> usize {
        match samples.checked_sub(self.segment) {
            Some(rest) => rest / self.step() + 1,
            None => 0,
        }
    }

    pub(super) fn check(&self) -> Result<(), Problem> {
        if !(self.rate_hz.is_finite() && self.rate_hz > 0.0) {
            let what = format!("a sampling rate of {} Hz is none", self.rate_hz);
            return Err(Problem::error("record.rate", what));
        }
        if self.segment < SHORTEST {
            let what = format!(
                "a segment of {} samples is too short for a spectrum",
                self.segment
            );
            return Err(Problem::error("segment", what).hint("at least 8 samples"));
        }
        if self.overlap >= self.segment {
            let what = format!(
                "an overlap of {} samples leaves nothing new in a segment of {}",
                self.overlap, self.segment
            );
            return Err(Problem::error("overlap", what).hint("half a segment is usual"));
        }
        Ok(())
    }
}

/// The refusal of a record too short for a plan.
pub(super) fn too_short(plan: &Plan, samples: usize, least: usize) -> Problem {
    let want = plan.segment + (least.max(1) - 1) * plan.step();
    let what = format!(
        "the record is too short: {samples} samples ({:.4} s) where {least} segments of {} need {want} ({:.4} s)",
        samples as f64 / plan.rate_hz,
        plan.segment,
        want as f64 / plan.rate_hz,
    );
    Problem::error("record", what).hint("shorten the segments, or record for longer")
}

/// What becomes of the transforms of one channel.
pub(super) trait Sink: Send {
    /// Takes the transform of the next segment, windowed and without further scale.
    fn take(&mut self, transform: &[Complex64]);
}

struct Lane<S> {
    pending: Vec<f64>,
    windowed: Vec<f64>,
    transform: Vec<Complex64>,
    scratch: Vec<Complex64>,
    sink: S,
}

impl<S: Sink> Lane<S> {
    /// Transforms every whole segment pending and keeps the rest.
    fn work(&mut self, plan: &Plan, weights: &[f64], fft: &dyn RealToComplex<f64>) {
        let (n, step) = (plan.segment, plan.step());
        let mut at = 0;
        while at + n <= self.pending.len() {
            let samples = &self.pending[at..at + n];
            let mean = match plan.detrend {
                Detrend::Constant => sum(samples) / n as f64,
                Detrend::Nothing => 0.0,
            };
            for ((out, x), w) in self.windowed.iter_mut().zip(samples).zip(weights) {
                *out = (x - mean) * w;
            }
            // Lengths agree by construction, the only thing the transform can refuse.
            if fft
                .process_with_scratch(&mut self.windowed, &mut self.transform, &mut self.scratch)
                .is_ok()
            {
                self.sink.take(&self.transform);
            }
            at += step;
        }
        self.pending.drain(..at);
    }
}

/// A sum in eight parts, which a processor adds side by side.
fn sum(samples: &[f64]) -> f64 {
    let mut parts = [0.0; 8];
    let chunks = samples.chunks_exact(8);
    let rest: f64 = chunks.remainder().iter().sum();
    for chunk in chunks {
        for (p, x) in parts.iter_mut().zip(chunk) {
            *p += x;
        }
    }
    parts.iter().sum::<f64>() + rest
}

/// Samples a batch of segments may hold for each channel; short segments come many to a batch.
const BATCH: usize = 1 << 16;

/// The segments of several channels.
pub(super) struct Engine<S> {
    plan: Plan,
    weights: Vec<f64>,
    fft: Arc<dyn RealToComplex<f64>>,
    lanes: Vec<Lane<S>>,
    batch: usize,
    samples: usize,
    segments: usize,
}

impl<S: Sink> Engine<S> {
    pub(super) fn new(plan: Plan, sinks: Vec<S>) -> Result<Self, Problem> {
        plan.check()?;
        let fft = RealFftPlanner::new().plan_fft_forward(plan.segment);
        let batch = (BATCH / plan.step()).max(1);
        let lanes = sinks
            .into_iter()
            .map(|sink| Lane {
                pending: Vec::with_capacity(plan.segment + batch * plan.step()),
                windowed: fft.make_input_vec(),
                transform: fft.make_output_vec(),
                scratch: fft.make_scratch_vec(),
                sink,
            })
            .collect();
        Ok(Engine {
            plan,
            weights: plan.window.weights(plan.segment),
            fft,
            lanes,
            batch,
            samples: 0,
            segments: 0,
        })
    }

    pub(super) fn plan(&self) -> &Plan {
        &self.plan
    }

    pub(super) fn weights(&self) -> &[f64] {
        &self.weights
    }

    pub(super) fn samples(&self) -> usize {
        self.samples
    }

    pub(super) fn segments(&self) -> usize {
        self.segments
    }

    /// Takes the next samples of every channel, `blocks[i]` of channel `i`, all of one length, and calls
    /// `between` after each batch of segments.
    pub(super) fn feed(
        &mut self,
        blocks: &[&[f64]],
        mut between: impl FnMut(&mut [&mut S]),
    ) -> Result<(), Problem> {
        let length = blocks.first().map_or(0, |b| b.len());
        if blocks.len() != self.lanes.len() || blocks.iter().any(|b| b.len() != length) {
            let what = format!(
                "a block of {} channels where {} are awaited, or channels of unequal length",
                blocks.len(),
                self.lanes.len()
            );
            return Err(Problem::error("record", what)
                .hint("every block holds the same number of samples of every channel"));
        }
        let room = self.plan.segment + (self.batch - 1) * self.plan.step();
        let mut at = 0;
        while at < length {
            let pending = self.lanes.first().map_or(0, |l| l.pending.len());
            let take = (room - pending).min(length - at);
            for (lane, block) in self.lanes.iter_mut().zip(blocks) {
                lane.pending.extend_from_slice(&block[at..at + take]);
            }
            at += take;
            self.samples += take;
            if pending + take == room {
                self.work(&mut between);
            }
        }
        Ok(())
    }

    /// Works off the segments still pending.
    pub(super) fn finish(&mut self, mut between: impl FnMut(&mut [&mut S])) {
        self.work(&mut between);
    }

    pub(super) fn into_sinks(self) -> Vec<S> {
        self.lanes.into_iter().map(|l| l.sink).collect()
    }

    fn work(&mut self, between: &mut impl FnMut(&mut [&mut S])) {
        let pending = self.lanes.first().map_or(0, |l| l.pending.len());
        let count = self.plan.segments_in(pending);
        if count == 0 {
            return;
        }
        let (plan, weights, fft) = (&self.plan, &self.weights, &self.fft);
        self.lanes
            .par_iter_mut()
            .for_each(|lane| lane.work(plan, weights, fft.as_ref()));
        self.segments += count;
        let mut sinks: Vec<&mut S> = self.lanes.iter_mut().map(|l| &mut l.sink).collect();
        between(&mut sinks);
    }
}
