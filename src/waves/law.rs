//! The closed set of scalar laws `F(s)` a primitive may carry.
//!
//! ```text
//! Delays      F(s) = sum_k w_k exp(-s t_k + s^2 d_k^2/2)    a signed measure of delays
//! Polynomial  F(s) = (a_0 + a_1 s + a_2 s^2) exp(-s t)
//! Complex     F(s) = (a + i b) exp(-s t)                    for Im s > 0; conjugate below
//! ```
//!
//! `t` delays (s), `d` standard deviations (s). Each law evaluates itself in every arithmetic, so an
//! element that carries one needs no line of its own.

use super::complex::Cx;
use crate::numerics::analytic::{Region, TAYLOR};
use crate::numerics::dual::Real;
use crate::numerics::number::{Bounding, Number, Over};

/// One contribution to a measure of delays: normally distributed about `delay`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Delayed<T> {
    /// Signed weight.
    pub weight: T,
    /// Mean delay (s).
    pub delay: T,
    /// Standard deviation of the delay (s); zero for a sharp delay.
    pub spread: T,
}

/// A scalar law `F(s)`.
#[derive(Clone, Debug, PartialEq)]
pub enum Law<T> {
    /// A signed measure of delays.
    Delays(Vec<Delayed<T>>),
    /// A polynomial in `s`, lowest power first, times a delay.
    Polynomial {
        /// `a_0, a_1, a_2`.
        coefficients: [T; 3],
        /// Delay (s).
        delay: T,
    },
    /// A complex constant times a delay. Breaks conjugate symmetry of the analytic continuation.
    Complex {
        /// Real part.
        re: T,
        /// Imaginary part, for positive frequency.
        im: T,
        /// Delay (s).
        delay: T,
    },
}

impl<T> Law<T> {
    /// The same law in another number type.
    pub fn map<U>(&self, f: impl Fn(&T) -> U) -> Law<U> {
        match self {
            Law::Delays(delays) => Law::Delays(
                delays
                    .iter()
                    .map(|d| Delayed {
                        weight: f(&d.weight),
                        delay: f(&d.delay),
                        spread: f(&d.spread),
                    })
                    .collect(),
            ),
            Law::Polynomial {
                coefficients,
                delay,
            } => Law::Polynomial {
                coefficients: coefficients.each_ref().map(&f),
                delay: f(delay),
            },
            Law::Complex { re, im, delay } => Law::Complex {
                re: f(re),
                im: f(im),
                delay: f(delay),
            },
        }
    }
}

impl<T: Real> Law<T> {
    /// `F(s) = s`.
    pub fn s() -> Self {
        let zero = T::from(0.0);
        Law::Polynomial {
            coefficients: [zero, T::from(1.0), zero],
            delay: zero,
        }
    }

    /// A pure delay `exp(-s t)`.
    pub fn pure_delay(delay: T) -> Self {
        Law::Delays(vec![Delayed {
            weight: T::from(1.0),
            delay,
            spread: T::from(0.0),
        }])
    }

    /// The same law times `exp(-s extra)`.
    #[must_use]
    pub fn delayed(&self, extra: T) -> Self {
        match self {
            Law::Delays(d) => Law::Delays(
                d.iter()
                    .map(|d| Delayed {
                        delay: d.delay + extra,
                        ..*d
                    })
                    .collect(),
            ),
            Law::Polynomial {
                coefficients,
                delay,
            } => Law::Polynomial {
                coefficients: *coefficients,
                delay: *delay + extra,
            },
            Law::Complex { re, im, delay } => Law::Complex {
                re: *re,
                im: *im,
                delay: *delay + extra,
            },
        }
    }

    /// Takes the numbers of `other`, times `exp(-s extra)`; `None` where that is of another form.
    pub fn renew(&mut self, other: &Law<T>, extra: T) -> Option<()> {
        if let (Law::Delays(mine), Law::Delays(theirs)) = (&mut *self, other) {
            if mine.len() != theirs.len() {
                return None;
            }
            for (mine, theirs) in mine.iter_mut().zip(theirs) {
                *mine = Delayed {
                    delay: theirs.delay + extra,
                    ..*theirs
                };
            }
        } else if std::mem::discriminant(self) == std::mem::discriminant(other) {
            *self = other.delayed(extra);
        } else {
            return None;
        }
        Some(())
    }

    /// Whether `F(conj s) = conj F(s)` holds for the analytic function itself.
    pub fn is_symmetric(&self) -> bool {
        !matches!(self, Law::Complex { .. })
    }

    /// Number of rounded operations behind one value, for the rounding floor.
    pub fn operations(&self) -> f64 {
        match self {
            Law::Delays(d) => 9.0 + 4.0 * d.len() as f64,
            Law::Polynomial { .. } => 17.0,
            Law::Complex { .. } => 11.0,
        }
    }

    /// The first `N` Taylor coefficients of `F` about `s`.
    #[inline(always)]
    pub fn taylor<V: Over<T>, const N: usize>(&self, s: Cx<V>) -> [Cx<V>; N] {
        let zero = T::from(0.0);
        match self {
            Law::Delays(delays) => {
                let mut sum = [Cx::from_real(zero, zero); N];
                for d in delays {
                    let part: [Cx<V>; N] = exponential(s, d.delay, d.spread);
                    for (a, b) in sum.iter_mut().zip(part) {
                        *a = b.scale_add(d.weight, *a);
                    }
                }
                sum
            }
            Law::Polynomial {
                coefficients: [a, b, c],
                delay,
            } => {
                let real = |x: T| Cx::from_real(x, zero);
                let sc = s.scale(*c);
                let mut p = [real(zero); N];
                for (k, slot) in p.iter_mut().enumerate() {
                    *slot = match k {
                        0 => real(*a) + s * (real(*b) + sc),
                        1 => real(*b) + sc + sc,
                        2 => real(*c),
                        _ => *slot,
                    };
                }
                if delay.is_exactly_zero() {
                    p
                } else {
                    product(&p, &point_delay(s, *delay))
                }
            }
            Law::Complex { re, im, delay } => {
                let constant = Cx::new(V::constant(*re), V::constant(*im));
                {
                    let mut e: [Cx<V>; N] = point_delay(s, *delay);
                    for e in &mut e {
                        *e = *e * constant;
                    }
                    e
                }
            }
        }
    }
}

/// Taylor coefficients of `exp(-s t)`.
#[inline(always)]
pub fn point_delay<T: Real, V: Over<T>, const N: usize>(s: Cx<V>, t: T) -> [Cx<V>; N] {
    let mut e = [s.scale(-t).exp(); N];
    for k in 1..N {
        e[k] = e[k - 1].scale(-t / k as f64);
    }
    e
}

/// Taylor coefficients of `exp(g)`, `g = -s t + s^2 d^2/2`, by `k e_k = sum_j j g_j e_{k-j}`.
#[inline(always)]
fn exponential<T: Real, V: Over<T>, const N: usize>(s: Cx<V>, t: T, d: T) -> [Cx<V>; N] {
    if d.is_exactly_zero() {
        return point_delay(s, t);
    }
    let half = d * d * 0.5;
    let g0 = (s * s).scale_add(half, s.scale(-t));
    let g1 = s.scale_add(half * 2.0, Cx::from_real(-t, T::from(0.0)));
    let mut e = [g0.exp(); N];
    for k in 1..N {
        let mut next = g1 * e[k - 1];
        if k >= 2 {
            next = e[k - 2].scale_add(half * 2.0, next);
        }
        e[k] = next.scale(T::from(1.0 / k as f64));
    }
    e
}

/// Product of two Taylor series.
#[inline(always)]
pub fn product<V: Number, const N: usize>(a: &[Cx<V>; N], b: &[Cx<V>; N]) -> [Cx<V>; N] {
    let mut c = *b;
    for k in 0..N {
        let mut sum = a[0] * b[k];
        for j in 1..=k {
            sum = sum + a[j] * b[k - j];
        }
        c[k] = sum;
    }
    c
}

/// Bounds of `|F^(k)|/k!`, `k = 0..TAYLOR`, over a region.
///
/// A measure of delays is bounded as a measure: `|F^(k)| <= integral |t|^k exp(-sigma t) d|mu|`,
/// which is convex in `sigma`, so its greatest value is at an edge of the region. Where a spread delay
/// has faded, its closed form `|exp(g)| = exp(-sigma t + (sigma^2 - omega^2) d^2/2)` bounds it better;
/// the lesser of the two counts.
impl Law<f64> {
    /// The bounds.
    #[inline(always)]
    pub fn majorant<V: Bounding>(&self, region: &Region<V>) -> [V; TAYLOR] {
        let real = V::constant;
        match self {
            Law::Delays(delays) => {
                let mut sum = [real(0.0); TAYLOR];
                for d in delays {
                    let part = spread_majorant(region, d.delay, d.spread);
                    for (a, b) in sum.iter_mut().zip(part) {
                        *a = b.scaled_add(d.weight.abs(), *a);
                    }
                }
                sum
            }
            Law::Polynomial {
                coefficients: [a, b, c],
                delay,
            } => {
                let r = region.modulus;
                let [a, b, c] = [a.abs(), b.abs(), c.abs()];
                let mut p = [real(0.0); TAYLOR];
                p[0] = r.scaled_add(c, real(b)).mul_add(r, real(a));
                p[1] = r.scaled_add(2.0 * c, real(b));
                p[2] = real(c);
                real_product(&p, &delay_majorant(region, *delay))
            }
            Law::Complex { re, im, delay } => {
                let size = re.hypot(*im);
                delay_majorant(region, *delay).map(|e| e.scaled(size))
            }
        }
    }
}

/// Bounds for `exp(-s t)`, `t >= 0`.
#[inline(always)]
pub fn delay_majorant<V: Bounding>(region: &Region<V>, t: f64) -> [V; TAYLOR] {
    let mut e = [region.growth.0.scaled(-t).exp(); TAYLOR];
    for k in 1..TAYLOR {
        e[k] = e[k - 1].scaled(t / k as f64);
    }
    e
}

#[inline(always)]
fn spread_majorant<V: Bounding>(region: &Region<V>, t: f64, d: f64) -> [V; TAYLOR] {
    if d == 0.0 {
        return delay_majorant(region, t);
    }
    let a = shifted_moments(region.growth.0, t, d);
    let b = shifted_moments(region.growth.1, t, d);
    let faded = faded_majorant(region, t, d);
    let mut least = a;
    for k in 0..TAYLOR {
        least[k] = a[k].max(b[k]).min(faded[k]);
    }
    least
}

/// `exp(-sigma t)` times a normal density is a shifted normal density: mean `t - sigma d^2`, same spread.
/// Odd absolute moments by Cauchy-Schwarz from the even ones.
#[inline(always)]
fn shifted_moments<V: Bounding>(sigma: V, t: f64, d: f64) -> [V; TAYLOR] {
    let d2 = d * d;
    let m = sigma.scaled_add(-d2, V::constant(t));
    let scale = (sigma * sigma).scaled_add(0.5 * d2, sigma.scaled(-t)).exp();
    let m2 = m * m;
    let second = m2 + V::constant(d2);
    let fourth = m2.mul_add(m2 + V::constant(6.0 * d2), V::constant(3.0 * d2 * d2));
    [
        scale,
        scale * second.sqrt(),
        (scale * second).scaled(0.5),
        (scale * (second * fourth).sqrt()).scaled(1.0 / 6.0),
        (scale * fourth).scaled(1.0 / 24.0),
    ]
}

/// From `g = -s t + s^2 d^2/2`: the greatest `|exp(g)|`, and `k e_k <= |g'| e_{k-1} + d^2 e_{k-2}`.
#[inline(always)]
fn faded_majorant<V: Bounding>(region: &Region<V>, t: f64, d: f64) -> [V; TAYLOR] {
    let (d2, (low, high)) = (d * d, region.growth);
    let exponent = |sigma: V| {
        let squares = (sigma - region.omega) * (sigma + region.omega);
        squares.scaled_add(0.5 * d2, sigma.scaled(-t))
    };
    let slope_at = |sigma: V| sigma.scaled_add(-d2, V::constant(t)).abs();
    let real = slope_at(low).max(slope_at(high));
    let imaginary = region.modulus.scaled(d2);
    let slope = real.mul_add(real, imaginary * imaginary).sqrt();
    let mut e = [exponent(low).max(exponent(high)).exp(); TAYLOR];
    for k in 1..TAYLOR {
        let mut next = slope * e[k - 1];
        if k >= 2 {
            next = e[k - 2].scaled_add(d2, next);
        }
        e[k] = next.scaled(1.0 / k as f64);
    }
    e
}

/// Product of two series of bounds.
#[inline(always)]
pub fn real_product<V: Number>(a: &[V; TAYLOR], b: &[V; TAYLOR]) -> [V; TAYLOR] {
    let mut c = *b;
    for k in 0..TAYLOR {
        let mut sum = a[0] * b[k];
        for j in 1..=k {
            sum = a[j].mul_add(b[k - j], sum);
        }
        c[k] = sum;
    }
    c
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn laws() -> impl Strategy<Value = Law<f64>> {
        let delayed = (
            -3.0..3.0f64,
            0.0..0.02f64,
            prop_oneof![Just(0.0), 0.0..0.004f64],
        )
            .prop_map(|(weight, delay, spread)| Delayed {
                weight,
                delay,
                spread,
            });
        prop_oneof![
            prop::collection::vec(delayed, 1..4).prop_map(Law::Delays),
            (prop::array::uniform3(-1.0..1.0f64), 0.0..0.01f64).prop_map(|([a, b, c], delay)| {
                Law::Polynomial {
                    coefficients: [a, b * 1e-3, c * 1e-6],
                    delay,
                }
            }),
            (-1.0..1.0f64, -1.0..1.0f64, 0.0..0.01f64).prop_map(|(re, im, delay)| Law::Complex {
                re,
                im,
                delay
            }),
        ]
    }

    proptest! {
        #[test]
        fn sampled_values_never_exceed_the_bounds(
            law in laws(),
            growth in -600.0..600.0f64,
            width in 0.0..300.0f64,
            position in 0.0..1.0f64,
            omega in -6000.0..6000.0f64,
            share in 0.0..=1.0f64,
        ) {
            let s = Cx::new(growth + position * width, omega);
            let region = Region {
                growth: (growth, growth + width),
                modulus: (growth.abs().max((growth + width).abs())).hypot(omega),
                omega: omega.abs() * share,
            };
            let values: [Cx<f64>; TAYLOR] = law.taylor(s);
            let bounds = law.majorant(&region);
            for (v, b) in values.iter().zip(bounds) {
                prop_assert!(v.value().norm() <= b * (1.0 + 1e-12) + 1e-300);
            }
        }

        #[test]
        fn coefficients_sum_to_the_value_nearby(law in laws(), re in -300.0..300.0f64, im in 0.0..5000.0f64) {
            let s = Cx::new(re, im);
            let h = Cx::new(3.0, -2.0);
            let t: [Cx<f64>; 5] = law.taylor(s);
            let sum = t.iter().rev().fold(Cx::real(0.0), |acc, &c| acc * h + c);
            let exact: [Cx<f64>; 1] = law.taylor(s + h);
            let size = 1.0 + exact[0].value().norm() + t[0].value().norm();
            prop_assert!((sum - exact[0]).value().norm() < 1e-5 * size);
        }
    }

    #[test]
    fn bounds_are_attained_on_the_real_axis() {
        // A positive measure and a growth rate at the region's edge: equality, so half of the bound
        // would be exceeded.
        let law = Law::Delays(vec![Delayed {
            weight: 2.0,
            delay: 0.003,
            spread: 0.0,
        }]);
        let region = Region {
            growth: (-50.0, 80.0),
            modulus: 100.0,
            omega: 0.0,
        };
        let v: [Cx<f64>; TAYLOR] = law.taylor(Cx::new(-50.0, 0.0));
        for (v, b) in v.iter().zip(law.majorant(&region)) {
            assert!((v.value().norm() / b - 1.0).abs() < 1e-14);
        }
    }

    #[test]
    fn a_spread_delay_that_has_faded_is_bounded_by_what_is_left_of_it() {
        let law = Law::Delays(vec![Delayed {
            weight: 1.0,
            delay: 0.02,
            spread: 5e-3,
        }]);
        for (re, im) in [(-300.0, 2600.0), (40.0, 900.0), (-10.0, 1800.0)] {
            let point = Region::disc(num_complex::Complex64::new(re, im), 0.0);
            let v: [Cx<f64>; TAYLOR] = law.taylor(Cx::new(re, im));
            let bounds = law.majorant(&point);
            assert!((v[0].value().norm() / bounds[0] - 1.0).abs() < 1e-12);
            let slope = v[1].value().norm() / bounds[1];
            assert!((0.95..1.0 + 1e-12).contains(&slope), "{slope}");
        }
    }
}
