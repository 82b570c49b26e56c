//! The slow witness: zeros of `det A(s)`, `A` the global matrix, by Gaussian elimination at every point
//! and by the change of its phase between points that lie close (argument principle). Nothing here
//! uses the characteristic function, its bounds, its derivatives or its compiled program.

use std::f64::consts::{FRAC_PI_4, PI, TAU};

use num_complex::Complex64;
use stillflame::acoustics::matrix;
use stillflame::waves::law::Law;
use stillflame::waves::primitive::{Chain, Step};

/// `det A(s)` as a number of modulus one and the logarithm of its modulus; `None` where it is zero or not
/// finite.
pub fn determinant(chain: &Chain<f64>, s: Complex64) -> Option<(Complex64, f64)> {
    let a = matrix::assemble(chain, s);
    let n = a.nrows();
    let is_entry = |x: &Complex64| x.re != 0.0 || x.im != 0.0;
    // Most of the matrix is empty: each row with the place behind its last entry.
    let mut rows: Vec<(usize, Vec<Complex64>)> = Vec::with_capacity(n);
    let mut log = 0.0;
    for i in 0..n {
        let mut row: Vec<Complex64> = a.row(i).iter().copied().collect();
        // Pivots are compared between rows of unit size.
        let size = row.iter().map(|x| x.norm()).fold(0.0, f64::max);
        row.iter_mut().for_each(|x| *x /= size);
        log += size.ln();
        let end = row.iter().rposition(is_entry).map_or(0, |last| last + 1);
        rows.push((end, row));
    }
    let mut phase = Complex64::new(1.0, 0.0);
    for k in 0..n {
        let size = |i: usize| rows[i].1[k].norm_sqr();
        let pivot = (k..n).fold(k, |best, i| if size(i) > size(best) { i } else { best });
        if pivot != k {
            rows.swap(pivot, k);
            phase = -phase;
        }
        let (done, rest) = rows.split_at_mut(k + 1);
        let (end, upper) = &done[k];
        let head = upper[k];
        phase *= head / head.norm();
        log += head.norm().ln();
        if !(phase.is_finite() && log.is_finite()) {
            return None;
        }
        for (last, row) in rest {
            if is_entry(&row[k]) {
                let factor = row[k] / head;
                for (x, u) in row[k + 1..*end].iter_mut().zip(&upper[k + 1..*end]) {
                    *x -= factor * u;
                }
                *last = (*last).max(*end);
            }
        }
    }
    Some((phase / phase.norm(), log))
}

/// A delay no product in the determinant exceeds (s): its reciprocal is how finely to look.
pub fn longest_delay(chain: &Chain<f64>) -> f64 {
    let of_law = |law: &Law<f64>| match law {
        Law::Delays(d) => d.iter().map(|d| d.delay + d.spread).fold(0.0, f64::max),
        Law::Polynomial { delay, .. } | Law::Complex { delay, .. } => *delay,
    };
    let of_step = |step: &Step<f64>| match step {
        Step::Travel(t) => t.downstream + t.upstream + t.entropy.as_ref().map_or(0.0, of_law),
        Step::Joint(j) => j.terms.iter().map(|t| of_law(&t.law)).fold(0.0, f64::max),
    };
    chain.steps.iter().map(of_step).sum()
}

/// A walk along straight lines.
pub struct Walk<'c> {
    pub chain: &'c Chain<f64>,
    /// Greatest distance between points.
    pub step: f64,
    /// Determinants so far.
    pub looks: usize,
}

impl Walk<'_> {
    fn look(&mut self, s: Complex64) -> Option<Complex64> {
        self.looks += 1;
        determinant(self.chain, s).map(|(phase, _)| phase)
    }

    /// Change of phase (rad) along a polygon.
    pub fn along(&mut self, corners: &[Complex64]) -> Option<f64> {
        let mut turned = 0.0;
        let mut here = self.look(corners[0])?;
        for pair in corners.windows(2) {
            let parts = ((pair[1] - pair[0]).norm() / self.step).ceil().max(1.0);
            let at = |i: f64| pair[0] + (pair[1] - pair[0]) * (i / parts);
            for i in 0..parts as usize {
                let (a, b) = (at(i as f64), at(i as f64 + 1.0));
                let next = self.look(b)?;
                turned += self.between(a, here, b, next, 0)?;
                here = next;
            }
        }
        Some(turned)
    }

    fn between(
        &mut self,
        a: Complex64,
        at_a: Complex64,
        b: Complex64,
        at_b: Complex64,
        depth: usize,
    ) -> Option<f64> {
        let turn = (at_b * at_a.conj()).arg();
        if turn.abs() < FRAC_PI_4 {
            return Some(turn);
        }
        if depth > 40 {
            return None;
        }
        let middle = (a + b) * 0.5;
        let at_middle = self.look(middle)?;
        Some(
            self.between(a, at_a, middle, at_middle, depth + 1)?
                + self.between(middle, at_middle, b, at_b, depth + 1)?,
        )
    }

    /// Number of zeros in the window: with a mirror image below the real axis, where `mirrored`, of
    /// which it is the upper half.
    pub fn count(&mut self, growth: (f64, f64), omega: (f64, f64), mirrored: bool) -> Option<i64> {
        let at = Complex64::new;
        let around = [
            at(growth.1, omega.0),
            at(growth.1, omega.1),
            at(growth.0, omega.1),
            at(growth.0, omega.0),
            at(growth.1, omega.0),
        ];
        let (corners, unit) = if mirrored {
            (&around[..4], PI)
        } else {
            (&around[..], TAU)
        };
        whole(self.along(corners)? / unit)
    }

    /// Distance from `centre` to the only zero of the determinant in a circle about it, with what
    /// rounding leaves open of it. `None` where its linear part does not outweigh the rest, so that it
    /// holds no zero or several.
    pub fn off_by(&mut self, centre: Complex64, radius: f64) -> Option<(f64, f64)> {
        const POINTS: usize = 16;
        self.looks += POINTS;
        let turn = |i: usize| Complex64::from_polar(1.0, TAU * (i % POINTS) as f64 / POINTS as f64);
        let look = |i| determinant(self.chain, centre + radius * turn(i));
        let seen: Option<Vec<(Complex64, f64)>> = (0..POINTS).map(look).collect();
        let seen = seen?;
        // Fourier coefficients: what is beyond the third is rounding.
        let values = seen
            .iter()
            .map(|(phase, log)| phase * (log - seen[0].1).exp());
        let values: Vec<Complex64> = values.collect();
        let coefficient = |k: usize| {
            let sum: Complex64 = (0..POINTS).map(|i| values[i] * turn(i * k).conj()).sum();
            (sum / POINTS as f64).norm()
        };
        let c: Vec<f64> = (0..POINTS).map(coefficient).collect();
        let noise = c[4..].iter().fold(0.0, |a: f64, &b| a.max(b));
        let outweighs = c[1] > 2.0 * (c[0] + c[2] + c[3] + 12.0 * noise);
        outweighs.then_some((radius * c[0] / c[1], radius * noise / c[1]))
    }
}

fn whole(x: f64) -> Option<i64> {
    ((x - x.round()).abs() < 0.02).then_some(x.round() as i64)
}
