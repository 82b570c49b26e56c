//! One mode followed over a map, and the cut that this leaves.
//!
//! Around a point where two modes meet, an exceptional point, they change places, so that no label holds for a
//! whole plane: what a mode becomes depends on the way taken. So the way is laid down: from the design point first
//! *across* to the column, along the design value of `up`, then *up* or down the column. That depends
//! neither on the resolution of the map nor on its extent nor on the number of threads. Two neighbours of a
//! column are one mode by construction. Two neighbours of a row need not be: where they are not, a *cut*
//! passes between them. It begins at an exceptional point and runs from there along the columns, away from the
//! design value of `up`, to another such point or to the rim.
//!
//! Between two columns the ties change only in a cell that holds an exceptional point of the mode (an odd
//! number of them: of two in one cell nothing is seen). It is then found by Newton. Neighbours that cannot be tied
//! either way are told apart only where such a point is found beside them.
//!
//! Cuts are looked for where the mode lies within the window's own width of it, and exceptional points are kept
//! where it lies within a quarter of that: farther out nothing of either is to be seen on the map.

pub mod beside;
mod ground;

use std::f64::consts::TAU;

use num_complex::Complex64;
use rayon::prelude::*;

use super::map::{Map, moves_mean_flow};
use crate::meanflow::MeanFlow;
use crate::modes::{Mode, Window};
use crate::network::Network;
use ground::{Ground, Meeting, Position, Spot};

/// How far outside the window cuts are looked for, and exceptional points kept, over the window's width.
const LOOKED: f64 = 1.0;
const KEPT: f64 = 0.25;
/// How far outside its cell (in steps) rounding may put a meeting.
const BESIDE: f64 = 1e-6;

/// An exceptional point of the mode followed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Exceptional {
    /// Where, in steps of both axes; the middle of its cell where it was not found within it.
    pub at: (f64, f64),
    /// The mode there, where found.
    pub s: Option<Complex64>,
}

/// A straight piece of the cut, between a column and the next.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Cut {
    /// The column before it.
    pub column: usize,
    /// Its lower end, in steps of both axes.
    pub from: (f64, f64),
    /// Its upper end.
    pub to: (f64, f64),
}

/// A mode over a map.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Followed {
    /// The mode at each point, row by row; none where it was not followed to, or is not in the list of the point.
    pub modes: Vec<Option<Mode>>,
    /// The points it was followed to, in or outside the window.
    pub reached: Vec<bool>,
    /// By column, upwards.
    pub cuts: Vec<Cut>,
    /// By column, upwards.
    pub exceptional: Vec<Exceptional>,
}

/// What `mode` of the network as it stands becomes at each point of the map, of whose points `lists` are the
/// modes. The network lies on the map.
pub fn follow(
    network: &Network,
    mean: &MeanFlow<f64>,
    map: &Map,
    lists: &[Vec<Mode>],
    mode: &Mode,
) -> Followed {
    let axes = [map.across, map.up];
    let moves = axes.iter().any(|a| moves_mean_flow(network, a.knob));
    let ground = Ground {
        network,
        axes,
        held: (!moves).then(|| mean.lift()),
    };
    let design = (
        map.across.position(network.values[map.across.knob]),
        map.up.position(network.values[map.up.knob]),
    );
    let near = |s: Complex64, room: f64| near(&map.window, s, room);
    let levels = Levels::new(map.up.points, design.1);
    let columns = columns(&ground, design, &levels, mode);
    let between: Vec<(Vec<Cut>, Vec<Exceptional>)> = columns
        .par_windows(2)
        .enumerate()
        .filter_map(|(i, pair)| match pair {
            [left, right] => {
                let looked = |s: Complex64| near(s, LOOKED);
                Some(Gap::new(&ground, &levels, i, (left, right), looked).cuts())
            }
            _ => None,
        })
        .collect();
    let (cuts, exceptional): (Vec<_>, Vec<_>) = between.into_iter().unzip();

    let mut modes = Vec::with_capacity(lists.len());
    let mut reached = Vec::with_capacity(lists.len());
    for (k, list) in lists.iter().enumerate() {
        let (i, j) = (k % map.across.points, k / map.across.points);
        let spot = columns
            .get(i)
            .and_then(|column| column.get(levels.of_row(j)).copied().flatten());
        reached.push(spot.is_some());
        // The certified list has the last word on the value.
        let in_list = |spot: Spot| {
            let near = |m: &&Mode| (m.s - spot.s()).norm() <= m.error_bound + spot.zero.error;
            list.iter().find(near).copied()
        };
        modes.push(spot.and_then(in_list));
    }
    Followed {
        modes,
        reached,
        cuts: cuts.into_iter().flatten().collect(),
        exceptional: exceptional
            .into_iter()
            .flatten()
            .filter(|e| e.s.is_none_or(|s| near(s, KEPT)))
            .collect(),
    }
}

/// Whether a mode lies in a window, or outside by no more than `room` of its width.
fn near(window: &Window, s: Complex64, room: f64) -> bool {
    let within = |x: f64, (low, high): (f64, f64)| {
        let room = room * (high - low);
        (low - room..=high + room).contains(&x)
    };
    within(s.re, window.growth) && within(s.im / TAU, window.frequency)
}

/// The positions at which a column is visited: its rows, and the design value of `up` where it lies
/// between two of them.
struct Levels {
    at: Vec<f64>,
    base: usize,
    added: bool,
}

impl Levels {
    fn new(rows: usize, design: f64) -> Self {
        let mut at: Vec<f64> = (0..rows).map(|j| j as f64).collect();
        let base = at.partition_point(|&v| v < design);
        let added = at.get(base) != Some(&design);
        if added {
            at.insert(base, design);
        }
        Levels { at, base, added }
    }

    fn of_row(&self, row: usize) -> usize {
        row + usize::from(self.added && row >= self.base)
    }

    fn position(&self, column: usize, level: usize) -> Option<Position> {
        Some((column as f64, *self.at.get(level)?))
    }
}

/// The mode at each level of each column.
fn columns(
    ground: &Ground<'_>,
    design: Position,
    levels: &Levels,
    mode: &Mode,
) -> Vec<Vec<Option<Spot>>> {
    let points = ground.axes[0].points;
    let Some(start) = ground.spot(design, mode.s, mode.s.norm()) else {
        return vec![vec![None; levels.at.len()]; points];
    };
    let mut base = vec![None; points];
    let first = (design.0.ceil().max(0.0) as usize).min(points);
    let onward = |base: &mut Vec<Option<Spot>>, columns: &mut dyn Iterator<Item = usize>| {
        let mut here = start;
        for i in columns {
            let Some(there) = ground.carry(&here, (i as f64, design.1)) else {
                break;
            };
            if let Some(slot) = base.get_mut(i) {
                *slot = Some(there);
            }
            here = there;
        }
    };
    onward(&mut base, &mut (first..points));
    onward(&mut base, &mut (0..first).rev());
    base.into_par_iter()
        .enumerate()
        .map(|(i, spot)| column(ground, levels, i, spot))
        .collect()
}

/// The mode up and down a column, as far as it can be followed.
fn column(
    ground: &Ground<'_>,
    levels: &Levels,
    column: usize,
    base: Option<Spot>,
) -> Vec<Option<Spot>> {
    let mut spots = vec![None; levels.at.len()];
    let Some(start) = base else { return spots };
    let mut onward = |numbers: &mut dyn Iterator<Item = usize>| {
        let mut here = start;
        for l in numbers {
            let there = levels.position(column, l);
            let Some(there) = there.and_then(|at| ground.carry(&here, at)) else {
                break;
            };
            if let Some(slot) = spots.get_mut(l) {
                *slot = Some(there);
            }
            here = there;
        }
    };
    onward(&mut (levels.base..levels.at.len()));
    onward(&mut (0..levels.base).rev());
    spots
}

/// What two neighbours of a row are to each other.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Tie {
    /// The mode is not known at both, or lies far outside the window.
    Open,
    /// Neither leads to the other, nor to any mode.
    Undecided,
    /// One mode.
    Same,
    /// Two.
    Other,
}

/// Where neighbours are two modes: what the left one becomes at the right, and the right one at the left, as
/// far as that can be said.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
struct Crossed {
    right: Option<Spot>,
    left: Option<Spot>,
}

/// Two neighbouring columns.
struct Gap<'a> {
    ground: &'a Ground<'a>,
    levels: &'a Levels,
    column: usize,
    left: &'a [Option<Spot>],
    ties: Vec<Tie>,
    crossed: Vec<Crossed>,
}

impl<'a> Gap<'a> {
    fn new(
        ground: &'a Ground<'a>,
        levels: &'a Levels,
        column: usize,
        (left, right): (&'a [Option<Spot>], &[Option<Spot>]),
        looked: impl Fn(Complex64) -> bool,
    ) -> Self {
        let each = left.iter().zip(right).map(|(a, b)| match (a, b) {
            (Some(a), Some(b)) if looked(a.s()) || looked(b.s()) => tie(ground, a, b),
            _ => (Tie::Open, Crossed::default()),
        });
        let (ties, crossed) = each.unzip();
        let mut gap = Gap {
            ground,
            levels,
            column,
            left,
            ties,
            crossed,
        };
        let decided = |(level, tie): (usize, &Tie)| match tie {
            Tie::Undecided if gap.parted(level) => Tie::Other,
            Tie::Undecided => Tie::Open,
            tie => *tie,
        };
        gap.ties = gap.ties.iter().enumerate().map(decided).collect();
        gap
    }

    /// Whether the mode meets another in a cell beside a level.
    fn parted(&self, level: usize) -> bool {
        let spot = self.spot(level);
        let cells = [level, level + 1];
        let met = cells.map(|cell| self.meeting(cell, spot, None));
        met.into_iter().flatten().any(|met| met.s.is_some())
    }

    /// The cuts between the columns, with the exceptional points at their ends and beside them.
    fn cuts(&self) -> (Vec<Cut>, Vec<Exceptional>) {
        let mut cuts = Vec::new();
        let mut points: Vec<Exceptional> = Vec::new();
        let mut begun: Option<(Option<Position>, f64)> = None;
        let middle = self.column as f64 + 0.5;
        let mut end = |begun: Option<(Option<Position>, f64)>, at: Option<Position>, v: f64| {
            let Some((from, low)) = begun else { return };
            // Where only one end is known the cut keeps to its column.
            let u = from.or(at).map_or(middle, |p| p.0);
            cuts.push(Cut {
                column: self.column,
                from: from.unwrap_or((u, low)),
                to: at.unwrap_or((u, v)),
            });
        };
        let mut before = Tie::Open;
        let mut below = 0.0;
        for (l, (&tie, &v)) in self.ties.iter().zip(&self.levels.at).enumerate() {
            let lower = l.saturating_sub(1);
            let met = match (before, tie) {
                (Tie::Same, Tie::Other) => self.meeting(l, self.spot(l), self.crossed(l).left),
                (Tie::Other, Tie::Same) => {
                    self.meeting(l, self.spot(lower), self.crossed(lower).left)
                }
                (Tie::Other, Tie::Other) => self.beside(l),
                _ => None,
            };
            points.extend(met);
            let at = met.map(|m| m.at);
            match (before, tie) {
                (Tie::Other, Tie::Same) => end(begun.take(), at, v),
                (Tie::Other, Tie::Open) => end(begun.take(), None, below),
                (Tie::Same | Tie::Open, Tie::Other) => begun = Some((at, v)),
                _ => {}
            }
            (before, below) = (tie, v);
        }
        end(begun.take(), None, below);
        (cuts, points)
    }

    fn spot(&self, level: usize) -> Option<Spot> {
        self.left.get(level).copied().flatten()
    }

    fn crossed(&self, level: usize) -> Crossed {
        self.crossed.get(level).copied().unwrap_or_default()
    }

    /// The exceptional point in the cell below a level, of two modes of its left side.
    fn meeting(&self, level: usize, a: Option<Spot>, b: Option<Spot>) -> Option<Exceptional> {
        let upper = *self.levels.at.get(level)?;
        let lower = *self.levels.at.get(level.checked_sub(1)?)?;
        let column = self.column as f64;
        let middle = (column + 0.5, 0.5 * (lower + upper));
        let a = a?;
        let s = b.map_or(a.s(), |b| 0.5 * (a.s() + b.s()));
        let within = |m: &Meeting| {
            m.at.0 >= column - BESIDE
                && m.at.0 <= column + 1.0 + BESIDE
                && m.at.1 >= lower - BESIDE
                && m.at.1 <= upper + BESIDE
        };
        let met = self.ground.meeting(middle, s).filter(within);
        Some(Exceptional {
            at: met.map_or(middle, |m| m.at),
            s: met.map(|m| m.s),
        })
    }

    /// An exceptional point of the other modes at a cut, in the cell below a level: the mode that one side
    /// becomes on the other does not go on as it does a level higher.
    fn beside(&self, level: usize) -> Option<Exceptional> {
        let (before, here) = (self.crossed(level.checked_sub(1)?), self.crossed(level));
        let changed = |a: Option<Spot>, b: Option<Spot>| {
            let (a, b) = (a?, b?);
            if a.leads_to(&b) {
                return None;
            }
            let there = self.ground.carry(&a, b.at)?;
            (!there.is(&b)).then_some((there, b))
        };
        let (a, b) =
            changed(before.left, here.left).or_else(|| changed(before.right, here.right))?;
        self.meeting(level, Some(a), Some(b))
    }
}

fn tie(ground: &Ground<'_>, a: &Spot, b: &Spot) -> (Tie, Crossed) {
    let same = (Tie::Same, Crossed::default());
    if a.leads_to(b) {
        return same;
    }
    let right = ground.carry(a, b.at);
    if right.is_some_and(|right| right.is(b)) {
        return same;
    }
    let left = ground.carry(b, a.at);
    if left.is_some_and(|left| left.is(a)) {
        return same;
    }
    // On a line through an exceptional point neither way is open.
    let tie = match (left, right) {
        (None, None) => Tie::Undecided,
        _ => Tie::Other,
    };
    (tie, Crossed { right, left })
}
