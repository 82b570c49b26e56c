//! A root on the window's edge, or up to 1 rad/s from it: the list is complete and right, or says that
//! just this root is on the edge.

use num_complex::Complex64;
use rayon::prelude::*;
use stillflame::numerics::count::Rectangle;
use stillflame::numerics::isolate::Zero;
use stillflame::numerics::zeros::{self, Doubt, Scan, Search};

use crate::common::figures;
use crate::common::random::{Wish, draw};

const CASES: usize = 1500;

const WIDE: Rectangle = Rectangle {
    growth: (-500.0, 500.0),
    omega: (0.0, 5000.0),
};

/// The window with one edge moved to `offset` outside of the root.
fn beside(z: Complex64, edge: usize, offset: f64) -> Rectangle {
    let mut r = WIDE;
    match edge {
        0 => r.growth.0 = z.re - offset,
        1 => r.growth.1 = z.re + offset,
        2 => r.omega.0 = z.im - offset,
        _ => r.omega.1 = z.im + offset,
    }
    r
}

struct Case {
    told: String,
    fault: Option<String>,
    flagged: bool,
}

fn fault(
    list: &Search,
    all: &[Zero],
    root: &Zero,
    window: &Rectangle,
    offset: f64,
) -> Option<String> {
    if list.complete() {
        // A root whose side the list claims to know lies there beyond doubt.
        let inside = |z: &Zero| {
            let mut at = z.at;
            if z.real && window.omega.0 == 0.0 {
                at.im = z.error;
            }
            window.holds(at, 0.0) == Some(true)
        };
        let exact: Vec<&Zero> = all.iter().filter(|z| inside(z)).collect();
        let weight: usize = exact.iter().map(|z| usize::from(z.multiplicity)).sum();
        if list.expected != Some(weight as i64) || list.zeros.len() != exact.len() {
            return Some(format!("{:?} expected, {weight} are", list.expected));
        }
        let listed = |z: &&&Zero| {
            let same = |k: &Zero| (k.at - z.at).norm() <= k.error + z.error;
            list.zeros.iter().any(same)
        };
        return (exact.iter().filter(listed).count() != exact.len())
            .then(|| "other roots".to_owned());
    }
    // Flagged only where it cannot be told: this root, and any that has the same growth rate or frequency.
    let near = |z: &Zero| {
        let (g, w) = (window.growth, window.omega);
        let edges = [z.at.re - g.0, z.at.re - g.1, z.at.im - w.0, z.at.im - w.1];
        let distance = edges.iter().fold(f64::INFINITY, |d, x| d.min(x.abs()));
        distance <= 1e-9 * z.at.norm().max(1.0) + 4.0 * z.error
    };
    let names = |d: &Doubt, z: &Zero| matches!(d, Doubt::OnEdge { at, error } if (at - z.at).norm() <= error + z.error);
    let justified = |d: &Doubt| all.iter().any(|z| names(d, z) && near(z));
    let all_justified = list.doubts.iter().all(justified);
    let this_too = list.doubts.iter().any(|d| names(d, root));
    (!(all_justified && this_too)).then(|| format!("offset {offset:e}: {:?}", list.doubts))
}

/// Cases of one network.
fn cases(seed: u64) -> Vec<Case> {
    let drawn = draw(seed, &Wish::default());
    let tape = &drawn.solved.acoustics.characteristic.tape;
    let reach = Rectangle {
        growth: (-510.0, 510.0),
        omega: (0.0, 5020.0),
    };
    let all = zeros::search(tape, &reach, Scan::Whole);
    assert!(all.complete(), "{:?}", all.doubts);
    let within = all
        .zeros
        .iter()
        .filter(|z| WIDE.holds(z.at, z.error) == Some(true));
    let within: Vec<&Zero> = within.collect();
    let mut rng = fastrand::Rng::with_seed(seed);
    let mut told = Vec::new();
    for _ in 0..if within.is_empty() { 0 } else { 15 } {
        let edge = rng.usize(0..4);
        let root = *within[rng.usize(0..within.len())];
        let sign = if rng.bool() { 1.0 } else { -1.0 };
        let offset = match rng.u8(0..8) {
            0 => 0.0,
            _ => sign * 10f64.powf(-12.0 * rng.f64()),
        };
        let window = beside(root.at, edge, offset);
        if window.omega.0 < 0.0 || window.omega.1 <= window.omega.0 || root.real && edge >= 2 {
            continue;
        }
        let list = zeros::search(tape, &window, Scan::Whole);
        told.push(Case {
            told: format!(
                "{root:?} {offset:e} inside edge {edge} of {window:?}\n{}",
                drawn.rig
            ),
            fault: fault(&list, &all.zeros, &root, &window, offset),
            flagged: !list.complete(),
        });
    }
    told
}

#[test]
fn a_root_beside_the_edge_is_listed_rightly_or_named() {
    let cases: Vec<Case> = (10_000..10_108)
        .into_par_iter()
        .flat_map_iter(cases)
        .collect();
    let cases = &cases[..CASES];
    let flagged = cases.iter().filter(|c| c.flagged).count();
    let faults: Vec<String> = cases
        .iter()
        .filter_map(|c| Some(format!("{}: {}", c.fault.as_ref()?, c.told)))
        .collect();
    println!(
        "{} cases, {flagged} flagged, {} wrong",
        cases.len(),
        faults.len()
    );
    assert!(
        faults.is_empty(),
        "{} wrong:\n{}",
        faults.len(),
        faults.join("\n\n")
    );
    figures::count("trial edges", cases.len());
    figures::about("trial edges named", flagged);
    // One in eight lies on the edge exactly.
    assert!((CASES / 10..CASES / 2).contains(&flagged));
}
