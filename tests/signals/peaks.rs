//! Frequencies and decay rates from synthetic records of every rig, over many seeds.

use std::sync::OnceLock;

use rayon::prelude::*;
use stillflame::measured::nature::Evidence;
use stillflame::measured::peaks::{Peak, Peaks, Search, find};
use stillflame::measured::{Plan, Spectra, Welch, Window};

use crate::nature;
use crate::play::Noise;
use crate::rigs::{self, Bound, NAMES, RATE, Rig};

pub const SECONDS: f64 = 60.0;
const SEEDS: u64 = 100;
const LOW: f64 = 10.0;

/// What was found in one record.
#[derive(Debug)]
pub struct Heard {
    pub peaks: Peaks,
    pub evidence: Vec<Evidence>,
}

pub fn hear(rig: &Rig, seconds: f64, seed: u64) -> Heard {
    let record = rigs::record(rig, seconds, seed);
    // Segments of a thirty-second of the record.
    let segment = record.len() / 64 * 2;
    let mut welch = Welch::new(Plan::hann(RATE, segment), 1, &[]).unwrap();
    welch.feed(&record.blocks()).unwrap();
    let spectra = welch.finish().unwrap();
    let search = Search {
        low: LOW,
        high: 1.15 * rig.top,
        most: 20,
    };
    let peaks = find(&spectra, 0, search).unwrap();
    let evidence = nature::evidence(&record, &spectra, &peaks.peaks);
    Heard { peaks, evidence }
}

/// A minute of each rig, once for every seed.
pub fn minute() -> &'static [(&'static str, Rig, Vec<Heard>)] {
    static HEARD: OnceLock<Vec<(&'static str, Rig, Vec<Heard>)>> = OnceLock::new();
    HEARD.get_or_init(|| {
        // Other seeds than those the method was tried on: `STILLFLAME_FIRST_SEED=1000`.
        let first = std::env::var("STILLFLAME_FIRST_SEED").map_or(0, |s| s.parse().unwrap());
        let all = NAMES.iter().map(|name| {
            let rig = rigs::rig(name);
            let seeds = (first..first + SEEDS).into_par_iter();
            let heard = seeds.map(|seed| hear(&rig, SECONDS, seed)).collect();
            (*name, rig, heard)
        });
        all.collect()
    })
}

/// The peak that stands for a mode: the nearest, within a full width at half power.
fn nearest<'a>(peaks: &'a [Peak], bound: &Bound) -> Option<&'a Peak> {
    let off = |p: &Peak| (p.frequency.value - bound.frequency).abs();
    peaks
        .iter()
        .filter(|p| p.resolved && off(p) < bound.decay / std::f64::consts::PI)
        .min_by(|a, b| off(a).total_cmp(&off(b)))
}

#[test]
fn decay_rates_lie_in_their_intervals_and_intervals_are_near_the_bound() {
    let mut faults = Vec::new();
    let mut judged = 0;
    for (name, rig, heard) in minute() {
        let sound = rigs::sound(SECONDS, 0);
        let misfit = heard.iter().map(|h| h.peaks.misfit).sum::<f64>() / SEEDS as f64;
        assert!((misfit - 1.0).abs() < 0.1, "{name}: {misfit}");
        for bound in rigs::bounds(rig, &sound, LOW, 1.15 * rig.top) {
            let (mut seen, mut near, mut held, mut widths) = (0, 0, 0, Vec::new());
            for found in heard {
                let Some(peak) = nearest(&found.peaks.peaks, &bound) else {
                    continue;
                };
                seen += 1;
                let allowed = (0.002 * bound.frequency).max(2.0 * bound.frequency_deviation);
                near += i32::from((peak.frequency.value - bound.frequency).abs() <= allowed);
                held += i32::from(peak.decay.holds(bound.decay));
                widths.push(peak.decay.width() / (2.0 * 1.96 * bound.decay_deviation));
            }
            widths.sort_by(f64::total_cmp);
            let median = widths.get(widths.len() / 2).copied().unwrap_or(f64::NAN);
            let clear = bound.share > 0.75 && bound.separation > 1.0;
            println!(
                "{name:16} {:7.2} Hz {:7.2} 1/s share {:.2} apart {:5.2}: seen {seen:3} frequency {near:3} decay {held:3} width {median:.2} of the bound {:.1} %{}",
                bound.frequency,
                -bound.decay,
                bound.share,
                bound.separation,
                100.0 * bound.decay_deviation / bound.decay,
                if clear { "" } else { "  (overlaps)" }
            );
            if clear {
                judged += 1;
                if near < 90 || held < 90 || median.is_nan() || median > 1.5 {
                    faults.push(format!("{name} {:.2} Hz", bound.frequency));
                }
            }
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
    assert!(judged >= 15, "{judged}");
}

fn noise(seed: u64, n: usize) -> Vec<f64> {
    let mut noise = Noise::new(seed);
    (0..n).map(|_| noise.next()).collect()
}

const BAND: Search = Search {
    low: LOW,
    high: 1000.0,
    most: 20,
};

fn spectra(plan: Plan, samples: &[f64]) -> Spectra {
    let mut welch = Welch::new(plan, 1, &[]).unwrap();
    welch.feed(&[samples]).unwrap();
    welch.finish().unwrap()
}

/// In white noise there is next to nothing to find.
#[test]
fn white_noise_has_no_peaks() {
    let found: Vec<Peaks> = (0..40)
        .into_par_iter()
        .map(|seed| {
            find(
                &spectra(Plan::hann(RATE, 4096), &noise(seed, 1 << 17)),
                0,
                BAND,
            )
            .unwrap()
        })
        .collect();
    let peaks = found.iter().map(|p| p.peaks.len()).sum::<usize>();
    assert!(peaks <= 2, "{peaks}");
    for p in &found {
        assert!((p.misfit - 1.0).abs() < 0.3, "{}", p.misfit);
        // One-sided density of unit variance.
        let mean = p.fitted.iter().sum::<f64>() / p.fitted.len() as f64;
        assert!((mean * RATE / 2.0 - 1.0).abs() < 0.05, "{mean}");
    }
}

#[test]
fn what_cannot_be_fitted_is_refused_in_words() {
    let x = noise(1, 1 << 15);
    let hann = Plan::hann(RATE, 1024);
    let refused = |s: &Spectra, search: Search| find(s, 0, search).unwrap_err().what;
    let boxcar = Plan {
        window: Window::Boxcar,
        ..hann
    };
    assert!(refused(&spectra(boxcar, &x), BAND).contains("boxcar"));
    assert!(refused(&spectra(Plan::hann(RATE, 1 << 14), &x), BAND).contains("averages"));
    let narrow = Search {
        low: 500.0,
        high: 510.0,
        ..BAND
    };
    assert!(refused(&spectra(hann, &x), narrow).contains("bins"));
    let empty = Search {
        low: f64::NAN,
        high: f64::NAN,
        ..BAND
    };
    assert!(refused(&spectra(hann, &x), empty).contains("bins"));
    assert!(refused(&spectra(hann, &vec![3.0; 1 << 15]), BAND).contains("constant"));
    assert!(find(&spectra(hann, &x), 7, BAND).is_err());
}
