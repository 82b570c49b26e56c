//! The text of the page: `page.md` with its blocks filled in from the program.
//!
//! A fenced block `knobs NAME` becomes a row for each knob of that table; its lines `KEY: TEXT` say
//! what the absence of a key without default means. A fenced block `units` becomes the table of units.

use std::fmt::Write;

use stillflame::elements::{
    GAS_KNOBS, area_change, duct,
    ends::{EXIT_KNOBS, FEED_KNOBS},
    flame, plenum, restriction,
};
use stillflame::knobs::{KnobSpec, Range};
use stillflame::units::{Dimension, write};

/// Every knob table by the name the page has for it.
pub const TABLES: &[(&str, &[KnobSpec])] = &[
    ("feed", FEED_KNOBS),
    ("gas", GAS_KNOBS),
    ("duct", duct::KNOBS),
    ("contraction", area_change::KNOBS),
    ("expansion", area_change::KNOBS),
    ("restriction", restriction::KNOBS),
    ("plenum", plenum::KNOBS),
    ("flame", flame::KNOBS),
    ("response", stillflame::flame::KNOBS),
    ("exit", EXIT_KNOBS),
    ("sensor", stillflame::network::sensors::KNOBS),
];

/// What the page shows where `page.md` leaves something out.
pub const UNTOLD: &str = "UNTOLD";

/// The whole page.
pub fn reference() -> String {
    let mut page = String::new();
    let mut lines = include_str!("page.md").lines();
    while let Some(line) = lines.next() {
        let fence = line.strip_prefix("```").unwrap_or_default();
        if fence != "units" && !fence.starts_with("knobs ") {
            page.push_str(line);
            page.push('\n');
            continue;
        }
        let absences: Vec<(&str, &str)> = lines
            .by_ref()
            .take_while(|l| *l != "```")
            .filter_map(|l| l.split_once(": "))
            .collect();
        match fence.strip_prefix("knobs ") {
            Some(name) => knobs(&mut page, name, &absences),
            None => units(&mut page),
        }
    }
    page
}

fn knobs(page: &mut String, name: &str, absences: &[(&str, &str)]) {
    page.push_str("| key | quantity | range | where absent | meaning |\n");
    page.push_str("| --- | --- | --- | --- | --- |\n");
    let table = TABLES.iter().find(|(known, _)| *known == name);
    for spec in table.map_or(&[][..], |(_, specs)| specs) {
        let stated = absences.iter().find(|(key, _)| *key == spec.key);
        let absent = match (spec.default, stated) {
            (Some(value), _) => format!("`{}`", write(value, spec.dimension)),
            (None, Some((_, text))) => (*text).to_owned(),
            (None, None) => UNTOLD.to_owned(),
        };
        let (quantity, range) = (quantity(spec.dimension), range(spec));
        let (key, doc) = (spec.key, spec.doc);
        let _ = writeln!(
            page,
            "| `{key}` | {quantity} | {range} | {absent} | {doc} |"
        );
    }
}

fn quantity(dimension: Dimension) -> String {
    match dimension {
        Dimension::Number => "plain number".to_owned(),
        other => format!("{}, `\"{}\"`", bare(other), other.example()),
    }
}

/// `length` for `a length`.
fn bare(dimension: Dimension) -> &'static str {
    let noun = dimension.noun();
    noun.split_once(' ').map_or(noun, |(_, n)| n)
}

fn range(spec: &KnobSpec) -> String {
    match spec.range {
        Range::Any => "any".to_owned(),
        Range::Positive => "above zero".to_owned(),
        Range::NotNegative => "zero or more".to_owned(),
        Range::Subsonic => "zero or more, below 1".to_owned(),
        Range::Above(bound) => format!("above {}", write(bound, spec.dimension)),
    }
}

fn units(page: &mut String) {
    page.push_str("| quantity | units, the SI unit first |\n| --- | --- |\n");
    for dimension in Dimension::ALL {
        let names: Vec<String> = dimension.unit_names().map(|n| format!("`{n}`")).collect();
        if !names.is_empty() {
            let _ = writeln!(page, "| {} | {} |", bare(dimension), names.join(", "));
        }
    }
}
