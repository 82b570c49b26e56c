//! A sweep as figures: frequency and growth rate over the parameter, and the root locus.

use std::f64::consts::TAU;

use super::SweepReport;
use super::words::joined;
use crate::draw::{
    Axis, DrawError, LineFigure, Locus, Mark, Panel, Scale, Series, Shade, Spot, Trail, lines,
    locus,
};
use crate::report::figure::{engineers_unit, label};
use crate::report::map::percent_of;
use crate::report::{CAUTION, counted, rate, window_text};
use crate::studies::path::{Parameter, Spacing};
use crate::studies::sweep::{Branch, Kind, Place, State, Sweep};
use crate::units::write_decimals;

/// Positions between two neighbours of a trail, for smooth curves.
const FINE: u32 = 3;

/// Most branches with a number, a look and a legend entry of their own; where there are more, those of largest
/// growth rate.
const MOST_NAMED: usize = 14;

/// Shortest branch that has a look of its own where there are many, as a part of the path.
const LEAST_NAMED: f64 = 0.01;

/// What a figure shows of the branches.
struct Cast {
    /// Branches with a name of their own, by number; each with its look's.
    named: Vec<usize>,
    /// Stretches of the others.
    crowd: Vec<Vec<Place>>,
    /// Legend text of those.
    crowd_name: String,
    /// Where modes could not be followed, the fastest mode known at each position.
    tops: Vec<Place>,
}

/// The fastest mode on no branch at each position that has some.
fn tops(sweep: &Sweep) -> Vec<Place> {
    let mut all: Vec<Place> = sweep.unfollowed.clone();
    all.sort_by(|a, b| a.u.total_cmp(&b.u).then(b.s.re.total_cmp(&a.s.re)));
    all.dedup_by(|b, a| b.u == a.u);
    all
}

impl Cast {
    fn of(sweep: &Sweep) -> Cast {
        let mut named: Vec<usize> = (0..sweep.branches.len()).collect();
        let growth = |i: &usize| {
            let branch = sweep.branches.get(*i);
            branch
                .and_then(Branch::greatest)
                .map_or(f64::MIN, |p| p.s.re)
        };
        let extent = |i: &usize| {
            let trace = sweep.branches.get(*i).map(|b| b.trace.as_slice());
            match trace {
                Some([first, .., last]) => (last.u - first.u).abs(),
                _ => 0.0,
            }
        };
        let mut others = Vec::new();
        if named.len() > MOST_NAMED {
            named.sort_by(|a, b| growth(b).total_cmp(&growth(a)));
            // What is too short to be seen is not named, however fast.
            let (long, short): (Vec<usize>, Vec<usize>) =
                named.into_iter().partition(|i| extent(i) >= LEAST_NAMED);
            named = long;
            others = named.split_off(named.len().min(MOST_NAMED));
            others.extend(short);
            named.sort_unstable();
        }
        let mut names = Vec::new();
        if !others.is_empty() {
            names.push(format!(
                "{} of less growth or extent",
                counted(others.len(), "other mode")
            ));
        }
        if !sweep.growing_outside.is_empty() {
            names.push("growth outside the window".to_owned());
        }
        let crowd_name = names.join("; ");
        let branch = |i: &usize| sweep.branches.get(*i);
        let crowd = others.iter().filter_map(branch);
        let crowd = crowd.chain(&sweep.growing_outside);
        let crowd = crowd.flat_map(smooth).collect();
        Cast {
            named,
            crowd,
            crowd_name,
            tops: tops(sweep),
        }
    }

    /// The look of a branch, where it has one.
    fn look(&self, branch: usize) -> Option<usize> {
        self.named.iter().position(|b| *b == branch)
    }

    fn crowd(&self, of: impl Fn(&Place) -> (f64, f64)) -> Vec<Vec<(f64, f64)>> {
        let places = |run: &Vec<Place>| run.iter().map(&of).collect();
        self.crowd.iter().map(places).collect()
    }
}

impl SweepReport<'_> {
    /// The axis of the parameter and the size of its unit in SI.
    fn parameter_axis(&self) -> (Axis, f64) {
        let path = &self.sweep.path;
        let (name, dimension) = self.parameter();
        let scale = match path.spacing {
            Spacing::Linear => Scale::Linear,
            Spacing::Geometric => Scale::Logarithmic,
        };
        if path.parameter == Parameter::Factor {
            let names: Vec<String> = self.knobs().map(|(name, ..)| label(name)).collect();
            let few: Vec<String> = names.iter().map(|n| lower(n)).collect();
            let label = match format!("Factor on {}", joined(&few)) {
                // More would not fit below the axis.
                label if label.len() <= 80 => label,
                _ => format!("Factor on {}", counted(names.len(), "number")),
            };
            let unit = String::new();
            return (Axis { label, unit, scale }, 1.0);
        }
        let largest = path.values.from.abs().max(path.values.to.abs());
        let (unit, size) = engineers_unit(dimension, largest);
        let label = label(name);
        (Axis { label, unit, scale }, size)
    }

    fn subtitle(&self) -> String {
        let (complete, not_certified, failed) = self.sweep.tally();
        let certified = match (not_certified, failed) {
            (0, 0) => "the list of each proved complete".to_owned(),
            (n, 0) => format!("the lists of {n} not certified"),
            (0, f) => format!("{f} without an answer"),
            (n, f) => format!("the lists of {n} not certified, {f} without an answer"),
        };
        let total = complete + not_certified + failed;
        let followed = match self.sweep.unresolved.is_empty() {
            true => "modes followed from one to the next",
            false => "modes followed from one to the next where lines are drawn",
        };
        format!(
            "{}; {} reported, {certified}; {followed}",
            self.heading.title,
            counted(total, "point")
        )
    }

    /// Where modes are not followed: `from 20 ms on`.
    pub(super) fn unfollowed(&self) -> Option<String> {
        let all = &self.sweep.unresolved;
        let length: f64 = all.iter().map(|(a, b)| b - a).sum();
        let (first, last) = (all.first()?, all.last()?);
        let hull = self.stretch((first.0, last.1));
        Some(if all.len() == 1 {
            hull
        } else {
            format!(
                "over {} of the way {hull}",
                percent_of(length / (last.1 - first.0))
            )
        })
    }

    fn footnote(&self) -> String {
        format!(
            "Modes in {}. {} {CAUTION}",
            window_text(&self.sweep.window),
            self.growth_outside("is shown as well")
        )
    }

    /// The legend text of a branch.
    fn branch_name(index: usize, branch: &Branch) -> String {
        let frequencies = || branch.trace.iter().map(|p| p.s.im / TAU);
        let low = frequencies().fold(f64::INFINITY, f64::min);
        let high = frequencies().fold(0.0, f64::max);
        let number = index + 1;
        let hz = |x: f64| write_decimals(x, 0);
        if high.round() > low.round() {
            format!("{number}: {} to {} Hz", hz(low), hz(high))
        } else {
            format!("{number}: {} Hz", hz(low))
        }
    }

    /// Marks of events, each placed by `at` from position and mode.
    fn spots(
        &self,
        cast: &Cast,
        at: impl Fn(f64, num_complex::Complex64) -> (f64, f64),
        told: bool,
    ) -> Vec<Spot> {
        let mut spots = Vec::new();
        for event in &self.sweep.events {
            let looks = event.branches.iter().map(|b| cast.look(*b));
            let Some(style) = looks.reduce(Option::or).filter(Option::is_some) else {
                continue;
            };
            let ends = matches!(event.kind, Kind::Found | Kind::Lost);
            if ends && self.sweep.is_unresolved(event.u) {
                continue;
            }
            let mark = match event.kind {
                Kind::BecomesUnstable | Kind::BecomesStable => Mark::Circle,
                Kind::Enters | Kind::Leaves => Mark::Triangle,
                Kind::ExceptionalPoint
                | Kind::Crossing
                | Kind::BecomesReal
                | Kind::BecomesOscillating => Mark::Diamond,
                Kind::Found | Kind::Lost => Mark::Cross,
            };
            let label = match mark {
                Mark::Circle | Mark::Diamond if told => self.told(event.u, 3),
                _ => String::new(),
            };
            let (x, y) = at(event.u, event.s);
            spots.push(Spot {
                x,
                y,
                mark,
                style,
                label,
            });
        }
        spots
    }

    fn marks() -> Vec<(Mark, String)> {
        [
            (Mark::Circle, "neutral"),
            (Mark::Triangle, "enters or leaves the window"),
            (Mark::Diamond, "modes meet"),
            (Mark::Cross, "not to be followed further"),
            (Mark::Box, "start of the sweep"),
            (Mark::Square, "end of the sweep"),
        ]
        .map(|(mark, text)| (mark, text.to_owned()))
        .to_vec()
    }

    /// Frequency and growth rate over the parameter, as SVG.
    ///
    /// # Errors
    /// Where the figure cannot be drawn.
    pub fn panels_svg(&self) -> Result<String, DrawError> {
        let sweep = self.sweep;
        let (axis, size) = self.parameter_axis();
        let scaled = |u: f64| self.value(u) / size;
        let cast = Cast::of(sweep);
        let named = || {
            cast.named
                .iter()
                .filter_map(|i| Some((*i, sweep.branches.get(*i)?)))
        };
        let places = named().flat_map(|(_, b)| &b.trace).map(|p| p.u);
        let mut at: Vec<f64> = sweep.points.iter().map(|p| p.u).chain(places).collect();
        at.sort_by(f64::total_cmp);
        at.dedup_by(|b, a| scaled(*b) <= scaled(*a));
        let uncertain = |u: f64| {
            let point = sweep.points.iter().find(|p| p.u == u);
            point.is_some_and(|p| p.state != State::Certified)
        };
        let dots = |of: &dyn Fn(&Place) -> (f64, f64)| sweep.unfollowed.iter().map(of).collect();
        let tops = |of: &dyn Fn(&Place) -> (f64, f64)| cast.tops.iter().map(of).collect();
        let over_frequency = |p: &Place| (scaled(p.u), p.s.im / TAU);
        let over_growth = |p: &Place| (scaled(p.u), p.s.re);
        let series = |of: fn(&Place) -> f64| -> Vec<Series> {
            named()
                .enumerate()
                .map(|(style, (i, branch))| Series {
                    name: Self::branch_name(i, branch),
                    style,
                    values: at
                        .iter()
                        .map(|u| branch.known_at(*u).map(|p| of(&p)))
                        .collect(),
                    tag: (i + 1).to_string(),
                })
                .collect()
        };
        let figure = LineFigure {
            title: self.finding(),
            subtitle: self.subtitle(),
            footnote: self.footnote(),
            x: axis,
            x_values: at.iter().map(|u| scaled(*u)).collect(),
            certified: at.iter().map(|u| !uncertain(*u)).collect(),
            uncertified: self.uncertain(),
            mark: self.design_at().map(|u| (scaled(u), self.design_label(u))),
            panels: vec![
                Panel {
                    y: Axis::new("Frequency", "Hz"),
                    series: series(|p| p.s.im / TAU),
                    shade: None,
                    crowd: cast.crowd(over_frequency),
                    dots: dots(&over_frequency),
                    tops: tops(&over_frequency),
                    spots: self.spots(&cast, |u, s| (scaled(u), s.im / TAU), false),
                },
                Panel {
                    y: Axis::new("Growth rate", "1/s"),
                    series: series(|p| p.s.re),
                    shade: Some(grows()),
                    crowd: cast.crowd(over_growth),
                    dots: dots(&over_growth),
                    tops: tops(&over_growth),
                    spots: self.spots(&cast, |u, s| (scaled(u), s.re), false),
                },
            ],
            marks: Self::marks(),
            crowd: cast.crowd_name.clone(),
            dots: (
                "modes at points computed, not followed between".into(),
                "the fastest of these at each".into(),
            ),
        };
        lines::render(&figure)
    }

    /// What is hatched.
    fn uncertain(&self) -> String {
        let (_, not_certified, failed) = self.sweep.tally();
        let parts = [
            (not_certified > 0, "not certified"),
            (failed > 0, "without an answer"),
        ];
        let words: Vec<&str> = parts.iter().filter(|p| p.0).map(|p| p.1).collect();
        words.join(", or ")
    }

    fn design_label(&self, u: f64) -> String {
        let value = self.told(u, 4);
        match self.design.leading() {
            Some(mode) => format!("design at {value}: {} 1/s", rate(mode.growth())),
            None => format!("design at {value}"),
        }
    }

    /// The trails of all branches in the plane of frequency and growth rate, as SVG.
    ///
    /// # Errors
    /// Where the figure cannot be drawn.
    pub fn locus_svg(&self) -> Result<String, DrawError> {
        let sweep = self.sweep;
        let (axis, size) = self.parameter_axis();
        let scaled = |u: f64| self.value(u) / size;
        let point = |p: &Place| (scaled(p.u), p.s.im / TAU, p.s.re);
        let cast = Cast::of(sweep);
        let named = || {
            cast.named
                .iter()
                .filter_map(|i| Some((*i, sweep.branches.get(*i)?)))
        };
        let trails: Vec<Trail> = named()
            .enumerate()
            .map(|(style, (i, branch))| Trail {
                name: Self::branch_name(i, branch),
                tag: (i + 1).to_string(),
                style,
                runs: smooth(branch)
                    .iter()
                    .map(|run| run.iter().map(point).collect())
                    .collect(),
            })
            .collect();
        let mut spots = self.spots(&cast, |_, s| (s.im / TAU, s.re), true);
        for (style, (_, branch)) in named().enumerate() {
            let first = branch.trace.first().filter(|p| p.u <= 0.0);
            let last = branch.trace.last().filter(|p| p.u >= 1.0);
            for (place, mark) in [(first, Mark::Box), (last, Mark::Square)] {
                if let Some((_, x, y)) = place.map(point) {
                    spots.push(Spot {
                        x,
                        y,
                        mark,
                        style: Some(style),
                        label: String::new(),
                    });
                }
            }
        }
        let mut marks = Self::marks();
        if let Some(u) = self.design_at() {
            let places = named().filter_map(|(_, b)| b.known_at(u));
            for place in places {
                let (_, x, y) = point(&place);
                spots.push(Spot {
                    x,
                    y,
                    mark: Mark::Target,
                    style: None,
                    label: String::new(),
                });
            }
            marks.push((Mark::Target, format!("design at {}", self.told(u, 4))));
        }
        locus::render(&Locus {
            title: self.finding(),
            subtitle: self.subtitle(),
            footnote: self.footnote(),
            x: Axis::new("Frequency", "Hz"),
            y: Axis::new("Growth rate", "1/s"),
            parameter: (axis, scaled(0.0), scaled(1.0)),
            shade: Some(grows()),
            trails,
            crowd: (cast.crowd(|p| (p.s.im / TAU, p.s.re)), cast.crowd_name),
            dots: (
                sweep
                    .unfollowed
                    .iter()
                    .map(|p| (p.s.im / TAU, p.s.re))
                    .collect(),
                "modes at points computed, not followed between".into(),
            ),
            spots,
            marks,
        })
    }
}

fn grows() -> Shade {
    Shade {
        from: 0.0,
        upwards: true,
        label: "grows".into(),
    }
}

fn lower(text: &str) -> String {
    let mut letters = text.chars();
    let first = letters.next().into_iter().flat_map(char::to_lowercase);
    first.chain(letters).collect()
}

/// The places of a branch with more in between by cubics, parted at gaps.
fn smooth(branch: &Branch) -> Vec<Vec<Place>> {
    let mut runs: Vec<Vec<Place>> = Vec::new();
    let mut before: Option<&Place> = None;
    for place in &branch.trace {
        match (before.filter(|_| !place.gap_before), runs.last_mut()) {
            (Some(last), Some(run)) => {
                let h = place.u - last.u;
                let inner = (1..=FINE).map(|k| last.u + h * f64::from(k) / f64::from(FINE + 1));
                run.extend(inner.filter_map(|u| branch.known_at(u)));
                run.push(*place);
            }
            _ => runs.push(vec![*place]),
        }
        before = Some(place);
    }
    runs
}
