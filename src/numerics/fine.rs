//! Numbers of twice the working precision, `v + low` with `|low| <= u |v|`, for constants that are sums of
//! terms which nearly cancel: rounded once at the end they are right to their last bit, and not to
//! that of the terms.
//!
//! ```text
//! a + b = s + e    s = fl(a + b), e exact (Knuth 1997, The Art of Computer Programming, section 4.2.2)
//! a b   = p + e    p = fl(a b),   e = fl(a b - p) exact by a fused multiply-add
//! ```
//!
//! Derivatives, where `T` carries them, have working precision.

use std::ops::{Add, AddAssign, Div, Mul, Neg, Sub, SubAssign};

use super::dual::Real;

/// A number over `T` with the part of its value that `T` cannot hold.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fine<T> {
    v: T,
    low: f64,
}

impl<T: Real> Fine<T> {
    /// An exact number.
    pub fn exact(v: T) -> Self {
        Fine { v, low: 0.0 }
    }

    /// Rounded to working precision.
    pub fn rounded(self) -> T {
        self.v
    }

    /// `v` and an addition to its value, normalised.
    fn normal(v: T, more: f64) -> Self {
        let before = v.value();
        let v = v + more;
        let taken = v.value() - before;
        let low = more - taken;
        Fine {
            v,
            low: if low.is_finite() { low } else { 0.0 },
        }
    }
}

impl<T: Real> From<f64> for Fine<T> {
    fn from(x: f64) -> Self {
        Fine::exact(T::from(x))
    }
}

impl<T: Real> Add for Fine<T> {
    type Output = Self;
    fn add(self, other: Self) -> Self {
        let (a, b) = (self.v.value(), other.v.value());
        let sum = self.v + other.v;
        let s = sum.value();
        let of_b = s - a;
        let error = (a - (s - of_b)) + (b - of_b);
        Fine::normal(sum, error + (self.low + other.low))
    }
}

impl<T: Real> Neg for Fine<T> {
    type Output = Self;
    fn neg(self) -> Self {
        Fine {
            v: -self.v,
            low: -self.low,
        }
    }
}

impl<T: Real> Sub for Fine<T> {
    type Output = Self;
    fn sub(self, other: Self) -> Self {
        self + -other
    }
}

impl<T: Real> Mul for Fine<T> {
    type Output = Self;
    fn mul(self, other: Self) -> Self {
        let (a, b) = (self.v.value(), other.v.value());
        let product = self.v * other.v;
        let error = a.mul_add(b, -product.value());
        Fine::normal(product, error + (a * other.low + self.low * b))
    }
}

impl<T: Real> Div for Fine<T> {
    type Output = Self;
    fn div(self, other: Self) -> Self {
        let (a, b) = (self.v.value(), other.v.value());
        let quotient = self.v / other.v;
        let q = quotient.value();
        let rest = (-q).mul_add(b, a) + (self.low - q * other.low);
        Fine::normal(quotient, rest / b)
    }
}

impl<T: Real> Add<f64> for Fine<T> {
    type Output = Self;
    fn add(self, other: f64) -> Self {
        self + Self::from(other)
    }
}

impl<T: Real> Sub<f64> for Fine<T> {
    type Output = Self;
    fn sub(self, other: f64) -> Self {
        self - Self::from(other)
    }
}

impl<T: Real> Mul<f64> for Fine<T> {
    type Output = Self;
    fn mul(self, other: f64) -> Self {
        self * Self::from(other)
    }
}

impl<T: Real> Div<f64> for Fine<T> {
    type Output = Self;
    fn div(self, other: f64) -> Self {
        self / Self::from(other)
    }
}

impl<T: Real> AddAssign for Fine<T> {
    fn add_assign(&mut self, other: Self) {
        *self = *self + other;
    }
}

impl<T: Real> SubAssign for Fine<T> {
    fn sub_assign(&mut self, other: Self) {
        *self = *self - other;
    }
}

/// Sums, products and quotients are fine; functions have working precision.
impl<T: Real> Real for Fine<T> {
    type Scalar = T::Scalar;
    const DERIVATIVES: bool = T::DERIVATIVES;
    fn value(self) -> f64 {
        self.v.value()
    }
    fn chain(self, value: Self::Scalar, derivative: Self::Scalar) -> Self {
        Fine::exact(self.v.chain(value, derivative))
    }
    fn sqrt(self) -> Self {
        Fine::exact(self.v.sqrt())
    }
    fn exp(self) -> Self {
        Fine::exact(self.v.exp())
    }
    fn ln(self) -> Self {
        Fine::exact(self.v.ln())
    }
    fn sin(self) -> Self {
        Fine::exact(self.v.sin())
    }
    fn cos(self) -> Self {
        Fine::exact(self.v.cos())
    }
    fn is_finite(self) -> bool {
        self.v.is_finite()
    }
    fn is_exactly_zero(self) -> bool {
        self.v.is_exactly_zero() && self.low == 0.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numerics::dual::Dual;
    use proptest::prelude::*;

    fn fine(x: f64) -> Fine<f64> {
        Fine::exact(x)
    }

    proptest! {
        #[test]
        fn what_cancels_leaves_the_exact_rest(a in -1e3..1e3f64, b in -1e3..1e3f64, c in 0.1..1e3f64) {
            // (a + b)^2 - a^2 - 2 a b - b^2 = 0, to twice the precision.
            let (x, y) = (fine(a), fine(b));
            let rest = (x + y) * (x + y) - x * x - x * y * 2.0 - y * y;
            let size = (a.abs() + b.abs()).powi(2);
            prop_assert!(rest.value().abs() <= 1e-30 * size);
            // A quotient times its divisor.
            let back = x / fine(c) * fine(c) - x;
            prop_assert!(back.value().abs() <= 1e-30 * a.abs());
            // A sum whose parts differ widely.
            prop_assert_eq!(((x + fine(1e17)) - fine(1e17)).value(), a);
        }

        #[test]
        fn derivatives_are_those_of_the_working_numbers(a in 0.1..3.0f64, b in 0.1..3.0f64) {
            let x = Dual::variable(a, 0);
            let f = |x: Dual| x * x / (x + b) - x * 0.3;
            let g = Fine::exact(x);
            let g = (g * g / (g + b) - g * 0.3).rounded();
            prop_assert!((g.v - f(x).v).abs() < 1e-14 && (g.d[0] - f(x).d[0]).abs() < 1e-13);
        }
    }
}
