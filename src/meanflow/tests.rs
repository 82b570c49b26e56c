//! Identities over random chains; exact derivatives.

mod published;
mod refusals;

use proptest::prelude::*;

use super::rig::{COLD, Flow, Rig, long_chain};
use super::*;
use crate::elements::port::Port;
use crate::gas::{Gas, choked_flux};
use crate::numerics::dual::{Dual, Grad};

fn open() -> ExitEnd {
    ExitEnd::Open
}

fn only_problem(network: &Network<f64>) -> Problem {
    let problems = solve(network).expect_err("a problem is expected").0;
    assert_eq!(problems.len(), 1, "{problems:?}");
    problems[0].clone()
}

/// Every balance of every element, as relative residuals.
fn check_balances(network: &Network<f64>, flow: &MeanFlow<f64>) -> Result<(), TestCaseError> {
    let layout = &network.layout;
    let mass_flow = flow.states[0].mass_flow();
    for (i, pair) in flow.states.windows(2).enumerate() {
        let element = &layout.elements[layout.links[i].to.0];
        let (up, down) = (Port::of(&pair[0]), Port::of(&pair[1]));
        let number = |k| network.values[k];
        let third = element.kind.third_balance(&up, &down, number).unwrap();
        prop_assert!(
            third.abs() <= 1e-12 * up.stagnation_pressure,
            "third balance {:e} in {}",
            third / up.stagnation_pressure,
            element.name
        );
        prop_assert!((down.mass_flow - mass_flow).abs() <= 1e-12 * mass_flow.abs());
        let rise = pair[1].stagnation_enthalpy() - pair[0].stagnation_enthalpy();
        let scale = pair[0].gas.cp(pair[0].temperature) * pair[0].temperature;
        match flow.heat_release[layout.links[i].to.0] {
            None => prop_assert!(rise.abs() <= 1e-12 * scale, "h_t by {:e}", rise / scale),
            Some(q) => prop_assert!((q - mass_flow * rise).abs() <= 1e-12 * q.abs()),
        }
        prop_assert!(pair[1].mach() < 1.0);
    }
    Ok(())
}

#[derive(Clone, Debug)]
enum Piece {
    Area(f64, bool),
    Loss(f64),
    Vessel(f64),
    Flame(f64, bool),
}

fn pieces() -> impl Strategy<Value = Vec<Piece>> {
    let piece = prop_oneof![
        4 => (0.004..0.012f64, any::<bool>()).prop_map(|(a, s)| Piece::Area(a, s)),
        1 => (0.0..3.0f64).prop_map(Piece::Loss),
        1 => (0.004..0.012f64).prop_map(Piece::Vessel),
        1 => (1.2..3.0f64, any::<bool>()).prop_map(|(r, g)| Piece::Flame(r, g)),
    ];
    prop::collection::vec(piece, 1..10)
}

fn build(gas: Gas<f64>, flow: Flow, pressure: Option<f64>, pieces: &[Piece]) -> Rig {
    let mut rig = Rig::new(gas, flow, 400.0, pressure, FeedEnd::Reservoir).duct("d", 0.008);
    let (mut area, mut burnt) = (0.008, 400.0);
    for (i, piece) in pieces.iter().enumerate() {
        let name = format!("e{i}");
        rig = match piece {
            Piece::Area(a, smooth) => {
                let narrows = *a < area;
                area = *a;
                if narrows && *smooth {
                    rig.contraction(&name)
                } else {
                    rig.expansion(&name)
                }
            }
            Piece::Loss(z) => rig.restriction(&name, *z, None),
            Piece::Vessel(a) => {
                area = *a;
                rig.plenum(&name)
            }
            Piece::Flame(ratio, other) => {
                burnt = (burnt * ratio).min(2500.0_f64.max(burnt + 50.0));
                let gas = other.then_some(Gas::Perfect {
                    gamma: 1.3,
                    gas_constant: 295.0,
                });
                rig.flame(&name, Some(burnt), gas)
            }
        };
        rig = rig.duct(&format!("d{i}"), area);
    }
    rig
}

fn gases() -> impl Strategy<Value = Gas<f64>> {
    prop_oneof![Just(Gas::Air), Just(COLD)]
}

/// Whether two flows with derivatives agree; compares along one knob by central differences.
fn check_derivatives(network: &Network<f64>, tolerance: f64) -> Result<(), TestCaseError> {
    let plain = solve(network).unwrap();
    for k in 0..network.layout.knobs.len() {
        let knob = KnobId(k);
        let x = network.values[knob];
        let dual = solve(&network.seeded(knob)).unwrap();
        let h = if x == 0.0 { 1e-5 } else { 2e-4 * x };
        let at = |d: f64| solve(&network.with(knob, x + d));
        let around = [at(-2.0 * h), at(-h), at(h), at(2.0 * h)];
        let around: Result<Vec<MeanFlow<f64>>, _> = around.into_iter().collect();
        let Ok([a, b, c, d]) = around.as_deref() else {
            // A flow at the end of what a chain can pass has neighbours without an answer.
            return Err(TestCaseError::reject("a neighbour has no answer"));
        };
        let compare = |exact: Dual, value: f64, f: [f64; 4], scale: f64, what: &str| {
            let slope = (8.0 * (f[2] - f[1]) - (f[3] - f[0])) / (12.0 * h);
            let unit = scale / x.abs().max(1.0);
            prop_assert!((exact.v - value).abs() <= 1e-12 * scale, "{what}: value");
            prop_assert!(
                (exact.d[0] - slope).abs() <= tolerance * (slope.abs() + unit),
                "{what} by {}: {} exact, {slope} by difference",
                network.layout.knobs[k].name,
                exact.d[0]
            );
            Ok(())
        };
        for i in 0..plain.states.len() {
            let of = |get: fn(&State<f64>) -> f64| {
                [
                    get(&a.states[i]),
                    get(&b.states[i]),
                    get(&c.states[i]),
                    get(&d.states[i]),
                ]
            };
            let (s, e) = (plain.states[i], dual.states[i]);
            let u = s.velocity.abs().max(1.0);
            compare(e.pressure, s.pressure, of(|s| s.pressure), s.pressure, "p")?;
            compare(
                e.temperature,
                s.temperature,
                of(|s| s.temperature),
                s.temperature,
                "T",
            )?;
            compare(e.velocity, s.velocity, of(|s| s.velocity), u, "u")?;
        }
        if let (Some(e), Some(v)) = (dual.throat_area, plain.throat_area) {
            let f = [a.throat_area, b.throat_area, c.throat_area, d.throat_area];
            compare(e, v, f.map(Option::unwrap), v, "throat")?;
        }
    }
    Ok(())
}

proptest! {
    #[test]
    fn balances_hold_over_random_chains(
        gas in gases(), mach in 0.0..0.25f64, pieces in pieces(), p in 5e4..3e6f64,
    ) {
        let network = build(gas, Flow::Mach(mach), Some(p), &pieces).exit(open());
        match solve(&network) {
            Ok(flow) => check_balances(&network, &flow)?,
            Err(problems) => {
                let told = problems.to_string();
                // Brought to rest, a fast stream may be hotter than the next flame is stated.
                let refused = ["flow beyond Mach 1", "colder than its inlet"];
                prop_assert!(refused.iter().any(|r| told.contains(r)), "{told}");
                prop_assert!(mach > 0.02, "{told}");
            }
        }
    }

    #[test]
    fn still_gas_keeps_pressure_and_between_flames_temperature(
        gas in gases(), pieces in pieces(), p in 5e4..3e6f64,
    ) {
        let network = build(gas, Flow::Mass(0.0), Some(p), &pieces).exit(open());
        let flow = solve(&network).unwrap();
        for s in &flow.states {
            prop_assert_eq!(s.velocity, 0.0);
            prop_assert!((s.pressure / p - 1.0).abs() < 1e-14);
        }
        for q in flow.heat_release.iter().flatten() {
            prop_assert_eq!(*q, 0.0);
        }
        check_balances(&network, &flow)?;
    }

    #[test]
    fn a_stated_throat_gives_back_the_flow_that_implied_it(
        gas in gases(), mach in 0.005..0.2f64, pieces in pieces(), p in 5e4..3e6f64,
    ) {
        let choked = ExitEnd::Choked { throat: None };
        let network = build(gas, Flow::Mach(mach), Some(p), &pieces).exit(choked);
        let flow = solve(&network);
        prop_assume!(flow.is_ok());
        let flow = flow.unwrap();
        let throat = flow.throat_area.unwrap();
        let last = flow.states.last().unwrap();
        prop_assert!(throat < last.area);
        // Where the passage is itself all but choked, the throat says little about the flow.
        prop_assume!(flow.states.iter().all(|s| s.mach() < 0.9));
        let mass_flow = last.mass_flow();
        let by_pressure = build(gas, Flow::FromThroat, Some(p), &pieces).throat(throat);
        let by_flow = build(gas, Flow::Mass(mass_flow), None, &pieces).throat(throat);
        for network in [by_pressure, by_flow] {
            let again = solve(&network).unwrap();
            check_balances(&network, &again)?;
            prop_assert_eq!(again.throat_area, Some(throat));
            for (a, b) in again.states.iter().zip(&flow.states) {
                prop_assert!((a.pressure / b.pressure - 1.0).abs() < 1e-10);
                prop_assert!((a.velocity / b.velocity - 1.0).abs() < 1e-10);
                prop_assert!((a.temperature / b.temperature - 1.0).abs() < 1e-10);
            }
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(48))]

    #[test]
    fn derivatives_agree_with_differences(
        gas in gases(), mach in 0.01..0.12f64, pieces in pieces(), p in 5e4..3e6f64,
    ) {
        let choked = ExitEnd::Choked { throat: None };
        let network = build(gas, Flow::Mach(mach), Some(p), &pieces).exit(choked);
        let flow = solve(&network);
        prop_assume!(flow.is_ok());
        let flow = flow.unwrap();
        prop_assume!(flow.states.iter().all(|s| s.mach() < 0.6));
        // The polynomials' second derivative jumps at 1000 K, and differences with it.
        let joint = |t: f64| (t - 1000.0).abs() < 15.0;
        prop_assume!(flow.states.iter().all(|s| {
            !joint(s.temperature) && !joint(s.stagnation_temperature())
        }));
        check_derivatives(&network, 1e-6)?;
        let mass_flow = flow.states[0].mass_flow();
        let throat = flow.throat_area.unwrap();
        check_derivatives(&build(gas, Flow::FromThroat, Some(p), &pieces).throat(throat), 1e-6)?;
        check_derivatives(&build(gas, Flow::Mass(mass_flow), None, &pieces).throat(throat), 1e-6)?;
    }
}

#[test]
fn derivatives_at_rest() {
    for gas in [Gas::Air, COLD] {
        let rig = Rig::new(gas, Flow::Mass(0.0), 300.0, Some(1e5), FeedEnd::Closed)
            .duct("a", 0.01)
            .contraction("n")
            .duct("b", 0.002)
            .expansion("x")
            .flame("f", Some(1500.0), None)
            .duct("c", 0.006);
        let network = rig.exit(open());
        let knob = network.layout.knob("feed.mass_flow").unwrap();
        let flow = solve(&network.seeded(knob)).unwrap();
        for s in &flow.states {
            let v = s.value();
            // u = mdot/(rho A): linear at rest; pressure and temperature have no first order.
            assert!((s.velocity.d[0] * v.density() * v.area - 1.0).abs() < 1e-12);
            assert!(s.pressure.d[0].abs() < 1e-9 && s.temperature.d[0].abs() < 1e-9);
        }
    }
}

#[test]
fn every_derivative_of_a_chain_of_every_kind() {
    for gas in [Gas::Air, COLD] {
        let network = long_chain(gas).exit(ExitEnd::Choked { throat: None });
        check_balances(&network, &solve(&network).unwrap()).unwrap();
        check_derivatives(&network, 1e-7).unwrap();
    }
}

/// Derivatives of derivatives, as an acoustic Jacobian over a knob needs them.
#[test]
fn nested_derivatives() {
    type Twice = Grad<Dual, 1>;
    for gas in [Gas::Air, COLD] {
        let network = long_chain(gas).exit(ExitEnd::Choked { throat: None });
        let knob = network.layout.knob("feed.mass_flow").unwrap();
        let twice = |values: Vec<Twice>| {
            let layout = std::sync::Arc::clone(&network.layout);
            solve(&Network {
                layout,
                values: crate::knobs::Values(values),
            })
            .unwrap()
        };
        let mut values: Vec<Twice> = network.values.0.iter().map(|&x| Twice::from(x)).collect();
        let x = network.values[knob];
        values[knob.0] = Grad::variable(Dual::variable(x, 0), 0);
        let flow = twice(values);
        let h = 1e-4 * x;
        let slope = |x: f64| solve(&network.with(knob, x).seeded(knob)).unwrap();
        let (below, above) = (slope(x - h), slope(x + h));
        for (i, s) in flow.states.iter().enumerate() {
            let second =
                (above.states[i].pressure.d[0] - below.states[i].pressure.d[0]) / (2.0 * h);
            let exact = s.pressure.d[0].d[0];
            assert!(
                (exact - second).abs() <= 1e-5 * (1.0 + second.abs()),
                "{exact} {second}"
            );
        }
    }
}

#[test]
fn molar_mass_and_constant_name_the_same_gas() {
    let values = crate::knobs::Values(vec![1.4, 28.96e-3]);
    let choice = crate::elements::GasChoice::PerfectByMolarMass {
        gamma: KnobId(0),
        molar_mass: KnobId(1),
    };
    let r = gas(choice, &values).gas_constant();
    assert!((r - 8.314_462_618_153_24 / 28.96e-3).abs() < 1e-12);
}
