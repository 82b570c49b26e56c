//! Minors: the coordinates of a subspace, and what a linear map does to them.
//!
//! A `k`-dimensional subspace of a `d`-dimensional space spanned by the columns of `X` has as
//! coordinates the `k x k` minors of `X`, one for each set of `k` rows. With `I`, `J` sets of `k` rows
//! and columns:
//!
//! ```text
//! map x -> A x                      minors multiply by the compound matrix  C_k(A)[I, J] = det A[I, J]
//! map x -> A x + F o (w . x)        C_k(A) + F N,   N[I, J] = sum_{j in J} w_j det A[I, J; column j -> o_I]
//! condition l . x = 0               out[S] = sum_{j not in S} (-1)^(rank of j in S + j) l_j in[S + j]
//! ```
//!
//! No division occurs, and a scalar of a rank-one term appears to first power only, so that no
//! spurious zero or pole enters a determinant computed this way (compound matrices: Horn & Johnson
//! 2013, *Matrix Analysis*, section 0.8.1; for eigenvalue problems Ng & Reid 1979, J. Comput. Phys. 30).

use crate::numerics::dual::Real;

/// A dense matrix, rows of columns.
pub type Dense<T> = Vec<Vec<T>>;

/// All sets of `k` out of `d`, as sorted lists, in a fixed order.
pub fn subsets(d: usize, k: usize) -> Vec<Vec<usize>> {
    let mut all = Vec::new();
    let mut current = Vec::with_capacity(k);
    fn extend(
        from: usize,
        d: usize,
        k: usize,
        current: &mut Vec<usize>,
        all: &mut Vec<Vec<usize>>,
    ) {
        if current.len() == k {
            all.push(current.clone());
            return;
        }
        for i in from..d {
            current.push(i);
            extend(i + 1, d, k, current, all);
            current.pop();
        }
    }
    extend(0, d, k, &mut current, &mut all);
    all
}

/// Determinant by expansion along the first row: the order is at most the number of signals that
/// wait at once, hence small.
fn determinant<T: Real>(m: &[Vec<T>]) -> T {
    match m {
        [] => T::from(1.0),
        [row] => row[0],
        [a, b] => a[0] * b[1] - a[1] * b[0],
        [first, rest @ ..] => {
            let mut sum = T::from(0.0);
            for (j, &a) in first.iter().enumerate() {
                if a.is_exactly_zero() {
                    continue;
                }
                let minor: Vec<Vec<T>> = rest
                    .iter()
                    .map(|r| {
                        r.iter()
                            .enumerate()
                            .filter(|(i, _)| *i != j)
                            .map(|(_, &x)| x)
                            .collect()
                    })
                    .collect();
                let term = a * determinant(&minor);
                if j % 2 == 0 { sum += term } else { sum -= term }
            }
            sum
        }
    }
}

/// The compound matrix `C_k(A)` of a matrix with `columns` columns.
pub fn compound<T: Real>(a: &Dense<T>, columns: usize, k: usize) -> Dense<T> {
    if k == 1 {
        return a.clone();
    }
    let (rows, cols) = (subsets(a.len(), k), subsets(columns, k));
    rows.iter()
        .map(|i| {
            cols.iter()
                .map(|j| {
                    let sub: Vec<Vec<T>> = i
                        .iter()
                        .map(|&r| j.iter().map(|&c| a[r][c]).collect())
                        .collect();
                    determinant(&sub)
                })
                .collect()
        })
        .collect()
}

/// The part of the compound of `A + F o w^T` that is linear in `F`.
pub fn rank_one_compound<T: Real>(a: &Dense<T>, o: &[T], w: &[T], k: usize) -> Dense<T> {
    if k == 1 {
        return o
            .iter()
            .map(|&o| w.iter().map(|&w| o * w).collect())
            .collect();
    }
    let (rows, cols) = (subsets(o.len(), k), subsets(w.len(), k));
    rows.iter()
        .map(|i| {
            cols.iter()
                .map(|j| {
                    let mut sum = T::from(0.0);
                    for (slot, &column) in j.iter().enumerate() {
                        if w[column].is_exactly_zero() {
                            continue;
                        }
                        let mut sub: Vec<Vec<T>> = i
                            .iter()
                            .map(|&r| j.iter().map(|&c| a[r][c]).collect())
                            .collect();
                        for (line, &r) in sub.iter_mut().zip(i) {
                            line[slot] = o[r];
                        }
                        sum += w[column] * determinant(&sub);
                    }
                    sum
                })
                .collect()
        })
        .collect()
}

/// Minors after a new free coordinate, the last, is added: `k` of `d` to `k + 1` of `d + 1`.
pub fn open<T: Real>(d: usize, k: usize) -> Dense<T> {
    let old = subsets(d, k);
    subsets(d + 1, k + 1)
        .iter()
        .map(|new| {
            old.iter()
                .map(|s| {
                    let kept = new.last() == Some(&d) && new[..k] == s[..];
                    T::from(if kept { 1.0 } else { 0.0 })
                })
                .collect()
        })
        .collect()
}

/// Minors after the condition `l . x = 0`, in the coordinates without `dropped`: `k` of `d` to
/// `k - 1` of `d - 1`.
pub fn close<T: Real>(l: &[T], k: usize, dropped: usize) -> Dense<T> {
    let d = l.len();
    let old = subsets(d, k);
    let kept: Vec<usize> = (0..d).filter(|&i| i != dropped).collect();
    subsets(d - 1, k - 1)
        .iter()
        .map(|s| {
            let s: Vec<usize> = s.iter().map(|&i| kept[i]).collect();
            old.iter()
                .map(|o| match o.iter().position(|i| !s.contains(i)) {
                    Some(rank) if o.iter().filter(|i| !s.contains(i)).count() == 1 => {
                        let c = l[o[rank]];
                        if rank % 2 == 0 { c } else { -c }
                    }
                    _ => T::from(0.0),
                })
                .collect()
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn minors(x: &Dense<f64>, k: usize) -> Vec<f64> {
        compound(x, k, k).into_iter().map(|r| r[0]).collect()
    }

    fn times(a: &Dense<f64>, v: &[f64]) -> Vec<f64> {
        a.iter()
            .map(|r| r.iter().zip(v).map(|(a, b)| a * b).sum())
            .collect()
    }

    fn product(a: &Dense<f64>, b: &Dense<f64>) -> Dense<f64> {
        a.iter()
            .map(|r| {
                (0..b[0].len())
                    .map(|j| r.iter().zip(b).map(|(a, b)| a * b[j]).sum())
                    .collect()
            })
            .collect()
    }

    fn matrix(rows: usize, cols: usize) -> impl Strategy<Value = Dense<f64>> {
        prop::collection::vec(prop::collection::vec(-1.0..1.0f64, cols), rows)
    }

    fn close_to(a: &[f64], b: &[f64]) -> bool {
        a.len() == b.len() && a.iter().zip(b).all(|(a, b)| (a - b).abs() < 1e-12)
    }

    proptest! {
        #[test]
        fn minors_of_a_product_are_products_of_minors(a in matrix(5, 4), x in matrix(4, 3)) {
            let direct = minors(&product(&a, &x), 3);
            prop_assert!(close_to(&direct, &times(&compound(&a, 4, 3), &minors(&x, 3))));
        }

        #[test]
        fn a_rank_one_term_enters_linearly(
            a in matrix(4, 4), o in prop::collection::vec(-1.0..1.0f64, 4),
            w in prop::collection::vec(-1.0..1.0f64, 4), f in -3.0..3.0f64,
        ) {
            let whole: Dense<f64> = (0..4)
                .map(|i| (0..4).map(|j| a[i][j] + f * o[i] * w[j]).collect())
                .collect();
            for k in 1..=4 {
                let base = compound(&a, 4, k);
                let linear = rank_one_compound(&a, &o, &w, k);
                for (i, row) in compound(&whole, 4, k).iter().enumerate() {
                    for (j, exact) in row.iter().enumerate() {
                        prop_assert!((base[i][j] + f * linear[i][j] - exact).abs() < 1e-12);
                    }
                }
            }
        }

        #[test]
        fn closing_what_was_opened_eliminates_it(
            x in prop::collection::vec(-1.0..1.0f64, 4), l in prop::collection::vec(-1.0..1.0f64, 4),
            b in prop::collection::vec(-1.0..1.0f64, 4),
        ) {
            // A line in four dimensions, plus a free signal q that drives x -> x + b q and must equal
            // l . x: the closed line is parallel to the solution.
            let mut drive: Dense<f64> = (0..5)
                .map(|i| (0..5).map(|j| if i == j { 1.0 } else { 0.0 }).collect())
                .collect();
            for (row, b) in drive.iter_mut().zip(&b) {
                row[4] = *b;
            }
            let opened = times(&open(4, 1), &x);
            let driven = times(&compound(&drive, 5, 2), &opened);
            let condition = [-l[0], -l[1], -l[2], -l[3], 1.0];
            let line = times(&close(&condition, 2, 4), &driven);
            // q (1 - l.b) = l.x, hence x (1 - l.b) + b (l.x), up to one common sign.
            let lx: f64 = l.iter().zip(&x).map(|(a, b)| a * b).sum();
            let lb: f64 = l.iter().zip(&b).map(|(a, b)| a * b).sum();
            let expected: Vec<f64> = x.iter().zip(&b).map(|(x, b)| x * (1.0 - lb) + b * lx).collect();
            let negative: Vec<f64> = expected.iter().map(|e| -e).collect();
            prop_assert!(close_to(&line, &expected) || close_to(&line, &negative));
        }
    }
}
