//! A complex number over any [`Number`]: what [`num_complex`] offers needs a full numeric tower that
//! numbers with derivatives, and eight numbers at once, do not have.

use std::ops::{Add, Mul, Neg, Sub};

use num_complex::Complex64;

use crate::numerics::dual::Real;
use crate::numerics::number::{Number, Over};

/// `re + i im`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Cx<T> {
    /// Real part.
    pub re: T,
    /// Imaginary part.
    pub im: T,
}

impl<T> Cx<T> {
    /// From its parts.
    #[inline(always)]
    pub fn new(re: T, im: T) -> Self {
        Cx { re, im }
    }
}

impl<T: Real> Cx<T> {
    /// A real number.
    pub fn real(re: T) -> Self {
        Cx {
            re,
            im: T::from(0.0),
        }
    }

    /// A plain complex number as a constant.
    pub fn constant(z: Complex64) -> Self {
        Cx {
            re: T::from(z.re),
            im: T::from(z.im),
        }
    }

    /// The value without derivatives.
    pub fn value(self) -> Complex64 {
        Complex64::new(self.re.value(), self.im.value())
    }
}

impl<V: Number> Cx<V> {
    /// A constant of an arithmetic with real constants of type `T`.
    #[inline(always)]
    pub fn from_real<T>(re: T, zero: T) -> Self
    where
        V: Over<T>,
    {
        Cx {
            re: V::constant(re),
            im: V::constant(zero),
        }
    }

    /// `k self` for a real constant.
    #[must_use]
    #[inline(always)]
    pub fn scale<T: Copy>(self, k: T) -> Self
    where
        V: Over<T>,
    {
        Cx {
            re: self.re.scaled(k),
            im: self.im.scaled(k),
        }
    }

    /// `k self + to` for a real constant.
    #[must_use]
    #[inline(always)]
    pub fn scale_add<T: Copy>(self, k: T, to: Self) -> Self
    where
        V: Over<T>,
    {
        Cx {
            re: self.re.scaled_add(k, to.re),
            im: self.im.scaled_add(k, to.im),
        }
    }

    /// `exp(self)`.
    #[must_use]
    #[inline(always)]
    pub fn exp<T>(self) -> Self
    where
        V: Over<T>,
    {
        let r = self.re.exp();
        let (sin, cos) = self.im.sin_cos();
        Cx {
            re: r * cos,
            im: r * sin,
        }
    }
}

impl<T: Number> Add for Cx<T> {
    type Output = Self;
    #[inline(always)]
    fn add(self, o: Self) -> Self {
        Cx {
            re: self.re + o.re,
            im: self.im + o.im,
        }
    }
}

impl<T: Number> Sub for Cx<T> {
    type Output = Self;
    #[inline(always)]
    fn sub(self, o: Self) -> Self {
        Cx {
            re: self.re - o.re,
            im: self.im - o.im,
        }
    }
}

impl<T: Number> Mul for Cx<T> {
    type Output = Self;
    #[inline(always)]
    fn mul(self, o: Self) -> Self {
        Cx {
            re: self.im.neg_mul_add(o.im, self.re * o.re),
            im: self.re.mul_add(o.im, self.im * o.re),
        }
    }
}

impl<T: Number> Neg for Cx<T> {
    type Output = Self;
    #[inline(always)]
    fn neg(self) -> Self {
        Cx {
            re: -self.re,
            im: -self.im,
        }
    }
}
