//! Areas at the stations: stated by ducts, passed on by elements without an area of their own.
//!
//! Ducts, flames and restrictions have the same area at both their stations; contractions,
//! expansions and plenums part one area from the next. Stations joined by elements of the first
//! kind form a *stretch*, and its ducts say its area: at least one, and all the same.

use super::{ElementId, Layout, Link, Network, StationId};
use crate::elements::ends::ExitEnd;
use crate::elements::{Element, Kind, Section};
use crate::numerics::dual::Real;
use crate::problems::Problem;
use crate::units::{Dimension, write_rounded};

/// Areas agree within this, relative.
pub const TOLERANCE: f64 = 1e-9;

/// Area of each station (m^2), in the order of [`Layout::links`].
pub fn station_areas<T: Real>(network: &Network<T>) -> Vec<T> {
    network
        .layout
        .station_sections
        .iter()
        .map(|s| s.area(&network.values))
        .collect()
}

/// Every place where areas do not fit: ducts that adjoin without an area change between them, an
/// area change that goes the wrong way, a throat no narrower than what leads to it.
///
/// The network's numbers may be others than those it was read with, as at a point of a sweep.
pub fn check_areas(network: &Network<f64>) -> Vec<Problem> {
    let sections: Vec<Option<Section>> = network
        .layout
        .station_sections
        .iter()
        .copied()
        .map(Some)
        .collect();
    check(network, &sections)
}

/// As [`check_areas`], where the area of some stations may be unknown: nothing is said of those.
pub(crate) fn check(network: &Network<f64>, sections: &[Option<Section>]) -> Vec<Problem> {
    let layout = &*network.layout;
    let area = |s: Option<StationId>| {
        let section = (*sections.get(s?.0)?)?;
        let area = section.area(&network.values);
        area.is_finite().then_some((section, area))
    };
    let mut problems = Vec::new();
    for stretch in stretches(&layout.elements, &layout.links) {
        adjoining(network, &stretch, &mut problems);
    }
    let mut misfits: Vec<Misfit<'_>> = Vec::new();
    for (id, element) in network.elements() {
        let (before, after) = (area(layout.inlet(id)), area(layout.outlet(id)));
        match &element.kind {
            Kind::Contraction(_) | Kind::Expansion(_) => {
                if let (Some(before), Some(after)) = (before, after) {
                    misfits.extend(misfit(element, before, after));
                }
            }
            Kind::Exit(exit) => {
                if let (
                    ExitEnd::Choked {
                        throat: Some(throat),
                    },
                    Some(duct),
                ) = (exit.end, before)
                {
                    let throat_area = throat.area(&network.values);
                    if throat_area >= duct.1 * (1.0 - TOLERANCE) {
                        let what = format!(
                            "the throat is {}, not narrower than the {} before it",
                            told(network, throat, throat_area),
                            told(network, duct.0, duct.1)
                        );
                        problems.push(
                            Problem::error(knob_name(layout, throat), what)
                                .hint("a nozzle chokes at a throat narrower than its inlet"),
                        );
                    }
                }
            }
            Kind::Feed(_)
            | Kind::Duct(_)
            | Kind::Flame(_)
            | Kind::Restriction(_)
            | Kind::Plenum(_) => {}
        }
    }
    let mut left = misfits.as_slice();
    while let [first, rest @ ..] = left {
        // Two that share the area between them are one mistake: that area.
        if let [second, rest @ ..] = rest
            && second.before.0 == first.after.0
        {
            problems.push(between_misfits(network, first, second));
            left = rest;
        } else {
            problems.push(first.problem(network));
            left = rest;
        }
    }
    problems
}

/// Which duct's section each station takes; a station of a stretch without a duct has none, which
/// is a problem. Of a stretch with a duct whose section is not `known` nothing is said.
pub(crate) fn assign(
    elements: &[Element],
    links: &[Link],
    known: impl Fn(Section) -> bool,
) -> (Vec<Option<Section>>, Vec<Problem>) {
    let mut sections = vec![None; links.len()];
    let mut problems = Vec::new();
    if !elements.iter().any(|e| matches!(e.kind, Kind::Duct(_))) {
        // One problem, not one for each stretch.
        let what = "the network has no duct, so no station has an area";
        problems.push(
            Problem::error("element", what)
                .hint("waves travel in ducts: add an [[element]] of kind = \"duct\""),
        );
        return (sections, problems);
    }
    for stretch in stretches(elements, links) {
        let stated = || {
            stretch
                .ducts
                .iter()
                .filter_map(|d| duct_section(elements, *d))
        };
        if stated().any(|s| !known(s)) {
            continue;
        }
        let section = stated().next();
        for station in &stretch.stations {
            if let Some(s) = sections.get_mut(station.0) {
                *s = section;
            }
        }
        if section.is_none() {
            problems.extend(unsized_stretch(elements, links, &stretch));
        }
    }
    (sections, problems)
}

/// Stations that share one area, and the ducts that say it, in flow order.
struct Stretch {
    stations: Vec<StationId>,
    ducts: Vec<ElementId>,
}

/// Whether an element has the same area at both ends.
fn passes_area(kind: &Kind) -> bool {
    match kind {
        Kind::Duct(_) | Kind::Flame(_) | Kind::Restriction(_) => true,
        Kind::Feed(_)
        | Kind::Exit(_)
        | Kind::Contraction(_)
        | Kind::Expansion(_)
        | Kind::Plenum(_) => false,
    }
}

fn stretches(elements: &[Element], links: &[Link]) -> Vec<Stretch> {
    // Labels of stations; joining two stretches relabels one. Networks are small.
    let mut label: Vec<usize> = (0..links.len()).collect();
    let passing = || {
        elements
            .iter()
            .enumerate()
            .filter(|(_, e)| passes_area(&e.kind))
            .map(|(i, _)| ElementId(i))
    };
    let ends = |e: ElementId| {
        let inlet = links.iter().position(|l| l.to == e);
        let outlet = links.iter().position(|l| l.from == e);
        inlet.zip(outlet)
    };
    for (a, b) in passing().filter_map(ends) {
        let (Some(&keep), Some(&gone)) = (label.get(a), label.get(b)) else {
            continue;
        };
        label
            .iter_mut()
            .filter(|l| **l == gone)
            .for_each(|l| *l = keep);
    }
    let mut found: Vec<Stretch> = Vec::new();
    let mut seen: Vec<usize> = Vec::new();
    for &l in &label {
        if seen.contains(&l) {
            continue;
        }
        seen.push(l);
        let stations = (0..links.len())
            .filter(|i| label.get(*i) == Some(&l))
            .map(StationId)
            .collect();
        let ducts = passing()
            .filter(|e| duct_section(elements, *e).is_some())
            .filter(|e| ends(*e).is_some_and(|(a, _)| label.get(a) == Some(&l)))
            .collect();
        found.push(Stretch { stations, ducts });
    }
    found
}

fn duct_section(elements: &[Element], id: ElementId) -> Option<Section> {
    match &elements.get(id.0)?.kind {
        Kind::Duct(duct) => Some(duct.section),
        _ => None,
    }
}

fn adjoining(network: &Network<f64>, stretch: &Stretch, problems: &mut Vec<Problem>) {
    let elements = &network.layout.elements;
    for pair in stretch.ducts.windows(2) {
        let &[a, b] = pair else { continue };
        let (Some(first), Some(second)) = (duct_section(elements, a), duct_section(elements, b))
        else {
            continue;
        };
        let (area_a, area_b) = (first.area(&network.values), second.area(&network.values));
        if !(area_a.is_finite() && area_b.is_finite()) || agree(area_a, area_b) {
            continue;
        }
        let between = between(elements, a, b);
        let joined = match between.as_slice() {
            [] => "with no area change between them".to_owned(),
            names => format!(
                "with only {} between them, which changes no area",
                names.join(" and ")
            ),
        };
        let what = format!(
            "`{}` is {}, but `{}` before it is {}, {joined}",
            name(elements, b),
            told(network, second, area_b),
            name(elements, a),
            told(network, first, area_a),
        );
        let change = if area_b > area_a {
            "expansion"
        } else {
            "contraction"
        };
        problems.push(
            Problem::error(knob_name(&network.layout, second), what).hint(format!(
                "give both the same area, or put an element of kind = \"{change}\" between them"
            )),
        );
    }
}

/// The flames and restrictions between two ducts.
fn between(elements: &[Element], a: ElementId, b: ElementId) -> Vec<String> {
    let range = elements.get(a.0 + 1..b.0).unwrap_or_default();
    range
        .iter()
        .map(|e| match e.kind {
            Kind::Flame(_) => format!("the flame `{}`", e.name),
            _ => format!("`{}`", e.name),
        })
        .collect()
}

/// An area change that does not go the way its kind says.
struct Misfit<'a> {
    element: &'a Element,
    kind: &'static str,
    before: (Section, f64),
    after: (Section, f64),
}

fn misfit<'a>(
    element: &'a Element,
    before: (Section, f64),
    after: (Section, f64),
) -> Option<Misfit<'a>> {
    let narrows = matches!(element.kind, Kind::Contraction(_));
    let fits = !agree(before.1, after.1) && (after.1 < before.1) == narrows;
    (!fits).then_some(Misfit {
        element,
        kind: if narrows { "contraction" } else { "expansion" },
        before,
        after,
    })
}

impl Misfit<'_> {
    fn narrows(&self) -> bool {
        matches!(self.element.kind, Kind::Contraction(_))
    }

    /// What it does and should not.
    fn does(&self) -> &'static str {
        if agree(self.before.1, self.after.1) {
            "leaves the area as it is"
        } else if self.narrows() {
            "widens"
        } else {
            "narrows"
        }
    }

    fn problem(&self, network: &Network<f64>) -> Problem {
        let what = format!(
            "this {} {}: it goes from {} to {}",
            self.kind,
            self.does(),
            told(network, self.before.0, self.before.1),
            told(network, self.after.0, self.after.1)
        );
        let hint = match (agree(self.before.1, self.after.1), self.narrows()) {
            (true, true) => "a contraction narrows: remove it, or correct a neighbour's area",
            (true, false) => "an expansion widens: remove it, or correct a neighbour's area",
            (false, true) => "make it kind = \"expansion\", or correct a neighbour's area",
            (false, false) => "make it kind = \"contraction\", or correct a neighbour's area",
        };
        Problem::error(&self.element.name, what).hint(hint)
    }
}

/// The area between two area changes fits neither of them.
fn between_misfits(network: &Network<f64>, first: &Misfit<'_>, second: &Misfit<'_>) -> Problem {
    let area = |(section, area)| told(network, section, area);
    let told_of = |m: &Misfit<'_>| format!("the {} `{}`", m.kind, m.element.name);
    let what = format!(
        "this area, {}, fits neither neighbour: {} from {} {}, {} to {} {}",
        area(first.after),
        told_of(first),
        area(first.before),
        first.does(),
        told_of(second),
        area(second.after),
        second.does(),
    );
    Problem::error(knob_name(&network.layout, first.after.0), what)
        .hint("correct this area, or the kinds of both neighbours")
}

fn unsized_stretch(elements: &[Element], links: &[Link], stretch: &Stretch) -> Option<Problem> {
    let first = links.get(stretch.stations.first()?.0)?;
    let last = links.get(stretch.stations.last()?.0)?;
    let (from, to) = (name(elements, first.from), name(elements, last.to));
    let what =
        format!("no duct stands between `{from}` and `{to}`, so nothing says the area there");
    let subject = if from == "feed" { to } else { from };
    Some(Problem::error(subject, what).hint(format!(
        "put a duct between `{from}` and `{to}`; it may be short"
    )))
}

fn agree(a: f64, b: f64) -> bool {
    (a - b).abs() <= TOLERANCE * a.abs().max(b.abs())
}

fn name(elements: &[Element], id: ElementId) -> &str {
    elements.get(id.0).map_or("", |e| e.name.as_str())
}

fn knob_name(layout: &Layout, section: Section) -> String {
    let (Section::Diameter(k) | Section::Area(k)) = section;
    layout
        .knobs
        .get(k.0)
        .map_or_else(|| "element".to_owned(), |knob| knob.name.clone())
}

/// A section as it was stated: `30 mm wide`, `50 cm^2`.
fn told(network: &Network<f64>, section: Section, area: f64) -> String {
    match section {
        Section::Diameter(k) => {
            format!(
                "{} wide",
                write_rounded(network.values[k], Dimension::Length, 9)
            )
        }
        Section::Area(_) => write_rounded(area, Dimension::Area, 9),
    }
}
