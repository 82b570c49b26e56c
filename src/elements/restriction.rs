//! A restriction: a pressure loss between equal areas, with the inertia of the gas in it.

use super::Section;
use super::lowering::{Acting, Between, Side};
use super::port::Port;
use crate::knobs::{KnobId, KnobSpec, Range, Values};
use crate::numerics::dual::Real;
use crate::units::Dimension;

/// A burner, plate, orifice or screen between equal areas.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Restriction {
    /// Loss of isentropic stagnation pressure over `rho_1 u^2/2`.
    pub loss_coefficient: KnobId,
    /// Effective length of the slug of gas in it (m).
    pub effective_length: KnobId,
    /// Area whose velocity `u = mdot/(rho_1 A)` the two numbers above refer to; the upstream
    /// station's where none is stated.
    pub section: Option<Section>,
}

impl Restriction {
    /// `p_t1 - p_t2 - zeta rho1 u^2/2 = 0` (Pa) with `u = mdot/(rho1 A) = u1 A1/A`.
    pub fn balance<N: Real>(
        &self,
        up: &Port<N>,
        down: &Port<N>,
        number: impl Fn(KnobId) -> N,
    ) -> N {
        let widening = self.widening(up.area, &number);
        let dynamic = up.momentum_flux * widening * widening * 0.5;
        up.stagnation_pressure - down.stagnation_pressure - number(self.loss_coefficient) * dynamic
    }

    /// The slug moves with the velocity `u1 A1/A` in the stated area.
    pub fn acting<T: Real>(&self, between: &Between<'_, T>, values: &Values<T>) -> Acting<T> {
        let widening = self.widening(between.up.area, |k| values[k]);
        let length = values[self.effective_length];
        Acting::slug(between, length, Side::Inlet, widening)
    }

    /// `A1/A`: the upstream area over the area the numbers refer to.
    pub fn widening<N: Real>(&self, upstream: N, number: impl Fn(KnobId) -> N) -> N {
        match self.section {
            None => N::from(1.0),
            Some(Section::Area(a)) => upstream / number(a),
            Some(Section::Diameter(d)) => {
                let d = number(d);
                upstream / (d * d * std::f64::consts::FRAC_PI_4)
            }
        }
    }
}

/// What a file may state of a restriction in numbers.
pub const KNOBS: &[KnobSpec] = &[
    KnobSpec {
        key: "loss_coefficient",
        dimension: Dimension::Number,
        range: Range::NotNegative,
        default: None,
        doc: "loss of stagnation pressure over the dynamic pressure of the stated area",
    },
    KnobSpec {
        key: "effective_length",
        dimension: Dimension::Length,
        range: Range::NotNegative,
        default: Some(0.0),
        doc: "length of a slug of the stated area that moves with the flow",
    },
    KnobSpec {
        key: "diameter",
        dimension: Dimension::Length,
        range: Range::Positive,
        default: None,
        doc: "diameter of the open passage; the neighbours' area where absent",
    },
    KnobSpec {
        key: "area",
        dimension: Dimension::Area,
        range: Range::Positive,
        default: None,
        doc: "area of the open passage, instead of the diameter",
    },
];
