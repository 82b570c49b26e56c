//! The closed set of primitives an element lowers to.
//!
//! At a plane the unknowns are `x = (p+, p-, e)`: the pressure waves running downstream and upstream
//! and the entropy flux scaled to a pressure, `e = rho c eta`, all in pascal. Along a chain of planes
//!
//! ```text
//! Start    rows x_0 = 0                                    two conditions; the first may carry a law
//! Travel   p+ -> p+ exp(-s t+),  p- -> p- exp(+s t-),  e -> F(s) e  or  e -> 0
//! Joint    up x_j + down x_(j+1) + row sum_k F_k(s) (sense_k . x_(at_k)) = 0
//! End      row . x_n = 0                                    may carry a law
//! ```
//!
//! A joint's terms share one `row`, so that they are together of rank one in whatever they sense;
//! what they sense may lie at any plane.

use super::law::Law;
use crate::numerics::dual::Real;

/// Coefficients of the three unknowns at a plane.
pub type Row<T> = [T; 3];

/// Three rows.
pub type Block<T> = [[T; 3]; 3];

/// Index of a plane in a chain.
pub type Plane = usize;

/// Two conditions on the first plane.
#[derive(Clone, Debug, PartialEq)]
pub struct Start<T> {
    /// `rows x = 0`.
    pub rows: [Row<T>; 2],
    /// Added to the first row: `F(s) (sense . x)`.
    pub term: Option<(Law<T>, Row<T>)>,
}

/// One condition on the last plane.
#[derive(Clone, Debug, PartialEq)]
pub struct End<T> {
    /// `row . x = 0`.
    pub row: Row<T>,
    /// Added to it: `F(s) (sense . x)`.
    pub term: Option<(Law<T>, Row<T>)>,
}

/// Waves travelling over a distance.
#[derive(Clone, Debug, PartialEq)]
pub struct Travel<T> {
    /// Time `p+` takes (s).
    pub downstream: T,
    /// Time `p-` takes (s).
    pub upstream: T,
    /// What multiplies the entropy flux; nothing arrives where absent.
    pub entropy: Option<Law<T>>,
}

/// One term of a joint: `F(s) (sense . x_at)`.
#[derive(Clone, Debug, PartialEq)]
pub struct Term<T> {
    /// The law `F`.
    pub law: Law<T>,
    /// What it multiplies.
    pub sense: Row<T>,
    /// Where that is sensed.
    pub at: Plane,
}

/// Three linear conditions between two adjoining planes.
#[derive(Clone, Debug, PartialEq)]
pub struct Joint<T> {
    /// Coefficients of the unknowns before it.
    pub up: Block<T>,
    /// Coefficients of the unknowns behind it; not singular.
    pub down: Block<T>,
    /// How the terms enter the three conditions.
    pub row: Row<T>,
    /// What enters them.
    pub terms: Vec<Term<T>>,
}

/// One step from a plane to the next.
#[derive(Clone, Debug, PartialEq)]
pub enum Step<T> {
    /// A distance.
    Travel(Travel<T>),
    /// A compact element.
    Joint(Joint<T>),
}

/// A chain: step `j` leads from plane `j` to plane `j + 1`.
#[derive(Clone, Debug, PartialEq)]
pub struct Chain<T> {
    /// Conditions at plane 0.
    pub start: Start<T>,
    /// The steps in order.
    pub steps: Vec<Step<T>>,
    /// Condition at the last plane.
    pub end: End<T>,
}

impl<T: Copy> Chain<T> {
    /// The same chain with each number replaced by `f` of it.
    pub fn map<U>(&self, f: impl Fn(T) -> U + Copy) -> Chain<U> {
        let row = |r: &Row<T>| r.map(f);
        let block = |b: &Block<T>| b.map(|r| r.map(f));
        let signal = |(law, sense): &(Law<T>, Row<T>)| (law.map(|x| f(*x)), row(sense));
        let term = |t: &Term<T>| Term {
            law: t.law.map(|x| f(*x)),
            sense: row(&t.sense),
            at: t.at,
        };
        let step = |step: &Step<T>| match step {
            Step::Travel(t) => Step::Travel(Travel {
                downstream: f(t.downstream),
                upstream: f(t.upstream),
                entropy: t.entropy.as_ref().map(|law| law.map(|x| f(*x))),
            }),
            Step::Joint(j) => Step::Joint(Joint {
                up: block(&j.up),
                down: block(&j.down),
                row: row(&j.row),
                terms: j.terms.iter().map(term).collect(),
            }),
        };
        Chain {
            start: Start {
                rows: self.start.rows.map(|r| r.map(f)),
                term: self.start.term.as_ref().map(signal),
            },
            steps: self.steps.iter().map(step).collect(),
            end: End {
                row: row(&self.end.row),
                term: self.end.term.as_ref().map(signal),
            },
        }
    }
}

/// Where a law of a chain stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Place {
    /// In the conditions at plane 0.
    Start,
    /// The entropy of the distance that step is.
    Entropy(usize),
    /// A term of the joint that step is.
    Term {
        /// The step.
        step: usize,
        /// Which of its terms.
        term: usize,
    },
    /// In the condition at the last plane.
    End,
}

impl<T> Chain<T> {
    /// The law at a place.
    pub fn law(&self, place: Place) -> Option<&Law<T>> {
        let step = |step: usize| self.steps.get(step);
        match place {
            Place::Start => self.start.term.as_ref().map(|(law, _)| law),
            Place::End => self.end.term.as_ref().map(|(law, _)| law),
            Place::Entropy(j) => match step(j)? {
                Step::Travel(travel) => travel.entropy.as_ref(),
                Step::Joint(_) => None,
            },
            Place::Term { step: j, term } => match step(j)? {
                Step::Joint(joint) => joint.terms.get(term).map(|t| &t.law),
                Step::Travel(_) => None,
            },
        }
    }

    /// Number of planes.
    pub fn planes(&self) -> usize {
        self.steps.len() + 1
    }
}

impl<T: PartialEq> Chain<T> {
    /// Whether both are the same in all but their laws.
    pub fn same_but_for_laws(&self, other: &Self) -> bool {
        let signals = |a: &Option<(Law<T>, Row<T>)>, b: &Option<(Law<T>, Row<T>)>| match (a, b) {
            (Some((_, a)), Some((_, b))) => a == b,
            (a, b) => a.is_none() && b.is_none(),
        };
        let terms = |(a, b): (&Term<T>, &Term<T>)| a.at == b.at && a.sense == b.sense;
        let steps = |(a, b): (&Step<T>, &Step<T>)| match (a, b) {
            (Step::Travel(a), Step::Travel(b)) => {
                a.downstream == b.downstream
                    && a.upstream == b.upstream
                    && a.entropy.is_some() == b.entropy.is_some()
            }
            (Step::Joint(a), Step::Joint(b)) => {
                (&a.up, &a.down, &a.row) == (&b.up, &b.down, &b.row)
                    && a.terms.len() == b.terms.len()
                    && a.terms.iter().zip(&b.terms).all(terms)
            }
            _ => false,
        };
        self.start.rows == other.start.rows
            && signals(&self.start.term, &other.start.term)
            && self.end.row == other.end.row
            && signals(&self.end.term, &other.end.term)
            && self.steps.len() == other.steps.len()
            && self.steps.iter().zip(&other.steps).all(steps)
    }
}

impl Chain<f64> {
    /// The same chain in another number type, as constants.
    pub fn lift<T: Real>(&self) -> Chain<T> {
        self.map(T::from)
    }
}
