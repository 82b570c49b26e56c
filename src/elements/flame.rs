//! A compact flame between equal areas.

use super::lowering::{Acting, Between, velocity_row};
use super::port::Port;
use super::{GasChoice, Sensed};
use crate::flame::ResponseLaw;
use crate::knobs::{KnobId, KnobSpec, Range, Values};
use crate::numerics::dual::Real;
use crate::units::Dimension;
use crate::waves::law::Law;
use crate::waves::primitive::Term;

/// A flame thin against every wavelength in the window.
#[derive(Clone, Debug, PartialEq)]
pub struct Flame {
    /// Static temperature behind it (K); the inlet's where none is stated (velocity basis only).
    pub burnt_temperature: Option<KnobId>,
    /// The gas behind it; the same as before it where none is stated.
    pub burnt_gas: Option<GasChoice>,
    /// What its response multiplies.
    pub basis: Basis,
    /// Contributions to its response, summed.
    pub responses: Vec<Response>,
}

impl Flame {
    /// The heat release `Q' = K sum F(s) u'_ref` enters the enthalpy flow, with
    ///
    /// ```text
    /// heat release basis   K = rho_ref A_ref (h_t2 - h_t1)
    /// velocity basis       K = gamma_1 p_1/(gamma_1 - 1)  rho_ref A_ref/rho_1
    /// ```
    ///
    /// which is `Q u'_ref/u_ref` with `Q = mdot (h_t2 - h_t1)`, and its limit in still gas.
    pub fn acting<'a, T: Real>(
        &self,
        between: &Between<'a, T>,
        values: &Values<T>,
        sensed: &[Sensed<'a, T>],
    ) -> Acting<T> {
        let zero = T::from(0.0);
        let up = between.up;
        let strength = match self.basis {
            Basis::HeatRelease => between.down.stagnation_enthalpy() - up.stagnation_enthalpy(),
            Basis::Velocity => {
                let gamma = up.gas.gamma(up.temperature);
                gamma * up.pressure / ((gamma - 1.0) * up.density())
            }
        };
        let mut terms: Vec<Term<T>> = Vec::new();
        for (response, at) in self.responses.iter().zip(sensed) {
            let part = response.law.delays(values);
            // Contributions that follow one station make one law.
            if let Some(Term {
                law: Law::Delays(parts),
                ..
            }) = terms.iter_mut().find(|t| t.at == at.plane)
            {
                parts.push(part);
                continue;
            }
            let factor = strength * at.state.density() * at.state.area;
            terms.push(Term {
                law: Law::Delays(vec![part]),
                sense: velocity_row(at.state, factor),
                at: at.plane,
            });
        }
        Acting {
            row: [zero, T::from(1.0), zero],
            terms,
        }
    }
}

/// Momentum through a passage of constant area: `p1 + rho1 u1^2 - p2 - rho2 u2^2 = 0` (Pa).
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

/// What a file may state of a flame in numbers, beside its response.
pub const KNOBS: &[KnobSpec] = &[KnobSpec {
    key: "burnt_temperature",
    dimension: Dimension::Temperature,
    range: Range::Positive,
    default: None,
    doc: "static temperature behind the flame",
}];
