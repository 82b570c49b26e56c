//! A tape as an analytic function: one place at a time, or eight and sixteen.

use num_complex::Complex64;

use super::arithmetic::{Majorant, Taylor};
use super::{MOST_SLOTS, Tape, Work};
use crate::numerics::analytic::{Analytic, Region, Rounding, TAYLOR};
use crate::numerics::lanes::{Both, Job, LANES, Lanes, on_lanes};
use crate::waves::complex::Cx;

impl Analytic for Tape<f64> {
    fn value_and_slope(&self, s: Complex64) -> (Complex64, Complex64) {
        let [d, slope] = self.taylor_at::<2>(s);
        (d.value(), slope.value())
    }

    fn taylor(&self, s: Complex64) -> [Complex64; 4] {
        self.taylor_at::<4>(s).map(Cx::value)
    }

    fn bound(&self, region: &Region) -> [f64; TAYLOR] {
        self.run(&Majorant(region))
    }

    fn values_and_slopes(&self, at: &[Complex64], to: &mut Vec<(Complex64, Complex64)>) {
        let tape = self;
        match self.width {
            0..=2 => on_lanes(Slopes::<2> { tape, at, to }),
            3..=4 => on_lanes(Slopes::<4> { tape, at, to }),
            5..=8 => on_lanes(Slopes::<8> { tape, at, to }),
            9..=16 => on_lanes(Slopes::<16> { tape, at, to }),
            _ => on_lanes(Slopes::<MOST_SLOTS> { tape, at, to }),
        }
    }

    fn bounds(&self, over: &[Region], to: &mut Vec<[f64; TAYLOR]>) {
        let tape = self;
        match self.width {
            0..=2 => on_lanes(Bounds::<2> { tape, over, to }),
            3..=4 => on_lanes(Bounds::<4> { tape, over, to }),
            5..=8 => on_lanes(Bounds::<8> { tape, over, to }),
            9..=16 => on_lanes(Bounds::<16> { tape, over, to }),
            _ => on_lanes(Bounds::<MOST_SLOTS> { tape, over, to }),
        }
    }

    fn rounding(&self) -> Rounding {
        self.rounding
    }

    fn is_symmetric(&self) -> bool {
        self.symmetric
    }
}

/// Eight or fewer things, the last of fewer repeated.
#[inline(always)]
fn filled<X: Copy>(from: &[X]) -> Option<[X; LANES]> {
    if let Ok(eight) = from.try_into() {
        return Some(eight);
    }
    let last = from.last()?;
    let mut eight = [*last; LANES];
    for (to, x) in eight.iter_mut().zip(from) {
        *to = *x;
    }
    Some(eight)
}

#[inline(always)]
fn gathered<L: Lanes, X>(from: &[X; LANES], coordinate: impl Fn(&X) -> f64) -> L {
    let mut eight = [0.0; LANES];
    for (to, x) in eight.iter_mut().zip(from) {
        *to = coordinate(x);
    }
    L::load(&eight)
}

#[inline(always)]
fn scattered<L: Lanes>(x: L) -> [f64; LANES] {
    let mut eight = [0.0; LANES];
    x.store(&mut eight);
    eight
}

/// Values and slopes, of a tape on at most `W` slots.
struct Slopes<'a, const W: usize> {
    tape: &'a Tape<f64>,
    at: &'a [Complex64],
    to: &'a mut Vec<(Complex64, Complex64)>,
}

#[inline(always)]
fn place<L: Lanes>(at: &[Complex64; LANES]) -> Cx<L> {
    Cx::new(gathered(at, |s| s.re), gathered(at, |s| s.im))
}

#[inline(always)]
fn append<L: Lanes>(d: Cx<L>, slope: Cx<L>, number: usize, to: &mut Vec<(Complex64, Complex64)>) {
    let (re, im) = (scattered(d.re), scattered(d.im));
    let (slope_re, slope_im) = (scattered(slope.re), scattered(slope.im));
    let pair = |i: usize| {
        let d = Complex64::new(re[i], im[i]);
        (d, Complex64::new(slope_re[i], slope_im[i]))
    };
    to.extend((0..number.min(LANES)).map(pair));
}

impl<const W: usize> Job for Slopes<'_, W> {
    type Output = ();
    #[inline(always)]
    fn run<L: Lanes>(self) {
        self.to.reserve(self.at.len());
        let sixteens = self.at.chunks_exact(2 * LANES);
        let rest = sixteens.remainder();
        if sixteens.len() > 0 {
            let zero = Both(L::from(0.0), L::from(0.0));
            let mut work = Work::<_, W>::of(&Taylor::<_, 2>(Cx::new(zero, zero)));
            for sixteen in sixteens {
                let (a, b) = sixteen.split_at(LANES);
                let (Some(a), Some(b)) = (filled(a), filled(b)) else {
                    continue;
                };
                let (a, b) = (place::<L>(&a), place::<L>(&b));
                let s = Cx::new(Both(a.re, b.re), Both(a.im, b.im));
                let [d, slope] = self.tape.run_in(&Taylor::<_, 2>(s), &mut work);
                let part = |x: Cx<Both<L>>| (Cx::new(x.re.0, x.im.0), Cx::new(x.re.1, x.im.1));
                let (d, slope) = (part(d), part(slope));
                append(d.0, slope.0, LANES, self.to);
                append(d.1, slope.1, LANES, self.to);
            }
        }
        if !rest.is_empty() {
            let zero = L::from(0.0);
            let mut work = Work::<_, W>::of(&Taylor::<_, 2>(Cx::new(zero, zero)));
            for eight in rest.chunks(LANES) {
                if let Some(at) = filled(eight) {
                    let [d, slope] = self.tape.run_in(&Taylor::<_, 2>(place(&at)), &mut work);
                    append(d, slope, eight.len(), self.to);
                }
            }
        }
    }
}

/// Bounds, of a tape on at most `W` slots.
struct Bounds<'a, const W: usize> {
    tape: &'a Tape<f64>,
    over: &'a [Region],
    to: &'a mut Vec<[f64; TAYLOR]>,
}

impl<const W: usize> Job for Bounds<'_, W> {
    type Output = ();
    #[inline(always)]
    fn run<L: Lanes>(self) {
        let mut work = Work::<_, W>([[L::from(0.0); TAYLOR]; W], [[L::from(0.0); TAYLOR]; W]);
        for over in self.over.chunks(LANES) {
            let Some(eight) = filled(over) else { continue };
            let region = Region {
                growth: (
                    gathered::<L, _>(&eight, |r| r.growth.0),
                    gathered(&eight, |r| r.growth.1),
                ),
                modulus: gathered(&eight, |r| r.modulus),
                omega: gathered(&eight, |r| r.omega),
            };
            let found = self.tape.run_in(&Majorant(&region), &mut work);
            let mut bounds = [[0.0; TAYLOR]; LANES];
            for (k, orders) in found.into_iter().enumerate() {
                for (bound, x) in bounds.iter_mut().zip(scattered(orders)) {
                    bound[k] = x;
                }
            }
            self.to.extend_from_slice(&bounds[..over.len()]);
        }
    }
}
