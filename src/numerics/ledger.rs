//! The list of zeros found, each proved, held against the count.
//!
//! A candidate enters only as a proved disc; a disc that holds a zero already listed is the same
//! zero. A list is complete when the weights add up to the count.

use num_complex::Complex64;

use super::analytic::{Analytic, modulus};
use super::isolate::{self, Zero};

/// What became of a candidate.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Entry {
    /// A new zero, or two.
    New,
    /// A zero listed already.
    Known,
    /// Nothing could be proved near it.
    Unproven,
}

/// Zeros found so far.
#[derive(Clone, Debug)]
pub struct Ledger<'f, F: ?Sized> {
    f: &'f F,
    symmetric: bool,
    reach: f64,
    zeros: Vec<Zero>,
    /// Values of the function used in proofs.
    pub evaluations: usize,
}

impl<'f, F: Analytic + ?Sized> Ledger<'f, F> {
    /// An empty list; no proof is sought in a disc larger than `reach`.
    pub fn new(f: &'f F, reach: f64) -> Self {
        Ledger {
            f,
            symmetric: f.is_symmetric(),
            reach,
            zeros: Vec::new(),
            evaluations: 0,
        }
    }

    /// Whether the function is symmetric about the real axis, so that zeros above it stand for pairs.
    pub fn symmetric(&self) -> bool {
        self.symmetric
    }

    /// The zeros listed.
    pub fn zeros(&self) -> &[Zero] {
        &self.zeros
    }

    /// Whether a listed disc holds `z`, which would then converge to the zero in it.
    pub fn covers(&self, z: Complex64) -> bool {
        let holds = |k: &Zero| (k.at - z).norm_sqr() < k.radius * k.radius;
        self.zeros.iter().any(holds)
    }

    /// Offers a point that Newton has reached.
    pub fn offer(&mut self, z: Complex64) -> Entry {
        let z = self.folded(z);
        if self.knows(z) {
            return Entry::Known;
        }
        let proved = isolate::simple(self.f, z, self.reach);
        self.take(z, proved)
    }

    /// Offers many, in their order; whether any of them is new. Where many lie near one another some are proved
    /// to no purpose.
    pub fn offer_all(&mut self, reached: impl Iterator<Item = Complex64>) -> bool {
        let mut fresh: Vec<Complex64> = Vec::new();
        for z in reached {
            let z = self.folded(z);
            // Newton from two starts reaches one zero to within rounding.
            let same = |other: &Complex64| modulus(other - z) <= 1e-11 * modulus(z);
            if !fresh.iter().any(same) && !self.knows(z) {
                fresh.push(z);
            }
        }
        if fresh.is_empty() {
            return false;
        }
        let proofs = isolate::simples(self.f, &fresh, self.reach);
        let mut any = false;
        for (z, proved) in fresh.into_iter().zip(proofs) {
            any |= !self.knows(z) && self.take(z, proved) == Entry::New;
        }
        any
    }

    fn folded(&self, z: Complex64) -> Complex64 {
        if self.symmetric && z.im < 0.0 {
            z.conj()
        } else {
            z
        }
    }

    /// Whether a listed disc holds `z` so deep that it is the zero in it.
    fn knows(&self, z: Complex64) -> bool {
        let holds = |k: &Zero| modulus(k.at - z) + k.error < k.radius;
        self.zeros.iter().any(holds)
    }

    /// Enters what is proved near `z`, or the pair that may be.
    fn take(&mut self, z: Complex64, simple: Option<Zero>) -> Entry {
        let proved = match simple {
            Some(zero) => vec![zero],
            None => match isolate::pair(self.f, z, self.reach, &mut self.evaluations) {
                Some(zeros) => zeros,
                None => return Entry::Unproven,
            },
        };
        let mut entry = Entry::Known;
        for zero in proved {
            if self.enter(zero) {
                entry = Entry::New;
            }
        }
        entry
    }

    fn enter(&mut self, mut zero: Zero) -> bool {
        if self.symmetric {
            if zero.at.im < 0.0 {
                zero.at = zero.at.conj();
            }
            // Its own conjugate is a zero too and would lie in the same disc: it is real.
            let own_mirror = 2.0 * zero.at.im + zero.error < zero.radius;
            if own_mirror && zero.multiplicity == 1 {
                zero.real = true;
                zero.at.im = 0.0;
            }
        }
        let same = self.zeros.iter().any(|k| {
            let apart = (k.at - zero.at).norm();
            apart + zero.error < k.radius || apart + k.error < zero.radius
        });
        if !same {
            self.zeros.push(zero);
        }
        !same
    }

    /// How much a zero weighs in the count: both of a conjugate pair are inside a symmetric contour.
    pub fn weight(&self, zero: &Zero) -> i64 {
        let m = i64::from(zero.multiplicity);
        if !self.symmetric {
            return m;
        }
        if zero.real {
            return m;
        }
        // Two zeros whose disc meets the axis: a conjugate pair or two real ones, which weigh the same.
        if zero.multiplicity == 2
            && zero.at.im.abs() + zero.error < zero.radius
            && zero.at.im <= zero.error
        {
            return 2;
        }
        2 * m
    }
}
