use proptest::prelude::*;

use super::*;
use crate::numerics::dual::{Dual, Grad};

fn perfect() -> Gas<f64> {
    Gas::Perfect {
        gamma: 1.4,
        gas_constant: 287.0,
    }
}

/// Derivative of `f` at `x` by a fourth-order central difference.
fn slope(f: impl Fn(f64) -> f64, x: f64) -> f64 {
    let h = 1e-3 * x;
    (8.0 * (f(x + h) - f(x - h)) - (f(x + 2.0 * h) - f(x - 2.0 * h))) / (12.0 * h)
}

fn close(a: f64, b: f64, tolerance: f64) -> bool {
    (a - b).abs() <= tolerance * a.abs().max(b.abs()).max(1e-3)
}

fn gases() -> impl Strategy<Value = Gas<f64>> {
    prop_oneof![
        Just(Gas::Air),
        (1.1..1.67f64, 180.0..4000.0f64).prop_map(|(gamma, gas_constant)| Gas::Perfect {
            gamma,
            gas_constant
        })
    ]
}

/// Temperatures whose neighbourhood does not straddle the joint at 1000 K.
fn temperatures() -> impl Strategy<Value = f64> {
    prop_oneof![220.0..990.0f64, 1010.0..5000.0f64]
}

proptest! {
    #[test]
    fn cp_is_the_slope_of_enthalpy_and_of_entropy(gas in gases(), t in temperatures()) {
        prop_assert!(close(slope(|t| gas.enthalpy(t), t), gas.cp(t), 1e-8));
        prop_assert!(close(slope(|t| gas.entropy_function(t), t) * t, gas.cp(t), 1e-8));
        let h = gas.lift::<Dual>().enthalpy(Dual::variable(t, 0));
        prop_assert!(close(h.d[0], gas.cp(t), 1e-13));
        prop_assert!(close(gas.cp(t) / (gas.cp(t) - gas.gas_constant()), gas.gamma(t), 1e-13));
    }

    #[test]
    fn temperature_at_enthalpy_inverts(gas in gases(), t in 60.0..9000.0f64) {
        let back = gas.temperature_at_enthalpy(gas.enthalpy(t));
        prop_assert!(close(back, t, 1e-13), "{t} K came back as {back} K");
        // First and second derivatives: T'(h) = 1/cp, T''(h) = -cp'/cp^3.
        let h = Grad::<Dual, 1>::variable(Dual::variable(gas.enthalpy(t), 0), 0);
        let x = gas.lift::<Grad<Dual, 1>>().temperature_at_enthalpy(h);
        let cp = gas.lift::<Dual>().cp(Dual::variable(t, 0));
        prop_assert!(close(x.d[0].v, 1.0 / cp.v, 1e-12));
        let second = -cp.d[0] / cp.v.powi(3);
        prop_assert!((x.d[0].d[0] - second).abs() <= 1e-10 * second.abs() + 1e-22);
    }

    #[test]
    fn stagnation_is_an_isentropic_stop(
        gas in gases(), p in 1e4..5e6f64, t in 220.0..3000.0f64, mach in 0.0..0.95f64,
    ) {
        let velocity = mach * gas.sound_speed(t);
        let s = State { gas, pressure: p, temperature: t, velocity, area: 0.01 };
        let t_t = s.stagnation_temperature();
        prop_assert!(close(gas.enthalpy(t_t), s.stagnation_enthalpy(), 1e-12));
        let entropy = gas.entropy_function(t_t) - gas.entropy_function(t);
        let pressure = gas.gas_constant() * (s.stagnation_pressure() / p).ln();
        prop_assert!((entropy - pressure).abs() <= 1e-11 * gas.cp(t));
        prop_assert!(close(s.mach(), mach, 1e-14) || mach < 1e-3);
        prop_assert!(close(s.mass_flow(), s.density() * velocity * 0.01, 1e-14));
    }

    #[test]
    fn stagnation_pressure_derivatives(
        gas in gases(), p in 1e4..5e6f64, t in temperatures(), mach in 0.05..0.8f64,
    ) {
        let u = mach * gas.sound_speed(t);
        let at = |p: f64, t: f64, u: f64| {
            State { gas, pressure: p, temperature: t, velocity: u, area: 1.0 }
                .stagnation_pressure()
        };
        let g = State {
            gas: gas.lift::<Grad<f64, 3>>(),
            pressure: Grad::variable(p, 0),
            temperature: Grad::variable(t, 1),
            velocity: Grad::variable(u, 2),
            area: Grad::constant(1.0),
        }
        .stagnation_pressure();
        prop_assert!(close(g.v, at(p, t, u), 1e-13));
        prop_assert!(close(g.d[0] * p, slope(|p| at(p, t, u), p) * p, 1e-8));
        let crosses = t < 1000.0 && t + u * u / 2000.0 > 980.0;
        prop_assert!(crosses || close(g.d[1] * t, slope(|t| at(p, t, u), t) * t, 1e-7));
        prop_assert!(crosses || close(g.d[2] * u, slope(|u| at(p, t, u), u) * u, 1e-7));
    }

    #[test]
    fn choked_flux_is_the_greatest_on_its_isentrope(
        gas in gases(), p_t in 1e5..5e6f64, t_t in 260.0..3500.0f64, f in 0.7..0.999f64,
    ) {
        let g = choked_flux(&gas, p_t, t_t);
        let flux = |t: f64| {
            let u = (2.0 * (gas.enthalpy(t_t) - gas.enthalpy(t))).sqrt();
            p_t * gas.isentropic_pressure_ratio(t, t_t) / (gas.gas_constant() * t) * u
        };
        let throat = choked_temperature(&gas, t_t);
        prop_assert!(close(flux(throat), g, 1e-12));
        prop_assert!(flux(f * t_t) <= g * (1.0 + 1e-13));
        let s = State {
            gas,
            pressure: 1.0,
            temperature: throat,
            velocity: gas.sound_speed(throat),
            area: 1.0,
        };
        prop_assert!(close(s.stagnation_temperature(), t_t, 1e-12));
    }

    #[test]
    fn choked_flux_slopes(gas in gases(), p_t in 1e5..5e6f64, t_t in 260.0..3500.0f64) {
        let throat = choked_temperature(&gas, t_t);
        prop_assume!((throat - 1000.0).abs() > 10.0 && (t_t - 1000.0).abs() > 10.0);
        let lifted = gas.lift::<Grad<f64, 2>>();
        let g = choked_flux(&lifted, Grad::variable(p_t, 0), Grad::variable(t_t, 1));
        prop_assert!(close(g.d[0] * p_t, g.v, 1e-12));
        let by_t = g.d[1] * t_t / g.v;
        prop_assert!(close(by_t, choked_flux_temperature_slope(&gas, t_t), 1e-10));
        prop_assert!(close(by_t, slope(|t| choked_flux(&gas, p_t, t), t_t) * t_t / g.v, 1e-7));
    }

    #[test]
    fn derivative_of_the_choked_slope(t_t in prop_oneof![260.0..980.0f64, 1250.0..3500.0f64]) {
        let d = choked_flux_temperature_slope(&Gas::Air, Dual::variable(t_t, 0));
        let by_difference = slope(|t| choked_flux_temperature_slope(&Gas::Air, t), t_t);
        prop_assert!((d.d[0] - by_difference).abs() * t_t < 1e-7);
    }
}

#[test]
fn still_gas_is_at_its_stagnation_state() {
    for gas in [perfect(), Gas::Air] {
        for t in [250.0, 300.0, 1000.0, 1800.0] {
            let s = State {
                gas,
                pressure: 101_325.0,
                temperature: t,
                velocity: 0.0,
                area: 0.01,
            };
            assert!((s.stagnation_temperature() / t - 1.0).abs() < 1e-15);
            assert!((s.stagnation_pressure() / 101_325.0 - 1.0).abs() < 1e-14);
        }
    }
}

#[test]
fn enthalpy_vanishes_at_the_reference() {
    for gas in [perfect(), Gas::Air] {
        assert!(gas.enthalpy(REFERENCE_TEMPERATURE).abs() < 1e-9);
    }
}

#[test]
fn range_is_told() {
    assert!(perfect().beyond_range(9000.0).is_none());
    assert!(Gas::<f64>::Air.beyond_range(300.0).is_none());
    assert!(
        Gas::<f64>::Air
            .beyond_range(150.0)
            .is_some_and(|m| m.contains("150.0 K"))
    );
    assert!(Gas::<f64>::Air.beyond_range(6100.0).is_some());
}

/// Species checks of TM-4513 coefficients, computed by an independent library.
#[test]
fn species_polynomials() {
    use super::nasa::{ARGON, CARBON_DIOXIDE, NITROGEN, OXYGEN, Piece, Species};
    let data = include_str!("../../tests/data/nasa_tm4513_species.csv");
    let mut rows = 0;
    for line in data.lines().filter(|l| !l.starts_with('#')).skip(1) {
        let cells: Vec<&str> = line.split(',').collect();
        let species: Species = match cells[0] {
            "N2" => NITROGEN,
            "O2" => OXYGEN,
            "Ar" => ARGON,
            "CO2" => CARBON_DIOXIDE,
            other => panic!("unknown species {other}"),
        };
        let number = |i: usize| cells[i].parse::<f64>().unwrap();
        let t = number(1);
        let piece = Piece::new(if t <= 1000.0 {
            species.low
        } else {
            species.high
        });
        let r = MOLAR_GAS_CONSTANT;
        assert!(close(piece.cp(t) * r, number(2), 1e-10), "cp of {line}");
        // Enthalpies near 298.15 K are differences of large numbers: relative to cp T there.
        assert!((piece.enthalpy(t) * r - number(3)).abs() < 1e-10 * r * 2.5 * t.max(1e3));
        assert!(close(piece.entropy(t) * r, number(4), 1e-10), "s of {line}");
        rows += 1;
    }
    assert_eq!(rows, 24);
}
