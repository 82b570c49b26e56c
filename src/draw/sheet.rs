//! The samples of a map laid out on its plot.
//!
//! A map with a single sample along an axis is spread over that axis: see [`Sheet::new`].

use super::axis::Span;
use super::map::StabilityMap;
use super::region;
use super::svg::{Point, Rect, closed_path, open_path};

pub(super) fn ends(samples: &[f64]) -> (f64, f64) {
    (
        samples.first().copied().unwrap_or(0.0),
        samples.last().copied().unwrap_or(1.0),
    )
}

/// The samples laid out on the plot.
pub(super) struct Sheet {
    pub plot: Rect,
    pub x: Span,
    pub y: Span,
    pub columns: Vec<f64>,
    pub rows: Vec<f64>,
}

impl Sheet {
    pub fn new(map: &StabilityMap, plot: Rect) -> Self {
        let (x0, x1) = ends(&map.x_values);
        let (y0, y1) = ends(&map.y_values);
        let x = Span::new(x0, x1, map.x.scale, plot.left, plot.right);
        let y = Span::new(y0, y1, map.y.scale, plot.bottom, plot.top);
        // A lone sample stands for the whole axis; its row or column comes doubled.
        let nodes = |values: &[f64], span: &Span, start: f64, end: f64| match values {
            [_] => vec![start, end],
            many => many.iter().map(|&v| span.at(v)).collect(),
        };
        let columns = nodes(&map.x_values, &x, plot.left, plot.right);
        let rows = nodes(&map.y_values, &y, plot.bottom, plot.top);
        Sheet {
            plot,
            x,
            y,
            columns,
            rows,
        }
    }

    /// px of a position in samples.
    pub fn place(&self, (u, v): (f64, f64)) -> Point {
        (along(&self.columns, u), along(&self.rows, v))
    }

    /// Column and row of the sample nearest to a point of the plot.
    pub fn nearest(&self, (x, y): Point) -> (usize, usize) {
        let nearest = |nodes: &[f64], at: f64| index_of(nodes, at).round() as usize;
        (nearest(&self.columns, x), nearest(&self.rows, y))
    }

    pub fn place_all(&self, line: &[(f64, f64)]) -> Vec<Point> {
        line.iter().map(|&p| self.place(p)).collect()
    }

    /// Outline of the cells of marked samples, as path data. A spot too small to show its fill is
    /// drawn larger, and where `struck` with a stroke across it, since hatching may miss it.
    pub fn outline(&self, marked: impl Fn(usize, usize) -> bool, struck: bool) -> String {
        const SMALLEST: f64 = 6.0;
        let x = |i: usize| corner(&self.columns, i, self.plot.left, self.plot.right);
        let y = |j: usize| corner(&self.rows, j, self.plot.bottom, self.plot.top);
        let rims = region::outlines(self.columns.len(), self.rows.len(), marked);
        let mut data = String::new();
        for rim in rims {
            let points: Vec<Point> = rim.iter().map(|&(i, j)| (x(i), y(j))).collect();
            let bounds = bounds(&points);
            if bounds.width() < SMALLEST && bounds.height() < SMALLEST {
                let (cx, cy) = (
                    (bounds.left + bounds.right) / 2.0,
                    (bounds.top + bounds.bottom) / 2.0,
                );
                let half = SMALLEST / 2.0;
                let cx = cx.clamp(self.plot.left + half, self.plot.right - half);
                let cy = cy.clamp(self.plot.top + half, self.plot.bottom - half);
                let spot = Rect {
                    left: cx,
                    top: cy,
                    right: cx,
                    bottom: cy,
                }
                .grown(half);
                data += &spot.path();
                if struck {
                    data += &open_path(&[(spot.left, spot.top), (spot.right, spot.bottom)]);
                }
            } else {
                data += &closed_path(&points);
            }
        }
        data
    }
}

fn bounds(points: &[Point]) -> Rect {
    let empty = Rect {
        left: f64::INFINITY,
        top: f64::INFINITY,
        right: f64::NEG_INFINITY,
        bottom: f64::NEG_INFINITY,
    };
    points.iter().fold(empty, |r, p| Rect {
        left: r.left.min(p.0),
        top: r.top.min(p.1),
        right: r.right.max(p.0),
        bottom: r.bottom.max(p.1),
    })
}

/// Value of `nodes` at a fractional index.
fn along(nodes: &[f64], u: f64) -> f64 {
    let k = (u.max(0.0).floor() as usize).min(nodes.len().saturating_sub(1));
    match (nodes.get(k), nodes.get(k + 1)) {
        (Some(a), Some(b)) => a + (u - k as f64) * (b - a),
        (Some(a), None) => *a,
        _ => 0.0,
    }
}

/// Fractional index at which monotone `nodes` take `value`.
pub(super) fn index_of(nodes: &[f64], value: f64) -> f64 {
    let rising = nodes.first() <= nodes.last();
    let k = nodes.partition_point(|&n| if rising { n <= value } else { n >= value });
    let k = k.clamp(1, nodes.len().max(2) - 1);
    match (nodes.get(k - 1), nodes.get(k)) {
        (Some(a), Some(b)) => (k - 1) as f64 + ((value - a) / (b - a)).clamp(0.0, 1.0),
        _ => 0.0,
    }
}

/// px of cell corner `i`, half-way between samples `i - 1` and `i`.
pub(super) fn corner(nodes: &[f64], i: usize, start: f64, end: f64) -> f64 {
    match (i.checked_sub(1).and_then(|k| nodes.get(k)), nodes.get(i)) {
        (Some(a), Some(b)) => (a + b) / 2.0,
        (None, _) => start,
        (_, None) => end,
    }
}
