//! The window of a search and what it is when a network does not state it.

use std::f64::consts::{PI, TAU};

use crate::elements::{Kind, Section};
use crate::meanflow::MeanFlow;
use crate::network::{FARTHEST, Network};
use crate::numerics::count::Rectangle;
use crate::problems::{Problem, Problems};

/// First zero of the derivative of the Bessel function `J_1`: the first cut-on of a round duct
/// (Abramowitz & Stegun 1964, table 9.5).
const FIRST_CUT_ON: f64 = 1.841_183_781_340_659;

/// Part of the lowest cut-on frequency the default window reaches.
const BELOW_CUT_ON: f64 = 0.9;

/// Growth rates of the default window (1/s).
const DEFAULT_GROWTH: (f64, f64) = (-500.0, 500.0);

/// A window in the plane of frequency and growth rate.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Window {
    /// Lowest and highest frequency (Hz).
    pub frequency: (f64, f64),
    /// Lowest and highest growth rate (1/s).
    pub growth: (f64, f64),
}

impl Window {
    /// The window in the plane of `s`.
    pub fn rectangle(&self) -> Rectangle {
        Rectangle {
            growth: self.growth,
            omega: (TAU * self.frequency.0, TAU * self.frequency.1),
        }
    }

    /// What the file states, completed: up to 0.9 of the lowest cut-on frequency, no farther than a
    /// window may be stated, and 500 1/s either way.
    ///
    /// # Errors
    /// Where the window is empty, or cannot be completed because no duct has a cut-on.
    pub fn of(network: &Network, mean: &MeanFlow<f64>) -> Result<Window, Problems> {
        let search = network.layout.search;
        let frequency = match search.frequency {
            Some(f) => f,
            None => {
                let lowest = cut_on(network, mean)
                    .into_iter()
                    .map(|(_, f)| f)
                    .reduce(f64::min);
                let Some(lowest) = lowest else {
                    return Err(Problem::error(
                        "search.frequency",
                        "no duct gives a cut-on frequency to set the window by",
                    )
                    .hint("state frequency = \"0 to 500 Hz\" under [search]")
                    .into());
                };
                (0.0, (BELOW_CUT_ON * lowest).min(FARTHEST))
            }
        };
        Ok(Window {
            frequency,
            growth: search.growth.unwrap_or(DEFAULT_GROWTH),
        })
    }
}

/// The lowest cut-on frequency (Hz) of each duct, `1.8412 c sqrt(1 - M^2)/(pi D)`, by name. A duct of
/// stated area is taken as round.
pub fn cut_on(network: &Network, mean: &MeanFlow<f64>) -> Vec<(String, f64)> {
    let mut all = Vec::new();
    for (id, element) in network.elements() {
        let Kind::Duct(duct) = &element.kind else {
            continue;
        };
        let Some(state) = network.layout.inlet(id).and_then(|s| mean.states.get(s.0)) else {
            continue;
        };
        let diameter = match duct.section {
            Section::Diameter(d) => network.values[d],
            Section::Area(a) => (4.0 * network.values[a] / PI).sqrt(),
        };
        let m = state.mach();
        let f = FIRST_CUT_ON * state.sound_speed() * (1.0 - m * m).sqrt() / (PI * diameter);
        all.push((element.name.clone(), f));
    }
    all
}
