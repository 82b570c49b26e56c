//! What a sweep says: where branches are, where some mode grows, how many points are certified.

use super::{Branch, Event, Kind, Place, State, Sweep, crossing};
use crate::modes::Tendency;

impl Branch {
    /// Its place of largest growth rate.
    pub fn greatest(&self) -> Option<&Place> {
        let by_growth = |a: &&Place, b: &&Place| a.s.re.total_cmp(&b.s.re);
        self.trace.iter().max_by(by_growth)
    }

    /// Where it is at a position, by the cubic through its places; `None` where it is not.
    pub fn at(&self, u: f64) -> Option<Place> {
        let i = self.trace.partition_point(|p| p.u < u);
        let after = self.trace.get(i)?;
        if after.u == u {
            return Some(*after);
        }
        let before = self.trace.get(i.checked_sub(1)?)?;
        Some(crossing::on_cubic(before, after, u))
    }

    /// The same, but not over points without a usable list.
    pub fn known_at(&self, u: f64) -> Option<Place> {
        let after = self.trace.get(self.trace.partition_point(|p| p.u < u))?;
        if after.gap_before && after.u > u {
            return None;
        }
        self.at(u)
    }

    /// Stretches over which it grows, given the events at which its growth rate changes its sign.
    pub(super) fn growing<'e>(
        &self,
        neutral: impl Iterator<Item = &'e Event> + Clone,
    ) -> Vec<(f64, f64)> {
        let mut stretches = Vec::new();
        for run in self.trace.chunk_by(|_, next| !next.gap_before) {
            let (Some(first), Some(last)) = (run.first(), run.last()) else {
                continue;
            };
            let mut decided = run.iter().map(Place::tendency);
            let begins = decided.find(|t| *t != Tendency::Neutral);
            let mut since = (begins == Some(Tendency::Grows)).then_some(first.u);
            let inside = |e: &&Event| (first.u..=last.u).contains(&e.u);
            for event in neutral.clone().filter(inside) {
                match (event.kind, since) {
                    (Kind::BecomesUnstable, _) => since = Some(event.u),
                    (_, Some(from)) => {
                        stretches.push((from, event.u));
                        since = None;
                    }
                    (_, None) => {}
                }
            }
            stretches.extend(since.map(|from| (from, last.u)));
        }
        stretches
    }
}

impl Sweep {
    /// Positions where a branch becomes neutral, with the event, of one branch or of all.
    pub fn neutral(&self, branch: Option<usize>) -> impl Iterator<Item = &Event> + Clone {
        neutral(&self.events, branch)
    }

    /// Whether a position lies where modes move too fast to be followed.
    pub fn is_unresolved(&self, u: f64) -> bool {
        let i = self.unresolved.partition_point(|(_, to)| *to < u);
        self.unresolved.get(i).is_some_and(|(from, _)| *from <= u)
    }

    /// How many points are certified, not certified, and without an answer.
    pub fn tally(&self) -> (usize, usize, usize) {
        let mut tally = (0, 0, 0);
        for point in &self.points {
            match point.state {
                State::Certified => tally.0 += 1,
                State::Doubtful(_) => tally.1 += 1,
                State::Failed(_) => tally.2 += 1,
            }
        }
        tally
    }
}

/// Events at which a growth rate changes its sign, of one branch or of all.
pub(super) fn neutral(
    events: &[Event],
    branch: Option<usize>,
) -> impl Iterator<Item = &Event> + Clone {
    let sign = |k: Kind| matches!(k, Kind::BecomesUnstable | Kind::BecomesStable);
    let of = move |e: &&Event| branch.is_none_or(|b| e.branches.contains(&b));
    events.iter().filter(move |e| sign(e.kind)).filter(of)
}
