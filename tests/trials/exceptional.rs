//! Nine exceptional points and their neighbourhoods, 1 to 1e-12 away in gain and in delay, against
//! roots in 50 digits (`tests/yardstick/exceptional.py`).

use num_complex::Complex64;
use stillflame::modes::{self, ModeList};
use stillflame::numerics::zeros::{self, Scan};

use crate::common::counting::Counting;
use crate::common::figures;
use crate::common::heater::{self, WINDOW};

/// By how much rounding in the gas, the geometry and the delays of a network moves its parameters.
const PARAMETERS: f64 = 2e-15;

/// Values a list may take at most, beside an exceptional point too.
const MOST_VALUES: usize = 3000;

/// What the exact roots hold against a list.
fn fault(list: &ModeList, roots: &[Complex64], middle: Complex64, parting: f64) -> Option<String> {
    if !list.complete() {
        return Some(format!("not proved: {:?}", list.doubts));
    }
    let weight: usize = list.modes.iter().map(|m| usize::from(m.multiplicity)).sum();
    if weight != roots.len() || list.expected != Some(roots.len()) {
        return Some(format!(
            "{weight} listed, {:?} expected, {} exact",
            list.expected,
            roots.len()
        ));
    }
    // Each root goes to the nearest mode; a mode must get as many as it stands for.
    let mut given = vec![0; list.modes.len()];
    for r in roots {
        let (i, m) = list
            .modes
            .iter()
            .enumerate()
            .filter(|(i, m)| given[*i] < m.multiplicity)
            .min_by(|a, b| (a.1.s - r).norm().total_cmp(&(b.1.s - r).norm()))?;
        given[i] += 1;
        // The root of the network as rounded: beside the point a square root enlarges the difference.
        let from_middle = (r - middle).norm();
        let shifted = parting * parting * PARAMETERS;
        let blur = (shifted + from_middle * from_middle).sqrt() - from_middle;
        let off = (m.s - r).norm();
        if off > m.error_bound + blur + 1e-13 * r.norm() {
            return Some(format!(
                "{r} is {off:e} from {m:?}, rounding of the network {blur:e}"
            ));
        }
        if m.multiplicity == 1 && off > 1e-6 * r.norm() {
            return Some(format!("{r} is {off:e} from {m:?}"));
        }
    }
    None
}

#[test]
fn lists_beside_exceptional_points_are_complete_and_right() {
    let points = heater::points();
    assert_eq!(points.len(), 9);
    let (mut cases, mut told, mut doubles, mut most, mut faults) = (0, 0, 0, 0, Vec::new());
    for p in &points {
        let middle = Complex64::new(heater::number(&p.s_re), heater::number(&p.s_im));
        for b in &p.beside {
            let solved = heater::solved(&p.x_f, b);
            let f = Counting::of(&solved.acoustics.characteristic.tape);
            zeros::search(&f, &WINDOW.rectangle(), Scan::Whole);
            let calls = f.calls();
            let work = calls.values + 2 * calls.series + calls.bounds;
            most = most.max(work);
            let list = modes::find(&solved, WINDOW, Scan::Whole);
            let roots: Vec<_> = b.roots.iter().map(|&(x, y)| Complex64::new(x, y)).collect();
            let parting = p.parting[0].max(p.parting[1]);
            doubles += list.modes.iter().filter(|m| m.multiplicity == 2).count();
            told += usize::from(list.complete());
            cases += 1;
            let place = || format!("x_f {} about {middle:.1}, {}, work {work}", p.x_f, b.moved);
            faults.extend(
                fault(&list, &roots, middle, parting).map(|what| format!("{}: {what}", place())),
            );
        }
    }
    println!(
        "{cases} lists, {told} complete, {doubles} double modes, at most {most} values and bounds"
    );
    assert!(
        faults.is_empty(),
        "{} of {cases} wrong:\n{}",
        faults.len(),
        faults.join("\n")
    );
    figures::count("trial exceptional", cases);
    figures::about("trial exceptional not proved", cases - told);
    assert!(most <= MOST_VALUES, "{most}");
    assert!(doubles >= points.len(), "{doubles}");
}
