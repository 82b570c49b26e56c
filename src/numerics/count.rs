//! Counting the zeros of an analytic function inside a contour, provably up to rounding.
//!
//! The number of zeros is the winding of `f` along the contour (argument principle). On a segment of
//! length `h` let `H` be the cubic Hermite interpolant of `f` through value and slope at both ends;
//! then `|f - H| <= max|f''''| h^4/384 = B_4 h^4/16`, with `B_4` bounding `|f''''|/4!`. `H` is a Bezier
//! curve and lies in the hull of its four control points. When all four, projected on the bisector of
//! the end values, exceed that bound and the rounding floor, `f` stays in one half-plane along the
//! segment, so that its phase changes by the principal difference of the end phases. Otherwise the
//! segment is halved. Crossings of the negative real axis are counted as integers; no arctangent is
//! summed.
//!
//! With `f(conj s) = conj f(s)` the walk runs over right, top and left edge from real axis to real
//! axis, where `f` is real: the phase change over pi is `N_real + 2 N_upper`.

use num_complex::Complex64;

use super::analytic::{Analytic, Region, Rounding, TAYLOR};

/// Work done.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Effort {
    /// Values of the function (each with its slope).
    pub evaluations: usize,
    /// Bounds evaluated.
    pub bounds: usize,
    /// Segments halved.
    pub refinements: usize,
    /// Windows counted again with another pad.
    pub retries: usize,
    /// Searches that needed more than Newton from the grid.
    pub fallbacks: usize,
}

/// Why no count was reached.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
pub enum CountError {
    /// A zero lies on the contour, to rounding.
    #[error("a zero lies on the contour near {near}")]
    OnContour {
        /// Where.
        near: Complex64,
    },
    /// Values on the contour are smaller than what rounding leaves open of them.
    #[error("values near {near} are lost in rounding")]
    Drowned {
        /// Where.
        near: Complex64,
    },
    /// A bound or a value is infinite: the window reaches too far for the delays in it.
    #[error(
        "values overflow at {at}: the window reaches too far left for the delays in the network"
    )]
    Overflow {
        /// Where.
        at: Complex64,
    },
    /// A value contradicts its bound: the bound is wrong.
    #[error("a value at {at} exceeds its proven bound: the bound is wrong")]
    BoundContradicted {
        /// Where.
        at: Complex64,
    },
}

/// A rectangle in the plane of `s`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rectangle {
    /// Least and greatest real part.
    pub growth: (f64, f64),
    /// Least and greatest imaginary part.
    pub omega: (f64, f64),
}

impl Rectangle {
    /// Whether a disc about `z` lies inside (`Some(true)`), outside (`Some(false)`), or across an edge.
    pub fn holds(&self, z: Complex64, error: f64) -> Option<bool> {
        let side = |x: f64, (a, b): (f64, f64)| {
            if x - error >= a && x + error <= b {
                Some(true)
            } else if x + error < a || x - error > b {
                Some(false)
            } else {
                None
            }
        };
        match (side(z.re, self.growth), side(z.im, self.omega)) {
            (Some(false), _) | (_, Some(false)) => Some(false),
            (Some(true), Some(true)) => Some(true),
            _ => None,
        }
    }
}

#[derive(Clone, Copy)]
struct Sample {
    s: Complex64,
    value: Complex64,
    slope: Complex64,
    /// Moduli of the three, which every segment that ends here asks for.
    moduli: [f64; 3],
}

/// Most halvings of one segment before a zero is taken to lie on it.
const DEEPEST: u32 = 60;

/// Distance from a zero within which a point of the contour is on it, over the modulus, where rounding
/// stops the walk.
const BESIDE: f64 = 1e-5;

/// Ratio of the moduli between which segments share a bound.
const WIDENING: f64 = 1.5;

/// Walks contours of one function.
pub struct Walker<'f, F: ?Sized> {
    f: &'f F,
    rounding: Rounding,
    cached: Option<(Region, [f64; TAYLOR])>,
    /// Work done so far.
    pub effort: Effort,
}

impl<'f, F: Analytic + ?Sized> Walker<'f, F> {
    /// A walker that has done nothing yet.
    pub fn new(f: &'f F) -> Self {
        Walker {
            f,
            rounding: f.rounding(),
            cached: None,
            effort: Effort::default(),
        }
    }

    /// `N_real + 2 N_upper` within `growth` and `|omega| <= top`, for a symmetric function.
    ///
    /// # Errors
    /// See [`CountError`].
    pub fn symmetric(&mut self, growth: (f64, f64), top: f64) -> Result<i64, CountError> {
        let corners = [
            Complex64::new(growth.1, 0.0),
            Complex64::new(growth.1, top),
            Complex64::new(growth.0, top),
            Complex64::new(growth.0, 0.0),
        ];
        let (start, end, crossings) = self.path(&corners)?;
        // On the real axis the function is real: its phase is 0 or pi.
        let half = |v: Complex64| i64::from(v.re < 0.0);
        Ok(half(end) - half(start) + 2 * crossings)
    }

    /// Number of zeros in a rectangle, with multiplicity.
    ///
    /// # Errors
    /// See [`CountError`].
    pub fn rectangle(&mut self, r: &Rectangle) -> Result<i64, CountError> {
        let corners = [
            Complex64::new(r.growth.0, r.omega.0),
            Complex64::new(r.growth.1, r.omega.0),
            Complex64::new(r.growth.1, r.omega.1),
            Complex64::new(r.growth.0, r.omega.1),
            Complex64::new(r.growth.0, r.omega.0),
        ];
        Ok(self.path(&corners)?.2)
    }

    /// First and last value along a polygon, and how often the negative real axis is crossed
    /// counterclockwise less clockwise.
    fn path(&mut self, corners: &[Complex64]) -> Result<(Complex64, Complex64, i64), CountError> {
        let mut crossings = 0;
        let mut here = self.sample(corners[0])?;
        let first = here.value;
        for pair in corners.windows(2) {
            crossings += self.edge(&mut here, pair[1])?;
        }
        Ok((first, here.value, crossings))
    }

    fn sample(&mut self, s: Complex64) -> Result<Sample, CountError> {
        self.effort.evaluations += 1;
        let (value, slope) = self.f.value_and_slope(s);
        if !(value.is_finite() && slope.is_finite()) {
            return Err(CountError::Overflow { at: s });
        }
        Ok(Sample {
            s,
            value,
            slope,
            moduli: [s.norm(), value.norm(), slope.norm()],
        })
    }

    /// Bounds for a segment; its region is widened in steps, so that neighbours share an evaluation.
    fn bound(&mut self, a: Complex64, b: Complex64) -> Result<[f64; TAYLOR], CountError> {
        let mut region = Region::segment(a, b);
        let power = |exponent: f64| WIDENING.powf(exponent);
        region.modulus = power(region.modulus.max(1.0).log(WIDENING).ceil());
        region.omega = match region.omega {
            below if below < 1.0 => 0.0,
            omega => power(omega.log(WIDENING).floor()),
        };
        if let Some((cached, bounds)) = self.cached
            && cached == region
        {
            return Ok(bounds);
        }
        self.effort.bounds += 1;
        let bounds = self.f.bound(&region);
        if !bounds.iter().all(|b| b.is_finite()) {
            // Delays grow to the left.
            let at = if b.re < a.re { b } else { a };
            return Err(CountError::Overflow { at });
        }
        self.cached = Some((region, bounds));
        Ok(bounds)
    }

    fn edge(&mut self, here: &mut Sample, to: Complex64) -> Result<i64, CountError> {
        let mut crossings = 0;
        let from = here.s;
        let length = (to - from).norm();
        if length == 0.0 {
            return Ok(0);
        }
        let b = self.bound(from, to)?;
        let step = 1.8 * b[0] / b[1].max(f64::MIN_POSITIVE);
        let parts = (length / step).ceil().clamp(1.0, 1e6) as usize;
        for i in 1..=parts {
            let s = if i == parts {
                to
            } else {
                from + (to - from) * (i as f64 / parts as f64)
            };
            let next = self.sample(s)?;
            let bounds = self.bound(here.s, next.s)?;
            crossings += self.segment(*here, next, &bounds, 0)?;
            *here = next;
        }
        Ok(crossings)
    }

    fn segment(
        &mut self,
        a: Sample,
        b: Sample,
        bounds: &[f64; TAYLOR],
        depth: u32,
    ) -> Result<i64, CountError> {
        let h = (b.s - a.s).norm();
        let along = (b.s - a.s) / h;
        let ([sa, va, _], [sb, vb, _]) = (a.moduli, b.moduli);
        let modulus = sa.max(sb);
        let floor = self.rounding.floor(bounds, modulus, 0);
        let slope_floor = self.rounding.floor(bounds, modulus, 1);
        for p in [&a, &b] {
            let [_, value, slope] = p.moduli;
            if value > bounds[0] + floor || slope > bounds[1] + slope_floor {
                return Err(CountError::BoundContradicted { at: p.s });
            }
        }
        let remainder = bounds[4] * h.powi(4) / 16.0;
        let noise = floor + slope_floor * h / 3.0;
        if va > floor && vb > floor {
            let control = [
                a.value,
                a.value + a.slope * along * (h / 3.0),
                b.value - b.slope * along * (h / 3.0),
                b.value,
            ];
            let (from, to) = (a.value / va, b.value / vb);
            let bisector = from + to;
            let size = bisector.norm();
            let clear = |p: &Complex64| (p * bisector.conj()).re > (remainder + noise) * size;
            if size > 1e-9 && control.iter().all(clear) {
                return Ok(crossing(from, to));
            }
        }
        if depth >= DEEPEST || h <= 4.0 * f64::EPSILON * modulus {
            let p = if va < vb { a } else { b };
            let [_, value, slope] = p.moduli;
            // Beside a zero the slope tells where it lies.
            let found = slope > 2.0 * slope_floor && value + floor < BESIDE * modulus * slope;
            return Err(if found {
                CountError::OnContour { near: p.s }
            } else {
                CountError::Drowned { near: p.s }
            });
        }
        self.effort.refinements += 1;
        let middle = self.sample((a.s + b.s) * 0.5)?;
        // The interpolant's own value there: a bound that is contradicted is a bound that is wrong.
        let hermite = (a.value + b.value) * 0.5 + (a.slope - b.slope) * along * (h / 8.0);
        if (middle.value - hermite).norm() > remainder + 3.0 * floor + slope_floor * h {
            return Err(CountError::BoundContradicted { at: middle.s });
        }
        Ok(self.segment(a, middle, bounds, depth + 1)?
            + self.segment(middle, b, bounds, depth + 1)?)
    }
}

/// Crossing of the negative real axis between two directions less than half a turn apart:
/// counterclockwise +1, clockwise -1. The axis itself counts to the upper half-plane. Directions of
/// modulus one, since the product of two values may overflow where they do not.
fn crossing(a: Complex64, b: Complex64) -> i64 {
    let turn = (a.conj() * b).im;
    match (a.im >= 0.0, b.im >= 0.0) {
        (true, false) if turn > 0.0 => 1,
        (false, true) if turn < 0.0 => -1,
        // From the axis itself half a turn can end on it again only through zero.
        _ => 0,
    }
}
