//! What a map tells beside its arrays: a list of events, and words on the mode followed.

use serde::Serialize;

use super::map::{self, MapReport};
use super::rate;
use crate::studies::branch::Followed;
use crate::studies::cautions::place;
use crate::studies::map::{Map, Point};
use crate::units::write_decimals;

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

/// Why a mode is not followed to all points.
pub(super) const NOT_FOLLOWED: &str = "It is followed until it stops oscillating, meets another mode on the way, or there is no mean flow";

impl MapReport<'_> {
    /// How the mode was followed, and where it meets another.
    pub(super) fn cut_words(&self, one: &map::Followed<'_>) -> String {
        let map = self.map;
        let across = self.axis(map.across).0;
        let mut text = format!(
            "Followed from the design point first along {across}, then along {}; to {} of {} points\n",
            self.axis(map.up).0,
            one.over.reached.iter().filter(|r| **r).count(),
            map.points.len()
        );
        if one.over.reached.iter().any(|r| !r) {
            text.push_str(&format!("{NOT_FOLLOWED}.\n"));
        }
        for point in &one.over.exceptional {
            let at = place(
                self.network,
                (map.across.knob, map.across.between(point.at.0)),
                (map.up.knob, map.up.between(point.at.1)),
            );
            let told = match point.s {
                Some(s) => format!(
                    "It meets another mode at {at}: {} Hz, {} 1/s\n",
                    write_decimals(s.im / std::f64::consts::TAU, 1),
                    rate(s.re)
                ),
                None => format!("It meets another mode near {at}\n"),
            };
            text.push_str(&told);
        }
        if !one.over.cuts.is_empty() {
            text.push_str(
                "From there the map has a cut: beyond, what the mode becomes depends on the way taken.\n\
                 Meetings farther outside the window than a quarter of its width are not listed.\n",
            );
        }
        text
    }
}
