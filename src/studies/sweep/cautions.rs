//! What is wrong with a sweep before it is computed, and what qualifies it.

use super::{State, Sweep};
use crate::knobs::KnobId;
use crate::meanflow::MeanFlow;
use crate::network::Network;
use crate::problems::Problem;
use crate::studies::cautions::{Answer, assumptions, moving, refused, setting, unanswered};
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
    found.extend(beyond(network, sweep));
    let points = sweep.points.iter().map(|point| {
        let answer = match &point.state {
            State::Certified => Answer::Certified,
            State::Doubtful(why) => Answer::Doubtful(why),
            State::Failed(problem) => Answer::Failed(problem),
        };
        (answer, point.u)
    });
    found.extend(unanswered(points, |u| place(network, path, u)));
    found
}

/// Points where a mode grows faster than the window's upper edge.
fn beyond(network: &Network, sweep: &Sweep) -> Option<Problem> {
    let beyond = || sweep.points.iter().filter_map(|p| Some((p.u, p.beyond?)));
    let (u, fastest) = beyond().max_by(|a, b| a.1.growth().total_cmp(&b.1.growth()))?;
    let what = format!(
        "at {} of {} points a mode grows faster than the window's upper edge of {:.0} 1/s; the fastest, at \
         {}: {:.0} 1/s at {:.1} Hz",
        beyond().count(),
        sweep.points.len(),
        sweep.window.growth.1,
        place(network, &sweep.path, u),
        fastest.growth(),
        fastest.frequency()
    );
    let hint = format!(
        "branches end at the window's edge; search growth rates up to {:.0} 1/s to follow it",
        (1.1 * fastest.growth() / 50.0).ceil() * 50.0
    );
    Some(Problem::warning("search.growth", what).hint(hint))
}
