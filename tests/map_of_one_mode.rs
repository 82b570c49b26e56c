//! One mode followed over a map, held against a closed relation whose roots are carried along the same way in small
//! steps, and against exact exceptional points.

use std::path::Path;

use num_complex::Complex64;
use stillflame::modes::{self, Mode, Scan, Window};
use stillflame::network::Network;
use stillflame::studies::branch::{Followed, follow};
use stillflame::studies::map::{Axis, Map, map};
use stillflame::{input, meanflow};

fn tube() -> Network {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR"));
    let file = folder.join("tests/data/closed_form/rijke_open_open_L4.toml");
    input::read(&file, &[]).unwrap().network
}

/// Delays (s) and interaction indices of a plane, and its points along each.
struct Plane {
    delay: (f64, f64),
    index: (f64, f64),
    points: (usize, usize),
}

/// The mode nearest to `s` at the design point, followed.
fn followed(plane: &Plane, design: (f64, f64), s: Complex64) -> (Map, Followed) {
    let mut network = tube();
    let knob = |name: &str| network.layout.knob(name).unwrap();
    let (delay, index) = (knob("flame.delay"), knob("flame.interaction_index"));
    network.values[delay] = design.0;
    network.values[index] = design.1;
    let axis = |knob, (low, high), points| Axis {
        knob,
        low,
        high,
        points,
    };
    let across = axis(delay, plane.delay, plane.points.0);
    let up = axis(index, plane.index, plane.points.1);
    let window = Window {
        frequency: (16.0, 960.0),
        growth: (-1200.0, 400.0),
    };
    let mean = meanflow::solve(&network).unwrap();
    let solved = modes::solve(&network).unwrap();
    let list = modes::find(&solved, window, Scan::Whole).modes;
    let near = |a: &&Mode, b: &&Mode| (a.s - s).norm().total_cmp(&(b.s - s).norm());
    let mode = list.iter().min_by(near).unwrap();
    let go_on = || std::ops::ControlFlow::Continue(());
    let map = map(&network, &mean, (across, up), window, true, go_on).unwrap();
    let followed = follow(&network, &mean, &map, map.lists.as_ref().unwrap(), mode);
    (map, followed)
}

/// `D` of the tube: see the head of `tests/data/exceptional_points.json`.
fn relation(s: Complex64, tau: f64, n: f64) -> Complex64 {
    let (l, c, x) = (1.0, 340.0, 0.25);
    let heater = (-s * tau).exp() * n * (s * (x / c)).cosh() * (s * ((l - x) / c)).sinh();
    (s * (l / c)).sinh() + heater
}

/// A root of the closed relation carried along a straight line in many small steps.
fn carried(mut s: Complex64, from: (f64, f64), to: (f64, f64)) -> Complex64 {
    const STEPS: u32 = 1000;
    for k in 1..=STEPS {
        let t = f64::from(k) / f64::from(STEPS);
        let (tau, n) = (from.0 + t * (to.0 - from.0), from.1 + t * (to.1 - from.1));
        for _ in 0..4 {
            let h = 1e-3;
            let slope = (relation(s + h, tau, n) - relation(s - h, tau, n)) / (2.0 * h);
            s -= relation(s, tau, n) / slope;
        }
    }
    s
}

/// The exact exceptional point of `tests/data/exceptional_points.json`, by 40-digit arithmetic.
const POINT: (f64, f64) = (0.003_926_001_502_322_7, 0.426_799_715_957_87);
const THERE: Complex64 = Complex64::new(-176.459_936_383_6, 989.745_500_445_57);

#[test]
fn each_point_has_the_mode_that_the_way_laid_down_leads_to() {
    let plane = Plane {
        delay: (0.0036, 0.0042),
        index: (0.1, 0.8),
        points: (11, 9),
    };
    for (design, s) in [
        ((0.0038, 0.3), Complex64::new(-56.0, 1022.0)),
        ((0.00377, 0.33), Complex64::new(-400.0, 970.0)),
        // From beyond the exceptional point the cut runs the other way.
        ((0.0041, 0.71), Complex64::new(-150.0, 1170.0)),
    ] {
        let (map, followed) = followed(&plane, design, s);
        let mut start = s;
        for _ in 0..40 {
            let slope = (relation(start + 1e-3, design.0, design.1)
                - relation(start - 1e-3, design.0, design.1))
                / 2e-3;
            start -= relation(start, design.0, design.1) / slope;
        }
        assert_eq!(followed.reached, [true; 99]);
        for (k, mode) in followed.modes.iter().enumerate() {
            let (tau, n) = (map.across.value(k % 11), map.up.value(k / 11));
            let corner = (tau, design.1);
            let expected = carried(carried(start, design, corner), corner, (tau, n));
            let found = mode.unwrap().s;
            assert!(
                (found - expected).norm() < 1e-6,
                "{tau} {n}: {found} {expected}"
            );
        }
    }
}

#[test]
fn around_an_exceptional_point_exactly_it_is_found_and_a_cut_ends_there() {
    let here = |columns, rows| Plane {
        delay: (0.0036, 0.0042),
        index: (0.1, 0.8),
        points: (columns, rows),
    };
    for (columns, rows) in [(2, 2), (3, 7), (10, 10), (25, 25)] {
        for (design, s, upwards) in [
            ((0.0038, 0.3), Complex64::new(-56.0, 1022.0), true),
            ((0.0038, 0.3), Complex64::new(-410.0, 972.0), true),
            ((0.0041, 0.71), Complex64::new(-150.0, 1170.0), false),
        ] {
            let (map, found) = followed(&here(columns, rows), design, s);
            let [point] = found.exceptional.as_slice() else {
                panic!("{:?}", found.exceptional);
            };
            let value = |at: (f64, f64)| (map.across.between(at.0), map.up.between(at.1));
            let (tau, n) = value(point.at);
            assert!((tau / POINT.0 - 1.0).abs() < 1e-11, "{tau}");
            assert!((n / POINT.1 - 1.0).abs() < 1e-11, "{n}");
            assert!((point.s.unwrap() - THERE).norm() < 1e-8);
            let [cut] = found.cuts.as_slice() else {
                panic!("{:?}", found.cuts);
            };
            let rim = (point.at.0, if upwards { rows as f64 - 1.0 } else { 0.0 });
            let ends = [cut.from, cut.to];
            assert_eq!(
                ends,
                if upwards {
                    [point.at, rim]
                } else {
                    [rim, point.at]
                }
            );
        }
    }
}

#[test]
fn where_two_modes_only_pass_through_one_value_there_is_no_cut() {
    // n = 4, tau = 1/680 s: s = 2 pi i c/L is a root for every n and tau, and there it is met by another.
    let plane = Plane {
        delay: (0.0013, 0.0016),
        index: (3.0, 5.2),
        points: (12, 13),
    };
    let (_, found) = followed(&plane, (0.00133, 3.1), Complex64::new(0.0, 2136.283));
    assert_eq!(found.reached, [true; 156]);
    assert!(found.cuts.is_empty() && found.exceptional.is_empty());
    for mode in found.modes {
        assert!((mode.unwrap().s.im - 2_136.283_004_441_059).abs() < 1e-6);
    }
}

#[test]
fn a_mode_is_not_replaced_where_it_leaves_the_window() {
    let plane = Plane {
        delay: (0.0038, 0.0042),
        index: (0.01, 0.3),
        points: (5, 12),
    };
    // The intrinsic mode decays without bound as its gain goes to zero.
    let (_, found) = followed(&plane, (0.0039, 0.29), Complex64::new(-410.0, 972.0));
    let known: Vec<bool> = found.modes.iter().map(Option::is_some).collect();
    assert!(known[55..].iter().all(|k| *k) && known[..5].iter().all(|k| !*k));
    assert!(found.cuts.is_empty());
}
