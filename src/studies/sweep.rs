//! A sweep: the certified mode list at every point of a path, and its modes followed from point to
//! point as branches.
//!
//! Every point has its own count and its own proofs (`sample`), and so has every point put in between
//! where a step does not say by itself which mode is which (`ties`, `follow`). What happens to
//! branches is told as events (`weave`): a mode leaves or enters through an edge of the window, two
//! modes meet, a mode and its conjugate become two real modes, a growth rate changes its sign.

pub mod cautions;
mod crossing;
mod follow;
mod growth;
mod reading;
mod sample;
mod ties;
mod weave;
mod woven;

use std::ops::ControlFlow;

use num_complex::Complex64;
use rayon::prelude::*;

use crate::meanflow::MeanFlow;
use crate::modes::{self, Mode, Tendency, Window};
use crate::network::Network;
use crate::numerics::count::Effort;
use crate::problems::Problem;
use crate::studies::map::moves_mean_flow;
use crate::studies::path::Path;
pub use follow::Edge;
use sample::{Ground, Sample, Verdict};
use woven::{Woven, add, weave};

/// Modes closer than this share of the largest `|s|` in the window count as met. Two that close are known to
/// about the square root of the unit roundoff, 1e-8.
const MERGE: f64 = 3e-7;

/// What happens to a branch.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// It enters the window.
    Enters,
    /// It leaves the window.
    Leaves,
    /// Two modes become one and part with velocities that have nothing to do with those before: which
    /// is which beyond is a convention.
    ExceptionalPoint,
    /// Two modes pass through one value and go on as they came.
    Crossing,
    /// A mode and its conjugate meet at frequency zero and part as two real modes; the second branch
    /// begins.
    BecomesReal,
    /// Two real modes meet and part as a mode that oscillates and its conjugate; the second branch ends.
    BecomesOscillating,
    /// Its growth rate becomes positive.
    BecomesUnstable,
    /// Its growth rate becomes negative.
    BecomesStable,
    /// It begins where it could not be followed from before.
    Found,
    /// It ends where it could not be followed further.
    Lost,
}

/// An event along the path.
#[derive(Clone, Debug, PartialEq)]
pub struct Event {
    /// Where, from 0 to 1.
    pub u: f64,
    /// What.
    pub kind: Kind,
    /// To which branches, by index.
    pub branches: Vec<usize>,
    /// The mode there.
    pub s: Complex64,
    /// Through which edge of the window.
    pub edge: Option<Edge>,
}

/// A branch at one position.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Place {
    /// From 0 to 1.
    pub u: f64,
    /// The mode.
    pub s: Complex64,
    /// `ds/du`.
    pub velocity: Complex64,
    /// The exact mode lies no farther from `s`.
    pub error: f64,
    /// The reported point, where it is one.
    pub point: Option<usize>,
    /// Whether points without a usable list lie between this and the place before.
    pub gap_before: bool,
}

impl Place {
    /// Whether it grows, as far as its error bound tells.
    pub fn tendency(&self) -> Tendency {
        Mode {
            s: self.s,
            error_bound: self.error,
            multiplicity: 1,
        }
        .tendency()
    }
}

/// A mode followed along the path.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Branch {
    /// Reported points, points in between and crossings of the window's edge, in order.
    pub trace: Vec<Place>,
}

/// How far the list of a point can be trusted.
#[derive(Clone, Debug, PartialEq)]
pub enum State {
    /// Proved complete.
    Certified,
    /// It is not, for the reason given.
    Doubtful(Box<str>),
    /// There is no mean flow, or no acoustics about it.
    Failed(Box<Problem>),
}

/// Growth outside the window at a point, up to its highest frequency.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Outside {
    /// The fastest mode that grows there.
    pub fastest: Option<Mode>,
    /// Whether further growth is excluded, by proof.
    pub excluded: bool,
    /// Growth rate (1/s) up to which was searched.
    pub searched_to: f64,
}

impl Outside {
    fn of(found: &modes::Outside) -> Self {
        let grows = found.fastest().filter(|m| m.tendency() == Tendency::Grows);
        Outside {
            fastest: grows.copied(),
            excluded: found.rest_excluded(),
            searched_to: found.searched_to,
        }
    }
}

/// The largest growth rate on a sweep.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fastest {
    /// Where, from 0 to 1.
    pub u: f64,
    /// The mode.
    pub s: Complex64,
    /// Its branch; `None` outside the window.
    pub branch: Option<usize>,
}

/// A reported point.
#[derive(Clone, Debug, PartialEq)]
pub struct Point {
    /// From 0 to 1.
    pub u: f64,
    /// How far its list can be trusted.
    pub state: State,
    /// The modes by increasing frequency, each with the index of its branch where it could be told.
    pub modes: Vec<(Option<usize>, Mode)>,
    /// What grows outside the window there.
    pub outside: Outside,
    /// Work done on the list.
    pub effort: Effort,
}

/// The answers along a path.
#[derive(Clone, Debug, PartialEq)]
pub struct Sweep {
    /// The path.
    pub path: Path,
    /// Where modes were searched at every point.
    pub window: Window,
    /// The points in order.
    pub points: Vec<Point>,
    /// The branches, those of the first point by frequency, then as they begin.
    pub branches: Vec<Branch>,
    /// The events in order.
    pub events: Vec<Event>,
    /// Certified points put in between.
    pub between: usize,
    /// Stretches over which modes move too fast to be followed with the work that points in between may take, in
    /// order and apart: branches end and begin there.
    pub unresolved: Vec<(f64, f64)>,
    /// The modes known within these that are on no branch, and those of [`growing_outside`](Self::growing_outside)
    /// that could not be followed, at reported points and points put in between.
    pub unfollowed: Vec<Place>,
    /// Stretches over which some mode grows, in the window or outside up to its highest frequency, in order
    /// and apart.
    pub unstable: Vec<(f64, f64)>,
    /// Of [`unstable`](Self::unstable), stretches over which modes move too fast to be followed or points have no answer, and
    /// at an end of which some mode grows: they are taken for unstable.
    pub taken_for_unstable: Vec<(f64, f64)>,
    /// Modes that grow outside the window up to its highest frequency, over the stretches where they do.
    pub growing_outside: Vec<Branch>,
    /// The mode of largest growth rate found, in the window or outside up to its highest frequency, between points as
    /// well where it was followed.
    pub fastest: Option<Fastest>,
    /// The fastest of the modes that grow outside.
    pub fastest_outside: Option<Fastest>,
    /// Work done on the lists of all points, those in between among them.
    pub effort: Effort,
}

/// Follows the modes of a network along a path, on all cores.
///
/// `mean` is the mean flow of the network; it is computed anew at each point where a knob of the path can
/// move it. `watch` is called once for each reported point done and may end the work, which then has no
/// answer. The answer does not depend on the number of threads.
pub fn sweep(
    network: &Network,
    mean: &MeanFlow<f64>,
    path: &Path,
    window: Window,
    watch: impl Fn() -> ControlFlow<()> + Sync,
) -> Option<Sweep> {
    let moves = path.knobs.iter().any(|(k, _)| moves_mean_flow(network, *k));
    let r = window.rectangle();
    let largest = r.growth.0.abs().max(r.growth.1.abs()).hypot(r.omega.1);
    let ground = Ground {
        network,
        path,
        held: (!moves).then_some(mean),
        window,
        merge: MERGE * largest,
    };
    let samples: Option<Vec<Sample>> = (0..path.points)
        .into_par_iter()
        .map(|i| {
            let sample = ground.sample(path.position(i), true, &[]);
            watch().is_continue().then_some(sample)
        })
        .collect();
    let samples = samples?;
    let woven = weave(&ground, &samples);
    let usable: Vec<bool> = samples.iter().map(Sample::usable).collect();

    let mut effort = woven.effort;
    for sample in &samples {
        add(&mut effort, &sample.effort);
    }
    let points = samples
        .into_iter()
        .zip(woven.on)
        .map(|(sample, on)| point(sample, &on, &woven.branches))
        .collect();
    let mut sweep = Sweep {
        path: path.clone(),
        window,
        points,
        branches: woven.branches,
        events: woven.events,
        between: woven.between,
        unresolved: woven.unresolved,
        unfollowed: woven.loose,
        unstable: Vec::new(),
        taken_for_unstable: Vec::new(),
        growing_outside: Vec::new(),
        fastest: None,
        fastest_outside: None,
        effort,
    };
    growth::judge(&ground, &mut sweep, &usable);
    Some(sweep)
}

/// A sample as a reported point. Where its list was not followed, a mode is told to be of the branch
/// that passes through the disc that holds no other.
fn point(sample: Sample, on: &[Vec<usize>], branches: &[Branch]) -> Point {
    let mut modes: Vec<(Option<usize>, Mode)> = Vec::new();
    let followed = sample.usable();
    let here: Vec<(usize, Complex64)> = if followed {
        Vec::new()
    } else {
        let places = branches.iter().enumerate();
        places
            .filter_map(|(i, b)| b.at(sample.u).map(|p| (i, p.s)))
            .collect()
    };
    for (i, node) in sample.nodes.iter().enumerate() {
        let passing: Vec<usize> = here
            .iter()
            .filter(|(_, s)| (s - node.at).norm() < node.radius)
            .map(|(b, _)| *b)
            .collect();
        let branches: &[usize] = match on.get(i) {
            Some(on) => on,
            None if passing.len() == node.listed => &passing,
            None => &[],
        };
        for (k, mode) in node.modes.iter().take(node.listed).enumerate() {
            modes.push((branches.get(k).copied(), *mode));
        }
    }
    modes.sort_by(|(_, a), (_, b)| {
        let by_growth = a.s.re.total_cmp(&b.s.re);
        a.s.im.total_cmp(&b.s.im).then(by_growth)
    });
    Point {
        u: sample.u,
        state: match sample.verdict {
            Verdict::Complete => State::Certified,
            Verdict::Followable(why) | Verdict::Doubtful(why) => State::Doubtful(why),
            Verdict::Failed(problem) => State::Failed(problem),
        },
        modes,
        outside: sample.outside,
        effort: sample.effort,
    }
}
