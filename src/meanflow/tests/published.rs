//! Against published relations and tables.

use super::*;

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
