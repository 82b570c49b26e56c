//! Samples woven into branches: followed from one to the next, what could not be followed set apart, neutral values found.

use num_complex::Complex64;
use rayon::prelude::*;

use super::sample::{Ground, Sample};
use super::weave::Weaver;
use super::{Branch, Event, Kind, Place, crossing, follow, growth};
use crate::modes::Tendency;
use crate::numerics::count::Effort;

/// Samples with their modes followed from one to the next.
#[derive(Default)]
pub(super) struct Woven {
    pub branches: Vec<Branch>,
    pub events: Vec<Event>,
    /// The branches on each node of each sample.
    pub on: Vec<Vec<Vec<usize>>>,
    pub between: usize,
    /// In order and apart.
    pub unresolved: Vec<(f64, f64)>,
    /// Places within these that are on no branch.
    pub loose: Vec<Place>,
    /// Work done on samples put in between.
    pub effort: Effort,
}

/// Stretches over which modes move too fast to be followed are one where less of the path lies between them: what was
/// followed over so little tells nothing.
const SEEN_APART: f64 = 1.0 / 200.0;

impl Woven {
    /// Takes out branches that lie in unresolved stretches all along, with their events; their places are kept.
    fn leave_out_pieces(&mut self) {
        if self.unresolved.is_empty() {
            return;
        }
        let mut number = vec![None; self.branches.len()];
        let mut kept = Vec::new();
        for (i, branch) in std::mem::take(&mut self.branches).into_iter().enumerate() {
            let (first, last) = (branch.trace.first(), branch.trace.last());
            let within = |(from, to): &(f64, f64)| {
                first.is_some_and(|p| *from <= p.u) && last.is_some_and(|p| p.u <= *to)
            };
            if self.unresolved.iter().any(within) {
                self.loose.extend(branch.trace);
            } else {
                number[i] = Some(kept.len());
                kept.push(branch);
            }
        }
        self.branches = kept;
        let renumber = |on: &mut Vec<usize>| {
            let all = std::mem::take(on).into_iter();
            on.extend(all.filter_map(|b| number.get(b).copied().flatten()));
        };
        for on in self.on.iter_mut().flatten() {
            renumber(on);
        }
        self.events.retain_mut(|event| {
            let of_none = event.branches.is_empty();
            renumber(&mut event.branches);
            of_none || !event.branches.is_empty()
        });
    }
}

pub(super) fn weave(ground: &Ground<'_>, samples: &[Sample]) -> Woven {
    let usable: Vec<usize> = (0..samples.len())
        .filter(|i| samples[*i].usable())
        .collect();
    let pairs: Vec<(usize, usize)> = usable.windows(2).map(|w| (w[0], w[1])).collect();
    let ends: Vec<(&Sample, &Sample)> = pairs
        .iter()
        .map(|&(i, j)| (&samples[i], &samples[j]))
        .collect();
    let stretches = follow::follow(ground, &ends);

    let mut woven = Woven {
        on: vec![Vec::new(); samples.len()],
        ..Woven::default()
    };
    if let Some(&first) = usable.first() {
        let mut weaver = Weaver::new(ground, &samples[first], first);
        woven.on[first] = weaver.on().to_vec();
        for (&(i, j), stretch) in pairs.iter().zip(&stretches) {
            weaver.advance(&samples[i], stretch, &samples[j], j);
            woven.on[j] = weaver.on().to_vec();
        }
        weaver.finish();
        (woven.branches, woven.events) = (weaver.branches, weaver.events);
    }
    let open = stretches.iter().flat_map(|s| s.unresolved.iter().copied());
    woven.unresolved = growth::joined(open.collect(), SEEN_APART);
    woven.leave_out_pieces();
    for branch in &mut woven.branches {
        mark_gaps(&mut branch.trace, samples);
    }
    let neutral: Vec<Vec<Event>> = woven
        .branches
        .par_iter()
        .enumerate()
        .map(|(i, b)| neutral(ground, i, b))
        .collect();
    woven.events.extend(neutral.into_iter().flatten());
    woven
        .events
        .sort_by(|a, b| a.u.total_cmp(&b.u).then(a.branches.cmp(&b.branches)));
    tell_meetings_once(&mut woven.events);
    for stretch in stretches {
        woven.between += stretch.between.len();
        for sample in &stretch.between {
            add(&mut woven.effort, &sample.effort);
        }
    }
    woven
}

/// Next to a meeting the shortest steps may be in doubt as well: within [`SAME`] of a meeting of the same
/// branches nothing is told again, and that they become real or oscillating goes before.
fn tell_meetings_once(events: &mut Vec<Event>) {
    const SAME: f64 = 1e-9;
    let rank = |k: Kind| match k {
        Kind::BecomesReal | Kind::BecomesOscillating => Some(0),
        Kind::ExceptionalPoint | Kind::Crossing => Some(1),
        _ => None,
    };
    let set = |e: &Event| {
        let mut branches = e.branches.clone();
        branches.sort_unstable();
        branches
    };
    let mut kept: Vec<Event> = Vec::with_capacity(events.len());
    for event in events.drain(..) {
        let Some(this) = rank(event.kind) else {
            kept.push(event);
            continue;
        };
        let same = kept
            .iter_mut()
            .rev()
            .find(|e| rank(e.kind).is_some() && event.u - e.u <= SAME && set(e) == set(&event));
        match same {
            Some(told) if rank(told.kind) > Some(this) => *told = event,
            Some(_) => {}
            None => kept.push(event),
        }
    }
    *events = kept;
}

pub(super) fn add(sum: &mut Effort, more: &Effort) {
    sum.evaluations += more.evaluations;
    sum.bounds += more.bounds;
    sum.refinements += more.refinements;
    sum.retries += more.retries;
    sum.fallbacks += more.fallbacks;
}

/// Marks places that come after a point without a usable list.
fn mark_gaps(trace: &mut [Place], samples: &[Sample]) {
    let mut before: Option<f64> = None;
    for place in trace {
        place.gap_before = before.is_some_and(|before| {
            let first = samples.partition_point(|s| s.u <= before);
            let until = samples.partition_point(|s| s.u < place.u);
            samples
                .get(first..until)
                .is_some_and(|skipped| skipped.iter().any(|s| !s.usable()))
        });
        before = Some(place.u);
    }
}

/// Where the growth rate of a branch changes its sign.
fn neutral(ground: &Ground<'_>, index: usize, branch: &Branch) -> Vec<Event> {
    let mut events = Vec::new();
    let growth = |s: Complex64| s.re;
    let mut cross = |a: Place, b: Place| {
        let place = crossing::change_of_sign(ground, (a, b), growth)
            .unwrap_or_else(|| crossing::interpolated(&a, &b, growth));
        events.push(Event {
            u: place.u,
            kind: if b.s.re > a.s.re {
                Kind::BecomesUnstable
            } else {
                Kind::BecomesStable
            },
            branches: vec![index],
            s: place.s,
            edge: None,
        });
    };
    // A growth rate within its error bound is on neither side.
    let mut decided: Option<Place> = None;
    for place in branch
        .trace
        .iter()
        .filter(|p| p.tendency() != Tendency::Neutral)
    {
        if let Some(before) = decided {
            if before.tendency() != place.tendency() {
                cross(before, *place);
            } else if let Some(u) = crossing::dip(&before, place)
                && let Some(dip) = crossing::place(ground, &before, place, u)
                && dip.tendency() != place.tendency()
            {
                cross(before, dip);
                cross(dip, *place);
            }
        }
        decided = Some(*place);
    }
    events
}
