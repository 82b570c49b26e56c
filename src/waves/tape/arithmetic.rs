//! The arithmetics a tape is run in.

use crate::numerics::analytic::{Region, TAYLOR};
use crate::numerics::dual::Real;
use crate::numerics::number::{Bounding, Over};
use crate::waves::complex::Cx;
use crate::waves::law::{self, Law};

/// Arithmetic the tape is run in. Everything is to be inlined always: only so is it compiled for the
/// instruction set of the lanes it is run in.
pub(in crate::waves) trait Arithmetic<T: Real> {
    type Element: Copy;
    fn zero(&self) -> Self::Element;
    fn one(&self) -> Self::Element;
    fn add(&self, a: Self::Element, b: Self::Element) -> Self::Element;
    fn scaled(&self, k: T, x: Self::Element) -> Self::Element;
    fn add_scaled(&self, sum: Self::Element, k: T, x: Self::Element) -> Self::Element;
    fn product(&self, a: Self::Element, b: Self::Element) -> Self::Element;
    type Delay: Copy;
    /// `exp(-s t)`.
    fn delay(&self, t: T) -> Self::Delay;
    /// `exp(-s t) x`.
    fn delayed(&self, e: Self::Delay, t: T, x: Self::Element) -> Self::Element;
    fn law(&self, law: &Law<T>) -> Self::Element;
    /// `F(s) x`.
    #[inline(always)]
    fn answer(&self, law: &Law<T>, x: Self::Element) -> Self::Element {
        match law {
            Law::Delays(delays) => match delays.as_slice() {
                [one] if one.spread.is_exactly_zero() => {
                    self.delayed(self.delay(one.delay), one.delay, self.scaled(one.weight, x))
                }
                _ => self.product(self.law(law), x),
            },
            _ => self.product(self.law(law), x),
        }
    }
}

/// Taylor series of order `N - 1` about a point, or about several points at once.
pub(in crate::waves) struct Taylor<V, const N: usize>(pub Cx<V>);

impl<T: Real, V: Over<T>, const N: usize> Arithmetic<T> for Taylor<V, N> {
    type Element = [Cx<V>; N];
    #[inline(always)]
    fn zero(&self) -> Self::Element {
        [Cx::from_real(T::from(0.0), T::from(0.0)); N]
    }
    #[inline(always)]
    fn one(&self) -> Self::Element {
        let mut one = self.zero();
        one[0] = Cx::from_real(T::from(1.0), T::from(0.0));
        one
    }
    #[inline(always)]
    fn add(&self, mut a: Self::Element, b: Self::Element) -> Self::Element {
        for i in 0..N {
            a[i] = a[i] + b[i];
        }
        a
    }
    #[inline(always)]
    fn scaled(&self, k: T, mut x: Self::Element) -> Self::Element {
        for x in &mut x {
            *x = x.scale(k);
        }
        x
    }
    #[inline(always)]
    fn add_scaled(&self, mut sum: Self::Element, k: T, x: Self::Element) -> Self::Element {
        for i in 0..N {
            sum[i] = x[i].scale_add(k, sum[i]);
        }
        sum
    }
    #[inline(always)]
    fn product(&self, a: Self::Element, b: Self::Element) -> Self::Element {
        law::product(&a, &b)
    }
    type Delay = Cx<V>;
    #[inline(always)]
    fn delay(&self, t: T) -> Cx<V> {
        self.0.scale(-t).exp()
    }
    /// By `(e x)_k = e y_k` with `y_k = sum_j (-t)^j/j! x_{k-j}`.
    #[inline(always)]
    fn delayed(&self, e: Cx<V>, t: T, x: Self::Element) -> Self::Element {
        let mut y = x;
        for k in 0..N {
            let mut weight = T::from(1.0);
            for j in 1..=k {
                weight = weight * -t / j as f64;
                y[k] = x[k - j].scale_add(weight, y[k]);
            }
            y[k] = e * y[k];
        }
        y
    }
    #[inline(always)]
    fn law(&self, law: &Law<T>) -> Self::Element {
        law.taylor(self.0)
    }
}

/// Bounds over a region, or over several at once.
pub(in crate::waves) struct Majorant<'a, V>(pub &'a Region<V>);

impl<V: Bounding> Arithmetic<f64> for Majorant<'_, V> {
    type Element = [V; TAYLOR];
    #[inline(always)]
    fn zero(&self) -> Self::Element {
        [V::constant(0.0); TAYLOR]
    }
    #[inline(always)]
    fn one(&self) -> Self::Element {
        let mut one = self.zero();
        one[0] = V::constant(1.0);
        one
    }
    #[inline(always)]
    fn add(&self, mut a: Self::Element, b: Self::Element) -> Self::Element {
        for i in 0..TAYLOR {
            a[i] = a[i] + b[i];
        }
        a
    }
    #[inline(always)]
    fn scaled(&self, k: f64, mut x: Self::Element) -> Self::Element {
        let k = k.abs();
        for x in &mut x {
            *x = x.scaled(k);
        }
        x
    }
    #[inline(always)]
    fn add_scaled(&self, mut sum: Self::Element, k: f64, x: Self::Element) -> Self::Element {
        let k = k.abs();
        for i in 0..TAYLOR {
            sum[i] = x[i].scaled_add(k, sum[i]);
        }
        sum
    }
    #[inline(always)]
    fn product(&self, a: Self::Element, b: Self::Element) -> Self::Element {
        law::real_product(&a, &b)
    }
    type Delay = V;
    #[inline(always)]
    fn delay(&self, t: f64) -> V {
        self.0.growth.0.scaled(-t).exp()
    }
    #[inline(always)]
    fn delayed(&self, e: V, t: f64, x: Self::Element) -> Self::Element {
        let mut y = x;
        for k in 0..TAYLOR {
            let mut weight = 1.0;
            for j in 1..=k {
                weight *= t.abs() / j as f64;
                y[k] = x[k - j].scaled_add(weight, y[k]);
            }
            y[k] = e * y[k];
        }
        y
    }
    #[inline(always)]
    fn law(&self, law: &Law<f64>) -> Self::Element {
        law.majorant(self.0)
    }
}
