//! What has no answer, and what qualifies one, is told.

use super::*;

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
    // A little below, as between two flames stated equally hot, it is remarked on.
    let pilot = network.layout.knob("pilot.burnt_temperature").unwrap();
    let warnings = solve(&network.with(pilot, 699.0)).unwrap().warnings;
    assert_eq!(warnings.len(), 1);
    assert_eq!(warnings[0].subject, "pilot.burnt_temperature");
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
        Flow::Mach(0.01),
        150.0,
        Some(1e5),
        FeedEnd::Reservoir,
    )
    .duct("a", 0.01)
    .flame("f", Some(6500.0), None)
    .duct("b", 0.01)
    .exit(open());
    let warnings = solve(&cold).unwrap().warnings;
    assert_eq!(warnings[0].subject, "feed.temperature");
    assert!(warnings[0].what.contains("150.0 K"));
}

/// Found by the random chains: the temperature before the second flame falls as the Mach number rises,
/// so that flows short of the answer make it colder than its inlet.
#[test]
fn a_flame_too_cold_beside_the_answer_does_not_hide_it() {
    let rig = |flow, pressure| {
        Rig::new(Gas::Air, flow, 600.0, pressure, FeedEnd::Reservoir)
            .duct("a", 0.01)
            .flame("f1", Some(2000.0), None)
            .duct("b", 0.01)
            .plenum("p")
            .duct("c", 0.01)
    };
    let choked = || ExitEnd::Choked { throat: None };
    let before = solve(&rig(Flow::Mach(0.1), Some(1e5)).exit(choked())).unwrap();
    let inlet = before.states.last().unwrap().temperature;
    let rig = |flow, pressure| {
        rig(flow, pressure)
            .flame("f2", Some(0.99 * inlet + 0.01), None)
            .duct("d", 0.01)
    };
    let flow = solve(&rig(Flow::Mach(0.1), Some(1e5)).exit(choked())).unwrap();
    let throat = flow.throat_area.unwrap();
    let again = solve(&rig(Flow::FromThroat, Some(1e5)).throat(throat)).unwrap();
    let (a, b) = (flow.states[0].velocity, again.states[0].velocity);
    assert!((a / b - 1.0).abs() < 1e-9);
    let colder = only_problem(&rig(Flow::FromThroat, Some(1e5)).throat(0.95 * throat));
    assert_eq!(colder.subject, "f2.burnt_temperature");
}
