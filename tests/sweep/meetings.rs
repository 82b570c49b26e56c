//! Beside exceptional points branches keep their identity; through them the sweep says so.

use num_complex::Complex64;
use serde_json::Value;
use stillflame::modes::Window;
use stillflame::studies::sweep::{Kind, Sweep};

use crate::ground::{check, file, network, path, sweep};

const TUBE: &str = "tests/data/closed_form/rijke_open_open_L4.toml";

fn exact() -> Value {
    let text = std::fs::read_to_string(file("tests/data/exceptional_points.json")).unwrap();
    serde_json::from_str(&text).unwrap()
}

fn number(v: &Value) -> f64 {
    v.as_str().unwrap().parse().unwrap()
}

fn eigenvalue(v: &Value) -> Complex64 {
    Complex64::new(number(&v["s_re"]), number(&v["s_im"]))
}

const WINDOW: Window = Window {
    frequency: (100.0, 250.0),
    growth: (-600.0, 200.0),
};

/// `D` and `D'` of the closed relation.
fn relation(s: Complex64, n: f64, tau: f64) -> (Complex64, Complex64) {
    let (l, c, x) = (1.0, 340.0, 0.25);
    let (a, b, d) = (s * (l / c), s * (x / c), s * ((l - x) / c));
    let f = (-s * tau).exp() * n;
    let value = a.sinh() + f * b.cosh() * d.sinh();
    let slope = a.cosh() * (l / c)
        + f * (b.sinh() * d.sinh() * (x / c) + b.cosh() * d.cosh() * ((l - x) / c)
            - b.cosh() * d.sinh() * tau);
    (value, slope)
}

/// Follows a root of the closed relation from one end of a path to the other by Newton in steps so small
/// that it cannot leave its root: a hundredth of the distance to the exceptional point.
fn continued(from: Complex64, ends: ((f64, f64), (f64, f64)), point: (f64, f64)) -> Complex64 {
    let ((n0, t0), (n1, t1)) = ends;
    let at = |u: f64| (n0 + (n1 - n0) * u, t0 + (t1 - t0) * u);
    let distance = |u: f64| {
        let (n, tau) = at(u);
        (n / point.0 - 1.0).hypot(tau / point.1 - 1.0)
    };
    let length = (n1 / n0 - 1.0).hypot(t1 / t0 - 1.0);
    let (mut u, mut s) = (0.0f64, from);
    while u < 1.0 {
        u = (u + 0.01 * distance(u) / length).min(1.0);
        let (n, tau) = at(u);
        for _ in 0..8 {
            let (value, slope) = relation(s, n, tau);
            s -= value / slope;
        }
    }
    s
}

/// The branch of the mode nearest to `s` at a point.
fn branch_at(sweep: &Sweep, point: usize, s: Complex64) -> (usize, f64) {
    let modes = sweep.points[point].modes.iter();
    modes
        .map(|(b, m)| (b.unwrap(), (m.s - s).norm()))
        .min_by(|a, b| a.1.total_cmp(&b.1))
        .unwrap()
}

fn met(sweep: &Sweep) -> usize {
    let meets = |k: &Kind| matches!(k, Kind::ExceptionalPoint | Kind::Crossing);
    sweep.events.iter().filter(|e| meets(&e.kind)).count()
}

/// A sweep of the delay, or of the gain, that passes the exceptional point at a relative distance.
fn passing(vary: &str, distance: f64, points: usize) -> Sweep {
    passing_between(vary, distance, points, (1.0, 1.0))
}

/// The same over a longer or shorter range on either side.
fn passing_between(vary: &str, distance: f64, points: usize, (left, right): (f64, f64)) -> Sweep {
    let ep = &exact()["exceptional"];
    let (n0, t0) = (number(&ep["n"]), number(&ep["tau"]));
    let (range, fixed) = if vary == "flame.delay" {
        let set = format!("flame.interaction_index = {}", n0 * (1.0 + distance));
        (((1.0 - 0.07 * left) * t0, (1.0 + 0.06 * right) * t0), set)
    } else {
        let set = format!("flame.delay = {} s", t0 * (1.0 + distance));
        (((1.0 - 0.2 * left) * n0, (1.0 + 0.3 * right) * n0), set)
    };
    let tube = network(TUBE, &[fixed]);
    sweep(
        &tube,
        &path(&tube, &[(vary, range.0, range.1)], points),
        WINDOW,
    )
}

#[test]
fn beside_an_exceptional_point_branches_keep_their_identity() {
    let ep = &exact()["exceptional"];
    let (n0, t0) = (number(&ep["n"]), number(&ep["tau"]));
    let mut compared = 0;
    for vary in ["flame.delay", "flame.interaction_index"] {
        for distance in [1e-3, -1e-3, 1e-6, -1e-6] {
            for points in [21, 141] {
                let found = passing(vary, distance, points);
                check(&found);
                assert_eq!(met(&found), 0, "{vary} {distance}: {:?}", found.events);
                let last = points - 1;
                for (_, mode) in &found.points[0].modes {
                    let (start, _) = branch_at(&found, 0, mode.s);
                    let ends = if vary == "flame.delay" {
                        let n = n0 * (1.0 + distance);
                        ((n, 0.93 * t0), (n, 1.06 * t0))
                    } else {
                        let t = t0 * (1.0 + distance);
                        ((0.8 * n0, t), (1.3 * n0, t))
                    };
                    let end = continued(mode.s, ends, (n0, t0));
                    let (reached, error) = branch_at(&found, last, end);
                    if error < 1e-6 {
                        assert_eq!(start, reached, "{vary} {distance} {points}");
                        compared += 1;
                    }
                }
            }
        }
    }
    assert!(compared >= 32, "{compared}");
}

/// On one side of the point the two branches end up exchanged against the other side: what the square
/// root does.
#[test]
fn the_two_sides_of_an_exceptional_point_differ_by_an_exchange() {
    let pairing = |distance: f64| {
        let found = passing("flame.delay", distance, 61);
        let first = found.points.first().unwrap();
        let last = found.points.last().unwrap();
        let of = |b: Option<usize>| last.modes.iter().find(|(x, _)| *x == b).map(|(_, m)| m.s);
        first.modes.iter().map(|(b, _)| of(*b)).collect::<Vec<_>>()
    };
    let (above, below) = (pairing(1e-6), pairing(-1e-6));
    assert_eq!(above.len(), 2);
    let near = |a: Option<Complex64>, b: Option<Complex64>| (a.unwrap() - b.unwrap()).norm() < 0.1;
    assert!(near(above[0], below[1]) && near(above[1], below[0]));
}

#[test]
fn through_an_exceptional_point_the_sweep_says_so() {
    let ep = &exact()["exceptional"];
    let s = eigenvalue(ep);
    for (vary, value) in [
        ("flame.delay", &ep["tau"]),
        ("flame.interaction_index", &ep["n"]),
    ] {
        let reaches = [(1.0, 1.0), (0.317, 0.881), (0.909, 0.473), (0.7, 0.111)];
        for (points, reach) in [21, 60, 141]
            .into_iter()
            .flat_map(|n| reaches.map(|r| (n, r)))
        {
            let found = passing_between(vary, 0.0, points, reach);
            check(&found);
            assert_eq!(met(&found), 1, "{vary} {points}: {:#?}", found.events);
            let event = found
                .events
                .iter()
                .find(|e| e.kind == Kind::ExceptionalPoint)
                .unwrap();
            assert_eq!(event.branches.len(), 2);
            let there = found.path.value(event.u);
            assert!((there / number(value) - 1.0).abs() < 1e-9, "{there}");
            assert!((event.s - s).norm() < 1e-3, "{}", event.s);
            assert!(found.between < 200, "{}", found.between);
        }
    }
}

/// The roots beside the point are those of the source.
#[test]
fn the_split_beside_the_point_is_that_of_the_square_root() {
    let ep = &exact()["exceptional"];
    let factor = number(&ep["split_n_factor"]);
    let found = passing("flame.interaction_index", 0.0, 21);
    let n = number(&ep["n"]) * factor;
    let u = (n - found.path.values.from) / (found.path.values.to - found.path.values.from);
    for root in ep["split"].as_array().unwrap() {
        let exact = eigenvalue(root);
        let nearest = found
            .branches
            .iter()
            .filter_map(|b| b.at(u))
            .map(|p| (p.s - exact).norm())
            .fold(f64::INFINITY, f64::min);
        // By the cubic between the points put in.
        assert!(nearest < 0.05, "{nearest}");
    }
}

/// At n = 4 two roots pass through one value with velocities of their own.
#[test]
fn branches_that_cross_go_on_as_they_came() {
    let exact = exact();
    let point = &exact["crossing"];
    let (n, s) = (number(&point["n"]), eigenvalue(point));
    let tube = network(
        TUBE,
        &[format!("flame.delay = {} s", number(&point["tau"]))],
    );
    let window = Window {
        frequency: (330.0, 350.0),
        growth: (-100.0, 100.0),
    };
    for (low, high, points) in [
        (3.9, 4.1, 21),
        (3.9, 4.1, 20),
        (3.95, 4.07, 8),
        (3.913, 4.0317, 33),
        (3.9771, 4.09, 141),
        (3.99, 4.1003, 4),
    ] {
        let along = path(&tube, &[("flame.interaction_index", low, high)], points);
        let found = sweep(&tube, &along, window);
        check(&found);
        assert_eq!(met(&found), 1, "{:#?}", found.events);
        let event = found
            .events
            .iter()
            .find(|e| e.kind == Kind::Crossing)
            .unwrap();
        assert!((found.path.value(event.u) - n).abs() < 1e-4 && (event.s - s).norm() < 1e-2);
        // One of the two does not move at all.
        let moved: Vec<f64> = found
            .branches
            .iter()
            .map(|b| (b.trace.last().unwrap().s - b.trace.first().unwrap().s).norm())
            .collect();
        assert_eq!(moved.len(), 2);
        assert!(moved[0].min(moved[1]) < 1e-3, "{moved:?}");
        assert!(moved[0].max(moved[1]) > 1.0, "{moved:?}");
    }
}
