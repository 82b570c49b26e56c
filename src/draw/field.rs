//! A sampled field between its samples.
//!
//! In a cell whose corners are known the value is a cubic in x on each row, then a cubic in y
//! through those: with differences `d0, d1` on either side of a sample, its slope is their mean,
//! held to three times the smaller, and 0 at an extremum (the monotonicity condition of Fritsch and
//! Carlson, 1980). The surface is exact at the samples, continuous across cells, and within a cell
//! stays in the range of its corners, so it shows no sign that none of them has. Positions are in
//! samples: (0, 0) is row 0, column 0. A field may be cut along seams between two
//! columns; beside one it is continued straight from its own side. Two samples say nothing of what lies between
//! them: along an axis of two, each stands for its half.

use super::cut::Seam;

/// Rows of samples, `None` where there is no value.
pub type Rows = [Vec<Option<f64>>];

/// A rectangular sampled field.
#[derive(Debug, Clone, Copy)]
pub struct Field<'a> {
    rows: &'a Rows,
    seams: &'a [Seam],
    /// Number of columns.
    pub columns: usize,
}

impl<'a> Field<'a> {
    /// Wraps rows of equal length.
    pub fn new(rows: &'a Rows) -> Self {
        Field {
            rows,
            seams: &[],
            columns: rows.first().map_or(0, Vec::len),
        }
    }

    /// Whether each sample stands for its half of the axis, along rows and along columns.
    pub fn halves(&self) -> (bool, bool) {
        (self.columns == 2, self.height() == 2)
    }

    /// The same field cut along seams: beside one a value comes from its own side alone.
    #[must_use]
    pub fn cut(mut self, seams: &'a [Seam]) -> Self {
        self.seams = seams;
        self
    }

    /// The seams between a column and the next that touch the rows of a cell.
    fn seams(&self, column: usize, row: usize) -> impl Iterator<Item = &'a Seam> {
        let (low, high) = (row as f64, row as f64 + 1.0);
        let touches = move |s: &&Seam| s.column == column && s.from.1 < high && s.to.1 > low;
        self.seams.iter().filter(touches)
    }

    /// Whether a seam passes between two column positions at one of two row positions.
    pub fn parted(&self, (u0, u1): (f64, f64), v: [f64; 2]) -> bool {
        let passes = |s: &Seam| {
            let between = |v| s.at(v).is_some_and(|u| u0 < u && u <= u1);
            v.into_iter().any(between)
        };
        self.seams.iter().any(passes)
    }

    /// Number of rows.
    pub fn height(&self) -> usize {
        self.rows.len()
    }

    /// The sample, if there is one.
    pub fn sample(&self, column: usize, row: usize) -> Option<f64> {
        self.rows.get(row)?.get(column).copied().flatten()
    }

    fn corners(&self, column: usize, row: usize) -> Option<[f64; 4]> {
        Some([
            self.sample(column, row)?,
            self.sample(column + 1, row)?,
            self.sample(column, row + 1)?,
            self.sample(column + 1, row + 1)?,
        ])
    }

    /// Least and largest corner of the cell above and right of a sample; `None` unless all four are
    /// known.
    pub fn cell_range(&self, column: usize, row: usize) -> Option<(f64, f64)> {
        let corners = self.corners(column, row)?;
        let low = corners.into_iter().fold(f64::INFINITY, f64::min);
        let high = corners.into_iter().fold(f64::NEG_INFINITY, f64::max);
        Some((low, high))
    }

    /// Value at column position `u` and row position `v`. Next to an absent sample the nearest
    /// sample decides whether there is a value, and the known corners give it.
    pub fn at(&self, u: f64, v: f64) -> Option<f64> {
        let own = |x: f64, half| if half { x.round() } else { x };
        let halves = self.halves();
        // Beside a seam a value is of its own side, wherever between the columns the seam lies.
        let cell = split(v, self.height()).0;
        let beside = self.seams(0, cell).any(|seam| seam.at(v).is_some());
        let u = own(u, halves.0 && !beside);
        let (column, s) = split(u, self.columns);
        let (row, t) = split(own(v, halves.1), self.height());
        if self.columns < 2 || self.height() < 2 {
            return self.along_line(column, s, row, t);
        }
        if self.corners(column, row).is_none() {
            return self.beside_hole(column, s, row, t);
        }
        if self.seams(column, row).next().is_some() {
            return self.beside_seam((column, s), (row, t), v);
        }
        let line = |r: usize| -> [f64; 4] {
            let p1 = self.sample(column, r);
            let p2 = self.sample(column + 1, r);
            // What lies beyond a seam beside the cell says nothing of slopes here.
            let whole = |c: &usize| self.seams(*c, row).next().is_none();
            let before = column.checked_sub(1).filter(whole);
            let after = Some(column + 1).filter(whole);
            let p0 = before.and_then(|c| self.sample(c, r));
            let p3 = after.and_then(|c| self.sample(c + 1, r));
            complete([p0, p1, p2, p3])
        };
        let known =
            |r: usize| self.sample(column, r).is_some() && self.sample(column + 1, r).is_some();
        let value = |r: usize| known(r).then(|| cubic(line(r), s));
        let below = row.checked_sub(1).and_then(value);
        let down = complete([below, value(row), value(row + 1), value(row + 2)]);
        Some(cubic(down, t))
    }

    fn along_line(&self, column: usize, s: f64, row: usize, t: f64) -> Option<f64> {
        let (a, w) = if self.columns >= 2 {
            ((column + 1, row), s)
        } else {
            ((column, row + 1), t)
        };
        match (self.sample(column, row), self.sample(a.0, a.1)) {
            (Some(p), Some(q)) => Some(p + w * (q - p)),
            (p, q) => {
                if w < 0.5 {
                    p
                } else {
                    q
                }
            }
        }
    }

    /// In a cell that a seam touches, whose corners are known: along each column the field goes on; where the seam
    /// passes, it is continued straight from the columns on the same side.
    fn beside_seam(
        &self,
        (column, s): (usize, f64),
        (row, t): (usize, f64),
        v: f64,
    ) -> Option<f64> {
        let along = |c: usize| {
            let below = row.checked_sub(1).and_then(|r| self.sample(c, r));
            let above = self.sample(c, row + 2);
            let own = [self.sample(c, row)?, self.sample(c, row + 1)?];
            Some(cubic(
                complete([below, Some(own[0]), Some(own[1]), above]),
                t,
            ))
        };
        let (left, right) = (along(column)?, along(column + 1)?);
        let Some(u) = self.seams(column, row).find_map(|seam| seam.at(v)) else {
            return Some(left + s * (right - left));
        };
        // The cell on the far side of a column, where no other seam parts it.
        let whole = |c: &usize| self.seams(*c, row).next().is_none();
        let (value, beyond, away) = if column as f64 + s < u {
            let cell = column.checked_sub(1).filter(whole);
            (left, cell.and_then(along), s)
        } else {
            let cell = Some(column + 1).filter(whole);
            (right, cell.and_then(|c| along(c + 1)), 1.0 - s)
        };
        Some(value + away * beyond.map_or(0.0, |b| value - b))
    }

    fn beside_hole(&self, column: usize, s: f64, row: usize, t: f64) -> Option<f64> {
        let nearest = (column + usize::from(s >= 0.5), row + usize::from(t >= 0.5));
        self.sample(nearest.0, nearest.1)?;
        let corners = [
            (self.sample(column, row), (1.0 - s) * (1.0 - t)),
            (self.sample(column + 1, row), s * (1.0 - t)),
            (self.sample(column, row + 1), (1.0 - s) * t),
            (self.sample(column + 1, row + 1), s * t),
        ];
        let (sum, weight) = corners
            .into_iter()
            .filter_map(|(value, w)| value.map(|v| (v * w, w)))
            .fold((0.0, 0.0), |(a, b), (v, w)| (a + v, b + w));
        Some(sum / weight)
    }
}

/// Whole and fractional part of a position among `n` samples, the whole part naming a cell.
fn split(position: f64, n: usize) -> (usize, f64) {
    let position = position.clamp(0.0, n.saturating_sub(1) as f64);
    let cell = (position.floor() as usize).min(n.saturating_sub(2));
    (cell, position - cell as f64)
}

/// Fills in absent outer points by continuing the line through the inner ones.
fn complete([p0, p1, p2, p3]: [Option<f64>; 4]) -> [f64; 4] {
    let p1 = p1.or(p2).unwrap_or(0.0);
    let p2 = p2.unwrap_or(p1);
    [
        p0.unwrap_or(2.0 * p1 - p2),
        p1,
        p2,
        p3.unwrap_or(2.0 * p2 - p1),
    ]
}

/// Slope at a sample from the differences before and after it.
fn slope(before: f64, after: f64) -> f64 {
    if before * after <= 0.0 {
        return 0.0;
    }
    let most = 3.0 * before.abs().min(after.abs());
    ((before + after) / 2.0).clamp(-most, most)
}

/// The Hermite cubic between `p1` and `p2`.
fn cubic([p0, p1, p2, p3]: [f64; 4], t: f64) -> f64 {
    let rise = p2 - p1;
    let (m1, m2) = (slope(p1 - p0, rise), slope(rise, p3 - p2));
    let value = p1 + t * (m1 + t * (3.0 * rise - 2.0 * m1 - m2 + t * (m1 + m2 - 2.0 * rise)));
    // Monotone up to rounding.
    value.clamp(p1.min(p2), p1.max(p2))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Two samples say nothing of what lies between them, cut apart or not.
    #[test]
    fn two_by_two_samples_with_a_cut_have_no_values_but_their_own() {
        let rows = [vec![Some(1.0), Some(20.0)], vec![Some(300.0), Some(4000.0)]];
        let seam = |from: (f64, f64), to: (f64, f64)| Seam {
            column: 0,
            from,
            to,
        };
        for seams in [
            vec![seam((0.3, 0.0), (0.3, 1.0))],
            vec![seam((0.3, 0.0), (0.7, 0.4))],
            vec![seam((0.8, 0.6), (0.8, 1.0))],
            vec![],
        ] {
            let field = Field::new(&rows).cut(&seams);
            for k in 0..=40 {
                for l in 0..=40 {
                    let (u, v) = (f64::from(k) / 40.0, f64::from(l) / 40.0);
                    let value = field.at(u, v).unwrap();
                    let row = &rows[v.round() as usize];
                    let border = seams.iter().find_map(|s| s.at(v)).unwrap_or(0.5);
                    assert_eq!(
                        Some(value),
                        row[usize::from(u >= border)],
                        "at {u}, {v}: {seams:?}"
                    );
                }
            }
        }
    }
}
