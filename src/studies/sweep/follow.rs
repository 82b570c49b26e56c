//! From one reported point to the next: ties that are clear, with certified points in between where they
//! must be.
//!
//! A step that is not clear is halved, the longest first. What a list gains or loses at a clear step has
//! gone through the window's edge: it is followed outside by Newton from its prediction, proved there, and
//! tied like any other. Halving ends at [`LEAST`], where two modes that still cannot be told apart meet;
//! then only what is clear by itself is kept. It ends as well where the work of the whole sweep is spent
//! ([`MOST_WORK`]): over a step that is not clear by then nothing is followed.

use num_complex::Complex64;
use rayon::prelude::*;

use super::sample::{Ground, Live, Node, Sample};
use super::ties::{Step, Tie, Ties, between};

/// Shortest step in `u`: below it neighbours differ by rounding alone.
pub(super) const LEAST: f64 = 1.0 / (1u64 << 40) as f64;

/// Work that points put in between may take over a whole sweep, as evaluations of the characteristic function: a few
/// seconds. A sweep over a delay of a few periods takes a tenth of it.
const MOST_WORK: usize = 5_000_000;

/// Points put between two reported ones, in turn: what few points make clear is never left for what many do not.
const ALLOWANCES: [usize; 4] = [16, 64, 256, 4096];

/// Steps halved at once, and pairs of reported points looked at together. Fixed, so that what is spent does not depend
/// on the number of threads.
const AT_ONCE: usize = 32;

/// An edge of the window.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Edge {
    /// Of frequency.
    LowestFrequency,
    /// Of frequency.
    HighestFrequency,
    /// Of growth rate.
    LowestGrowth,
    /// Of growth rate.
    HighestGrowth,
}

/// A node that crosses the window's edge within a step.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Passage {
    /// Index of the node on its side of the step.
    pub node: usize,
    /// What it is on the other side, outside the window.
    pub outside: Node,
}

/// What becomes of the nodes over one step.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Link {
    pub ties: Vec<Tie>,
    /// Through the edge, out.
    pub leaving: Vec<Passage>,
    /// Through the edge, in.
    pub entering: Vec<Passage>,
    /// Of the left end, without a continuation that could be found.
    pub lost: Vec<usize>,
    /// Of the right end, from nowhere that could be found.
    pub found: Vec<usize>,
    /// Ties that two modes share because they could not be told apart.
    pub meetings: Vec<[usize; 2]>,
}

/// Links from one usable sample to another with the samples put in between; one link more than samples.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Stretch {
    pub between: Vec<Sample>,
    pub links: Vec<Link>,
    /// Steps that would have been halved further, as positions.
    pub unresolved: Vec<(f64, f64)>,
}

/// What is known of a step.
enum Known {
    /// Every tie is beyond doubt.
    Clear(Link),
    /// It is to be halved.
    Open,
    /// It cannot be halved: it is the shortest, or there is nothing to go by in its middle.
    Stuck,
}

impl Known {
    fn of(ground: &Ground<'_>, left: &Sample, right: &Sample) -> Known {
        let attempt = Attempt::new(ground, left, right);
        match attempt.clear() {
            Some(link) => Known::Clear(link),
            None if attempt.step.last => Known::Stuck,
            None => Known::Open,
        }
    }
}

/// Two reported points with what was put in between so far.
struct Track {
    samples: Vec<Sample>,
    steps: Vec<Known>,
}

impl Track {
    fn new(ground: &Ground<'_>, left: &Sample, right: &Sample) -> Self {
        Track {
            samples: vec![left.clone(), right.clone()],
            steps: vec![Known::of(ground, left, right)],
        }
    }

    /// Steps to be halved, with their lengths; no more than the allowance still permits, the longest first.
    fn open(&self, allowance: usize) -> Vec<(f64, usize)> {
        let steps = self.samples.windows(2).zip(&self.steps).enumerate();
        let mut open: Vec<(f64, usize)> = steps
            .filter(|(_, (_, known))| matches!(known, Known::Open))
            .filter_map(|(i, (ends, _))| Some((ends.last()?.u - ends.first()?.u, i)))
            .collect();
        open.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
        open.truncate((allowance + 2).saturating_sub(self.samples.len()));
        open
    }

    /// Puts halves in their places; the steps in any order. Tells the work they took.
    fn put(&mut self, mut halves: Vec<(usize, Halves)>) -> usize {
        halves.sort_by_key(|(i, _)| std::cmp::Reverse(*i));
        let mut work = 0;
        for (i, halves) in halves {
            match halves {
                Some((middle, both)) => {
                    work += middle.effort.evaluations;
                    self.samples.insert(i + 1, middle);
                    self.steps.splice(i..=i, both);
                }
                None => {
                    if let Some(step) = self.steps.get_mut(i) {
                        *step = Known::Stuck;
                    }
                }
            }
        }
        work
    }

    fn stretch(mut self, ground: &Ground<'_>) -> Stretch {
        let mut stretch = Stretch::default();
        for (ends, known) in self.samples.windows(2).zip(self.steps) {
            let [a, b] = ends else { continue };
            stretch.links.push(match known {
                Known::Clear(link) => link,
                Known::Stuck => Attempt::new(ground, a, b).whatever_holds(),
                Known::Open => {
                    stretch.unresolved.push((a.u, b.u));
                    Link {
                        lost: (0..a.nodes.len()).collect(),
                        found: (0..b.nodes.len()).collect(),
                        ..Link::default()
                    }
                }
            });
        }
        self.samples.pop();
        self.samples.drain(..1);
        stretch.between = self.samples;
        stretch
    }
}

type Halves = Option<(Sample, [Known; 2])>;

/// Follows every node of each sample to the next.
pub(super) fn follow(ground: &Ground<'_>, pairs: &[(&Sample, &Sample)]) -> Vec<Stretch> {
    let mut tracks: Vec<Track> = pairs
        .par_iter()
        .map(|(left, right)| Track::new(ground, left, right))
        .collect();
    let mut spent = 0;
    'all: for allowance in ALLOWANCES {
        for some in tracks.chunks_mut(AT_ONCE) {
            loop {
                if spent >= MOST_WORK {
                    break 'all;
                }
                let tracks = some.iter().enumerate();
                let mut open: Vec<(f64, usize, usize)> = tracks
                    .flat_map(|(k, t)| t.open(allowance).into_iter().map(move |(h, i)| (h, k, i)))
                    .collect();
                if open.is_empty() {
                    break;
                }
                open.sort_by(|a, b| b.0.total_cmp(&a.0).then((a.1, a.2).cmp(&(b.1, b.2))));
                open.truncate(AT_ONCE);
                let halves: Vec<(usize, (usize, Halves))> = open
                    .par_iter()
                    .filter_map(|&(_, k, i)| {
                        let samples = &some.get(k)?.samples;
                        let halves = halves(ground, samples.get(i)?, samples.get(i + 1)?);
                        Some((k, (i, halves)))
                    })
                    .collect();
                let mut of: Vec<Vec<(usize, Halves)>> = some.iter().map(|_| Vec::new()).collect();
                for (k, one) in halves {
                    of[k].push(one);
                }
                for (track, halves) in some.iter_mut().zip(of) {
                    spent += track.put(halves);
                }
            }
        }
    }
    tracks.into_par_iter().map(|t| t.stretch(ground)).collect()
}

/// A step in two, where the list in its middle can be followed.
///
/// Both ends say where its modes are to be expected.
fn halves(ground: &Ground<'_>, left: &Sample, right: &Sample) -> Halves {
    let h = 0.5 * (right.u - left.u);
    let mut starts: Vec<Complex64> = left.nodes.iter().map(|n| n.predicted(h)).collect();
    for node in &right.nodes {
        let at = node.predicted(-h);
        let known = |s: &Complex64| (s - at).norm() < 0.1 * node.radius;
        if !starts.iter().any(known) {
            starts.push(at);
        }
    }
    let middle = ground.sample(0.5 * (left.u + right.u), false, &starts);
    middle.usable().then(|| {
        let both = [
            Known::of(ground, left, &middle),
            Known::of(ground, &middle, right),
        ];
        (middle, both)
    })
}

struct Attempt<'a> {
    ground: &'a Ground<'a>,
    left: &'a Sample,
    right: &'a Sample,
    step: Step<'a>,
    ties: Ties,
}

impl<'a> Attempt<'a> {
    fn new(ground: &'a Ground<'a>, left: &'a Sample, right: &'a Sample) -> Self {
        let h = right.u - left.u;
        let step = Step {
            left: &left.nodes,
            right: &right.nodes,
            h,
            merge: ground.merge,
            symmetric: left.symmetric && right.symmetric,
            last: h <= LEAST,
        };
        let ties = step.ties();
        Attempt {
            ground,
            left,
            right,
            step,
            ties,
        }
    }

    /// The link where nothing about it is in doubt.
    fn clear(&self) -> Option<Link> {
        if !self.ties.clear {
            return None;
        }
        let (leaving, entering) = self.passages();
        if leaving.len() < self.ties.gone.len() || entering.len() < self.ties.new.len() {
            return None;
        }
        let mut tied = self.tied();
        tied.extend(leaving.iter().map(|p| (self.left.nodes[p.node], p.outside)));
        tied.extend(
            entering
                .iter()
                .map(|p| (p.outside, self.right.nodes[p.node])),
        );
        self.step.apart(&tied).then(|| Link {
            ties: self.ties.ties.clone(),
            leaving,
            entering,
            ..Link::default()
        })
    }

    /// The ties of one node with one, which alone have a path.
    fn tied(&self) -> Vec<(Node, Node)> {
        self.single().map(|(_, a, b)| (a, b)).collect()
    }

    fn single(&self) -> impl Iterator<Item = (usize, Node, Node)> {
        let all = self.ties.ties.iter().enumerate();
        all.filter_map(
            |(i, tie)| match (tie.left.as_slice(), tie.right.as_slice()) {
                ([a], [b]) => {
                    let (a, b) = (self.left.nodes[*a], self.right.nodes[*b]);
                    (a.on_axis == b.on_axis && a.two == b.two).then_some((i, a, b))
                }
                _ => None,
            },
        )
    }

    /// What is clear by itself, and the rest as lost and found; at the shortest step two modes on one
    /// path have met.
    fn whatever_holds(&self) -> Link {
        let (leaving, entering) = self.passages();
        let mut link = Link {
            ties: self.ties.ties.clone(),
            ..Link::default()
        };
        let single: Vec<(usize, Node, Node)> = self.single().collect();
        if self.step.last {
            let tied: Vec<(Node, Node)> = single.iter().map(|(_, a, b)| (*a, *b)).collect();
            if let Some((i, j)) = self.step.crowded(&tied).filter(|(i, j)| i != j) {
                link.meetings.push([single[i].0, single[j].0]);
            }
        } else {
            let mut doubtful = Vec::new();
            for (k, (i, a, b)) in single.iter().enumerate() {
                let others = single.iter().enumerate().filter(|(l, _)| *l != k);
                let mut pairs = others.map(|(_, (_, c, d))| [(*a, *b), (*c, *d)]);
                if !pairs.all(|pair| self.step.apart(&pair)) {
                    doubtful.push(*i);
                }
            }
            let dropped: Vec<Tie> = doubtful.iter().map(|i| link.ties[*i].clone()).collect();
            link.ties.retain(|tie| !dropped.contains(tie));
            for tie in dropped {
                link.lost.extend(tie.left);
                link.found.extend(tie.right);
            }
        }
        let without = |nodes: &[usize], passages: &[Passage]| -> Vec<usize> {
            let passes = |n: &usize| passages.iter().any(|p| p.node == *n);
            nodes.iter().copied().filter(|n| !passes(n)).collect()
        };
        link.lost.extend(without(&self.ties.gone, &leaving));
        link.found.extend(without(&self.ties.new, &entering));
        link.leaving = leaving;
        link.entering = entering;
        link
    }

    /// Those of the nodes gone or new that passed the window's edge.
    fn passages(&self) -> (Vec<Passage>, Vec<Passage>) {
        let h = self.step.h;
        let seek = |nodes: &[usize], of: &Sample, at: f64, h: f64| -> Vec<Passage> {
            if nodes.is_empty() {
                return Vec::new();
            }
            let Ok(live) = self.ground.live(at) else {
                return Vec::new();
            };
            let through = |&node: &usize| {
                self.outside(&live, of.nodes.get(node)?, h)
                    .map(|outside| Passage { node, outside })
            };
            nodes.iter().filter_map(through).collect()
        };
        (
            seek(&self.ties.gone, self.left, self.right.u, h),
            seek(&self.ties.new, self.right, self.left.u, -h),
        )
    }

    /// What a node is a step `h` away, where that is outside the window and proved.
    fn outside(&self, live: &Live, node: &Node, h: f64) -> Option<Node> {
        if node.two {
            return None;
        }
        let expected = node.predicted(h);
        let zero = live.mode_near(expected, 4.0 * (node.velocity * h).norm() + node.radius)?;
        let there = live.node(&zero);
        let rectangle = self.ground.window.rectangle();
        let mut seen = there.at;
        if there.on_axis {
            // The axis is no edge.
            seen.im = seen.im.max(there.error);
        } else if self.step.symmetric && seen.im < 0.0 && rectangle.omega.0 <= 0.0 {
            // The conjugate of what a list may hold; the axis is crossed by meeting on it.
            return None;
        }
        let out = rectangle.holds(seen, there.error) == Some(false);
        let alike = there.on_axis == node.on_axis;
        let within = (expected - there.at).norm() < there.radius
            && (there.predicted(-h) - node.at).norm() < node.radius;
        (out && alike && (within || self.step.last)).then_some(there)
    }
}

/// How far beyond an edge a place lies; negative inside.
pub(super) fn beyond_edge(ground: &Ground<'_>, edge: Edge, s: Complex64) -> f64 {
    let r = ground.window.rectangle();
    match edge {
        Edge::LowestFrequency => r.omega.0 - s.im,
        Edge::HighestFrequency => s.im - r.omega.1,
        Edge::LowestGrowth => r.growth.0 - s.re,
        Edge::HighestGrowth => s.re - r.growth.1,
    }
}

/// The edge crossed first on the way from a node inside to what it is outside, a step `h` later.
pub(super) fn edge_between(ground: &Ground<'_>, inside: &Node, outside: &Node, h: f64) -> Edge {
    const PLACES: u32 = 64;
    let edges = [
        Edge::HighestGrowth,
        Edge::LowestGrowth,
        Edge::HighestFrequency,
        Edge::LowestFrequency,
    ];
    let passed = |e: &Edge| beyond_edge(ground, *e, outside.at) > 0.0;
    let path = |t| {
        between(
            inside.at,
            inside.velocity,
            outside.at,
            outside.velocity,
            h,
            t,
        )
    };
    let first = (1..=PLACES)
        .map(|k| path(f64::from(k) / f64::from(PLACES)))
        .find_map(|s| {
            let mut passed = edges.into_iter().filter(passed);
            passed.find(|e| beyond_edge(ground, *e, s) > 0.0)
        });
    first.unwrap_or_else(|| {
        let far = |e: &Edge| beyond_edge(ground, *e, outside.at);
        let by_distance = |a: &Edge, b: &Edge| far(a).total_cmp(&far(b));
        edges
            .into_iter()
            .max_by(by_distance)
            .unwrap_or(Edge::LowestGrowth)
    })
}
