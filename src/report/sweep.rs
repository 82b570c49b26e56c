//! A sweep: as JSON and as CSV.

mod figure;
mod words;

use serde::Serialize;

use super::document::WindowFields;
use super::map::growth_outside;
use super::{Document, Heading};
use crate::modes::{self, ModeList};
use crate::network::Network;
use crate::problems::Problem;
use crate::studies::path::{Parameter, Spacing};
use crate::studies::sweep::{Edge, Event, Kind, State, Sweep};
use crate::units::{Dimension, write_rounded};

/// A sweep to report.
#[derive(Clone, Copy, Debug)]
pub struct SweepReport<'a> {
    /// Of which network.
    pub heading: Heading<'a>,
    /// The network as its file states it.
    pub network: &'a Network,
    /// The answers.
    pub sweep: &'a Sweep,
    /// The modes as the file states the network: at the design value.
    pub design: &'a ModeList,
    /// What grows outside the window at the design value.
    pub design_outside: &'a modes::Outside,
    /// What qualifies it.
    pub warnings: &'a [Problem],
}

#[derive(Clone, Debug, Serialize)]
struct KnobFields<'a> {
    name: &'a str,
    unit: &'static str,
    from: f64,
    to: f64,
}

#[derive(Clone, Debug, Serialize)]
struct ModeFields {
    branch: Option<usize>,
    frequency_hz: f64,
    growth_per_s: f64,
}

#[derive(Clone, Debug, Serialize)]
struct PointFields<'a> {
    value: f64,
    complete: bool,
    modes: Option<Vec<ModeFields>>,
    problem: Option<&'a str>,
}

#[derive(Clone, Debug, Serialize)]
struct EventFields {
    value: f64,
    kind: &'static str,
    branches: Vec<usize>,
    frequency_hz: f64,
    growth_per_s: f64,
    edge: Option<&'static str>,
}

#[derive(Clone, Debug, Serialize)]
struct BranchFields {
    branch: usize,
    from: f64,
    to: f64,
    lowest_frequency_hz: f64,
    highest_frequency_hz: f64,
    largest_growth_per_s: f64,
    value_there: f64,
    frequency_hz_there: f64,
}

#[derive(Clone, Debug, Serialize)]
struct Design {
    value: Option<f64>,
    complete: bool,
    growth_per_s: Option<f64>,
    frequency_hz: Option<f64>,
    growth_outside_window_per_s: Option<f64>,
}

#[derive(Clone, Debug, Serialize)]
struct Counts {
    total: usize,
    complete: usize,
    not_certified: usize,
    failed: usize,
    put_in_between: usize,
}

#[derive(Clone, Debug, Serialize)]
struct Body<'a> {
    finding: String,
    parameter: &'a str,
    parameter_unit: &'static str,
    spacing: &'static str,
    knobs: Vec<KnobFields<'a>>,
    points: Vec<PointFields<'a>>,
    events: Vec<EventFields>,
    branches: Vec<BranchFields>,
    unstable: Vec<(f64, f64)>,
    growth_outside_window_per_s: Vec<Option<f64>>,
    design_point: Design,
    counts: Counts,
    evaluations: usize,
    window: WindowFields,
    not_followed: Vec<(f64, f64)>,
    taken_for_unstable: Vec<(f64, f64)>,
    growth_excluded_beyond: bool,
    growth_not_excluded_because: Option<String>,
    growth_outside: String,
}

/// How an event is called in JSON.
fn kind(kind: Kind) -> &'static str {
    match kind {
        Kind::Enters => "enters",
        Kind::Leaves => "leaves",
        Kind::ExceptionalPoint => "exceptional_point",
        Kind::Crossing => "crossing",
        Kind::BecomesReal => "becomes_real",
        Kind::BecomesOscillating => "becomes_oscillating",
        Kind::BecomesUnstable => "becomes_unstable",
        Kind::BecomesStable => "becomes_stable",
        Kind::Found => "found",
        Kind::Lost => "lost",
    }
}

fn edge(edge: Edge) -> &'static str {
    match edge {
        Edge::LowestFrequency => "lowest_frequency",
        Edge::HighestFrequency => "highest_frequency",
        Edge::LowestGrowth => "lowest_growth",
        Edge::HighestGrowth => "highest_growth",
    }
}

/// Where a text or an object tells of growth outside the window; a picture stands alone.
const IN_WORDS: &str = "is told in the warnings";

impl<'a> SweepReport<'a> {
    /// What varies, and its dimension.
    pub(super) fn parameter(&self) -> (&'a str, Dimension) {
        match self.sweep.path.parameter {
            Parameter::Factor => ("factor", Dimension::Number),
            Parameter::Knob(knob) => {
                let knob = self.network.layout.knobs.get(knob.0);
                knob.map_or(("", Dimension::Number), |k| {
                    (k.name.as_str(), k.spec.dimension)
                })
            }
        }
    }

    /// Every knob that moves, its dimension, and both its ends.
    fn knobs(&self) -> impl Iterator<Item = (&'a str, Dimension, f64, f64)> {
        let layout = &self.network.layout;
        self.sweep.path.knobs.iter().filter_map(|(id, run)| {
            let knob = layout.knobs.get(id.0)?;
            Some((knob.name.as_str(), knob.spec.dimension, run.from, run.to))
        })
    }

    /// The fastest mode that grows outside the window at the design value.
    pub(super) fn design_growing_outside(&self) -> Option<&modes::Mode> {
        let fastest = self.design_outside.fastest();
        fastest.filter(|m| m.tendency() == modes::Tendency::Grows)
    }

    /// The design position on the path.
    pub(super) fn design_at(&self) -> Option<f64> {
        self.sweep.path.design(self.network)
    }

    /// Points where a mode grows outside the window, those where more is not excluded, and the least
    /// growth rate up to which these were searched.
    fn outside(&self) -> (usize, usize, Option<f64>) {
        let points = || self.sweep.points.iter().map(|p| p.outside);
        let open = || points().filter(|o| !o.excluded);
        (
            points().filter(|o| o.fastest.is_some()).count(),
            open().count(),
            open().map(|o| o.searched_to).reduce(f64::min),
        )
    }

    /// What the sweep says of growth outside its window, in a sentence or two.
    fn growth_outside(&self, seen: &str) -> String {
        let said = growth_outside(&self.sweep.window, self.outside(), seen);
        match self.sweep.grows_through_an_edge() {
            0 => said,
            n => format!(
                "{said} Between points it is NOT EXCLUDED: growing modes pass an edge of the window {}; unstable \
                 stretches count them outside as well.",
                times(n)
            ),
        }
    }

    /// The parameter at a position.
    fn value(&self, u: f64) -> f64 {
        self.sweep.path.value(u)
    }

    /// A value of the parameter for a sentence.
    pub(super) fn told(&self, u: f64, digits: usize) -> String {
        write_rounded(self.value(u), self.parameter().1, digits)
    }

    /// As JSON.
    ///
    /// # Errors
    /// Where it has no form in JSON.
    pub fn json(&self) -> std::io::Result<String> {
        let sweep = self.sweep;
        let (parameter, dimension) = self.parameter();
        let (complete, not_certified, failed) = sweep.tally();
        let leading = self.design.leading();
        let (outside, open, _) = self.outside();
        let excluded = outside == 0 && open == 0 && sweep.grows_through_an_edge() == 0;
        let told = || self.growth_outside(IN_WORDS);
        let stretches = |all: &[(f64, f64)]| {
            let values = all.iter().map(|(a, b)| (self.value(*a), self.value(*b)));
            values.collect()
        };
        let body = Body {
            finding: self.finding(),
            parameter,
            parameter_unit: dimension.si_unit(),
            spacing: match sweep.path.spacing {
                Spacing::Linear => "linear",
                Spacing::Geometric => "logarithmic",
            },
            knobs: self
                .knobs()
                .map(|(name, dimension, from, to)| KnobFields {
                    name,
                    unit: dimension.si_unit(),
                    from,
                    to,
                })
                .collect(),
            points: self.points(),
            events: self.events(),
            branches: self.branches(),
            unstable: stretches(&sweep.unstable),
            not_followed: stretches(&sweep.unresolved),
            taken_for_unstable: stretches(&sweep.taken_for_unstable),
            growth_outside_window_per_s: sweep
                .points
                .iter()
                .map(|p| p.outside.fastest.map(|m| m.growth()))
                .collect(),
            design_point: Design {
                value: self.design_at().map(|u| self.value(u)),
                complete: self.design.complete(),
                growth_per_s: leading.map(|m| m.growth()),
                frequency_hz: leading.map(|m| m.frequency()),
                growth_outside_window_per_s: self.design_growing_outside().map(|m| m.growth()),
            },
            counts: Counts {
                total: sweep.points.len(),
                complete,
                not_certified,
                failed,
                put_in_between: sweep.between,
            },
            evaluations: sweep.effort.evaluations,
            window: (&sweep.window).into(),
            growth_excluded_beyond: excluded,
            growth_not_excluded_because: (!excluded).then(&told),
            growth_outside: told(),
        };
        Document::new("stillflame/sweep", &self.heading, body, self.warnings).to_json()
    }

    fn points(&self) -> Vec<PointFields<'a>> {
        let point = |p: &'a crate::studies::sweep::Point| PointFields {
            value: self.value(p.u),
            complete: p.state == State::Certified,
            modes: match p.state {
                State::Failed(_) => None,
                State::Certified | State::Doubtful(_) => {
                    let fields = p.modes.iter().map(|(branch, mode)| ModeFields {
                        branch: branch.map(|b| b + 1),
                        frequency_hz: mode.frequency(),
                        growth_per_s: mode.growth(),
                    });
                    Some(fields.collect())
                }
            },
            problem: problem(&p.state),
        };
        self.sweep.points.iter().map(point).collect()
    }

    fn events(&self) -> Vec<EventFields> {
        let event = |e: &Event| EventFields {
            value: self.value(e.u),
            kind: kind(e.kind),
            branches: e.branches.iter().map(|b| b + 1).collect(),
            frequency_hz: e.s.im / std::f64::consts::TAU,
            growth_per_s: e.s.re,
            edge: e.edge.map(edge),
        };
        self.sweep.events.iter().map(event).collect()
    }

    fn branches(&self) -> Vec<BranchFields> {
        let all = self.sweep.branches.iter().enumerate();
        all.filter_map(|(i, branch)| {
            let (first, last) = (branch.trace.first()?, branch.trace.last()?);
            let greatest = branch.greatest()?;
            let frequencies = branch.trace.iter().map(|p| p.s.im / std::f64::consts::TAU);
            Some(BranchFields {
                branch: i + 1,
                from: self.value(first.u),
                to: self.value(last.u),
                lowest_frequency_hz: frequencies.clone().fold(f64::INFINITY, f64::min),
                highest_frequency_hz: frequencies.fold(0.0, f64::max),
                largest_growth_per_s: greatest.s.re,
                value_there: self.value(greatest.u),
                frequency_hz_there: greatest.s.im / std::f64::consts::TAU,
            })
        })
        .collect()
    }

    /// A line for each point and branch, in SI; a point without modes has one line all the same.
    ///
    /// # Errors
    /// Where a row cannot be written.
    pub fn csv(&self) -> std::io::Result<Vec<u8>> {
        let named = |name: &str, dimension: Dimension| match dimension.si_unit() {
            "" => name.to_owned(),
            unit => format!("{name} [{unit}]"),
        };
        let mut writer = csv::Writer::from_writer(Vec::new());
        let factor = self.sweep.path.parameter == Parameter::Factor;
        let mut heading: Vec<String> = Vec::new();
        heading.extend(factor.then(|| "factor".to_owned()));
        heading.extend(
            self.knobs()
                .map(|(name, dimension, ..)| named(name, dimension)),
        );
        let fields = [
            "branch",
            "frequency_hz",
            "growth_per_s",
            "error_bound_per_s",
            "complete",
            "problem",
        ];
        heading.extend(fields.map(str::to_owned));
        writer.write_record(&heading)?;
        let path = &self.sweep.path;
        for point in &self.sweep.points {
            let mut values: Vec<String> = Vec::new();
            values.extend(factor.then(|| self.value(point.u).to_string()));
            let here = path.knobs.iter().map(|(_, r)| r.at(path.spacing, point.u));
            values.extend(here.map(|x| x.to_string()));
            let end = [
                (point.state == State::Certified).to_string(),
                problem(&point.state).unwrap_or_default().to_owned(),
            ];
            let mut write = |middle: [String; 4]| {
                let row = values.iter().chain(&middle).chain(&end);
                writer.write_record(row.map(String::as_str))
            };
            if point.modes.is_empty() {
                write([const { String::new() }; 4])?;
            }
            for (branch, mode) in &point.modes {
                write([
                    branch.map_or(String::new(), |b| (b + 1).to_string()),
                    mode.frequency().to_string(),
                    mode.growth().to_string(),
                    mode.error_bound.to_string(),
                ])?;
            }
        }
        writer
            .into_inner()
            .map_err(|e| std::io::Error::other(e.to_string()))
    }
}

fn times(n: usize) -> String {
    match n {
        1 => "once".to_owned(),
        2 => "twice".to_owned(),
        n => format!("{n} times"),
    }
}

fn problem(state: &State) -> Option<&str> {
    match state {
        State::Certified => None,
        State::Doubtful(why) => Some(why),
        State::Failed(problem) => Some(&problem.what),
    }
}
