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

use super::analytic::{Analytic, Region, Rounding, TAYLOR, modulus};

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

/// A piece of the contour: its ends and its bounds by index, and how often it was halved.
#[derive(Clone, Copy)]
struct Segment {
    ends: [u32; 2],
    bound: u32,
    depth: u32,
}

/// What a segment tells.
enum Told {
    /// The phase along it changes by the principal difference: crossings of the negative real axis.
    Clear(i64),
    /// It is to be halved.
    Open,
}

/// Most halvings of one segment before a zero is taken to lie on it.
const DEEPEST: u32 = 60;

/// Most segments halved together: rounding, not zeros, keeps so many open.
const MOST_OPEN: usize = 200_000;

/// Most places on one contour, for the same reason.
const MOST_SAMPLES: usize = 2_000_000;

/// Distance from a zero within which a point of the contour is on it, over the modulus, where rounding
/// stops the walk.
const BESIDE: f64 = 1e-5;

/// Walks contours of one function.
///
/// A contour is walked level by level: all its points at once, then the middles of all segments that are to be
/// halved, so that values and bounds are asked for in batches.
pub struct Walker<'f, F: ?Sized> {
    f: &'f F,
    rounding: Rounding,
    work: Work,
    /// Work done so far.
    pub effort: Effort,
}

/// Memory of a walk, used again by the next.
#[derive(Default)]
struct Work {
    places: Vec<Complex64>,
    values: Vec<(Complex64, Complex64)>,
    samples: Vec<Sample>,
    regions: Vec<Region>,
    bounds: Vec<[f64; TAYLOR]>,
    segments: Vec<Segment>,
    open: Vec<Segment>,
}

impl Work {
    /// Appends a sample for each place with its value.
    fn sample(&mut self) {
        let both = self.places.iter().zip(&self.values);
        self.samples
            .extend(both.map(|(&s, &value)| Sample::of(s, value)));
    }
}

impl Segment {
    /// Its ends and its bounds.
    fn of<'w>(
        &self,
        samples: &'w [Sample],
        bounds: &'w [[f64; TAYLOR]],
    ) -> (&'w Sample, &'w Sample, &'w [f64; TAYLOR]) {
        let [a, b] = self.ends;
        let end = |i: u32| &samples[i as usize];
        (end(a), end(b), &bounds[self.bound as usize])
    }
}

impl<'f, F: Analytic + ?Sized> Walker<'f, F> {
    /// A walker that has done nothing yet.
    pub fn new(f: &'f F) -> Self {
        Walker {
            f,
            rounding: f.rounding(),
            work: Work::default(),
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
        let mut work = std::mem::take(&mut self.work);
        let told = self.walk(&mut work, corners);
        self.work = work;
        told
    }

    fn walk(
        &mut self,
        work: &mut Work,
        corners: &[Complex64],
    ) -> Result<(Complex64, Complex64, i64), CountError> {
        self.place(work, corners)?;
        self.evaluate(work)?;
        work.samples.clear();
        work.sample();
        work.regions.clear();
        work.segments.clear();
        for (i, pair) in work.samples.windows(2).enumerate() {
            let [a, b] = pair else { continue };
            let region = widened(a, b);
            if work.regions.last() != Some(&region) {
                work.regions.push(region);
            }
            work.segments.push(Segment {
                ends: [i as u32, i as u32 + 1],
                bound: work.regions.len() as u32 - 1,
                depth: 0,
            });
        }
        let ends = |work: &Work| Some((work.samples.first()?.value, work.samples.last()?.value));
        let zero = Complex64::new(0.0, 0.0);
        let (first, last) = ends(work).unwrap_or((zero, zero));
        self.bounds(work)?;
        let mut crossings = 0;
        while !work.segments.is_empty() {
            work.open.clear();
            work.places.clear();
            for segment in &work.segments {
                let (a, b, bounds) = segment.of(&work.samples, &work.bounds);
                match self.judge(a, b, segment.depth, bounds)? {
                    Told::Clear(n) => crossings += n,
                    Told::Open => {
                        work.open.push(*segment);
                        work.places.push((a.s + b.s) * 0.5);
                    }
                }
            }
            let many = work.open.len() > MOST_OPEN || work.samples.len() > MOST_SAMPLES;
            if let (Some(open), true) = (work.open.first(), many) {
                let near = open.of(&work.samples, &work.bounds).0.s;
                return Err(CountError::Drowned { near });
            }
            work.segments.clear();
            self.effort.refinements += work.open.len();
            self.evaluate(work)?;
            let known = work.samples.len();
            work.sample();
            for (i, segment) in work.open.iter().enumerate() {
                let middle = known + i;
                let (a, b, bounds) = segment.of(&work.samples, &work.bounds);
                self.held(a, b, &work.samples[middle], bounds)?;
                let [from, to] = segment.ends;
                let middle = middle as u32;
                for ends in [[from, middle], [middle, to]] {
                    work.segments.push(Segment {
                        ends,
                        depth: segment.depth + 1,
                        ..*segment
                    });
                }
            }
        }
        Ok((first, last, crossings))
    }

    /// The points of a polygon, its edges cut by the scale on which the function may vary along them.
    fn place(&mut self, work: &mut Work, corners: &[Complex64]) -> Result<(), CountError> {
        work.regions.clear();
        let edges = || corners.iter().zip(corners.iter().skip(1));
        work.regions.extend(edges().map(|(a, b)| {
            let (a, b) = (Sample::at(*a), Sample::at(*b));
            widened(&a, &b)
        }));
        self.bounds(work)?;
        work.places.clear();
        work.places.extend(corners.first());
        for ((&from, &to), b) in edges().zip(&work.bounds) {
            let length = (to - from).norm();
            if length == 0.0 {
                continue;
            }
            let step = 1.8 * b[0] / b[1].max(f64::MIN_POSITIVE);
            let parts = (length / step).ceil().clamp(1.0, 1e6) as usize;
            let inner = (1..parts).map(|i| from + (to - from) * (i as f64 / parts as f64));
            work.places.extend(inner.chain([to]));
        }
        Ok(())
    }

    /// Values at the places.
    fn evaluate(&mut self, work: &mut Work) -> Result<(), CountError> {
        self.effort.evaluations += work.places.len();
        work.values.clear();
        self.f.values_and_slopes(&work.places, &mut work.values);
        for (&at, (value, slope)) in work.places.iter().zip(&work.values) {
            if !(value.is_finite() && slope.is_finite()) {
                return Err(CountError::Overflow { at });
            }
        }
        Ok(())
    }

    /// Bounds over the regions.
    fn bounds(&mut self, work: &mut Work) -> Result<(), CountError> {
        self.effort.bounds += work.regions.len();
        work.bounds.clear();
        self.f.bounds(&work.regions, &mut work.bounds);
        for (region, bounds) in work.regions.iter().zip(&work.bounds) {
            if !bounds.iter().all(|b| b.is_finite()) {
                // Delays grow to the left.
                let at = Complex64::new(region.growth.0, region.omega);
                return Err(CountError::Overflow { at });
            }
        }
        Ok(())
    }

    fn judge(
        &self,
        a: &Sample,
        b: &Sample,
        depth: u32,
        bounds: &[f64; TAYLOR],
    ) -> Result<Told, CountError> {
        let chord = b.s - a.s;
        let h = modulus(chord);
        let ([sa, va, _], [sb, vb, _]) = (a.moduli, b.moduli);
        let modulus = sa.max(sb);
        let floor = self.rounding.floor(bounds, modulus, 0);
        let slope_floor = self.rounding.floor(bounds, modulus, 1);
        for p in [a, b] {
            let [_, value, slope] = p.moduli;
            if value > bounds[0] + floor || slope > bounds[1] + slope_floor {
                return Err(CountError::BoundContradicted { at: p.s });
            }
        }
        let h2 = h * h;
        let remainder = bounds[4] * (h2 * h2) / 16.0;
        let noise = floor + slope_floor * h / 3.0;
        if va > floor && vb > floor {
            let (from, to, length) = directions(a, b);
            let bisector = from + to;
            let size = bisector.norm_sqr().sqrt();
            let third = chord / 3.0;
            let needed = (remainder + noise) * size;
            let clear = |p: Complex64| p.re * bisector.re + p.im * bisector.im > needed;
            if size > 1e-9 * length
                && clear(a.value)
                && clear(b.value)
                && clear(a.value + a.slope * third)
                && clear(b.value - b.slope * third)
            {
                return Ok(Told::Clear(crossing(from, to)));
            }
        }
        // A value within rounding of zero stays the end of a segment however often that is halved.
        let lost = va <= floor || vb <= floor;
        if lost || depth >= DEEPEST || h <= 4.0 * f64::EPSILON * modulus {
            let p = if va < vb { a } else { b };
            return Err(stopped(p, floor, slope_floor, modulus));
        }
        Ok(Told::Open)
    }

    /// Holds the value in the middle of a segment against its interpolant's own there: a bound that is
    /// contradicted is a bound that is wrong.
    fn held(
        &self,
        a: &Sample,
        b: &Sample,
        middle: &Sample,
        bounds: &[f64; TAYLOR],
    ) -> Result<(), CountError> {
        let h = modulus(b.s - a.s);
        let along = (b.s - a.s) / h;
        let farthest = a.moduli[0].max(b.moduli[0]);
        let floor = self.rounding.floor(bounds, farthest, 0);
        let slope_floor = self.rounding.floor(bounds, farthest, 1);
        let remainder = bounds[4] * h.powi(4) / 16.0;
        let hermite = (a.value + b.value) * 0.5 + (a.slope - b.slope) * along * (h / 8.0);
        if modulus(middle.value - hermite) > remainder + 3.0 * floor + slope_floor * h {
            return Err(CountError::BoundContradicted { at: middle.s });
        }
        Ok(())
    }
}

/// Why the walk ends at a point: beside a zero the slope tells where it lies.
fn stopped(p: &Sample, floor: f64, slope_floor: f64, modulus: f64) -> CountError {
    let [_, value, slope] = p.moduli;
    if slope > 2.0 * slope_floor && value + floor < BESIDE * modulus * slope {
        CountError::OnContour { near: p.s }
    } else {
        CountError::Drowned { near: p.s }
    }
}

impl Sample {
    fn of(s: Complex64, (value, slope): (Complex64, Complex64)) -> Self {
        Sample {
            s,
            value,
            slope,
            moduli: [modulus(s), modulus(value), modulus(slope)],
        }
    }

    /// A place without its values.
    fn at(s: Complex64) -> Self {
        let zero = Complex64::new(0.0, 0.0);
        Sample::of(s, (zero, zero))
    }
}

/// The directions of the values at both ends, of one length, and that length: each value times the modulus of the other,
/// which needs no division, or of modulus one where products might leave the range.
fn directions(a: &Sample, b: &Sample) -> (Complex64, Complex64, f64) {
    let ([_, va, _], [_, vb, _]) = (a.moduli, b.moduli);
    let near = |v: f64| v > 1e-70 && v < 1e70;
    if near(va) && near(vb) {
        (a.value * vb, b.value * va, va * vb)
    } else {
        (a.value / va, b.value / vb, 1.0)
    }
}

/// The region of a segment, widened to numbers of few digits so that neighbours share an evaluation of
/// the bounds.
fn widened(a: &Sample, b: &Sample) -> Region {
    let omega = if a.s.im * b.s.im > 0.0 {
        a.s.im.abs().min(b.s.im.abs())
    } else {
        0.0
    };
    Region {
        growth: (a.s.re.min(b.s.re), a.s.re.max(b.s.re)),
        modulus: rounded(a.moduli[0].max(b.moduli[0]).max(1.0), true),
        omega: if omega < 1.0 {
            0.0
        } else {
            rounded(omega, false)
        },
    }
}

/// The next number of the form `2^k` or `1.5 2^k`, at least or at most `x >= 1`.
fn rounded(x: f64, up: bool) -> f64 {
    const HALF: u64 = 1 << 51;
    let bits = x.to_bits();
    let up = if up { HALF - 1 } else { 0 };
    f64::from_bits((bits + up) & !(HALF - 1))
}

/// Crossing of the negative real axis between two directions less than half a turn apart:
/// counterclockwise +1, clockwise -1. The axis itself counts to the upper half-plane.
fn crossing(a: Complex64, b: Complex64) -> i64 {
    let turn = (a.conj() * b).im;
    match (a.im >= 0.0, b.im >= 0.0) {
        (true, false) if turn > 0.0 => 1,
        (false, true) if turn < 0.0 => -1,
        // From the axis itself half a turn can end on it again only through zero.
        _ => 0,
    }
}
