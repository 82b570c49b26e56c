//! Gases and the state of a stream at a station: equation of state, sound speed, stagnation.
//!
//! A gas obeys `p = rho R T`; its specific heat is constant ([`Gas::Perfect`]) or depends on
//! temperature alone ([`Gas::Air`]). Enthalpy is sensible, zero at 298.15 K. Everything is written
//! over [`Real`], values and derivatives alike.

pub(crate) mod air;
mod choked;
pub(crate) mod implicit;
pub(crate) mod nasa;
mod state;

pub use choked::{choked_flux, choked_flux_temperature_slope, choked_temperature};
pub use state::State;

use crate::numerics::dual::Real;

/// Molar gas constant (J/(mol K)), exact (SI, CODATA 2018).
pub const MOLAR_GAS_CONSTANT: f64 = 8.314_462_618_153_24;

/// Temperature at which sensible enthalpy is zero (K).
pub const REFERENCE_TEMPERATURE: f64 = 298.15;

/// A gas of fixed composition obeying `p = rho R T`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Gas<T> {
    /// Constant ratio of specific heats and specific gas constant (J/(kg K)).
    Perfect {
        /// Ratio of specific heats.
        gamma: T,
        /// Specific gas constant (J/(kg K)).
        gas_constant: T,
    },
    /// Dry air, thermally perfect: N2 0.78084, O2 0.20946, Ar 0.00934, CO2 0.0004 by mole,
    /// normalised; NASA polynomials (McBride, Gordon & Reno 1993, NASA TM-4513).
    Air,
}

impl<T> Gas<T> {
    /// The same gas with each number replaced by `f` of it.
    pub fn map<U>(self, f: impl Fn(T) -> U) -> Gas<U> {
        match self {
            Gas::Perfect {
                gamma,
                gas_constant,
            } => Gas::Perfect {
                gamma: f(gamma),
                gas_constant: f(gas_constant),
            },
            Gas::Air => Gas::Air,
        }
    }
}

impl<T: Real> Gas<T> {
    /// Specific gas constant `R` (J/(kg K)).
    pub fn gas_constant(&self) -> T {
        match *self {
            Gas::Perfect { gas_constant, .. } => gas_constant,
            Gas::Air => T::from(air::GAS_CONSTANT),
        }
    }

    /// Specific heat at constant pressure (J/(kg K)) at `t` (K).
    pub fn cp(&self, t: T) -> T {
        match *self {
            Gas::Perfect {
                gamma,
                gas_constant,
            } => gamma / (gamma - 1.0) * gas_constant,
            Gas::Air => air::cp(t),
        }
    }

    /// Ratio of specific heats at `t` (K).
    pub fn gamma(&self, t: T) -> T {
        match *self {
            Gas::Perfect { gamma, .. } => gamma,
            Gas::Air => {
                let cp = air::cp(t);
                cp / (cp - air::GAS_CONSTANT)
            }
        }
    }

    /// Sensible enthalpy (J/kg) at `t` (K), zero at [`REFERENCE_TEMPERATURE`].
    pub fn enthalpy(&self, t: T) -> T {
        match self {
            Gas::Perfect { .. } => self.cp(t) * (t - REFERENCE_TEMPERATURE),
            Gas::Air => air::enthalpy(t),
        }
    }

    /// `integral cp/T dT` (J/(kg K)) at `t` (K), from a datum of its own: only differences mean
    /// something. Along an isentrope `p` varies as `exp(entropy_function/R)`.
    pub fn entropy_function(&self, t: T) -> T {
        match self {
            Gas::Perfect { .. } => self.cp(t) * t.ln(),
            Gas::Air => air::entropy(t),
        }
    }

    /// Frozen sound speed `sqrt(gamma R T)` (m/s) at `t` (K).
    pub fn sound_speed(&self, t: T) -> T {
        (self.gamma(t) * self.gas_constant() * t).sqrt()
    }

    /// Temperature (K) at which the sensible enthalpy is `h` (J/kg).
    ///
    /// Not positive where `h` lies below the enthalpy at absolute zero.
    pub fn temperature_at_enthalpy(&self, h: T) -> T {
        let guess = REFERENCE_TEMPERATURE + h.value() / (4.0 * self.gas_constant().value());
        self.temperature_at_enthalpy_near(h, guess)
    }

    /// [`Gas::temperature_at_enthalpy`] with a guess (K), which saves iterations.
    pub(crate) fn temperature_at_enthalpy_near(&self, h: T, guess: f64) -> T {
        match self {
            Gas::Perfect { .. } => h / self.cp(h) + REFERENCE_TEMPERATURE,
            Gas::Air => {
                let root = air::temperature_at_enthalpy(h.value(), guess);
                implicit::carry(root, air::cp(root), |t: T| air::enthalpy(t) - h)
            }
        }
    }

    /// `p_a/p_b` between temperatures `a` and `b` (K) of one isentrope.
    pub fn isentropic_pressure_ratio(&self, a: T, b: T) -> T {
        match *self {
            Gas::Perfect { gamma, .. } => (a / b).pow(gamma / (gamma - 1.0)),
            Gas::Air => ((air::entropy(a) - air::entropy(b)) / air::GAS_CONSTANT).exp(),
        }
    }

    /// The gas in plain numbers.
    pub fn value(&self) -> Gas<f64> {
        self.map(Real::value)
    }

    /// Temperatures (K) between which the gas's properties are known; `None` where they hold by
    /// definition.
    pub fn range(&self) -> Option<(f64, f64)> {
        match self {
            Gas::Perfect { .. } => None,
            Gas::Air => Some((nasa::LOWEST, nasa::HIGHEST)),
        }
    }

    /// A remark, where `t` (K) lies outside [`Gas::range`]; properties there are extrapolated.
    pub fn beyond_range(&self, t: T) -> Option<String> {
        let (lowest, highest) = self.range()?;
        let t = t.value();
        let told = if t < 1e9 {
            format!("{t:.1}")
        } else {
            format!("{t:.3e}")
        };
        (!(lowest..=highest).contains(&t)).then(|| {
            format!(
                "air at {told} K lies outside its property data ({lowest} K to {highest} K); \
                 its specific heat there is extrapolated"
            )
        })
    }
}

impl Gas<f64> {
    /// The same gas in another number type, as constants.
    pub fn lift<T: Real>(&self) -> Gas<T> {
        self.map(T::from)
    }
}

#[cfg(test)]
mod tests;
