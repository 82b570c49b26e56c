//! The ends: the feed, where the mean flow is stated, and the exit.

use super::knob::{KnobId, KnobSpec, Range};
use super::{GasChoice, Section};
use crate::units::Dimension;

/// Where the stream enters: its mean state and its acoustic end.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Feed {
    /// The gas.
    pub gas: GasChoice,
    /// How much of it flows.
    pub flow: FeedFlow,
    /// Static temperature at the first station [K].
    pub temperature: KnobId,
    /// Static pressure at the first station [Pa]; absent where a stated throat area sets it.
    pub pressure: Option<KnobId>,
    /// Its acoustic end.
    pub end: FeedEnd,
}

/// How the flow is stated.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum FeedFlow {
    /// Mass flow [kg/s].
    MassFlow(KnobId),
    /// Velocity at the first station [m/s].
    Velocity(KnobId),
    /// Mach number at the first station.
    Mach(KnobId),
    /// Not stated: it follows from pressure, temperature and the exit's stated throat area.
    FromThroat,
}

/// Acoustic end at the feed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum FeedEnd {
    /// `u' = 0`, no entropy enters.
    Closed,
    /// `p' = 0`, no entropy enters.
    Open,
    /// `p_t' = 0, h_t' = 0`.
    Reservoir,
    /// No sound and no entropy enters.
    Anechoic,
    /// `mdot' = 0, h_t' = 0`.
    Choked,
    /// `p+ = R p-`, no entropy enters.
    Reflection(Reflection),
}

/// Acoustic end at the exit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum ExitEnd {
    /// `u' = 0`.
    Closed,
    /// `p' = 0`.
    Open,
    /// No sound enters.
    Anechoic,
    /// A compact choked nozzle.
    Choked {
        /// Its throat; follows from the flow where not stated.
        throat: Option<Section>,
    },
    /// `p- = R p+`.
    Reflection(Reflection),
}

/// A constant reflection coefficient `R = coefficient exp(i phase)` for `Im s > 0`, its conjugate
/// below.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Reflection {
    /// Signed modulus.
    pub coefficient: KnobId,
    /// Phase [rad].
    pub phase: KnobId,
}

/// Where the stream leaves.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Exit {
    /// Its acoustic end.
    pub end: ExitEnd,
}

/// What a file may state of the feed in numbers, beside its gas.
pub const FEED_KNOBS: &[KnobSpec] = &[
    KnobSpec {
        key: "mass_flow",
        dimension: Dimension::MassFlow,
        range: Range::NotNegative,
        default: None,
        doc: "mass flow; zero is still gas",
    },
    KnobSpec {
        key: "velocity",
        dimension: Dimension::Velocity,
        range: Range::NotNegative,
        default: None,
        doc: "velocity at the first station, instead of the mass flow",
    },
    KnobSpec {
        key: "mach",
        dimension: Dimension::Number,
        range: Range::NotNegative,
        default: None,
        doc: "Mach number at the first station, instead of the mass flow",
    },
    KnobSpec {
        key: "temperature",
        dimension: Dimension::Temperature,
        range: Range::Positive,
        default: None,
        doc: "static temperature at the first station",
    },
    KnobSpec {
        key: "pressure",
        dimension: Dimension::Pressure,
        range: Range::Positive,
        default: None,
        doc: "static pressure at the first station",
    },
    COEFFICIENT,
    PHASE,
];

/// What a file may state of the exit in numbers.
pub const EXIT_KNOBS: &[KnobSpec] = &[
    KnobSpec {
        key: "throat_diameter",
        dimension: Dimension::Length,
        range: Range::Positive,
        default: None,
        doc: "throat diameter of a choked nozzle",
    },
    KnobSpec {
        key: "throat_area",
        dimension: Dimension::Area,
        range: Range::Positive,
        default: None,
        doc: "throat area of a choked nozzle, instead of the diameter",
    },
    COEFFICIENT,
    PHASE,
];

const COEFFICIENT: KnobSpec = KnobSpec {
    key: "coefficient",
    dimension: Dimension::Number,
    range: Range::Any,
    default: None,
    doc: "signed modulus of a constant reflection coefficient",
};

const PHASE: KnobSpec = KnobSpec {
    key: "phase",
    dimension: Dimension::Angle,
    range: Range::Any,
    default: Some(0.0),
    doc: "phase of a constant reflection coefficient, for positive frequency",
};
