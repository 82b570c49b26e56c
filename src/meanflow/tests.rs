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
        let Ok([a, b, c, d]): Result<[MeanFlow<f64>; 4], _> = around
            .into_iter()
            .collect::<Result<Vec<_>, _>>()
            .unwrap()
            .try_into()
        else {
            unreachable!()
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
                prop_assert!(told.contains("flow beyond Mach 1"), "{told}");
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
                values: crate::elements::knob::Values(values),
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
    let values = crate::elements::knob::Values(vec![1.4, 28.96e-3]);
    let choice = crate::elements::GasChoice::PerfectByMolarMass {
        gamma: KnobId(0),
        molar_mass: KnobId(1),
    };
    let r = gas(choice, &values).gas_constant();
    assert!((r - 8.314_462_618_153_24 / 28.96e-3).abs() < 1e-12);
}

/// Heating in a constant area from Mach 0.05, 300 K to 1200 K, gamma 1.4, R 287 J/(kg K): mean flow
/// of a published-formula case solved with mpmath in 40 digits (Rayleigh flow: momentum and mass kept).
#[test]
fn heating_in_a_constant_area() {
    let network = Rig::new(
        COLD,
        Flow::Mach(0.05),
        300.0,
        Some(101_325.0),
        FeedEnd::Choked,
    )
    .duct("before", 0.01)
    .flame("flame", Some(1200.0), None)
    .duct("behind", 0.01)
    .exit(open());
    let flow = solve(&network).unwrap();
    let (a, b) = (flow.states[1], flow.states[2]);
    let close = |x: f64, y: f64| assert!((x / y - 1.0).abs() < 1e-13, "{x} {y}");
    close(a.velocity, 17.359435474692);
    close(b.velocity, 70.185265172049);
    close(b.pressure / a.pressure, 0.98934928476158);
    close(b.mach(), 0.10107653741732);
    close(a.sound_speed(), 347.18870949384);
    close(b.sound_speed(), 694.37741898769);
    close(
        flow.heat_release[2].unwrap() / a.mass_flow(),
        906362.31072364,
    );
    assert_eq!(flow.heat_release.iter().flatten().count(), 1);
}

/// Rayleigh-flow functions of a perfect gas (closed form; tabulated in NACA Report 1135, 1953):
/// `T/T* = ((1 + g) M/(1 + g M^2))^2`, `p/p* = (1 + g)/(1 + g M^2)`, over the whole subsonic branch
/// to the hottest static temperature, at `M = 1/sqrt(g)`.
#[test]
fn rayleigh_flow_up_to_the_hottest_temperature() {
    let g = 1.4f64;
    let t_star = |m: f64| ((1.0 + g) * m / (1.0 + g * m * m)).powi(2);
    let p_star = |m: f64| (1.0 + g) / (1.0 + g * m * m);
    let m1 = 0.2;
    for m2 in [0.2, 0.3, 0.5, 0.7, 0.8, 0.83, 0.844] {
        let t2 = 300.0 * t_star(m2) / t_star(m1);
        let network = Rig::new(COLD, Flow::Mach(m1), 300.0, Some(2e5), FeedEnd::Reservoir)
            .duct("a", 0.01)
            .flame("f", Some(t2), None)
            .duct("b", 0.01)
            .exit(open());
        let flow = solve(&network).unwrap();
        assert!((flow.states[2].mach() - m2).abs() < 1e-10, "{m2}");
        assert!((flow.states[2].pressure / 2e5 - p_star(m2) / p_star(m1)).abs() < 1e-10);
    }
    let hottest = 300.0 * t_star(1.0 / g.sqrt()) / t_star(m1);
    let network = Rig::new(COLD, Flow::Mach(m1), 300.0, Some(2e5), FeedEnd::Reservoir)
        .duct("a", 0.01)
        .flame("f", Some(hottest * 1.0001), None)
        .duct("b", 0.01)
        .exit(open());
    let problem = only_problem(&network);
    assert_eq!(problem.subject, "f");
    assert!(
        problem.what.contains("flow beyond Mach 1 in `f`"),
        "{problem}"
    );
    assert!(
        problem.what.contains(&format!("{hottest:.1} K")),
        "{problem}"
    );
}

/// Isentropic area change from Mach 0.3 to 0.5, gamma 1.4: A/A* 2.0351 and 1.3398, p/p_t 0.9395 and
/// 0.8430 (NACA Report 1135, 1953; from memory).
#[test]
fn contraction_follows_the_isentropic_tables() {
    let network = Rig::new(
        COLD,
        Flow::Mach(0.3),
        300.0,
        Some(0.9395e5),
        FeedEnd::Reservoir,
    )
    .duct("a", 2.0351e-3)
    .contraction("n")
    .duct("b", 1.3398e-3)
    .exit(ExitEnd::Choked { throat: None });
    let flow = solve(&network).unwrap();
    let b = flow.states[2];
    assert!((b.mach() - 0.5).abs() < 1e-4);
    assert!((b.pressure - 0.8430e5).abs() < 10.0);
    assert!((flow.throat_area.unwrap() - 1e-3).abs() < 1e-7);
}

/// Sudden expansion in nearly incompressible flow: the loss is `(1 - A1/A2)^2 rho u1^2/2`
/// (Borda-Carnot; handbook value).
#[test]
fn slow_expansion_loses_the_borda_carnot_head() {
    let network = Rig::new(COLD, Flow::Mach(0.01), 300.0, Some(1e5), FeedEnd::Reservoir)
        .duct("a", 0.002)
        .expansion("x")
        .duct("b", 0.008)
        .exit(open());
    let flow = solve(&network).unwrap();
    let (a, b) = (flow.states[1], flow.states[2]);
    let head = 0.5 * a.density() * a.velocity * a.velocity;
    let loss = (a.stagnation_pressure() - b.stagnation_pressure()) / head;
    assert!((loss - 0.5625).abs() < 2e-4, "{loss}");
}

#[test]
fn a_plenum_loses_the_jet_and_leaves_from_rest() {
    let network = Rig::new(
        Gas::Air,
        Flow::Mach(0.2),
        500.0,
        Some(1e6),
        FeedEnd::Reservoir,
    )
    .duct("a", 0.002)
    .plenum("p")
    .duct("b", 0.004)
    .exit(open());
    let flow = solve(&network).unwrap();
    let (a, b) = (flow.states[1], flow.states[2]);
    assert!((b.stagnation_pressure() / a.pressure - 1.0).abs() < 1e-13);
    assert!((b.stagnation_temperature() / a.stagnation_temperature() - 1.0).abs() < 1e-13);
}

#[test]
fn beyond_mach_one_is_told_with_element_and_number() {
    let too_narrow = |gas| {
        Rig::new(gas, Flow::Mach(0.3), 300.0, Some(1e5), FeedEnd::Reservoir)
            .duct("a", 0.01)
            .contraction("neck")
            .duct("b", 0.004)
            .exit(open())
    };
    for gas in [Gas::Air, COLD] {
        let network = too_narrow(gas);
        let problem = only_problem(&network);
        assert_eq!(problem.subject, "neck");
        assert!(
            problem.what.contains("flow beyond Mach 1 in `neck`"),
            "{problem}"
        );
        let s = State {
            gas,
            pressure: 1e5,
            temperature: 300.0,
            velocity: 0.3 * gas.sound_speed(300.0),
            area: 0.01,
        };
        let most = 0.004 * choked_flux(&gas, s.stagnation_pressure(), s.stagnation_temperature());
        assert!(
            problem.what.contains(&format!("most {most:.4} kg/s")),
            "{problem}"
        );
        // Just wide enough: it flows, close to Mach 1.
        let area = network.layout.knob("b.area").unwrap();
        let enough = 0.004 * s.mass_flow() / most * (1.0 + 1e-6);
        let flow = solve(&network.with(area, enough)).unwrap();
        assert!((0.99..1.0).contains(&flow.states[2].mach()));
        assert!(solve(&network.with(area, enough * (1.0 - 3e-6))).is_err());
    }

    let lossy = Rig::new(COLD, Flow::Mach(0.5), 300.0, Some(1e5), FeedEnd::Reservoir)
        .duct("a", 0.01)
        .restriction("plate", 2.5, None)
        .duct("b", 0.01)
        .exit(open());
    assert!(
        only_problem(&lossy)
            .what
            .contains("flow beyond Mach 1 in `plate`")
    );

    let holed = Rig::new(COLD, Flow::Mach(0.3), 300.0, Some(1e5), FeedEnd::Reservoir)
        .duct("a", 0.01)
        .restriction("holes", 0.01, Some(0.06))
        .duct("b", 0.01)
        .exit(open());
    assert!(
        only_problem(&holed)
            .what
            .contains("its open area passes at most")
    );

    for (flow, subject) in [
        (Flow::Mach(1.2), "feed.mach"),
        (Flow::Velocity(400.0), "feed.velocity"),
        (Flow::Mass(20.0), "feed.mass_flow"),
    ] {
        let network = Rig::new(COLD, flow, 300.0, Some(1e5), FeedEnd::Reservoir)
            .duct("a", 0.01)
            .exit(open());
        let problem = only_problem(&network);
        assert_eq!(problem.subject, subject);
        assert!(
            problem.what.contains("flow beyond Mach 1 in `feed`: Mach "),
            "{problem}"
        );
    }
}

#[test]
fn a_throat_that_cannot_choke_is_told() {
    let narrow = Rig::new(COLD, Flow::FromThroat, 300.0, Some(1e5), FeedEnd::Reservoir)
        .duct("a", 0.01)
        .contraction("neck")
        .duct("b", 0.002)
        .expansion("dump")
        .duct("c", 0.01)
        .throat(0.005);
    let problem = only_problem(&narrow);
    assert_eq!(problem.subject, "neck");
    assert!(
        problem.what.contains("flow beyond Mach 1 in `neck`"),
        "{problem}"
    );

    let wide = Rig::new(COLD, Flow::FromThroat, 300.0, Some(1e5), FeedEnd::Reservoir)
        .duct("a", 0.01)
        .throat(0.012);
    assert_eq!(only_problem(&wide).subject, "exit");

    let hot = Rig::new(Gas::Air, Flow::Mass(0.5), 300.0, None, FeedEnd::Reservoir)
        .duct("a", 0.01)
        .flame("f", Some(2200.0), None)
        .duct("b", 0.01)
        .throat(0.00995);
    let problem = only_problem(&hot);
    assert_eq!(problem.subject, "f");
    assert!(problem.what.contains("thermal choking"), "{problem}");
}

#[test]
fn flow_stated_too_little_or_too_much_is_told() {
    let rig =
        |flow, pressure| Rig::new(COLD, flow, 300.0, pressure, FeedEnd::Reservoir).duct("a", 0.01);
    let over = rig(Flow::Mass(0.1), Some(1e5)).throat(0.001);
    assert!(only_problem(&over).what.contains("all stated"));
    let degenerate = rig(Flow::Mach(0.1), None).throat(0.001);
    assert_eq!(only_problem(&degenerate).subject, "feed.mach");
    assert!(
        only_problem(&rig(Flow::FromThroat, Some(1e5)).exit(open()))
            .what
            .contains("flow")
    );
    assert!(
        only_problem(&rig(Flow::Mass(0.1), None).exit(open()))
            .what
            .contains("pressure")
    );
}

#[test]
fn a_flame_colder_than_its_inlet_is_told() {
    let network = Rig::new(COLD, Flow::Mach(0.1), 700.0, Some(1e5), FeedEnd::Reservoir)
        .duct("a", 0.01)
        .flame("pilot", Some(650.0), None)
        .duct("b", 0.01)
        .exit(open());
    let problem = only_problem(&network);
    assert_eq!(problem.subject, "pilot.burnt_temperature");
    assert!(problem.what.contains("650.00 K") && problem.what.contains("700.00 K"));
    // The same temperature is no flame to the mean flow, and no error.
    let knob = network.layout.knob("pilot.burnt_temperature").unwrap();
    let flow = solve(&network.with(knob, 700.0)).unwrap();
    assert!((flow.states[2].pressure / flow.states[1].pressure - 1.0).abs() < 1e-14);
}

#[test]
fn a_choked_end_needs_flow() {
    let rig = |end| Rig::new(COLD, Flow::Mass(0.0), 300.0, Some(1e5), end).duct("a", 0.01);
    assert_eq!(
        only_problem(&rig(FeedEnd::Choked).exit(open())).subject,
        "feed"
    );
    let nozzle = ExitEnd::Choked { throat: None };
    assert_eq!(
        only_problem(&rig(FeedEnd::Closed).exit(nozzle)).subject,
        "exit"
    );
    let both = solve(&rig(FeedEnd::Choked).exit(nozzle)).unwrap_err();
    assert_eq!(both.0.len(), 2);
    let stated = Rig::new(COLD, Flow::Mass(0.0), 300.0, None, FeedEnd::Closed)
        .duct("a", 0.01)
        .throat(0.001);
    assert_eq!(only_problem(&stated).subject, "exit");
}

#[test]
fn nothing_that_is_not_finite_comes_out() {
    let network = long_chain(COLD).exit(open());
    for k in 0..network.layout.knobs.len() {
        for bad in [
            f64::NAN,
            f64::INFINITY,
            f64::NEG_INFINITY,
            0.0,
            -1.0,
            1e300,
            1e-300,
        ] {
            if let Ok(flow) = solve(&network.with(KnobId(k), bad)) {
                for s in &flow.states {
                    let name = &network.layout.knobs[k].name;
                    assert!(s.is_finite(), "{name} = {bad}");
                    assert!(
                        s.density().is_finite() && s.mach().abs() < 1.0,
                        "{name} = {bad}"
                    );
                }
            }
        }
    }
}

#[test]
fn doubtful_states_are_warned_of() {
    let network = Rig::new(COLD, Flow::Mach(0.2), 300.0, Some(1e5), FeedEnd::Reservoir)
        .duct("slow", 0.01)
        .contraction("neck")
        .duct("fast", 0.006)
        .exit(open());
    let warnings = solve(&network).unwrap().warnings;
    let subjects: Vec<&str> = warnings.iter().map(|w| w.subject.as_str()).collect();
    assert_eq!(subjects, ["neck", "fast"]);
    // A/A* is 2.9635 at Mach 0.2 and 1.7780 = 0.6 x 2.9635 at Mach 0.35 (NACA Report 1135, from memory).
    assert!(warnings[0].what.contains("Mach 0.350"), "{}", warnings[0]);

    let cold = Rig::new(
        Gas::Air,
        Flow::Mach(0.1),
        150.0,
        Some(1e5),
        FeedEnd::Reservoir,
    )
    .duct("a", 0.01)
    .flame("f", Some(6500.0), None)
    .duct("b", 0.01)
    .exit(open());
    let warnings = solve(&cold);
    let warnings = warnings.unwrap().warnings;
    assert_eq!(warnings[0].subject, "feed.temperature");
    assert!(warnings[0].what.contains("150.0 K"));
}

#[test]
fn timing() {
    for gas in [COLD, Gas::Air] {
        let network = long_chain(gas).exit(ExitEnd::Choked { throat: None });
        let flow = solve(&network).unwrap();
        let lim = long_chain(gas).exit(open());
        let throat = flow.throat_area.unwrap();
        let time = |what: &str, f: &dyn Fn()| {
            let n = 3000;
            let t = std::time::Instant::now();
            for _ in 0..n {
                f();
            }
            println!(
                "{gas:?} {what}: {:.2} us",
                t.elapsed().as_secs_f64() / n as f64 * 1e6
            );
        };
        time("f64 open", &|| {
            drop(std::hint::black_box(solve(std::hint::black_box(&lim))))
        });
        time("f64 choked", &|| {
            drop(std::hint::black_box(solve(std::hint::black_box(&network))))
        });
        let seeded = network.seeded(network.layout.knob("feed.mass_flow").unwrap());
        time("dual", &|| {
            drop(std::hint::black_box(solve(std::hint::black_box(&seeded))))
        });
        let mut r = long_chain(gas);
        r.no_pressure();
        let n = r.throat(throat);
        solve(&n).unwrap();
        time("throat f64", &|| {
            drop(std::hint::black_box(solve(std::hint::black_box(&n))))
        });
        println!(
            "machs {:?}",
            flow.states
                .iter()
                .map(|s| (s.mach() * 1e3).round() / 1e3)
                .collect::<Vec<_>>()
        );
    }
}
