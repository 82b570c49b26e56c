//! Whether each number of a network is one its knob may hold, in the file or at a point of a sweep.

use super::Network;
use crate::elements::Kind;
use crate::elements::ends::{ExitEnd, FeedEnd, FeedFlow};
use crate::knobs::{KnobId, KnobSpec, Range};
use crate::problems::Problem;
use crate::units::write_rounded;

/// Every number outside the range of its knob, and every choked end without flow.
pub fn check_values(network: &Network<f64>) -> Vec<Problem> {
    let mut problems: Vec<Problem> = network
        .layout
        .knobs
        .iter()
        .zip(&network.values.0)
        .filter_map(|(knob, value)| out_of_range(&knob.name, &knob.spec, *value))
        .collect();
    problems.extend(choked_without_flow(network));
    problems
}

/// The problem of a number outside its knob's range.
pub(crate) fn out_of_range(name: &str, spec: &KnobSpec, value: f64) -> Option<Problem> {
    if spec.range.holds(value) {
        return None;
    }
    let number = |x: f64| write_rounded(x, spec.dimension, 6);
    let wanted = match spec.range {
        Range::Any => "be finite".to_owned(),
        Range::Positive => "be greater than zero".to_owned(),
        Range::NotNegative => "not be negative".to_owned(),
        Range::Subsonic => {
            "be zero or more and less than 1: only subsonic flow is described".to_owned()
        }
        Range::Above(bound) => format!("be greater than {}", number(bound)),
    };
    let key = spec.key;
    let what = format!("`{key}` is {}, and must {wanted}", number(value));
    Some(Problem::error(name, what).hint(format!("`{key}` is the {}", spec.doc)))
}

/// A choked end passes no mass where nothing flows.
pub(crate) fn choked_without_flow(network: &Network<f64>) -> Vec<Problem> {
    let mut problems = Vec::new();
    let layout = &network.layout;
    let Some(still) = still(network) else {
        return problems;
    };
    let flow = layout.knobs.get(still.0).map_or("feed", |k| &k.name);
    let choked: Vec<&str> = layout
        .elements
        .iter()
        .filter(|element| match &element.kind {
            Kind::Feed(feed) => feed.end == FeedEnd::Choked,
            Kind::Exit(exit) => matches!(exit.end, ExitEnd::Choked { .. }),
            _ => false,
        })
        .map(|element| element.name.as_str())
        .collect();
    let hint = "state a flow, or end = \"closed\" for still gas behind a shut valve";
    match *choked.as_slice() {
        [] => {}
        [one] => {
            let what = format!("this end is choked, but nothing flows: `{flow}` is zero");
            problems.push(Problem::error(format!("{one}.end"), what).hint(hint));
        }
        [_, ..] => {
            let what = format!("nothing flows: `{flow}` is zero, but both ends are choked");
            problems.push(Problem::error(flow, what).hint(hint));
        }
    }
    problems
}

/// The knob that says the gas is still, if it is.
pub(crate) fn still(network: &Network<f64>) -> Option<KnobId> {
    let feed = network.layout.elements.iter().find_map(|e| match &e.kind {
        Kind::Feed(feed) => Some(feed),
        _ => None,
    })?;
    match feed.flow {
        FeedFlow::MassFlow(k) | FeedFlow::Velocity(k) | FeedFlow::Mach(k) => {
            (network.values[k] == 0.0).then_some(k)
        }
        FeedFlow::FromThroat => None,
    }
}
