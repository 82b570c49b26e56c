//! Level lines by marching squares.
//!
//! A corner is *above* where its value is at least the level. A cell edge with one corner above is
//! crossed once, at `t = (level - a) / (b - a)`; the two crossings of a cell are joined, and where
//! there are four the mean of the corners decides how. Each edge has one crossing, so lines join
//! exactly, and they end only at the rim or at a cell left out.

use super::field::Field;

/// A level line in sample positions (column, row); closed where first and last point are equal.
pub type Line = Vec<(f64, f64)>;

/// Lines of `field` at `level`.
///
/// Each cell is divided into `fine` by `fine` parts along the field's own interpolation. A cell
/// with an absent corner has no lines, nor has one that a seam passes or for which `skip(column, row)` holds.
pub fn lines(
    field: &Field,
    level: f64,
    fine: usize,
    skip: impl Fn(usize, usize) -> bool,
) -> Vec<Line> {
    let fine = fine.max(1);
    if field.columns < 2 || field.height() < 2 {
        return Vec::new();
    }
    let nx = (field.columns - 1) * fine + 1;
    let ny = (field.height() - 1) * fine + 1;
    let mut links = Links::new(nx, ny);
    for row in 0..field.height() - 1 {
        for column in 0..field.columns - 1 {
            let Some((low, high)) = field.cell_range(column, row) else {
                continue;
            };
            // The interpolation stays within the corners, so other cells have no crossing.
            if low >= level || high < level || skip(column, row) {
                continue;
            }
            for j in row * fine..(row + 1) * fine {
                for i in column * fine..(column + 1) * fine {
                    links.cell(field, level, fine, i, j);
                }
            }
        }
    }
    links
        .join()
        .into_iter()
        .map(|line| smooth(line, fine))
        .collect()
}

fn smooth(line: Line, fine: usize) -> Line {
    let f = fine as f64;
    line.into_iter().map(|(x, y)| (x / f, y / f)).collect()
}

/// Crossings by edge: edges along x come first, then edges along y.
pub(super) struct Links {
    nx: usize,
    ny: usize,
    next: Vec<[usize; 2]>,
    at: Vec<(f64, f64)>,
}

const NONE: usize = usize::MAX;

impl Links {
    pub(super) fn new(nx: usize, ny: usize) -> Self {
        let edges = 2 * nx * ny;
        Links {
            nx,
            ny,
            next: vec![[NONE; 2]; edges],
            at: vec![(0.0, 0.0); edges],
        }
    }

    fn cell(&mut self, field: &Field, level: f64, fine: usize, i: usize, j: usize) {
        let f = fine as f64;
        let value = |i: usize, j: usize| {
            if fine == 1 {
                field.sample(i, j)
            } else {
                field.at(i as f64 / f, j as f64 / f)
            }
        };
        let ends = |k: usize| (k as f64 / f, (k + 1) as f64 / f);
        let (v0, v1) = ends(j);
        if field.parted(ends(i), [v0, v1]) {
            return;
        }
        let corners = (
            value(i, j),
            value(i + 1, j),
            value(i + 1, j + 1),
            value(i, j + 1),
        );
        let (Some(a), Some(b), Some(c), Some(d)) = corners else {
            return;
        };
        let along_y = self.nx * self.ny;
        let (x, y) = (i as f64, j as f64);
        // Where a sample stands for its half, the field steps in the middle.
        let halves = field.halves();
        let along = |half: bool, p: f64, q: f64| if half { 0.5 } else { (level - p) / (q - p) };
        let (cut_x, cut_y) = (
            |p: f64, q: f64| along(halves.0, p, q),
            |p: f64, q: f64| along(halves.1, p, q),
        );
        // Edges in order around the cell: bottom, right, top, left.
        let edges = [
            (a, b, j * self.nx + i, (x + cut_x(a, b), y)),
            (
                b,
                c,
                along_y + j * self.nx + i + 1,
                (x + 1.0, y + cut_y(b, c)),
            ),
            (d, c, (j + 1) * self.nx + i, (x + cut_x(d, c), y + 1.0)),
            (a, d, along_y + j * self.nx + i, (x, y + cut_y(a, d))),
        ];
        let crossed: Vec<(usize, (f64, f64))> = edges
            .into_iter()
            .filter(|(p, q, ..)| (*p >= level) != (*q >= level))
            .map(|(_, _, edge, at)| (edge, at))
            .collect();
        match *crossed.as_slice() {
            [p, q] => self.link(p, q),
            [bottom, right, top, left] => {
                let centre_above = (a + b + c + d) / 4.0 >= level;
                // Keep the corner on the other side of the centre on its own.
                if centre_above == (a >= level) {
                    self.link(bottom, right);
                    self.link(top, left);
                } else {
                    self.link(bottom, left);
                    self.link(right, top);
                }
            }
            _ => {}
        }
    }

    pub(super) fn link(&mut self, (p, at_p): (usize, (f64, f64)), (q, at_q): (usize, (f64, f64))) {
        for (edge, at, other) in [(p, at_p, q), (q, at_q, p)] {
            if let Some(slot) = self.at.get_mut(edge) {
                *slot = at;
            }
            if let Some([first, second]) = self.next.get_mut(edge) {
                if *first == NONE {
                    *first = other
                } else {
                    *second = other
                }
            }
        }
    }

    /// Open lines first, from their ends, then loops.
    pub(super) fn join(self) -> Vec<Line> {
        let mut done = vec![false; self.next.len()];
        let mut out = Vec::new();
        for open in [true, false] {
            for start in 0..self.next.len() {
                let ends = self.next.get(start).copied().unwrap_or([NONE; 2]);
                let fits = if open {
                    ends[0] != NONE && ends[1] == NONE
                } else {
                    ends[1] != NONE
                };
                if !fits || done.get(start) != Some(&false) {
                    continue;
                }
                out.push(self.follow(start, &mut done));
            }
        }
        out
    }

    fn follow(&self, start: usize, done: &mut [bool]) -> Line {
        let mut line = Line::new();
        let mut here = start;
        loop {
            if let Some(mark) = done.get_mut(here) {
                *mark = true;
            }
            line.extend(self.at.get(here));
            let ends = self.next.get(here).copied().unwrap_or([NONE; 2]);
            let fresh = |&e: &usize| done.get(e) == Some(&false);
            match ends.into_iter().find(fresh) {
                Some(next) => here = next,
                None => {
                    if ends.contains(&start) && here != start && line.len() > 2 {
                        line.extend(self.at.get(start));
                    }
                    return line;
                }
            }
        }
    }
}

/// Drops points that lie within `tolerance` of the line through their neighbours (Ramer 1972,
/// Douglas and Peucker 1973), without recursion.
pub fn simplify(line: &[(f64, f64)], tolerance: f64) -> Line {
    let last = line.len().saturating_sub(1);
    let mut keep = vec![false; line.len()];
    let mut stack = vec![(0, last)];
    while let Some((a, b)) = stack.pop() {
        for end in [a, b] {
            if let Some(k) = keep.get_mut(end) {
                *k = true;
            }
        }
        let (Some(&p), Some(&q)) = (line.get(a), line.get(b)) else {
            continue;
        };
        let farthest = (a + 1..b)
            .filter_map(|i| line.get(i).map(|&r| (i, distance(r, p, q))))
            .fold((0, 0.0), |best, d| if d.1 > best.1 { d } else { best });
        if farthest.1 > tolerance {
            stack.push((a, farthest.0));
            stack.push((farthest.0, b));
        }
    }
    line.iter()
        .zip(keep)
        .filter_map(|(&p, k)| k.then_some(p))
        .collect()
}

fn distance(r: (f64, f64), p: (f64, f64), q: (f64, f64)) -> f64 {
    let (dx, dy) = (q.0 - p.0, q.1 - p.1);
    let length = dx * dx + dy * dy;
    let along = |u: f64| (r.0 - p.0 - u * dx).hypot(r.1 - p.1 - u * dy);
    if length == 0.0 {
        return along(0.0);
    }
    along((((r.0 - p.0) * dx + (r.1 - p.1) * dy) / length).clamp(0.0, 1.0))
}
