//! Every zero of an analytic function in a window, with a verdict on the list.
//!
//! 1. Count the zeros in the window padded by about 2 % ([`count`](super::count)); a zero on the padded
//!    edge asks for another pad.
//! 2. Newton from a staggered grid of pitch `1.6 B_0/B_1`, where the first step is short, and where zeros are
//!    missing from a rim about it; each point
//!    reached is proved ([`isolate`]) and entered ([`ledger`](super::ledger)), until the
//!    weights add up to the count. Zeros expected somewhere, as those of a function much like this one,
//!    are tried before the grid.
//! 3. Else Newton deflated by the zeros found, then subdivision with counts that must add up.
//! 4. The zeros within the window asked for are the list; one whose error disc straddles its edge makes
//!    the list incomplete and is named.

use num_complex::Complex64;

use super::analytic::Analytic;
use super::count::{CountError, Effort, Rectangle, Walker};
use super::hunt::Hunt;
use super::isolate::{self, Zero};
use super::ledger::Ledger;

/// Why a list is not certified.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
pub enum Doubt {
    /// No count was reached.
    #[error("no count: {0}")]
    NotCounted(CountError),
    /// Fewer zeros were found than counted.
    #[error("{missing} of the zeros counted were not found")]
    Missing {
        /// How many in the padded window; for a symmetric function a pair of conjugates is one.
        missing: i64,
    },
    /// More zeros were found than counted: the function is not analytic or a zero is listed twice.
    #[error("{excess} more zeros found than counted")]
    Excess {
        /// How many.
        excess: i64,
    },
    /// A zero cannot be told to lie inside or outside the window.
    #[error("a zero at {at} straddles the window's edge within its error {error:e}")]
    OnEdge {
        /// Where.
        at: Complex64,
        /// Its error bound.
        error: f64,
    },
    /// A zero is proved but not converged.
    #[error("the zero at {at} is known to {error:e} only")]
    Coarse {
        /// Where.
        at: Complex64,
        /// Its error bound.
        error: f64,
    },
}

/// Zeros in a window and what is known about them.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Search {
    /// The zeros inside, by increasing imaginary part; for a symmetric function those with
    /// nonnegative imaginary part.
    pub zeros: Vec<Zero>,
    /// Number of zeros in the window, with multiplicity; absent where none could be counted.
    pub expected: Option<i64>,
    /// Every zero met, those just outside the window among them: where to start for a function much
    /// like this one.
    pub met: Vec<Complex64>,
    /// Empty when the list is proved complete.
    pub doubts: Vec<Doubt>,
    /// Work done.
    pub effort: Effort,
}

impl Search {
    /// Whether the list is proved complete.
    pub fn complete(&self) -> bool {
        self.doubts.is_empty()
    }
}

/// Largest error of a simple zero, relative to its modulus, that counts as converged.
pub const CONVERGED: f64 = 1e-8;

const PADS: [f64; 5] = [0.02, 0.0287, 0.0131, 0.0411, 0.0073];

/// When the grid of starts may be left.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Scan {
    /// Never before its end: more zeros than counted betray a function that is not analytic.
    Whole,
    /// As soon as the zeros found add up to the count: for functions analytic by construction.
    UntilCounted,
}

/// Finds every zero in the window.
pub fn search<F: Analytic + ?Sized>(f: &F, window: &Rectangle, scan: Scan) -> Search {
    search_from(f, window, scan, &[])
}

/// The same, with points near which zeros are to be expected. They are tried first and may spare the
/// grid; what they cannot do is change the count that the list is held against.
pub fn search_from<F: Analytic + ?Sized>(
    f: &F,
    window: &Rectangle,
    scan: Scan,
    starts: &[Complex64],
) -> Search {
    let mut found = search_parts(f, window, &[*window], scan, starts).into_iter();
    found.next().unwrap_or_default()
}

/// The zeros of several windows from one search of a rectangle that holds them all, which is padded as the first of
/// them would be. Only zeros within their errors of an edge set the verdicts apart: what is missing may lie in any.
pub fn search_parts<F: Analytic + ?Sized>(
    f: &F,
    whole: &Rectangle,
    parts: &[Rectangle],
    scan: Scan,
    starts: &[Complex64],
) -> Vec<Search> {
    let symmetric = f.is_symmetric();
    let mut walker = Walker::new(f);
    let mut counted = Err(CountError::Overflow {
        at: Complex64::new(0.0, 0.0),
    });
    let mut padded = *whole;
    let first = parts.first().unwrap_or(whole);
    for (attempt, pad) in PADS.into_iter().enumerate() {
        padded = pad_by(whole, first, pad, symmetric);
        walker.effort.retries = attempt;
        counted = count(&mut walker, &padded, symmetric);
        let again = matches!(
            counted,
            Err(CountError::OnContour { .. } | CountError::Drowned { .. })
        );
        if !again {
            break;
        }
    }
    let corner = Complex64::new(padded.growth.0, padded.omega.1);
    let scale = isolate::scale(f, corner);
    let mut ledger = Ledger::new(f, scale);
    let count = match counted {
        Ok(n) => n,
        Err(e) => {
            let none = Search {
                doubts: vec![Doubt::NotCounted(e)],
                effort: walker.effort,
                ..Search::default()
            };
            return vec![none; parts.len()];
        }
    };
    Hunt {
        f,
        padded: &padded,
        count,
        symmetric,
        pitch: 1.6 * scale,
        scan,
        starts,
    }
    .run(&mut ledger, &mut walker);
    walker.effort.evaluations += ledger.evaluations;
    let verdict = |part| certify(&ledger, part, &padded, count, walker.effort);
    parts.iter().map(verdict).collect()
}

/// A rectangle padded by a share of the width and height of another.
fn pad_by(window: &Rectangle, of: &Rectangle, pad: f64, symmetric: bool) -> Rectangle {
    let (dg, dw) = (of.growth.1 - of.growth.0, of.omega.1 - of.omega.0);
    let bottom = if symmetric {
        0.0
    } else {
        window.omega.0 - pad * dw
    };
    Rectangle {
        growth: (window.growth.0 - pad * dg, window.growth.1 + pad * dg),
        omega: (bottom, window.omega.1 + pad * dw),
    }
}

/// Zeros in a rectangle.
pub(super) fn count<F: Analytic + ?Sized>(
    walker: &mut Walker<'_, F>,
    r: &Rectangle,
    symmetric: bool,
) -> Result<i64, CountError> {
    if symmetric {
        walker.symmetric(r.growth, r.omega.1)
    } else {
        walker.rectangle(r)
    }
}

/// The verdict: holds a ledger against the count of its padded window and filters it to the window.
pub fn certify<F: Analytic + ?Sized>(
    ledger: &Ledger<'_, F>,
    window: &Rectangle,
    padded: &Rectangle,
    count: i64,
    effort: Effort,
) -> Search {
    let symmetric = ledger.symmetric();
    let mut doubts = Vec::new();
    let mut zeros = Vec::new();
    let mut weight = 0;
    for zero in ledger.zeros() {
        // The axis is no edge of a symmetric window. Where a window without symmetry begins at it, a
        // zero that cannot be told from it is in.
        let near_axis = zero.real || zero.at.im.abs() <= zero.error;
        let on_axis = near_axis && (symmetric || window.omega.0 == 0.0);
        let mut seen = *zero;
        if on_axis {
            seen.at.im = zero.at.im.max(zero.error);
        }
        if padded.holds(seen.at, zero.error) != Some(false) {
            weight += ledger.weight(zero);
        }
        let mut edges = *window;
        if on_axis && window.omega.0 <= 0.0 {
            edges.omega.0 = 0.0;
        } else if zero.real {
            // Frequency exactly zero, below the window.
            continue;
        }
        match edges.holds(seen.at, zero.error) {
            Some(true) => zeros.push(on_or_above(zero, on_axis)),
            Some(false) => {}
            None => {
                zeros.push(*zero);
                doubts.push(Doubt::OnEdge {
                    at: zero.at,
                    error: zero.error,
                });
            }
        }
        if !zero.settled && zero.error > CONVERGED * zero.at.norm().max(1.0) {
            doubts.push(Doubt::Coarse {
                at: zero.at,
                error: zero.error,
            });
        }
    }
    let listed: i64 = zeros.iter().map(|z| i64::from(z.multiplicity)).sum();
    // Conjugates are counted both and listed once.
    let share = if symmetric { 2 } else { 1 };
    let shared = |weight: i64| (weight + share - 1) / share;
    let missing = count - weight;
    if missing > 0 {
        doubts.push(Doubt::Missing {
            missing: shared(missing),
        });
    }
    if missing < 0 {
        doubts.push(Doubt::Excess {
            excess: shared(-missing),
        });
    }
    let expected = listed + (missing as f64 / share as f64).round() as i64;
    zeros.sort_by(|a, b| {
        a.at.im
            .total_cmp(&b.at.im)
            .then(a.at.re.total_cmp(&b.at.re))
    });
    Search {
        zeros,
        expected: Some(expected),
        met: ledger.zeros().iter().map(|z| z.at).collect(),
        doubts,
        effort,
    }
}

/// A zero on the axis as one not below it; its error covers the way it was moved.
fn on_or_above(zero: &Zero, on_axis: bool) -> Zero {
    let below = if on_axis { (-zero.at.im).max(0.0) } else { 0.0 };
    Zero {
        at: Complex64::new(zero.at.re, zero.at.im + below),
        error: zero.error + below,
        ..*zero
    }
}
