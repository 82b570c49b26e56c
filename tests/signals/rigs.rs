//! Synthetic records of the rigs in `networks/`, and what can be known of their peaks at best.

use std::f64::consts::{PI, TAU};
use std::path::Path;

use nalgebra::{DMatrix, DVector, Matrix2};
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

/// A rig as its sensors hear it.
pub struct Rig {
    pub parts: Vec<Part>,
    /// Highest frequency of its window (Hz).
    pub top: f64,
}

/// A rig heard from three places along its ducts: where its quietest mode is loudest, and at a third and two thirds of the way. Of these
/// the first is the one a single sensor would be at.
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
        parts: play::parts(&shaped, &[best, end / 3.0, 2.0 * end / 3.0]),
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
    let names = ["p1", "p2", "p3"].map(str::to_owned);
    play::play(&rig.parts, &names, &sound(seconds, seed))
}

/// A term of the covariance of sensors, `Re[c b^T exp(s t)]` for `t >= 0`, and whether it is a mode that decays.
#[derive(Clone)]
struct Term {
    s: Complex64,
    shape: DVector<Complex64>,
    drive: DVector<Complex64>,
    decays: bool,
}

/// Covariance of a part at its sensors, from the state it is played by.
fn term(p: &Part, slowest: f64, sound: &Sound) -> Term {
    let (w, count) = (p.s.im, p.at.len());
    let at = DVector::from_column_slice(&p.at);
    if p.s.re > 0.0 {
        // Small changes of the cycle's amplitude decay at twice the growth rate.
        let density = 2.0 * slowest * sound.level.powi(2);
        let square = density / (8.0 * p.s.re);
        return Term {
            s: Complex64::new(-2.0 * p.s.re, w),
            drive: at.map(|c| c.conj() * square),
            shape: at,
            decays: false,
        };
    }
    let nu = -p.s.re;
    let mean_square = sound.level.powi(2) * slowest / nu;
    let stiff = w * w + nu * nu;
    // Rows: what each sensor hears of the state (y, y').
    let h = DMatrix::from_fn(count, 2, |a, i| {
        let c = p.at[a];
        Complex64::from(if i == 0 { c.re } else { c.im / w })
    });
    let steady = Matrix2::new(mean_square, 0.0, 0.0, mean_square * stiff);
    // exp(A t) = exp(-nu t) [cos(w t) + turn sin(w t)], so that the covariance is h (1 - i turn) steady h^T: of rank one.
    let turn = Matrix2::new(nu, 1.0, -stiff, -nu) / w;
    let middle = steady.map(Complex64::from) - (turn * steady).map(|x| Complex64::new(0.0, x));
    let whole = &h * DMatrix::from_fn(2, 2, |i, j| middle[(i, j)]) * h.transpose();
    let loudest = (0..count)
        .max_by(|a, b| p.at[*a].norm().total_cmp(&p.at[*b].norm()))
        .unwrap();
    let drive: DVector<Complex64> = whole.row(loudest).transpose();
    Term {
        s: p.s,
        shape: whole.column(loudest) / whole[(loudest, loudest)],
        drive,
        decays: true,
    }
}

impl Term {
    /// Its part of the two-sided spectral matrix of the sampled record (times the rate), exactly.
    fn at(&self, frequency: f64) -> DMatrix<Complex64> {
        let z = (self.s / RATE).exp();
        let turn = Complex64::cis(TAU * frequency / RATE);
        let series = |q: Complex64| (Complex64::ONE - q).inv() - 0.5;
        let (near, far) = (series(z * turn.conj()), series(z * turn));
        let c = &self.shape * self.drive.transpose();
        let half = c.map(|c| 0.5 * (near * c + (far * c).conj()));
        &half + half.adjoint()
    }

    /// The same with one of its parameters moved: decay rate (1/s), frequency (Hz), real and imaginary parts of drives and, but for the loudest,
    /// of the shape; with the size of that parameter.
    fn moved(&self, parameter: usize, by: f64) -> (Term, f64) {
        let mut other = self.clone();
        let count = self.shape.len();
        let step = |of: &mut Complex64, size: f64, imaginary: bool| {
            let turn = if imaginary {
                Complex64::I
            } else {
                Complex64::ONE
            };
            *of += turn * (size * by);
            size
        };
        let size = match parameter {
            0 => step(&mut other.s, self.s.re, false),
            1 => step(&mut other.s, TAU, true),
            i if i < 2 + 2 * count => {
                let size = self.drive.norm();
                step(&mut other.drive[(i - 2) / 2], size, i % 2 == 1)
            }
            i => {
                let loudest = self.shape.map(|c| c.norm()).imax();
                let rest = (i - 2 - 2 * count) / 2;
                step(
                    &mut other.shape[rest + usize::from(rest >= loudest)],
                    1.0,
                    i % 2 == 1,
                )
            }
        };
        (other, size)
    }
}

/// What can be known of a mode that decays.
pub struct Bound {
    pub frequency: f64,
    pub decay: f64,
    /// Least standard deviations of an unbiased estimate from all sensors together (Hz, 1/s).
    pub frequency_deviation: f64,
    pub decay_deviation: f64,
    /// Distance to the next mode over the mean of the two full widths at half power.
    pub separation: f64,
}

/// Cramer-Rao bounds from the Fisher information of a Gaussian record of all sensors (Whittle 1953), `sum tr S^-1 dS S^-1 dS` over
/// its frequencies, with all parameters unknown: poles, shapes and drives of the modes and of how a cycle's amplitude wavers, and each sensor's noise. So the
/// bound of a mode holds what its neighbours cost it.
pub fn bounds(rig: &Rig, sound: &Sound, low: f64, high: f64) -> Vec<Bound> {
    let decays = rig.parts.iter().filter(|p| p.s.re < 0.0).map(|p| -p.s.re);
    let slowest = decays.fold(f64::INFINITY, f64::min);
    let terms: Vec<Term> = rig.parts.iter().map(|p| term(p, slowest, sound)).collect();
    let sensors = rig.parts[0].at.len();
    let (each, n) = (4 * sensors, 1500);
    let width = (high - low) / n as f64;
    let columns = each * terms.len() + sensors;
    let mut information = DMatrix::<f64>::zeros(columns, columns);
    for j in 0..n {
        let f = low + (j as f64 + 0.5) * width;
        let noise =
            DMatrix::identity(sensors, sensors) * Complex64::from(sound.sensor_noise.powi(2));
        let whole = terms.iter().fold(noise, |sum, t| sum + t.at(f));
        let white = whole.cholesky().unwrap().l().try_inverse().unwrap();
        let mut u = DMatrix::<f64>::zeros(2 * sensors * sensors, columns);
        let mut put = |column: usize, d: DMatrix<Complex64>| {
            let d = &white * d * white.adjoint();
            for (i, v) in d.iter().enumerate() {
                u[(2 * i, column)] = v.re;
                u[(2 * i + 1, column)] = v.im;
            }
        };
        for (k, t) in terms.iter().enumerate() {
            for i in 0..each {
                let h = 1e-5;
                let d = t.moved(i, h).0.at(f) - t.moved(i, -h).0.at(f);
                put(each * k + i, d / Complex64::from(2.0 * h));
            }
        }
        for a in 0..sensors {
            let mut d = DMatrix::zeros(sensors, sensors);
            d[(a, a)] = Complex64::ONE;
            put(each * terms.len() + a, d);
        }
        information += u.tr_mul(&u) * (width * sound.duration);
    }
    let sizes = information.diagonal().map(f64::sqrt);
    let scaled = DMatrix::from_fn(columns, columns, |i, j| {
        information[(i, j)] / (sizes[i] * sizes[j])
    });
    let inverse = scaled.try_inverse().unwrap();
    let deviation = |k: usize, i: usize| {
        let at = each * k + i;
        inverse[(at, at)].sqrt() / sizes[at] * terms[k].moved(i, 0.0).1.abs()
    };
    let modes = (0..terms.len()).filter(|k| terms[*k].decays);
    modes
        .map(|k| {
            let (decay, frequency) = (-terms[k].s.re, terms[k].s.im / TAU);
            let apart = |other: &Term| {
                let gap = (other.s.im / TAU - frequency).abs();
                gap / ((decay - other.s.re) / (2.0 * PI))
            };
            let others = terms.iter().enumerate().filter(|(j, _)| *j != k);
            Bound {
                frequency,
                decay,
                frequency_deviation: deviation(k, 1) / TAU,
                decay_deviation: deviation(k, 0),
                separation: others.map(|(_, t)| apart(t)).fold(f64::INFINITY, f64::min),
            }
        })
        .collect()
}
