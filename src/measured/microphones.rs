//! Plane waves from wall pressures: `p+` with the flow, `p-` against it, reflection coefficient and velocity.
//!
//! With `exp(+i w t)`, at a distance `x` along the flow from the plane of reference,
//!
//! ```text
//! p(x) = p+ exp(-i k+ x) + p- exp(+i k- x),   k+ = w/(c + u),  k- = w/(c - u)
//! rho c u' = p+ - p-
//! ```
//!
//! Two sensors give `p+` and `p-` directly (ISO 10534-2), more by least squares. The columns have unit entries, so the ratio
//! of the largest to the smallest singular value says by how much an error of a sensor may grow; it is infinite where
//! the sensors are a multiple of half a wavelength apart, `(k+ + k-) d = 2 pi n`.

use std::f64::consts::PI;

use nalgebra::{DMatrix, DVector};
use num_complex::Complex64;

use crate::problems::Problem;

/// The duct and the places of the sensors.
#[derive(Clone, Debug, PartialEq)]
pub struct Array {
    /// Distance of each sensor along the flow from the plane of reference (m); negative upstream of it.
    pub positions: Vec<f64>,
    /// Sound speed (m/s).
    pub sound_speed: f64,
    /// Mean velocity (m/s), positive along `x`.
    pub velocity: f64,
    /// Density (kg/m^3).
    pub density: f64,
}

/// Which way the wave runs that falls on the plane of reference.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Facing {
    /// The plane is a downstream end: reflection is `p-/p+`.
    Downstream,
    /// The plane is an upstream end: reflection is `p+/p-`.
    Upstream,
}

/// Waves at the plane of reference.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Waves {
    /// Wave that runs with the flow (Pa).
    pub downstream: Complex64,
    /// Wave that runs against it (Pa).
    pub upstream: Complex64,
    /// Velocity fluctuation (m/s).
    pub velocity: Complex64,
    /// Condition number of the system solved.
    pub condition: f64,
    /// Root mean square of what the waves leave unexplained at the sensors (Pa); zero for two sensors.
    pub residual: f64,
}

impl Waves {
    /// Pressure at the plane of reference (Pa).
    pub fn pressure(&self) -> Complex64 {
        self.downstream + self.upstream
    }

    /// Reflected over incident pressure wave.
    pub fn reflection(&self, facing: Facing) -> Complex64 {
        match facing {
            Facing::Downstream => self.upstream / self.downstream,
            Facing::Upstream => self.downstream / self.upstream,
        }
    }
}

/// Condition number from which on the waves are doubtful. Two sensors reach it within about a tenth of the band to
/// the half wavelength, as ISO 10534-2 keeps clear of it.
pub const DOUBTFUL: f64 = 6.0;

/// Condition number from which on there is no answer.
const SINGULAR: f64 = 1e12;

impl Array {
    fn wavenumbers(&self, frequency: f64) -> (f64, f64) {
        let omega = 2.0 * PI * frequency;
        (
            omega / (self.sound_speed + self.velocity),
            omega / (self.sound_speed - self.velocity),
        )
    }

    fn check(&self, sensors: usize) -> Result<(), Problem> {
        let given = self.positions.len();
        if given < 2 {
            return Err(Problem::error(
                "sensor",
                "waves cannot be parted with fewer than two sensors",
            )
            .hint("add a sensor of pressure in the same duct"));
        }
        if sensors != given {
            let what = format!("{sensors} pressures for {given} sensors");
            return Err(Problem::error("sensor", what));
        }
        if !self.positions.iter().all(|x| x.is_finite()) {
            return Err(Problem::error(
                "sensor",
                "a sensor's position is not finite",
            ));
        }
        let flow = self.sound_speed > 0.0
            && self.sound_speed.is_finite()
            && self.velocity.abs() < self.sound_speed
            && self.density > 0.0
            && self.density.is_finite();
        if !flow {
            let what = format!(
                "no subsonic flow: sound speed {} m/s, velocity {} m/s, density {} kg/m^3",
                self.sound_speed, self.velocity, self.density
            );
            return Err(Problem::error("sensor", what));
        }
        Ok(())
    }

    fn matrix(&self, frequency: f64) -> DMatrix<Complex64> {
        let (with, against) = self.wavenumbers(frequency);
        DMatrix::from_fn(self.positions.len(), 2, |i, j| {
            let x = self.positions[i];
            if j == 0 {
                Complex64::cis(-with * x)
            } else {
                Complex64::cis(against * x)
            }
        })
    }

    /// Condition number at a frequency (Hz): one at best, infinite where sensors are half wavelengths apart.
    pub fn condition(&self, frequency: f64) -> f64 {
        // Columns of norm sqrt(n) whose inner product is g: singular values sqrt(n +- |g|).
        let (with, against) = self.wavenumbers(frequency);
        let n = self.positions.len() as f64;
        let g: Complex64 = self
            .positions
            .iter()
            .map(|x| Complex64::cis((with + against) * x))
            .sum();
        let low = n - g.norm();
        if low > n * f64::EPSILON {
            ((n + g.norm()) / low).sqrt()
        } else {
            f64::INFINITY
        }
    }

    /// Waves from pressure amplitudes, one for each sensor (Pa), in whatever common phase.
    ///
    /// # Errors
    /// Where there are fewer than two sensors, the flow is not subsonic, or the sensors cannot tell the waves apart.
    pub fn part(&self, frequency: f64, pressures: &[Complex64]) -> Result<Waves, Problem> {
        self.check(pressures.len())?;
        let condition = self.condition(frequency);
        if condition > SINGULAR {
            let what = format!(
                "at {frequency:.2} Hz the sensors are whole half wavelengths apart: the waves cannot be told apart"
            );
            return Err(Problem::error("sensor", what).hint("add a sensor at another distance"));
        }
        let matrix = self.matrix(frequency);
        let measured = DVector::from_column_slice(pressures);
        let none = || Problem::error("sensor", format!("no waves settle at {frequency:.2} Hz"));
        let solved = if self.positions.len() == 2 {
            matrix.clone().lu().solve(&measured).ok_or_else(none)?
        } else {
            let qr = matrix.clone().qr();
            let right = qr.q().adjoint() * &measured;
            qr.r().solve_upper_triangular(&right).ok_or_else(none)?
        };
        let rest = (&matrix * &solved - &measured).norm();
        let (downstream, upstream) = (solved[0], solved[1]);
        Ok(Waves {
            downstream,
            upstream,
            velocity: (downstream - upstream) / (self.density * self.sound_speed),
            condition,
            residual: rest / (pressures.len() as f64).sqrt(),
        })
    }

    /// Waves from spectra: `cross[i]` is the cross density of a reference with sensor `i` and `reference` the power density
    /// of the reference; amplitudes are those per unit of it, noise of the sensors averaged out.
    ///
    /// # Errors
    /// As [`part`](Self::part), and where the reference has no power.
    pub fn part_spectra(
        &self,
        frequency: f64,
        reference: f64,
        cross: &[Complex64],
    ) -> Result<Waves, Problem> {
        if reference.is_nan() || reference <= 0.0 {
            let what = format!("the reference has no power at {frequency:.2} Hz");
            return Err(Problem::error("reference", what));
        }
        let root = reference.sqrt();
        let amplitudes: Vec<Complex64> = cross.iter().map(|c| c / root).collect();
        self.part(frequency, &amplitudes)
    }

    /// A warning for each stretch of frequencies where the sensors are too near to half a wavelength apart (or too
    /// near each other for their distance to tell), with its ends.
    pub fn warnings(&self, frequencies: &[f64]) -> Vec<Problem> {
        let doubtful = |f: &f64| self.condition(*f) > DOUBTFUL;
        frequencies
            .chunk_by(|a, b| doubtful(a) == doubtful(b))
            .filter(|stretch| stretch.first().is_some_and(doubtful))
            .map(|stretch| {
                let (first, last) = (stretch[0], stretch[stretch.len() - 1]);
                let worst = stretch.iter().map(|f| self.condition(*f)).fold(1.0, f64::max);
                let low = self.spacing_in_half_waves(last) < 0.5;
                let why = if low {
                    "sensors a small part of a wavelength apart"
                } else {
                    "sensors near whole half wavelengths apart"
                };
                let what = format!(
                    "from {first:.1} to {last:.1} Hz errors of the pressures grow up to {worst:.1} times: {why}"
                );
                Problem::warning("sensor", what)
                    .hint("leave this band out, or add a sensor at another distance")
            })
            .collect()
    }

    /// Largest distance between sensors over half a wavelength, flow included.
    fn spacing_in_half_waves(&self, frequency: f64) -> f64 {
        let (with, against) = self.wavenumbers(frequency);
        let ends = self
            .positions
            .iter()
            .fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), x| {
                (a.min(*x), b.max(*x))
            });
        (with + against) * (ends.1 - ends.0) / (2.0 * PI)
    }
}
