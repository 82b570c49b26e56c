//! The shape of a mode at the stations and along the ducts.
//!
//! Between the ends of a duct of length `L`, at a distance `x` from its inlet,
//!
//! ```text
//! p' = p+_1 exp(-s x/(c+u)) + p-_2 exp(-s (L-x)/(c-u)),   rho c u' = p+ - p-
//! ```
//!
//! with `p+_1` at the inlet and `p-_2` at the outlet.

use num_complex::Complex64;

use super::explain::Explained;
use super::{Mode, ModeList, Solved, shape};
use crate::elements::Kind;
use crate::gas::State;
use crate::network::{ElementId, Network};
use crate::problems::Problem;

/// Amplitudes at one place, `a(x)` of `Re[a(x) exp(s t)]`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sample {
    /// The element.
    pub element: ElementId,
    /// Distance from the feed along the ducts (m).
    pub position: f64,
    /// Pressure (Pa).
    pub pressure: Complex64,
    /// Axial velocity (m/s).
    pub velocity: Complex64,
}

/// The shape of a mode, its largest pressure amplitude 1 Pa with phase zero.
#[derive(Clone, Debug, PartialEq)]
pub struct Shape {
    /// At each station; `element` is the one that ends there.
    pub stations: Vec<Sample>,
    /// Along each duct, from its inlet to its outlet.
    pub along: Vec<Sample>,
    /// Residual in the global matrix (see [`NullVector`](crate::acoustics::matrix::NullVector)).
    pub residual: f64,
}

/// Places along a duct for each radian of phase a wave passes through, and the least and most of them.
const PER_RADIAN: f64 = 6.0;
const FEWEST: usize = 17;
const MOST: usize = 401;

/// Pressure over the largest wave below which it is rounding. A flame at a pressure node that answers to
/// its own inlet has modes of velocity alone.
const LOST: f64 = 1e-9;

/// The shape of a mode; `None` where the null vector of the global matrix does not settle, is not
/// finite or holds no pressure.
pub fn along(network: &Network, solved: &Solved, mode: &Mode) -> Option<Shape> {
    let null = shape(solved, mode)?;
    let s = mode.s;
    let mut stations = Vec::with_capacity(null.waves.len());
    let mut along = Vec::new();
    let mut position = 0.0;
    let links = &network.layout.links;
    for (plane, (link, state)) in links.iter().zip(&solved.mean.states).enumerate() {
        let &[plus, minus, _] = null.waves.get(plane)?;
        if let (Kind::Duct(duct), Some(before)) = (network.kind(link.from), plane.checked_sub(1)) {
            let length = network.values[duct.length];
            let &[entering, _, _] = null.waves.get(before)?;
            let (c, u) = (state.sound_speed(), state.velocity);
            let phase = s.im * length / (c - u).max(f64::MIN_POSITIVE);
            let steps = ((PER_RADIAN * phase).ceil() as usize).clamp(FEWEST, MOST) - 1;
            for i in 0..=steps {
                let x = length * (i as f64 / steps as f64);
                let plus = entering * (-s * x / (c + u)).exp();
                let minus = minus * (-s * (length - x) / (c - u)).exp();
                along.push(sample(link.from, position + x, state, plus, minus));
            }
            position += length;
        }
        stations.push(sample(link.from, position, state, plus, minus));
    }
    let peak = stations
        .iter()
        .chain(&along)
        .map(|a| a.pressure)
        .max_by(|a, b| a.norm().total_cmp(&b.norm()))?;
    let waves = null.waves.iter().flatten().map(|w| w.norm());
    if !(peak.norm() > LOST * waves.fold(0.0, f64::max) && peak.is_finite()) {
        return None;
    }
    for a in stations.iter_mut().chain(&mut along) {
        a.pressure /= peak;
        a.velocity /= peak;
    }
    let finite = |a: &Sample| a.pressure.is_finite() && a.velocity.is_finite();
    (stations.iter().chain(&along).all(finite)).then_some(Shape {
        stations,
        along,
        residual: null.residual,
    })
}

fn sample(
    element: ElementId,
    position: f64,
    state: &State<f64>,
    plus: Complex64,
    minus: Complex64,
) -> Sample {
    Sample {
        element,
        position,
        pressure: plus + minus,
        velocity: (plus - minus) / (state.density() * state.sound_speed()),
    }
}

/// A warning for each mode without a shape.
pub fn unsettled(list: &ModeList, explained: &[Explained]) -> Vec<Problem> {
    let modes = list.modes.iter().zip(explained).enumerate();
    modes
        .filter(|(_, (_, told))| told.shape.is_none())
        .map(|(i, (mode, _))| {
            let what = format!(
                "mode {} at {:.2} Hz has no shape: the null vector did not settle",
                i + 1,
                mode.frequency()
            );
            Problem::warning("modes", what).hint("its frequency and growth rate stand all the same")
        })
        .collect()
}
