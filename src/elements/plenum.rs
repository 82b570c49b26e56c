//! A plenum: a vessel whose gas is at rest and compressible.

use super::lowering::{self, Acting, Between, on_waves};
use super::port::Port;
use crate::knobs::{KnobId, KnobSpec, Range, Values};
use crate::numerics::dual::{Grad, Real};
use crate::units::Dimension;
use crate::waves::law::Law;
use crate::waves::primitive::{Joint, Term};

/// A vessel large enough for its gas to be at rest.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Plenum {
    /// Volume (m^3).
    pub volume: KnobId,
}

impl Plenum {
    /// `A_1 (rho u' + u p'/c^2)_1 - mdot_2' = V s p_1'/c^2` with the sound speed of the gas at rest,
    /// `p_1' = p_t2'`, and no entropy leaves.
    ///
    /// The row is the vessel's energy balance `(mdot h_t)_1' - (mdot h_t)_2' = V s p_1'/(gamma - 1)` over
    /// its enthalpy, to second order in the Mach numbers: entropy flowing in brings energy and lacks
    /// mass, so that `mdot_1'` counts without its share of entropy. A flame before the vessel acts on
    /// it through this, though it leaves the mass flow as it is.
    pub fn lower<T: Real>(&self, between: &Between<'_, T>, values: &Values<T>) -> Joint<T> {
        let zero = T::from(0.0);
        let mut inflow = Port::around(between.up, 0);
        inflow.mass_flow.d[2] = zero;
        let down = Port::around(between.down, 3);
        let c = between
            .up
            .gas
            .sound_speed(between.up.stagnation_temperature());
        let compliance = values[self.volume] / (c * c);
        let acting = Acting {
            row: [T::from(-1.0), zero, zero],
            terms: vec![Term {
                law: Law::Polynomial {
                    coefficients: [zero, compliance, zero],
                    delay: zero,
                },
                sense: on_waves(between.up, [T::from(1.0), zero, zero]),
                at: between.plane,
            }],
        };
        let mut no_entropy = Grad::constant(zero);
        no_entropy.d[5] = T::from(1.0);
        let balances = [
            inflow.mass_flow - down.mass_flow,
            no_entropy,
            balance(&inflow, &down),
        ];
        lowering::rows(between, balances, acting)
    }
}

/// The inflow loses its dynamic head, the outflow leaves isentropically from rest:
/// `p1 - p_t2 = 0` (Pa).
pub fn balance<N: Real>(up: &Port<N>, down: &Port<N>) -> N {
    up.pressure - down.stagnation_pressure
}

/// What a file may state of a plenum in numbers.
pub const KNOBS: &[KnobSpec] = &[KnobSpec {
    key: "volume",
    dimension: Dimension::Volume,
    range: Range::Positive,
    default: None,
    doc: "volume of the gas at rest",
}];
