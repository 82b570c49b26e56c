//! From links to branches: every mode of every point gets the number of its branch, and what happens to
//! branches is told as events.

use num_complex::Complex64;

use super::crossing::{self, change_of_sign};
use super::follow::{Link, Passage, Stretch, beyond_edge, edge_between};
use super::sample::{Ground, Node, Sample};
use super::ties::Tie;
use super::{Branch, Event, Kind, Place};

/// Two branches on one node, or one with its own conjugate.
struct Merged {
    branches: Vec<usize>,
    /// The first and the last position of the node.
    over: (f64, f64),
    at: Complex64,
    /// Velocities before, where both were apart.
    before: Option<[Complex64; 2]>,
}

/// Branches in the making.
pub(super) struct Weaver<'a> {
    ground: &'a Ground<'a>,
    pub branches: Vec<Branch>,
    pub events: Vec<Event>,
    merged: Vec<Merged>,
    /// The branches on each node of the sample reached.
    on: Vec<Vec<usize>>,
}

/// Share of the difference of two velocities by which they may change through a meeting and still be
/// those of two branches that cross.
const STEADY: f64 = 0.3;

/// Which of two that leave a meeting is which that came, by least change of velocity (`true` where they
/// are swapped), and whether velocities are so steady that this is no convention.
fn partners(before: [Complex64; 2], after: [Complex64; 2]) -> (bool, bool) {
    let change = |x: Complex64, y: Complex64| (x - y).norm();
    let straight = change(before[0], after[0]) + change(before[1], after[1]);
    let swapped = change(before[0], after[1]) + change(before[1], after[0]);
    let apart = change(before[0], before[1]);
    let least = straight.min(swapped);
    (swapped < straight, least <= STEADY * apart)
}

impl<'a> Weaver<'a> {
    /// Begins at the first usable sample.
    pub fn new(ground: &'a Ground<'a>, first: &Sample, point: usize) -> Self {
        let mut weaver = Weaver {
            ground,
            branches: Vec::new(),
            events: Vec::new(),
            merged: Vec::new(),
            on: vec![Vec::new(); first.nodes.len()],
        };
        for (i, node) in first.nodes.iter().enumerate() {
            let born: Vec<usize> = (0..node.listed).map(|_| weaver.begin()).collect();
            if node.two {
                weaver.merge(born.clone(), first.u, node, None);
            }
            weaver.stand(&born, first.u, node, Some(point));
            weaver.on[i] = born;
        }
        weaver
    }

    /// The branches on each node of the sample reached.
    pub fn on(&self) -> &[Vec<usize>] {
        &self.on
    }

    /// Follows a stretch to the sample of a reported point.
    pub fn advance(&mut self, left: &Sample, stretch: &Stretch, right: &Sample, point: usize) {
        let mut from = left;
        let ends = stretch.between.iter().map(|s| (s, None));
        let ends = ends.chain([(right, Some(point))]);
        for (link, (to, point)) in stretch.links.iter().zip(ends) {
            self.link(from, link, to, point);
            from = to;
        }
    }

    /// Ends what is merged still.
    pub fn finish(&mut self) {
        while let Some(merged) = self.merged.pop() {
            if merged.branches.len() == 2 {
                self.meet(&merged, Kind::ExceptionalPoint);
            }
        }
    }

    fn begin(&mut self) -> usize {
        self.branches.push(Branch::default());
        self.branches.len() - 1
    }

    /// Puts branches on a node.
    fn stand(&mut self, branches: &[usize], u: f64, node: &Node, point: Option<usize>) {
        for &b in branches {
            self.put(b, u, node, point);
        }
    }

    fn put(&mut self, branch: usize, u: f64, node: &Node, point: Option<usize>) {
        if let Some(branch) = self.branches.get_mut(branch) {
            branch.trace.push(Place {
                u,
                s: node.at,
                velocity: node.velocity,
                error: node.error,
                point,
                gap_before: false,
            });
        }
    }

    fn tell(&mut self, kind: Kind, u: f64, s: Complex64, branches: &[usize]) {
        self.events.push(Event {
            u,
            kind,
            branches: branches.to_vec(),
            s,
            edge: None,
        });
    }

    fn merge(&mut self, on: Vec<usize>, u: f64, node: &Node, before: Option<[Complex64; 2]>) {
        self.merged.push(Merged {
            branches: on,
            over: (u, u),
            at: node.at,
            before,
        });
    }

    fn meet(&mut self, merged: &Merged, kind: Kind) {
        let u = 0.5 * (merged.over.0 + merged.over.1);
        self.tell(kind, u, merged.at, &merged.branches);
    }

    /// Takes the record of a merged node off the list.
    fn parted(&mut self, on: &[usize]) -> Option<Merged> {
        let at = self.merged.iter().position(|m| m.branches == on)?;
        Some(self.merged.swap_remove(at))
    }

    fn link(&mut self, left: &Sample, link: &Link, right: &Sample, point: Option<usize>) {
        let mut on = vec![Vec::new(); right.nodes.len()];
        for tie in &link.ties {
            self.tie(left, tie, right, &mut on);
        }
        for [i, j] in &link.meetings {
            self.unresolved(left, [&link.ties[*i], &link.ties[*j]], right);
        }
        for &node in &link.lost {
            let branches = std::mem::take(&mut self.on[node]);
            self.tell(Kind::Lost, left.u, left.nodes[node].at, &branches);
        }
        for passage in &link.leaving {
            self.leave(left, passage, right);
        }
        for passage in &link.entering {
            on[passage.node] = self.enter(left, passage, right);
        }
        for &node in &link.found {
            let found = &right.nodes[node];
            let born: Vec<usize> = (0..found.listed).map(|_| self.begin()).collect();
            if found.two {
                self.merge(born.clone(), right.u, found, None);
            }
            self.tell(Kind::Found, right.u, found.at, &born);
            on[node] = born;
        }
        for (branches, node) in on.iter().zip(&right.nodes) {
            self.stand(branches, right.u, node, point);
        }
        self.on = on;
    }

    fn tie(&mut self, left: &Sample, tie: &Tie, right: &Sample, on: &mut [Vec<usize>]) {
        let mut came: Vec<usize> = Vec::new();
        for &i in &tie.left {
            came.append(&mut self.on[i]);
        }
        let from: Vec<&Node> = tie.left.iter().map(|i| &left.nodes[*i]).collect();
        let to: Vec<&Node> = tie.right.iter().map(|i| &right.nodes[*i]).collect();
        match (from.as_slice(), to.as_slice()) {
            ([a], [b]) if a.two == b.two => {
                if let Some(merged) = self.merged.iter_mut().find(|m| m.branches == came) {
                    merged.over.1 = right.u;
                }
                on[tie.right[0]] = came;
            }
            ([_], [b]) if b.two => {
                // With its own conjugate.
                self.merge(came.clone(), right.u, b, None);
                on[tie.right[0]] = came;
            }
            ([_], [_]) => {
                // Off the axis again.
                let merged = self.parted(&came);
                self.one_goes_on(&mut came, merged, right.u);
                on[tie.right[0]] = came;
            }
            ([a, b], [c]) => {
                let before = Some([a.velocity, b.velocity]);
                if c.two {
                    self.merge(came.clone(), right.u, c, before);
                } else {
                    let u = 0.5 * (left.u + right.u);
                    let merged = Merged {
                        branches: came.clone(),
                        over: (u, u),
                        at: (a.at + b.at) / 2.0,
                        before,
                    };
                    self.one_goes_on(&mut came, Some(merged), u);
                }
                on[tie.right[0]] = came;
            }
            ([a], [c, d]) => {
                let merged = self.parted(&came).unwrap_or_else(|| Merged {
                    branches: came.clone(),
                    over: (left.u, right.u),
                    at: if a.two { a.at } else { (c.at + d.at) / 2.0 },
                    before: None,
                });
                let [first, second] = self.two_go_on(&merged, [c.velocity, d.velocity]);
                on[tie.right[0]] = first;
                on[tie.right[1]] = second;
            }
            ([a, b], [c, d]) => {
                let merged = Merged {
                    branches: came,
                    over: (left.u, right.u),
                    at: (a.at + b.at) / 2.0,
                    before: Some([a.velocity, b.velocity]),
                };
                let [first, second] = self.two_go_on(&merged, [c.velocity, d.velocity]);
                on[tie.right[0]] = first;
                on[tie.right[1]] = second;
            }
            _ => {}
        }
    }

    /// Off a node on the axis as one that oscillates: of two real modes one ends.
    fn one_goes_on(&mut self, came: &mut Vec<usize>, merged: Option<Merged>, u: f64) {
        if let (2, Some(merged)) = (came.len(), merged) {
            came.sort_unstable();
            let over = (merged.over.0, u.min(merged.over.1.max(merged.over.0)));
            self.meet(
                &Merged {
                    branches: came.clone(),
                    over,
                    ..merged
                },
                Kind::BecomesOscillating,
            );
            came.truncate(1);
        }
    }

    /// Off a merged node as two.
    fn two_go_on(&mut self, merged: &Merged, after: [Complex64; 2]) -> [Vec<usize>; 2] {
        match merged.branches.as_slice() {
            [one] => {
                let born = self.begin();
                let both = Merged {
                    branches: vec![*one, born],
                    at: merged.at,
                    over: merged.over,
                    before: None,
                };
                self.meet(&both, Kind::BecomesReal);
                [vec![*one], vec![born]]
            }
            [one, other] => {
                let (swapped, steady) = match merged.before {
                    Some(before) => partners(before, after),
                    None => (false, false),
                };
                let kind = if steady {
                    Kind::Crossing
                } else {
                    Kind::ExceptionalPoint
                };
                self.meet(merged, kind);
                if swapped {
                    [vec![*other], vec![*one]]
                } else {
                    [vec![*one], vec![*other]]
                }
            }
            _ => [Vec::new(), Vec::new()],
        }
    }

    /// Two ties over the shortest step whose paths do not keep apart.
    fn unresolved(&mut self, left: &Sample, ties: [&Tie; 2], right: &Sample) {
        let end = |i: usize| {
            let (a, b) = (*ties[i].left.first()?, *ties[i].right.first()?);
            Some((left.nodes.get(a)?, right.nodes.get(b)?, a))
        };
        let (Some(first), Some(second)) = (end(0), end(1)) else {
            return;
        };
        let before = [first.0.velocity, second.0.velocity];
        let (_, steady) = partners(before, [first.1.velocity, second.1.velocity]);
        let kind = if steady {
            Kind::Crossing
        } else {
            Kind::ExceptionalPoint
        };
        let mut branches = Vec::new();
        for node in [first.0, second.0] {
            let last = |b: &Branch| {
                b.trace
                    .last()
                    .is_some_and(|p| p.s == node.at && p.u == left.u)
            };
            branches.extend(self.branches.iter().position(last));
        }
        let s = (first.0.at + second.0.at + first.1.at + second.1.at) / 4.0;
        self.tell(kind, 0.5 * (left.u + right.u), s, &branches);
    }

    fn leave(&mut self, left: &Sample, passage: &Passage, right: &Sample) {
        let inside = left.nodes[passage.node];
        let edge = edge_between(self.ground, &inside, &passage.outside, right.u - left.u);
        let ends = (at(left.u, &inside), at(right.u, &passage.outside));
        let place = self.on_edge(ends, edge);
        let branches = std::mem::take(&mut self.on[passage.node]);
        for b in &branches {
            if let Some(branch) = self.branches.get_mut(*b) {
                branch.trace.push(place);
            }
        }
        self.events.push(Event {
            u: place.u,
            kind: Kind::Leaves,
            branches,
            s: place.s,
            edge: Some(edge),
        });
    }

    fn enter(&mut self, left: &Sample, passage: &Passage, right: &Sample) -> Vec<usize> {
        let inside = right.nodes[passage.node];
        let edge = edge_between(self.ground, &inside, &passage.outside, left.u - right.u);
        let ends = (at(left.u, &passage.outside), at(right.u, &inside));
        let place = self.on_edge(ends, edge);
        let branch = self.begin();
        if let Some(b) = self.branches.get_mut(branch) {
            b.trace.push(place);
        }
        self.events.push(Event {
            u: place.u,
            kind: Kind::Enters,
            branches: vec![branch],
            s: place.s,
            edge: Some(edge),
        });
        vec![branch]
    }

    fn on_edge(&self, (a, b): (Place, Place), edge: super::Edge) -> Place {
        let distance = |s: Complex64| beyond_edge(self.ground, edge, s);
        if (distance(a.s) > 0.0) == (distance(b.s) > 0.0) {
            // On the edge within its error: the end inside.
            return if distance(a.s).abs() < distance(b.s).abs() {
                a
            } else {
                b
            };
        }
        change_of_sign(self.ground, (a, b), distance)
            .unwrap_or_else(|| crossing::interpolated(&a, &b, distance))
    }
}

fn at(u: f64, node: &Node) -> Place {
    Place {
        u,
        s: node.at,
        velocity: node.velocity,
        error: node.error,
        point: None,
        gap_before: false,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn branches_that_cross_are_told_from_those_that_lose_their_identity() {
        let c = Complex64::new;
        let (a, b) = (c(10.0, -400.0), c(-20.0, 300.0));
        assert_eq!(partners([a, b], [a * 1.01, b]), (false, true));
        assert_eq!(partners([a, b], [b, a]), (true, true));
        // Through a square root: velocities turn by a right angle.
        let v = c(0.0, 1e6);
        let turned = [v * c(0.0, 1.0), -v * c(0.0, 1.0)];
        assert!(!partners([v, -v], turned).1);
    }
}
