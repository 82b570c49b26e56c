//! A stability map: the certified mode list at every point of a plane of two knobs.
//!
//! Values come from their index, `low + i (high - low)/(n - 1)`, and both ends are exact. Every point has
//! its own count and its own proofs. A search starts at the zeros met at the point before in its stretch
//! of a row; stretches are fixed, so the answer does not depend on the number of threads.

use std::ops::ControlFlow;

use num_complex::Complex64;
use rayon::prelude::*;

use crate::acoustics::{self, Acoustics};
use crate::elements::Kind;
use crate::elements::duct::Entropy;
use crate::elements::ends::{ExitEnd, FeedEnd};
use crate::flame::ResponseLaw;
use crate::knobs::KnobId;
use crate::meanflow::MeanFlow;
use crate::modes::{self, Mode, Tendency, Window};
use crate::network::Network;
use crate::problems::{Problem, Problems};

/// A knob and the values it takes, in SI.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Axis {
    /// The knob.
    pub knob: KnobId,
    /// First value.
    pub low: f64,
    /// Last value.
    pub high: f64,
    /// Number of values, both ends among them.
    pub points: usize,
}

impl Axis {
    /// The value of that index.
    pub fn value(&self, index: usize) -> f64 {
        let last = self.points.saturating_sub(1);
        match index {
            0 => self.low,
            i if i >= last => self.high,
            i => self.low + (self.high - self.low) * (i as f64 / last as f64),
        }
    }

    /// The value at a position in steps from the first.
    pub fn between(&self, position: f64) -> f64 {
        let index = position.round();
        if index == position && index >= 0.0 {
            return self.value(index as usize);
        }
        self.low + self.step() * position
    }

    /// What the value changes in a step.
    pub fn step(&self) -> f64 {
        (self.high - self.low) / self.points.saturating_sub(1).max(1) as f64
    }

    /// The position of a value in steps from the first.
    pub fn position(&self, value: f64) -> f64 {
        let position = (value - self.low) / self.step();
        let index = position.round();
        // A value of the axis lies on its point, not beside it by rounding.
        if index >= 0.0 && self.value(index as usize) == value {
            index
        } else {
            position
        }
    }

    /// Every value in order.
    pub fn values(&self) -> Vec<f64> {
        (0..self.points).map(|i| self.value(i)).collect()
    }

    /// Whether a value lies on the axis.
    pub fn holds(&self, value: f64) -> bool {
        (self.low..=self.high).contains(&value)
    }
}

/// The modes that matter at a point.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Found {
    /// The mode in the window that grows fastest, or decays slowest.
    pub leading: Option<Mode>,
    /// The fastest of those that grow outside it, up to its highest frequency (see [`modes::outside`]).
    pub outside: Option<Mode>,
    /// Whether further growth there is excluded, by proof.
    pub excluded: bool,
    /// Growth rate (1/s) up to which was searched.
    pub searched_to: f64,
}

/// What is known of one point.
#[derive(Clone, Debug, PartialEq)]
pub enum Point {
    /// The list of the window is proved complete.
    Certified(Found),
    /// It is not.
    Doubtful {
        /// Of the modes found.
        found: Found,
        /// The first doubt, in words.
        why: Box<str>,
    },
    /// There is no mean flow, or no acoustics about it.
    Failed(Box<Problem>),
}

impl Point {
    fn found(&self) -> Found {
        match self {
            Point::Certified(found) | Point::Doubtful { found, .. } => *found,
            Point::Failed(_) => Found::default(),
        }
    }

    /// The leading mode in the window.
    pub fn leading(&self) -> Option<Mode> {
        self.found().leading
    }

    /// The fastest mode that grows outside the window.
    pub fn outside(&self) -> Option<Mode> {
        self.found().outside
    }

    /// The fastest mode known, in the window or outside.
    pub fn fastest(&self) -> Option<Mode> {
        let both = [self.outside(), self.leading()];
        modes::fastest(both.iter().flatten()).copied()
    }

    /// Whether growth beside the modes known is excluded, up to the window's highest frequency.
    pub fn excluded(&self) -> bool {
        self.found().excluded
    }

    /// Whether the list at the point is proved complete.
    pub fn complete(&self) -> bool {
        matches!(self, Point::Certified(_))
    }
}

/// The answers over a plane.
#[derive(Clone, Debug, PartialEq)]
pub struct Map {
    /// The axis along a row.
    pub across: Axis,
    /// The axis from row to row.
    pub up: Axis,
    /// Where modes were searched at every point.
    pub window: Window,
    /// Row by row, each of `across.points`.
    pub points: Vec<Point>,
    /// The modes of each point, in and outside the window, where they were asked for.
    pub lists: Option<Vec<Vec<Mode>>>,
}

impl Map {
    /// The rows, from the lowest value of `up`.
    pub fn rows(&self) -> impl Iterator<Item = &[Point]> {
        self.points.chunks(self.across.points.max(1))
    }

    /// Each point with its values on `across` and `up`.
    pub fn placed(&self) -> impl Iterator<Item = (f64, f64, &Point)> {
        self.rows().enumerate().flat_map(move |(j, row)| {
            let up = self.up.value(j);
            row.iter()
                .enumerate()
                .map(move |(i, point)| (self.across.value(i), up, point))
        })
    }
}

impl Map {
    /// The same map of one mode alone, as it was followed.
    #[must_use]
    pub fn of_one(mut self, followed: &[Option<Mode>]) -> Map {
        for (point, mode) in self.points.iter_mut().zip(followed) {
            match point {
                Point::Certified(found) | Point::Doubtful { found, .. } => {
                    found.leading = *mode;
                    found.outside = None;
                }
                Point::Failed(_) => {}
            }
        }
        self.lists = None;
        self
    }
}

/// How many points came out how.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Tally {
    /// All of them.
    pub points: usize,
    /// Those whose list is proved complete.
    pub complete: usize,
    /// Those whose list is not.
    pub doubtful: usize,
    /// Those without a mean flow.
    pub failed: usize,
    /// Those where a mode grows, whether or not the list is complete.
    pub growing: usize,
    /// Those where a mode grows outside the window.
    pub outside: usize,
    /// Those where growth beside the modes known is not excluded.
    pub open: usize,
    /// Least growth rate (1/s) up to which growth outside the window was searched at those.
    pub searched_to: Option<f64>,
    /// The largest growth rate found, in the window or outside, with its values on `across` and `up`.
    pub greatest: Option<(f64, f64, Mode)>,
}

impl Map {
    /// Counts the points.
    pub fn tally(&self) -> Tally {
        let mut tally = Tally::default();
        for (x, y, point) in self.placed() {
            tally.points += 1;
            match point {
                Point::Certified(_) => tally.complete += 1,
                Point::Doubtful { .. } => tally.doubtful += 1,
                Point::Failed(_) => tally.failed += 1,
            }
            if !point.excluded() {
                tally.open += 1;
                let to = point.found().searched_to;
                tally.searched_to = Some(tally.searched_to.map_or(to, |least| least.min(to)));
            }
            let Some(mode) = point.fastest() else {
                continue;
            };
            tally.outside += usize::from(point.outside().is_some());
            if mode.tendency() == Tendency::Grows {
                tally.growing += 1;
            }
            if tally
                .greatest
                .is_none_or(|(_, _, m)| m.growth() < mode.growth())
            {
                tally.greatest = Some((x, y, mode));
            }
        }
        tally
    }
}

/// A point with its modes, in and outside the window.
type Solution = (Point, Vec<Mode>);

/// Points of a row that are solved one after another.
const STRETCH: usize = 50;

/// Asks for the modes at every point of the plane, on all cores; with `lists`, keeps them all.
///
/// `mean` is the mean flow of the network; it is computed anew at each point where a knob of the plane
/// can move it. `watch` is called once for each point done and may end the work, which then has no
/// answer.
pub fn map(
    network: &Network,
    mean: &MeanFlow<f64>,
    (across, up): (Axis, Axis),
    window: Window,
    lists: bool,
    watch: impl Fn() -> ControlFlow<()> + Sync,
) -> Option<Map> {
    let moves = moves_mean_flow(network, across.knob) || moves_mean_flow(network, up.knob);
    let held = (!moves).then_some(mean);
    let in_row = across.points.div_ceil(STRETCH);
    let stretches: Option<Vec<Vec<Solution>>> = (0..in_row * up.points)
        .into_par_iter()
        .map(|index| {
            let (first, j) = (index % in_row * STRETCH, index / in_row);
            let mut here = network.clone();
            let mut known = Known::default();
            (first..across.points.min(first + STRETCH))
                .map(|i| {
                    here.values[across.knob] = across.value(i);
                    here.values[up.knob] = up.value(j);
                    let (point, mut modes) = point(&here, held, window, &mut known);
                    if !lists {
                        modes = Vec::new();
                    }
                    watch().is_continue().then_some((point, modes))
                })
                .collect()
        })
        .collect();
    let (points, all): (Vec<_>, Vec<_>) = stretches?.into_iter().flatten().unzip();
    Some(Map {
        across,
        up,
        window,
        points,
        lists: lists.then_some(all),
    })
}

/// A zero farther from all of the point before, over its modulus, is taken for a new one.
const FARTHEST_STEP: f64 = 0.1;

/// What was met at the point before.
#[derive(Default)]
struct Known {
    acoustics: Option<Acoustics<f64>>,
    zeros: Vec<Complex64>,
    /// Those of the point before that.
    earlier: Vec<Complex64>,
    clear_beyond: f64,
}

impl Known {
    /// Where zeros are to be expected next: each as far on as it has come from its nearest at the point before.
    fn expected(&self) -> Vec<Complex64> {
        let on = |&z: &Complex64| {
            let apart = |a: &&Complex64| (**a - z).norm_sqr();
            let nearest = |a: &&Complex64, b: &&Complex64| apart(a).total_cmp(&apart(b));
            let before = self.earlier.iter().min_by(nearest);
            before
                .filter(|a| (*a - z).norm() < FARTHEST_STEP * z.norm())
                .map_or(z, |a| z + (z - a))
        };
        self.zeros.iter().map(on).collect()
    }

    fn take(&mut self, met: Vec<Complex64>) {
        self.earlier = std::mem::replace(&mut self.zeros, met);
    }
}

/// One point. `known` is of the point before and is left with what is met here.
fn point(
    network: &Network,
    held: Option<&MeanFlow<f64>>,
    window: Window,
    known: &mut Known,
) -> Solution {
    let acoustics = match (held, known.acoustics.take()) {
        (None, _) => modes::solve(network).map(|solved| solved.acoustics),
        (Some(mean), None) => acoustics::assemble(network, mean),
        (Some(mean), Some(before)) => acoustics::assemble_like(before, network, mean),
    };
    let acoustics = match acoustics {
        Ok(acoustics) => acoustics,
        Err(Problems(problems)) => {
            let unsaid = || Problem::error("network", "this point has no solution");
            let first = problems.into_iter().next().unwrap_or_else(unsaid);
            return (Point::Failed(Box::new(first)), Vec::new());
        }
    };
    let expected = known.expected();
    // The characteristic function is analytic by construction: a search may end at the count.
    let (mut list, outside) =
        modes::find_all_from(&acoustics, window, known.clear_beyond, &expected);
    let mut met = std::mem::take(&mut list.met);
    for z in &outside.met {
        if !met.contains(z) {
            met.push(*z);
        }
    }
    known.take(met);
    known.acoustics = Some(acoustics);
    known.clear_beyond = outside.searched_to;
    let grows = outside
        .fastest()
        .filter(|m| m.tendency() == Tendency::Grows);
    let found = Found {
        leading: list.leading().copied(),
        outside: grows.copied(),
        excluded: outside.rest_excluded(),
        searched_to: outside.searched_to,
    };
    let point = match list.doubts.first() {
        None => Point::Certified(found),
        Some(doubt) => Point::Doubtful {
            found,
            why: modes::doubt_in_words(doubt).0.into(),
        },
    };
    let mut all = list.modes;
    all.extend(outside.faster);
    (point, all)
}

/// Whether a knob can move the mean flow. Those of the acoustics alone cannot: ducts lose nothing along
/// their length, slugs and volumes are at rest in steady flow, and a response answers fluctuations.
pub fn moves_mean_flow(network: &Network, knob: KnobId) -> bool {
    !network
        .layout
        .elements
        .iter()
        .any(|e| acoustics_only(&e.kind).contains(&knob))
}

/// The knobs of an element that no steady balance reads.
fn acoustics_only(kind: &Kind) -> Vec<KnobId> {
    match kind {
        Kind::Feed(feed) => match feed.end {
            FeedEnd::Reflection(r) => vec![r.coefficient, r.phase],
            FeedEnd::Closed
            | FeedEnd::Open
            | FeedEnd::Reservoir
            | FeedEnd::Anechoic
            | FeedEnd::Choked => Vec::new(),
        },
        Kind::Exit(exit) => match exit.end {
            ExitEnd::Reflection(r) => vec![r.coefficient, r.phase],
            ExitEnd::Closed | ExitEnd::Open | ExitEnd::Anechoic | ExitEnd::Choked { .. } => {
                Vec::new()
            }
        },
        Kind::Duct(duct) => match duct.entropy {
            Entropy::Mixed => vec![duct.length],
            Entropy::Carried { dispersion } => vec![duct.length, dispersion],
        },
        Kind::Contraction(c) => vec![c.effective_length],
        Kind::Expansion(e) => vec![e.effective_length],
        Kind::Restriction(r) => vec![r.effective_length],
        Kind::Plenum(p) => vec![p.volume],
        Kind::Flame(flame) => flame
            .responses
            .iter()
            .flat_map(|r| match r.law {
                ResponseLaw::NTau {
                    interaction_index,
                    delay,
                } => vec![interaction_index, delay],
                ResponseLaw::Gaussian {
                    interaction_index,
                    delay,
                    spread,
                } => vec![interaction_index, delay, spread],
            })
            .collect(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{input, meanflow};

    #[test]
    fn values_come_from_the_index_and_the_ends_are_exact() {
        let axis = Axis {
            knob: KnobId(0),
            low: 0.1,
            high: 0.7,
            points: 7,
        };
        let values = axis.values();
        assert_eq!((values[0], values[6]), (0.1, 0.7));
        for (i, v) in values.iter().enumerate() {
            assert!((v - 0.1 * (i as f64 + 1.0)).abs() < 1e-15);
        }
        assert!(values.windows(2).all(|w| w[0] < w[1]));
    }

    /// A knob said to leave the mean flow alone has derivative zero, exactly, in every state; the
    /// knobs of feed, areas and burnt temperatures have not.
    #[test]
    fn only_knobs_that_leave_the_mean_flow_alone_are_said_to() {
        let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("networks");
        let (mut still, mut moving) = (0, 0);
        for entry in std::fs::read_dir(folder).unwrap() {
            let path = entry.unwrap().path();
            let network = input::read(&path, &[]).unwrap().network;
            for (i, knob) in network.layout.knobs.iter().enumerate() {
                let mean = meanflow::solve(&network.seeded(KnobId(i))).unwrap();
                let moves = mean.states.iter().any(|s| {
                    [s.pressure, s.temperature, s.velocity, s.area]
                        .iter()
                        .any(|x| x.d[0] != 0.0)
                });
                if moves {
                    assert!(moves_mean_flow(&network, KnobId(i)), "{}", knob.name);
                    moving += 1;
                } else if !moves_mean_flow(&network, KnobId(i)) {
                    still += 1;
                }
            }
        }
        assert!(still > 40 && moving > 40, "{still} still, {moving} moving");
    }
}
