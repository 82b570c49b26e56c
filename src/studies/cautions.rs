//! What is wrong with a map before it is computed, and what qualifies it.

use super::map::{Axis, Map, Point, moves_mean_flow};
use crate::elements::Kind;
use crate::elements::ends::{Exit, ExitEnd};
use crate::knobs::KnobId;
use crate::meanflow::{self, MeanFlow};
use crate::modes::{Mode, validity};
use crate::network::{Network, areas, values};
use crate::problems::Problem;
use crate::units::{Dimension, write_rounded};

/// The numbers of the network at a point of the plane.
fn at(network: &Network, (across, x): (Axis, f64), (up, y): (Axis, f64)) -> Network {
    network.with(across.knob, x).with(up.knob, y)
}

/// The four corners of the plane, and where each is in words.
fn corners(network: &Network, across: Axis, up: Axis) -> Vec<(String, Network)> {
    let mut all = Vec::new();
    for y in [up.low, up.high] {
        for x in [across.low, across.high] {
            let place = place(network, (across.knob, x), (up.knob, y));
            all.push((place, at(network, (across, x), (up, y))));
        }
    }
    all
}

/// Points spread over the plane, ends included, and where each is in words.
fn sampled(network: &Network, across: Axis, up: Axis) -> Vec<(String, Network)> {
    const MOST: usize = 25;
    let spread = |axis: Axis| Axis {
        points: axis.points.min(MOST),
        ..axis
    };
    let mut all = Vec::new();
    for y in spread(up).values() {
        for x in spread(across).values() {
            let place = place(network, (across.knob, x), (up.knob, y));
            all.push((place, at(network, (across, x), (up, y))));
        }
    }
    all
}

/// `main_flame.delay = 3 ms, main_flame.interaction_index = 1`.
pub fn place(network: &Network, across: (KnobId, f64), up: (KnobId, f64)) -> String {
    format!("{}, {}", setting(network, across), setting(network, up))
}

/// `main_flame.delay = 3 ms`.
pub fn setting(network: &Network, (knob, value): (KnobId, f64)) -> String {
    match network.layout.knobs.get(knob.0) {
        Some(k) => format!("{} = {}", k.name, write_rounded(value, k.spec.dimension, 5)),
        None => value.to_string(),
    }
}

/// Adds those of `more` whose subject has not been spoken of, with the place where they arise.
fn add(found: &mut Vec<Problem>, known: &[Problem], place: &str, more: Vec<Problem>) {
    for mut problem in more {
        let said = |p: &Problem| p.subject == problem.subject;
        if known.iter().chain(found.iter()).any(said) {
            continue;
        }
        problem.what = format!("at {place}: {}", problem.what);
        found.push(problem);
    }
}

/// Numbers out of range and areas that do not fit, at the corners: areas are monotone in a knob, so
/// what fits at the corners fits between them.
pub fn refusals(network: &Network, across: Axis, up: Axis) -> Vec<Problem> {
    let mut found = Vec::new();
    for (place, corner) in corners(network, across, up) {
        let mut wrong = values::check_values(&corner);
        if wrong.is_empty() {
            wrong = areas::check_areas(&corner);
        }
        add(&mut found, &[], &place, wrong);
    }
    found
}

/// What qualifies a map beyond what is `known` of the network itself: assumptions that fail somewhere on it,
/// what moves and what stays while the mean flow moves, points without an answer.
pub fn warnings(
    network: &Network,
    mean: &MeanFlow<f64>,
    map: &Map,
    known: &[Problem],
) -> Vec<Problem> {
    let (across, up) = (map.across, map.up);
    let mut found = moving(network, mean, across, up);
    let moves = [across, up].map(|a| moves_mean_flow(network, a.knob));
    let looked = if moves.contains(&true) {
        // The flow is not monotone over the plane, and a corner may have none.
        sampled(network, across, up)
    } else {
        corners(network, across, up)
    };
    for (place, sample) in looked {
        let mut more = validity::of_responses(&sample);
        // A point without a mean flow is told as a failed one.
        if let Ok(mean) = meanflow::solve(&sample) {
            more.extend(mean.warnings.iter().cloned());
            more.extend(validity::of_window(&sample, &mean, &map.window));
        }
        add(&mut found, known, &place, more);
    }
    found.extend(outside(network, map));
    found.extend(unanswered(network, map));
    found
}

/// Delays that stay and throats that move while an axis moves the mean flow.
fn moving(network: &Network, mean: &MeanFlow<f64>, across: Axis, up: Axis) -> Vec<Problem> {
    let mut found = Vec::new();
    let name = |k: KnobId| {
        let knob = network.layout.knobs.get(k.0);
        knob.map_or("network", |k| k.name.as_str())
    };
    let movers: Vec<&str> = [across.knob, up.knob]
        .into_iter()
        .filter(|k| moves_mean_flow(network, *k))
        .map(name)
        .collect();
    if movers.is_empty() {
        return found;
    }
    let by = movers.join(" and ");
    for (delay, _) in validity::delays(network) {
        if delay != across.knob && delay != up.knob {
            let what =
                format!("this delay stays fixed, while {by} can move velocities over the map");
            found.push(
                Problem::warning(name(delay), what)
                    .hint("a delay of convection shortens as velocity rises: map it as well"),
            );
        }
    }
    for element in &network.layout.elements {
        if let (
            Kind::Exit(Exit {
                end: ExitEnd::Choked { throat: None },
            }),
            Some(area),
        ) = (&element.kind, mean.throat_area)
        {
            let area = write_rounded(area, Dimension::Area, 4);
            let what = format!(
                "the throat area follows from the flow, so {by} can move it over the map; it is {area} as \
                 the file stands"
            );
            found.push(
                Problem::warning("exit", what)
                    .hint("state throat_area for hardware that stays as it is"),
            );
        }
    }
    found
}

/// Points where a mode grows outside the window.
fn outside(network: &Network, map: &Map) -> Option<Problem> {
    let mut count = 0;
    let mut fastest: Option<(f64, f64, Mode)> = None;
    for (x, y, point) in map.placed() {
        let Some(mode) = point.outside() else {
            continue;
        };
        count += 1;
        if fastest.is_none_or(|(_, _, m)| m.growth() < mode.growth()) {
            fastest = Some((x, y, mode));
        }
    }
    let (x, y, fastest) = fastest?;
    let what = format!(
        "at {count} of {} points a mode grows outside the window; the fastest, at {}: {:.0} 1/s at {:.1} Hz",
        map.points.len(),
        place(network, (map.across.knob, x), (map.up.knob, y)),
        fastest.growth(),
        fastest.frequency()
    );
    let (low, high) = map.window.growth;
    let subject = if (low..=high).contains(&fastest.growth()) {
        "search.frequency"
    } else {
        "search.growth"
    };
    Some(Problem::warning(subject, what).hint(
        "the figure shows those growth rates; the lists and largest_growth_per_s keep to the window",
    ))
}

/// Points that failed, by what they failed at, and points not certified.
fn unanswered(network: &Network, map: &Map) -> Vec<Problem> {
    let mut failed: Vec<(&Problem, usize, String)> = Vec::new();
    let mut doubtful: Option<(&str, usize, String)> = None;
    for (x, y, point) in map.placed() {
        let here = || place(network, (map.across.knob, x), (map.up.knob, y));
        match point {
            Point::Certified(_) => {}
            Point::Doubtful { why, .. } => match &mut doubtful {
                Some((_, count, _)) => *count += 1,
                None => doubtful = Some((why, 1, here())),
            },
            Point::Failed(problem) => {
                match failed.iter_mut().find(|f| f.0.subject == problem.subject) {
                    Some((_, count, _)) => *count += 1,
                    None => failed.push((problem, 1, here())),
                }
            }
        }
    }
    let total = map.points.len();
    let mut found: Vec<Problem> = failed
        .into_iter()
        .map(|(first, count, place)| {
            let what = format!(
                "{count} of {total} points have no answer; the first, at {place}: {}",
                first.what
            );
            let mut problem = Problem::warning(&first.subject, what);
            problem.hint.clone_from(&first.hint);
            problem
        })
        .collect();
    if let Some((why, count, place)) = doubtful {
        let what =
            format!("{count} of {total} points are not certified; the first, at {place}: {why}");
        found.push(
            Problem::warning("search", what)
                .hint("another window may avoid a mode on its edge; the points are hatched"),
        );
    }
    found
}
