//! Frequencies, decay rates and amplitudes from synthetic records.

use std::f64::consts::TAU;

use rayon::prelude::*;
use stillflame::measured::peaks::{Peaks, Search, find, find_together};
use stillflame::measured::{Plan, Spectra, Welch, Window};

use crate::heard::{self, LOW, SECONDS};
use crate::play::Noise;
use crate::rigs::{self, NAMES, RATE};

/// A slice of the campaign of `cargo bench --bench records`: every mode of every rig is found in every record, and nine of ten intervals hold.
#[test]
fn modes_are_found_by_all_sensors_together() {
    let seeds = 1000..1003;
    let (mut held, mut near, mut modes) = (0, 0, 0);
    for name in NAMES {
        let rig = rigs::rig(name);
        let heard = heard::minutes(&rig, seeds.clone());
        for (h, seed) in heard.iter().zip(seeds.clone()) {
            let misfit = h.shared.as_ref().unwrap().misfit;
            assert!((misfit - 1.0).abs() < 0.1, "{name} {seed}: {misfit}");
            let wrong = heard::misjudged(&rig, SECONDS, h);
            assert!(wrong.is_empty(), "{name} {seed}: {wrong:?}");
        }
        for f in heard::fared(&rig, &heard) {
            println!(
                "{name:16} {:7.2} Hz {:7.2} 1/s apart {:.2}: seen {} frequency {} decay {} of {}, width {:.2}{}",
                f.bound.frequency,
                -f.bound.decay,
                f.bound.separation,
                f.seen,
                f.near,
                f.held,
                f.records,
                f.width,
                if f.reached() { "" } else { " (short)" }
            );
            assert!(10 * f.seen >= 6 * f.records, "{name} {}", f.bound.frequency);
            (held, near, modes) = (held + f.held, near + f.near, modes + f.records);
        }
    }
    assert_eq!(modes, 21 * 3);
    assert!(
        20 * held >= 17 * modes && 20 * near >= 17 * modes,
        "{held} {near} of {modes}"
    );
}

/// A mode that another hides at one sensor is told by two that hear them in other shapes; one sensor alone fits the same with either call.
#[test]
fn two_sensors_tell_what_one_cannot() {
    let rig = rigs::rig("pressurised_rig");
    let record = rigs::record(&rig, SECONDS, 7);
    let mut welch = Welch::of_all_pairs(Plan::hann(RATE, record.len() / 64 * 2), 3).unwrap();
    welch.feed(&record.blocks()).unwrap();
    let spectra = welch.finish().unwrap();
    let search = Search {
        low: LOW,
        high: 1.15 * rig.top,
        most: 20,
    };
    let one = find(&spectra, 0, search).unwrap();
    assert_eq!(one, find_together(&spectra, &[0], search).unwrap());
    let hidden = rig
        .parts
        .iter()
        .map(|p| p.s)
        .find(|s| (s.re + 270.4).abs() < 1.0);
    let hidden = hidden.unwrap();
    let near = |p: &Peaks| {
        let off = |q: &stillflame::measured::peaks::Peak| {
            (q.frequency.value - hidden.im / TAU).abs() < 10.0
                && (q.decay.value / -hidden.re - 1.0).abs() < 0.25
        };
        p.peaks.iter().any(off)
    };
    let all = find_together(&spectra, &[0, 1, 2], search).unwrap();
    assert!(near(&all), "{:?}", all.peaks);
    assert!(all.peaks.iter().all(|p| p.loudest < 3));
    assert!(find_together(&spectra, &[], search).is_err());
}

/// A tone without noise of its own: amplitude and frequency wherever it lies between bins, at three lengths of window, in noise and in next to none.
#[test]
fn tones_have_their_amplitude() {
    let amplitude = 3.0;
    let cases: Vec<(usize, f64, f64)> = [1024, 2048, 4096]
        .into_iter()
        .flat_map(|n| [0.0, 0.1, 0.25, 0.5, 0.73].map(|off| (n, off)))
        .flat_map(|(n, off)| [1e-6, 0.01, 0.5].map(|noise| (n, off, noise)))
        .collect();
    cases.into_par_iter().for_each(|(segment, off, level)| {
        let width = RATE / segment as f64;
        let f = ((300.0 / width).round() + off) * width;
        let mut noise = Noise::new(5);
        let samples: Vec<f64> = (0..32 * segment)
            .map(|i| amplitude * (TAU * f * i as f64 / RATE + 0.3).cos() + level * noise.next())
            .collect();
        let found = find(&spectra(Plan::hann(RATE, segment), &samples), 0, BAND).unwrap();
        let loudest = found
            .peaks
            .iter()
            .max_by(|a, b| a.rms.value.total_cmp(&b.rms.value));
        let peak = loudest.unwrap();
        let rms = peak.rms.value / (amplitude / 2.0_f64.sqrt());
        assert!((rms - 1.0).abs() < 0.005, "{segment} {off} {level}: {rms}");
        assert!(
            (peak.frequency.value - f).abs() < 0.01 * width,
            "{segment} {off} {level}: {peak:?}"
        );
        assert!(!peak.resolved);
    });
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
        let mean = p.fitted[0].iter().sum::<f64>() / p.fitted[0].len() as f64;
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
