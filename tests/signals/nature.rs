//! Noise and cycles told apart.

use std::f64::consts::{PI, TAU};

use num_complex::Complex64;
use rayon::prelude::*;
use stillflame::measured::nature::{Evidence, Verdict, weigh};
use stillflame::measured::peaks::Peak;
use stillflame::measured::{Envelopes, Plan, Record, Spectra};

use crate::peaks::{self, Heard};
use crate::rigs::{self, NAMES, RATE, Rig};

/// Segment lengths of the envelopes (samples).
const LENGTHS: [usize; 4] = [256, 512, 1024, 2048];

/// Evidence for each peak of a record, in the order of the peaks.
pub fn evidence(record: &Record, spectra: &Spectra, peaks: &[Peak]) -> Vec<Evidence> {
    let banks: Vec<_> = LENGTHS
        .iter()
        .map(|n| {
            let mut envelopes = Envelopes::new(Plan::hann(RATE, *n), 1).unwrap();
            envelopes.feed(&record.blocks()).unwrap();
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

/// Growth rate of the mode a peak stands for: the nearest, within a full width at half power.
fn growth(rig: &Rig, peak: &Peak) -> Option<f64> {
    let off = |s: &Complex64| (s.im / TAU - peak.frequency.value).abs();
    let modes = rig.parts.iter().map(|p| p.s);
    let nearest = modes.min_by(|a, b| off(a).total_cmp(&off(b)))?;
    (off(&nearest) < nearest.re.abs() / PI).then_some(nearest.re)
}

/// Every peak is told for what it is, and no cycle is missed.
fn all_told(rig: &Rig, name: &str, seconds: f64, records: &[Heard]) {
    let growing = rig.parts.iter().filter(|p| p.s.re > 0.0).count();
    for (seed, heard) in records.iter().enumerate() {
        let mut cycles = 0;
        for (peak, told) in heard.peaks.peaks.iter().zip(&heard.evidence) {
            let Some(growth) = growth(rig, peak) else {
                continue;
            };
            cycles += usize::from(told.verdict == Verdict::Cycle);
            if seed == 0 {
                println!(
                    "{name:16} {growth:8.2} 1/s: ratio {:.2} gain {:.0} of {:.0} coherence {:.2} width {:.2}",
                    told.ratio,
                    told.gain,
                    told.independent,
                    told.coherence,
                    told.width_in_resolutions
                );
            }
            if growth.abs() * seconds >= 50.0 {
                let want = if growth > 0.0 {
                    Verdict::Cycle
                } else {
                    Verdict::Noise
                };
                assert_eq!(
                    told.verdict, want,
                    "{name} {seed}, {growth} 1/s: {peak:?} {told:?}"
                );
            }
        }
        assert!(cycles >= growing, "{name} {seed}: {heard:?}");
    }
}

#[test]
fn cycles_and_noise_are_told_apart_in_a_minute() {
    for (name, rig, records) in peaks::minute() {
        all_told(rig, name, peaks::SECONDS, records);
    }
}

#[test]
fn cycles_and_noise_are_told_apart_in_a_few_seconds() {
    let seconds = 6.0;
    for name in NAMES {
        let rig = rigs::rig(name);
        let records: Vec<Heard> = (0..100)
            .into_par_iter()
            .map(|seed| peaks::hear(&rig, seconds, 5000 + seed))
            .collect();
        all_told(&rig, name, seconds, &records);
    }
}
