//! The characteristic function as a straight-line program over a short vector.
//!
//! ```text
//! Scale   v_i -> exp(-s t) v_i           for the slots i named
//! Map     v -> (C + sum_k F_k(s) B_k) v   constant real matrices C, B_k; laws F_k
//! ```
//!
//! The vector starts as `(1)` and ends as `(D)`. Each arithmetic runs the same program: Taylor series
//! in `s` over numbers or duals, and the *majorant*, in which every coefficient is replaced by its
//! modulus and every law by a bound of its derivatives, so that the result bounds `|D^(k)|/k!`.

use num_complex::Complex64;

use super::complex::Cx;
use super::exterior::Dense;
use super::law::{self, Law};
use crate::numerics::analytic::{Analytic, Region, Rounding, TAYLOR};
use crate::numerics::dual::Real;

/// Most slots the vector may have.
pub const MOST_SLOTS: usize = 64;

/// A constant real matrix without its zeros, row by row in one list.
#[derive(Clone, Debug, PartialEq)]
struct Sparse<T> {
    /// Where each row ends in the list.
    ends: Vec<usize>,
    /// Column and coefficient.
    entries: Vec<(u8, T)>,
}

#[derive(Clone, Debug, PartialEq)]
enum Op<T> {
    Scale {
        delay: T,
        slots: Vec<u8>,
    },
    Map {
        constant: Sparse<T>,
        lawful: Vec<(Law<T>, Sparse<T>)>,
    },
}

/// A compiled characteristic function `D(s)`.
#[derive(Clone, Debug, PartialEq)]
pub struct Tape<T> {
    ops: Vec<Op<T>>,
    width: usize,
    rounding: Rounding,
    symmetric: bool,
}

/// Arithmetic the tape is run in.
pub(super) trait Arithmetic<T> {
    type Element: Copy;
    fn zero(&self) -> Self::Element;
    fn one(&self) -> Self::Element;
    fn add(&self, a: Self::Element, b: Self::Element) -> Self::Element;
    fn add_scaled(&self, sum: Self::Element, k: T, x: Self::Element) -> Self::Element;
    fn product(&self, a: Self::Element, b: Self::Element) -> Self::Element;
    fn delay(&self, t: T) -> Self::Element;
    fn law(&self, law: &Law<T>) -> Self::Element;
}

/// Taylor series of order `N - 1` about a point.
struct Taylor<T, const N: usize>(Cx<T>);

impl<T: Real, const N: usize> Arithmetic<T> for Taylor<T, N> {
    type Element = [Cx<T>; N];
    #[inline]
    fn zero(&self) -> Self::Element {
        [Cx::real(T::from(0.0)); N]
    }
    #[inline]
    fn one(&self) -> Self::Element {
        let mut one = self.zero();
        one[0] = Cx::real(T::from(1.0));
        one
    }
    #[inline]
    fn add(&self, a: Self::Element, b: Self::Element) -> Self::Element {
        std::array::from_fn(|i| a[i] + b[i])
    }
    #[inline]
    fn add_scaled(&self, sum: Self::Element, k: T, x: Self::Element) -> Self::Element {
        std::array::from_fn(|i| sum[i] + x[i].scale(k))
    }
    #[inline]
    fn product(&self, a: Self::Element, b: Self::Element) -> Self::Element {
        law::product(&a, &b)
    }
    #[inline]
    fn delay(&self, t: T) -> Self::Element {
        law::point_delay(self.0, t)
    }
    #[inline]
    fn law(&self, law: &Law<T>) -> Self::Element {
        law.taylor(self.0)
    }
}

/// Bounds over a region.
struct Majorant<'a>(&'a Region);

impl Arithmetic<f64> for Majorant<'_> {
    type Element = [f64; TAYLOR];
    fn zero(&self) -> Self::Element {
        [0.0; TAYLOR]
    }
    fn one(&self) -> Self::Element {
        let mut one = [0.0; TAYLOR];
        one[0] = 1.0;
        one
    }
    #[inline]
    fn add(&self, a: Self::Element, b: Self::Element) -> Self::Element {
        std::array::from_fn(|i| a[i] + b[i])
    }
    #[inline]
    fn add_scaled(&self, sum: Self::Element, k: f64, x: Self::Element) -> Self::Element {
        std::array::from_fn(|i| sum[i] + k.abs() * x[i])
    }
    #[inline]
    fn product(&self, a: Self::Element, b: Self::Element) -> Self::Element {
        law::real_product(&a, &b)
    }
    #[inline]
    fn delay(&self, t: f64) -> Self::Element {
        law::delay_majorant(self.0, t)
    }
    #[inline]
    fn law(&self, law: &Law<f64>) -> Self::Element {
        law.majorant(self.0)
    }
}

impl<T: Real> Sparse<T> {
    fn of(m: &Dense<T>) -> Self {
        let mut sparse = Sparse {
            ends: Vec::with_capacity(m.len()),
            entries: Vec::new(),
        };
        for row in m {
            let used = row.iter().enumerate().filter(|(_, x)| !x.is_exactly_zero());
            sparse.entries.extend(used.map(|(j, &x)| (j as u8, x)));
            sparse.ends.push(sparse.entries.len());
        }
        sparse
    }

    fn rows(&self) -> impl Iterator<Item = &[(u8, T)]> {
        let mut from = 0;
        self.ends.iter().map(move |&end| {
            let row = &self.entries[from..end];
            from = end;
            row
        })
    }
}

/// `row . v`. The sum is held apart from the vectors, so that it can stay in registers.
#[inline]
fn dot<T: Real, A: Arithmetic<T>>(arithmetic: &A, row: &[(u8, T)], v: &[A::Element]) -> A::Element {
    let add = |sum, &(j, k): &(u8, T)| arithmetic.add_scaled(sum, k, v[usize::from(j)]);
    row.iter().fold(arithmetic.zero(), add)
}

impl<T: Copy> Sparse<T> {
    fn map<U>(&self, f: impl Fn(T) -> U) -> Sparse<U> {
        Sparse {
            ends: self.ends.clone(),
            entries: self.entries.iter().map(|&(j, x)| (j, f(x))).collect(),
        }
    }
}

impl<T: Copy> Tape<T> {
    /// The same program with each number replaced by `f` of it.
    pub fn map<U>(&self, f: impl Fn(T) -> U + Copy) -> Tape<U> {
        let op = |op: &Op<T>| match op {
            Op::Scale { delay, slots } => Op::Scale {
                delay: f(*delay),
                slots: slots.clone(),
            },
            Op::Map { constant, lawful } => Op::Map {
                constant: constant.map(f),
                lawful: lawful
                    .iter()
                    .map(|(law, b)| (law.map(|x| f(*x)), b.map(f)))
                    .collect(),
            },
        };
        Tape {
            ops: self.ops.iter().map(op).collect(),
            width: self.width,
            rounding: self.rounding,
            symmetric: self.symmetric,
        }
    }
}

impl<T: Real> Tape<T> {
    pub(super) fn run<A: Arithmetic<T>>(&self, arithmetic: &A) -> A::Element {
        match self.width {
            0..=2 => self.run_in::<A, 2>(arithmetic),
            3..=4 => self.run_in::<A, 4>(arithmetic),
            5..=16 => self.run_in::<A, 16>(arithmetic),
            _ => self.run_in::<A, MOST_SLOTS>(arithmetic),
        }
    }

    fn run_in<A: Arithmetic<T>, const W: usize>(&self, arithmetic: &A) -> A::Element {
        let (mut one, mut other) = ([arithmetic.zero(); W], [arithmetic.zero(); W]);
        let (mut v, mut next) = (&mut one, &mut other);
        v[0] = arithmetic.one();
        for op in &self.ops {
            match op {
                Op::Scale { delay, slots } => {
                    let e = arithmetic.delay(*delay);
                    for &i in slots {
                        let i = usize::from(i);
                        v[i] = arithmetic.product(e, v[i]);
                    }
                }
                Op::Map { constant, lawful } => {
                    for (n, row) in next.iter_mut().zip(constant.rows()) {
                        *n = dot(arithmetic, row, v);
                    }
                    for (law, part) in lawful {
                        let f = arithmetic.law(law);
                        for (n, row) in next.iter_mut().zip(part.rows()) {
                            if !row.is_empty() {
                                let x = dot(arithmetic, row, v);
                                *n = arithmetic.add(*n, arithmetic.product(f, x));
                            }
                        }
                    }
                    std::mem::swap(&mut v, &mut next);
                }
            }
        }
        v[0]
    }

    /// The delays (s) of all scalings.
    pub(super) fn scales(&self) -> impl Iterator<Item = T> {
        self.ops.iter().filter_map(|op| match op {
            Op::Scale { delay, .. } => Some(*delay),
            Op::Map { .. } => None,
        })
    }

    /// The laws of each map.
    pub(super) fn laws(&self) -> impl Iterator<Item = impl Iterator<Item = &Law<T>>> {
        self.ops.iter().filter_map(|op| match op {
            Op::Scale { .. } => None,
            Op::Map { lawful, .. } => Some(lawful.iter().map(|(law, _)| law)),
        })
    }

    /// Taylor coefficients `D^(k)/k!` at `s`, orders 0 to `N - 1`.
    pub fn taylor_at<const N: usize>(&self, s: Complex64) -> [Cx<T>; N] {
        self.run(&Taylor(Cx::constant(s)))
    }
}

impl Analytic for Tape<f64> {
    fn value_and_slope(&self, s: Complex64) -> (Complex64, Complex64) {
        let [d, slope] = self.taylor_at::<2>(s);
        (d.value(), slope.value())
    }

    fn taylor(&self, s: Complex64) -> [Complex64; 4] {
        self.taylor_at::<4>(s).map(Cx::value)
    }

    fn bound(&self, region: &Region) -> [f64; TAYLOR] {
        self.run(&Majorant(region))
    }

    fn rounding(&self) -> Rounding {
        self.rounding
    }

    fn is_symmetric(&self) -> bool {
        self.symmetric
    }
}

/// Writes a tape, joining what can be joined.
pub struct Writer<T> {
    ops: Vec<Pending<T>>,
    too_wide: bool,
}

enum Pending<T> {
    Scale(Vec<(T, Vec<usize>)>),
    Map {
        constant: Dense<T>,
        lawful: Vec<(Law<T>, Dense<T>)>,
    },
}

impl<T: Real> Default for Writer<T> {
    /// An empty program.
    fn default() -> Self {
        Writer {
            ops: Vec::new(),
            too_wide: false,
        }
    }
}

impl<T: Real> Writer<T> {
    /// `v_i -> exp(-s t_i) v_i` with one delay for each slot.
    pub fn scale(&mut self, delays: &[T]) {
        let mut groups: Vec<(T, Vec<usize>)> = Vec::new();
        for (i, &t) in delays.iter().enumerate() {
            if t.is_exactly_zero() {
                continue;
            }
            match groups.iter_mut().find(|(d, _)| (*d - t).is_exactly_zero()) {
                Some((_, slots)) => slots.push(i),
                None => groups.push((t, vec![i])),
            }
        }
        if let Some(Pending::Scale(last)) = self.ops.last_mut()
            && last.len() == groups.len()
            && last.iter().zip(&groups).all(|(a, b)| a.1 == b.1)
        {
            for (a, b) in last.iter_mut().zip(groups) {
                a.0 += b.0;
            }
            return;
        }
        if !groups.is_empty() {
            self.ops.push(Pending::Scale(groups));
        }
    }

    /// `v -> (C + sum F_k B_k) v`.
    pub fn map(&mut self, constant: Dense<T>, lawful: Vec<(Law<T>, Dense<T>)>) {
        self.too_wide |= constant.len() > MOST_SLOTS;
        if let Some(Pending::Map {
            constant: c,
            lawful: l,
        }) = self.ops.last_mut()
        {
            if l.is_empty() {
                let before = std::mem::take(c);
                *l = lawful
                    .into_iter()
                    .map(|(f, b)| (f, matrix_product(&b, &before)))
                    .collect();
                *c = matrix_product(&constant, &before);
                return;
            }
            if lawful.is_empty() {
                *c = matrix_product(&constant, c);
                for (_, b) in l.iter_mut() {
                    *b = matrix_product(&constant, b);
                }
                return;
            }
        }
        self.ops.push(Pending::Map { constant, lawful });
    }

    /// The program; `None` where the vector would be longer than [`MOST_SLOTS`].
    pub fn finish(self) -> Option<Tape<T>> {
        if self.too_wide {
            return None;
        }
        let mut tape = Tape {
            ops: Vec::with_capacity(self.ops.len()),
            width: 1,
            rounding: Rounding {
                values: 0.0,
                arguments: 2.0,
            },
            symmetric: true,
        };
        for op in self.ops {
            match op {
                Pending::Scale(groups) => {
                    for (delay, slots) in groups {
                        // exp, sine and cosine to 1 ulp each and one complex product.
                        tape.rounding.values += 8.0;
                        tape.ops.push(Op::Scale {
                            delay,
                            slots: slots.iter().map(|&i| i as u8).collect(),
                        });
                    }
                }
                Pending::Map { constant, lawful } => {
                    tape.width = tape.width.max(constant.len());
                    let terms = |m: &Dense<T>| {
                        m.iter()
                            .map(|r| r.iter().filter(|x| !x.is_exactly_zero()).count())
                            .max()
                            .unwrap_or(0) as f64
                    };
                    // Laws of one map lie on parallel paths: the longest counts, sums add one each.
                    let of_laws = lawful
                        .iter()
                        .map(|(f, b)| f.operations() + terms(b))
                        .fold(0.0, f64::max);
                    tape.rounding.values +=
                        (2.0 + terms(&constant)).max(of_laws) + 1.0 + lawful.len() as f64;
                    tape.symmetric &= lawful.iter().all(|(f, _)| f.is_symmetric());
                    tape.ops.push(Op::Map {
                        constant: Sparse::of(&constant),
                        lawful: lawful
                            .into_iter()
                            .map(|(f, b)| (f, Sparse::of(&b)))
                            .collect(),
                    });
                }
            }
        }
        // First-order error analysis: a margin for the terms of second order.
        tape.rounding.values *= 1.1;
        Some(tape)
    }
}

fn matrix_product<T: Real>(a: &Dense<T>, b: &Dense<T>) -> Dense<T> {
    let columns = b.first().map_or(0, Vec::len);
    a.iter()
        .map(|row| {
            (0..columns)
                .map(|j| {
                    let mut sum = T::from(0.0);
                    for (&x, line) in row.iter().zip(b) {
                        if !x.is_exactly_zero() && !line[j].is_exactly_zero() {
                            sum += x * line[j];
                        }
                    }
                    sum
                })
                .collect()
        })
        .collect()
}
