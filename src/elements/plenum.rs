//! A plenum: a vessel whose gas is at rest and compressible.

use super::lowering::{self, Acting, Between, on_waves};
use super::port::Port;
use crate::knobs::{KnobId, KnobSpec, Range, Values};
use crate::numerics::dual::{Grad, Real};
use crate::units::Dimension;
use crate::waves::law::Law;
use crate::waves::primitive::{Joint, Term};

/// A vessel large enough for its gas to be at rest.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Plenum {
    /// Volume (m^3).
    pub volume: KnobId,
}

impl Plenum {
    /// `A_1 (rho u' + u p'/c^2)_1 - mdot_2' = V s p_1'/c^2` with the sound speed of the gas at rest,
    /// `p_1' = p_t2'`, and no entropy leaves.
    ///
    /// The row is the vessel's energy balance `(mdot h_t)_1' - (mdot h_t)_2' = V s p_1'/(gamma - 1)` over
    /// its enthalpy, to second order in the Mach numbers: entropy flowing in brings energy and lacks
    /// mass, so that `mdot_1'` counts without its share of entropy. A flame before the vessel acts on
    /// it through this, though it leaves the mass flow as it is.
    pub fn lower<T: Real>(&self, between: &Between<'_, T>, values: &Values<T>) -> Joint<T> {
        let zero = T::from(0.0);
        let mut inflow = Port::around(between.up, 0);
        inflow.mass_flow.d[2] = zero;
        let down = Port::around(between.down, 3);
        let c = between
            .up
            .gas
            .sound_speed(between.up.stagnation_temperature());
        let compliance = values[self.volume] / (c * c);
        let acting = Acting {
            row: [T::from(-1.0), zero, zero],
            terms: vec![Term {
                law: Law::Polynomial {
                    coefficients: [zero, compliance, zero],
                    delay: zero,
                },
                sense: on_waves(between.up, [T::from(1.0), zero, zero]),
                at: between.plane,
            }],
        };
        let mut no_entropy = Grad::constant(zero);
        no_entropy.d[5] = T::from(1.0);
        let balances = [
            inflow.mass_flow - down.mass_flow,
            no_entropy,
            balance(&inflow, &down),
        ];
        lowering::rows(between, balances, acting)
    }
}

/// The inflow loses its dynamic head, the outflow leaves isentropically from rest:
/// `p1 - p_t2 = 0` (Pa).
pub fn balance<N: Real>(up: &Port<N>, down: &Port<N>) -> N {
    up.pressure - down.stagnation_pressure
}

/// What a file may state of a plenum in numbers.
pub const KNOBS: &[KnobSpec] = &[KnobSpec {
    key: "volume",
    dimension: Dimension::Volume,
    range: Range::Positive,
    default: None,
    doc: "volume of the gas at rest",
}];

#[cfg(test)]
mod tests {
    use crate::input;
    use crate::modes::{self, Scan, Window};
    use num_complex::Complex64;

    /// A flame right before the vessel, or before nothing.
    fn found(velocity: f64, vessel: &str) -> Vec<Complex64> {
        let toml = format!(
            r#"
            title = "Flame before a vessel (invented)"
            search = {{ frequency = "20 to 700 Hz", growth = "-400 to 400 1/s" }}
            exit = {{ end = "open" }}
            [feed]
            gas = {{ gamma = 1.4, gas_constant = "287 J/(kg K)" }}
            velocity = "{velocity} m/s"
            temperature = "300 K"
            pressure = "1 bar"
            end = "closed"
            [[element]]
            name = "a"
            kind = "duct"
            length = "0.4 m"
            diameter = "80 mm"
            [[element]]
            name = "f"
            kind = "flame"
            burnt_temperature = "1500 K"
            response = {{ kind = "n-tau", interaction_index = 0.7, delay = "2 ms" }}
            {vessel}
            [[element]]
            name = "b"
            kind = "duct"
            length = "0.6 m"
            diameter = "80 mm"
            "#
        );
        let network = input::parse("t.toml", &toml, &[]).unwrap().network;
        let solved = modes::solve(&network).unwrap();
        let window = Window::of(&network, &solved.mean).unwrap();
        let list = modes::find(&solved, window, Scan::Whole);
        assert!(list.complete());
        list.modes.iter().map(|m| m.s).collect()
    }

    /// A vessel of no volume adds nothing but the loss of the jet's head, of first order in the Mach number (0.003
    /// and 0.013 here), so that the flame before it acts as if it were not there.
    #[test]
    fn a_vanishing_vessel_lets_a_flame_act_through_it() {
        let vessel = "[[element]]\nname = \"v\"\nkind = \"plenum\"\nvolume = \"1e-9 mm^3\"";
        for (velocity, tolerance) in [(0.0, 1e-9), (0.5, 4e-3), (2.0, 2e-2)] {
            let (with, without) = (found(velocity, vessel), found(velocity, ""));
            assert_eq!(with.len(), without.len());
            assert!(!with.is_empty());
            for (a, b) in with.iter().zip(&without) {
                let off = (a - b).norm() / b.norm();
                assert!(off < tolerance, "{velocity}: {a} {b} {off:e}");
            }
        }
    }
}
