//! The mean flow at every station.

use serde::Serialize;

use super::table::{Lean, Table};
use super::{Document, Heading, closing, csv_of};
use crate::elements::Kind;
use crate::elements::ends::{Exit, ExitEnd};
use crate::gas::State;
use crate::meanflow::MeanFlow;
use crate::network::Network;
use crate::problems::Problem;
use crate::units::{Dimension, write_decimals, write_rounded};

/// One end of an element, in SI.
#[derive(Clone, Debug, Serialize)]
struct Station<'a> {
    element: &'a str,
    side: &'static str,
    pressure_pa: f64,
    temperature_k: f64,
    velocity_m_s: f64,
    mach: f64,
    sound_speed_m_s: f64,
    density_kg_m3: f64,
    area_m2: f64,
}

#[derive(Clone, Debug, Serialize)]
struct Heat<'a> {
    element: &'a str,
    power_w: f64,
}

#[derive(Clone, Debug, Serialize)]
struct Body<'a> {
    stations: &'a [Station<'a>],
    mass_flow_kg_s: Option<f64>,
    heat_release: Vec<Heat<'a>>,
    throat_area_m2: Option<f64>,
}

/// A mean flow to report.
#[derive(Clone, Copy, Debug)]
pub struct Flow<'a> {
    /// Of which network.
    pub heading: Heading<'a>,
    /// The network.
    pub network: &'a Network,
    /// Its mean flow.
    pub mean: &'a MeanFlow<f64>,
    /// What qualifies it.
    pub warnings: &'a [Problem],
}

impl Flow<'_> {
    /// The inlet and the outlet of every element, in flow order.
    fn stations(&self) -> Vec<Station<'_>> {
        let layout = &self.network.layout;
        let mut all = Vec::new();
        for (id, element) in self.network.elements() {
            for (side, station) in [("in", layout.inlet(id)), ("out", layout.outlet(id))] {
                if let Some(state) = station.and_then(|s| self.mean.state(s)) {
                    all.push(at(&element.name, side, state));
                }
            }
        }
        all
    }

    fn heat(&self) -> Vec<Heat<'_>> {
        let powers = self.network.layout.elements.iter();
        powers
            .zip(&self.mean.heat_release)
            .filter_map(|(element, power)| {
                Some(Heat {
                    element: &element.name,
                    power_w: (*power)?,
                })
            })
            .collect()
    }

    fn mass_flow(&self) -> Option<f64> {
        self.mean.states.first().map(State::mass_flow)
    }

    /// As JSON.
    ///
    /// # Errors
    /// Where it has no form in JSON.
    pub fn json(&self) -> std::io::Result<String> {
        let body = Body {
            stations: &self.stations(),
            mass_flow_kg_s: self.mass_flow(),
            heat_release: self.heat(),
            throat_area_m2: self.mean.throat_area,
        };
        Document::new("stillflame/flow", &self.heading, body, self.warnings).to_json()
    }

    /// The stations as CSV, in SI.
    ///
    /// # Errors
    /// Where a row cannot be written.
    pub fn csv(&self) -> std::io::Result<Vec<u8>> {
        csv_of(self.stations())
    }

    /// For people.
    pub fn text(&self) -> String {
        use Lean::{Left, Right};
        let mut table = Table::new(&[Left, Left, Right, Right, Right, Right, Right, Right, Right]);
        table.heading(&[
            "element",
            "side",
            "pressure",
            "temperature",
            "velocity",
            "Mach",
            "sound speed",
            "density",
            "area",
        ]);
        table.heading(&["", "", "kPa", "K", "m/s", "", "m/s", "kg/m^3", "cm^2"]);
        for s in self.stations() {
            table.row(vec![
                s.element.to_owned(),
                s.side.to_owned(),
                write_decimals(s.pressure_pa / 1e3, 3),
                write_decimals(s.temperature_k, 1),
                write_decimals(s.velocity_m_s, 3),
                format!("{:.4}", s.mach),
                write_decimals(s.sound_speed_m_s, 1),
                format!("{:.4}", s.density_kg_m3),
                write_decimals(s.area_m2 * 1e4, 3),
            ]);
        }
        let mut text = format!("{}\n{}\n", self.heading.text(), table.text());
        if let Some(flow) = self.mass_flow() {
            let flow = write_rounded(flow, Dimension::MassFlow, 5);
            text.push_str(&format!("Mass flow {flow}.\n"));
        }
        for heat in self.heat() {
            let power = power(heat.power_w);
            text.push_str(&format!("Heat release of {}: {power}.\n", heat.element));
        }
        if let Some(area) = self.mean.throat_area {
            let stated = self.network.layout.elements.iter().any(|e| {
                matches!(
                    e.kind,
                    Kind::Exit(Exit {
                        end: ExitEnd::Choked { throat: Some(_) }
                    })
                )
            });
            let diameter = (4.0 * area / std::f64::consts::PI).sqrt();
            text.push_str(&format!(
                "Throat of the exit: {}, {} across if round{}.\n",
                write_rounded(area, Dimension::Area, 5),
                write_rounded(diameter, Dimension::Length, 5),
                if stated {
                    ""
                } else {
                    "; it follows from the flow"
                }
            ));
        }
        text.push_str(&closing(self.warnings));
        text
    }
}

fn at<'a>(element: &'a str, side: &'static str, state: &State<f64>) -> Station<'a> {
    Station {
        element,
        side,
        pressure_pa: state.pressure,
        temperature_k: state.temperature,
        velocity_m_s: state.velocity,
        mach: state.mach(),
        sound_speed_m_s: state.sound_speed(),
        density_kg_m3: state.density(),
        area_m2: state.area,
    }
}

/// A power in W, kW or MW.
pub(super) fn power(watts: f64) -> String {
    match watts.abs() {
        p if p >= 1e6 => format!("{} MW", write_decimals(watts / 1e6, 3)),
        p if p >= 1e3 => format!("{:.2} kW", watts / 1e3),
        _ => format!("{watts:.1} W"),
    }
}
