//! A straight passage: plane waves in uniform flow.

use super::Section;
use super::knob::{KnobId, KnobSpec, Range};
use crate::units::Dimension;

/// A passage of constant area.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Duct {
    /// Length [m].
    pub length: KnobId,
    /// Its area.
    pub section: Section,
    /// What becomes of entropy waves in it.
    pub entropy: Entropy,
}

/// What becomes of entropy waves along a duct.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Entropy {
    /// They have mixed out at its end.
    Mixed,
    /// They travel with the flow and spread.
    Carried {
        /// Standard deviation of the arrival time [s].
        dispersion: KnobId,
    },
}

/// What a file may state of a duct in numbers.
pub const KNOBS: &[KnobSpec] = &[
    KnobSpec {
        key: "length",
        dimension: Dimension::Length,
        range: Range::Positive,
        default: None,
        doc: "length along the flow",
    },
    KnobSpec {
        key: "diameter",
        dimension: Dimension::Length,
        range: Range::Positive,
        default: None,
        doc: "inner diameter of a round passage",
    },
    KnobSpec {
        key: "area",
        dimension: Dimension::Area,
        range: Range::Positive,
        default: None,
        doc: "area of the passage, instead of the diameter",
    },
    KnobSpec {
        key: "entropy_dispersion",
        dimension: Dimension::Time,
        range: Range::NotNegative,
        default: Some(0.0),
        doc: "standard deviation in arrival time of a carried entropy wave",
    },
];
