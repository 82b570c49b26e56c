//! From a window to a certified list of modes.

mod blur;
pub mod budget;
pub mod explain;
pub mod margins;
mod outside;
pub mod shapes;
pub mod validity;
mod window;

use num_complex::Complex64;

use crate::acoustics::{self, Acoustics, matrix};
use crate::meanflow::{self, MeanFlow};
use crate::network::Network;
use crate::numerics::count::{CountError, Effort};
pub use crate::numerics::zeros::Scan;
use crate::numerics::zeros::{self, Doubt};
use crate::problems::{Problem, Problems};
use crate::units::{write_decimals, write_signed};

pub use outside::{Outside, find_all_from, outside};
pub use window::{Window, cut_on};

/// One mode: `p'(x, t) = Re[p(x) exp(s t)]`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Mode {
    /// `s = growth + 2 pi i frequency` (1/s).
    pub s: Complex64,
    /// The exact eigenvalue lies no farther from `s` than this (1/s): proved for the model's coefficients as they are
    /// computed; [`find`] adds what their rounding was seen to move it.
    pub error_bound: f64,
    /// Number of modes that coincide within `error_bound`.
    pub multiplicity: u8,
}

impl Mode {
    /// Frequency (Hz), not negative.
    pub fn frequency(&self) -> f64 {
        self.s.im / std::f64::consts::TAU
    }

    /// Growth rate (1/s): positive grows.
    pub fn growth(&self) -> f64 {
        self.s.re
    }

    /// Growth rate over frequency; none for a mode that does not oscillate.
    pub fn cycle_increment(&self) -> Option<f64> {
        (self.s.im > 0.0).then(|| self.growth() / self.frequency())
    }

    /// `-growth/|s|`; none where `s` is zero, as far as its error bound tells.
    pub fn damping_ratio(&self) -> Option<f64> {
        let size = self.s.norm();
        (size > self.error_bound).then(|| -self.growth() / size)
    }

    /// Full width at half power of the peak a damped mode makes in a spectrum, `-growth/pi` (Hz).
    pub fn half_power_width(&self) -> Option<f64> {
        (self.growth() < 0.0).then(|| -self.growth() / std::f64::consts::PI)
    }

    /// Whether it grows, as far as its error bound tells.
    pub fn tendency(&self) -> Tendency {
        match self.growth() {
            g if g > self.error_bound => Tendency::Grows,
            g if g < -self.error_bound => Tendency::Decays,
            _ => Tendency::Neutral,
        }
    }
}

/// What becomes of a small disturbance in a mode.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Tendency {
    /// It grows, by more than the error bound.
    Grows,
    /// The error bound does not tell.
    Neutral,
    /// It decays, by more than the error bound.
    Decays,
}

/// Every mode in a window, and whether that is proved.
#[derive(Clone, Debug, PartialEq)]
pub struct ModeList {
    /// Where was searched.
    pub window: Window,
    /// By increasing frequency.
    pub modes: Vec<Mode>,
    /// Number of modes in the window by the argument principle; absent where no count was reached.
    pub expected: Option<usize>,
    /// Every zero met, those just outside the window among them: where to start for a network much like
    /// this one.
    pub met: Vec<Complex64>,
    /// Why the list is not proved complete; empty when it is.
    pub doubts: Vec<Doubt>,
    /// Work done.
    pub effort: Effort,
}

impl ModeList {
    /// Whether the list is proved complete: the count agrees and no mode straddles the window's edge.
    pub fn complete(&self) -> bool {
        self.doubts.is_empty()
    }

    /// The mode that grows fastest, or decays slowest.
    pub fn leading(&self) -> Option<&Mode> {
        fastest(self.modes.iter())
    }
}

/// The mode that grows fastest, or decays slowest; of those that their errors do not tell from it, the one of lowest
/// frequency, so that rounding does not choose.
pub fn fastest<'a>(modes: impl Iterator<Item = &'a Mode> + Clone) -> Option<&'a Mode> {
    let by_growth = |a: &&Mode, b: &&Mode| a.growth().total_cmp(&b.growth());
    let first = modes.clone().max_by(by_growth)?;
    let alike = |m: &&Mode| first.growth() - m.growth() <= first.error_bound + m.error_bound;
    modes
        .filter(alike)
        .min_by(|a, b| a.frequency().total_cmp(&b.frequency()))
}

/// A network with its mean flow and acoustics.
#[derive(Clone, Debug)]
pub struct Solved {
    /// The mean flow.
    pub mean: MeanFlow<f64>,
    /// The acoustics about it.
    pub acoustics: Acoustics<f64>,
}

/// Computes the mean flow of a network and its acoustics.
///
/// # Errors
/// Where the mean flow has no solution or the acoustics cannot be assembled.
pub fn solve(network: &Network) -> Result<Solved, Problems> {
    let mean = meanflow::solve(network)?;
    let acoustics = acoustics::assemble(network, &mean)?;
    Ok(Solved { mean, acoustics })
}

/// Error of a mode, relative to its modulus, beyond which a list that holds it is in doubt.
const BLURRED: f64 = 1e-4;

/// Finds every mode in a window. Errors of the modes hold what rounding of the coefficients leaves open; where that is
/// much, the list is in doubt ([`Doubt::Coarse`]).
pub fn find(solved: &Solved, window: Window, scan: Scan) -> ModeList {
    let mut list = find_from(&solved.acoustics, window, scan, &[]);
    let coarse = |m: &Mode| m.error_bound > BLURRED * m.s.norm().max(1.0);
    let known = list.modes.iter().map(coarse).collect::<Vec<_>>();
    blur::widen(&solved.acoustics.chain, &mut list.modes);
    for (mode, known) in list.modes.iter().zip(known) {
        if coarse(mode) && !known {
            list.doubts.push(Doubt::Coarse {
                at: mode.s,
                error: mode.error_bound,
            });
        }
    }
    list
}

/// The same with errors for the coefficients as they are, trying first where zeros are to be expected: those met in a network much like this one.
pub fn find_from(
    acoustics: &Acoustics<f64>,
    window: Window,
    scan: Scan,
    starts: &[Complex64],
) -> ModeList {
    let tape = &acoustics.characteristic.tape;
    let found = zeros::search_from(tape, &window.rectangle(), scan, starts);
    listed(window, found)
}

fn listed(window: Window, found: zeros::Search) -> ModeList {
    let modes = found
        .zeros
        .iter()
        .map(|z| Mode {
            s: z.at,
            error_bound: z.error,
            multiplicity: z.multiplicity,
        })
        .collect();
    ModeList {
        window,
        modes,
        expected: found.expected.and_then(|n| usize::try_from(n).ok()),
        met: found.met,
        doubts: found.doubts,
        effort: found.effort,
    }
}

/// The shape of a mode with its residual in the global matrix.
pub fn shape(solved: &Solved, mode: &Mode) -> Option<matrix::NullVector> {
    matrix::null_vector(&solved.acoustics.chain, mode.s)
}

/// The doubts of a list as problems that qualify it.
pub fn doubts_as_warnings(list: &ModeList) -> Vec<Problem> {
    list.doubts
        .iter()
        .map(|d| {
            let (what, hint) = doubt_in_words(d);
            Problem::warning("search", what).hint(hint)
        })
        .collect()
}

/// What a doubt says of the modes, and what may mend it.
pub fn doubt_in_words(doubt: &Doubt) -> (String, &'static str) {
    let place = |s: &Complex64| {
        let frequency = s.im.abs() / std::f64::consts::TAU;
        format!(
            "{} Hz with growth rate {} 1/s",
            write_decimals(frequency, 4),
            write_signed(s.re, 4)
        )
    };
    let defect = "the list is not to be relied on: this is a defect of the program, worth a report";
    match doubt {
        Doubt::NotCounted(CountError::OnContour { near }) => (
            format!(
                "the modes could not be counted: one lies on the edge of each window tried, near {}",
                place(near)
            ),
            "move the edges of the window",
        ),
        Doubt::NotCounted(CountError::Drowned { near }) => (
            format!(
                "the modes could not be counted: near {} what waves cancel leaves less than rounding",
                place(near)
            ),
            "raise the lower growth rate: waves that decay fast in time grow along the network, entropy carried slowly \
             most of all",
        ),
        Doubt::NotCounted(CountError::Overflow { at }) => (
            format!(
                "the modes could not be counted: at {} the numbers overflow",
                place(at)
            ),
            if at.re < 0.0 {
                "raise the lower growth rate: the longest delay sets how far it may go down, be it of a flame, a \
                 long duct or entropy carried slowly"
            } else {
                "take a window that reaches less far"
            },
        ),
        Doubt::NotCounted(CountError::BoundContradicted { at }) => (
            format!(
                "the modes could not be counted: at {} a value exceeds its bound",
                place(at)
            ),
            defect,
        ),
        Doubt::Missing { missing } => (
            format!("of the modes counted {missing} could not be found or proved"),
            "a window less deep, or moved, may list them; rounding hides modes that delays damp strongly",
        ),
        Doubt::Excess { excess } => (
            format!("{excess} more modes were found than counted"),
            defect,
        ),
        Doubt::OnEdge { at, error } => (
            format!(
                "the mode at {} lies within its error, {error:.1e} 1/s, of the window's edge",
                place(at)
            ),
            "move that edge",
        ),
        Doubt::Coarse { at, error } => (
            format!("the mode at {} is known to {error:.1e} 1/s only", place(at)),
            "a window less deep in decay avoids modes that rounding blurs",
        ),
    }
}
