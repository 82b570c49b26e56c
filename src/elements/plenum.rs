//! A plenum: a vessel whose gas is at rest and compressible.

use super::knob::{KnobId, KnobSpec, Range};
use super::port::Port;
use crate::numerics::dual::Real;
use crate::units::Dimension;

/// A vessel large enough for its gas to be at rest.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Plenum {
    /// Volume [m^3].
    pub volume: KnobId,
}

/// The inflow loses its dynamic head, the outflow leaves isentropically from rest:
/// `p1 - p_t2 = 0` [Pa].
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
