//! The certified list at one position, with the velocity of every mode along the path.
//!
//! With `D(s; u) = 0` along the path, `ds/du = -D_u/D_s`; `D_u` comes from the network in numbers that
//! carry their derivative along the path, mean flow included. Two modes closer than the merging distance
//! are one *node*: their middle `m`, where `D_s = 0`, moves with `dm/du = -D_su/D_ss`, finite
//! where the velocities of both are not. Near the real axis the second of the two may be a mode's own
//! conjugate.

use num_complex::Complex64;

use super::Outside;
use crate::acoustics::{self, Acoustics};
use crate::meanflow::{self, MeanFlow};
use crate::modes::{self, Mode, Solved, Window};
use crate::network::{Network, areas, values};
use crate::numerics::analytic::Analytic;
use crate::numerics::count::Effort;
use crate::numerics::dual::Dual;
use crate::numerics::isolate::{self, Zero};
use crate::numerics::zeros::{self, Doubt, Scan};
use crate::problems::{Problem, Problems};
use crate::studies::path::Path;

/// One mode, or two that cannot be told apart.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Node {
    /// The mode, or the middle of both.
    pub at: Complex64,
    /// `ds/du`.
    pub velocity: Complex64,
    /// The exact mode lies no farther from `at`; both do.
    pub error: f64,
    /// No other mode lies nearer.
    pub radius: f64,
    /// On the real axis: a mode that does not oscillate, or one merged with its own conjugate.
    pub on_axis: bool,
    /// Whether it stands for two.
    pub two: bool,
    /// The modes of the list it stands for; the same twice where it is one.
    pub modes: [Mode; 2],
    /// How many modes of the list these are: with its own conjugate a mode is one.
    pub listed: usize,
}

impl Node {
    /// Where it will be, or has been, a step `h` away.
    pub fn predicted(&self, h: f64) -> Complex64 {
        self.at + self.velocity * h
    }
}

/// How far the list of a sample can be trusted.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Verdict {
    /// Proved complete.
    Complete,
    /// A mode sits on the window's edge, or is not converged, but none is missing.
    Followable(Box<str>),
    /// Modes may be missing.
    Doubtful(Box<str>),
    /// There is no mean flow, or no acoustics about it.
    Failed(Box<Problem>),
}

/// What is known at one position.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Sample {
    pub u: f64,
    pub verdict: Verdict,
    pub nodes: Vec<Node>,
    /// Whether modes come in conjugate pairs.
    pub symmetric: bool,
    pub effort: Effort,
    /// What grows outside the window, where asked for.
    pub outside: Outside,
}

impl Sample {
    /// A position whose modes are not known.
    pub fn unknown(u: f64, verdict: Verdict) -> Self {
        Sample {
            u,
            verdict,
            nodes: Vec::new(),
            symmetric: false,
            effort: Effort::default(),
            outside: Outside::default(),
        }
    }

    /// Whether modes can be followed from here.
    pub fn usable(&self) -> bool {
        matches!(self.verdict, Verdict::Complete | Verdict::Followable(_))
    }
}

/// The characteristic function at one position, and with its derivative along the path.
pub(super) struct Live {
    solved: Solved,
    along: Acoustics<Dual>,
}

impl Live {
    fn function(&self) -> &impl Analytic {
        &self.solved.acoustics.characteristic.tape
    }

    /// `ds/du` of a simple mode.
    pub fn velocity(&self, s: Complex64) -> Complex64 {
        let [(_, [derivative]), (slope, _)] = self.along.taylor(s);
        finite(-derivative / slope)
    }

    /// `dm/du` of the middle of two.
    fn velocity_of_middle(&self, s: Complex64) -> Complex64 {
        let [_, (_, [derivative]), (second, _)] = self.along.taylor(s);
        finite(-derivative / (second * 2.0))
    }

    /// The mode that Newton reaches from a guess within `reach`, proved to be one.
    pub fn mode_near(&self, guess: Complex64, reach: f64) -> Option<Zero> {
        let f = self.function();
        let at = isolate::newton(f, guess, reach, &mut 0)?;
        isolate::simple(f, at, isolate::scale(f, at))
    }

    /// A proved zero as a node.
    pub fn node(&self, zero: &Zero) -> Node {
        let velocity = if zero.multiplicity == 1 {
            self.velocity(zero.at)
        } else {
            self.velocity_of_middle(zero.at)
        };
        let mode = mode(zero);
        let on_axis = self.symmetric() && (zero.real || zero.at.im <= zero.error);
        let two = zero.multiplicity > 1;
        Node {
            at: along_axis(zero.at, on_axis),
            velocity: along_axis(velocity, on_axis),
            error: zero.error,
            radius: zero.radius,
            on_axis,
            two,
            modes: [mode; 2],
            listed: if two && !on_axis { 2 } else { 1 },
        }
    }

    fn symmetric(&self) -> bool {
        self.function().is_symmetric()
    }
}

fn mode(zero: &Zero) -> Mode {
    Mode {
        s: zero.at,
        error_bound: zero.error,
        multiplicity: zero.multiplicity,
    }
}

/// A mode on the axis, and its velocity, are real.
fn along_axis(x: Complex64, on_axis: bool) -> Complex64 {
    if on_axis {
        Complex64::new(x.re, 0.0)
    } else {
        x
    }
}

fn finite(x: Complex64) -> Complex64 {
    if x.is_finite() {
        x
    } else {
        Complex64::new(0.0, 0.0)
    }
}

/// What every position of a path shares.
pub(super) struct Ground<'a> {
    pub network: &'a Network,
    pub path: &'a Path,
    /// The mean flow, where nothing on the path moves it.
    pub held: Option<&'a MeanFlow<f64>>,
    pub window: Window,
    /// Modes closer than this (1/s) are one node.
    pub merge: f64,
}

impl Ground<'_> {
    /// The characteristic function at a position.
    pub fn live(&self, u: f64) -> Result<Live, Box<Problem>> {
        self.solve(u).map_err(|Problems(problems)| {
            let unsaid = || Problem::error("network", "this point has no solution");
            Box::new(problems.into_iter().next().unwrap_or_else(unsaid))
        })
    }

    fn solve(&self, u: f64) -> Result<Live, Problems> {
        let network = self.path.at(self.network, u);
        let mut wrong = values::check_values(&network);
        if wrong.is_empty() {
            wrong = areas::check_areas(&network);
        }
        if !wrong.is_empty() {
            return Err(Problems(wrong));
        }
        let mean = match self.held {
            Some(mean) => mean.clone(),
            None => meanflow::solve(&network)?,
        };
        let acoustics = acoustics::assemble(&network, &mean)?;
        let dual = self.path.along(self.network, u);
        let along = acoustics::assemble(&dual, &meanflow::solve(&dual)?)?;
        Ok(Live {
            solved: Solved { mean, acoustics },
            along,
        })
    }

    /// The certified list at a position, with places near which modes are to be expected; a reported point is also
    /// searched for growth beyond the window.
    pub fn sample(&self, u: f64, reported: bool, starts: &[Complex64]) -> Sample {
        let live = match self.live(u) {
            Ok(live) => live,
            Err(problem) => {
                return Sample::unknown(u, Verdict::Failed(problem));
            }
        };
        let window = self.window.rectangle();
        let found = zeros::search_from(live.function(), &window, Scan::UntilCounted, starts);
        let none_missing = |d: &Doubt| matches!(d, Doubt::OnEdge { .. } | Doubt::Coarse { .. });
        let verdict = match found.doubts.first() {
            None => Verdict::Complete,
            Some(doubt) => {
                let why = modes::doubt_in_words(doubt).0.into();
                if found.doubts.iter().all(none_missing) {
                    Verdict::Followable(why)
                } else {
                    Verdict::Doubtful(why)
                }
            }
        };
        let outside = if reported {
            Outside::of(&modes::outside(&live.solved, self.window))
        } else {
            Outside::default()
        };
        Sample {
            u,
            verdict,
            nodes: self.nodes(&live, &found.zeros),
            symmetric: live.symmetric(),
            effort: found.effort,
            outside,
        }
    }

    /// The list as nodes: zeros closer than the merging distance become one.
    fn nodes(&self, live: &Live, zeros: &[Zero]) -> Vec<Node> {
        let mut singles: Vec<Node> = zeros.iter().map(|z| live.node(z)).collect();
        let mut nodes = Vec::with_capacity(singles.len());
        while let Some(a) = singles.pop() {
            let near = |b: &Node| !a.two && !b.two && (a.at - b.at).norm() <= self.merge;
            if let Some(b) = singles.iter().position(near).map(|i| singles.remove(i)) {
                nodes.push(self.merged(live, &a, &b));
            } else if live.symmetric() && !a.on_axis && 2.0 * a.at.im <= self.merge {
                nodes.push(self.merged(live, &a, &a));
            } else {
                nodes.push(a);
            }
        }
        let at: Vec<Complex64> = nodes.iter().map(|n| n.at).collect();
        for (i, node) in nodes.iter_mut().enumerate().filter(|(_, n)| n.two) {
            let others = at.iter().enumerate().filter(|(j, _)| *j != i);
            let nearest = others.map(|(_, z)| (z - node.at).norm());
            node.radius = nearest.fold(1e4 * self.merge, |r, d| r.min(0.5 * d));
        }
        nodes.sort_by(|a, b| {
            let by_growth = a.at.re.total_cmp(&b.at.re);
            a.at.im.total_cmp(&b.at.im).then(by_growth)
        });
        nodes
    }

    /// Two nodes as one; the same twice is a mode with its own conjugate.
    fn merged(&self, live: &Live, a: &Node, b: &Node) -> Node {
        let own_mirror = a.at == b.at;
        let mut at = (a.at + b.at) / 2.0;
        let on_axis = own_mirror || a.on_axis || b.on_axis;
        if on_axis {
            at.im = 0.0;
        }
        Node {
            at,
            velocity: along_axis(live.velocity_of_middle(at), on_axis),
            error: (a.at - at).norm() + a.error.max(b.error),
            radius: self.merge,
            on_axis,
            two: true,
            modes: [a.modes[0], b.modes[0]],
            listed: if own_mirror { 1 } else { 2 },
        }
    }
}
