//! From a balance and its mean state to wave primitives.
//!
//! The balance is differentiated along `(p', u', eta)` of both stations and written in the waves
//! `p' = p+ + p-`, `rho c u' = p+ - p-`, `rho c eta = e`. Rows are scaled to unit largest coefficient,
//! which no zero of the determinant feels.

use super::Kind;
use super::port::{Port, UNKNOWNS, Variation};
use crate::gas::State;
use crate::knobs::Values;
use crate::numerics::dual::{Grad, Real};
use crate::waves::law::Law;
use crate::waves::primitive::{Joint, Plane, Row, Term};

/// The mean state before and behind a compact element, with the planes there.
#[derive(Clone, Copy, Debug)]
pub struct Between<'a, T> {
    /// State at its inlet.
    pub up: &'a State<T>,
    /// State at its outlet.
    pub down: &'a State<T>,
    /// Plane of the inlet; the outlet is the next one.
    pub plane: Plane,
}

/// One of the two stations of a compact element.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Side {
    /// The one before it.
    Inlet,
    /// The one behind it.
    Outlet,
}

/// Coefficients along `(p', u', eta)` of one station as coefficients of its waves.
pub fn on_waves<T: Real>(state: &State<T>, along: [T; 3]) -> Row<T> {
    let impedance = state.density() * state.sound_speed();
    let (velocity, entropy) = (along[1] / impedance, along[2] / impedance);
    [along[0] + velocity, along[0] - velocity, entropy]
}

/// The row that reads `factor u'` off the waves of a station.
pub fn velocity_row<T: Real>(state: &State<T>, factor: T) -> Row<T> {
    let zero = T::from(0.0);
    on_waves(state, [zero, factor, zero])
}

/// What beside the steady balances acts in a compact element: it enters mass, enthalpy flow and third
/// balance by `row`, each term `F(s)` times what it senses.
pub struct Acting<T> {
    /// Weight in mass (kg/s), enthalpy flow (W) and third balance (Pa).
    pub row: Row<T>,
    /// The terms.
    pub terms: Vec<Term<T>>,
}

impl<T: Real> Acting<T> {
    /// Nothing.
    pub fn nothing() -> Self {
        Acting {
            row: [T::from(0.0); 3],
            terms: Vec::new(),
        }
    }

    /// The inertia of a slug of gas of effective length `length` that moves with `faster` times the
    /// velocity of a station: `h_t1' - h_t2' = L s u'` and, in the third balance, `rho_1 L s u'`.
    pub fn slug(between: &Between<'_, T>, length: T, side: Side, faster: T) -> Self {
        if length.is_exactly_zero() {
            return Self::nothing();
        }
        let (state, at) = match side {
            Side::Inlet => (between.up, between.plane),
            Side::Outlet => (between.down, between.plane + 1),
        };
        let sense = velocity_row(state, faster);
        let zero = T::from(0.0);
        let law = Law::Polynomial {
            coefficients: [zero, length, zero],
            delay: zero,
        };
        Acting {
            row: [zero, -between.up.mass_flow(), -between.up.density()],
            terms: vec![Term { law, sense, at }],
        }
    }
}

/// Mass, enthalpy flow and third balance of a compact element, differentiated.
pub fn joint<T: Real>(
    kind: &Kind,
    between: &Between<'_, T>,
    values: &Values<T>,
    acting: Acting<T>,
) -> Joint<T> {
    let up = Port::around(between.up, 0);
    let down = Port::around(between.down, 3);
    let third = kind
        .third_balance(&up, &down, |k| Grad::constant(values[k]))
        .unwrap_or(up.pressure - down.pressure);
    rows(
        between,
        [
            up.mass_flow - down.mass_flow,
            up.enthalpy_flow - down.enthalpy_flow,
            third,
        ],
        acting,
    )
}

/// Three differentiated balances as a joint.
pub fn rows<T: Real>(
    between: &Between<'_, T>,
    balances: [Variation<T>; 3],
    acting: Acting<T>,
) -> Joint<T> {
    let zero = T::from(0.0);
    let mut joint = Joint {
        up: [[zero; 3]; 3],
        down: [[zero; 3]; 3],
        row: acting.row,
        terms: acting.terms,
    };
    for (i, balance) in balances.iter().enumerate() {
        let d: [T; UNKNOWNS] = balance.d;
        let before = on_waves(between.up, [d[0], d[1], d[2]]);
        let behind = on_waves(between.down, [d[3], d[4], d[5]]);
        let largest = before
            .iter()
            .chain(&behind)
            .map(|x| x.value().abs())
            .fold(f64::MIN_POSITIVE, f64::max);
        joint.up[i] = before.map(|x| x / largest);
        joint.down[i] = behind.map(|x| x / largest);
        joint.row[i] = joint.row[i] / largest;
    }
    joint
}
