//! What is wrong with a sweep before it is computed, and what qualifies it.

use super::{State, Sweep};
use crate::knobs::KnobId;
use crate::meanflow::MeanFlow;
use crate::network::Network;
use crate::problems::Problem;
use crate::studies::cautions::{
    Answer, assumptions, moving, outside, refused, setting, unanswered,
};
use crate::studies::path::{Parameter, Path};
use crate::units::{Dimension, write_rounded};

/// `main_flame.delay = 3 ms`, or `factor = 0.9`.
pub fn place(network: &Network, path: &Path, u: f64) -> String {
    let value = path.value(u);
    match path.parameter {
        Parameter::Knob(knob) => setting(network, (knob, value)),
        Parameter::Factor => format!("factor = {}", write_rounded(value, Dimension::Number, 5)),
    }
}

/// The network at positions spread over the path, ends included, and where each is in words.
fn places(network: &Network, path: &Path, most: usize) -> Vec<(String, Network)> {
    let spread = Path {
        points: path.points.min(most),
        ..path.clone()
    };
    (0..spread.points)
        .map(|i| spread.position(i))
        .map(|u| (place(network, path, u), path.at(network, u)))
        .collect()
}

/// Numbers out of range and areas that do not fit, at both ends; between them a point that does not fit
/// is told as failed.
pub fn refusals(network: &Network, path: &Path) -> Vec<Problem> {
    refused(places(network, path, 2))
}

/// What qualifies a sweep beyond what is `known` of the network itself.
pub fn warnings(
    network: &Network,
    mean: &MeanFlow<f64>,
    sweep: &Sweep,
    known: &[Problem],
) -> Vec<Problem> {
    let path = &sweep.path;
    let knobs: Vec<KnobId> = path.knobs.iter().map(|(k, _)| *k).collect();
    let mut found = moving(network, mean, &knobs, "the sweep", "vary it as well");
    let looked = places(network, path, 25);
    assumptions(&mut found, known, &sweep.window, looked);
    let grows = sweep.points.iter();
    let grows = grows.filter(|p| p.outside.fastest.is_some()).count();
    let place = |u| place(network, path, u);
    if let Some(fastest) = sweep.fastest_outside {
        found.push(outside(
            (grows, sweep.points.len()),
            (fastest.s, place(fastest.u)),
            &sweep.window,
            "branches end at the window's edge; search a larger window to follow it",
        ));
    }
    if let (Some((from, _)), Some((_, to))) = (sweep.unresolved.first(), sweep.unresolved.last()) {
        let what = format!(
            "between {} and {} modes move too fast for {} points, and {} put in between, to tell which is which: \
             branches end and begin there",
            place(*from),
            place(*to),
            sweep.points.len(),
            sweep.between
        );
        found.push(
            Problem::warning("sweep", what).hint("sweep a shorter span or more points (--points)"),
        );
    }
    let taken = &sweep.taken_for_unstable;
    if let (Some((from, _)), Some((_, to))) = (taken.first(), taken.last()) {
        let what = format!(
            "between {} and {} modes that grow move too fast to be followed: steps with growth at an end are \
             taken for unstable all along",
            place(*from),
            place(*to)
        );
        found.push(Problem::warning("sweep", what));
    }
    let points = sweep.points.iter().map(|point| {
        let answer = match &point.state {
            State::Certified => Answer::Certified,
            State::Doubtful(why) => Answer::Doubtful(why),
            State::Failed(problem) => Answer::Failed(problem),
        };
        (answer, point.u)
    });
    found.extend(unanswered(points, place));
    found
}
