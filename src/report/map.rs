//! A stability map: as JSON, as CSV and in words.

use serde::Serialize;

use super::document::WindowFields;
use super::map_events::{EventFields, events};
use super::{Document, Heading, closing, counted, rate, window_text};
use crate::modes::{self, Mode, ModeList, Outside, Tendency, Window};
use crate::network::Network;
use crate::problems::Problem;
use crate::studies::branch;
use crate::studies::cautions::{place, setting};
use crate::studies::map::{Axis, Map, Point};
use crate::studies::regions::{Region, Regions};
use crate::units::{Dimension, write_decimals, write_rounded};

/// A map to report.
#[derive(Clone, Copy, Debug)]
pub struct MapReport<'a> {
    /// Of which network.
    pub heading: Heading<'a>,
    /// The network as its file states it.
    pub network: &'a Network,
    /// The answers.
    pub map: &'a Map,
    /// Which mode leads where.
    pub regions: &'a Regions,
    /// Growth rates (1/s) beyond the window beside ground that grows, for the neutral curve.
    pub beyond: &'a [Option<f64>],
    /// The modes as the file states the network: at the design point.
    pub design: &'a ModeList,
    /// What grows outside the window there.
    pub design_outside: &'a Outside,
    /// The mode followed, on a map of one mode.
    pub followed: Option<Followed<'a>>,
    /// What qualifies it.
    pub warnings: &'a [Problem],
}

/// A mode followed over a map.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Followed<'a> {
    /// Its number in the list at the design point, from one.
    pub number: usize,
    /// The mode there.
    pub mode: Mode,
    /// What becomes of it.
    pub over: &'a branch::Followed,
}

#[derive(Clone, Debug, Serialize)]
struct Design {
    across: f64,
    up: f64,
    inside: bool,
    complete: bool,
    growth_per_s: Option<f64>,
    frequency_hz: Option<f64>,
    growth_outside_window_per_s: Option<f64>,
}

#[derive(Clone, Debug, Serialize)]
struct Counts {
    total: usize,
    complete: usize,
    not_certified: usize,
    failed: usize,
    growing: usize,
    growing_outside_window: usize,
    growth_not_excluded: usize,
}

/// Points led by one mode; its index in the list is its number in `leading_region`.
#[derive(Clone, Debug, Serialize)]
struct RegionFields {
    points: usize,
    frequency_hz: [f64; 2],
    largest_growth_per_s: f64,
}

impl From<&Region> for RegionFields {
    fn from(r: &Region) -> Self {
        RegionFields {
            points: r.points,
            frequency_hz: [r.frequency.0, r.frequency.1],
            largest_growth_per_s: r.fastest.growth(),
        }
    }
}

/// A point without a mean flow, or whose list is not certified.
#[derive(Clone, Debug, Serialize)]
struct Unanswered<'a> {
    across: f64,
    up: f64,
    failed: bool,
    subject: Option<&'a str>,
    why: &'a str,
}

#[derive(Clone, Debug, Serialize)]
struct Body<'a> {
    finding: String,
    followed_mode: Option<usize>,
    followed_to: Option<Vec<Vec<bool>>>,
    across_knob: &'a str,
    across_unit: &'static str,
    across: Vec<f64>,
    up_knob: &'a str,
    up_unit: &'static str,
    up: Vec<f64>,
    largest_growth_per_s: Vec<Vec<Option<f64>>>,
    frequency_hz_there: Vec<Vec<Option<f64>>>,
    complete: Vec<Vec<bool>>,
    growth_outside_window_per_s: Vec<Vec<Option<f64>>>,
    leading_region: Vec<Vec<Option<usize>>>,
    leading_regions: Vec<RegionFields>,
    points: Counts,
    points_without_answer: Vec<Unanswered<'a>>,
    events: Vec<EventFields>,
    design_point: Design,
    window: WindowFields,
    growth_excluded_beyond: bool,
    growth_not_excluded_because: Option<String>,
    growth_outside: String,
}

impl<'a> MapReport<'a> {
    /// The name and the dimension of an axis.
    pub(super) fn axis(&self, axis: Axis) -> (&'a str, Dimension) {
        let knob = self.network.layout.knobs.get(axis.knob.0);
        knob.map_or(("", Dimension::Number), |k| {
            (k.name.as_str(), k.spec.dimension)
        })
    }

    /// The design point on both axes.
    pub(super) fn design_values(&self) -> (f64, f64) {
        let values = &self.network.values;
        (values[self.map.across.knob], values[self.map.up.knob])
    }

    pub(super) fn design_inside(&self) -> bool {
        let (x, y) = self.design_values();
        self.map.across.holds(x) && self.map.up.holds(y)
    }

    /// The fastest mode known at the design point.
    pub(super) fn design_mode(&self) -> Option<&Mode> {
        if let Some(one) = &self.followed {
            return Some(&one.mode);
        }
        let both = [self.design_outside.fastest(), self.design.leading()];
        modes::fastest(both.into_iter().flatten())
    }

    /// What the map says of growth outside its window, in a sentence.
    pub(super) fn growth_outside(&self) -> String {
        if self.followed.is_some() {
            return "A map of one mode tells of no other, and of no growth outside the window."
                .to_owned();
        }
        let tally = self.map.tally();
        let known = (tally.outside, tally.open, tally.searched_to);
        growth_outside(&self.map.window, known, "is shown as well")
    }

    /// Each row as what `f` makes of its points.
    pub(super) fn rows<T>(&self, f: impl Fn(&Point) -> T) -> Vec<Vec<T>> {
        self.map
            .rows()
            .map(|row| row.iter().map(&f).collect())
            .collect()
    }

    /// Whether the mode followed was followed to each point, in or outside the window.
    pub(super) fn reached(&self) -> Option<Vec<Vec<bool>>> {
        let reached = self.followed?.over.reached.as_slice();
        let columns = self.map.across.points.max(1);
        Some(reached.chunks(columns).map(<[_]>::to_vec).collect())
    }

    fn unanswered(&self) -> Vec<Unanswered<'a>> {
        let told = |(across, up, point): (f64, f64, &'a Point)| {
            let (failed, subject, why) = match point {
                Point::Certified(_) => return None,
                Point::Doubtful { why, .. } => (false, None, &**why),
                Point::Failed(problem) => {
                    (true, Some(problem.subject.as_str()), problem.what.as_str())
                }
            };
            Some(Unanswered {
                across,
                up,
                failed,
                subject,
                why,
            })
        };
        self.map.placed().filter_map(told).collect()
    }

    /// As JSON.
    ///
    /// # Errors
    /// Where it has no form in JSON.
    pub fn json(&self) -> std::io::Result<String> {
        let map = self.map;
        let tally = map.tally();
        let (x, y) = self.design_values();
        let ((across_knob, across), (up_knob, up)) = (self.axis(map.across), self.axis(map.up));
        let leading = self.design.leading();
        let regions = self.regions;
        let columns = map.across.points.max(1);
        let excluded = self.followed.is_none() && tally.outside == 0 && tally.open == 0;
        let body = Body {
            finding: self.finding(),
            followed_mode: self.followed.map(|one| one.number),
            followed_to: self.reached(),
            across_knob,
            across_unit: across.si_unit(),
            across: map.across.values(),
            up_knob,
            up_unit: up.si_unit(),
            up: map.up.values(),
            largest_growth_per_s: self.rows(|p| p.leading().map(|m| m.growth())),
            frequency_hz_there: self.rows(|p| p.leading().map(|m| m.frequency())),
            complete: self.rows(Point::complete),
            growth_outside_window_per_s: self.rows(|p| p.outside().map(|m| m.growth())),
            leading_region: regions.of.chunks(columns).map(<[_]>::to_vec).collect(),
            leading_regions: regions.list.iter().map(Into::into).collect(),
            points: Counts {
                total: tally.points,
                complete: tally.complete,
                not_certified: tally.doubtful,
                failed: tally.failed,
                growing: tally.growing,
                growing_outside_window: tally.outside,
                growth_not_excluded: tally.open,
            },
            points_without_answer: self.unanswered(),
            events: events(map, self.followed.map(|one| one.over)),
            design_point: Design {
                across: x,
                up: y,
                inside: self.design_inside(),
                complete: self.design.complete(),
                growth_per_s: leading.map(|m| m.growth()),
                frequency_hz: leading.map(|m| m.frequency()),
                growth_outside_window_per_s: self.design_outside.fastest().map(|m| m.growth()),
            },
            window: (&map.window).into(),
            growth_excluded_beyond: excluded,
            growth_not_excluded_because: (!excluded).then(|| self.growth_outside()),
            growth_outside: self.growth_outside(),
        };
        Document::new("stillflame/map", &self.heading, body, self.warnings).to_json()
    }

    /// A line for each point, in SI.
    ///
    /// # Errors
    /// Where a row cannot be written.
    pub fn csv(&self) -> std::io::Result<Vec<u8>> {
        let reached = self.followed.map(|one| one.over.reached.as_slice());
        let named = |axis| {
            let (name, dimension): (&str, Dimension) = self.axis(axis);
            match dimension.si_unit() {
                "" => name.to_owned(),
                unit => format!("{name} [{unit}]"),
            }
        };
        let mut writer = csv::Writer::from_writer(Vec::new());
        let mut head = vec![named(self.map.across), named(self.map.up)];
        head.extend(
            [
                "largest_growth_per_s",
                "frequency_hz_there",
                "error_bound_per_s",
                "growth_outside_window_per_s",
                "complete",
                "failed",
            ]
            .map(str::to_owned),
        );
        head.extend(reached.map(|_| "followed_to".to_owned()));
        writer.write_record(head)?;
        let number = |x: Option<f64>| x.map_or(String::new(), |x| x.to_string());
        for (k, (x, y, point)) in self.map.placed().enumerate() {
            let mode = point.leading();
            let mut row = vec![
                x.to_string(),
                y.to_string(),
                number(mode.map(|m| m.growth())),
                number(mode.map(|m| m.frequency())),
                number(mode.map(|m| m.error_bound)),
                number(point.outside().map(|m| m.growth())),
                point.complete().to_string(),
                matches!(point, Point::Failed(_)).to_string(),
            ];
            row.extend(reached.map(|r| r.get(k).is_some_and(|r| *r).to_string()));
            writer.write_record(row)?;
        }
        writer
            .into_inner()
            .map_err(|e| std::io::Error::other(e.to_string()))
    }

    /// What the map shows, in a sentence.
    pub fn finding(&self) -> String {
        let tally = self.map.tally();
        let unknown = tally.points - tally.complete;
        if let Some(one) = &self.followed {
            let over = match tally.growing {
                0 => "grows nowhere on the map".to_owned(),
                n => format!("grows at {} of the points", percent(n, tally.points)),
            };
            return format!(
                "Mode {}, {} Hz and {} 1/s at the design point, {over}",
                one.number,
                write_decimals(one.mode.frequency(), 0),
                rate(one.mode.growth())
            );
        }
        let mut text = match (tally.growing, unknown) {
            (0, 0) => "No mode in the window grows on the map".to_owned(),
            (0, n) if n == tally.points => "No point of the map is certified".to_owned(),
            (0, _) => "No mode grows where the map is certified".to_owned(),
            (n, _) => format!("Unstable at {} of the points", percent(n, tally.points)),
        };
        for (count, what) in [
            (tally.doubtful, "not certified"),
            (tally.failed, "without a mean flow"),
        ] {
            if count > 0 && unknown < tally.points {
                text.push_str(&format!(", {} {what}", percent(count, tally.points)));
            }
        }
        text.push_str("; ");
        text.push_str(&self.design_words());
        text
    }

    /// What becomes of the design point.
    fn design_words(&self) -> String {
        if !self.design_inside() {
            return "the design point lies outside it".to_owned();
        }
        let certified = if self.design.complete() {
            ""
        } else {
            " (not certified)"
        };
        let Some(mode) = self.design_mode() else {
            return format!("the design point has no mode in the window{certified}");
        };
        let verb = match mode.tendency() {
            Tendency::Grows => "grows",
            Tendency::Neutral => "is neutral",
            Tendency::Decays => "decays",
        };
        format!(
            "the design point {verb} at {} 1/s and {} Hz{certified}",
            rate(mode.growth()),
            write_decimals(mode.frequency(), 0)
        )
    }

    /// For people.
    pub fn text(&self) -> String {
        let map = self.map;
        let tally = map.tally();
        let range = |axis: Axis| {
            let (name, dimension) = self.axis(axis);
            format!(
                "{name} from {} to {} at {} values",
                write_rounded(axis.low, dimension, 6),
                write_rounded(axis.high, dimension, 6),
                axis.points
            )
        };
        let mut text = format!(
            "{}\n{}.\n\nAcross  {}\nUp      {}\nModes in {} at each of {} points\n",
            self.heading.text(),
            self.finding(),
            range(map.across),
            range(map.up),
            window_text(&map.window),
            tally.points
        );
        text.push_str(&format!(
            "Certified complete: {}; not certified: {}; failed: {}\n",
            tally.complete, tally.doubtful, tally.failed
        ));
        if let Some((x, y, mode)) = tally.greatest {
            text.push_str(&format!(
                "Largest growth rate: {} 1/s at {} Hz, at {}\n",
                rate(mode.growth()),
                write_decimals(mode.frequency(), 1),
                place(self.network, (map.across.knob, x), (map.up.knob, y))
            ));
        }
        if let Some(one) = &self.followed {
            text.push_str(&self.cut_words(one));
        }
        let (x, y) = self.design_values();
        text.push_str(&format!(
            "Design point: {}, {}\n{}\n",
            setting(self.network, (map.across.knob, x)),
            setting(self.network, (map.up.knob, y)),
            self.growth_outside()
        ));
        text.push_str(&closing(self.warnings));
        text
    }
}

/// What is said of growth outside a window, in a sentence: the number of points where there is some, of those
/// where more is not excluded, and the least growth rate up to which those were searched.
pub(super) fn growth_outside(
    window: &Window,
    (outside, open, searched_to): (usize, usize, Option<f64>),
    seen: &str,
) -> String {
    let top = write_decimals(window.frequency.1, 0);
    match (open, searched_to) {
        (0, _) if outside == 0 => {
            format!("At each point growth outside the window is excluded up to {top} Hz, by proof.")
        }
        (0, _) => format!(
            "Growth outside the window {seen}; more of it up to {top} Hz is excluded at each point, by proof."
        ),
        (open, Some(to)) if to > window.growth.1 => format!(
            "Growth outside the window was searched up to {top} Hz and at least {} 1/s; beyond, \
             it is not excluded at {}.",
            write_decimals(to, 0),
            counted(open, "point")
        ),
        (open, _) => format!(
            "Growth outside the window is not excluded at {}.",
            counted(open, "point")
        ),
    }
}

/// `41 %`; what is neither nothing nor all is never said to be.
pub(super) fn percent(part: usize, whole: usize) -> String {
    percent_of(part as f64 / whole.max(1) as f64)
}

/// The same of a share.
pub(super) fn percent_of(share: f64) -> String {
    let exact = 100.0 * share;
    match exact {
        p if p > 0.0 && p < 1.0 => "less than 1 %".to_owned(),
        p if p > 99.0 && p < 100.0 => "more than 99 %".to_owned(),
        p => format!("{p:.0} %"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn percentages_do_not_round_to_nothing_or_all() {
        assert_eq!(percent(0, 7), "0 %");
        assert_eq!(percent(1, 40_000), "less than 1 %");
        assert_eq!(percent(39_999, 40_000), "more than 99 %");
        assert_eq!(percent(41, 100), "41 %");
        assert_eq!(percent(7, 7), "100 %");
    }
}
