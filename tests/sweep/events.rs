//! Entries, exits, neutral crossings and meetings on the real axis, against computations of their own.

use num_complex::Complex64;
use stillflame::input;
use stillflame::modes::{self, Mode, Scan, Window};
use stillflame::network::Network;
use stillflame::studies::path::{Path, Spacing};
use stillflame::studies::sweep::{Edge, Kind, State, Sweep};

use crate::ground::{check, network, path, sweep, window};

fn list(network: &Network, window: Window) -> Vec<Mode> {
    let solved = modes::solve(network).unwrap();
    let list = modes::find(&solved, window, Scan::Whole);
    assert!(list.complete(), "{:?}", list.doubts);
    list.modes
}

/// The mode near `s`, by Newton on a numerical derivative of `D`: nothing of the follower.
fn near(network: &Network, s: Complex64) -> Complex64 {
    let solved = modes::solve(network).unwrap();
    let tape = &solved.acoustics.characteristic.tape;
    let d = |s: Complex64| tape.taylor_at::<1>(s)[0].value();
    let mut s = s;
    for _ in 0..30 {
        let h = 1e-6 * s.norm();
        let step = d(s) * (2.0 * h) / (d(s + h) - d(s - h));
        s -= step;
        if step.norm() < 1e-12 * s.norm() {
            break;
        }
    }
    s
}

/// Every passage of a mode through the window's edge along a path, from lists over a larger window at
/// many positions, joined by nearest neighbours and bisected.
fn dense(network: &Network, along: &Path, window: Window, steps: usize) -> Vec<(f64, Edge, bool)> {
    let (df, dg) = (
        0.3 * (window.frequency.1 - window.frequency.0),
        0.3 * (window.growth.1 - window.growth.0),
    );
    let larger = Window {
        frequency: ((window.frequency.0 - df).max(0.0), window.frequency.1 + df),
        growth: (window.growth.0 - dg, window.growth.1 + dg),
    };
    let r = window.rectangle();
    let beyond = |s: Complex64| {
        [
            (Edge::LowestFrequency, r.omega.0 - s.im),
            (Edge::HighestFrequency, s.im - r.omega.1),
            (Edge::LowestGrowth, r.growth.0 - s.re),
            (Edge::HighestGrowth, s.re - r.growth.1),
        ]
    };
    let inside = |s: Complex64| beyond(s).iter().all(|(_, d)| *d <= 0.0);
    let mut passages = Vec::new();
    let mut before = list(&along.at(network, 0.0), larger);
    for k in 1..=steps {
        let (u0, u1) = ((k - 1) as f64 / steps as f64, k as f64 / steps as f64);
        let now = list(&along.at(network, u1), larger);
        for mode in &before {
            let next = now
                .iter()
                .min_by(|a, b| (a.s - mode.s).norm().total_cmp(&(b.s - mode.s).norm()));
            let Some(next) = next.filter(|n| (n.s - mode.s).norm() < 40.0) else {
                continue;
            };
            if inside(mode.s) == inside(next.s) {
                continue;
            }
            let (mut a, mut b, mut s) = (u0, u1, mode.s);
            for _ in 0..45 {
                let u = 0.5 * (a + b);
                s = near(&along.at(network, u), s);
                if inside(s) == inside(mode.s) {
                    a = u;
                } else {
                    b = u;
                }
            }
            let (edge, _) = beyond(s)
                .into_iter()
                .min_by(|x, y| x.1.abs().total_cmp(&y.1.abs()))
                .unwrap();
            passages.push((0.5 * (a + b), edge, inside(next.s)));
        }
        before = now;
    }
    passages.sort_by(|a, b| a.0.total_cmp(&b.0));
    passages
}

fn passages(sweep: &Sweep) -> Vec<(f64, Edge, bool)> {
    let through = |k: Kind| matches!(k, Kind::Enters | Kind::Leaves);
    sweep
        .events
        .iter()
        .filter(|e| through(e.kind))
        .map(|e| (e.u, e.edge.unwrap(), e.kind == Kind::Enters))
        .collect()
}

#[test]
fn entries_and_exits_are_those_of_dense_lists() {
    let mut edges = Vec::new();
    let cases = [
        (
            "networks/swirl_rig.toml",
            vec![("main_flame.delay", 1e-3, 8e-3)],
            (100.0, 420.0),
            (-120.0, 60.0),
            36,
        ),
        (
            "networks/swirl_rig.toml",
            vec![("main_flame.interaction_index", 0.0, 2.0)],
            (150.0, 420.0),
            (-80.0, 80.0),
            11,
        ),
        (
            "networks/swirl_rig.toml",
            vec![("feed.mass_flow", 0.01, 0.05), ("chamber.length", 0.6, 0.8)],
            (120.0, 400.0),
            (-100.0, 50.0),
            21,
        ),
        (
            "networks/swirl_rig.toml",
            vec![("main_flame.delay", 1e-3, 8e-3)],
            (60.0, 345.0),
            (-200.0, 200.0),
            141,
        ),
        (
            "tests/data/closed_form/rijke_open_open_L4.toml",
            vec![("flame.delay", 0.5e-3, 5e-3)],
            (120.0, 700.0),
            (-20.0, 15.0),
            31,
        ),
    ];
    for (file, runs, frequency, growth, points) in cases {
        let rig = network(file, &[]);
        let window = Window { frequency, growth };
        let along = path(&rig, &runs, points);
        let found = sweep(&rig, &along, window);
        check(&found);
        let unexplained = |k: &Kind| matches!(k, Kind::Lost | Kind::Found);
        assert!(
            !found.events.iter().any(|e| unexplained(&e.kind)),
            "{:#?}",
            found.events
        );
        let (mine, wanted) = (passages(&found), dense(&rig, &along, window, 900));
        assert_eq!(mine.len(), wanted.len(), "{file}: {mine:?}\n{wanted:?}");
        for (a, b) in mine.iter().zip(&wanted) {
            assert!(
                (a.0 - b.0).abs() < 1e-9 && (a.1, a.2) == (b.1, b.2),
                "{a:?} {b:?}"
            );
        }
        edges.extend(mine.iter().map(|p| p.1));
    }
    for edge in [
        Edge::LowestFrequency,
        Edge::HighestFrequency,
        Edge::LowestGrowth,
        Edge::HighestGrowth,
    ] {
        assert!(edges.contains(&edge), "no case passes {edge:?}: {edges:?}");
    }
}

/// Velocities along a path are differences of the modes along it, the change of the mean flow included.
#[test]
fn velocities_are_differences_along_the_path() {
    let rig = network("networks/pressurised_rig.toml", &[]);
    let runs = [
        ("feed.mass_flow", 0.9, 1.3),
        ("feed.temperature", 600.0, 700.0),
        ("main_flame.delay", 2e-3, 4e-3),
    ];
    for spacing in [Spacing::Linear, Spacing::Geometric] {
        let mut along = path(&rig, &runs, 9);
        along.spacing = spacing;
        let found = sweep(&rig, &along, window(&rig));
        check(&found);
        let mut compared = 0;
        for place in found.branches.iter().flat_map(|b| &b.trace) {
            let h = 1e-5;
            if place.point.is_none() || place.u < h || place.u > 1.0 - h {
                continue;
            }
            let at = |u: f64| near(&along.at(&rig, u), place.s);
            let difference = (at(place.u + h) - at(place.u - h)) / (2.0 * h);
            let error = (place.velocity - difference).norm();
            assert!(
                error < 1e-5 * (1.0 + difference.norm()),
                "{error:e} of {difference}"
            );
            compared += 1;
        }
        assert!(compared > 20, "{compared}");
    }
}

/// A mode is followed the same way whatever the number of points.
#[test]
fn branches_do_not_depend_on_the_number_of_points() {
    let rig = network("networks/twenty_elements.toml", &[]);
    let window = window(&rig);
    let ends = |points: usize| {
        let runs = [
            ("main_flame.delay", 1e-3, 4e-3),
            ("pilot_flame.delay", 1.2e-3, 4.8e-3),
        ];
        let mut along = path(&rig, &runs, points);
        along.spacing = Spacing::Geometric;
        let found = sweep(&rig, &along, window);
        check(&found);
        let of = |b: &stillflame::studies::sweep::Branch| {
            let (first, last) = (b.trace.first().unwrap(), b.trace.last().unwrap());
            (first.u, first.s, last.u, last.s)
        };
        found.branches.iter().map(of).collect::<Vec<_>>()
    };
    let many = ends(401);
    assert!(many.len() > 7);
    for points in [9, 40, 141] {
        let few = ends(points);
        assert_eq!(few.len(), many.len());
        for (a, b) in few.iter().zip(&many) {
            assert!((a.0 - b.0).abs() < 1e-9 && (a.2 - b.2).abs() < 1e-9);
            assert!(
                (a.1 - b.1).norm() < 1e-6 && (a.3 - b.3).norm() < 1e-6,
                "{points}"
            );
        }
    }
}

const VESSEL: &str = r#"
title = "Vessel that empties through a screen (invented)"
search = { frequency = "0 to 120 Hz", growth = "-600 to 100 1/s" }
exit = { end = "open" }
[feed]
gas = { gamma = 1.4, gas_constant = "287 J/(kg K)" }
mass_flow = "40 g/s"
temperature = "300 K"
pressure = "101325 Pa"
end = "choked"
[[element]]
name = "inlet"
kind = "duct"
length = "20 mm"
diameter = "50 mm"
[[element]]
name = "vessel"
kind = "plenum"
volume = "5 L"
[[element]]
name = "neck"
kind = "duct"
length = "200 mm"
diameter = "40 mm"
[[element]]
name = "screen"
kind = "restriction"
loss_coefficient = 2.0
[[element]]
name = "tail"
kind = "duct"
length = "20 mm"
diameter = "40 mm"
"#;

/// With more loss the resonance of a vessel and its neck becomes overdamped: a mode and its conjugate
/// meet and part as two real modes.
#[test]
fn an_oscillating_mode_becomes_two_real_ones_and_back() {
    let rig = input::parse("vessel.toml", VESSEL, &[]).unwrap().network;
    let window = window(&rig);
    for (low, high) in [(1.0, 40.0), (40.0, 1.0), (4.0, 5.0)] {
        for points in [12, 40, 141] {
            let along = path(&rig, &[("screen.loss_coefficient", low, high)], points);
            let found = sweep(&rig, &along, window);
            check(&found);
            let kind = if low < high {
                Kind::BecomesReal
            } else {
                Kind::BecomesOscillating
            };
            let events: Vec<_> = found.events.iter().filter(|e| e.kind == kind).collect();
            assert_eq!(events.len(), 1, "{points}: {:#?}", found.events);
            let event = events[0];
            assert_eq!(event.branches.len(), 2);
            assert!(event.s.im == 0.0);
            let unexplained = |k: &Kind| {
                matches!(
                    k,
                    Kind::Lost | Kind::Found | Kind::ExceptionalPoint | Kind::Crossing
                )
            };
            assert!(
                !found.events.iter().any(|e| unexplained(&e.kind)),
                "{:#?}",
                found.events
            );
            // Just before it oscillates, just behind it does not.
            let step = 1e-9 * (high - low).signum();
            let at = |value: f64| {
                let knob = rig.layout.knob("screen.loss_coefficient").unwrap();
                list(&rig.with(knob, value), window)
            };
            let value = found.path.value(event.u);
            let (before, behind) = (at(value - step), at(value + step));
            let (one, two) = if low < high {
                (before, behind)
            } else {
                (behind, before)
            };
            assert!(one.len() == 1 && one[0].s.im > 0.0, "{one:?}");
            assert!(
                two.len() == 2 && two.iter().all(|m| m.s.im == 0.0),
                "{two:?}"
            );
            assert!((one[0].s - event.s).norm() < 0.1);
        }
    }
}

/// Two tubes of still gas, the second of stated area.
const STEP: &str = r#"
title = "Two tubes, shut and open (invented)"
search = { frequency = "20 to 900 Hz", growth = "-100 to 100 1/s" }
exit = { end = "open" }
[feed]
gas = { gamma = 1.4, gas_constant = "287 J/(kg K)" }
mass_flow = "0 kg/s"
temperature = "300 K"
pressure = "101325 Pa"
end = "closed"
[[element]]
name = "wide"
kind = "duct"
length = "400 mm"
diameter = "100 mm"
[[element]]
name = "step"
kind = "contraction"
[[element]]
name = "narrow"
kind = "duct"
length = "500 mm"
area = "58 cm^2"
"#;

/// A diameter and an area that grow linearly: in the middle of the path the narrow tube is wider than the
/// wide one, and the points there have no answer. The modes hardly change meanwhile, so branches go on.
#[test]
fn branches_go_on_beyond_points_that_fail() {
    let rig = input::parse("step.toml", STEP, &[]).unwrap().network;
    let square = std::f64::consts::FRAC_PI_4 * 1e-6;
    let runs = [
        ("wide.diameter", 0.1, 0.2),
        ("narrow.area", 7510.0 * square, 37510.0 * square),
    ];
    let found = sweep(&rig, &path(&rig, &runs, 121), window(&rig));
    check(&found);
    let failed = found
        .points
        .iter()
        .filter(|p| matches!(p.state, State::Failed(_)));
    let failed: Vec<f64> = failed.map(|p| p.u).collect();
    assert!(
        failed.len() >= 5 && failed.iter().all(|u| (u - 0.5).abs() < 0.033),
        "{failed:?}"
    );
    // Nothing damps or drives: growth rates are zero to rounding, and no sign is made of that.
    assert!(found.events.is_empty(), "{:#?}", found.events);
    assert!(found.branches.len() >= 4);
    for branch in &found.branches {
        let (first, last) = (branch.trace.first().unwrap(), branch.trace.last().unwrap());
        assert_eq!((first.u, last.u), (0.0, 1.0));
        assert_eq!(branch.trace.iter().filter(|p| p.gap_before).count(), 1);
        assert!(branch.known_at(0.5).is_none() && branch.known_at(0.4).is_some());
    }
}

/// Flow that chokes in the middle of a path: modes crowd towards Mach 1, no prediction holds across, and
/// the sweep says so.
#[test]
fn branches_end_where_nothing_carries_them_across() {
    let rig = network("networks/swirl_rig.toml", &[]);
    let runs = [
        ("feed.mass_flow", 0.15, 0.756),
        ("mixing_tube.diameter", 0.03, 0.07),
        ("chamber.diameter", 0.08, 0.19),
        ("plenum.diameter", 0.1, 0.24),
    ];
    let found = sweep(&rig, &path(&rig, &runs, 61), window(&rig));
    check(&found);
    let failed = found
        .points
        .iter()
        .filter(|p| matches!(p.state, State::Failed(_)));
    let failed: Vec<f64> = failed.map(|p| p.u).collect();
    assert!(failed.len() > 5 && failed[0] > 0.1 && *failed.last().unwrap() < 0.5);
    for kind in [Kind::Lost, Kind::Found] {
        let at: Vec<f64> = found
            .events
            .iter()
            .filter(|e| e.kind == kind)
            .map(|e| e.u)
            .collect();
        assert!(!at.is_empty(), "{kind:?}");
        let gap = failed[0] - 0.02..=failed[failed.len() - 1] + 0.02;
        assert!(at.iter().all(|u| gap.contains(u)), "{kind:?} at {at:?}");
    }
}
