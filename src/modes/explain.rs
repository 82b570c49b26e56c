//! What a mode is, in an engineer's words: where it lives, what it lives by, what drives it and what would
//! make it neutral.

use super::budget::{self, Budget};
use super::margins::{self, Margins, Nature};
use super::shapes::{self, Shape};
use super::{Mode, Solved};
use crate::elements::Kind;
use crate::network::{ElementId, Network};

/// One mode explained.
#[derive(Clone, Debug, PartialEq)]
pub struct Explained {
    /// Its shape; absent where it does not settle.
    pub shape: Option<Shape>,
    /// Where its growth comes from; absent where the shape is.
    pub budget: Option<Budget>,
    /// What makes it neutral.
    pub margins: Margins,
    /// What it lives by.
    pub nature: Nature,
}

/// Explains a mode.
pub fn explain(network: &Network, solved: &Solved, mode: &Mode) -> Explained {
    Explained {
        shape: shapes::along(network, solved, mode),
        budget: budget::budget(network, solved, mode),
        margins: margins::margins(solved, mode),
        nature: margins::nature(solved, mode),
    }
}

impl Explained {
    /// The element that holds the largest part of the acoustic energy, with that part.
    pub fn mostly_in(&self) -> Option<(ElementId, f64)> {
        let parts = &self.budget.as_ref()?.parts;
        let most = parts.iter().max_by(|a, b| a.energy.total_cmp(&b.energy))?;
        Some((most.element, most.energy))
    }

    /// In one word of the trade: `intrinsic`, `convective`, or, for a mode of the passages, `plenum` where most of
    /// its energy lies before the first flame and `chamber` where it lies behind; `acoustic` without a flame.
    pub fn label(&self, network: &Network) -> &'static str {
        match self.nature {
            Nature::Intrinsic => "intrinsic",
            Nature::Convective => "convective",
            Nature::Unclear => "unclear",
            Nature::Acoustic => {
                let mut elements = network.elements();
                let flame = elements.find(|(_, e)| matches!(e.kind, Kind::Flame(_)));
                let (Some((flame, _)), Some(budget)) = (flame, &self.budget) else {
                    return "acoustic";
                };
                let before = |p: &&budget::Part| p.element.0 < flame.0;
                let before: f64 = budget.parts.iter().filter(before).map(|p| p.energy).sum();
                if before > 0.5 { "plenum" } else { "chamber" }
            }
        }
    }
}
