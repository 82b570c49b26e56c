//! Proof that a disc holds exactly one zero, or exactly two, with an error bound.
//!
//! With `f(z + h) = c_0 + c_1 h + R`, `|R| <= B_2 r^2` on `|h| <= r`, Rouche's theorem against the linear
//! part gives exactly one zero in the disc of radius `r` when `|c_1| r > |c_0| + B_2 r^2`: for every `r`
//! between the roots `r-` and `r+` of that quadratic. `r-` bounds the error of `z`; the disc of radius
//! `r+` holds no other zero. Where `B_2` is too far above `|c_2|` for that, `|R| <= |c_2| r^2 + |c_3| r^3 + B_4 r^4`.
//! Likewise against the quadratic part: exactly two zeros when
//! `|c_2| r^2 > |c_0| + |c_1| r + |c_3| r^3 + B_4 r^4`. The computed `c_k` are widened by the rounding floor.

use num_complex::Complex64;

use super::analytic::{Analytic, Region};

/// A disc with a known number of zeros.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Zero {
    /// Best estimate: the zero, or the middle of two.
    pub at: Complex64,
    /// The zero, or both, lie no farther from it.
    pub error: f64,
    /// No other zero lies nearer than this.
    pub radius: f64,
    /// One or two.
    pub multiplicity: u8,
    /// Proven to lie on the real axis.
    pub real: bool,
    /// The function there is zero to rounding: no arithmetic of this precision tells more.
    pub settled: bool,
}

/// The scale on which a function varies between the real axis and `z`: `B_0/B_1`, the reciprocal of an
/// effective delay.
pub fn scale<F: Analytic + ?Sized>(f: &F, z: Complex64) -> f64 {
    let b = f.bound(&Region {
        omega: 0.0,
        ..Region::disc(z, 0.0)
    });
    b[0] / b[1].max(f64::MIN_POSITIVE)
}

/// `a/b` where `|b|^2` overflows or underflows too.
pub fn quotient(a: Complex64, b: Complex64) -> Complex64 {
    let size = b.norm();
    (a / size) / (b / size)
}

/// Newton from `z` until the step is at rounding level or no longer shrinks. `None` where it leaves
/// `reach` about the start or does not settle.
pub fn newton<F: Analytic + ?Sized>(
    f: &F,
    start: Complex64,
    reach: f64,
    evaluations: &mut usize,
) -> Option<Complex64> {
    let mut z = start;
    let mut last = f64::INFINITY;
    for _ in 0..40 {
        *evaluations += 1;
        let (value, slope) = f.value_and_slope(z);
        let step = quotient(value, slope);
        if !step.is_finite() {
            return (value.norm() == 0.0).then_some(z);
        }
        let size = step.norm();
        let settled = size <= 8.0 * f64::EPSILON * z.norm();
        // Rounding noise: a step already small that grows again.
        let noise = size >= last && last <= 1e-9 * (z.norm() + reach);
        if noise {
            return Some(z);
        }
        z -= step;
        if settled {
            return Some(z);
        }
        if (z - start).norm_sqr() > reach * reach {
            return None;
        }
        last = size;
    }
    (last <= 1e-6 * (z.norm() + reach)).then_some(z)
}

/// Proves one zero near `z`, which Newton has reached, in a disc no larger than `reach`.
pub fn simple<F: Analytic + ?Sized>(f: &F, z: Complex64, reach: f64) -> Option<Zero> {
    let rounding = f.rounding();
    let (value, slope) = f.value_and_slope(z);
    let (widest, mut reach) = (reach, reach);
    let mut best: Option<(f64, f64)> = None;
    let mut settled = false;
    // A smaller disc has a smaller bound; the widest proof wins.
    for _ in 0..12 {
        if best.is_some_and(|(_, outer)| reach <= outer) {
            break;
        }
        let bounds = f.bound(&Region::disc(z, reach));
        let floor = |order| rounding.floor(&bounds, z.norm(), order);
        let (e, a) = (value.norm() + floor(0), slope.norm() - floor(1));
        // Divided by the slope: its square may overflow where it does not.
        let (e, curvature) = (e / a, bounds[2] / a);
        let root = 1.0 - 4.0 * curvature * e;
        if a > 0.0 && root > 0.0 {
            let sum = 1.0 + root.sqrt();
            let inner = 2.0 * e / sum;
            let outer = if 2.0 * curvature * reach > sum {
                sum / (2.0 * curvature)
            } else {
                reach
            };
            if inner < outer && best.is_none_or(|(_, o)| outer > o) {
                best = Some((inner, outer));
                settled = value.norm() <= 2.0 * floor(0);
            }
            if outer < reach {
                // The bound, not the reach, limits the disc: shrink towards where both meet.
                reach = 1.5 * outer;
                continue;
            }
        }
        reach *= 0.25;
    }
    if best.is_none() {
        best = outweighed(f, z, widest, 1);
        let here = f.bound(&Region::disc(z, 0.0));
        settled = value.norm() <= 2.0 * rounding.floor(&here, z.norm(), 0);
    }
    let (error, radius) = best?;
    Some(Zero {
        at: z,
        error,
        radius,
        multiplicity: 1,
        real: false,
        settled,
    })
}

/// Proves two zeros near `z` and tells them apart where rounding allows.
pub fn pair<F: Analytic + ?Sized>(
    f: &F,
    z: Complex64,
    reach: f64,
    evaluations: &mut usize,
) -> Option<Vec<Zero>> {
    let mut z = z;
    // The middle of two close zeros is a zero of the slope.
    for _ in 0..30 {
        *evaluations += 1;
        let [_, c1, c2, _] = f.taylor(z);
        let step = quotient(c1, c2) * 0.5;
        if !step.is_finite() {
            return None;
        }
        if step.norm() > reach {
            return None;
        }
        z -= step;
        if step.norm() <= 8.0 * f64::EPSILON * (z.norm() + reach) {
            break;
        }
    }
    let [c0, c1, c2, _] = f.taylor(z);
    let (error, radius) = outweighed(f, z, reach, 2)?;
    let both = Zero {
        at: z,
        error,
        radius,
        multiplicity: 2,
        real: false,
        settled: true,
    };
    let (c0, c1) = (quotient(c0, c2), quotient(c1, c2));
    let root = (c1 * c1 - c0 * 4.0).sqrt();
    let mut halves = Vec::new();
    for sign in [1.0, -1.0] {
        let guess = z + (-c1 + root * sign) * 0.5;
        if let Some(zero) =
            newton(f, guess, 4.0 * both.error, evaluations).and_then(|z| simple(f, z, both.radius))
        {
            halves.push(zero);
        }
    }
    if let [a, b] = halves[..] {
        let apart = (a.at - b.at).norm();
        // Each disc of radius `error` holds one zero; disjoint discs hold two.
        if apart > a.error + b.error {
            return Some(vec![a, b]);
        }
    }
    Some(vec![both])
}

/// Least and greatest radius found of a disc about `z` that holds as many zeros as the `order` says:
/// `|c_order| r^order` outweighs the other coefficients to the third and `B_4 r^4`. The coefficients
/// themselves may be far below their bounds.
fn outweighed<F: Analytic + ?Sized>(
    f: &F,
    z: Complex64,
    reach: f64,
    order: usize,
) -> Option<(f64, f64)> {
    let (rounding, here) = (f.rounding(), f.bound(&Region::disc(z, 0.0)));
    let sizes = f.taylor(z).map(|c| c.norm());
    let floor = |k| rounding.floor(&here, z.norm(), k);
    let most: [f64; 4] = std::array::from_fn(|k| sizes[k] + floor(k));
    let mut r = reach;
    let (mut least, mut greatest) = (None, None);
    while r > 1e-12 * (reach + z.norm()) {
        let powers = [1.0, r, r * r, r * r * r];
        let terms = most.iter().zip(powers).map(|(c, p)| c * p);
        let others = terms.enumerate().filter(|(k, _)| *k != order);
        let rest =
            others.map(|(_, t)| t).sum::<f64>() + f.bound(&Region::disc(z, r))[4] * r.powi(4);
        if (sizes[order] - floor(order)) * powers[order] > rest {
            greatest = greatest.or(Some(r));
            least = Some(r);
        } else if least.is_some() {
            break;
        }
        r *= 0.8;
    }
    Some((least?, greatest?))
}
