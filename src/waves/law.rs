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

    /// Whether `F(conj s) = conj F(s)` holds for the analytic function itself.
    pub fn is_symmetric(&self) -> bool {
        !matches!(self, Law::Complex { .. })
    }

    /// Number of rounded operations behind one value, for the rounding floor.
    pub fn operations(&self) -> f64 {
        match self {
            Law::Delays(d) => 8.0 + 4.0 * d.len() as f64,
            Law::Polynomial { .. } => 16.0,
            Law::Complex { .. } => 10.0,
        }
    }

    /// The first `N` Taylor coefficients of `F` about `s`.
    #[inline]
    pub fn taylor<const N: usize>(&self, s: Cx<T>) -> [Cx<T>; N] {
        match self {
            Law::Delays(delays) => {
                let mut sum = [Cx::real(T::from(0.0)); N];
                for d in delays {
                    let part: [Cx<T>; N] = exponential(s, d.delay, d.spread);
                    for (a, b) in sum.iter_mut().zip(part) {
                        *a = *a + b.scale(d.weight);
                    }
                }
                sum
            }
            Law::Polynomial {
                coefficients: [a, b, c],
                delay,
            } => {
                let sc = s.scale(*c);
                let mut p = [Cx::real(T::from(0.0)); N];
                for (k, slot) in p.iter_mut().enumerate() {
                    *slot = match k {
                        0 => Cx::real(*a) + s * (Cx::real(*b) + sc),
                        1 => Cx::real(*b) + sc + sc,
                        2 => Cx::real(*c),
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
                point_delay(s, *delay).map(|e: Cx<T>| e * Cx::new(*re, *im))
            }
        }
    }
}

/// Taylor coefficients of `exp(-s t)`.
#[inline]
pub fn point_delay<T: Real, const N: usize>(s: Cx<T>, t: T) -> [Cx<T>; N] {
    let mut e = [(-s).scale(t).exp(); N];
    for k in 1..N {
        e[k] = e[k - 1].scale(-t / k as f64);
    }
    e
}

/// Taylor coefficients of `exp(g)`, `g = -s t + s^2 d^2/2`, by `k e_k = sum_j j g_j e_{k-j}`.
fn exponential<T: Real, const N: usize>(s: Cx<T>, t: T, d: T) -> [Cx<T>; N] {
    if d.is_exactly_zero() {
        return point_delay(s, t);
    }
    let half = d * d * 0.5;
    let g0 = (-s).scale(t) + (s * s).scale(half);
    let g1 = Cx::real(-t) + s.scale(half * 2.0);
    let mut e = [g0.exp(); N];
    for k in 1..N {
        let mut next = g1 * e[k - 1];
        if k >= 2 {
            next = next + e[k - 2].scale(half * 2.0);
        }
        e[k] = next.scale(T::from(1.0 / k as f64));
    }
    e
}

/// Product of two Taylor series.
#[inline]
pub fn product<T: Real, const N: usize>(a: &[Cx<T>; N], b: &[Cx<T>; N]) -> [Cx<T>; N] {
    std::array::from_fn(|k| {
        let mut sum = a[0] * b[k];
        for j in 1..=k {
            sum = sum + a[j] * b[k - j];
        }
        sum
    })
}

/// Bounds of `|F^(k)|/k!`, `k = 0..TAYLOR`, over a region.
///
/// A measure of delays is bounded as a measure: `|F^(k)| <= integral |t|^k exp(-sigma t) d|mu|`,
/// which is convex in `sigma`, so its greatest value is at an edge of the region. Where a spread delay
/// has faded, its closed form `|exp(g)| = exp(-sigma t + (sigma^2 - omega^2) d^2/2)` bounds it better;
/// the lesser of the two counts.
impl Law<f64> {
    /// The bounds.
    pub fn majorant(&self, region: &Region) -> [f64; TAYLOR] {
        match self {
            Law::Delays(delays) => {
                let mut sum = [0.0; TAYLOR];
                for d in delays {
                    let part = spread_majorant(region, d.delay, d.spread);
                    for (a, b) in sum.iter_mut().zip(part) {
                        *a += d.weight.abs() * b;
                    }
                }
                sum
            }
            Law::Polynomial {
                coefficients: [a, b, c],
                delay,
            } => {
                let r = region.modulus;
                let mut p = [0.0; TAYLOR];
                p[0] = a.abs() + r * (b.abs() + r * c.abs());
                p[1] = b.abs() + 2.0 * r * c.abs();
                p[2] = c.abs();
                real_product(&p, &delay_majorant(region, *delay))
            }
            Law::Complex { re, im, delay } => {
                delay_majorant(region, *delay).map(|e| e * re.hypot(*im))
            }
        }
    }
}

/// Bounds for `exp(-s t)`, `t >= 0`.
#[inline]
pub fn delay_majorant(region: &Region, t: f64) -> [f64; TAYLOR] {
    let mut e = [(-region.growth.0 * t).exp(); TAYLOR];
    for k in 1..TAYLOR {
        e[k] = e[k - 1] * t / k as f64;
    }
    e
}

fn spread_majorant(region: &Region, t: f64, d: f64) -> [f64; TAYLOR] {
    if d == 0.0 {
        return delay_majorant(region, t);
    }
    let edge = |sigma: f64| {
        // exp(-sigma t) times a normal density is a shifted normal density: mean m, same spread.
        let m = t - sigma * d * d;
        let scale = (-sigma * t + 0.5 * (sigma * d).powi(2)).exp();
        let (m2, d2) = (m * m, d * d);
        let second = m2 + d2;
        let fourth = m2 * m2 + 6.0 * m2 * d2 + 3.0 * d2 * d2;
        // Odd absolute moments by Cauchy-Schwarz from the even ones.
        [
            scale,
            scale * second.sqrt(),
            scale * second / 2.0,
            scale * (second * fourth).sqrt() / 6.0,
            scale * fourth / 24.0,
        ]
    };
    let (a, b) = (edge(region.growth.0), edge(region.growth.1));
    let faded = faded_majorant(region, t, d);
    std::array::from_fn(|k| a[k].max(b[k]).min(faded[k]))
}

/// From `g = -s t + s^2 d^2/2`: the greatest `|exp(g)|`, and `k e_k <= |g'| e_{k-1} + d^2 e_{k-2}`.
fn faded_majorant(region: &Region, t: f64, d: f64) -> [f64; TAYLOR] {
    let (d2, (low, high)) = (d * d, region.growth);
    let exponent =
        |sigma: f64| -sigma * t + 0.5 * (sigma - region.omega) * (sigma + region.omega) * d2;
    let real = (t - low * d2).abs().max((t - high * d2).abs());
    let slope = real.hypot(region.modulus * d2);
    let mut e = [exponent(low).max(exponent(high)).exp(); TAYLOR];
    for k in 1..TAYLOR {
        let before = if k >= 2 { e[k - 2] * d2 } else { 0.0 };
        e[k] = (slope * e[k - 1] + before) / k as f64;
    }
    e
}

/// Product of two series of bounds.
#[inline]
pub fn real_product(a: &[f64; TAYLOR], b: &[f64; TAYLOR]) -> [f64; TAYLOR] {
    std::array::from_fn(|k| (0..=k).map(|j| a[j] * b[k - j]).sum())
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
