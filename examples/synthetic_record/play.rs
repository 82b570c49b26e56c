//! A network's response to noise, played as records of pressure. SYNTHETIC: no rig was measured.
//!
//! Each certified mode `s = sigma + i w` with shape `p(x)` is an oscillator of complex amplitude `a`, and
//!
//! ```text
//! p'(x, t) = sum_modes Re[p(x) a(t)] + white noise of the sensor
//! ```
//!
//! A mode that decays is `a = y - i y'/w` with `y'' + 2 nu y' + (w^2 + nu^2) y = white noise`, `nu = -sigma`, advanced by the
//! exact transition matrix and covariance of its state over a sample, begun in its steady state. A mode that grows ends
//! as a cycle: the stochastic van der Pol oscillator averaged over a period (Noiray & Schuermans 2013, Int. J. Non-Linear Mech.
//! 50, 152),
//!
//! ```text
//! da = [sigma (1 - |a|^2/A^2) + i w] a dt + complex white noise,
//! ```
//!
//! its drift advanced exactly, its noise added at each sample. Noise of unequal modes is independent. Its strength gives the
//! slowest mode to decay a root mean square of [`Sound::level`] at its shape's largest pressure and every other mode
//! the same spectral density of forcing; `A` is [`Sound::cycle`] over the square root of the number of growing modes.

use std::f64::consts::{PI, TAU};

use num_complex::Complex64;
use stillflame::measured::{Channel, Quantity, Record};
use stillflame::modes::Mode;
use stillflame::modes::shapes::{Sample, Shape};

/// How loud and for how long.
#[derive(Clone, Copy, Debug)]
pub struct Sound {
    /// Sampling rate (Hz).
    pub rate_hz: f64,
    /// Duration (s).
    pub duration: f64,
    /// Root mean square of the slowest mode to decay, at its loudest place (Pa).
    pub level: f64,
    /// Amplitude of the cycles at their loudest place (Pa).
    pub cycle: f64,
    /// Standard deviation of each sensor's own noise (Pa).
    pub sensor_noise: f64,
    /// Seed of all noise.
    pub seed: u64,
}

/// One mode at the sensors: its eigenvalue and, for each sensor, the complex amplitude there per unit of `a`.
#[derive(Clone, Debug)]
pub struct Part {
    /// Growth rate and angular frequency (1/s).
    pub s: Complex64,
    /// Amplitude at each sensor.
    pub at: Vec<Complex64>,
}

/// Modes with their pressures at distances from the feed along the ducts (m); modes without a shape or that do not oscillate are left
/// out.
pub fn parts(modes: &[(Mode, Option<Shape>)], positions: &[f64]) -> Vec<Part> {
    modes
        .iter()
        .filter(|(mode, _)| mode.frequency() > 0.0)
        .filter_map(|(mode, shape)| {
            let shape = shape.as_ref()?;
            let at = positions.iter().map(|x| pressure(shape, *x)).collect();
            Some(Part { s: mode.s, at })
        })
        .collect()
}

/// Pressure of a shape at a place, between its two neighbours along a duct.
fn pressure(shape: &Shape, x: f64) -> Complex64 {
    let linear = |a: &Sample, b: &Sample| {
        let span = b.position - a.position;
        let part = if span > 0.0 {
            (x - a.position) / span
        } else {
            0.0
        };
        a.pressure * (1.0 - part) + b.pressure * part
    };
    let pairs = shape.along.windows(2);
    let between =
        |w: &&[Sample]| w[0].element == w[1].element && w[0].position <= x && x <= w[1].position;
    match (pairs.clone().find(between), shape.along.last()) {
        (Some(w), _) => linear(&w[0], &w[1]),
        (None, Some(last)) => last.pressure,
        (None, None) => Complex64::ZERO,
    }
}

/// First stream of the sensors' own noise; those before are the modes'.
const SENSORS: u64 = 1000;

/// Normal deviates (Box & Muller 1958).
pub struct Noise(fastrand::Rng);

impl Noise {
    /// From a seed.
    pub fn new(seed: u64) -> Noise {
        Noise(fastrand::Rng::with_seed(seed))
    }

    /// One of many independent streams of a seed. Neighbouring seeds of the generator give related numbers, so the seed is scattered first
    /// (the finaliser of SplitMix64, Steele, Lea & Flood 2014).
    pub fn stream(seed: u64, stream: u64) -> Noise {
        const GOLDEN: u64 = 0x9e37_79b9_7f4a_7c15;
        let scatter = |x: u64| {
            let x = (x ^ (x >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
            let x = (x ^ (x >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
            x ^ (x >> 31)
        };
        let own = scatter(seed.wrapping_add(1).wrapping_mul(GOLDEN));
        Noise::new(scatter(own ^ stream.wrapping_add(1).wrapping_mul(GOLDEN)))
    }

    /// The next.
    pub fn next(&mut self) -> f64 {
        let (u, v) = (1.0 - self.0.f64(), self.0.f64());
        (-2.0 * u.ln()).sqrt() * (TAU * v).cos()
    }
}

/// Amplitude of a mode that decays, sample by sample.
struct Decaying {
    turn: [[f64; 2]; 2],
    root: [f64; 3],
    state: [f64; 2],
    omega: f64,
}

impl Decaying {
    fn new(s: Complex64, mean_square: f64, dt: f64, noise: &mut Noise) -> Decaying {
        let (nu, w) = (-s.re, s.im);
        let stiff = w * w + nu * nu;
        let (e, c, d) = ((-nu * dt).exp(), (w * dt).cos(), (w * dt).sin());
        let turn = [
            [e * (c + nu / w * d), e * d / w],
            [-e * stiff / w * d, e * (c - nu / w * d)],
        ];
        // Steady covariance is diagonal; what a step adds is what it would otherwise lose.
        let steady = [mean_square, mean_square * stiff];
        let kept = |i: usize, j: usize| {
            turn[i][0] * turn[j][0] * steady[0] + turn[i][1] * turn[j][1] * steady[1]
        };
        let first = (steady[0] - kept(0, 0)).max(0.0).sqrt();
        let cross = -kept(0, 1) / first.max(f64::MIN_POSITIVE);
        let second = (steady[1] - kept(1, 1) - cross * cross).max(0.0).sqrt();
        Decaying {
            turn,
            root: [first, cross, second],
            state: [
                steady[0].sqrt() * noise.next(),
                steady[1].sqrt() * noise.next(),
            ],
            omega: w,
        }
    }

    fn next(&mut self, noise: &mut Noise) -> Complex64 {
        let [y, v] = self.state;
        let (a, b) = (noise.next(), noise.next());
        let [first, cross, second] = self.root;
        self.state = [
            self.turn[0][0] * y + self.turn[0][1] * v + first * a,
            self.turn[1][0] * y + self.turn[1][1] * v + cross * a + second * b,
        ];
        Complex64::new(y, -v / self.omega)
    }
}

/// Amplitude of a mode that grows and saturates.
struct Cycle {
    growth: f64,
    limit: f64,
    turn: Complex64,
    dt: f64,
    kick: f64,
    state: Complex64,
}

impl Cycle {
    fn next(&mut self, noise: &mut Noise) -> Complex64 {
        let now = self.state;
        // |a|^2 of da = sigma (1 - |a|^2/A^2) a dt is logistic.
        let grown = (2.0 * self.growth * self.dt).exp();
        let share = now.norm_sqr() / (self.limit * self.limit);
        let factor = (grown / (1.0 + share * (grown - 1.0))).sqrt();
        let kick = Complex64::new(noise.next(), noise.next()) * self.kick;
        self.state = now * factor * self.turn + kick;
        now
    }
}

/// The record of parts at sensors named `names`.
pub fn play(parts: &[Part], names: &[String], sound: &Sound) -> Record {
    let dt = sound.rate_hz.recip();
    let count = (sound.duration * sound.rate_hz).round() as usize;
    let slowest = parts
        .iter()
        .filter(|p| p.s.re < 0.0)
        .map(|p| -p.s.re)
        .fold(f64::INFINITY, f64::min);
    let slowest = if slowest.is_finite() { slowest } else { PI };
    let growing = parts.iter().filter(|p| p.s.re >= 0.0).count().max(1) as f64;
    let mut samples = vec![vec![0.0; count]; names.len()];
    for (k, part) in parts.iter().enumerate() {
        let mut noise = Noise::stream(sound.seed, k as u64);
        let mut add = |i: usize, a: Complex64| {
            for (channel, at) in samples.iter_mut().zip(&part.at) {
                channel[i] += (at * a).re;
            }
        };
        if part.s.re < 0.0 {
            // Mean square over forcing goes with one over the decay rate.
            let mean_square = sound.level.powi(2) * slowest / -part.s.re;
            let mut mode = Decaying::new(part.s, mean_square, dt, &mut noise);
            for i in 0..count {
                add(i, mode.next(&mut noise));
            }
        } else {
            let limit = sound.cycle / growing.sqrt();
            let mut mode = Cycle {
                growth: part.s.re,
                limit,
                turn: Complex64::cis(part.s.im * dt),
                dt,
                // Forcing of equal density: variance 2 nu per second and unit mean square.
                kick: (2.0 * slowest * dt).sqrt() * sound.level,
                state: Complex64::new(limit, 0.0),
            };
            for i in 0..count {
                add(i, mode.next(&mut noise));
            }
        }
    }
    for (i, channel) in samples.iter_mut().enumerate() {
        let mut noise = Noise::stream(sound.seed, SENSORS + i as u64);
        for x in channel.iter_mut() {
            *x += sound.sensor_noise * noise.next();
        }
    }
    let channels = names.iter().zip(samples).map(|(name, samples)| Channel {
        name: name.clone(),
        quantity: Quantity::Pressure,
        samples,
    });
    Record {
        rate_hz: sound.rate_hz,
        start: 0.0,
        channels: channels.collect(),
    }
}
