//! Noise and cycles told apart.

use rayon::prelude::*;
use stillflame::measured::nature::{Evidence, Verdict, weigh};
use stillflame::measured::peaks::find;
use stillflame::measured::{Envelopes, Plan};

use crate::peaks::{search, spectra};
use crate::rigs::{self, NAMES, RATE, Rig};

/// Segment lengths of the envelopes (samples).
const LENGTHS: [usize; 4] = [256, 512, 1024, 2048];

/// Evidence for each peak of a record with the growth rate of the mode nearest to it.
fn evidence(rig: &Rig, seconds: f64, seed: u64) -> Vec<(f64, Evidence)> {
    let spectra = spectra(rig, seconds, seed);
    let found = find(&spectra, 0, search(rig)).unwrap();
    let record = rigs::record(rig, seconds, seed);
    let banks: Vec<_> = LENGTHS
        .iter()
        .map(|n| {
            let mut envelopes = Envelopes::new(Plan::hann(RATE, *n), 1).unwrap();
            envelopes.feed(&record.blocks()).unwrap();
            envelopes.finish().unwrap().remove(0)
        })
        .collect();
    let frequencies: Vec<f64> = found.peaks.iter().map(|p| p.frequency.value).collect();
    let resolution = spectra.plan().resolution();
    found
        .peaks
        .iter()
        .filter_map(|peak| {
            let f = peak.frequency.value;
            let off = |s: &num_complex::Complex64| (s.im / std::f64::consts::TAU - f).abs();
            let mode = rig
                .parts
                .iter()
                .map(|p| p.s)
                .min_by(|a, b| off(a).total_cmp(&off(b)))?;
            let near = off(&mode) < mode.re.abs() / std::f64::consts::PI;
            let told = weigh(peak, &frequencies, &banks, resolution)?;
            near.then_some((mode.re, told))
        })
        .collect()
}

fn all_told(seconds: f64, seeds: u64) {
    for name in NAMES {
        let rig = rigs::rig(name);
        let all: Vec<Vec<(f64, Evidence)>> = (0..seeds)
            .into_par_iter()
            .map(|seed| evidence(&rig, seconds, 5000 + seed))
            .collect();
        let growing = rig.parts.iter().filter(|p| p.s.re > 0.0).count();
        for told in &all {
            let cycles = told
                .iter()
                .filter(|(s, e)| *s > 0.0 && e.verdict == Verdict::Cycle)
                .count();
            assert_eq!(cycles, growing, "{name}: {told:?}");
            for (growth, e) in told {
                if growth.abs() * seconds >= 50.0 {
                    let want = if *growth > 0.0 {
                        Verdict::Cycle
                    } else {
                        Verdict::Noise
                    };
                    assert_eq!(e.verdict, want, "{name}, growth rate {growth}: {e:?}");
                }
            }
        }
        let some = &all[0];
        for (growth, e) in some {
            println!(
                "{name:16} {growth:8.2} 1/s: ratio {:.2} gain {:.0} of {:.0} coherence {:.2} width {:.2}",
                e.ratio, e.gain, e.independent, e.coherence, e.width_in_resolutions
            );
        }
    }
}

#[test]
fn cycles_and_noise_are_told_apart_in_a_minute() {
    all_told(60.0, 100);
}

#[test]
fn cycles_and_noise_are_told_apart_in_a_few_seconds() {
    all_told(6.0, 100);
}
