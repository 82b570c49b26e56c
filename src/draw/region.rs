//! Outlines of marked samples: the union of their cells, each reaching half-way to its neighbours.

use std::collections::BTreeMap;

/// Closed outlines, in half steps: corner (i, j) lies between samples i-1 and i, j-1 and j.
/// Outer rims and holes run in opposite senses.
pub(super) fn outlines(
    columns: usize,
    rows: usize,
    marked: impl Fn(usize, usize) -> bool,
) -> Vec<Vec<(usize, usize)>> {
    let inside = |i: Option<usize>, j: Option<usize>| match (i, j) {
        (Some(i), Some(j)) => i < columns && j < rows && marked(i, j),
        _ => false,
    };
    // Rim edges, directed with the marked cell on the left (rows counted upwards).
    let mut from: BTreeMap<(usize, usize), Vec<(usize, usize)>> = BTreeMap::new();
    for j in 0..rows {
        for i in 0..columns {
            if !marked(i, j) {
                continue;
            }
            let corners = [(i, j), (i + 1, j), (i + 1, j + 1), (i, j + 1)];
            let outside = [
                !inside(Some(i), j.checked_sub(1)),
                !inside(Some(i + 1), Some(j)),
                !inside(Some(i), Some(j + 1)),
                !inside(i.checked_sub(1), Some(j)),
            ];
            let ends = corners.into_iter().cycle().skip(1);
            for ((a, b), open) in corners.into_iter().zip(ends).zip(outside) {
                if open {
                    from.entry(a).or_default().push(b);
                }
            }
        }
    }
    let mut out = Vec::new();
    while let Some((&start, _)) = from.iter().next() {
        out.push(trace(&mut from, start));
    }
    out
}

fn trace(
    from: &mut BTreeMap<(usize, usize), Vec<(usize, usize)>>,
    start: (usize, usize),
) -> Vec<(usize, usize)> {
    let mut rim = vec![start];
    let mut here = start;
    let mut heading = (0i64, 0i64);
    while let Some(ends) = from.get_mut(&here) {
        // Where two cells touch at a corner, turn left: they stay separate outlines.
        let turn = |&(_, &e): &(usize, &(usize, usize))| {
            let d = step(here, e);
            heading.1 * d.0 - heading.0 * d.1
        };
        let pick = ends
            .iter()
            .enumerate()
            .min_by_key(turn)
            .map_or(0, |(k, _)| k);
        let next = ends.swap_remove(pick);
        if ends.is_empty() {
            from.remove(&here);
        }
        let d = step(here, next);
        if d == heading {
            rim.pop();
        }
        rim.push(next);
        heading = d;
        here = next;
        if here == start {
            break;
        }
    }
    rim.pop();
    rim
}

fn step(a: (usize, usize), b: (usize, usize)) -> (i64, i64) {
    (b.0 as i64 - a.0 as i64, b.1 as i64 - a.1 as i64)
}
