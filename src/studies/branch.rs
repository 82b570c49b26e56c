//! One mode followed over a map, from the design point outwards.
//!
//! The mode of a point is looked for among those of its neighbour, near where the mode of a neighbour already
//! followed leads (carried on straight where the point beyond that is known too). Of all steps that could be
//! taken next the clearest is taken first, the one whose nearest candidate is nearest against the second.
//! Where no candidate is clearly nearer than another the mode is not followed. Around a meeting of two modes no
//! labels hold for the whole plane: there a cut remains, along which both sides were reached from elsewhere.

use std::cmp::{Ordering, Reverse};
use std::collections::BinaryHeap;

use num_complex::Complex64;

use super::map::{Axis, Map};
use crate::modes::Mode;

/// Largest distance of the nearest candidate, over that of the second.
const CLEAR: f64 = 0.4;

/// A step that could be taken.
struct Step {
    doubt: f64,
    to: usize,
    mode: Mode,
}

impl PartialEq for Step {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other) == Ordering::Equal
    }
}
impl Eq for Step {}
impl PartialOrd for Step {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}
impl Ord for Step {
    fn cmp(&self, other: &Self) -> Ordering {
        self.doubt
            .total_cmp(&other.doubt)
            .then(self.to.cmp(&other.to))
    }
}

/// The mode at each point, row by row, that `mode` of the network at `design` leads to; none where it is not
/// followed. `lists` are the modes of each point.
pub fn follow(
    map: &Map,
    lists: &[Vec<Mode>],
    design: (f64, f64),
    mode: &Mode,
) -> Vec<Option<Mode>> {
    let (columns, rows) = (map.across.points, map.up.points);
    let mut found: Vec<Option<Mode>> = vec![None; lists.len()];
    let (i, j) = (nearest(map.across, design.0), nearest(map.up, design.1));
    let mut open = BinaryHeap::new();
    let offer = |open: &mut BinaryHeap<Reverse<Step>>, to: usize, guess: Complex64| {
        let candidates = lists.get(to).map_or(&[][..], Vec::as_slice);
        if let Some((mode, doubt)) = clearest(candidates, guess, map) {
            open.push(Reverse(Step { doubt, to, mode }));
        }
    };
    offer(&mut open, j * columns + i, mode.s);
    while let Some(Reverse(step)) = open.pop() {
        match found.get_mut(step.to) {
            Some(slot @ None) => *slot = Some(step.mode),
            _ => continue,
        }
        let (i, j) = ((step.to % columns) as isize, (step.to / columns) as isize);
        for (di, dj) in [(1, 0), (-1, 0), (0, 1), (0, -1)] {
            let at = |k: isize| {
                let (i, j) = (i + k * di, j + k * dj);
                let inside = i >= 0 && j >= 0 && i < columns as isize && j < rows as isize;
                inside.then(|| j as usize * columns + i as usize)
            };
            let Some(to) = at(1).filter(|&k| found.get(k).is_some_and(Option::is_none)) else {
                continue;
            };
            let before = at(-1).and_then(|k| found.get(k).copied().flatten());
            let guess = before.map_or(step.mode.s, |b| step.mode.s * 2.0 - b.s);
            offer(&mut open, to, guess);
        }
    }
    found
}

fn nearest(axis: Axis, value: f64) -> usize {
    let last = axis.points.saturating_sub(1);
    let share = (value - axis.low) / (axis.high - axis.low);
    let index = (share * last as f64).round();
    // A degenerate axis has one point, and any value is nearest to it.
    if index > 0.0 {
        (index as usize).min(last)
    } else {
        0
    }
}

/// The candidate nearest to a guess with its doubt; none where another is about as near. A lone candidate is
/// held against the size of the window.
fn clearest(candidates: &[Mode], guess: Complex64, map: &Map) -> Option<(Mode, f64)> {
    let mut ranked: Vec<(f64, Mode)> = candidates
        .iter()
        .map(|m| ((m.s - guess).norm(), *m))
        .collect();
    ranked.sort_by(|a, b| a.0.total_cmp(&b.0));
    let &(near, mode) = ranked.first()?;
    let window = map.window.rectangle();
    let size = (window.growth.1 - window.growth.0).min(window.omega.1 - window.omega.0);
    let second = ranked.get(1).map_or(f64::INFINITY, |r| r.0);
    let doubt = near / second.min(size);
    (doubt <= CLEAR).then_some((mode, doubt))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::knobs::KnobId;
    use crate::modes::Window;
    use crate::studies::map::Point;

    fn mode(growth: f64, omega: f64) -> Mode {
        Mode {
            s: Complex64::new(growth, omega),
            error_bound: 0.0,
            multiplicity: 1,
        }
    }

    fn plane(columns: usize, rows: usize) -> Map {
        let axis = |points| Axis {
            knob: KnobId(0),
            low: -1.0,
            high: 1.0,
            points,
        };
        Map {
            across: axis(columns),
            up: axis(rows),
            window: Window {
                frequency: (0.0, 1000.0),
                growth: (-500.0, 500.0),
            },
            points: vec![Point::Certified(Default::default()); columns * rows],
            lists: None,
        }
    }

    #[test]
    fn a_mode_is_followed_through_a_crossing_of_growth_rates() {
        // Two modes of different frequency whose growth rates change places: each keeps its name.
        let map = plane(41, 5);
        let lists: Vec<Vec<Mode>> = (0..41 * 5)
            .map(|k| {
                let x = map.across.value(k % 41);
                vec![mode(100.0 * x, 2000.0 + 20.0 * x), mode(-100.0 * x, 2400.0)]
            })
            .collect();
        let found = follow(&map, &lists, (-1.0, 0.0), &lists[0][0]);
        for (k, m) in found.iter().enumerate() {
            assert_eq!(m.unwrap().s, lists[k][0].s);
        }
    }

    #[test]
    fn around_a_meeting_of_two_modes_a_cut_remains_and_nothing_jumps_elsewhere() {
        // s = 3000 i + 200 sqrt(x + i y): a branch point at the origin.
        let map = plane(40, 40);
        let lists: Vec<Vec<Mode>> = (0..1600)
            .map(|k| {
                let z = Complex64::new(map.across.value(k % 40), map.up.value(k / 40)).sqrt();
                let s = Complex64::new(0.0, 3000.0);
                [1.0, -1.0]
                    .map(|sign| s + z * 200.0 * sign)
                    .map(|s| mode(s.re, s.im))
                    .to_vec()
            })
            .collect();
        let found = follow(&map, &lists, (1.0, 0.0), &lists[20 * 40 + 39][0]);
        let known = found.iter().flatten().count();
        assert!(known > 1500, "{known}");
        let jumps = (0..1600)
            .filter(|k| k % 40 < 39)
            .filter(|&k| match (found[k], found[k + 1]) {
                (Some(a), Some(b)) => (a.s - b.s).norm() > 100.0,
                _ => false,
            })
            .count();
        // One cut from the meeting to the rim, at most.
        assert!(jumps <= 40, "{jumps}");
    }

    #[test]
    fn a_mode_that_leaves_the_window_is_not_replaced_by_another() {
        let map = plane(30, 1);
        let lists: Vec<Vec<Mode>> = (0..30)
            .map(|k| {
                let mut list = vec![mode(-50.0, 4000.0)];
                if k < 15 {
                    list.push(mode(20.0 * k as f64, 2000.0));
                }
                list
            })
            .collect();
        let found = follow(&map, &lists, (-1.0, 0.0), &lists[0][1]);
        assert!(found[..15].iter().all(|m| m.unwrap().s.im == 2000.0));
        assert!(found[15..].iter().all(Option::is_none));
    }
}
