//! Where on a path some mode grows, in the window or outside.
//!
//! Modes are followed a second time, in a window that holds whatever grows up to the highest frequency of the
//! window asked for, so that the ends of unstable stretches are neutral values wherever these lie.

use super::follow::Edge;
use super::reading::neutral;
use super::sample::{Ground, Sample};
use super::{Branch, Event, Fastest, Place, Sweep, Woven, add, weave};
use crate::modes::{Tendency, Window};

use rayon::prelude::*;

/// How far the window of growth reaches below zero and beyond the growth rate searched at the points, over
/// the height of the window asked for.
const ROOM: f64 = 0.25;

/// The least of that over the highest angular frequency: modes that decay at the points and grow between them must be
/// in it, however flat the window asked for.
const LEAST_ROOM: f64 = 0.05;

/// Finds the unstable stretches of a sweep and its fastest mode.
pub(super) fn judge(ground: &Ground<'_>, sweep: &mut Sweep) {
    let (stretches, fastest) = of(&sweep.branches, &sweep.events, |_| true, |_| true);
    let mut all = stretches;
    sweep.fastest = fastest;
    let window = window_of_growth(sweep);
    let wide = Ground { window, ..*ground };
    let samples: Vec<Sample> = sweep
        .points
        .par_iter()
        .map(|p| wide.sample(p.u, false))
        .collect();
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
    all.extend(stretches);
    let outside = fastest.map(|f| Fastest { branch: None, ..f });
    let at_points = sweep.points.iter().filter_map(|p| {
        p.outside.fastest.map(|m| Fastest {
            u: p.u,
            s: m.s,
            branch: None,
        })
    });
    let found = sweep.fastest.into_iter().chain(outside).chain(at_points);
    sweep.fastest = found.max_by(|a, b| a.s.re.total_cmp(&b.s.re));
    // Where that window has no list to go by, growth is known from point to point.
    for (i, (point, sample)) in sweep.points.iter().zip(&samples).enumerate() {
        if point.outside.fastest.is_some() && !sample.usable() {
            let u = |i: usize| sweep.points.get(i).map_or(point.u, |p| p.u);
            all.push((u(i.saturating_sub(1)), u(i + 1)));
        }
    }
    all.extend(in_doubt(&woven, known));
    sweep.unstable = joined(all);
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
fn in_doubt(woven: &Woven, known: impl Fn(&Place) -> bool) -> Vec<(f64, f64)> {
    let places = woven.branches.iter().flat_map(|b| &b.trace);
    let grows = places.filter(|p| p.tendency() == Tendency::Grows && known(p));
    let mut at: Vec<f64> = grows.map(|p| p.u).collect();
    at.sort_by(f64::total_cmp);
    let any = |(from, to): &&(f64, f64)| {
        let first = at.partition_point(|u| u < from);
        at.get(first).is_some_and(|u| u <= to)
    };
    woven.unresolved.iter().filter(any).copied().collect()
}

/// The stretches over which branches grow that are anywhere `known`, and the fastest of the places of these that
/// `count`.
fn of(
    branches: &[Branch],
    events: &[Event],
    known: impl Fn(&Place) -> bool,
    count: impl Fn(&Place) -> bool,
) -> (Vec<(f64, f64)>, Option<Fastest>) {
    let mut stretches = Vec::new();
    let mut fastest: Option<Fastest> = None;
    for (i, branch) in branches.iter().enumerate() {
        if !branch.trace.iter().any(&known) {
            continue;
        }
        stretches.extend(branch.growing(neutral(events, Some(i))));
        for place in branch.trace.iter().filter(|p| known(p) && count(p)) {
            if fastest.is_none_or(|f| f.s.re < place.s.re) {
                fastest = Some(Fastest {
                    u: place.u,
                    s: place.s,
                    branch: Some(i),
                });
            }
        }
    }
    (stretches, fastest)
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

/// Stretches in order, those that touch as one.
pub(super) fn joined(mut all: Vec<(f64, f64)>) -> Vec<(f64, f64)> {
    all.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut joined: Vec<(f64, f64)> = Vec::new();
    for (from, to) in all {
        match joined.last_mut() {
            Some(last) if from <= last.1 => last.1 = last.1.max(to),
            _ => joined.push((from, to)),
        }
    }
    joined
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
