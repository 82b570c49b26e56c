//! A straight passage: plane waves in uniform flow.

use super::Section;
use crate::gas::State;
use crate::knobs::{KnobId, KnobSpec, Range, Values};
use crate::numerics::dual::Real;
use crate::units::Dimension;
use crate::waves::law::{Delayed, Law};
use crate::waves::primitive::Travel;

/// A passage of constant area.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Duct {
    /// Length (m).
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
        /// Standard deviation of the arrival time (s).
        dispersion: KnobId,
    },
}

impl Duct {
    /// `p+ -> p+ exp(-s L/(c+u))`, `p- -> p- exp(+s L/(c-u))`, `eta -> eta exp(-s L/u + s^2 d^2/2)` where
    /// carried, else zero. Still gas carries no entropy anywhere.
    pub fn lower<T: Real>(&self, state: &State<T>, values: &Values<T>) -> Travel<T> {
        let (length, c, u) = (values[self.length], state.sound_speed(), state.velocity);
        let entropy = match self.entropy {
            Entropy::Carried { dispersion } if u.value() > 0.0 => {
                let spread = values[dispersion];
                Some(Law::Delays(vec![Delayed {
                    weight: T::from(1.0),
                    delay: length / u,
                    spread,
                }]))
            }
            _ => None,
        };
        Travel {
            downstream: length / (c + u),
            upstream: length / (c - u),
            entropy,
        }
    }
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
