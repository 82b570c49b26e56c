//! Modes explained: growth budget, energy, margins.

use serde::Serialize;

use super::table::{Lean, Table};
use crate::modes::Mode;
use crate::modes::budget::Part;
use crate::modes::explain::Explained;
use crate::network::{ElementId, Network};
use crate::units::{write_decimals, write_signed};

/// One element's part, in SI.
#[derive(Clone, Debug, Serialize)]
struct PartFields<'a> {
    element: &'a str,
    growth_per_s: f64,
    by_flow_per_s: f64,
    by_entropy_per_s: f64,
    by_heat_per_s: f64,
    energy_share: f64,
}

/// What explains a mode, in SI.
#[derive(Clone, Debug, Serialize)]
pub(super) struct Fields<'a> {
    label: &'static str,
    mostly_in: Option<&'a str>,
    gain_margin: Option<f64>,
    delay_margin_s: Option<f64>,
    budget: Option<Vec<PartFields<'a>>>,
}

impl<'a> Fields<'a> {
    pub fn new(network: &'a Network, told: &Explained) -> Self {
        let part = |p: &Part| PartFields {
            element: name(network, p.element),
            growth_per_s: p.growth(),
            by_flow_per_s: p.flow,
            by_entropy_per_s: p.entropy,
            by_heat_per_s: p.heat,
            energy_share: p.energy,
        };
        let budget = told.budget.as_ref();
        Fields {
            label: told.label(network),
            mostly_in: told.mostly_in().map(|(e, _)| name(network, e)),
            gain_margin: told.margins.gain,
            delay_margin_s: told.margins.delay,
            budget: budget.map(|b| b.parts.iter().map(part).collect()),
        }
    }
}

fn name(network: &Network, id: ElementId) -> &str {
    let element = network.layout.elements.get(id.0);
    element.map_or("", |e| e.name.as_str())
}

/// Below this part of the largest, a row of the budget is left out of the table for people.
const TELLING: f64 = 5e-4;

/// For people; `number` counts from zero.
pub(super) fn text(network: &Network, number: usize, mode: &Mode, told: &Explained) -> String {
    let mut text = format!(
        "\nMode {}, {} Hz, {} 1/s: {}",
        number + 1,
        write_decimals(mode.frequency(), 2),
        write_signed(mode.growth(), 3),
        told.label(network)
    );
    if let Some((element, share)) = told.mostly_in() {
        let name = name(network, element);
        text.push_str(&format!(", {:.0} % of its energy in {name}", 100.0 * share));
    }
    text.push_str(".\n");
    text.push_str(&match (mode.half_power_width(), told.margins.gain) {
        (Some(w), Some(k)) => {
            format!("  Width at half power {w:.2} Hz. Neutral with all gains times {k:.4}")
        }
        (Some(w), None) => format!(
            "  Width at half power {w:.2} Hz. No factor on all gains up to 10 makes it neutral"
        ),
        (None, Some(k)) => format!("  Neutral with all gains times {k:.4}"),
        (None, None) => "  No factor on all gains down to a thousandth makes it neutral".to_owned(),
    });
    text.push_str(&match told.margins.delay {
        Some(t) => format!(
            "; with all delays changed by {} ms.\n",
            write_signed(1e3 * t, 4)
        ),
        None => "; no change of all delays within half a period does.\n".to_owned(),
    });
    if let Some(budget) = &told.budget {
        text.push('\n');
        text.push_str(&table(network, &budget.parts));
    }
    text
}

fn table(network: &Network, parts: &[Part]) -> String {
    use Lean::{Left, Right};
    let mut table = Table::new(&[Left, Right, Right, Right, Right, Right]);
    table.heading(&[
        "element",
        "growth",
        "by flow",
        "by entropy",
        "by heat",
        "energy",
    ]);
    table.heading(&["", "1/s", "1/s", "1/s", "1/s", "%"]);
    let largest = parts.iter().map(|p| p.growth().abs()).fold(0.0, f64::max);
    let signed = |x: f64| {
        if x.abs() < 5e-4 {
            "0".to_owned()
        } else {
            write_signed(x, 3)
        }
    };
    for p in parts {
        if p.growth().abs() < TELLING * largest && p.energy < TELLING {
            continue;
        }
        table.row(vec![
            name(network, p.element).to_owned(),
            signed(p.growth()),
            signed(p.flow),
            signed(p.entropy),
            signed(p.heat),
            format!("{:.1}", 100.0 * p.energy),
        ]);
    }
    let sum: f64 = parts.iter().map(Part::growth).sum();
    let of = |f: fn(&Part) -> f64| signed(parts.iter().map(f).sum());
    table.row(vec![
        "sum".to_owned(),
        write_signed(sum, 3),
        of(|p| p.flow),
        of(|p| p.entropy),
        of(|p| p.heat),
        "100.0".to_owned(),
    ]);
    table.text()
}
