//! A mode at one position of a plane, carried from there to another.
//!
//! Positions are in steps of the two axes, so that neighbours are one apart. With `D(s; p) = 0` at a position `p`
//! the mode moves with `ds/dp = -D_p/D_s`; `D_p` comes from the network in numbers that carry their derivative,
//! mean flow included.
//!
//! About a mode, `D(s + h) = D_s h + ..`. Let `rho` be the largest radius found at which `|D/(D_s h) - 1|` stays below
//! [`LINEAR`] on the rim: by Rouche's theorem that disc holds no other mode. Over a step `dp` it goes on holding
//! one while `|D(s; p + dp) - D(s; p)| < |D(s; p)|` on its rim.
//! To first order the change is `dp D_p`, so `|dp D_p/D|` is held to [`MOST_CHANGE`] at both ends of a step, at
//! [`PLACES`] places of the rim, and each end must lie in the other's disc. So no other mode can have taken the place
//! of this one, however fast it is; a step that fails is halved. The mode at each position is proved; the discs are
//! sampled, and the change is of first order.

use num_complex::Complex64;

use crate::acoustics::{self, Acoustics};
use crate::meanflow::{self, MeanFlow};
use crate::network::Network;
use crate::numerics::analytic::{Analytic, quotient};
use crate::numerics::dual::Grad;
use crate::numerics::isolate::{self, Zero};
use crate::studies::map::Axis;

/// Largest relative change of `D` on the rim over a step.
const MOST_CHANGE: f64 = 0.5;
/// Largest share on the rim of what is not linear.
const LINEAR: f64 = 0.5;
/// Ratio of a radius tried to the one before.
const SHRINK: f64 = 0.75;
/// Largest radius tried, over how far Newton may go.
const ROOM: f64 = 2.0;
/// Places on the rim.
const PLACES: usize = 12;
/// Shortest step.
const LEAST: f64 = 1.0 / (1u64 << 30) as f64;
/// Most steps tried from one position to another.
const MOST_STEPS: usize = 300;
/// Most iterates towards a meeting.
const MOST_ITERATES: usize = 40;

/// A position in steps along both axes.
pub(super) type Position = (f64, f64);

/// A mode at a position.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Spot {
    pub at: Position,
    pub zero: Zero,
    /// Radius of the disc that holds no other mode.
    rho: f64,
    /// `ds/dp` along each axis.
    velocity: [Complex64; 2],
    /// `|D_p/D|` on the rim, the largest, along each axis.
    change: [f64; 2],
}

impl Spot {
    /// The mode.
    pub fn s(&self) -> Complex64 {
        self.zero.at
    }

    fn predicted(&self, to: Position) -> Complex64 {
        let (dx, dy) = (to.0 - self.at.0, to.1 - self.at.1);
        self.zero.at + self.velocity[0] * dx + self.velocity[1] * dy
    }

    /// Whether the disc goes on holding one mode as far as `to`.
    fn holds_to(&self, to: Position) -> bool {
        let (dx, dy) = (to.0 - self.at.0, to.1 - self.at.1);
        dx.abs() * self.change[0] + dy.abs() * self.change[1] <= MOST_CHANGE
    }

    /// Whether it is the same mode as another at the same position.
    pub fn is(&self, other: &Spot) -> bool {
        (self.s() - other.s()).norm() <= self.rho.min(other.rho)
    }

    /// Whether a single step leads to the mode at another position.
    pub fn leads_to(&self, other: &Spot) -> bool {
        self.is(other) && self.holds_to(other.at) && other.holds_to(self.at)
    }
}

/// Two modes that meet.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Meeting {
    pub at: Position,
    pub s: Complex64,
}

/// A number with its derivatives by a step along each axis.
pub(super) type OnPlane = Grad<f64, 2>;

/// The network over a plane.
pub(super) struct Ground<'a> {
    pub network: &'a Network,
    pub axes: [Axis; 2],
    /// The mean flow, where nothing on the plane moves it.
    pub held: Option<MeanFlow<OnPlane>>,
}

impl Ground<'_> {
    fn at(&self, position: Position) -> Option<Acoustics<OnPlane>> {
        let mut here = self.network.clone();
        for (axis, p) in self.axes.iter().zip([position.0, position.1]) {
            here.values[axis.knob] = axis.between(p);
        }
        let here = here.seeded_each(self.axes.map(|axis| (axis.knob, axis.step())));
        match &self.held {
            Some(mean) => acoustics::assemble(&here, mean),
            None => meanflow::solve(&here).and_then(|mean| acoustics::assemble(&here, &mean)),
        }
        .ok()
    }

    /// The mode that Newton reaches from a guess within `reach`, proved to be one.
    pub fn spot(&self, at: Position, guess: Complex64, reach: f64) -> Option<Spot> {
        let along = self.at(at)?;
        let f = &along.characteristic.tape.map(|x| x.v);
        let z = isolate::newton(f, guess, reach, &mut 0)?;
        let zero = isolate::simple(f, z, isolate::scale(f, z))?;
        let rho = lone(f, &zero, ROOM * reach)?;
        let [(_, moved), (slope, _)] = along.taylor(zero.at);
        let velocity = moved.map(|moved| -quotient(moved, slope));
        let change = on_rim(&along, zero.at, rho);
        let usable = velocity.iter().all(|v| v.is_finite()) && change.iter().all(|c| c.is_finite());
        usable.then_some(Spot {
            at,
            zero,
            rho,
            velocity,
            change,
        })
    }

    /// The mode carried to another position along the straight line, in steps halved where they must be. `None`
    /// where it cannot be: it meets another on the line, or there is no mean flow.
    pub fn carry(&self, from: &Spot, to: Position) -> Option<Spot> {
        let (dx, dy) = (to.0 - from.at.0, to.1 - from.at.1);
        if dx == 0.0 && dy == 0.0 {
            return Some(*from);
        }
        let (mut here, mut gone, mut step) = (*from, 0.0, 1.0);
        for _ in 0..MOST_STEPS {
            let share = gone + step;
            let next = if share >= 1.0 {
                to
            } else {
                (from.at.0 + share * dx, from.at.1 + share * dy)
            };
            let there = here
                .holds_to(next)
                .then(|| self.spot(next, here.predicted(next), here.rho))
                .flatten();
            match there.filter(|there| here.leads_to(there)) {
                Some(there) if share >= 1.0 => return Some(there),
                Some(there) => {
                    (here, gone) = (there, share);
                    step = (2.0 * step).min(1.0 - gone);
                }
                None => step *= 0.5,
            }
            if step < LEAST {
                return None;
            }
        }
        None
    }

    /// Where two modes meet: `D = D_s = 0`, by Newton in `s` and the position. From the second equation
    /// `ds = -(D_s + D_sx dx + D_sy dy)/D_ss`; in the first that leaves two real equations for `dx` and `dy`.
    pub fn meeting(&self, start: Position, s: Complex64) -> Option<Meeting> {
        let mut here = Meeting { at: start, s };
        let mut last = f64::INFINITY;
        for _ in 0..MOST_ITERATES {
            let along = self.at(here.at)?;
            let [(d, [d_x, d_y]), (d_s, [d_sx, d_sy]), (half, _)] = along.taylor(here.s);
            let d_ss = half * 2.0;
            let ratio = quotient(d_s, d_ss);
            let (value, a, b) = (d - d_s * ratio, d_x - d_sx * ratio, d_y - d_sy * ratio);
            let determinant = a.re * b.im - a.im * b.re;
            let dx = (b.re * value.im - b.im * value.re) / determinant;
            let dy = (a.im * value.re - a.re * value.im) / determinant;
            let ds = -ratio - quotient(d_sx * dx + d_sy * dy, d_ss);
            let size = dx.hypot(dy);

            if !(size.is_finite() && ds.is_finite()) {
                return None;
            }
            // Not farther than a step at once.
            let short = 1.0 / size.max(1.0);
            here.at = (here.at.0 + dx * short, here.at.1 + dy * short);
            here.s += ds * short;
            // At rounding level the steps no longer shrink.
            let settled = size <= 1e-9 && ds.norm() <= 1e-9 * here.s.norm();
            if settled && (size >= 0.5 * last || size <= 1e-14) {
                return Some(here);
            }
            last = size;
        }
        None
    }
}

/// Places on the circle of radius `rho` about zero.
fn rim(rho: f64) -> [Complex64; PLACES] {
    let turn = |k| std::f64::consts::TAU * k as f64 / PLACES as f64;
    std::array::from_fn(|k| Complex64::from_polar(rho, turn(k)))
}

/// The radius of a disc about a mode that holds no other, `most` at most.
fn lone(f: &impl Analytic, zero: &Zero, most: f64) -> Option<f64> {
    let (_, slope) = f.value_and_slope(zero.at);
    let mut values = Vec::with_capacity(PLACES);
    let mut linear = |rho: &f64| {
        let places = rim(*rho).map(|h| zero.at + h);
        values.clear();
        f.values_and_slopes(&places, &mut values);
        let mut parts = rim(*rho).into_iter().zip(&values);
        parts.all(|(h, (value, _))| (quotient(*value, slope * h) - 1.0).norm() < LINEAR)
    };
    let widest = most.min(0.5 * zero.at.norm());
    let tried = std::iter::successors(Some(widest), |rho| Some(SHRINK * rho));
    let mut large = tried.take_while(|rho| *rho > 2.0 * zero.error);
    large.find(|rho| linear(rho))
}

/// The largest `|D_p/D|` on the circle of radius `rho` about `s`, along each axis.
fn on_rim(along: &Acoustics<OnPlane>, s: Complex64, rho: f64) -> [f64; 2] {
    let mut most = [0.0; 2];
    for h in rim(rho) {
        let [(value, moved)] = along.taylor(s + h);
        for (most, moved) in most.iter_mut().zip(moved) {
            let change = quotient(moved, value).norm();
            // `max` alone would pass over what is no number.
            if change > *most || change.is_nan() {
                *most = change;
            }
        }
    }
    most
}
