//! Area changes: the smooth contraction and the sudden expansion.

use super::knob::{KnobId, KnobSpec, Range};
use crate::units::Dimension;

/// A change to a smaller area in which stagnation pressure is kept.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Contraction {
    /// Effective length of the slug of the smaller area [m].
    pub effective_length: KnobId,
}

/// A sudden change to a larger area: Borda-Carnot.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Expansion {
    /// Effective length of the slug of the smaller area [m].
    pub effective_length: KnobId,
}

/// What a file may state of either in numbers.
pub const KNOBS: &[KnobSpec] = &[KnobSpec {
    key: "effective_length",
    dimension: Dimension::Length,
    range: Range::NotNegative,
    default: Some(0.0),
    doc: "length of a slug of the smaller area that moves with the flow",
}];
