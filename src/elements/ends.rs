//! The ends: the feed, where the mean flow is stated, and the exit.

use std::f64::consts::PI;

use super::lowering::on_waves;
use super::port::{Port, Variation};
use super::{GasChoice, Section};
use crate::gas::{State, choked_flux_temperature_slope};
use crate::knobs::{KnobId, KnobSpec, Range, Values};
use crate::numerics::dual::{Grad, Real};
use crate::units::Dimension;
use crate::waves::law::Law;
use crate::waves::primitive::{End, Row, Start};

/// Where the stream enters: its mean state and its acoustic end.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Feed {
    /// The gas.
    pub gas: GasChoice,
    /// How much of it flows.
    pub flow: FeedFlow,
    /// Static temperature at the first station (K).
    pub temperature: KnobId,
    /// Static pressure at the first station (Pa); absent where a stated throat area sets it.
    pub pressure: Option<KnobId>,
    /// Its acoustic end.
    pub end: FeedEnd,
}

/// How the flow is stated.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum FeedFlow {
    /// Mass flow (kg/s).
    MassFlow(KnobId),
    /// Velocity at the first station (m/s).
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
    /// Phase (rad).
    pub phase: KnobId,
}

/// Where the stream leaves.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Exit {
    /// Its acoustic end.
    pub end: ExitEnd,
}

impl Feed {
    /// The two conditions its end sets on the first plane.
    pub fn lower<T: Real>(&self, state: &State<T>, values: &Values<T>) -> Start<T> {
        let (zero, one) = (T::from(0.0), T::from(1.0));
        let no_entropy = [zero, zero, one];
        let port = Port::around(state, 0);
        let h_t = state.stagnation_enthalpy();
        // u h_t' = 0: the enthalpy flow less what mass flow carries; no entropy enters still gas.
        let stagnation = || {
            let row = port.enthalpy_flow - port.mass_flow * Grad::constant(h_t);
            scaled(on_waves(state, first_three(row)))
        };
        let mut term = None;
        let rows = match self.end {
            FeedEnd::Closed => [[one, -one, zero], no_entropy],
            FeedEnd::Open => [[one, one, zero], no_entropy],
            FeedEnd::Anechoic => [[one, zero, zero], no_entropy],
            FeedEnd::Reservoir => {
                let row = on_waves(state, first_three(port.stagnation_pressure));
                [scaled(row), stagnation()]
            }
            FeedEnd::Choked => [
                scaled(on_waves(state, first_three(port.mass_flow))),
                stagnation(),
            ],
            FeedEnd::Reflection(r) => {
                let end = r.condition(values, [one, zero, zero], [zero, one, zero]);
                term = end.term;
                [end.row, no_entropy]
            }
        };
        Start { rows, term }
    }
}

impl Exit {
    /// The condition its end sets on the last plane.
    ///
    /// The choked nozzle passes `mdot = A* G(p_t, T_t)`, hence
    /// `mdot'/mdot = p_t'/p_t + (d ln G/d ln T_t) T_t'/T_t`; for a perfect gas this is `M' = 0` (Marble &
    /// Candel 1977, J. Sound Vib. 55).
    pub fn lower<T: Real>(&self, state: &State<T>, values: &Values<T>) -> End<T> {
        let (zero, one) = (T::from(0.0), T::from(1.0));
        let row = match self.end {
            ExitEnd::Closed => [one, -one, zero],
            ExitEnd::Open => [one, one, zero],
            ExitEnd::Anechoic => [zero, one, zero],
            ExitEnd::Choked { .. } => {
                let port = Port::around(state, 0);
                let (h_t, t_t) = (state.stagnation_enthalpy(), state.stagnation_temperature());
                let slope = choked_flux_temperature_slope(&state.gas, t_t);
                let heat = port.enthalpy_flow - port.mass_flow * Grad::constant(h_t);
                // mdot T_t'/T_t
                let warming = heat / Grad::constant(state.gas.cp(t_t) * t_t);
                let mass = state.mass_flow();
                let row = port.mass_flow
                    - port.stagnation_pressure * Grad::constant(mass / state.stagnation_pressure())
                    - warming * Grad::constant(slope);
                scaled(on_waves(state, first_three(row)))
            }
            ExitEnd::Reflection(r) => {
                return r.condition(values, [zero, one, zero], [one, zero, zero]);
            }
        };
        End { row, term: None }
    }
}

fn first_three<T: Real>(row: Variation<T>) -> [T; 3] {
    [row.d[0], row.d[1], row.d[2]]
}

fn scaled<T: Real>(row: Row<T>) -> Row<T> {
    let largest = row
        .iter()
        .map(|x| x.value().abs())
        .fold(f64::MIN_POSITIVE, f64::max);
    row.map(|x| x / largest)
}

impl Reflection {
    /// `reflected - R incident = 0`: a row, and a law on what it multiplies where `R` is not real. It is
    /// real where its phase is zero or half a turn, or where nothing is reflected.
    fn condition<T: Real>(
        &self,
        values: &Values<T>,
        reflected: Row<T>,
        incident: Row<T>,
    ) -> End<T> {
        let (modulus, phase) = (values[self.coefficient], values[self.phase]);
        let by_real = |r: T| std::array::from_fn(|i| reflected[i] - incident[i] * r);
        let (row, term) = if phase.is_exactly_zero() || modulus.is_exactly_zero() {
            (by_real(modulus), None)
        } else if (phase - PI).is_exactly_zero() {
            (by_real(-modulus), None)
        } else {
            let law = Law::Complex {
                re: modulus * phase.cos(),
                im: modulus * phase.sin(),
                delay: T::from(0.0),
            };
            (reflected, Some((law, incident.map(|x| -x))))
        };
        End { row, term }
    }
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
        range: Range::Subsonic,
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
