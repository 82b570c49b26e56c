//! A compact flame between equal areas.

use super::GasChoice;
use super::knob::{KnobId, KnobSpec, Range};
use super::port::Port;
use crate::numerics::dual::Real;
use crate::units::Dimension;

/// A flame thin against every wavelength in the window.
#[derive(Clone, Debug, PartialEq)]
pub struct Flame {
    /// Static temperature behind it [K]; the inlet's where none is stated (velocity basis only).
    pub burnt_temperature: Option<KnobId>,
    /// The gas behind it; the same as before it where none is stated.
    pub burnt_gas: Option<GasChoice>,
    /// What its response multiplies.
    pub basis: Basis,
    /// Contributions to its response, summed.
    pub responses: Vec<Response>,
}

/// Momentum through a passage of constant area: `p1 + rho1 u1^2 - p2 - rho2 u2^2 = 0` [Pa].
pub fn balance<N: Real>(up: &Port<N>, down: &Port<N>) -> N {
    up.pressure + up.momentum_flux - down.pressure - down.momentum_flux
}

/// What a response is a fraction of.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Basis {
    /// `Q'/Q = sum F u'/u`.
    HeatRelease,
    /// `Q' (gamma - 1)/(gamma p A) = sum F u'`: Crocco's interaction index.
    Velocity,
}

/// One contribution to a flame's response.
#[derive(Clone, Debug, PartialEq)]
pub struct Response {
    /// Its law.
    pub law: ResponseLaw,
    /// The station whose velocity it follows.
    pub reference: Reference,
}

/// Where a response takes its velocity from.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Reference {
    /// The flame's own inlet.
    OwnInlet,
    /// The inlet of the named element.
    InletOf(String),
    /// The outlet of the named element.
    OutletOf(String),
}

/// A law `F(s)`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ResponseLaw {
    /// `n exp(-s tau)` (Crocco 1951).
    NTau {
        /// Interaction index `n`, of either sign.
        interaction_index: KnobId,
        /// Delay `tau` [s].
        delay: KnobId,
    },
    /// `n exp(-s tau + s^2 w^2/2)`: delays normally distributed about `tau`.
    Gaussian {
        /// Interaction index `n`, of either sign.
        interaction_index: KnobId,
        /// Mean delay `tau` [s].
        delay: KnobId,
        /// Standard deviation `w` of the delay [s].
        spread: KnobId,
    },
}

/// What a file may state of a flame in numbers, beside its response.
pub const KNOBS: &[KnobSpec] = &[KnobSpec {
    key: "burnt_temperature",
    dimension: Dimension::Temperature,
    range: Range::Positive,
    default: None,
    doc: "static temperature behind the flame",
}];

/// What a file may state of a response in numbers.
pub const RESPONSE_KNOBS: &[KnobSpec] = &[
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
