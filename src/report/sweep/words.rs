//! A sweep in words: its finding, its branches and its events.

use super::{IN_WORDS, SweepReport, edge};
use crate::modes::Tendency;
use crate::report::map::percent;
use crate::report::table::{Lean, Table};
use crate::report::{band, closing, counted, rate, window_text};
use crate::studies::path::{Parameter, Spacing};
use crate::studies::sweep::{Event, Kind, State};
use crate::units::{Dimension, write_decimals, write_rounded};

/// What happens at an event, for people.
fn happens(event: &Event) -> String {
    let through = event.edge.map_or(String::new(), |e| {
        let edge = edge(e).replace('_', " ");
        format!(
            " through the {edge}{}",
            if edge.ends_with('h') { " rate" } else { "" }
        )
    });
    let other = event.branches.get(1).map_or(0, |b| b + 1);
    match event.kind {
        Kind::Enters => format!("enters the window{through}"),
        Kind::Leaves => format!("leaves the window{through}"),
        Kind::ExceptionalPoint => format!(
            "meets branch {other} at an exceptional point: which is which beyond is a convention"
        ),
        Kind::Crossing => format!("passes through branch {other}, each going on as it came"),
        Kind::BecomesReal => {
            format!(
                "meets its conjugate and parts as two modes that do not oscillate, itself and {other}"
            )
        }
        Kind::BecomesOscillating => {
            format!("meets branch {other}, which ends; it oscillates from here")
        }
        Kind::BecomesUnstable => "becomes unstable".to_owned(),
        Kind::BecomesStable => "becomes stable".to_owned(),
        Kind::Found => "begins: not to be followed from before".to_owned(),
        Kind::Lost => "ends: not to be followed further".to_owned(),
    }
}

impl SweepReport<'_> {
    /// What the sweep shows, in a sentence.
    pub fn finding(&self) -> String {
        let sweep = self.sweep;
        let (complete, not_certified, failed) = sweep.tally();
        let stretches = &sweep.unstable;
        let length: f64 = stretches.iter().map(|(a, b)| b - a).sum();
        let band = band(&sweep.window);
        let unstable = match sweep.taken_for_unstable.is_empty() {
            true => "Unstable",
            false => "Unstable or unknown",
        };
        let mut text = match stretches.as_slice() {
            _ if complete == 0 => "No point of the sweep is certified".to_owned(),
            [] if complete == sweep.points.len() && !sweep.unresolved.is_empty() => {
                format!("No mode in {band} grows at the points of the sweep")
            }
            [] if complete == sweep.points.len() => {
                format!("No mode in {band} grows on the sweep")
            }
            [] => format!("No mode in {band} grows where the sweep is certified"),
            [(a, b)] if *a <= 0.0 && *b >= 1.0 => {
                format!("{unstable} over the whole sweep in {band}")
            }
            few if few.len() <= 3 => {
                let parts: Vec<String> = few.iter().map(|s| self.stretch(*s)).collect();
                let of_what = match self.of_what() {
                    what if what.is_empty() => what,
                    what => format!("for {what}"),
                };
                format!("{unstable} {of_what}{}, in {band}", joined(&parts))
            }
            many => format!(
                "{unstable} over {:.0} % of the sweep, in {} stretches, in {band}",
                100.0 * length,
                many.len()
            ),
        };
        if let Some(fastest) = sweep.fastest.filter(|_| !stretches.is_empty()) {
            let frequency = fastest.s.im / std::f64::consts::TAU;
            // The band told is the window's; growth below it counts as well.
            let below = match frequency < sweep.window.frequency.0 {
                true => ", below that,",
                false => "",
            };
            let known = match sweep.unresolved.is_empty() {
                true => "",
                false => " known",
            };
            text.push_str(&format!(
                "; fastest{known} {} 1/s and {} Hz{below} at {}{}",
                rate(fastest.s.re),
                write_decimals(frequency, 0),
                self.of_what(),
                self.told(fastest.u, 3)
            ));
        }
        if let Some(part) = self.unfollowed() {
            text.push_str(&format!("; modes not followed {part}"));
        }
        let unknown = not_certified + failed;
        if unknown > 0 && complete > 0 {
            let share = percent(unknown, sweep.points.len());
            let what = match (not_certified, failed) {
                (_, 0) => "not certified",
                (0, _) => "without an answer",
                _ => "not certified or without an answer",
            };
            text.push_str(&format!("; {share} of the points {what}"));
        }
        // Points without an answer are told of already.
        let answered = sweep.points.iter();
        let answered = answered.filter(|p| !matches!(p.state, State::Failed(_)));
        let open = answered.filter(|p| !p.outside.excluded);
        if let Some(growth) = open.map(|p| p.outside.searched_to).reduce(f64::min) {
            let growth = write_decimals(growth, 0);
            text.push_str(&format!("; growth above {growth} 1/s not excluded"));
        }
        text
    }

    /// `interaction index `; nothing where the unit says what is meant.
    fn of_what(&self) -> String {
        let (name, dimension) = self.parameter();
        if dimension != Dimension::Number {
            return String::new();
        }
        let key = name.rsplit('.').next().unwrap_or(name);
        format!("{} ", key.replace('_', " "))
    }

    /// `from 2.31 ms to 4 ms`, `up to 4 ms`, `from 2.31 ms on`.
    pub(super) fn stretch(&self, (a, b): (f64, f64)) -> String {
        match (a <= 0.0, b >= 1.0) {
            _ if a == b => format!("at {}", self.told(a, 3)),
            (true, _) => format!("up to {}", self.told(b, 3)),
            (_, true) => format!("from {} on", self.told(a, 3)),
            _ => format!("from {} to {}", self.told(a, 3), self.told(b, 3)),
        }
    }

    /// For people.
    pub fn text(&self) -> String {
        let sweep = self.sweep;
        let (complete, not_certified, failed) = sweep.tally();
        let mut text = format!("{}\n{}.\n\n", self.heading.text(), self.finding());
        let steps = match (sweep.points.len().saturating_sub(1), sweep.path.spacing) {
            (1, _) => "1 step".to_owned(),
            (n, Spacing::Linear) => format!("{n} equal steps"),
            (n, Spacing::Geometric) => format!("{n} equal ratios"),
        };
        let mut label = "Sweep  ";
        if sweep.path.parameter == Parameter::Factor {
            let (from, to) = (self.told(0.0, 6), self.told(1.0, 6));
            text.push_str(&format!("{label} factor from {from} to {to} in {steps}\n"));
            label = "       ";
        }
        for (name, dimension, from, to) in self.knobs() {
            let (from, to) = (
                write_rounded(from, dimension, 6),
                write_rounded(to, dimension, 6),
            );
            text.push_str(&format!("{label} {name} from {from} to {to}"));
            if label == "Sweep  " {
                text.push_str(&format!(" in {steps}"));
            }
            text.push('\n');
            label = "       ";
        }
        let between = match sweep.between {
            0 => String::new(),
            n => format!(" and at {} put in between", counted(n, "point")),
        };
        text.push_str(&format!(
            "Modes in {} at each of {} points{between}\nCertified complete: {complete}; not certified: \
             {not_certified}; failed: {failed}\n",
            window_text(&sweep.window),
            sweep.points.len()
        ));
        if !sweep.branches.is_empty() {
            text.push_str(&format!("\n{}", self.branch_table()));
        }
        if !sweep.events.is_empty() {
            text.push_str(&format!("\n{}", self.event_table()));
        }
        text.push_str(&format!(
            "\n{}{}\n",
            self.design_words(),
            self.growth_outside(IN_WORDS)
        ));
        text.push_str(&closing(self.warnings));
        text
    }

    fn branch_table(&self) -> String {
        use Lean::Right;
        let mut table = Table::new(&[Right; 9]);
        table.heading(&[
            "branch",
            "from",
            "to",
            "frequency",
            "to",
            "largest",
            "at",
            "frequency",
            "unstable",
        ]);
        table.heading(&[
            "",
            "",
            "",
            "Hz",
            "Hz",
            "growth 1/s",
            "",
            "there, Hz",
            "from",
        ]);
        for (i, branch) in self.sweep.branches.iter().enumerate() {
            let (Some(first), Some(last), Some(greatest)) =
                (branch.trace.first(), branch.trace.last(), branch.greatest())
            else {
                continue;
            };
            let hz = |s: num_complex::Complex64| s.im / std::f64::consts::TAU;
            let frequencies = || branch.trace.iter().map(|p| hz(p.s));
            let mut neutral = self.sweep.neutral(Some(i));
            let unstable = match neutral.find(|e| e.kind == Kind::BecomesUnstable) {
                _ if first.tendency() == Tendency::Grows => self.told(first.u, 5),
                Some(event) => self.told(event.u, 5),
                None => "never".to_owned(),
            };
            table.row(vec![
                (i + 1).to_string(),
                self.told(first.u, 5),
                self.told(last.u, 5),
                write_decimals(frequencies().fold(f64::INFINITY, f64::min), 2),
                write_decimals(frequencies().fold(0.0, f64::max), 2),
                write_decimals(greatest.s.re, 3),
                self.told(greatest.u, 5),
                write_decimals(hz(greatest.s), 2),
                unstable,
            ]);
        }
        table.text()
    }

    fn event_table(&self) -> String {
        use Lean::{Left, Right};
        let mut table = Table::new(&[Right, Right, Right, Right, Left]);
        table.heading(&["at", "branch", "frequency", "growth rate", "what happens"]);
        table.heading(&["", "", "Hz", "1/s", ""]);
        for event in &self.sweep.events {
            let branch = event.branches.first().map_or(0, |b| b + 1);
            table.row(vec![
                self.told(event.u, 6),
                branch.to_string(),
                write_decimals(event.s.im / std::f64::consts::TAU, 3),
                write_decimals(event.s.re, 3),
                happens(event),
            ]);
        }
        table.text()
    }

    fn design_words(&self) -> String {
        let Some(u) = self.design_at() else {
            return "The network as its file states it does not lie on the sweep.\n".to_owned();
        };
        let band = band(&self.sweep.window);
        let mode = match self.design.leading() {
            None if self.design.complete() => {
                format!("no mode in {}", window_text(&self.sweep.window))
            }
            None => format!(
                "no mode was found in {}, and the list is not certified",
                window_text(&self.sweep.window)
            ),
            Some(m) => format!(
                "the leading mode in {band} {} at {} 1/s and {} Hz",
                match m.tendency() {
                    Tendency::Grows => "grows",
                    Tendency::Neutral => "is neutral",
                    Tendency::Decays => "decays",
                },
                rate(m.growth()),
                write_decimals(m.frequency(), 1)
            ),
        };
        let outside = self.design_growing_outside().map_or(String::new(), |m| {
            format!(
                "; outside, a mode grows at {} 1/s and {} Hz",
                rate(m.growth()),
                write_decimals(m.frequency(), 1)
            )
        });
        format!("Design point at {}: {mode}{outside}.\n", self.told(u, 5))
    }
}

/// `a, b and c`.
pub(super) fn joined(parts: &[String]) -> String {
    match parts {
        [] => String::new(),
        [one] => one.clone(),
        [most @ .., last] => format!("{} and {last}", most.join(", ")),
    }
}
