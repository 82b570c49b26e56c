//! Where on a path some mode grows, in the window or outside.
//!
//! Modes are followed a second time, in a window that holds whatever grows up to the highest frequency of the
//! window asked for, so that the ends of unstable stretches are neutral values wherever these lie.

use super::follow::Edge;
use super::reading::neutral;
use super::sample::{Ground, Sample, Verdict};
use super::{Branch, Event, Fastest, Place, Point, Sweep, Woven, add, crossing, weave};
use crate::modes::{Tendency, Window};

use std::cmp::Ordering;

use num_complex::Complex64;
use rayon::prelude::*;

/// How far the window of growth reaches below zero and beyond the growth rate searched at the points, over
/// the height of the window asked for.
const ROOM: f64 = 0.25;

/// The least of that over the highest angular frequency: modes that decay at the points and grow between them must be
/// in it, however flat the window asked for.
const LEAST_ROOM: f64 = 0.05;

/// Difference of growth rates, over the modulus, that rounding makes.
const ALIKE: f64 = 1e-11;

/// Finds the unstable stretches of a sweep and its fastest mode, given whether modes can be followed from each point.
pub(super) fn judge(ground: &Ground<'_>, sweep: &mut Sweep, usable: &[bool]) {
    let all = |_: &Place| true;
    let (mut unstable, inside) = of(&sweep.branches, &sweep.events, all, all);
    let mut in_doubt = in_doubt(&sweep.unresolved, &sweep.branches, &sweep.unfollowed, all);
    let loose = greatest(sweep.unfollowed.iter());
    sweep.fastest = inside
        .map(|at| at.refined(ground, &sweep.branches))
        .into_iter()
        .chain(loose)
        .max_by(by_growth);
    let window = window_of_growth(sweep);
    let wide = Ground { window, ..*ground };
    let sample = |(p, usable): (&Point, &bool)| {
        // Where modes may be missing in the window they may be in the larger one; to see that again takes long.
        if !usable {
            return Sample::unknown(p.u, Verdict::Doubtful("see the window asked for".into()));
        }
        let known = p.modes.iter().map(|(_, m)| m.s);
        let starts: Vec<Complex64> = known.chain(p.outside.fastest.map(|m| m.s)).collect();
        wide.sample(p.u, false, &starts)
    };
    let samples: Vec<Sample> = sweep.points.par_iter().zip(usable).map(sample).collect();
    let woven: Woven = weave(&wide, &samples);
    let asked = ground.window.rectangle();
    // What lies beyond the growth rate searched at the points about it is no more known of than at those.
    let searched = |u: f64| {
        let after = sweep.points.partition_point(|p| p.u < u);
        let about = [after.checked_sub(1), Some(after)].into_iter().flatten();
        let about = about.filter_map(|i| sweep.points.get(i));
        about
            .map(|p| p.outside.searched_to)
            .fold(f64::MIN, f64::max)
    };
    let known = |p: &Place| p.s.re <= searched(p.u);
    let outside = |p: &Place| asked.holds(p.s, p.error) == Some(false);
    let grows_outside = |p: &Place| outside(p) && known(p) && p.tendency() == Tendency::Grows;
    let runs = woven.branches.iter().flat_map(|b| runs(b, grows_outside));
    sweep.growing_outside = runs.collect();
    let (stretches, fastest) = of(&woven.branches, &woven.events, known, outside);
    unstable.extend(stretches);
    let followed = fastest.map(|f| f.refined(&wide, &woven.branches));
    let loose = woven.loose.iter().copied();
    let loose: Vec<Place> = loose.filter(grows_outside).collect();
    let at_points = sweep.points.iter().filter_map(|p| {
        p.outside.fastest.map(|m| Fastest {
            u: p.u,
            s: m.s,
            branch: None,
        })
    });
    let found = followed.map(|f| Fastest { branch: None, ..f }).into_iter();
    let found = found.chain(greatest(loose.iter())).chain(at_points);
    sweep.fastest_outside = found.filter(|f| f.s.re > 0.0).max_by(by_growth);
    let both = sweep.fastest.into_iter().chain(sweep.fastest_outside);
    sweep.fastest = both.max_by(by_growth);
    sweep.unfollowed.extend(loose);
    // Where that window has no list to go by, growth is known from point to point.
    for (i, (point, sample)) in sweep.points.iter().zip(&samples).enumerate() {
        if point.outside.fastest.is_some() && !sample.usable() {
            let u = |i: usize| sweep.points.get(i).map_or(point.u, |p| p.u);
            unstable.push((u(i.saturating_sub(1)), u(i + 1)));
        }
    }
    let also = self::in_doubt(&woven.unresolved, &woven.branches, &woven.loose, known);
    in_doubt.extend(also);
    in_doubt.extend(gaps(sweep, usable));
    let stretches = joined(unstable.iter().chain(&in_doubt).copied().collect(), 0.0);
    in_doubt.extend(left_out(sweep, &stretches));
    unstable.extend(&in_doubt);
    sweep.taken_for_unstable = joined(in_doubt, 0.0);
    sweep.unstable = joined(unstable, 0.0);
    for sample in &samples {
        add(&mut sweep.effort, &sample.effort);
    }
    add(&mut sweep.effort, &woven.effort);
}

/// The stretches of a branch at whose places something holds, each with the place before and the one behind.
fn runs(branch: &Branch, holds: impl Fn(&Place) -> bool) -> Vec<Branch> {
    let trace = &branch.trace;
    let mut runs: Vec<Branch> = Vec::new();
    let mut last = None;
    for i in (0..trace.len()).filter(|i| trace.get(*i).is_some_and(&holds)) {
        let goes_on = last.is_some_and(|last| last + 1 == i);
        let from = if goes_on { i } else { i.saturating_sub(1) };
        if !goes_on {
            runs.push(Branch::default());
        }
        if let Some(run) = runs.last_mut() {
            let seen = run.trace.last().map_or(f64::MIN, |p| p.u);
            let places = trace.iter().take(i + 2).skip(from);
            run.trace.extend(places.filter(|p| p.u > seen));
        }
        last = Some(i);
    }
    runs.retain(|run| run.trace.len() > 1);
    runs
}

/// Steps over which modes move too fast to be followed and at an end of which some mode grows: nothing says that it does
/// not all along.
fn in_doubt(
    unresolved: &[(f64, f64)],
    branches: &[Branch],
    loose: &[Place],
    known: impl Fn(&Place) -> bool,
) -> Vec<(f64, f64)> {
    let places = branches.iter().flat_map(|b| &b.trace).chain(loose);
    let grows = places.filter(|p| p.tendency() == Tendency::Grows && known(p));
    let mut at: Vec<f64> = grows.map(|p| p.u).collect();
    at.sort_by(f64::total_cmp);
    let any = |(from, to): &&(f64, f64)| {
        let first = at.partition_point(|u| u < from);
        at.get(first).is_some_and(|u| u <= to)
    };
    unresolved.iter().filter(any).copied().collect()
}

/// The ways over reported points without an answer, or whose list may miss modes, where some mode grows at a point beside:
/// nothing says where that ends.
fn gaps(sweep: &Sweep, usable: &[bool]) -> Vec<(f64, f64)> {
    let answered: Vec<usize> = (0..sweep.points.len())
        .filter(|i| usable.get(*i).is_some_and(|u| *u))
        .collect();
    let point = |i: usize| sweep.points.get(i);
    let last = sweep.points.len().saturating_sub(1);
    let before = answered.first().filter(|i| **i > 0).map(|i| (0, *i));
    let behind = answered.last().filter(|i| **i < last).map(|i| (*i, last));
    let between = answered.windows(2).filter_map(|pair| match pair {
        &[a, b] if b > a + 1 => Some((a, b)),
        _ => None,
    });
    let all = before.into_iter().chain(between).chain(behind);
    all.filter_map(|(a, b)| Some((point(a)?, point(b)?)))
        .filter(|(a, b)| a.grows() || b.grows())
        .map(|(a, b)| (a.u, b.u))
        .collect()
}

/// The ways between reported points about whatever is known to grow and lies in no stretch yet: at reported points, and of
/// modes that could not be followed.
fn left_out(sweep: &Sweep, stretches: &[(f64, f64)]) -> Vec<(f64, f64)> {
    let points = sweep.points.iter().filter(|p| p.grows()).map(|p| p.u);
    let loose = sweep.unfollowed.iter();
    let loose = loose.filter(|p| p.tendency() == Tendency::Grows);
    let covered = |u: &f64| stretches.iter().any(|(from, to)| (*from..=*to).contains(u));
    let about = |u: f64| {
        let before = sweep.points.iter().rev().find(|p| p.u < u);
        let after = sweep.points.iter().find(|p| p.u > u);
        (before.map_or(u, |p| p.u), after.map_or(u, |p| p.u))
    };
    let all = points.chain(loose.map(|p| p.u));
    all.filter(|u| !covered(u)).map(about).collect()
}

/// By growth rate; of those that rounding does not tell apart the one of lower frequency is the greater.
fn by_growth(a: &Fastest, b: &Fastest) -> Ordering {
    if (a.s.re - b.s.re).abs() <= ALIKE * a.s.norm().max(b.s.norm()) {
        b.s.im.total_cmp(&a.s.im)
    } else {
        a.s.re.total_cmp(&b.s.re)
    }
}

/// The stretches over which branches grow that are anywhere `known`, and the fastest of the places of these that
/// `count`.
fn of(
    branches: &[Branch],
    events: &[Event],
    known: impl Fn(&Place) -> bool,
    count: impl Fn(&Place) -> bool,
) -> (Vec<(f64, f64)>, Option<Fastest>) {
    let mut changes: Vec<Vec<&Event>> = branches.iter().map(|_| Vec::new()).collect();
    for event in neutral(events, None) {
        for b in &event.branches {
            changes[*b].push(event);
        }
    }
    let mut stretches = Vec::new();
    let mut fastest: Option<Fastest> = None;
    for (i, branch) in branches.iter().enumerate() {
        if !branch.trace.iter().any(&known) {
            continue;
        }
        stretches.extend(branch.growing(changes[i].iter().copied()));
        for place in branch.trace.iter().filter(|p| known(p) && count(p)) {
            let here = Fastest {
                u: place.u,
                s: place.s,
                branch: Some(i),
            };
            if fastest.is_none_or(|f| by_growth(&f, &here).is_lt()) {
                fastest = Some(here);
            }
        }
    }
    (stretches, fastest)
}

/// The fastest of places that are on no branch.
fn greatest<'p>(places: impl Iterator<Item = &'p Place>) -> Option<Fastest> {
    let place = |p: &Place| Fastest {
        u: p.u,
        s: p.s,
        branch: None,
    };
    places.map(place).max_by(by_growth)
}

impl Fastest {
    /// The summit of the branch beside the place of it that is highest.
    fn refined(self, ground: &Ground<'_>, branches: &[Branch]) -> Fastest {
        let trace = self.branch.and_then(|b| branches.get(b)).map(|b| &b.trace);
        let ends = trace.and_then(|trace| {
            let i = trace.iter().position(|p| p.u == self.u && p.s == self.s)?;
            let here = trace.get(i)?;
            if here.velocity.re > 0.0 {
                Some((*here, *trace.get(i + 1).filter(|p| !p.gap_before)?))
            } else {
                let before = i.checked_sub(1).filter(|_| !here.gap_before);
                Some((*trace.get(before?)?, *here))
            }
        });
        let summit = ends.and_then(|(a, b)| crossing::summit(ground, a, b));
        match summit.filter(|p| p.s.re > self.s.re) {
            Some(p) => Fastest {
                u: p.u,
                s: p.s,
                ..self
            },
            None => self,
        }
    }
}

fn window_of_growth(sweep: &Sweep) -> Window {
    let (low, high) = sweep.window.growth;
    let least = LEAST_ROOM * sweep.window.rectangle().omega.1;
    let room = (ROOM * (high - low)).max(least);
    let searched = sweep.points.iter().map(|p| p.outside.searched_to);
    Window {
        frequency: (0.0, sweep.window.frequency.1),
        growth: (-room, searched.fold(high.max(0.0), f64::max) + room),
    }
}

/// Stretches in order, those no farther from each other than `gap` as one.
pub(super) fn joined(mut all: Vec<(f64, f64)>, gap: f64) -> Vec<(f64, f64)> {
    all.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut joined: Vec<(f64, f64)> = Vec::new();
    for (from, to) in all {
        match joined.last_mut() {
            Some(last) if from <= last.1 + gap => last.1 = last.1.max(to),
            _ => joined.push((from, to)),
        }
    }
    joined
}

impl Point {
    /// Whether some mode known there grows, in the window or outside.
    pub fn grows(&self) -> bool {
        let outside = self.outside.fastest.iter();
        let mut modes = self.modes.iter().map(|(_, m)| m).chain(outside);
        modes.any(|m| m.tendency() == Tendency::Grows)
    }
}

impl Sweep {
    /// Modes that pass an edge of the window while they grow, other than that of highest frequency: beyond these
    /// edges some mode grows that is on no branch.
    pub fn grows_through_an_edge(&self) -> usize {
        let events = self.events.iter().filter(|e| e.s.re > 0.0);
        events
            .filter(|e| e.edge.is_some_and(|edge| edge != Edge::HighestFrequency))
            .count()
    }
}
