//! The shape of a mode as a figure: the rig to scale, amplitudes and phases over it, the growth budget.

use num_complex::Complex64;

use super::figure::engineers_unit;
use super::modes::Modes;
use super::{CAUTION, counted, rate};
use crate::draw::{
    Axis, Chain, ChainEnd, Contribution, Contributions, Curve, DrawError, EndSymbol, Passage,
    Plane, ProfileFigure, ProfilePanel, ProfileWords, Symbol, profile,
};
use crate::elements::Kind;
use crate::elements::ends::{ExitEnd, FeedEnd};
use crate::modes::budget::{Budget, Part};
use crate::modes::explain::Explained;
use crate::modes::shapes::{Sample, Shape};
use crate::modes::{Mode, Tendency};
use crate::network::{ElementId, Network, StationId, areas};
use crate::units::{Dimension, write_decimals, write_rounded};

/// Steps between two samples of a shape, along the cubic through the complex amplitudes of four of them, so
/// that a phase that turns quickly beside a node is followed.
const BETWEEN: usize = 8;
/// A phase that turns farther than this within one step jumps (degrees).
const JUMP: f64 = 120.0;
/// Phases are told in `-180 .. 180`, from a little beyond either, so that one of exactly half a turn does not
/// flicker between the two (degrees).
const EDGE: f64 = 180.5;
/// Below this part of the largest, an amplitude has no phase worth telling.
const SILENT: f64 = 1e-9;
/// Below this part of the largest, a bar is left out.
const TELLING: f64 = 0.01;
/// A driver of a decaying mode weaker than this part of its strongest damper is not named in the title.
const NOTEWORTHY: f64 = 0.2;

impl Modes<'_> {
    /// The figure of each mode whose shape settled, with the number of the mode, from one.
    ///
    /// # Errors
    /// Where a figure cannot be drawn.
    pub fn shapes_svg(&self) -> Result<Vec<(usize, String)>, DrawError> {
        let mut all = Vec::new();
        for (i, (mode, told)) in self.list.modes.iter().zip(self.explained).enumerate() {
            if let Some(shape) = &told.shape {
                let figure = self.shape_figure(i, mode, told, shape);
                all.push((i + 1, profile::render(&figure)?));
            }
        }
        Ok(all)
    }

    fn shape_figure(
        &self,
        i: usize,
        mode: &Mode,
        told: &Explained,
        shape: &Shape,
    ) -> ProfileFigure {
        let network = self.network;
        let length = shape.stations.last().map_or(1.0, |s| s.position);
        let (unit, size) = engineers_unit(Dimension::Length, length);
        let list = if self.list.complete() {
            "list proved complete"
        } else {
            "list NOT PROVED COMPLETE"
        };
        let label = match told.label(network) {
            "unclear" => "of unclear nature".to_owned(),
            label => format!("{label} mode"),
        };
        let multiplicity = match mode.multiplicity {
            1 => String::new(),
            n => format!(
                ", {} in one place, of which one shape",
                counted(n.into(), "mode")
            ),
        };
        let subtitle = format!(
            "{}. Mode {} of {}{multiplicity}, {}; {list}; pressure peak 1\u{a0}Pa.",
            self.heading.title.trim_end_matches('.'),
            i + 1,
            self.list.modes.len(),
            label,
        );
        ProfileFigure {
            title: finding(network, mode, told),
            subtitle,
            footnote: format!(
                "Linear plane waves about the mean flow; velocities are axial, phases those of p\u{2032} and \
                 u\u{2032} against the largest p\u{2032}. Each element's part of the growth rate is the acoustic \
                 power it puts in over twice the acoustic energy of the mode. {CAUTION}"
            ),
            x: Axis::new("Distance from the feed", unit),
            chain: chain(network, size),
            panels: panels(network, shape, size),
            words: ProfileWords {
                flame: "flame".into(),
                plane: "other compact element".into(),
                tinted: "behind a flame".into(),
            },
            bars: told.budget.as_ref().map(|b| bars(network, b)),
        }
    }
}

fn name(network: &Network, id: ElementId) -> &str {
    let element = network.layout.elements.get(id.0);
    element.map_or("", |e| e.name.as_str())
}

/// `376 Hz grows at +45.6 1/s; driven by main_flame, 58 % of its energy in chamber`.
fn finding(network: &Network, mode: &Mode, told: &Explained) -> String {
    let of = |verb: &str| match mode.frequency() {
        f if f > 0.0 => format!("{} Hz {verb}", write_decimals(f, 1)),
        _ => format!("A mode without oscillation {verb}"),
    };
    let growth = rate(mode.growth());
    let grows = mode.tendency() == Tendency::Grows;
    let mut text = match mode.tendency() {
        Tendency::Grows => of(&format!("grows at {growth} 1/s")),
        Tendency::Decays => of(&format!("decays at {growth} 1/s")),
        Tendency::Neutral => of("is neutral within its error bound"),
    };
    let Some(budget) = &told.budget else {
        return text;
    };
    let strongest = |side: f64| -> Option<&Part> {
        let those = budget.parts.iter().filter(|p| side * p.growth() > 0.0);
        those.max_by(|a, b| (side * a.growth()).total_cmp(&(side * b.growth())))
    };
    let (driver, damper) = (strongest(1.0), strongest(-1.0));
    // What is smaller than the rest of the balance by far is not what drives or damps.
    let worth = |p: &&Part| p.growth().abs() > 1e-6 * mode.s.norm();
    let most = damper.map_or(0.0, |p| p.growth().abs());
    let driver = driver.filter(|p| grows || p.growth() > NOTEWORTHY * most);
    let driver = driver.filter(worth).map(|p| name(network, p.element));
    let damper = damper.filter(worth).map(|p| name(network, p.element));
    let words = match (grows, driver, damper) {
        (true, Some(a), _) => format!("; driven by {a}"),
        (false, Some(a), Some(b)) => format!("; {b} damps it most, {a} drives it"),
        (false, None, Some(b)) => format!("; damped by {b}"),
        (false, Some(a), None) => format!("; driven by {a}"),
        (true, None, _) | (false, None, None) => String::new(),
    };
    text.push_str(&words);
    if let Some((element, share)) = told.mostly_in() {
        let percent = (100.0 * share).round();
        let element = name(network, element);
        text.push_str(&format!(", {percent:.0} % of its energy in {element}"));
    }
    text
}

/// The rig, lengths divided by `size`.
fn chain(network: &Network, size: f64) -> Chain {
    let areas = areas::station_areas(network);
    let width_at = |s: Option<StationId>| {
        let area = s.and_then(|s| areas.get(s.0).copied()).unwrap_or(0.0);
        (4.0 * area / std::f64::consts::PI).sqrt()
    };
    let mut chain = Chain::default();
    let (mut position, mut burnt) = (0.0, false);
    for (id, element) in network.elements() {
        let name = element.name.clone();
        let (before, behind) = (
            width_at(network.layout.inlet(id)),
            width_at(network.layout.outlet(id)),
        );
        let mut plane = |symbol: Symbol, width: f64| {
            chain.planes.push(Plane {
                name: name.clone(),
                at: position / size,
                width: width / size,
                symbol,
            });
        };
        match &element.kind {
            Kind::Duct(duct) => {
                let to = position + network.values[duct.length];
                chain.passages.push(Passage {
                    name,
                    from: position / size,
                    to: to / size,
                    width: behind / size,
                    tinted: burnt,
                });
                position = to;
            }
            Kind::Contraction(_) | Kind::Expansion(_) => plane(Symbol::Step, before.min(behind)),
            Kind::Plenum(_) => plane(Symbol::Vessel, before.max(behind)),
            Kind::Flame(_) => {
                plane(Symbol::Flame, behind);
                burnt = true;
            }
            Kind::Restriction(r) => {
                let narrow = r.section.map(|s| s.area(&network.values));
                let free = match narrow {
                    Some(area) => (4.0 * area / std::f64::consts::PI).sqrt() / before,
                    None => 0.5,
                };
                plane(Symbol::Pinch { free }, before);
            }
            Kind::Feed(feed) => {
                let (symbol, word) = feed_end(feed.end);
                chain.ends.0 = ChainEnd {
                    name: format!("{name}: {word}"),
                    symbol,
                };
            }
            Kind::Exit(exit) => {
                let (symbol, word) = exit_end(exit.end);
                chain.ends.1 = ChainEnd {
                    name: format!("{name}: {word}"),
                    symbol,
                };
            }
        }
    }
    let widest = chain.passages.iter().map(|p| p.width).fold(0.0, f64::max);
    let widest = write_rounded(widest * size, Dimension::Length, 3);
    chain.widest = format!("\u{d8} {widest}");
    chain
}

fn feed_end(end: FeedEnd) -> (EndSymbol, &'static str) {
    match end {
        FeedEnd::Closed => (EndSymbol::Wall, "closed"),
        FeedEnd::Open => (EndSymbol::Opening, "open"),
        FeedEnd::Reservoir => (EndSymbol::Room, "reservoir"),
        FeedEnd::Anechoic => (EndSymbol::Absorber, "anechoic"),
        FeedEnd::Choked => (EndSymbol::Nozzle, "choked"),
        FeedEnd::Reflection(_) => (EndSymbol::Sheet, "reflection"),
    }
}

fn exit_end(end: ExitEnd) -> (EndSymbol, &'static str) {
    match end {
        ExitEnd::Closed => (EndSymbol::Wall, "closed"),
        ExitEnd::Open => (EndSymbol::Opening, "open"),
        ExitEnd::Anechoic => (EndSymbol::Absorber, "anechoic"),
        ExitEnd::Choked { .. } => (EndSymbol::Nozzle, "choked"),
        ExitEnd::Reflection(_) => (EndSymbol::Sheet, "reflection"),
    }
}

/// The samples of each duct, and each station that no duct reaches by itself, in order along the rig.
fn stretches(network: &Network, shape: &Shape) -> Vec<Vec<Sample>> {
    let links = network.layout.links.iter().zip(&shape.stations);
    let duct = |id: ElementId| matches!(network.kind(id), Kind::Duct(_));
    let mut all = Vec::new();
    for (link, station) in links {
        if duct(link.from) {
            let those = shape.along.iter().filter(|s| s.element == link.from);
            all.push(those.copied().collect());
        } else if !duct(link.to) {
            all.push(vec![*station]);
        }
    }
    all
}

/// A stretch as places (m) with amplitudes, finer than its samples, which lie evenly.
fn finer(stretch: &[Sample], of: fn(&Sample) -> Complex64) -> Vec<(f64, Complex64)> {
    let mut all: Vec<(f64, Complex64)> = Vec::new();
    for (i, pair) in stretch.windows(2).enumerate() {
        let [a, b] = pair else { continue };
        let from = i.saturating_sub(1).min(stretch.len().saturating_sub(4));
        let near = stretch.get(from..from + 4);
        let step = |k: usize| {
            let t = k as f64 / BETWEEN as f64;
            let place = a.position + t * (b.position - a.position);
            let amplitude = match near {
                Some([c0, c1, c2, c3]) => {
                    cubic([of(c0), of(c1), of(c2), of(c3)], t + (i - from) as f64)
                }
                _ => of(a) + (of(b) - of(a)) * t,
            };
            (place, amplitude)
        };
        all.extend((0..BETWEEN).map(step));
    }
    all.extend(stretch.last().map(|s| (s.position, of(s))));
    all
}

/// The cubic with values `c` at 0, 1, 2, 3 (Lagrange).
fn cubic(c: [Complex64; 4], t: f64) -> Complex64 {
    let (t1, t2, t3) = (t - 1.0, t - 2.0, t - 3.0);
    c[0] * (-t1 * t2 * t3 / 6.0)
        + c[1] * (t * t2 * t3 / 2.0)
        + c[2] * (-t * t1 * t3 / 2.0)
        + c[3] * (t * t1 * t2 / 6.0)
}

fn panels(network: &Network, shape: &Shape, size: f64) -> Vec<ProfilePanel> {
    let stretches = stretches(network, shape);
    let traced = |of: fn(&Sample) -> Complex64| -> Vec<Vec<(f64, Complex64)>> {
        let all = stretches.iter().map(|s| finer(s, of));
        all.map(|run| run.into_iter().map(|(x, a)| (x / size, a)).collect())
            .collect()
    };
    let (pressure, velocity) = (traced(|s| s.pressure), traced(|s| s.velocity));
    let amplitude = |runs: &[Vec<(f64, Complex64)>], scale: f64| {
        let run =
            |r: &Vec<(f64, Complex64)>| r.iter().map(|(x, a)| (*x, scale * a.norm())).collect();
        runs.iter().map(run).collect()
    };
    let curve = |style: usize, runs| Curve {
        name: match style {
            0 => "pressure p\u{2032}".into(),
            _ => "axial velocity u\u{2032}".into(),
        },
        style,
        runs,
    };
    let quarter = |k: i32| f64::from(90 * k);
    vec![
        ProfilePanel {
            y: Axis::new("Pressure |p\u{2032}|", "Pa"),
            fixed: Some(((0.0, 1.08), vec![0.0, 0.5, 1.0])),
            curves: vec![curve(0, amplitude(&pressure, 1.0))],
        },
        ProfilePanel {
            y: Axis::new("Velocity |u\u{2032}|", "mm/s"),
            fixed: None,
            curves: vec![curve(1, amplitude(&velocity, 1e3))],
        },
        ProfilePanel {
            y: Axis::new("Phase", "deg"),
            fixed: Some(((-198.0, 198.0), (-2..=2).map(quarter).collect())),
            curves: vec![curve(0, phases(&pressure)), curve(1, phases(&velocity))],
        },
    ]
}

/// Phases (degrees) in `-EDGE .. EDGE`, broken where they jump and where they leave that range.
fn phases(runs: &[Vec<(f64, Complex64)>]) -> Vec<Vec<(f64, f64)>> {
    let sizes = runs.iter().flatten().map(|(_, a)| a.norm());
    let silent = SILENT * sizes.fold(0.0, f64::max);
    let mut all = Vec::new();
    for run in runs {
        let mut current: Vec<(f64, f64)> = Vec::new();
        for &(x, amplitude) in run {
            if amplitude.norm() <= silent {
                all.push(std::mem::take(&mut current));
                continue;
            }
            let mut phase = amplitude.arg().to_degrees();
            if phase <= EDGE - 360.0 {
                phase += 360.0;
            }
            if let Some(&(x0, before)) = current.last() {
                let turn = phase - before;
                // The shorter way round.
                let beyond = phase - 360.0 * (turn / 360.0).round();
                if (beyond - before).abs() > JUMP {
                    all.push(std::mem::take(&mut current));
                } else if beyond != phase {
                    let edge = if beyond > before { EDGE } else { EDGE - 360.0 };
                    let t = ((edge - before) / (beyond - before)).clamp(0.0, 1.0);
                    let crossing = x0 + t * (x - x0);
                    current.push((crossing, edge));
                    all.push(std::mem::take(&mut current));
                    let other = if beyond > before { EDGE - 360.0 } else { EDGE };
                    current.push((crossing, other));
                }
            }
            current.push((x, phase));
        }
        all.push(current);
    }
    all.retain(|run| !run.is_empty());
    all
}

fn bars(network: &Network, budget: &Budget) -> Contributions {
    let reach = |p: &Part| p.flow.abs().max(p.entropy.abs()).max(p.heat.abs());
    let largest = budget.parts.iter().map(reach).fold(0.0, f64::max);
    let telling = |p: &&Part| reach(p) > TELLING * largest || p.energy > TELLING;
    let (mut told, mut rest): (Vec<&Part>, Vec<&Part>) = budget.parts.iter().partition(telling);
    if rest.len() == 1 {
        (told, rest) = (budget.parts.iter().collect(), Vec::new());
    }
    // What is left of a balance by rounding is no part of it.
    let clean = |x: f64| if x.abs() > 1e-9 * largest { x } else { 0.0 };
    let row = |name: String, parts: &[&Part]| {
        let sum = |of: fn(&Part) -> f64| clean(parts.iter().map(|p| of(p)).sum());
        Contribution {
            name,
            values: vec![sum(|p| p.heat), sum(|p| p.flow), sum(|p| p.entropy)],
            share: 100.0 * parts.iter().map(|p| p.energy).sum::<f64>(),
        }
    };
    let mut rows: Vec<Contribution> = told
        .iter()
        .map(|p| row(name(network, p.element).to_owned(), &[p]))
        .collect();
    // Where the rest adds nothing there is nothing to draw.
    let seen = |p: &&Part| clean(p.growth()) != 0.0 || p.energy > 1e-9;
    if rest.iter().any(seen) {
        rows.push(row(format!("{} others", rest.len()), &rest));
    }
    Contributions {
        axis: Axis::new("Part of the growth rate", "1/s"),
        sides: ("damps".into(), "drives".into()),
        classes: vec![
            "by fluctuating heat release".into(),
            "by sound and mean flow".into(),
            "by entropy".into(),
        ],
        rows,
        sum: "growth rate".into(),
        share: Axis::new("Acoustic energy", "%"),
        whole: 100.0,
    }
}
