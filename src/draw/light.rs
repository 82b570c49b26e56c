//! Drawings kept light: what is too fine for its figure is drawn coarser.
//!
//! A curve that turns a thousand times across a plot, or ten thousand dots on it, are more than a page resolves. A
//! *drawing* here is a function of its coarseness, from 1 up; the finest that fits its share of the figure is taken.

use std::cell::Cell;
use std::collections::BTreeSet;

use super::contour::simplify;
use super::mark::Spot;
use super::svg::{Point, Svg, open_path, px};

/// The coarsest drawing: strokes are shifted by no more than a few px.
const COARSEST: f64 = 64.0;

/// The finest of ever coarser drawings that is no longer than `most` bytes, or the coarsest of all.
pub(super) fn within(most: usize, draw: impl Fn(f64) -> String) -> String {
    let mut coarseness = 1.0;
    loop {
        let data = draw(coarseness);
        if data.len() <= most || coarseness >= COARSEST {
            return data;
        }
        coarseness *= 2.0_f64.sqrt();
    }
}

/// Path data of open lines. Lines that even with vertices shifted by a px or two are too many become dots along them.
pub(super) fn curves(curves: &[Vec<Point>], tolerance: f64, most: usize) -> String {
    const SHIFT: f64 = 2.0;
    within(most, |coarseness| {
        let shift = tolerance * coarseness;
        if shift > SHIFT {
            let all: Vec<Point> = curves.iter().flat_map(|c| along(c, 4.0)).collect();
            return dotted(&all, 4.0 * shift / SHIFT);
        }
        let data = curves.iter().map(|c| match simplify(c, shift).as_slice() {
            [] => String::new(),
            [(x, y)] => format!("M{} {}h.1", px(*x), px(*y)),
            many => open_path(many),
        });
        data.collect()
    })
}

/// Points no farther apart than `gap` along a line.
fn along(line: &[Point], gap: f64) -> Vec<Point> {
    let steps = line.windows(2).flat_map(|w| {
        let &[a, b] = w else { return Vec::new() };
        let n = ((b.0 - a.0).hypot(b.1 - a.1) / gap).ceil().max(1.0);
        let at = |k: usize| {
            (
                a.0 + (b.0 - a.0) * k as f64 / n,
                a.1 + (b.1 - a.1) * k as f64 / n,
            )
        };
        (0..n as usize).map(at).collect()
    });
    steps.chain(line.last().copied()).collect()
}

/// Path data of dots, for round caps: one for each cell of a grid of so many px that holds any, a stroke where cells
/// below each other do.
fn dotted(points: &[Point], grid: f64) -> String {
    let cell = |&(x, y): &Point| ((x / grid).floor() as i64, (y / grid).floor() as i64);
    let cells: BTreeSet<(i64, i64)> = points.iter().map(cell).collect();
    let bounds = |of: fn(&Point) -> f64| {
        let all = points.iter().map(of);
        all.fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), v| {
            (a.min(v), b.max(v))
        })
    };
    let (across, down) = (bounds(|p| p.0), bounds(|p| p.1));
    // In tenths, so that relative steps add up without drift.
    let tenths = |k: i64, (low, high): (f64, f64)| {
        let centre = (k as f64 + 0.5) * grid;
        (10.0 * centre.max(low).min(high)).round()
    };
    let mut runs: Vec<(i64, i64, i64)> = Vec::new();
    for (i, j) in cells {
        match runs.last_mut() {
            Some((column, _, end)) if *column == i && *end + 1 == j => *end = j,
            _ => runs.push((i, j, j)),
        }
    }
    let mut data = String::new();
    let mut last: Option<(i64, f64)> = None;
    for (i, first, end) in runs {
        let (y, until) = (tenths(first, down), tenths(end, down));
        data += &match last {
            Some((column, at)) if column == i => format!("m0 {}", px((y - at) / 10.0)),
            _ => format!("M{} {}", px(tenths(i, across) / 10.0), px(y / 10.0)),
        };
        data += &match until > y {
            true => format!("v{}", px((until - y) / 10.0)),
            false => "h0".to_owned(),
        };
        last = Some((i, until));
    }
    data
}

/// Draws dots of a colour and a width, wider where they stand for many.
pub(super) fn dots(svg: &mut Svg, points: &[Point], (colour, width): (&str, f64), most: usize) {
    let grid = Cell::new(width);
    let data = within(most, |coarseness| {
        grid.set(0.6 * width * coarseness);
        dotted(points, grid.get())
    });
    svg.path(&data, &dot_style(colour, width.max(0.3 * grid.get())));
}

/// How dots are drawn.
pub(super) fn dot_style(colour: &str, width: f64) -> String {
    format!(
        "fill=\"none\" stroke=\"{colour}\" stroke-width=\"{}\" stroke-linecap=\"round\"",
        px(width)
    )
}

/// No more marks than `most`: where there are more, none near another of its kind.
pub(super) fn spots<'s>(
    spots: impl Iterator<Item = &'s Spot>,
    most: usize,
    place: impl Fn(&Spot) -> Point,
) -> Vec<&'s Spot> {
    let all: Vec<&Spot> = spots.collect();
    let mut kept = all.clone();
    let mut apart = 3.0;
    while kept.len() > most {
        kept.clear();
        for spot in &all {
            let (x, y) = place(spot);
            let near = |other: &&&Spot| {
                let (u, v) = place(other);
                other.mark == spot.mark && (x - u).hypot(y - v) < apart
            };
            if !kept.iter().any(|s| near(&s)) {
                kept.push(*spot);
            }
        }
        apart *= 1.3;
    }
    kept
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::draw::mark::Mark;

    fn waves(turns: f64) -> Vec<Vec<Point>> {
        let curve = |k: usize| {
            let at = |i: u32| {
                let x = f64::from(i) * 0.3;
                (x, 100.0 + k as f64 + 90.0 * (turns * x).sin())
            };
            (0..2000).map(at).collect()
        };
        (0..40).map(curve).collect()
    }

    #[test]
    fn what_fits_is_drawn_as_it_is() {
        let lines = vec![vec![(1.0, 2.0), (3.0, 4.0), (5.0, 9.0)], vec![(7.0, 7.0)]];
        assert_eq!(curves(&lines, 0.05, 1000), "M1 2l2 2 2 5M7 7h.1");
        assert_eq!(
            dotted(&[(1.0, 1.0), (1.2, 1.2), (1.0, 5.0)], 2.0),
            "M1 1h0m0 4h0"
        );
    }

    #[test]
    fn a_drawing_never_outgrows_its_share() {
        for turns in [0.01, 0.3, 5.0] {
            for most in [4000, 12_000, 40_000] {
                let data = curves(&waves(turns), 0.05, most);
                assert!(
                    !data.is_empty() && data.len() <= most,
                    "{turns}: {}",
                    data.len()
                );
            }
        }
        let many: Vec<Spot> = (0..5000)
            .map(|k| Spot {
                x: f64::from(k % 100),
                y: f64::from(k / 100),
                mark: if k % 2 == 0 {
                    Mark::Circle
                } else {
                    Mark::Cross
                },
                style: None,
                label: String::new(),
            })
            .collect();
        let kept = spots(many.iter(), 60, |s| (6.0 * s.x, 4.0 * s.y));
        assert!((20..=60).contains(&kept.len()), "{}", kept.len());
        assert_eq!(spots(many.iter().take(60), 60, |s| (s.x, s.y)).len(), 60);
    }
}
