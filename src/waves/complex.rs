//! A complex number over any [`Real`]: what [`num_complex`] offers needs a full numeric tower that
//! numbers with derivatives do not have.

use std::ops::{Add, Mul, Neg, Sub};

use num_complex::Complex64;

use crate::numerics::dual::Real;

/// `re + i im`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Cx<T> {
    /// Real part.
    pub re: T,
    /// Imaginary part.
    pub im: T,
}

impl<T: Real> Cx<T> {
    /// From its parts.
    pub fn new(re: T, im: T) -> Self {
        Cx { re, im }
    }

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

    /// `self * k` for real `k`.
    #[must_use]
    #[inline]
    pub fn scale(self, k: T) -> Self {
        Cx {
            re: self.re * k,
            im: self.im * k,
        }
    }

    /// `exp(self)`.
    #[must_use]
    #[inline]
    pub fn exp(self) -> Self {
        let r = self.re.exp();
        Cx {
            re: r * self.im.cos(),
            im: r * self.im.sin(),
        }
    }

    /// The value without derivatives.
    pub fn value(self) -> Complex64 {
        Complex64::new(self.re.value(), self.im.value())
    }
}

impl<T: Real> Add for Cx<T> {
    type Output = Self;
    #[inline]
    fn add(self, o: Self) -> Self {
        Cx {
            re: self.re + o.re,
            im: self.im + o.im,
        }
    }
}

impl<T: Real> Sub for Cx<T> {
    type Output = Self;
    #[inline]
    fn sub(self, o: Self) -> Self {
        Cx {
            re: self.re - o.re,
            im: self.im - o.im,
        }
    }
}

impl<T: Real> Mul for Cx<T> {
    type Output = Self;
    #[inline]
    fn mul(self, o: Self) -> Self {
        Cx {
            re: self.re * o.re - self.im * o.im,
            im: self.re * o.im + self.im * o.re,
        }
    }
}

impl<T: Real> Neg for Cx<T> {
    type Output = Self;
    fn neg(self) -> Self {
        Cx {
            re: -self.re,
            im: -self.im,
        }
    }
}
