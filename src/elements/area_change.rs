//! Area changes: the smooth contraction and the sudden expansion.

use super::lowering::{Acting, Between, Side};
use super::port::Port;
use crate::knobs::{KnobId, KnobSpec, Range, Values};
use crate::numerics::dual::Real;
use crate::units::Dimension;

/// A change to a smaller area in which stagnation pressure is kept.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Contraction {
    /// Effective length of the slug of the smaller area (m).
    pub effective_length: KnobId,
}

/// A sudden change to a larger area: Borda-Carnot.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Expansion {
    /// Effective length of the slug of the smaller area (m).
    pub effective_length: KnobId,
}

impl Contraction {
    /// The slug moves with the downstream velocity.
    pub fn acting<T: Real>(&self, between: &Between<'_, T>, values: &Values<T>) -> Acting<T> {
        let length = values[self.effective_length];
        Acting::slug(between, length, Side::Outlet, T::from(1.0))
    }
}

impl Expansion {
    /// The slug moves with the upstream velocity.
    pub fn acting<T: Real>(&self, between: &Between<'_, T>, values: &Values<T>) -> Acting<T> {
        let length = values[self.effective_length];
        Acting::slug(between, length, Side::Inlet, T::from(1.0))
    }
}

/// Stagnation pressure is kept, `p_t1 - p_t2 = 0` (Pa); with mass and enthalpy kept the change is
/// isentropic.
pub fn contraction<N: Real>(up: &Port<N>, down: &Port<N>) -> N {
    up.stagnation_pressure - down.stagnation_pressure
}

/// Momentum with the upstream pressure on the step's face, over the larger area:
/// `p1 + rho1 u1^2 A1/A2 - p2 - rho2 u2^2 = 0` (Pa) (Borda-Carnot, compressible).
pub fn expansion<N: Real>(up: &Port<N>, down: &Port<N>) -> N {
    up.pressure + up.momentum_flux * up.area / down.area - down.pressure - down.momentum_flux
}

/// What a file may state of either in numbers.
pub const KNOBS: &[KnobSpec] = &[KnobSpec {
    key: "effective_length",
    dimension: Dimension::Length,
    range: Range::NotNegative,
    default: Some(0.0),
    doc: "length of a slug of the smaller area that moves with the flow",
}];
