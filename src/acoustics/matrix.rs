//! The global matrix `A(s)` of a chain, in which nothing is eliminated: the slow witness of the
//! characteristic function, and the source of mode shapes.
//!
//! Unknowns: `(p+, p-, e)` at every plane. Rows: two conditions of the start, three of each step, one
//! of the end. A distance is written `p+_2 = exp(-s t+) p+_1`, `exp(-s t-) p-_2 = p-_1`.

use nalgebra::{DMatrix, DVector};
use num_complex::Complex64;

use crate::waves::complex::Cx;
use crate::waves::law::{Law, point_delay};
use crate::waves::primitive::{Chain, Step};

fn value(law: &Law<f64>, s: Complex64) -> Complex64 {
    let [f]: [Cx<f64>; 1] = law.taylor(Cx::constant(s));
    f.value()
}

fn delay(t: f64, s: Complex64) -> Complex64 {
    let [e]: [Cx<f64>; 1] = point_delay(Cx::constant(s), t);
    e.value()
}

/// The matrix at `s`; square, of three times the number of planes.
pub fn assemble(chain: &Chain<f64>, s: Complex64) -> DMatrix<Complex64> {
    let n = 3 * chain.planes();
    let mut a = DMatrix::zeros(n, n);
    let mut add = |row: usize, plane: usize, coefficients: [Complex64; 3]| {
        for (i, c) in coefficients.into_iter().enumerate() {
            a[(row, 3 * plane + i)] += c;
        }
    };
    let real = |row: &[f64; 3]| row.map(|x| Complex64::new(x, 0.0));
    let start = &chain.start;
    add(0, 0, real(&start.rows[0]));
    add(1, 0, real(&start.rows[1]));
    if let Some((law, sense)) = &start.term {
        let f = value(law, s);
        add(0, 0, sense.map(|x| f * x));
    }
    let (zero, one) = (Complex64::new(0.0, 0.0), Complex64::new(1.0, 0.0));
    for (j, step) in chain.steps.iter().enumerate() {
        let row = 2 + 3 * j;
        match step {
            Step::Travel(t) => {
                add(row, j, [-delay(t.downstream, s), zero, zero]);
                add(row, j + 1, [one, zero, zero]);
                add(row + 1, j, [zero, -one, zero]);
                add(row + 1, j + 1, [zero, delay(t.upstream, s), zero]);
                if let Some(law) = &t.entropy {
                    add(row + 2, j, [zero, zero, -value(law, s)]);
                }
                add(row + 2, j + 1, [zero, zero, one]);
            }
            Step::Joint(joint) => {
                for i in 0..3 {
                    add(row + i, j, real(&joint.up[i]));
                    add(row + i, j + 1, real(&joint.down[i]));
                    for term in &joint.terms {
                        let f = value(&term.law, s) * joint.row[i];
                        add(row + i, term.at, term.sense.map(|x| f * x));
                    }
                }
            }
        }
    }
    let last = chain.planes() - 1;
    add(n - 1, last, real(&chain.end.row));
    if let Some((law, sense)) = &chain.end.term {
        let f = value(law, s);
        add(n - 1, last, sense.map(|x| f * x));
    }
    a
}

/// A null vector of the matrix at an eigenvalue with its residual.
#[derive(Clone, Debug, PartialEq)]
pub struct NullVector {
    /// `(p+, p-, e)` at every plane, largest pressure amplitude one.
    pub waves: Vec<[Complex64; 3]>,
    /// `max|A x|` over `max|x|` with rows of `A` scaled to unit largest entry.
    pub residual: f64,
}

/// Four steps of inverse iteration on a matrix whose diagonal is shifted by numbers of modulus `shift`,
/// from and to a vector of unit largest entry.
fn inverse_iteration(a: &DMatrix<Complex64>, shift: f64) -> Option<DVector<Complex64>> {
    let spread = |size: f64| {
        DVector::from_fn(a.nrows(), |i, _| {
            Complex64::from_polar(size, 2.4 * i as f64)
        })
    };
    let lu = (a + DMatrix::from_diagonal(&spread(shift))).lu();
    let mut x = spread(1.0);
    for _ in 0..4 {
        x = lu.solve(&x)?;
        let size = x.iter().map(|z| z.norm()).fold(0.0, f64::max);
        if !(size.is_finite() && size > 0.0) {
            return None;
        }
        x /= Complex64::new(size, 0.0);
    }
    Some(x)
}

/// The null vector at `s` by inverse iteration on an LU factorisation; `None` where the iteration
/// does not settle on finite numbers.
pub fn null_vector(chain: &Chain<f64>, s: Complex64) -> Option<NullVector> {
    let mut a = assemble(chain, s);
    for mut row in a.row_iter_mut() {
        let largest = row.iter().map(|x| x.norm()).fold(0.0, f64::max);
        if !(largest.is_finite() && largest > 0.0) {
            return None;
        }
        row /= Complex64::new(largest, 0.0);
    }
    let n = a.nrows();
    // A matrix singular to the last bit has no LU solve; a shift at rounding level does not move the
    // vector. One that leaves a pivot at zero gives way to another.
    let x = [1.0, 3.0, 9.0, 27.0]
        .into_iter()
        .find_map(|times| inverse_iteration(&a, times * f64::EPSILON))?;
    let residual = (&a * &x).iter().map(|z| z.norm()).fold(0.0, f64::max);
    let planes = n / 3;
    // Phase: real where the pressure amplitude is largest.
    let pressure = |k: usize| x[3 * k] + x[3 * k + 1];
    let peak = (0..planes).max_by(|&i, &j| pressure(i).norm().total_cmp(&pressure(j).norm()))?;
    let scale = pressure(peak);
    let scale = if scale.norm() > 1e-12 {
        scale
    } else {
        Complex64::new(1.0, 0.0)
    };
    let waves = (0..planes)
        .map(|k| [x[3 * k], x[3 * k + 1], x[3 * k + 2]].map(|z| z / scale))
        .collect();
    Some(NullVector { waves, residual })
}
