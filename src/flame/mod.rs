//! Flame responses: laws `F(s)` from a velocity fluctuation to heat release.
//!
//! A response obeys `F(conj s) = conj F(s)`, so that it is real on the real axis; `F(0)` is its gain
//! at zero frequency. Each law is a measure of delays, for which `waves` has values and bounds.

use crate::knobs::{KnobId, KnobSpec, Range, Values};
use crate::numerics::dual::Real;
use crate::units::Dimension;
use crate::waves::law::Delayed;

/// A law `F(s)`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ResponseLaw {
    /// `n exp(-s tau)` (Crocco 1951).
    NTau {
        /// Interaction index `n`, of either sign.
        interaction_index: KnobId,
        /// Delay `tau` (s).
        delay: KnobId,
    },
    /// `n exp(-s tau + s^2 w^2/2)`: delays normally distributed about `tau`.
    Gaussian {
        /// Interaction index `n`, of either sign.
        interaction_index: KnobId,
        /// Mean delay `tau` (s).
        delay: KnobId,
        /// Standard deviation `w` of the delay (s).
        spread: KnobId,
    },
}

impl ResponseLaw {
    /// Its mean delay, and the standard deviation of that where there is one.
    pub fn delay_and_spread(self) -> (KnobId, Option<KnobId>) {
        match self {
            ResponseLaw::NTau { delay, .. } => (delay, None),
            ResponseLaw::Gaussian { delay, spread, .. } => (delay, Some(spread)),
        }
    }

    /// The law as one contribution to a measure of delays.
    pub fn delays<T: Real>(self, values: &Values<T>) -> Delayed<T> {
        match self {
            ResponseLaw::NTau {
                interaction_index,
                delay,
            } => Delayed {
                weight: values[interaction_index],
                delay: values[delay],
                spread: T::from(0.0),
            },
            ResponseLaw::Gaussian {
                interaction_index,
                delay,
                spread,
            } => Delayed {
                weight: values[interaction_index],
                delay: values[delay],
                spread: values[spread],
            },
        }
    }
}

/// What a file may state of a response in numbers.
pub const KNOBS: &[KnobSpec] = &[
    KnobSpec {
        key: "interaction_index",
        dimension: Dimension::Number,
        range: Range::Any,
        default: None,
        doc: "gain of the response at zero frequency, of either sign",
    },
    KnobSpec {
        key: "delay",
        dimension: Dimension::Time,
        range: Range::NotNegative,
        default: None,
        doc: "mean delay between velocity and heat release",
    },
    KnobSpec {
        key: "spread",
        dimension: Dimension::Time,
        range: Range::NotNegative,
        default: None,
        doc: "standard deviation of the delay (kind \"gaussian\")",
    },
];
