//! Knobs: the numbers of a network, each addressable by a dotted name.
//!
//! An element lists its knobs once as [`KnobSpec`]s; input, overrides, sweeps, hints and docs all
//! read that list. The numbers themselves live in one flat [`Values`] of the network, so that the
//! same network can be evaluated in plain numbers or in duals seeded in one knob or along several.

use std::ops::{Index, IndexMut};

use crate::numerics::dual::{Dual, Grad, Real};
use crate::units::Dimension;

/// Index of one number in a network's [`Values`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct KnobId(pub usize);

/// Which numbers a knob may hold, in SI.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Range {
    /// Any finite number.
    Any,
    /// Greater than zero.
    Positive,
    /// Zero or greater.
    NotNegative,
    /// A Mach number: zero or greater and less than one.
    Subsonic,
    /// Greater than the bound.
    Above(f64),
}

impl Range {
    /// Whether a finite number `x` lies in the range.
    pub fn holds(self, x: f64) -> bool {
        x.is_finite()
            && match self {
                Range::Any => true,
                Range::Positive => x > 0.0,
                Range::NotNegative => x >= 0.0,
                Range::Subsonic => (0.0..1.0).contains(&x),
                Range::Above(bound) => x > bound,
            }
    }
}

/// What the file may say under one key.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct KnobSpec {
    /// The key as written in the file.
    pub key: &'static str,
    /// The kind of quantity, hence the units accepted.
    pub dimension: Dimension,
    /// The numbers accepted, in SI.
    pub range: Range,
    /// The SI value when the key is absent; `None` where the element says what absence means.
    pub default: Option<f64>,
    /// One line on what it is.
    pub doc: &'static str,
}

/// One knob of a network: where it hangs and what it is.
#[derive(Clone, Debug, PartialEq)]
pub struct Knob {
    /// Dotted name: `chamber.length`.
    pub name: String,
    /// Its row in the knob table of its element.
    pub spec: KnobSpec,
}

/// The numbers of a network in SI, one for each knob.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Values<T>(pub Vec<T>);

impl<T> Index<KnobId> for Values<T> {
    type Output = T;
    fn index(&self, k: KnobId) -> &T {
        &self.0[k.0]
    }
}

impl<T> IndexMut<KnobId> for Values<T> {
    fn index_mut(&mut self, k: KnobId) -> &mut T {
        &mut self.0[k.0]
    }
}

impl Values<f64> {
    /// The same numbers in another number type, as constants.
    pub fn lift<T: Real>(&self) -> Values<T> {
        Values(self.0.iter().map(|&x| T::from(x)).collect())
    }

    /// The same numbers as duals, derivative one at `knob`.
    pub fn seeded(&self, knob: KnobId) -> Values<Dual> {
        self.seeded_along(&[(knob, 1.0)])
    }

    /// The same numbers with a direction for each knob named, and the derivative given along it.
    pub fn seeded_each<const N: usize>(&self, knobs: [(KnobId, f64); N]) -> Values<Grad<f64, N>> {
        let mut v: Values<Grad<f64, N>> = self.lift();
        for (direction, (knob, slope)) in knobs.into_iter().enumerate() {
            if let Some(x) = v.0.get_mut(knob.0) {
                x.d[direction] += slope;
            }
        }
        v
    }

    /// The same numbers as duals, with the derivative given at each knob named: along a direction.
    pub fn seeded_along(&self, direction: &[(KnobId, f64)]) -> Values<Dual> {
        let mut v: Values<Dual> = self.lift();
        for &(knob, slope) in direction {
            if let Some(x) = v.0.get_mut(knob.0) {
                x.d = [slope];
            }
        }
        v
    }
}
