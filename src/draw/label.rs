//! Where a label may stand: along a line, or beside a point.

use super::svg::{Point, Rect};

/// A place on a line: the stretch of it to leave out, and the text's centre and turn.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Place {
    pub from: f64,
    pub to: f64,
    pub centre: Point,
    /// Clockwise, degrees, in -90..=90.
    pub turn: f64,
    pub bounds: Rect,
}

/// A polyline with its running length.
pub(super) struct Measured<'a> {
    points: &'a [Point],
    length: Vec<f64>,
}

impl<'a> Measured<'a> {
    pub fn new(points: &'a [Point]) -> Self {
        let mut length = Vec::with_capacity(points.len());
        let mut sum = 0.0;
        let mut last = points.first().copied();
        for &p in points {
            if let Some(q) = last {
                sum += (p.0 - q.0).hypot(p.1 - q.1);
            }
            length.push(sum);
            last = Some(p);
        }
        Measured { points, length }
    }

    pub fn total(&self) -> f64 {
        self.length.last().copied().unwrap_or(0.0)
    }

    /// The point a given length along the line.
    pub fn at(&self, s: f64) -> Point {
        let k = self
            .length
            .partition_point(|&l| l < s)
            .clamp(1, self.points.len().max(2) - 1);
        let ends = (self.points.get(k - 1), self.points.get(k));
        let (Some(&p), Some(&q)) = ends else {
            return self.points.first().copied().unwrap_or((0.0, 0.0));
        };
        let (a, b) = match (self.length.get(k - 1), self.length.get(k)) {
            (Some(&a), Some(&b)) => (a, b),
            _ => (0.0, 0.0),
        };
        let t = if b > a {
            ((s - a) / (b - a)).clamp(0.0, 1.0)
        } else {
            0.0
        };
        (p.0 + t * (q.0 - p.0), p.1 + t * (q.1 - p.1))
    }

    /// The line between two lengths.
    pub fn stretch(&self, from: f64, to: f64) -> Vec<Point> {
        let inner = self.points.iter().zip(&self.length);
        let inner = inner
            .filter(|(_, l)| (from..=to).contains(*l))
            .map(|(p, _)| *p);
        std::iter::once(self.at(from))
            .chain(inner)
            .chain([self.at(to)])
            .collect()
    }

    /// The line with the given places left out; places must be in order and apart.
    pub fn without(&self, places: &[Place]) -> Vec<Vec<Point>> {
        let mut out = Vec::new();
        let mut from = 0.0;
        for place in places {
            out.push(self.stretch(from, place.from));
            from = place.to;
        }
        out.push(self.stretch(from, self.total()));
        out
    }
}

/// Most of the other points that a label may cover, for each px of its width.
const MOST_CROWDED: f64 = 0.4;

/// The best place for a label of `width` by `height` on the stretch `from..to` of a line: straight,
/// near level, inside `frame`, clear of `taken`, with few of `others`' points under it.
pub(super) fn on_line(
    line: &Measured,
    (from, to): (f64, f64),
    (width, height): (f64, f64),
    frame: Rect,
    taken: &[Rect],
    others: &dyn Fn(Rect) -> usize,
) -> Option<Place> {
    let half = width / 2.0 + 3.0;
    let middle = (from + to) / 2.0;
    let steps = ((to - from - 2.0 * half) / 6.0).floor();
    if steps < 1.0 {
        return None;
    }
    let mut best: Option<(f64, Place)> = None;
    for k in 0..=(steps as usize) {
        let s = from + half + 6.0 * k as f64;
        let (a, b, centre) = (line.at(s - half), line.at(s + half), line.at(s));
        let chord = (b.0 - a.0).hypot(b.1 - a.1);
        let bend = 1.0 - chord / (2.0 * half);
        let (a, b) = if a.0 <= b.0 { (a, b) } else { (b, a) };
        let turn = (b.1 - a.1).atan2(b.0 - a.0);
        if bend > 0.03 || turn.abs() > 1.45 {
            continue;
        }
        let centre = (
            (centre.0 + (a.0 + b.0) / 2.0) / 2.0,
            (centre.1 + (a.1 + b.1) / 2.0) / 2.0,
        );
        let bounds = turned_bounds(centre, width + 2.0, height, turn);
        if !frame.holds(bounds) || taken.iter().any(|t| t.overlaps(bounds)) {
            continue;
        }
        let crowd = others(bounds);
        if crowd as f64 > MOST_CROWDED * width {
            continue;
        }
        let score = 20.0 * bend
            + 0.4 * turn.abs()
            + 0.5 * crowd as f64
            + 0.3 * (s - middle).abs() / (to - from);
        if best.is_none_or(|(s, _)| score < s) {
            let place = Place {
                from: s - half,
                to: s + half,
                centre,
                turn: turn.to_degrees(),
                bounds,
            };
            best = Some((score, place));
        }
    }
    best.map(|(_, place)| place)
}

fn turned_bounds((x, y): Point, width: f64, height: f64, turn: f64) -> Rect {
    let (s, c) = (turn.sin().abs(), turn.cos().abs());
    let (w, h) = (
        (width * c + height * s) / 2.0,
        (width * s + height * c) / 2.0,
    );
    Rect {
        left: x - w,
        top: y - h,
        right: x + w,
        bottom: y + h,
    }
}

/// The box for a label of `width` by `height` beside a point, `gap` away from it: the first of
/// eight directions that stays inside `frame` and covers fewest of `others`' points, or else the
/// nearest box inside the frame.
pub(super) fn beside(
    (x, y): Point,
    (width, height): (f64, f64),
    gap: f64,
    frame: Rect,
    others: &dyn Fn(Rect) -> usize,
) -> Rect {
    let boxed = |left: f64, top: f64| Rect {
        left,
        top,
        right: left + width,
        bottom: top + height,
    };
    let d = 0.7 * gap;
    let all = [
        boxed(x + d, y - d - height),
        boxed(x + gap, y - height / 2.0),
        boxed(x + d, y + d),
        boxed(x - d - width, y - d - height),
        boxed(x - gap - width, y - height / 2.0),
        boxed(x - d - width, y + d),
        boxed(x - width / 2.0, y - gap - height),
        boxed(x - width / 2.0, y + gap),
    ];
    let inside = all.into_iter().filter(|b| frame.holds(*b));
    inside.min_by_key(|b| others(*b)).unwrap_or_else(|| {
        let left = (x - width / 2.0).clamp(frame.left, (frame.right - width).max(frame.left));
        let above = y - gap - height;
        let top = if above >= frame.top { above } else { y + gap };
        boxed(left, top)
    })
}
