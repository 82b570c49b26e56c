//! The state of a stream at a station.
//!
//! `rho = p/(R T)`, `M = u/c`, `mdot = rho u A`; stagnation values are those after an isentropic
//! stop: `h(T_t) = h(T) + u^2/2`, `p_t/p = exp((phi(T_t) - phi(T))/R)` with `phi' = cp/T`.

use super::Gas;
use crate::numerics::dual::Real;

/// A stream at a station: subsonic, uniform over its area.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct State<T> {
    /// Its gas.
    pub gas: Gas<T>,
    /// Static pressure (Pa).
    pub pressure: T,
    /// Static temperature (K).
    pub temperature: T,
    /// Velocity along the flow (m/s).
    pub velocity: T,
    /// Area of the passage (m^2).
    pub area: T,
}

impl<T> State<T> {
    /// The same state with each number replaced by `f` of it.
    pub fn map<U>(self, f: impl Fn(T) -> U) -> State<U> {
        State {
            gas: self.gas.map(&f),
            pressure: f(self.pressure),
            temperature: f(self.temperature),
            velocity: f(self.velocity),
            area: f(self.area),
        }
    }
}

impl<T: Real> State<T> {
    /// Density (kg/m^3).
    pub fn density(&self) -> T {
        self.pressure / (self.gas.gas_constant() * self.temperature)
    }

    /// Sound speed (m/s).
    pub fn sound_speed(&self) -> T {
        self.gas.sound_speed(self.temperature)
    }

    /// Mach number, of the velocity's sign.
    pub fn mach(&self) -> T {
        self.velocity / self.sound_speed()
    }

    /// Mass flow (kg/s).
    pub fn mass_flow(&self) -> T {
        self.density() * self.velocity * self.area
    }

    /// Stagnation enthalpy (J/kg): sensible enthalpy from 298.15 K plus `u^2/2`.
    pub fn stagnation_enthalpy(&self) -> T {
        self.gas.enthalpy(self.temperature) + self.velocity * self.velocity * 0.5
    }

    /// Stagnation temperature (K).
    pub fn stagnation_temperature(&self) -> T {
        let kinetic = self.velocity * self.velocity * 0.5;
        match self.gas {
            Gas::Perfect { .. } => self.temperature + kinetic / self.gas.cp(self.temperature),
            Gas::Air => {
                let t = self.temperature.value();
                let guess = t + kinetic.value() / self.gas.value().cp(t);
                self.gas
                    .temperature_at_enthalpy_near(self.stagnation_enthalpy(), guess)
            }
        }
    }

    /// Isentropic stagnation pressure (Pa).
    pub fn stagnation_pressure(&self) -> T {
        let t_t = self.stagnation_temperature();
        self.pressure * self.gas.isentropic_pressure_ratio(t_t, self.temperature)
    }

    /// The state in plain numbers.
    pub fn value(&self) -> State<f64> {
        self.map(Real::value)
    }

    /// Whether every number, derivatives included, is finite.
    pub fn is_finite(&self) -> bool {
        let gas = match self.gas {
            Gas::Perfect {
                gamma,
                gas_constant,
            } => gamma.is_finite() && gas_constant.is_finite(),
            Gas::Air => true,
        };
        gas && self.pressure.is_finite()
            && self.temperature.is_finite()
            && self.velocity.is_finite()
            && self.area.is_finite()
    }
}

impl State<f64> {
    /// The same state in another number type, as constants.
    pub fn lift<T: Real>(&self) -> State<T> {
        self.map(T::from)
    }
}
