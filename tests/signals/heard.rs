//! What is found in synthetic records of the rigs, held against what was played and what can be known at best.

use std::f64::consts::{PI, TAU};

use rayon::prelude::*;
use stillflame::measured::nature::{Evidence, Verdict, weigh};
use stillflame::measured::peaks::{Peak, Peaks, Search, find, find_together};
use stillflame::measured::{Envelopes, Plan, Record, Spectra, Welch};

use crate::rigs::{self, Bound, RATE, Rig};

pub const SECONDS: f64 = 60.0;
pub const LOW: f64 = 10.0;

/// What was found in one record: at its first sensor, and by all together.
#[derive(Debug)]
pub struct Heard {
    pub peaks: Peaks,
    pub evidence: Vec<Evidence>,
    pub shared: Option<Peaks>,
}

/// Segment lengths of the envelopes (samples).
const LENGTHS: [usize; 4] = [256, 512, 1024, 2048];

/// Evidence for each peak of the first sensor, in the order of the peaks.
fn evidence(record: &Record, spectra: &Spectra, peaks: &[Peak]) -> Vec<Evidence> {
    let first = &record.blocks()[..1];
    let banks: Vec<_> = LENGTHS
        .iter()
        .map(|n| {
            let mut envelopes = Envelopes::new(Plan::hann(RATE, *n), 1).unwrap();
            envelopes.feed(first).unwrap();
            envelopes.finish().unwrap().remove(0)
        })
        .collect();
    let frequencies: Vec<f64> = peaks.iter().map(|p| p.frequency.value).collect();
    let resolution = spectra.plan().resolution();
    peaks
        .iter()
        .map(|peak| weigh(peak, &frequencies, &banks, resolution).unwrap())
        .collect()
}

pub fn hear(rig: &Rig, seconds: f64, seed: u64, together: bool) -> Heard {
    let record = rigs::record(rig, seconds, seed);
    // Segments of a thirty-second of the record.
    let segment = record.len() / 64 * 2;
    let mut welch = Welch::of_all_pairs(Plan::hann(RATE, segment), record.channels.len()).unwrap();
    welch.feed(&record.blocks()).unwrap();
    let spectra = welch.finish().unwrap();
    let search = Search {
        low: LOW,
        high: 1.15 * rig.top,
        most: 20,
    };
    let peaks = find(&spectra, 0, search).unwrap();
    let evidence = evidence(&record, &spectra, &peaks.peaks);
    let shared = together.then(|| find_together(&spectra, &[0, 1, 2], search).unwrap());
    Heard {
        peaks,
        evidence,
        shared,
    }
}

/// A minute of a rig for each of some seeds.
pub fn minutes(rig: &Rig, seeds: std::ops::Range<u64>) -> Vec<Heard> {
    let heard = seeds.into_par_iter();
    heard.map(|seed| hear(rig, SECONDS, seed, true)).collect()
}

/// How one mode fared over many records.
pub struct Fared {
    pub bound: Bound,
    pub records: usize,
    /// Records in which a peak stands for it.
    pub seen: usize,
    /// Whose frequency is within 0.2 % or twice the bound; whose interval holds the decay rate.
    pub near: usize,
    pub held: usize,
    /// Median width of the interval over that of the bound.
    pub width: f64,
}

impl Fared {
    pub fn reached(&self) -> bool {
        let enough = |n: usize| 10 * n >= 9 * self.records;
        enough(self.near) && enough(self.held) && self.width <= 1.5
    }
}

/// Every mode that decays: the peak that stands for it is the one nearest to it in the plane of decay rate and frequency, if none of the
/// other modes is nearer to that peak, and within a full width at half power.
pub fn fared(rig: &Rig, heard: &[Heard]) -> Vec<Fared> {
    let all = rigs::bounds(rig, &rigs::sound(SECONDS, 0), LOW, 1.15 * rig.top);
    let places: Vec<(f64, f64)> = all.iter().map(|b| (b.frequency, b.decay)).collect();
    let off =
        |p: &Peak, (f, nu): (f64, f64)| (TAU * (p.frequency.value - f)).hypot(p.decay.value - nu);
    let of = |bound: Bound| {
        let own = (bound.frequency, bound.decay);
        let stands = |p: &&Peak| {
            p.resolved
                && (p.frequency.value - own.0).abs() < own.1 / PI
                && places.iter().all(|o| off(p, *o) >= off(p, own))
        };
        let (mut seen, mut near, mut held, mut widths) = (0, 0, 0, Vec::new());
        for found in heard.iter().flat_map(|h| &h.shared) {
            let nearest = (found.peaks.iter().filter(stands))
                .min_by(|a, b| off(a, own).total_cmp(&off(b, own)));
            let Some(peak) = nearest else { continue };
            let allowed = (0.002 * bound.frequency).max(2.0 * bound.frequency_deviation);
            seen += 1;
            near += usize::from((peak.frequency.value - bound.frequency).abs() <= allowed);
            held += usize::from(peak.decay.holds(bound.decay));
            widths.push(peak.decay.width() / (2.0 * 1.96 * bound.decay_deviation));
        }
        widths.sort_by(f64::total_cmp);
        Fared {
            bound,
            records: heard.len(),
            seen,
            near,
            held,
            width: widths
                .get(widths.len() / 2)
                .copied()
                .unwrap_or(f64::INFINITY),
        }
    };
    all.into_iter().map(of).collect()
}

/// Growth rate of the mode a peak stands for: the nearest, within a full width at half power.
fn growth(rig: &Rig, peak: &Peak) -> Option<f64> {
    let off = |f: f64| (f / TAU - peak.frequency.value).abs();
    let modes = rig.parts.iter().map(|p| p.s);
    let nearest = modes.min_by(|a, b| off(a.im).total_cmp(&off(b.im)))?;
    (off(nearest.im) < nearest.re.abs() / PI).then_some(nearest.re)
}

/// Peaks of one record that are told for what they are not, and cycles missed, of what `abs(sigma) T >= 50` asks for.
pub fn misjudged(rig: &Rig, seconds: f64, heard: &Heard) -> Vec<String> {
    let mut wrong = Vec::new();
    let mut cycles = 0;
    for (peak, told) in heard.peaks.peaks.iter().zip(&heard.evidence) {
        let Some(growth) = growth(rig, peak) else {
            continue;
        };
        cycles += usize::from(told.verdict == Verdict::Cycle);
        let want = match growth > 0.0 {
            true => Verdict::Cycle,
            false => Verdict::Noise,
        };
        if growth.abs() * seconds >= 50.0 && told.verdict != want {
            wrong.push(format!("{growth} 1/s: {peak:?} {told:?}"));
        }
    }
    let growing = rig.parts.iter().filter(|p| p.s.re > 0.0).count();
    if cycles < growing {
        wrong.push(format!(
            "{cycles} cycles of {growing} in {:?}",
            heard.peaks.peaks
        ));
    }
    wrong
}
