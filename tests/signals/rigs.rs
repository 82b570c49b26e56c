//! Synthetic records of the rigs in `networks/`, and what can be known of their peaks at best.

use std::f64::consts::{PI, TAU};
use std::path::Path;

use nalgebra::{DMatrix, Matrix2, Vector2};
use num_complex::Complex64;
use stillflame::modes::{self, Scan, Window, shapes};
use stillflame::{input, measured::Record};

use crate::play::{self, Part, Sound};

pub const RATE: f64 = 4096.0;

/// The five rigs.
pub const NAMES: [&str; 5] = [
    "flame_in_tube",
    "pressurised_rig",
    "staged_flame",
    "swirl_rig",
    "twenty_elements",
];

/// A rig as one sensor hears it.
pub struct Rig {
    pub parts: Vec<Part>,
    /// Highest frequency of its window (Hz).
    pub top: f64,
}

/// A rig heard from the place along its ducts where its quietest mode is loudest.
pub fn rig(name: &str) -> Rig {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("networks/{name}.toml"));
    let network = input::read(&path, &[]).unwrap().network;
    let solved = modes::solve(&network).unwrap();
    let window = Window::of(&network, &solved.mean).unwrap();
    let list = modes::find(&solved, window, Scan::Whole);
    assert!(list.complete());
    let shaped: Vec<_> = list
        .modes
        .iter()
        .map(|m| (*m, shapes::along(&network, &solved, m)))
        .collect();
    let end = shaped[0].1.as_ref().unwrap().along.last().unwrap().position;
    let quietest = |x: f64| {
        let parts = play::parts(&shaped, &[x]);
        parts
            .iter()
            .map(|p| p.at[0].norm())
            .fold(f64::INFINITY, f64::min)
    };
    let places = (1..200).map(|i| end * f64::from(i) / 200.0);
    let best = places
        .max_by(|a, b| quietest(*a).total_cmp(&quietest(*b)))
        .unwrap();
    Rig {
        parts: play::parts(&shaped, &[best]),
        top: window.frequency.1,
    }
}

pub fn sound(seconds: f64, seed: u64) -> Sound {
    Sound {
        rate_hz: RATE,
        duration: seconds,
        level: 50.0,
        cycle: 1000.0,
        sensor_noise: 1.0,
        seed,
    }
}

pub fn record(rig: &Rig, seconds: f64, seed: u64) -> Record {
    play::play(&rig.parts, &["p".to_owned()], &sound(seconds, seed))
}

/// A term `Re[C exp(s |t|)]` of the autocovariance, and whether it is a mode that decays.
struct Term {
    parameters: [f64; 4],
    decays: bool,
}

/// Autocovariance of a part, from the state it is played by.
fn terms(rig: &Rig, sound: &Sound) -> Vec<Term> {
    let decays = rig.parts.iter().filter(|p| p.s.re < 0.0).map(|p| -p.s.re);
    let slowest = decays.fold(f64::INFINITY, f64::min);
    let term = |p: &Part| {
        let (w, at) = (p.s.im, p.at[0]);
        if p.s.re < 0.0 {
            let nu = -p.s.re;
            let mean_square = sound.level.powi(2) * slowest / nu;
            let stiff = w * w + nu * nu;
            let h = Vector2::new(at.re, at.im / w);
            let steady = Matrix2::new(mean_square, 0.0, 0.0, mean_square * stiff);
            // exp(A t) = exp(-nu t) [cos(w t) + turn sin(w t)].
            let turn = Matrix2::new(nu, 1.0, -stiff, -nu) / w;
            let even = h.dot(&(steady * h));
            let odd = h.dot(&(turn * steady * h));
            Term {
                parameters: [nu, w / TAU, even, -odd],
                decays: true,
            }
        } else {
            // Small changes of the cycle's amplitude decay at twice the growth rate.
            let density = 2.0 * slowest * sound.level.powi(2);
            let square = density / (4.0 * p.s.re) * at.norm_sqr() / 2.0;
            Term {
                parameters: [2.0 * p.s.re, w / TAU, square, 0.0],
                decays: false,
            }
        }
    };
    rig.parts.iter().map(term).collect()
}

/// Exact one-sided density of the sampled record without the lines of its cycles.
fn density(parameters: &[f64], frequency: f64) -> f64 {
    let (terms, floor) = parameters.split_at(parameters.len() - 1);
    let turn = Complex64::cis(TAU * frequency / RATE);
    let sum: f64 = terms
        .chunks_exact(4)
        .map(|t| {
            let z = Complex64::new(-t[0] / RATE, TAU * t[1] / RATE).exp();
            let one = Complex64::ONE;
            let series = (one - z * turn).inv() + (one - z * turn.conj()).inv() - one;
            (Complex64::new(t[2], t[3]) * series).re
        })
        .sum();
    (sum + floor[0]) * 2.0 / RATE
}

/// What can be known of a mode that decays.
pub struct Bound {
    pub frequency: f64,
    pub decay: f64,
    /// Least standard deviations of an unbiased estimate (Hz, 1/s).
    pub frequency_deviation: f64,
    pub decay_deviation: f64,
    /// Part of the density at its frequency that is its own.
    pub share: f64,
    /// Distance to the next mode over the mean of the two full widths at half power.
    pub separation: f64,
}

/// Cramer-Rao bounds from the Fisher information of a Gaussian record (Whittle 1953) with all parameters unknown: those of the modes,
/// of how a cycle's amplitude wavers and of the sensor's noise.
pub fn bounds(rig: &Rig, sound: &Sound, low: f64, high: f64) -> Vec<Bound> {
    let terms = terms(rig, sound);
    let mut all: Vec<f64> = terms.iter().flat_map(|t| t.parameters).collect();
    all.push(sound.sensor_noise.powi(2));
    let (n, width) = (6000, (high - low) / 6000.0);
    let u = DMatrix::from_fn(n, all.len(), |j, i| {
        let f = low + (j as f64 + 0.5) * width;
        let size = 1e-6 * all[i].abs().max(1e-3);
        let moved = |by: f64| {
            let mut other = all.clone();
            other[i] += by;
            density(&other, f)
        };
        (moved(size) - moved(-size)) / (2.0 * size * density(&all, f))
    });
    let sizes: Vec<f64> = u.column_iter().map(|c| c.norm()).collect();
    let scaled = DMatrix::from_fn(n, all.len(), |j, i| u[(j, i)] / sizes[i]);
    let information = scaled.tr_mul(&scaled) * (width * sound.duration);
    let inverse = information.try_inverse().unwrap();
    let deviation = |parameter: usize| inverse[(parameter, parameter)].sqrt() / sizes[parameter];
    let modes = terms.iter().enumerate().filter(|(_, t)| t.decays);
    modes
        .map(|(k, t)| {
            let [decay, frequency, ..] = t.parameters;
            let mut alone: Vec<f64> = t.parameters.to_vec();
            alone.push(0.0);
            let apart = |(j, other): (usize, &Term)| {
                let [d, f, ..] = other.parameters;
                let gap = (f - frequency).abs();
                let mean = (d + decay) / (2.0 * PI);
                if j == k { f64::INFINITY } else { gap / mean }
            };
            Bound {
                frequency,
                decay,
                frequency_deviation: deviation(4 * k + 1),
                decay_deviation: deviation(4 * k),
                share: density(&alone, frequency) / density(&all, frequency),
                separation: terms
                    .iter()
                    .enumerate()
                    .map(apart)
                    .fold(f64::INFINITY, f64::min),
            }
        })
        .collect()
}
