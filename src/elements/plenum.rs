//! A plenum: a vessel whose gas is at rest and compressible.

use super::knob::{KnobId, KnobSpec, Range};
use crate::units::Dimension;

/// A vessel large enough for its gas to be at rest.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Plenum {
    /// Volume [m^3].
    pub volume: KnobId,
}

/// What a file may state of a plenum in numbers.
pub const KNOBS: &[KnobSpec] = &[KnobSpec {
    key: "volume",
    dimension: Dimension::Volume,
    range: Range::Positive,
    default: None,
    doc: "volume of the gas at rest",
}];
