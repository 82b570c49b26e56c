//! Numbers that carry first derivatives: `a + sum_i a_i e_i` with `e_i e_j = 0`.
//!
//! For `f(a)` the rule is `f(a + sum a_i e_i) = f(a) + f'(a) sum a_i e_i`; products follow from
//! `e_i e_j = 0`. Every physical relation of the crate is written once over [`Real`] and is
//! evaluated with [`f64`] for its value and with [`Grad`] for its exact derivative
//! (forward-mode automatic differentiation; Griewank & Walther 2008, *Evaluating Derivatives*).
//! `Grad` nests: `Grad<Dual, 6>` holds the parameter derivative of a Jacobian.

use std::fmt::Debug;
use std::ops::{Add, AddAssign, Div, Mul, Neg, Sub, SubAssign};

/// A real number type the physics is written over: [`f64`] or [`Grad`].
pub trait Real:
    Copy
    + Debug
    + Send
    + Sync
    + 'static
    + From<f64>
    + Add<Output = Self>
    + Sub<Output = Self>
    + Mul<Output = Self>
    + Div<Output = Self>
    + Neg<Output = Self>
    + Add<f64, Output = Self>
    + Sub<f64, Output = Self>
    + Mul<f64, Output = Self>
    + Div<f64, Output = Self>
    + AddAssign
    + SubAssign
{
    /// The value without its derivatives.
    fn value(self) -> f64;
    /// `f(self)` for a function whose value and first derivative at `self` are given.
    fn chain(self, value: Self::Scalar, derivative: Self::Scalar) -> Self;
    /// The number type of the derivatives' coefficients.
    type Scalar: Copy;
    /// Whether it carries derivatives.
    const DERIVATIVES: bool;
    /// Square root.
    fn sqrt(self) -> Self;
    /// Exponential.
    fn exp(self) -> Self;
    /// Natural logarithm.
    fn ln(self) -> Self;
    /// Sine.
    fn sin(self) -> Self;
    /// Cosine.
    fn cos(self) -> Self;
    /// `1/self`.
    fn recip(self) -> Self {
        Self::from(1.0) / self
    }
    /// `self^exponent` for a positive base: `exp(exponent ln self)`.
    fn pow(self, exponent: Self) -> Self {
        (exponent * self.ln()).exp()
    }
    /// Modulus; the derivative at zero is taken as zero.
    fn abs(self) -> Self {
        if self.value() < 0.0 {
            -self
        } else if self.value() == 0.0 {
            Self::from(0.0)
        } else {
            self
        }
    }
    /// Whether the value and every derivative are finite.
    fn is_finite(self) -> bool;
    /// Whether the value and every derivative are zero: what may be left out of a sum.
    fn is_exactly_zero(self) -> bool;
}

impl Real for f64 {
    type Scalar = f64;
    const DERIVATIVES: bool = false;
    fn value(self) -> f64 {
        self
    }
    fn chain(self, value: f64, _derivative: f64) -> f64 {
        value
    }
    fn sqrt(self) -> f64 {
        f64::sqrt(self)
    }
    fn exp(self) -> f64 {
        f64::exp(self)
    }
    fn ln(self) -> f64 {
        f64::ln(self)
    }
    fn sin(self) -> f64 {
        f64::sin(self)
    }
    fn cos(self) -> f64 {
        f64::cos(self)
    }
    fn pow(self, exponent: f64) -> f64 {
        f64::powf(self, exponent)
    }
    fn abs(self) -> f64 {
        f64::abs(self)
    }
    fn is_finite(self) -> bool {
        f64::is_finite(self)
    }
    fn is_exactly_zero(self) -> bool {
        self == 0.0
    }
}

/// A value over `T` with its derivatives along `N` independent directions.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Grad<T, const N: usize> {
    /// The value.
    pub v: T,
    /// The derivative along each direction.
    pub d: [T; N],
}

/// A number with its derivative with respect to one knob.
pub type Dual = Grad<f64, 1>;

impl<T: Real, const N: usize> Grad<T, N> {
    /// A constant: all derivatives zero.
    pub fn constant(v: T) -> Self {
        Grad {
            v,
            d: [T::from(0.0); N],
        }
    }

    /// An independent variable: derivative one along `direction`. A direction outside `0..N`
    /// gives a constant.
    pub fn variable(v: T, direction: usize) -> Self {
        let mut x = Self::constant(v);
        if let Some(d) = x.d.get_mut(direction) {
            *d = T::from(1.0);
        }
        x
    }

    fn map(self, v: T, slope: T) -> Self {
        Grad {
            v,
            d: self.d.map(|d| d * slope),
        }
    }
}

impl<T: Real, const N: usize> From<f64> for Grad<T, N> {
    fn from(v: f64) -> Self {
        Self::constant(T::from(v))
    }
}

impl<T: Real, const N: usize> Add for Grad<T, N> {
    type Output = Self;
    fn add(self, o: Self) -> Self {
        Grad {
            v: self.v + o.v,
            d: std::array::from_fn(|i| self.d[i] + o.d[i]),
        }
    }
}

impl<T: Real, const N: usize> Sub for Grad<T, N> {
    type Output = Self;
    fn sub(self, o: Self) -> Self {
        Grad {
            v: self.v - o.v,
            d: std::array::from_fn(|i| self.d[i] - o.d[i]),
        }
    }
}

#[expect(clippy::suspicious_arithmetic_impl, reason = "the product rule adds")]
impl<T: Real, const N: usize> Mul for Grad<T, N> {
    type Output = Self;
    fn mul(self, o: Self) -> Self {
        Grad {
            v: self.v * o.v,
            d: std::array::from_fn(|i| self.d[i] * o.v + self.v * o.d[i]),
        }
    }
}

#[expect(
    clippy::suspicious_arithmetic_impl,
    reason = "the quotient rule multiplies and subtracts"
)]
impl<T: Real, const N: usize> Div for Grad<T, N> {
    type Output = Self;
    fn div(self, o: Self) -> Self {
        let v = self.v / o.v;
        Grad {
            v,
            d: std::array::from_fn(|i| (self.d[i] - v * o.d[i]) / o.v),
        }
    }
}

impl<T: Real, const N: usize> Neg for Grad<T, N> {
    type Output = Self;
    fn neg(self) -> Self {
        Grad {
            v: -self.v,
            d: self.d.map(|d| -d),
        }
    }
}

impl<T: Real, const N: usize> Add<f64> for Grad<T, N> {
    type Output = Self;
    fn add(self, o: f64) -> Self {
        Grad {
            v: self.v + o,
            d: self.d,
        }
    }
}

impl<T: Real, const N: usize> Sub<f64> for Grad<T, N> {
    type Output = Self;
    fn sub(self, o: f64) -> Self {
        Grad {
            v: self.v - o,
            d: self.d,
        }
    }
}

impl<T: Real, const N: usize> Mul<f64> for Grad<T, N> {
    type Output = Self;
    fn mul(self, o: f64) -> Self {
        Grad {
            v: self.v * o,
            d: self.d.map(|d| d * o),
        }
    }
}

impl<T: Real, const N: usize> Div<f64> for Grad<T, N> {
    type Output = Self;
    fn div(self, o: f64) -> Self {
        Grad {
            v: self.v / o,
            d: self.d.map(|d| d / o),
        }
    }
}

impl<T: Real, const N: usize> AddAssign for Grad<T, N> {
    fn add_assign(&mut self, o: Self) {
        *self = *self + o;
    }
}

impl<T: Real, const N: usize> SubAssign for Grad<T, N> {
    fn sub_assign(&mut self, o: Self) {
        *self = *self - o;
    }
}

impl<T: Real, const N: usize> Real for Grad<T, N> {
    type Scalar = T;
    const DERIVATIVES: bool = true;
    fn value(self) -> f64 {
        self.v.value()
    }
    fn chain(self, value: T, derivative: T) -> Self {
        self.map(value, derivative)
    }
    fn sqrt(self) -> Self {
        let r = self.v.sqrt();
        self.map(r, (r * 2.0).recip())
    }
    fn exp(self) -> Self {
        let e = self.v.exp();
        self.map(e, e)
    }
    fn ln(self) -> Self {
        self.map(self.v.ln(), self.v.recip())
    }
    fn sin(self) -> Self {
        self.map(self.v.sin(), self.v.cos())
    }
    fn cos(self) -> Self {
        self.map(self.v.cos(), -self.v.sin())
    }
    fn is_finite(self) -> bool {
        self.v.is_finite() && self.d.iter().all(|d| d.is_finite())
    }
    fn is_exactly_zero(self) -> bool {
        self.v.is_exactly_zero() && self.d.iter().all(|d| d.is_exactly_zero())
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn sample<T: Real>(x: T, y: T) -> T {
        (x * y + 1.5).sqrt() / (x.exp() + y) + (y / x).ln() * x.sin() - y.cos() + x.pow(y) * 0.5
    }

    proptest! {
        #[test]
        fn derivatives_agree_with_central_differences(x in 0.3..2.0f64, y in 0.4..2.0f64) {
            let g = sample(Grad::<f64, 2>::variable(x, 0), Grad::variable(y, 1));
            let h = 1e-5;
            let dx = (sample(x + h, y) - sample(x - h, y)) / (2.0 * h);
            let dy = (sample(x, y + h) - sample(x, y - h)) / (2.0 * h);
            prop_assert!((g.v - sample(x, y)).abs() < 1e-13);
            prop_assert!((g.d[0] - dx).abs() < 1e-7 * (1.0 + dx.abs()));
            prop_assert!((g.d[1] - dy).abs() < 1e-7 * (1.0 + dy.abs()));
        }

        #[test]
        fn nested_duals_give_mixed_second_derivatives(x in 0.3..2.0f64, y in 0.4..2.0f64) {
            let outer = |y: f64| {
                let xx = Grad::<Dual, 1>::variable(Dual::constant(x), 0);
                let yy = Grad::<Dual, 1>::constant(Dual::variable(y, 0));
                sample(xx, yy)
            };
            let h = 1e-5;
            let slope = |y: f64| sample(Dual::variable(x, 0), Dual::constant(y)).d[0];
            let mixed = (slope(y + h) - slope(y - h)) / (2.0 * h);
            prop_assert!((outer(y).d[0].d[0] - mixed).abs() < 1e-6 * (1.0 + mixed.abs()));
        }
    }
}
