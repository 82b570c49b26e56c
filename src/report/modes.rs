//! A certified mode list.

use serde::Serialize;

use super::document::WindowFields;
use super::explain;
use super::shapes::{self, ShapeFields};
use super::table::{Lean, Table};
use super::{Document, Heading, closing, counted, csv_of, window_text};
use crate::modes::explain::Explained;
use crate::modes::shapes::Shape;
use crate::modes::{Mode, ModeList, Outside, Tendency, doubt_in_words};
use crate::network::Network;
use crate::numerics::count::Effort;
use crate::problems::Problem;
use crate::units::{write_decimals, write_signed};

/// A mode list to report.
#[derive(Clone, Copy, Debug)]
pub struct Modes<'a> {
    /// Of which network.
    pub heading: Heading<'a>,
    /// The network.
    pub network: &'a Network,
    /// The list.
    pub list: &'a ModeList,
    /// What grows outside its window.
    pub outside: &'a Outside,
    /// What explains each mode, in the order of the list.
    pub explained: &'a [Explained],
    /// Whether the shapes themselves are told, and not only their residuals.
    pub with_shapes: bool,
    /// Whether people are told what explains each mode.
    pub with_explanation: bool,
    /// What qualifies it.
    pub warnings: &'a [Problem],
}

/// One mode, in SI.
#[derive(Clone, Debug, Serialize)]
struct Row {
    frequency_hz: f64,
    growth_per_s: f64,
    error_bound_per_s: f64,
    cycle_increment: Option<f64>,
    damping_ratio: Option<f64>,
    half_power_width_hz: Option<f64>,
    multiplicity: u8,
    tendency: &'static str,
    residual: Option<f64>,
}

#[derive(Clone, Debug, Serialize)]
struct Entry<'a> {
    #[serde(flatten)]
    row: Row,
    #[serde(flatten)]
    explained: Option<explain::Fields<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    shape: Option<ShapeFields<'a>>,
}

#[derive(Clone, Debug, Serialize)]
struct EffortFields {
    evaluations: usize,
    bounds: usize,
    refinements: usize,
    retries: usize,
    fallbacks: usize,
}

impl From<&Effort> for EffortFields {
    fn from(e: &Effort) -> Self {
        EffortFields {
            evaluations: e.evaluations,
            bounds: e.bounds,
            refinements: e.refinements,
            retries: e.retries,
            fallbacks: e.fallbacks,
        }
    }
}

#[derive(Clone, Debug, Serialize)]
struct Body<'a> {
    complete: bool,
    expected: Option<usize>,
    found: usize,
    doubts: Vec<String>,
    window: WindowFields,
    modes: Vec<Entry<'a>>,
    effort: EffortFields,
    growth_excluded_beyond: bool,
    growth_not_excluded_because: Option<&'a str>,
    growth_searched_to_per_s: f64,
    outside_window: Vec<OutsideRow>,
}

/// A mode outside the window, in SI.
#[derive(Clone, Debug, Serialize)]
struct OutsideRow {
    frequency_hz: f64,
    growth_per_s: f64,
    error_bound_per_s: f64,
}

impl From<&Mode> for OutsideRow {
    fn from(mode: &Mode) -> Self {
        OutsideRow {
            frequency_hz: mode.frequency(),
            growth_per_s: mode.growth(),
            error_bound_per_s: mode.error_bound,
        }
    }
}

fn tendency(mode: &Mode) -> &'static str {
    match mode.tendency() {
        Tendency::Grows => "grows",
        Tendency::Neutral => "neutral",
        Tendency::Decays => "decays",
    }
}

impl Modes<'_> {
    fn shape(&self, index: usize) -> Option<&Shape> {
        self.explained.get(index)?.shape.as_ref()
    }

    fn rows(&self) -> impl Iterator<Item = Row> {
        self.list.modes.iter().enumerate().map(|(i, mode)| Row {
            frequency_hz: mode.frequency(),
            growth_per_s: mode.growth(),
            error_bound_per_s: mode.error_bound,
            cycle_increment: mode.cycle_increment(),
            damping_ratio: mode.damping_ratio(),
            half_power_width_hz: mode.half_power_width(),
            multiplicity: mode.multiplicity,
            tendency: tendency(mode),
            residual: self.shape(i).map(|s| s.residual).filter(|r| r.is_finite()),
        })
    }

    /// Modes found, each as often as it coincides.
    fn found(&self) -> usize {
        let weights = self.list.modes.iter().map(|m| usize::from(m.multiplicity));
        weights.sum()
    }

    /// Why growth outside the window is not excluded, where it is not. Without a count nothing is said of it.
    fn not_excluded(&self) -> Option<&str> {
        let uncounted = "no count was reached in the window itself";
        let uncounted = self.list.expected.is_none().then_some(uncounted);
        self.outside.reason.as_deref().or(uncounted)
    }

    /// As JSON.
    ///
    /// # Errors
    /// Where it has no form in JSON.
    pub fn json(&self) -> std::io::Result<String> {
        let told = |i: usize| self.shape(i).filter(|_| self.with_shapes);
        let entry = |(i, row)| Entry {
            row,
            explained: (self.explained.get(i)).map(|e| explain::Fields::new(self.network, e)),
            shape: told(i).map(|s| ShapeFields::new(self.network, s)),
        };
        let body = Body {
            complete: self.list.complete(),
            expected: self.list.expected,
            found: self.found(),
            doubts: self
                .list
                .doubts
                .iter()
                .map(|d| doubt_in_words(d).0)
                .collect(),
            window: (&self.list.window).into(),
            modes: self.rows().enumerate().map(entry).collect(),
            effort: (&self.list.effort).into(),
            growth_excluded_beyond: self.not_excluded().is_none(),
            growth_not_excluded_because: self.not_excluded(),
            growth_searched_to_per_s: self.outside.searched_to,
            outside_window: self.outside.modes().map(Into::into).collect(),
        };
        Document::new("stillflame/modes", &self.heading, body, self.warnings).to_json()
    }

    /// The modes as CSV, in SI.
    ///
    /// # Errors
    /// Where a row cannot be written.
    pub fn csv(&self) -> std::io::Result<Vec<u8>> {
        csv_of(self.rows())
    }

    /// Every shape as CSV, in SI.
    ///
    /// # Errors
    /// Where a row cannot be written.
    pub fn shapes_csv(&self) -> std::io::Result<Vec<u8>> {
        csv_of(shapes::csv_rows(self.network, self.list, self.explained))
    }

    /// For people.
    pub fn text(&self) -> String {
        let mut text = format!(
            "{}\nModes in {}\n\n",
            self.heading.text(),
            window_text(&self.list.window)
        );
        if !self.list.modes.is_empty() {
            text.push_str(&self.table());
            text.push('\n');
        }
        text.push_str(&self.verdict());
        if self.with_explanation {
            for (i, (mode, told)) in self.list.modes.iter().zip(self.explained).enumerate() {
                text.push_str(&explain::text(self.network, i, mode, told));
            }
        }
        if self.with_shapes {
            for (i, mode) in self.list.modes.iter().enumerate() {
                text.push_str(&shapes::text(self.network, i, mode, self.shape(i)));
            }
        }
        text.push_str(&closing(self.warnings));
        text
    }

    fn table(&self) -> String {
        use Lean::{Left, Right};
        let mut table = Table::new(&[Right, Right, Right, Left, Right, Right, Right, Right, Left]);
        table.heading(&[
            "mode",
            "frequency",
            "growth rate",
            "",
            "error bound",
            "cycle",
            "damping",
            "multi-",
            "label",
        ]);
        table.heading(&[
            "",
            "Hz",
            "1/s",
            "",
            "1/s",
            "increment",
            "ratio",
            "plicity",
            "",
        ]);
        let some = |x: Option<f64>, digits: usize| match x {
            Some(x) => write_decimals(x, digits),
            None => "none".to_owned(),
        };
        for (i, row) in self.rows().enumerate() {
            table.row(vec![
                format!("{}", i + 1),
                write_decimals(row.frequency_hz, 3),
                write_decimals(row.growth_per_s, 3),
                row.tendency.to_owned(),
                format!("{:.0e}", row.error_bound_per_s),
                some(row.cycle_increment, 4),
                some(row.damping_ratio, 4),
                format!("{}", row.multiplicity),
                (self.explained.get(i))
                    .map_or("", |e| e.label(self.network))
                    .to_owned(),
            ]);
        }
        table.text()
    }

    /// What the list proves, in words.
    fn verdict(&self) -> String {
        let list = self.list;
        let found = self.found();
        let mut text = match (list.complete(), list.expected) {
            (true, Some(n)) => format!(
                "Complete: the argument principle counts {} in the window, {found} found.\n",
                counted(n, "mode")
            ),
            (_, Some(n)) => format!(
                "NOT PROVED COMPLETE: {} expected in the window, {found} found.\n",
                counted(n, "mode")
            ),
            (_, None) => {
                format!("NOT PROVED COMPLETE: no count was reached; {found} found.\n")
            }
        };
        for doubt in &list.doubts {
            text.push_str(&format!("  {}\n", doubt_in_words(doubt).0));
        }
        let growing = list
            .modes
            .iter()
            .filter(|m| m.tendency() == Tendency::Grows)
            .count();
        text.push_str(&match (growing, list.leading()) {
            (0, None) => "No mode was found in the window.\n".to_owned(),
            (0, Some(m)) => format!(
                "No mode found in the window grows; the slowest to decay: {} 1/s at {} Hz.\n",
                write_decimals(m.growth(), 3),
                write_decimals(m.frequency(), 2)
            ),
            (n, Some(m)) => format!(
                "{} grow{}; the fastest: {} 1/s at {} Hz.\n",
                counted(n, "mode"),
                if n == 1 { "s" } else { "" },
                write_signed(m.growth(), 3),
                write_decimals(m.frequency(), 2)
            ),
            (n, None) => format!("{} grow.\n", counted(n, "mode")),
        });
        let top = write_decimals(list.window.frequency.1, 0);
        let searched = self.outside.complete && self.outside.reason.is_some();
        text.push_str(&match self.not_excluded() {
            None => format!("Growth outside the window is excluded up to {top} Hz, by proof.\n"),
            Some(reason) if self.outside.fastest().is_some() || !searched => {
                format!("Growth outside the window is NOT EXCLUDED: {reason}.\n")
            }
            Some(reason) => format!(
                "No growth outside the window up to {top} Hz and {} 1/s; faster growth is NOT EXCLUDED: \
                 {reason}.\n",
                write_decimals(self.outside.searched_to, 0)
            ),
        });
        let e = &list.effort;
        text.push_str(&format!(
            "Effort: {} evaluations, {} bounds, {} refinements, {} retries, {} fallbacks.\n",
            e.evaluations, e.bounds, e.refinements, e.retries, e.fallbacks
        ));
        text
    }
}
