//! The fluxes through a station, as every balance uses them, with derivatives that stay finite at
//! rest.
//!
//! With `rho` density, `u` velocity, `c` sound speed, `h_t` stagnation enthalpy, `T` temperature,
//! `eta = u s'/cp` entropy flux (m/s), the first-order changes are
//!
//! ```text
//! (rho u)'      = rho u' + u p'/c^2 - rho eta
//! (rho u^2)'    = u (rho u)' + rho u u'
//! (rho u h_t)'  = h_t (rho u)' + u p' + rho u^2 u' + rho cp T eta
//! p_t'          = rho_t (p'/rho + u u' - cp (T_t - T)/u eta)
//! ```
//!
//! (Gibbs' relation `dh = T ds + dp/rho` at static and at stagnation conditions). With the entropy
//! flux as unknown no term is singular at `u = 0`, so that still gas is no special case.

use crate::gas::State;
use crate::numerics::dual::{Grad, Real};

/// The fluxes through one station.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Port<N> {
    /// Static pressure `p` (Pa).
    pub pressure: N,
    /// Velocity `u` (m/s).
    pub velocity: N,
    /// Mass flow `rho u A` (kg/s).
    pub mass_flow: N,
    /// Momentum flux `rho u^2` (Pa).
    pub momentum_flux: N,
    /// Flow of stagnation enthalpy `rho u A h_t` (W).
    pub enthalpy_flow: N,
    /// Isentropic stagnation pressure (Pa).
    pub stagnation_pressure: N,
    /// Area (m^2).
    pub area: N,
}

/// Number of acoustic unknowns a balance between two stations depends on.
pub const UNKNOWNS: usize = 6;

/// A number with its derivatives with respect to `(p', u', eta)` of two stations.
pub type Variation<T> = Grad<T, UNKNOWNS>;

impl<T: Real> Port<T> {
    /// The fluxes of a state.
    pub fn of(state: &State<T>) -> Self {
        let mass_flow = state.mass_flow();
        Port {
            pressure: state.pressure,
            velocity: state.velocity,
            mass_flow,
            momentum_flux: state.density() * state.velocity * state.velocity,
            enthalpy_flow: mass_flow * state.stagnation_enthalpy(),
            stagnation_pressure: state.stagnation_pressure(),
            area: state.area,
        }
    }
}

impl<T: Real> Port<Variation<T>> {
    /// The fluxes of a state with their derivatives along `(p', u', eta)`, which are the directions
    /// `first`, `first + 1`, `first + 2`.
    pub fn around(state: &State<T>, first: usize) -> Self {
        let (gas, t, u, a) = (state.gas, state.temperature, state.velocity, state.area);
        let (rho, c, cp) = (state.density(), state.sound_speed(), gas.cp(t));
        let (h_t, t_t, p_t) = (
            state.stagnation_enthalpy(),
            state.stagnation_temperature(),
            state.stagnation_pressure(),
        );
        let along = |v: T, d: [T; 3]| {
            let mut g = Grad::constant(v);
            for (slot, d) in g.d.iter_mut().skip(first).zip(d) {
                *slot = d;
            }
            g
        };
        let zero = T::from(0.0);
        let one = T::from(1.0);
        let velocity = along(u, [zero, one, zero]);
        let area = Grad::constant(a);
        let mass_flux = along(rho * u, [u / (c * c), rho, -rho]);
        let stagnation_enthalpy_part = along(zero, [u, rho * u * u, rho * cp * t]) * area;
        let rho_t = p_t / (gas.gas_constant() * t_t);
        Port {
            pressure: along(state.pressure, [one, zero, zero]),
            velocity,
            mass_flow: mass_flux * area,
            momentum_flux: mass_flux * velocity,
            enthalpy_flow: mass_flux * area * Grad::constant(h_t) + stagnation_enthalpy_part,
            stagnation_pressure: along(
                p_t,
                [
                    rho_t / rho,
                    rho_t * u,
                    -rho_t * cp * stagnation_rise_over_velocity(state, t_t),
                ],
            ),
            area,
        }
    }
}

/// `(T_t - T)/u` (K s/m), finite at rest.
///
/// The difference of two temperatures would lose digits where it is small: from `h(T_t) - h(T) = u^2/2` it is
/// `u/(2 cp)` with the mean heat capacity between, by Gauss's rule of three points, exact for polynomials
/// of fifth degree.
fn stagnation_rise_over_velocity<T: Real>(state: &State<T>, t_t: T) -> T {
    let rise = t_t - state.temperature;
    if rise.value() > 1e-2 * state.temperature.value() {
        return rise / state.velocity;
    }
    let half_width = 0.5 * 0.6f64.sqrt();
    let cp = |node: f64| state.gas.cp(state.temperature + rise * node);
    let outer = cp(0.5 - half_width) + cp(0.5 + half_width);
    let mean = (outer * 5.0 + cp(0.5) * 8.0) / 18.0;
    state.velocity / (mean * 2.0)
}
