//! The characteristic function as a straight-line program over a short vector.
//!
//! ```text
//! Scale   v_i -> exp(-s t) v_i           for the slots i named
//! Map     v -> (C + sum_k F_k(s) B_k) v   constant real matrices C, B_k; laws F_k
//! ```
//!
//! The vector starts with ones and zeros and ends as `(D)`. Each arithmetic runs the same program: Taylor series
//! in `s` over numbers or duals, and the *majorant*, in which every coefficient is replaced by its
//! modulus and every law by a bound of its derivatives, so that the result bounds `|D^(k)|/k!`.

mod arithmetic;
mod eight;
mod writer;

use num_complex::Complex64;

use super::complex::Cx;
use super::exterior::Dense;
use super::law::Law;
use super::primitive::{Chain, Place};
use crate::numerics::analytic::Rounding;
use crate::numerics::dual::Real;
use arithmetic::Taylor;

pub(super) use arithmetic::Arithmetic;
pub use writer::{Entry, Writer};

/// Most slots the vector may have.
pub const MOST_SLOTS: usize = 64;

/// A row of a constant matrix: `v[lead]`, with the coefficient one, and the entries up to `end`.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Line {
    lead: Option<u8>,
    end: usize,
}

/// A constant real matrix without its zeros, row by row in one list.
#[derive(Clone, Debug, PartialEq)]
struct Sparse<T> {
    lines: Vec<Line>,
    entries: Entries<T>,
}

/// Slots and their coefficients, without zeros.
type Entries<T> = Vec<(u8, T)>;

/// What a law is multiplied by.
#[derive(Clone, Debug, PartialEq)]
enum Part<T> {
    Matrix(Sparse<T>),
    /// A column times a row, both without their zeros: the law is multiplied by one number.
    Outer {
        column: Entries<T>,
        row: Entries<T>,
    },
}

/// A law of a chain: which one, and the delay folded into it on the way.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Origin<T> {
    /// Where it stands.
    pub place: Place,
    /// Added to its delays (s).
    pub later: T,
}

#[derive(Clone, Debug, PartialEq)]
struct Lawful<T> {
    law: Law<T>,
    part: Part<T>,
    origin: Option<Origin<T>>,
}

#[derive(Clone, Debug, PartialEq)]
enum Op<T> {
    Scale {
        delay: T,
        slots: Vec<u8>,
    },
    Map {
        constant: Sparse<T>,
        lawful: Vec<Lawful<T>>,
    },
}

/// A compiled characteristic function `D(s)`.
#[derive(Clone, Debug, PartialEq)]
pub struct Tape<T> {
    /// Which slots are one at the start; the others are zero.
    start: Vec<bool>,
    ops: Vec<Op<T>>,
    width: usize,
    rounding: Rounding,
    symmetric: bool,
}

impl<T: Real> Sparse<T> {
    fn of(m: &Dense<T>) -> Self {
        let mut sparse = Sparse {
            lines: Vec::with_capacity(m.len()),
            entries: Vec::new(),
        };
        let one = T::from(1.0);
        for row in m {
            let lead = row.iter().position(|&x| (x - one).is_exactly_zero());
            let used = row.iter().enumerate().filter(|(_, x)| !x.is_exactly_zero());
            let others = used.filter(|(j, _)| Some(*j) != lead);
            sparse.entries.extend(others.map(|(j, &x)| (j as u8, x)));
            sparse.lines.push(Line {
                lead: lead.map(|j| j as u8),
                end: sparse.entries.len(),
            });
        }
        sparse
    }
}

/// `row . v`. The sum is held apart from the vectors, so that it can stay in registers.
#[inline(always)]
fn dot<T: Real, A: Arithmetic<T>>(
    arithmetic: &A,
    lead: Option<u8>,
    mut row: &[(u8, T)],
    v: &[A::Element],
) -> A::Element {
    let mut sum = match (lead, row) {
        (Some(j), _) => v[usize::from(j)],
        (None, &[(j, k), ref rest @ ..]) => {
            row = rest;
            arithmetic.scaled(k, v[usize::from(j)])
        }
        (None, []) => return arithmetic.zero(),
    };
    for &(j, k) in row {
        sum = arithmetic.add_scaled(sum, k, v[usize::from(j)]);
    }
    sum
}

impl<T: Copy> Sparse<T> {
    fn map<U>(&self, f: impl Fn(T) -> U) -> Sparse<U> {
        Sparse {
            lines: self.lines.clone(),
            entries: self.entries.iter().map(|&(j, x)| (j, f(x))).collect(),
        }
    }
}

impl<T: Copy> Part<T> {
    fn map<U>(&self, f: impl Fn(T) -> U + Copy) -> Part<U> {
        let list = |list: &[(u8, T)]| list.iter().map(|&(i, x)| (i, f(x))).collect();
        match self {
            Part::Matrix(m) => Part::Matrix(m.map(f)),
            Part::Outer { column, row } => Part::Outer {
                column: list(column),
                row: list(row),
            },
        }
    }
}

impl<T: Real> Part<T> {
    /// A matrix, as a column times a row where it is one. Numbers with derivatives stay a matrix: values may be
    /// proportional where derivatives are not.
    fn of(m: &Dense<T>) -> Self {
        match outer(m).filter(|_| !T::DERIVATIVES) {
            Some((column, row)) => Part::Outer { column, row },
            None => Part::Matrix(Sparse::of(m)),
        }
    }
}

/// Column and row of a matrix of rank one, to rounding; the row is its longest.
fn outer<T: Real>(m: &Dense<T>) -> Option<(Entries<T>, Entries<T>)> {
    let size = |x: &T| x.value().abs();
    let longest = |row: &&Vec<T>| row.iter().map(size).fold(0.0, f64::max);
    let first = m.iter().max_by(|a, b| longest(a).total_cmp(&longest(b)))?;
    let by_size = |a: &(usize, &T), b: &(usize, &T)| size(a.1).total_cmp(&size(b.1));
    let (pivot, &head) = first.iter().enumerate().max_by(by_size)?;
    if head.is_exactly_zero() {
        return None;
    }
    let mut column = Vec::with_capacity(m.len());
    for (i, row) in m.iter().enumerate() {
        let k = *row.get(pivot)? / head;
        let off = |(x, y): (&T, &T)| (*x - k * *y).value().abs() > 4.0 * f64::EPSILON * size(x);
        if row.iter().zip(first).any(off) {
            return None;
        }
        if !k.is_exactly_zero() {
            column.push((i as u8, k));
        }
    }
    let used = first
        .iter()
        .enumerate()
        .filter(|(_, x)| !x.is_exactly_zero());
    Some((column, used.map(|(j, &x)| (j as u8, x)).collect()))
}

impl<T: Copy> Lawful<T> {
    fn map<U>(&self, f: impl Fn(T) -> U + Copy) -> Lawful<U> {
        Lawful {
            law: self.law.map(|x| f(*x)),
            part: self.part.map(f),
            origin: self.origin.as_ref().map(|o| Origin {
                place: o.place,
                later: f(o.later),
            }),
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
                lawful: lawful.iter().map(|l| l.map(f)).collect(),
            },
        };
        Tape {
            start: self.start.clone(),
            ops: self.ops.iter().map(op).collect(),
            width: self.width,
            rounding: self.rounding,
            symmetric: self.symmetric,
        }
    }
}

/// The vectors a program of at most `W` slots goes back and forth between. What a run leaves in them the next never reads, so
/// that they are cleared once.
struct Work<E, const W: usize>([E; W], [E; W]);

impl<E: Copy, const W: usize> Work<E, W> {
    #[inline(always)]
    fn of<T: Real>(arithmetic: &impl Arithmetic<T, Element = E>) -> Self {
        Work([arithmetic.zero(); W], [arithmetic.zero(); W])
    }
}

impl<T: Real> Tape<T> {
    #[inline(always)]
    pub(super) fn run<A: Arithmetic<T>>(&self, arithmetic: &A) -> A::Element {
        match self.width {
            0..=2 => self.run_in(arithmetic, &mut Work::<_, 2>::of(arithmetic)),
            3..=4 => self.run_in(arithmetic, &mut Work::<_, 4>::of(arithmetic)),
            5..=16 => self.run_in(arithmetic, &mut Work::<_, 16>::of(arithmetic)),
            _ => self.run_in(arithmetic, &mut Work::<_, MOST_SLOTS>::of(arithmetic)),
        }
    }

    #[inline(always)]
    fn run_in<A: Arithmetic<T>, const W: usize>(
        &self,
        arithmetic: &A,
        work: &mut Work<A::Element, W>,
    ) -> A::Element {
        let Work(one, other) = work;
        let (mut v, mut next) = (one, other);
        for (v, &one) in v.iter_mut().zip(&self.start) {
            *v = if one {
                arithmetic.one()
            } else {
                arithmetic.zero()
            };
        }
        for op in &self.ops {
            match op {
                Op::Scale { delay, slots } => {
                    let e = arithmetic.delay(*delay);
                    for &i in slots {
                        let i = usize::from(i);
                        v[i] = arithmetic.delayed(e, *delay, v[i]);
                    }
                }
                Op::Map { constant, lawful } => {
                    let mut from = 0;
                    for (n, &Line { lead, end }) in next.iter_mut().zip(&constant.lines) {
                        *n = dot(arithmetic, lead, &constant.entries[from..end], v);
                        from = end;
                    }
                    for Lawful { law, part, .. } in lawful {
                        match part {
                            Part::Outer { column, row } => {
                                let heard = dot(arithmetic, None, row, v);
                                let answer = arithmetic.answer(law, heard);
                                for &(i, k) in column {
                                    let n = &mut next[usize::from(i)];
                                    *n = arithmetic.add_scaled(*n, k, answer);
                                }
                            }
                            Part::Matrix(part) => {
                                let f = arithmetic.law(law);
                                let mut from = 0;
                                for (n, &Line { lead, end }) in next.iter_mut().zip(&part.lines) {
                                    if lead.is_some() || end > from {
                                        let row = &part.entries[from..end];
                                        let x = dot(arithmetic, lead, row, v);
                                        *n = arithmetic.add(*n, arithmetic.product(f, x));
                                    }
                                    from = end;
                                }
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
            Op::Map { lawful, .. } => Some(lawful.iter().map(|l| &l.law)),
        })
    }

    /// The program with the laws of a chain like its own in all but the numbers of its laws; `None` where a law has
    /// no counterpart there of the same form.
    #[must_use]
    pub fn with_laws_of(mut self, chain: &Chain<T>) -> Option<Self> {
        for op in &mut self.ops {
            let Op::Map { lawful, .. } = op else { continue };
            for Lawful { law, origin, .. } in lawful {
                if let Some(Origin { place, later }) = origin {
                    law.renew(chain.law(*place)?, *later)?;
                }
            }
        }
        Some(self)
    }

    /// Taylor coefficients `D^(k)/k!` at `s`, orders 0 to `N - 1`.
    pub fn taylor_at<const N: usize>(&self, s: Complex64) -> [Cx<T>; N] {
        self.run(&Taylor(Cx::constant(s)))
    }
}
