//! What every number type can do, be it one number, one with derivatives, or eight at once.

use std::ops::{Add, Mul, Neg, Sub};

use super::dual::Real;

/// Sums, differences and products.
pub trait Number:
    Copy + Add<Output = Self> + Sub<Output = Self> + Mul<Output = Self> + Neg<Output = Self>
{
    /// `self a + b`, rounded once where the processor does so at no cost.
    #[must_use]
    #[inline(always)]
    fn mul_add(self, a: Self, b: Self) -> Self {
        self * a + b
    }

    /// `b - self a`, likewise.
    #[must_use]
    #[inline(always)]
    fn neg_mul_add(self, a: Self, b: Self) -> Self {
        b - self * a
    }
}

impl<T: Real> Number for T {}

/// A number an arithmetic with constants of type `T` works on: the constants' own type, or eight numbers
/// with plain constants.
pub trait Over<T>: Number {
    /// A constant.
    fn constant(x: T) -> Self;
    /// `k self` for a constant.
    #[must_use]
    fn scaled(self, k: T) -> Self;
    /// `k self + to` for a constant.
    #[must_use]
    fn scaled_add(self, k: T, to: Self) -> Self;
    /// Exponential.
    #[must_use]
    fn exp(self) -> Self;
    /// Sine and cosine.
    fn sin_cos(self) -> (Self, Self);
}

impl<T: Real> Over<T> for T {
    #[inline(always)]
    fn constant(x: T) -> T {
        x
    }
    #[inline(always)]
    fn scaled(self, k: T) -> T {
        self * k
    }
    #[inline(always)]
    fn scaled_add(self, k: T, to: T) -> T {
        to + self * k
    }
    #[inline(always)]
    fn exp(self) -> T {
        Real::exp(self)
    }
    #[inline(always)]
    fn sin_cos(self) -> (T, T) {
        (self.sin(), self.cos())
    }
}

/// A number that bounds can be worked out in.
pub trait Bounding: Over<f64> {
    /// Square root.
    #[must_use]
    fn sqrt(self) -> Self;
    /// Modulus.
    #[must_use]
    fn abs(self) -> Self;
    /// The greater one; the second where either is not a number.
    #[must_use]
    fn max(self, other: Self) -> Self;
    /// The lesser one; the second where either is not a number.
    #[must_use]
    fn min(self, other: Self) -> Self;
}

impl Bounding for f64 {
    #[inline(always)]
    fn sqrt(self) -> f64 {
        f64::sqrt(self)
    }
    #[inline(always)]
    fn abs(self) -> f64 {
        f64::abs(self)
    }
    #[inline(always)]
    fn max(self, other: f64) -> f64 {
        if self > other { self } else { other }
    }
    #[inline(always)]
    fn min(self, other: f64) -> f64 {
        if self < other { self } else { other }
    }
}
