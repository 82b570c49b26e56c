//! Where along a branch something becomes zero: its growth rate, or its distance from the window's edge.
//!
//! Newton in `u` with the velocity of the mode, inside a bracket that shrinks; bisection where Newton
//! would leave it. Every iterate is a proved mode of the network at its `u`.

use num_complex::Complex64;

use super::Place;
use super::sample::Ground;
use super::ties::between;

/// Most iterates.
const MOST: usize = 80;

/// Finds where `f` changes its sign between two places of a branch. `None` where an iterate has no mode.
pub(super) fn change_of_sign(
    ground: &Ground<'_>,
    ends: (Place, Place),
    f: impl Fn(Complex64) -> f64,
) -> Option<Place> {
    let (mut a, mut b) = ends;
    let rising = f(b.s) > f(a.s);
    let mut u = proportional(&a, &b, f(a.s), f(b.s));
    for _ in 0..MOST {
        let here = place(ground, &a, &b, u)?;
        let value = f(here.s);
        let enough = here.error.max(1e-13 * here.s.norm());
        if value.abs() <= enough || b.u - a.u <= 4.0 * f64::EPSILON {
            return Some(here);
        }
        if (value > 0.0) == rising {
            b = here;
        } else {
            a = here;
        }
        // The rate of `f`, which is a coordinate of `s` up to its sign and a shift.
        let rate = f(here.s + here.velocity) - value;
        let next = u - value / rate;
        u = if next > a.u && next < b.u {
            next
        } else {
            0.5 * (a.u + b.u)
        };
    }
    None
}

/// The position where a straight line between two places would be zero.
fn proportional(a: &Place, b: &Place, fa: f64, fb: f64) -> f64 {
    let t = fa / (fa - fb);
    let t = if t.is_finite() {
        t.clamp(0.0, 1.0)
    } else {
        0.5
    };
    a.u + t * (b.u - a.u)
}

/// The place by a straight line, where no iterate can be had.
pub(super) fn interpolated(a: &Place, b: &Place, f: impl Fn(Complex64) -> f64) -> Place {
    let u = proportional(a, b, f(a.s), f(b.s));
    on_cubic(a, b, u)
}

/// The branch at a position between two of its places, by the cubic through them.
pub(super) fn on_cubic(a: &Place, b: &Place, u: f64) -> Place {
    let h = b.u - a.u;
    let t = if h > 0.0 { (u - a.u) / h } else { 0.0 };
    Place {
        u,
        s: between(a.s, a.velocity, b.s, b.velocity, h, t),
        velocity: a.velocity * (1.0 - t) + b.velocity * t,
        error: a.error.max(b.error),
        ..*a
    }
}

/// The branch at a position between two of its places, as a proved mode.
pub(super) fn place(ground: &Ground<'_>, a: &Place, b: &Place, u: f64) -> Option<Place> {
    let guess = on_cubic(a, b, u);
    let live = ground.live(u).ok()?;
    let reach = (b.s - a.s).norm() + ground.merge;
    let zero = live.mode_near(guess.s, reach)?;
    let node = live.node(&zero);
    Some(Place {
        u,
        s: node.at,
        velocity: node.velocity,
        error: node.error,
        point: None,
        ..guess
    })
}

/// Where the growth rate of a branch is largest between two places, given that it rises at the first and falls at the
/// second; by bisection of its rate. `None` where it does not, or an iterate has no mode.
pub(super) fn summit(ground: &Ground<'_>, mut a: Place, mut b: Place) -> Option<Place> {
    if a.velocity.re <= 0.0 || b.velocity.re >= 0.0 {
        return None;
    }
    let mut best = if a.s.re > b.s.re { a } else { b };
    for _ in 0..MOST {
        // By a straight line through the rates, held off the ends.
        let t = (a.velocity.re / (a.velocity.re - b.velocity.re)).clamp(0.1, 0.9);
        let here = place(ground, &a, &b, a.u + t * (b.u - a.u))?;
        let gained = (here.s.re - best.s.re).abs();
        if here.s.re > best.s.re {
            best = here;
        }
        if gained <= here.error.max(1e-12 * here.s.norm()) || b.u - a.u <= 1e-12 {
            break;
        }
        if here.velocity.re > 0.0 {
            a = here;
        } else {
            b = here;
        }
    }
    Some(best)
}

/// A position strictly between two places of equal sign at which the cubic growth rate has the other
/// sign, if there is one.
pub(super) fn dip(a: &Place, b: &Place) -> Option<f64> {
    const PLACES: u32 = 32;
    let sign = a.s.re.signum();
    let towards = a.velocity.re * sign < 0.0 && b.velocity.re * sign > 0.0;
    if !towards {
        return None;
    }
    let at = |k: u32| a.u + (b.u - a.u) * f64::from(k) / f64::from(PLACES);
    (1..PLACES)
        .map(|k| (on_cubic(a, b, at(k)).s.re * sign, at(k)))
        .min_by(|x, y| x.0.total_cmp(&y.0))
        .filter(|(growth, _)| *growth < 0.0)
        .map(|(_, u)| u)
}
