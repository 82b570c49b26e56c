//! Two numbers of one type worked on side by side: while one waits for its last operation the processor works
//! on the other.

use std::ops::{Add, Mul, Neg, Sub};

use crate::numerics::number::{Bounding, Number, Over};

/// Two numbers.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Both<L>(pub L, pub L);

impl<L: Number> Add for Both<L> {
    type Output = Self;
    #[inline(always)]
    fn add(self, o: Self) -> Self {
        Both(self.0 + o.0, self.1 + o.1)
    }
}

impl<L: Number> Sub for Both<L> {
    type Output = Self;
    #[inline(always)]
    fn sub(self, o: Self) -> Self {
        Both(self.0 - o.0, self.1 - o.1)
    }
}

impl<L: Number> Mul for Both<L> {
    type Output = Self;
    #[inline(always)]
    fn mul(self, o: Self) -> Self {
        Both(self.0 * o.0, self.1 * o.1)
    }
}

impl<L: Number> Neg for Both<L> {
    type Output = Self;
    #[inline(always)]
    fn neg(self) -> Self {
        Both(-self.0, -self.1)
    }
}

impl<L: Number> Number for Both<L> {
    #[inline(always)]
    fn mul_add(self, a: Self, b: Self) -> Self {
        Both(self.0.mul_add(a.0, b.0), self.1.mul_add(a.1, b.1))
    }
    #[inline(always)]
    fn neg_mul_add(self, a: Self, b: Self) -> Self {
        Both(self.0.neg_mul_add(a.0, b.0), self.1.neg_mul_add(a.1, b.1))
    }
}

impl<L: Bounding> Over<f64> for Both<L> {
    #[inline(always)]
    fn constant(x: f64) -> Self {
        Both(L::constant(x), L::constant(x))
    }
    #[inline(always)]
    fn scaled(self, k: f64) -> Self {
        Both(self.0.scaled(k), self.1.scaled(k))
    }
    #[inline(always)]
    fn scaled_add(self, k: f64, to: Self) -> Self {
        Both(self.0.scaled_add(k, to.0), self.1.scaled_add(k, to.1))
    }
    #[inline(always)]
    fn exp(self) -> Self {
        Both(self.0.exp(), self.1.exp())
    }
    #[inline(always)]
    fn sin_cos(self) -> (Self, Self) {
        let ((a, b), (c, d)) = (self.0.sin_cos(), self.1.sin_cos());
        (Both(a, c), Both(b, d))
    }
}
