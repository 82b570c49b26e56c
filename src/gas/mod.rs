//! Gases and the state of a stream at a station: equation of state, sound speed, stagnation.

use crate::numerics::dual::Real;

/// Molar gas constant [J/(mol K)], exact (SI, CODATA 2018).
pub const MOLAR_GAS_CONSTANT: f64 = 8.314_462_618_153_24;

/// Temperature at which sensible enthalpy is zero [K].
pub const REFERENCE_TEMPERATURE: f64 = 298.15;

/// A gas of fixed composition obeying `p = rho R T`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Gas<T> {
    /// Constant ratio of specific heats and specific gas constant [J/(kg K)].
    Perfect {
        /// Ratio of specific heats.
        gamma: T,
        /// Specific gas constant [J/(kg K)].
        gas_constant: T,
    },
    /// Dry air, thermally perfect (NASA polynomials).
    Air,
}

/// A stream at a station: subsonic, uniform over its area.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct State<T> {
    /// Its gas.
    pub gas: Gas<T>,
    /// Static pressure [Pa].
    pub pressure: T,
    /// Static temperature [K].
    pub temperature: T,
    /// Velocity along the flow [m/s].
    pub velocity: T,
    /// Area of the passage [m^2].
    pub area: T,
}

impl<T: Real> State<T> {
    /// Density [kg/m^3].
    pub fn density(&self) -> T {
        todo!()
    }
    /// Mass flow [kg/s].
    pub fn mass_flow(&self) -> T {
        todo!()
    }
    /// Sound speed [m/s].
    pub fn sound_speed(&self) -> T {
        todo!()
    }
    /// Stagnation enthalpy [J/kg].
    pub fn stagnation_enthalpy(&self) -> T {
        todo!()
    }
    /// Stagnation temperature [K].
    pub fn stagnation_temperature(&self) -> T {
        todo!()
    }
    /// Stagnation pressure [Pa].
    pub fn stagnation_pressure(&self) -> T {
        todo!()
    }
}

impl<T: Real> Gas<T> {
    /// Heat capacity [J/(kg K)].
    pub fn cp(&self, _t: T) -> T {
        todo!()
    }
    /// Specific gas constant [J/(kg K)].
    pub fn gas_constant(&self) -> T {
        todo!()
    }
}
