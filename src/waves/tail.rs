//! Proof that a characteristic function has no zero far to the right in a band of frequency.
//!
//! ```text
//! D(s) = D_0(s) + R(s)
//! ```
//!
//! `D_0` collects the products of the tape that hold no delay: a polynomial. Every product in `R` holds a
//! delay, so that on `Re s >= g`, `|s| = r`
//!
//! ```text
//! |R(s)| <= sum_k c_k r^k exp(-(Re s - g) t),     t the shortest delay
//! ```
//!
//! with `c_k` from the moduli of all coefficients. Where every zero `z_j` of `D_0`, of degree `m` and leading
//! coefficient `d`, lies left of `g`, each factor obeys
//!
//! ```text
//! |s - z_j| >= g - Re z_j,     r/|s - z_j| <= 1 + |z_j|/(g - Re z_j)
//! ```
//!
//! so that `r^k/|D_0|` is bounded for `k <= m`; for `k = m + p` the power left over is bounded, in a band
//! `|Im s| <= w`, by `r^p exp(-(Re s - g) t) <= (g + w)^p` once `g + w >= p/t`. `D` has no zero where the sum of
//! these bounds stays below one. A coefficient of `D_0` at rounding level against the moduli of its products
//! is taken as zero, which it is where products cancel identically.

use nalgebra::DMatrix;
use num_complex::Complex64;

use super::law::Law;
use super::tape::{Arithmetic, Tape};

/// Highest power of `s` covered.
const MOST: usize = 20;

/// A coefficient below this share of the moduli of its products is zero.
const CANCELLED: f64 = 1e-11;

/// Why nothing is proved however far to the right one looks.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Unbounded {
    /// A spread delay has a part ahead of its cause, which outgrows everything. `|exp(-s t + s^2 d^2/2)|` falls
    /// up to the growth rate `t/d^2`: the least of these (1/s).
    Spread(f64),
    /// A delay is negative.
    Negative,
    /// More powers of `s` than covered.
    Degree,
    /// Without its delays the function vanishes.
    Vanishes,
}

/// Polynomials in `s`: the part without delays, the moduli of its products, and a bound of the rest,
/// of fewer than `N` powers.
#[derive(Clone, Copy)]
struct Parts<const N: usize> {
    prompt: [Complex64; N],
    moduli: [f64; N],
    late: [f64; N],
    degree: usize,
}

struct Split<const N: usize> {
    growth: f64,
}

impl<const N: usize> Split<N> {
    fn constant(value: Complex64, late: f64) -> Parts<N> {
        let mut parts = Parts {
            prompt: [Complex64::ZERO; N],
            moduli: [0.0; N],
            late: [0.0; N],
            degree: 0,
        };
        parts.prompt[0] = value;
        parts.moduli[0] = value.norm();
        parts.late[0] = late;
        parts
    }

    fn decayed(&self, t: f64) -> f64 {
        (-self.growth * t).exp()
    }
}

impl<const N: usize> Arithmetic<f64> for Split<N> {
    type Element = Parts<N>;

    fn zero(&self) -> Parts<N> {
        Self::constant(Complex64::ZERO, 0.0)
    }

    fn one(&self) -> Parts<N> {
        Self::constant(Complex64::ONE, 0.0)
    }

    fn add(&self, a: Parts<N>, b: Parts<N>) -> Parts<N> {
        self.add_scaled(a, 1.0, b)
    }

    fn scaled(&self, k: f64, x: Parts<N>) -> Parts<N> {
        self.add_scaled(self.zero(), k, x)
    }

    fn add_scaled(&self, mut sum: Parts<N>, k: f64, x: Parts<N>) -> Parts<N> {
        sum.degree = sum.degree.max(x.degree);
        for i in 0..=x.degree {
            sum.prompt[i] += x.prompt[i] * k;
            sum.moduli[i] += x.moduli[i] * k.abs();
            sum.late[i] += x.late[i] * k.abs();
        }
        sum
    }

    fn product(&self, a: Parts<N>, b: Parts<N>) -> Parts<N> {
        let mut sum = self.zero();
        // More powers would pile up in the last place; the caller allows for all.
        let last = N - 1;
        sum.degree = (a.degree + b.degree).min(last);
        for i in 0..=a.degree {
            for j in 0..=b.degree {
                let k = (i + j).min(last);
                sum.prompt[k] += a.prompt[i] * b.prompt[j];
                sum.moduli[k] += a.moduli[i] * b.moduli[j];
                sum.late[k] += a.moduli[i] * b.late[j] + a.late[i] * (b.moduli[j] + b.late[j]);
            }
        }
        sum
    }

    type Delay = Parts<N>;

    fn delayed(&self, e: Parts<N>, _: f64, x: Parts<N>) -> Parts<N> {
        self.product(e, x)
    }

    fn delay(&self, t: f64) -> Parts<N> {
        match t == 0.0 {
            true => self.one(),
            false => Self::constant(Complex64::ZERO, self.decayed(t)),
        }
    }

    fn law(&self, law: &Law<f64>) -> Parts<N> {
        match law {
            Law::Delays(delays) => delays.iter().fold(self.zero(), |sum, d| {
                self.add_scaled(sum, d.weight, self.delay(d.delay))
            }),
            Law::Polynomial {
                coefficients,
                delay,
            } => {
                let mut p = self.zero();
                p.degree = power(coefficients).min(N - 1);
                for (k, &c) in coefficients.iter().enumerate().take(N) {
                    p.prompt[k] = c.into();
                    p.moduli[k] = c.abs();
                }
                self.product(p, self.delay(*delay))
            }
            Law::Complex { re, im, delay } => {
                let value = Self::constant(Complex64::new(*re, *im), 0.0);
                self.product(value, self.delay(*delay))
            }
        }
    }
}

/// The highest power of a polynomial.
fn power(coefficients: &[f64; 3]) -> usize {
    coefficients.iter().rposition(|&c| c != 0.0).unwrap_or(0)
}

/// What stands in the way of a proof, read off the laws and delays; else the shortest delay and the highest
/// power of `s`.
fn obstacle(tape: &Tape<f64>) -> Result<(f64, usize), Unbounded> {
    let mut shortest = f64::INFINITY;
    let mut turning: Option<f64> = None;
    let mut powers = 0;
    let mut seen = |t: f64| {
        if t > 0.0 {
            shortest = shortest.min(t);
        }
        if t < 0.0 {
            Err(Unbounded::Negative)
        } else {
            Ok(())
        }
    };
    for t in tape.scales() {
        seen(t)?;
    }
    for laws in tape.laws() {
        let mut highest = 0;
        for law in laws {
            match law {
                Law::Delays(delays) => {
                    for d in delays.iter().filter(|d| d.weight != 0.0) {
                        if d.spread > 0.0 {
                            let turn = d.delay / (d.spread * d.spread);
                            turning = Some(turning.map_or(turn, |t| t.min(turn)));
                        }
                        seen(d.delay)?;
                    }
                }
                Law::Polynomial {
                    coefficients,
                    delay,
                } => {
                    highest = highest.max(power(coefficients));
                    seen(*delay)?;
                }
                Law::Complex { delay, .. } => seen(*delay)?,
            }
        }
        powers += highest;
    }
    if let Some(turn) = turning {
        return Err(Unbounded::Spread(turn));
    }
    Ok((shortest, powers))
}

/// A growth rate (1/s), at least `from`, to the right of which `tape` has no zero with `|Im s| <= omega`.
///
/// # Errors
/// Where no growth rate up to `limit` is proved to be one, with the reason if it is known.
pub fn clear_beyond(
    tape: &Tape<f64>,
    from: f64,
    omega: f64,
    limit: f64,
) -> Result<f64, Option<Unbounded>> {
    let (shortest, powers) = obstacle(tape).map_err(Some)?;
    match powers {
        0 => clear_with::<1>(tape, shortest, from, omega, limit),
        1..=4 => clear_with::<5>(tape, shortest, from, omega, limit),
        5..=MOST => clear_with::<{ MOST + 1 }>(tape, shortest, from, omega, limit),
        _ => Err(Some(Unbounded::Degree)),
    }
}

fn clear_with<const N: usize>(
    tape: &Tape<f64>,
    shortest: f64,
    from: f64,
    omega: f64,
    limit: f64,
) -> Result<f64, Option<Unbounded>> {
    let mut growth = from.max(1.0);
    while growth <= limit {
        let parts = tape.run(&Split::<N> { growth });
        if clear(&parts, growth, omega, shortest).map_err(Some)? {
            return Ok(growth);
        }
        growth *= 1.25;
    }
    Err(None)
}

fn clear<const N: usize>(
    parts: &Parts<N>,
    g: f64,
    omega: f64,
    shortest: f64,
) -> Result<bool, Unbounded> {
    let kept = |k: &usize| parts.prompt[*k].norm() > CANCELLED * parts.moduli[*k];
    let Some(m) = (0..=parts.degree).rev().find(kept) else {
        return Err(Unbounded::Vanishes);
    };
    let leading = parts.prompt[m];
    let Some(zeros) = zeros_of(&parts.prompt[..=m]) else {
        return Ok(false);
    };
    // For each zero: the bound of 1/|s - z|, and of r/|s - z|.
    let mut factors = Vec::with_capacity(m);
    for z in zeros {
        // The zeros are computed ones: a margin for their own error.
        let left = g - z.re - 1e-6 * z.norm();
        if left <= 0.0 {
            return Ok(false);
        }
        factors.push((1.0 / left, 1.0 + z.norm() / left));
    }
    factors.sort_by(|a, b| (a.1 / a.0).total_cmp(&(b.1 / b.0)));
    let mut sum = 0.0;
    for k in 0..=parts.degree {
        if parts.late[k] == 0.0 {
            continue;
        }
        let over = k.saturating_sub(m) as i32;
        let reach = g + omega;
        if over > 0 && reach * shortest < f64::from(over) {
            return Ok(false);
        }
        let powers: f64 = factors.iter().take(k).map(|f| f.1).product();
        let rest: f64 = factors.iter().skip(k).map(|f| f.0).product();
        sum += parts.late[k] * powers * rest * reach.powi(over);
    }
    Ok(sum < 0.99 * leading.norm())
}

/// Zeros of a polynomial, lowest coefficient first, as eigenvalues of its companion matrix; `None` where
/// they do not converge.
fn zeros_of(coefficients: &[Complex64]) -> Option<Vec<Complex64>> {
    let (&leading, lower) = coefficients.split_last()?;
    let m = lower.len();
    if m == 0 {
        return Some(Vec::new());
    }
    // In units of the geometric mean of their moduli the zeros are of order one.
    let unit = (lower[0] / leading).norm().powf(1.0 / m as f64);
    let unit = if unit > 0.0 { unit } else { 1.0 };
    let companion = DMatrix::from_fn(m, m, |i, j| {
        if j + 1 == m {
            -lower[i] / leading / unit.powi((m - i) as i32)
        } else if i == j + 1 {
            Complex64::ONE
        } else {
            Complex64::ZERO
        }
    });
    let zeros = companion.try_schur(f64::EPSILON, 10_000)?.eigenvalues()?;
    Some(zeros.iter().map(|&z| z * unit).collect())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numerics::count::{Rectangle, Walker};
    use crate::waves::law::Delayed;
    use crate::waves::tape::{Entry, Writer};
    use proptest::prelude::*;

    /// `sum_k F_k(s)`.
    fn sum_of(laws: Vec<Law<f64>>) -> Tape<f64> {
        let mut writer = Writer::default();
        let entry = || vec![vec![1.0]];
        let constant = vec![vec![0.0]];
        let entries = laws.into_iter().map(|law| Entry::of(law, entry()));
        writer.map(constant, entries.collect());
        writer.finish().unwrap().0
    }

    fn delayed(weight: f64, delay: f64, spread: f64) -> Law<f64> {
        Law::Delays(vec![Delayed {
            weight,
            delay,
            spread,
        }])
    }

    #[test]
    fn zeros_of_a_quartic() {
        // (s - 2)(s + 3)(s^2 + 4) expanded.
        let c = [-24.0, 4.0, -2.0, 1.0, 1.0].map(Complex64::from);
        let zeros = zeros_of(&c).unwrap();
        for (re, im) in [(-3.0, 0.0), (0.0, -2.0), (0.0, 2.0), (2.0, 0.0)] {
            let z = Complex64::new(re, im);
            assert!(zeros.iter().any(|x| (x - z).norm() < 1e-12));
        }
    }

    #[test]
    fn a_feedback_loop_is_cleared_just_beyond_its_fastest_zero() {
        // 1 - 5 exp(-s t): every zero grows at ln 5/t.
        let t = 1e-3;
        let tape = sum_of(vec![delayed(1.0, 0.0, 0.0), delayed(-5.0, t, 0.0)]);
        let fastest = 5.0f64.ln() / t;
        let clear = clear_beyond(&tape, 100.0, 6000.0, 1e6).unwrap();
        assert!(clear > fastest && clear < 1.3 * fastest);
    }

    #[test]
    fn what_outgrows_everything_is_told() {
        let spread = sum_of(vec![delayed(1.0, 0.0, 0.0), delayed(1.0, 3e-3, 1e-3)]);
        let told = clear_beyond(&spread, 0.0, 6000.0, 1e9);
        assert!(
            matches!(told, Err(Some(Unbounded::Spread(turn))) if (turn / 3e3 - 1.0).abs() < 1e-12)
        );
        let advanced = sum_of(vec![delayed(1.0, 0.0, 0.0), delayed(1.0, -3e-3, 0.0)]);
        let told = clear_beyond(&advanced, 0.0, 6000.0, 1e9);
        assert_eq!(told, Err(Some(Unbounded::Negative)));
        let late = sum_of(vec![delayed(1.0, 1e-3, 0.0)]);
        let told = clear_beyond(&late, 0.0, 6000.0, 1e9);
        assert_eq!(told, Err(Some(Unbounded::Vanishes)));
    }

    proptest! {
        /// Beyond the growth rate named the argument principle counts nothing, far to the right.
        #[test]
        fn nothing_is_counted_beyond(
            a in prop::array::uniform3(-1.0..1.0f64),
            weights in prop::collection::vec((-3.0..3.0f64, 1e-4..5e-3f64), 1..4),
            power in (-1.0..1.0f64, 1e-4..2e-3f64),
        ) {
            let mut laws = vec![Law::Polynomial {
                coefficients: [a[0], a[1] * 1e-3, a[2] * 1e-6],
                delay: 0.0,
            }];
            laws.extend(weights.iter().map(|&(w, t)| delayed(w, t, 0.0)));
            laws.push(Law::Polynomial { coefficients: [0.0, power.0 * 1e-3, 0.0], delay: power.1 });
            let tape = sum_of(laws);
            let omega = 5000.0;
            let Ok(g) = clear_beyond(&tape, 1.0, omega, 1e7) else { return Ok(()) };
            let strip = Rectangle { growth: (g, 5.0 * g + 2e4), omega: (0.0, omega) };
            prop_assert_eq!(Walker::new(&tape).symmetric(strip.growth, strip.omega.1), Ok(0));
        }
    }
}
