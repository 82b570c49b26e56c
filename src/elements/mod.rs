//! The elements a network is made of: one file each, holding its theory, its knobs, its balance,
//! its lowering to wave primitives and its tests.

pub mod area_change;
pub mod duct;
pub mod ends;
pub mod flame;
pub mod lowering;
pub mod plenum;
pub mod port;
pub mod restriction;

use lowering::Between;
use port::Port;

use crate::gas::State;
use crate::knobs::{KnobId, KnobSpec, Range, Values};
use crate::numerics::dual::Real;
use crate::waves::primitive::{Plane, Step};

/// One element of a network.
#[derive(Clone, Debug, PartialEq)]
pub struct Element {
    /// Its name, unique in the network; `feed` and `exit` for the ends.
    pub name: String,
    /// What it is.
    pub kind: Kind,
}

/// The closed set of elements. Adding one makes the compiler name every place to extend.
#[derive(Clone, Debug, PartialEq)]
pub enum Kind {
    /// Where the stream enters.
    Feed(ends::Feed),
    /// Where the stream leaves.
    Exit(ends::Exit),
    /// A passage of constant area along which waves travel.
    Duct(duct::Duct),
    /// An area change to a smaller area without loss.
    Contraction(area_change::Contraction),
    /// A sudden change to a larger area.
    Expansion(area_change::Expansion),
    /// A burner, plate, orifice or screen: a pressure loss.
    Restriction(restriction::Restriction),
    /// A large vessel whose gas is at rest.
    Plenum(plenum::Plenum),
    /// A compact flame.
    Flame(flame::Flame),
}

impl Kind {
    /// The element's third steady balance, beside mass and enthalpy flow, as a residual (Pa) that is
    /// zero: `None` for an end, which balances nothing. The mean flow solves it; the acoustics
    /// differentiates it.
    ///
    /// `number` gives the value of a knob in the number type of the ports.
    pub fn third_balance<N: Real>(
        &self,
        up: &Port<N>,
        down: &Port<N>,
        number: impl Fn(KnobId) -> N,
    ) -> Option<N> {
        match self {
            Kind::Feed(_) | Kind::Exit(_) => None,
            Kind::Duct(_) => Some(up.pressure - down.pressure),
            Kind::Contraction(_) => Some(area_change::contraction(up, down)),
            Kind::Expansion(_) => Some(area_change::expansion(up, down)),
            Kind::Restriction(r) => Some(r.balance(up, down, number)),
            Kind::Plenum(_) => Some(plenum::balance(up, down)),
            Kind::Flame(_) => Some(flame::balance(up, down)),
        }
    }
}

/// Where the signals of a flame come from.
#[derive(Clone, Copy, Debug)]
pub struct Sensed<'a, T> {
    /// Mean state at the plane.
    pub state: &'a State<T>,
    /// The plane.
    pub plane: Plane,
}

impl Kind {
    /// The step from the plane before the element to the plane behind it; `None` for an end.
    ///
    /// `sensed` gives the reference of each response of a flame, in order.
    pub fn lower<'a, T: Real>(
        &self,
        between: &Between<'a, T>,
        values: &Values<T>,
        sensed: &[Sensed<'a, T>],
    ) -> Option<Step<T>> {
        let acting = match self {
            Kind::Feed(_) | Kind::Exit(_) => return None,
            Kind::Duct(duct) => return Some(Step::Travel(duct.lower(between.up, values))),
            // A vessel is no balance between two streams alone.
            Kind::Plenum(p) => return Some(Step::Joint(p.lower(between, values))),
            Kind::Contraction(c) => c.acting(between, values),
            Kind::Expansion(e) => e.acting(between, values),
            Kind::Restriction(r) => r.acting(between, values),
            Kind::Flame(f) => f.acting(between, values, sensed),
        };
        Some(Step::Joint(lowering::joint(self, between, values, acting)))
    }
}

/// How an area is stated.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Section {
    /// By the diameter of a round passage (m).
    Diameter(KnobId),
    /// By its area (m^2).
    Area(KnobId),
}

impl Section {
    /// The area (m^2).
    pub fn area<T: Real>(self, values: &Values<T>) -> T {
        match self {
            Section::Diameter(d) => values[d] * values[d] * (std::f64::consts::PI / 4.0),
            Section::Area(a) => values[a],
        }
    }
}

/// A gas as a network names it; its numbers are knobs.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum GasChoice {
    /// Dry air, thermally perfect.
    Air,
    /// A perfect gas by specific gas constant.
    PerfectByConstant {
        /// Ratio of specific heats.
        gamma: KnobId,
        /// Specific gas constant (J/(kg K)).
        gas_constant: KnobId,
    },
    /// A perfect gas by molar mass.
    PerfectByMolarMass {
        /// Ratio of specific heats.
        gamma: KnobId,
        /// Molar mass (kg/mol).
        molar_mass: KnobId,
    },
}

/// Knob table of a gas written as a table: `gas = { gamma = 1.4, gas_constant = "287 J/(kg K)" }`.
pub const GAS_KNOBS: &[KnobSpec] = &[
    KnobSpec {
        key: "gamma",
        dimension: crate::units::Dimension::Number,
        range: Range::Above(1.0),
        default: None,
        doc: "ratio of specific heats",
    },
    KnobSpec {
        key: "gas_constant",
        dimension: crate::units::Dimension::SpecificGasConstant,
        range: Range::Positive,
        default: None,
        doc: "specific gas constant",
    },
    KnobSpec {
        key: "molar_mass",
        dimension: crate::units::Dimension::MolarMass,
        range: Range::Positive,
        default: None,
        doc: "molar mass, instead of the gas constant",
    },
];
