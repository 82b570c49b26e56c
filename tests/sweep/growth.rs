//! Stretches of growth inside and outside the window, and modes too fast to be followed.

use std::f64::consts::TAU;

use stillflame::meanflow;
use stillflame::modes::{self, Window};
use stillflame::studies::sweep::{Branch, Edge, cautions};

use crate::ground::{check, network, path, sweep};

/// Unstable stretches of the swirl rig over its flame's delay, up to 350 Hz, in the smallest window of growth that
/// shows them, in one that shows hardly any of it, and in one that begins above zero; with many points and with two.
#[test]
fn unstable_stretches_do_not_depend_on_the_window_of_growth_or_the_points() {
    let rig = network("networks/swirl_rig.toml", &[]);
    let stretches = |growth: (f64, f64), lowest: f64, points: usize| {
        let window = Window {
            frequency: (lowest, 350.0),
            growth,
        };
        let found = sweep(
            &rig,
            &path(&rig, &[("main_flame.delay", 1e-3, 8e-3)], points),
            window,
        );
        check(&found);
        assert!(found.unresolved.is_empty());
        // What grows outside is known as such, with the place before and the one behind.
        let outside = &found.growing_outside;
        assert_eq!(
            outside.is_empty(),
            growth == (-300.0, 300.0) && lowest == 0.0
        );
        let grows = |b: &Branch| b.trace.iter().any(|p| p.s.re > 0.0);
        assert!(outside.iter().all(|b| b.trace.len() > 1 && grows(b)));
        (found.unstable, found.fastest.unwrap().s)
    };
    let (all, fastest) = stretches((-300.0, 300.0), 0.0, 141);
    assert!(all.len() >= 3, "{all:?}");
    for (growth, lowest, points) in [
        ((-50.0, 20.0), 250.0, 141),
        ((-50.0, 20.0), 250.0, 2),
        ((40.0, 41.0), 0.0, 5),
        ((-60.0, -59.0), 100.0, 2),
        ((10.0, 100.0), 0.0, 141),
        ((-300.0, -200.0), 300.0, 3),
        ((-300.0, 300.0), 0.0, 2),
    ] {
        let (these, greatest) = stretches(growth, lowest, points);
        assert_eq!(
            these.len(),
            all.len(),
            "{growth:?}, {points}: {these:?}, not {all:?}"
        );
        for ((a, b), (c, d)) in these.iter().zip(&all) {
            assert!(
                (a - c).abs() < 1e-10 && (b - d).abs() < 1e-10,
                "{growth:?}: {these:?}, not {all:?}"
            );
        }
        // Between points the largest is known roughly.
        assert!(
            (greatest.re - fastest.re).abs() < 0.1 * fastest.re,
            "{greatest}"
        );
    }
}

/// Over a delay far longer than periods modes come in faster than points may be put in between: the sweep says where,
/// and whatever passes an edge does so on the edge.
#[test]
fn modes_too_fast_to_follow_are_told() {
    let rig = network("networks/swirl_rig.toml", &[]);
    let window = Window {
        frequency: (20.0, 400.0),
        growth: (-100.0, 300.0),
    };
    let found = sweep(
        &rig,
        &path(&rig, &[("main_flame.delay", 0.0, 0.3)], 2),
        window,
    );
    check(&found);
    assert!(!found.unresolved.is_empty() && found.between > 100);
    for event in &found.events {
        let (off, within) = match event.edge {
            None => continue,
            Some(Edge::LowestFrequency) => (event.s.im / TAU - 20.0, 1e-6),
            Some(Edge::HighestFrequency) => (event.s.im / TAU - 400.0, 1e-6),
            Some(Edge::LowestGrowth) => (event.s.re + 100.0, 1e-5),
            Some(Edge::HighestGrowth) => (event.s.re - 300.0, 1e-5),
        };
        assert!(off.abs() < within, "{event:?}");
    }
    // What is on no branch lies where nothing is followed, and no branch lies there all along.
    let inside = |u: f64| found.is_unresolved(u);
    assert!(!found.unfollowed.is_empty() && !found.branches.is_empty());
    assert!(found.unfollowed.iter().all(|p| inside(p.u)));
    let whole = |b: &Branch| {
        let (first, last) = (b.trace[0].u, b.trace[b.trace.len() - 1].u);
        let holds = |(from, to): &(f64, f64)| *from <= first && last <= *to;
        found.unresolved.iter().any(holds)
    };
    assert!(!found.branches.iter().any(whole));
    let warnings = cautions::warnings(&rig, &meanflow::solve(&rig).unwrap(), &found, &[]);
    assert!(
        warnings.iter().any(|w| w.what.contains("too fast")),
        "{warnings:?}"
    );
}

/// The largest growth rate is a summit between points, and the same however many there are.
#[test]
fn the_fastest_mode_is_a_summit_of_its_branch() {
    let rig = network("networks/swirl_rig.toml", &[]);
    for growth in [(-300.0, 300.0), (-60.0, 20.0)] {
        let window = Window {
            frequency: (200.0, 350.0),
            growth,
        };
        let fastest = |points: usize| {
            let along = path(&rig, &[("main_flame.delay", 0.8e-3, 2e-3)], points);
            let found = sweep(&rig, &along, window);
            let of_the_warning = found.fastest_outside;
            let fastest = found.fastest.unwrap();
            assert_eq!(fastest.branch.is_none(), growth.1 < 100.0);
            if fastest.branch.is_none() {
                assert_eq!(of_the_warning, Some(fastest));
            }
            let value = along.value(fastest.u);
            let at = |value: f64| {
                let settings = [format!("main_flame.delay = {value} s")];
                let solved = modes::solve(&network("networks/swirl_rig.toml", &settings)).unwrap();
                let wide = Window {
                    growth: (-300.0, 300.0),
                    ..window
                };
                modes::find(&solved, wide, modes::Scan::Whole)
                    .leading()
                    .unwrap()
                    .growth()
            };
            let here = at(value);
            assert!((here - fastest.s.re).abs() < 1e-7);
            assert!(here > at(value - 1e-6) && here > at(value + 1e-6));
            fastest.s
        };
        let (few, many) = (fastest(3), fastest(24));
        assert!((few - many).norm() < 1e-3, "{few}, {many}");
    }
}
