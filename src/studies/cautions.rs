//! What is wrong with a map before it is computed, and what qualifies it; what a sweep shares with it.

use num_complex::Complex64;

use super::map::{Axis, Map, Point, moves_mean_flow};
use crate::elements::Kind;
use crate::elements::ends::{Exit, ExitEnd};
use crate::knobs::KnobId;
use crate::meanflow::{self, MeanFlow};
use crate::modes::{Window, validity};
use crate::network::{Network, areas, values};
use crate::problems::Problem;
use crate::units::{Dimension, write_decimals, write_rounded, write_signed};

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
pub(super) fn add(found: &mut Vec<Problem>, known: &[Problem], place: &str, more: Vec<Problem>) {
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
    refused(corners(network, across, up))
}

/// Numbers out of range and areas that do not fit, at the places given.
pub(super) fn refused(places: Vec<(String, Network)>) -> Vec<Problem> {
    let mut found = Vec::new();
    for (place, network) in places {
        let mut wrong = values::check_values(&network);
        if wrong.is_empty() {
            wrong = areas::check_areas(&network);
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
    let knobs = [across.knob, up.knob];
    let mut found = moving(network, mean, &knobs, "the map", "map it as well");
    let looked = if knobs.iter().any(|k| moves_mean_flow(network, *k)) {
        // The flow is not monotone over the plane, and a corner may have none.
        sampled(network, across, up)
    } else {
        corners(network, across, up)
    };
    assumptions(&mut found, known, &map.window, looked);
    let place = |(x, y): (f64, f64)| place(network, (across.knob, x), (up.knob, y));
    let grows = || {
        map.placed()
            .filter_map(|(x, y, p)| Some(((x, y), p.outside()?)))
    };
    let hint = "the figure shows those growth rates; the lists and largest_growth_per_s keep to the window";
    let fastest = grows().max_by(|a, b| a.1.growth().total_cmp(&b.1.growth()));
    found.extend(fastest.map(|(at, mode)| {
        let counts = (grows().count(), map.points.len());
        outside(counts, (mode.s, place(at)), &map.window, hint)
    }));
    let points = map.placed().map(|(x, y, point)| {
        let answer = match point {
            Point::Certified(_) => Answer::Certified,
            Point::Doubtful { why, .. } => Answer::Doubtful(why),
            Point::Failed(problem) => Answer::Failed(problem),
        };
        (answer, (x, y))
    });
    found.extend(unanswered(points, place));
    found.extend(extrapolated(network, map));
    found
}

/// Points where growth is so fast that a response is taken far from where it was measured,
/// `|growth| delay > 1`.
fn extrapolated(network: &Network, map: &Map) -> Vec<Problem> {
    let mut found = Vec::new();
    for (delay, _) in validity::delays(network) {
        let tau = |x: f64, y: f64| match delay {
            k if k == map.across.knob => x,
            k if k == map.up.knob => y,
            k => network.values[k],
        };
        let fast = map.placed().filter_map(|(x, y, point)| {
            let product = point.fastest()?.growth().abs() * tau(x, y);
            (product > 1.0).then_some((product, (x, y)))
        });
        let mut count = 0;
        let most = fast
            .inspect(|_| count += 1)
            .max_by(|a, b| a.0.total_cmp(&b.0));
        let Some((product, (x, y))) = most else {
            continue;
        };
        let name = network.layout.knobs.get(delay.0);
        let what = format!(
            "at {count} of {} points growth or decay rate times delay exceeds 1 ({} at {}): a response \
             known from steady forcing is extrapolated there",
            map.points.len(),
            write_rounded(product, Dimension::Number, 3),
            place(network, (map.across.knob, x), (map.up.knob, y))
        );
        let name = name.map_or("network", |k| k.name.as_str());
        found.push(
            Problem::warning(name, what)
                .hint("take the growth rates there as signs, not as values"),
        );
    }
    found
}

/// Assumptions that fail at the places given.
pub(super) fn assumptions(
    found: &mut Vec<Problem>,
    known: &[Problem],
    window: &Window,
    places: Vec<(String, Network)>,
) {
    for (place, network) in places {
        let mut more = validity::of_responses(&network);
        // A point without a mean flow is told as a failed one.
        if let Ok(mean) = meanflow::solve(&network) {
            more.extend(mean.warnings.iter().cloned());
            more.extend(validity::of_window(&network, &mean, window));
        }
        add(found, known, &place, more);
    }
}

/// Delays that stay and throats that move while some of the knobs move the mean flow. `over` is what they
/// span, `mend` what else to do with a delay.
pub(super) fn moving(
    network: &Network,
    mean: &MeanFlow<f64>,
    knobs: &[KnobId],
    over: &str,
    mend: &str,
) -> Vec<Problem> {
    let mut found = Vec::new();
    let name = |k: KnobId| {
        let knob = network.layout.knobs.get(k.0);
        knob.map_or("network", |k| k.name.as_str())
    };
    let movers: Vec<&str> = knobs
        .iter()
        .filter(|k| moves_mean_flow(network, **k))
        .map(|k| name(*k))
        .collect();
    if movers.is_empty() {
        return found;
    }
    let by = match movers.as_slice() {
        [most @ .., one, other] => {
            let mut names: Vec<&str> = most.to_vec();
            let last = format!("{one} and {other}");
            names.push(&last);
            names.join(", ")
        }
        few => few.concat(),
    };
    for (delay, _) in validity::delays(network) {
        if !knobs.contains(&delay) {
            let what =
                format!("this delay stays fixed, while {by} can move velocities over {over}");
            let hint = format!("a delay of convection shortens as velocity rises: {mend}");
            found.push(Problem::warning(name(delay), what).hint(hint));
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
                "the throat area follows from the flow, so {by} can move it over {over}; it is {area} as the \
                 file stands"
            );
            found.push(
                Problem::warning("exit", what)
                    .hint("state throat_area for hardware that stays as it is"),
            );
        }
    }
    found
}

/// Points, of so many, where a mode grows outside the window, the fastest of all, and where.
pub(super) fn outside(
    (count, total): (usize, usize),
    (fastest, place): (Complex64, String),
    window: &Window,
    hint: &str,
) -> Problem {
    let seen = match count {
        0 => "between the points".to_owned(),
        _ => format!("at {count} of {total} points"),
    };
    let what = format!(
        "{seen} a mode grows outside the window; the fastest known, at {place}: {} 1/s at {} Hz",
        write_signed(fastest.re, 0),
        write_decimals(fastest.im / std::f64::consts::TAU, 1)
    );
    let (low, high) = window.growth;
    let subject = if (low..=high).contains(&fastest.re) {
        "search.frequency"
    } else {
        "search.growth"
    };
    Problem::warning(subject, what).hint(hint)
}

/// What is known of a point.
pub(super) enum Answer<'a> {
    Certified,
    Doubtful(&'a str),
    Failed(&'a Problem),
}

/// Points that failed, by what they failed at, and points not certified.
pub(super) fn unanswered<'a, P>(
    points: impl Iterator<Item = (Answer<'a>, P)>,
    place: impl Fn(P) -> String,
) -> Vec<Problem> {
    let mut failed: Vec<(&Problem, usize, String)> = Vec::new();
    let mut doubtful: Option<(&str, usize, String)> = None;
    let mut total = 0;
    for (answer, at) in points {
        total += 1;
        match answer {
            Answer::Certified => {}
            Answer::Doubtful(why) => match &mut doubtful {
                Some((_, count, _)) => *count += 1,
                None => doubtful = Some((why, 1, place(at))),
            },
            Answer::Failed(problem) => {
                match failed.iter_mut().find(|f| f.0.subject == problem.subject) {
                    Some((_, count, _)) => *count += 1,
                    None => failed.push((problem, 1, place(at))),
                }
            }
        }
    }
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
