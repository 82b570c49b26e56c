//! Flow at Mach 1 from given stagnation conditions: the throat of a choked nozzle.
//!
//! Isentropic from rest at `p_t, T_t` to the throat `*`, where `u* = c*`:
//! `h(T*) + c(T*)^2/2 = h(T_t)`, `p* = p_t exp((phi(T*) - phi(T_t))/R)`, `phi' = cp/T`, and the flux is
//! `G = p* c*/(R T*)` (kg/(s m^2)). For a perfect gas
//! `G = p_t sqrt(gamma/(R T_t)) (2/(gamma+1))^((gamma+1)/(2(gamma-1)))`.
//!
//! `G` is the greatest flux the isentrope allows, so `dG/dT* = 0` at given `T_t`, and with
//! `u*^2 = 2 (h_t - h*)`: `d ln G/d ln T_t = cp(T_t) (T_t/c*^2 - 1/R)`, which is `-1/2` for a perfect
//! gas.

use super::{Gas, implicit};
use crate::numerics::dual::{Dual, Real};

/// Static temperature (K) at Mach 1 of a stream with stagnation temperature `t_t` (K).
pub fn choked_temperature<T: Real>(gas: &Gas<T>, t_t: T) -> T {
    match *gas {
        Gas::Perfect { gamma, .. } => t_t * 2.0 / (gamma + 1.0),
        Gas::Air => {
            fn residual<T: Real>(t: T, h_t: T) -> T {
                let c = Gas::Air.sound_speed(t);
                Gas::Air.enthalpy(t) + c * c * 0.5 - h_t
            }
            let plain = t_t.value();
            let h_t = Dual::constant(Gas::<f64>::Air.enthalpy(plain));
            let mut t = plain * 2.0 / (Gas::<f64>::Air.gamma(plain) + 1.0);
            let mut slope = 1.0;
            for _ in 0..40 {
                let r = residual(Dual::variable(t, 0), h_t);
                [slope] = r.d;
                let step = r.v / slope;
                t -= step;
                if step.abs() <= 1e-9 * t.abs() {
                    break;
                }
            }
            let h_t = gas.enthalpy(t_t);
            implicit::carry(t, slope, |t: T| residual(t, h_t))
        }
    }
}

/// Mass flux `G` (kg/(s m^2)) at Mach 1 from stagnation pressure `p_t` (Pa) and temperature `t_t` (K).
pub fn choked_flux<T: Real>(gas: &Gas<T>, p_t: T, t_t: T) -> T {
    let r = gas.gas_constant();
    match *gas {
        Gas::Perfect { gamma, .. } => {
            let exponent = (gamma + 1.0) / ((gamma - 1.0) * 2.0);
            p_t * (gamma / (r * t_t)).sqrt() * ((gamma + 1.0).recip() * 2.0).pow(exponent)
        }
        Gas::Air => {
            let t = choked_temperature(gas, t_t);
            let p = p_t * gas.isentropic_pressure_ratio(t, t_t);
            p / (r * t) * gas.sound_speed(t)
        }
    }
}

/// `d ln G/d ln T_t` of [`choked_flux`] at constant `p_t`; `d ln G/d ln p_t` is one.
pub fn choked_flux_temperature_slope<T: Real>(gas: &Gas<T>, t_t: T) -> T {
    match gas {
        Gas::Perfect { .. } => T::from(-0.5),
        Gas::Air => {
            let c = gas.sound_speed(choked_temperature(gas, t_t));
            gas.cp(t_t) * (t_t / (c * c) - gas.gas_constant().recip())
        }
    }
}
