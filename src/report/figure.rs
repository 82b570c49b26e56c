//! A stability map as a figure: units for its axes and words for its labels.

use super::map::MapReport;
use super::map_events::NOT_FOLLOWED;
use super::{CAUTION, rate, window_text};
use crate::draw::patches::Patches;
use crate::draw::{
    Axis, Cuts, DesignPoint, DrawError, IsoLines, Quantity, Seam, StabilityMap, Words, map,
};
use crate::modes::{Mode, Tendency};
use crate::studies::branch::Cut;
use crate::studies::map::{Axis as Values, Point};
use crate::studies::regions::Region;
use crate::units::{self, Dimension, write_decimals, write_rounded};

/// The unit an engineer writes a quantity of that size in, and its size in SI.
pub(super) fn engineers_unit(dimension: Dimension, largest: f64) -> (String, f64) {
    let text = write_rounded(largest, dimension, 6);
    let unit = text.split_once(' ').map_or("", |(_, unit)| unit);
    match units::parse(&format!("1 {unit}"), dimension) {
        Ok(size) if !unit.is_empty() => (unit.to_owned(), size),
        _ => (dimension.si_unit().to_owned(), 1.0),
    }
}

/// `main_flame.delay` as `Delay of main_flame`.
pub(super) fn label(name: &str) -> String {
    let (element, key) = name.rsplit_once('.').unwrap_or(("", name));
    let words = key.replace('_', " ");
    let mut letters = words.chars();
    let capital: String = letters
        .next()
        .into_iter()
        .flat_map(char::to_uppercase)
        .chain(letters)
        .collect();
    if element.is_empty() {
        capital
    } else {
        format!("{capital} of {element}")
    }
}

/// A growth rate as it is drawn: a neutral mode has none, where rounding would scatter signs along an edge.
fn drawn(mode: &Mode) -> f64 {
    match mode.tendency() {
        Tendency::Neutral => 0.0,
        Tendency::Grows | Tendency::Decays => mode.growth(),
    }
}

struct Scaled {
    axis: Axis,
    values: Vec<f64>,
    size: f64,
}

impl MapReport<'_> {
    fn scaled(&self, values: Values) -> Scaled {
        let (name, dimension) = self.axis(values);
        let largest = values.low.abs().max(values.high.abs());
        let (unit, size) = engineers_unit(dimension, largest);
        Scaled {
            axis: Axis::new(label(name), unit),
            values: values.values().into_iter().map(|v| v / size).collect(),
            size,
        }
    }

    /// Which mode leads where.
    fn patches(&self) -> Patches {
        let regions = self.regions;
        let columns = self.map.across.points.max(1);
        let name = |r: &Region| {
            let (low, high) = r.frequency;
            let (low, high) = (write_decimals(low, 0), write_decimals(high, 0));
            if low == high {
                format!("{low} Hz")
            } else {
                format!("{low} to {high} Hz")
            }
        };
        Patches {
            caption: "another mode leads".into(),
            index: regions.of.chunks(columns).map(<[_]>::to_vec).collect(),
            names: regions.list.iter().map(name).collect(),
        }
    }

    /// The rows between whose samples a cut passes, on a side with something shown.
    fn rows_beside(&self, cut: &Cut) -> Vec<usize> {
        let columns = self.map.across.points;
        let known = |i: usize, j: usize| {
            let point = self.map.points.get(j * columns + i);
            i < columns && point.is_some_and(|p| p.leading().is_some())
        };
        let (low, high) = (cut.from.1.max(0.0), cut.to.1.max(0.0));
        ((low.floor() as usize)..=(high.ceil() as usize))
            .filter(|j| known(cut.column, *j) || known(cut.column + 1, *j))
            .collect()
    }

    /// The pieces of a cut with something shown beside them.
    fn shown(&self, cut: &Cut) -> Vec<Seam> {
        let ((u0, v0), (u1, v1)) = (cut.from, cut.to);
        let at = |v: f64| {
            let share = if v1 > v0 { (v - v0) / (v1 - v0) } else { 0.0 };
            (u0 + share * (u1 - u0), v)
        };
        let piece = |run: &[usize]| {
            // A sample is drawn half a step about its place.
            let low = *run.first()? as f64 - 0.5;
            let high = *run.last()? as f64 + 0.5;
            (low < v1 && high > v0).then(|| Seam {
                column: cut.column,
                from: if low > v0 { at(low) } else { cut.from },
                to: if high < v1 { at(high) } else { cut.to },
            })
        };
        let rows = self.rows_beside(cut);
        let runs = rows.chunk_by(|a, b| a + 1 == *b);
        runs.filter_map(piece).collect()
    }

    /// Where the mode followed meets others, and the cut from there, as far as it is shown on either side.
    fn cuts(&self) -> Cuts {
        let Some(one) = &self.followed else {
            return Cuts::default();
        };
        let seams: Vec<Seam> = (one.over.cuts.iter())
            .flat_map(|cut| self.shown(cut))
            .collect();
        let ends = |at: &(f64, f64)| seams.iter().any(|c| [c.from, c.to].contains(at));
        let beside = |at: (f64, f64)| {
            let place = Cut {
                column: at.0.max(0.0).floor() as usize,
                from: at,
                to: at,
            };
            !self.rows_beside(&place).is_empty()
        };
        let points = one.over.exceptional.iter().map(|p| p.at);
        let points = points.filter(|at| ends(at) || beside(*at)).collect();
        Cuts {
            caption: "cut: not one mode across".into(),
            point_caption: "meets another mode".into(),
            seams,
            points,
        }
    }

    /// The map as SVG.
    ///
    /// # Errors
    /// Where the figure cannot be drawn.
    pub fn svg(&self) -> Result<String, DrawError> {
        let (x, y) = (self.scaled(self.map.across), self.scaled(self.map.up));
        let tally = self.map.tally();
        let columns = self.map.across.points.max(1);
        let certified = match (tally.doubtful, tally.failed) {
            (0, 0) => "every list proved complete".to_owned(),
            (n, 0) => format!("{n} not certified"),
            (0, m) => format!("{m} without a mean flow"),
            (n, m) => format!("{n} not certified, {m} without a mean flow"),
        };
        let subtitle = format!(
            "{}; {} \u{d7} {} networks, {certified}",
            self.heading.title, self.map.across.points, self.map.up.points
        );
        let footnote = match &self.followed {
            None => format!(
                "Largest growth rate of the modes in {}. {} {}{CAUTION}",
                window_text(&self.map.window),
                self.growth_outside(),
                match self.beyond.iter().any(Option::is_some) {
                    true =>
                        "Beside ground without a mode in the window the neutral curve is placed by the mode that grows, \
                         followed out of the window. ",
                    false => "",
                }
            ),
            Some(one) => format!(
                "Growth rate of mode {} of the design point, followed first along the horizontal axis, then along the vertical \
                 one{}. {}Other modes may grow. {CAUTION}",
                one.number,
                match one.over.cuts.len() {
                    0 => "",
                    _ => "; by another way it is another mode beyond a cut",
                },
                match one.over.reached.iter().all(|r| *r) {
                    true => String::new(),
                    false => format!("{NOT_FOLLOWED}. "),
                }
            ),
        };
        let (design_x, design_y) = self.design_values();
        let design = match self.design_mode() {
            Some(mode) => format!("design, {} 1/s", rate(mode.growth())),
            None => "design".to_owned(),
        };
        map::render(&StabilityMap {
            title: self.finding(),
            subtitle,
            footnote,
            x_values: x.values,
            y_values: y.values,
            quantity: Quantity {
                label: match self.followed {
                    None => "Largest growth rate".into(),
                    Some(_) => "Growth rate of the mode".into(),
                },
                unit: "1/s".into(),
                above: "grows".into(),
                below: "decays".into(),
            },
            values: self.rows(|p| p.fastest().map(|m| drawn(&m))),
            beyond: self.beyond.chunks(columns).map(<[_]>::to_vec).collect(),
            certified: self.rows(Point::complete),
            reached: self.reached().unwrap_or_default(),
            frequency: self.followed.map(|_| IsoLines {
                label: "Frequency".into(),
                unit: "Hz".into(),
                values: self.rows(|p| p.leading().map(|m| m.frequency())),
            }),
            patches: self.followed.is_none().then(|| self.patches()),
            cuts: self.cuts(),
            design_point: self.design_inside().then(|| DesignPoint {
                x: design_x / x.size,
                y: design_y / y.size,
                label: design,
            }),
            words: Words {
                uncertified: match (tally.doubtful, tally.failed) {
                    (_, 0) => "not certified".into(),
                    (0, _) => "no mean flow".into(),
                    _ => "not certified, or no mean flow".into(),
                },
                absent: match self.followed {
                    None => Words::default().absent,
                    Some(_) => "outside the window".into(),
                },
                unreached: "not followed so far".into(),
                ..Words::default()
            },
            x: x.axis,
            y: y.axis,
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn axes_are_in_the_units_of_the_trade() {
        let unit = |d, x| engineers_unit(d, x);
        assert_eq!(unit(Dimension::Time, 0.01), ("ms".to_owned(), 1e-3));
        assert_eq!(unit(Dimension::Length, 0.9), ("mm".to_owned(), 1e-3));
        assert_eq!(unit(Dimension::MassFlow, 0.06), ("g/s".to_owned(), 1e-3));
        assert_eq!(unit(Dimension::Pressure, 8e5), ("kPa".to_owned(), 1e3));
        assert_eq!(unit(Dimension::Temperature, 1900.0), ("K".to_owned(), 1.0));
        assert_eq!(unit(Dimension::Number, 2.0), (String::new(), 1.0));
        let (degrees, size) = unit(Dimension::Angle, 1.0);
        assert_eq!(degrees, "deg");
        assert!((size - 1f64.to_radians()).abs() < 1e-15);
        assert_eq!(
            label("main_flame.interaction_index"),
            "Interaction index of main_flame"
        );
        assert_eq!(label("chamber"), "Chamber");
    }
}
