//! Waves parted by microphones, there and back.

use std::f64::consts::{PI, TAU};

use num_complex::Complex64;
use proptest::prelude::*;
use stillflame::measured::microphones::{Array, DOUBTFUL, Facing};
use stillflame::measured::{Plan, Welch};

fn sound(array: &Array, frequency: f64, plus: Complex64, minus: Complex64) -> Vec<Complex64> {
    let omega = TAU * frequency;
    let (with, against) = (
        omega / (array.sound_speed + array.velocity),
        omega / (array.sound_speed - array.velocity),
    );
    let at = |x: &f64| plus * Complex64::cis(-with * x) + minus * Complex64::cis(against * x);
    array.positions.iter().map(at).collect()
}

proptest! {
    /// Round trip to 1e-12 of the waves, times the condition number.
    #[test]
    fn waves_come_back(
        positions in prop::collection::vec(-1.0..1.0_f64, 2..6),
        frequency in 20.0..900.0_f64,
        mach in -0.4..0.4_f64,
        (r, phase, level) in (0.0..1.2_f64, -PI..PI, 0.1..1e4_f64),
    ) {
        let array = Array { positions, sound_speed: 700.0, velocity: 700.0 * mach, density: 0.3 };
        let condition = array.condition(frequency);
        prop_assume!(condition < 100.0);
        let plus = Complex64::from_polar(level, 0.3);
        let minus = plus * Complex64::from_polar(r, phase);
        let waves = array.part(frequency, &sound(&array, frequency, plus, minus)).unwrap();
        let allowed = 1e-12 * level * condition.max(1.0);
        prop_assert!((waves.downstream - plus).norm() < allowed);
        prop_assert!((waves.upstream - minus).norm() < allowed);
        prop_assert!((waves.pressure() - plus - minus).norm() < 2.0 * allowed);
        let velocity = (plus - minus) / (0.3 * 700.0);
        prop_assert!((waves.velocity - velocity).norm() < allowed);
        prop_assert!(waves.residual < allowed);
        let reflection = waves.reflection(Facing::Downstream);
        prop_assert!((reflection - Complex64::from_polar(r, phase)).norm() < 3e-12 * condition.max(1.0));
        prop_assert!((waves.condition - condition).abs() < 1e-9 * condition);
        // The condition number is that of the singular values.
        let omega = TAU * frequency;
        let (with, against) = (omega / (700.0 * (1.0 + mach)), omega / (700.0 * (1.0 - mach)));
        let matrix = nalgebra::DMatrix::from_fn(array.positions.len(), 2, |i, j| {
            let x = array.positions[i];
            Complex64::cis(if j == 0 { -with * x } else { against * x })
        });
        let values = matrix.singular_values();
        prop_assert!((values[0] / values[1] / condition - 1.0).abs() < 1e-8);
    }
}

/// ISO 10534-2 writes the reflection at the sample from the transfer function of two microphones,
/// `r = (H12 - exp(-i k s))/(exp(i k s) - H12) exp(2 i k x1)`, without flow (formula from memory); `x1` is the farther one.
#[test]
fn two_microphones_give_the_formula_of_the_standard() {
    let (c, s, near) = (343.2, 0.05, 0.10);
    let far = near + s;
    let array = Array {
        positions: vec![-far, -near],
        sound_speed: c,
        velocity: 0.0,
        density: 1.2,
    };
    for i in 1..30 {
        let frequency = 50.0 * f64::from(i);
        let k = TAU * frequency / c;
        let (p1, p2) = (
            Complex64::new(1.0, 0.2),
            Complex64::new(0.3 * f64::from(i).sin(), 0.7),
        );
        let h = p2 / p1;
        let standard = (h - Complex64::cis(-k * s)) / (Complex64::cis(k * s) - h)
            * Complex64::cis(2.0 * k * far);
        let waves = array.part(frequency, &[p1, p2]).unwrap();
        let got = waves.reflection(Facing::Downstream);
        assert!(
            (got - standard).norm() < 1e-11 * standard.norm(),
            "{frequency} {got} {standard}"
        );
    }
}

#[test]
fn half_wavelengths_are_warned_of_and_refused() {
    let array = Array {
        positions: vec![0.0, 0.25],
        sound_speed: 340.0,
        velocity: 0.0,
        density: 1.2,
    };
    // Half a wavelength is 0.25 m at 680 Hz.
    let bad = array
        .part(680.0, &[Complex64::ONE, Complex64::ONE])
        .unwrap_err();
    assert!(bad.what.contains("half wavelengths"), "{bad}");
    assert!(array.condition(340.0) < 1.0 + 1e-9);
    let frequencies: Vec<f64> = (1..100).map(|i| 10.0 * f64::from(i)).collect();
    let warnings = array.warnings(&frequencies);
    assert_eq!(warnings.len(), 2, "{warnings:?}");
    assert!(
        warnings[0].what.contains("small part") && warnings[1].what.contains("half wavelengths")
    );
    // Common practice keeps below 0.9 of the half wavelength: at 0.8 of it no warning is given yet.
    assert!(array.condition(0.8 * 680.0) < DOUBTFUL && array.condition(0.95 * 680.0) > DOUBTFUL);
    let three = Array {
        positions: vec![0.0, 0.25, 0.35],
        ..array
    };
    assert!(three.condition(680.0) < DOUBTFUL);
}

#[test]
fn bad_arrays_are_refused_in_words() {
    let sound = Array {
        positions: vec![0.0, 0.1],
        sound_speed: 340.0,
        velocity: 0.0,
        density: 1.2,
    };
    let p = [Complex64::ONE; 2];
    assert!(
        Array {
            positions: vec![0.0],
            ..sound.clone()
        }
        .part(100.0, &p[..1])
        .is_err()
    );
    assert!(sound.part(100.0, &p[..1]).is_err());
    assert!(
        Array {
            velocity: 400.0,
            ..sound.clone()
        }
        .part(100.0, &p)
        .is_err()
    );
    assert!(
        Array {
            positions: vec![0.0, f64::NAN],
            ..sound.clone()
        }
        .part(100.0, &p)
        .is_err()
    );
    assert!(
        Array {
            positions: vec![0.1, 0.1],
            ..sound.clone()
        }
        .part(100.0, &p)
        .is_err()
    );
    assert!(sound.part_spectra(100.0, 0.0, &p).is_err());
}

/// Records of three microphones in a duct with flow and an end of known reflection give it back.
#[test]
fn records_of_a_duct_give_its_reflection() {
    let (rate, c, u) = (8192.0, 340.0, 34.0);
    let array = Array {
        positions: vec![-0.5, -0.38, -0.2],
        sound_speed: c,
        velocity: u,
        density: 1.2,
    };
    let (n, reflection) = (1 << 16, -0.7);
    let mut random = fastrand::Rng::with_seed(11);
    // The wave at the end, periodic over the record, with a smooth spectrum; delays by turning phases.
    let tones: Vec<(f64, f64)> = (200..4000)
        .map(|j| (f64::from(j) * rate / f64::from(n) * 2.0, TAU * random.f64()))
        .collect();
    let mut channels = vec![vec![0.0; n as usize]; 3];
    for (f, phase) in &tones {
        let amplitudes = sound(
            &array,
            *f,
            Complex64::cis(*phase),
            Complex64::cis(*phase) * reflection,
        );
        for (channel, a) in channels.iter_mut().zip(amplitudes) {
            let step = Complex64::cis(TAU * f / rate);
            let mut now = a;
            for x in channel.iter_mut() {
                *x += now.re;
                now *= step;
            }
        }
    }
    let blocks: Vec<&[f64]> = channels.iter().map(Vec::as_slice).collect();
    let mut welch = Welch::of_all_pairs(Plan::hann(rate, 4096), 3).unwrap();
    welch.feed(&blocks).unwrap();
    let spectra = welch.finish().unwrap();
    for j in (60..180).step_by(7) {
        let cross: Vec<Complex64> = (0..3).map(|i| spectra.cross(0, i).unwrap()[j]).collect();
        let waves = array
            .part_spectra(spectra.frequency(j), spectra.density(0)[j], &cross)
            .unwrap();
        let got = waves.reflection(Facing::Downstream);
        assert!(
            (got - reflection).norm() < 0.03,
            "{} Hz: {got}",
            spectra.frequency(j)
        );
    }
}
