//! What counting and finding zeros asks of a function.

use num_complex::Complex64;

/// Number of Taylor coefficients a bound covers: orders 0 to 4.
pub const TAYLOR: usize = 5;

/// Where a bound must hold; of plain numbers, or several regions at once.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Region<V = f64> {
    /// Least and greatest real part.
    pub growth: (V, V),
    /// Greatest modulus.
    pub modulus: V,
    /// Least modulus of the imaginary part.
    pub omega: V,
}

impl Region {
    /// The region of a straight segment.
    pub fn segment(a: Complex64, b: Complex64) -> Self {
        Region {
            growth: (a.re.min(b.re), a.re.max(b.re)),
            modulus: modulus(a).max(modulus(b)),
            omega: if a.im * b.im > 0.0 {
                a.im.abs().min(b.im.abs())
            } else {
                0.0
            },
        }
    }

    /// The region of a disc.
    pub fn disc(centre: Complex64, radius: f64) -> Self {
        Region {
            growth: (centre.re - radius, centre.re + radius),
            modulus: modulus(centre) + radius,
            omega: (centre.im.abs() - radius).max(0.0),
        }
    }
}

/// Modulus, without the care that only numbers near the ends of the range need.
#[inline]
pub fn modulus(z: Complex64) -> f64 {
    let square = z.norm_sqr();
    if square > 1e-280 && square < 1e280 {
        square.sqrt()
    } else {
        z.norm()
    }
}

/// `a/b` where `|b|^2` overflows or underflows too.
#[inline]
pub fn quotient(a: Complex64, b: Complex64) -> Complex64 {
    let square = b.norm_sqr();
    if square > 1e-280 && square < 1e280 {
        let unit = b.conj() / square;
        a * unit
    } else {
        let size = b.norm();
        (a / size) / (b / size)
    }
}

/// How far a computed value may lie from the exact one: `u (values B_0 + arguments |s| B_1)` for the
/// function and the same one order up for its derivative, `u` the unit roundoff and `B_k` the
/// bounds of [`Analytic::bound`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rounding {
    /// Rounded operations on the longest path from a constant to the value.
    pub values: f64,
    /// Rounded operations on the argument of an exponential.
    pub arguments: f64,
}

impl Rounding {
    /// Bound of the rounding error of the `order`-th Taylor coefficient (0 to 3).
    pub fn floor(&self, bounds: &[f64; TAYLOR], modulus: f64, order: usize) -> f64 {
        let (b, next) = (bounds[order], (order + 1) as f64 * bounds[order + 1]);
        0.5 * f64::EPSILON * (self.values * b + self.arguments * modulus * next)
    }
}

/// A function analytic wherever it is asked, with bounds.
pub trait Analytic: Sync {
    /// Value and derivative at `s`.
    fn value_and_slope(&self, s: Complex64) -> (Complex64, Complex64);

    /// Taylor coefficients `f^(k)/k!` at `s`, orders 0 to 3.
    fn taylor(&self, s: Complex64) -> [Complex64; 4];

    /// Bounds of `|f^(k)|/k!` over the region, orders 0 to 4.
    fn bound(&self, region: &Region) -> [f64; TAYLOR];

    /// Value and derivative at many places, one after another into `to`.
    fn values_and_slopes(&self, at: &[Complex64], to: &mut Vec<(Complex64, Complex64)>) {
        to.extend(at.iter().map(|&s| self.value_and_slope(s)));
    }

    /// Bounds over many regions, one after another into `to`.
    fn bounds(&self, over: &[Region], to: &mut Vec<[f64; TAYLOR]>) {
        to.extend(over.iter().map(|region| self.bound(region)));
    }

    /// The rounding error of a computed value.
    fn rounding(&self) -> Rounding;

    /// Whether `f(conj s) = conj f(s)`.
    fn is_symmetric(&self) -> bool;
}
