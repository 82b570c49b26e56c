//! What a map tells beside its arrays, as a list of events.

use serde::Serialize;

use crate::studies::branch::Followed;
use crate::studies::map::{Map, Point};

/// Something at a point of the plane, or along a line on it.
#[derive(Clone, Debug, Serialize)]
pub(super) struct EventFields {
    kind: &'static str,
    /// Values of both knobs; of a cut, at its lower end.
    across: f64,
    up: f64,
    /// The other end of a cut.
    to: Option<[f64; 2]>,
    frequency_hz: Option<f64>,
    growth_per_s: Option<f64>,
    why: Option<String>,
}

/// Points without an answer, row by row; exceptional points of a mode followed; the cut they leave.
pub(super) fn events(map: &Map, followed: Option<&Followed>) -> Vec<EventFields> {
    let plain = |kind, (across, up): (f64, f64)| EventFields {
        kind,
        across,
        up,
        to: None,
        frequency_hz: None,
        growth_per_s: None,
        why: None,
    };
    let value = |at: (f64, f64)| (map.across.between(at.0), map.up.between(at.1));
    let mut events = Vec::new();
    for (across, up, point) in map.placed() {
        let (kind, why) = match point {
            Point::Certified(_) => continue,
            Point::Doubtful { why, .. } => ("not_certified", why.to_string()),
            Point::Failed(problem) => ("failed", format!("{}: {}", problem.subject, problem.what)),
        };
        events.push(EventFields {
            why: Some(why),
            ..plain(kind, (across, up))
        });
    }
    let Some(followed) = followed else {
        return events;
    };
    events.extend(followed.exceptional.iter().map(|point| EventFields {
        frequency_hz: point.s.map(|s| s.im / std::f64::consts::TAU),
        growth_per_s: point.s.map(|s| s.re),
        why: (point.s.is_none()).then(|| {
            "it lies in the cell about this place and was not found more closely".to_owned()
        }),
        ..plain("exceptional_point", value(point.at))
    }));
    events.extend(followed.cuts.iter().map(|cut| EventFields {
        to: Some(value(cut.to).into()),
        ..plain("cut", value(cut.from))
    }));
    events
}
