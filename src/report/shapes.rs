//! Mode shapes: amplitude and phase of pressure and velocity.

use num_complex::Complex64;
use serde::Serialize;

use super::table::{Lean, Table};
use crate::modes::explain::Explained;
use crate::modes::shapes::{Sample, Shape};
use crate::modes::{Mode, ModeList};
use crate::network::{ElementId, Network};
use crate::units::write_decimals;

/// One place, for a largest pressure amplitude of 1 Pa.
#[derive(Clone, Debug, Serialize)]
struct At<'a> {
    element: &'a str,
    #[serde(skip_serializing_if = "Option::is_none")]
    side: Option<&'static str>,
    position_m: f64,
    pressure_amplitude_pa: f64,
    pressure_phase_rad: f64,
    velocity_amplitude_m_s: f64,
    velocity_phase_rad: f64,
}

/// A shape in JSON.
#[derive(Clone, Debug, Serialize)]
pub(super) struct ShapeFields<'a> {
    stations: Vec<At<'a>>,
    along: Vec<At<'a>>,
}

impl<'a> ShapeFields<'a> {
    pub fn new(network: &'a Network, shape: &Shape) -> Self {
        ShapeFields {
            stations: stations(network, shape),
            along: along(network, shape),
        }
    }
}

fn stations<'a>(network: &'a Network, shape: &Shape) -> Vec<At<'a>> {
    let layout = &network.layout;
    let mut all = Vec::new();
    for (id, element) in network.elements() {
        for (side, station) in [("in", layout.inlet(id)), ("out", layout.outlet(id))] {
            if let Some(sample) = station.and_then(|s| shape.stations.get(s.0)) {
                all.push(at(&element.name, Some(side), sample));
            }
        }
    }
    all
}

fn along<'a>(network: &'a Network, shape: &Shape) -> Vec<At<'a>> {
    let samples = shape.along.iter();
    samples
        .map(|s| at(name(network, s.element), None, s))
        .collect()
}

fn name(network: &Network, id: ElementId) -> &str {
    let element = network.layout.elements.get(id.0);
    element.map_or("", |e| e.name.as_str())
}

fn at<'a>(element: &'a str, side: Option<&'static str>, s: &Sample) -> At<'a> {
    At {
        element,
        side,
        position_m: s.position,
        pressure_amplitude_pa: s.pressure.norm(),
        pressure_phase_rad: phase(s.pressure),
        velocity_amplitude_m_s: s.velocity.norm(),
        velocity_phase_rad: phase(s.velocity),
    }
}

/// The phase (rad); zero for a zero.
fn phase(z: Complex64) -> f64 {
    if z.norm() > 0.0 { z.arg() } else { 0.0 }
}

/// In degrees to a tenth, without a negative zero.
fn degrees(phase: f64) -> String {
    format!("{:.1}", (phase.to_degrees() * 10.0).round() / 10.0 + 0.0)
}

/// One line of the CSV of shapes.
#[derive(Clone, Debug, Serialize)]
pub(super) struct CsvRow<'a> {
    mode: usize,
    frequency_hz: f64,
    growth_per_s: f64,
    element: &'a str,
    side: &'static str,
    position_m: f64,
    pressure_amplitude_pa: f64,
    pressure_phase_rad: f64,
    velocity_amplitude_m_s: f64,
    velocity_phase_rad: f64,
}

/// Stations, then places along the ducts (`side` is `along`), mode by mode.
pub(super) fn csv_rows<'a>(
    network: &'a Network,
    list: &ModeList,
    explained: &[Explained],
) -> Vec<CsvRow<'a>> {
    let mut rows = Vec::new();
    for (i, (mode, told)) in list.modes.iter().zip(explained).enumerate() {
        let Some(shape) = &told.shape else { continue };
        let places = stations(network, shape);
        for place in places.into_iter().chain(along(network, shape)) {
            rows.push(CsvRow {
                mode: i + 1,
                frequency_hz: mode.frequency(),
                growth_per_s: mode.growth(),
                element: place.element,
                side: place.side.unwrap_or("along"),
                position_m: place.position_m,
                pressure_amplitude_pa: place.pressure_amplitude_pa,
                pressure_phase_rad: place.pressure_phase_rad,
                velocity_amplitude_m_s: place.velocity_amplitude_m_s,
                velocity_phase_rad: place.velocity_phase_rad,
            });
        }
    }
    rows
}

/// The shape of one mode at the stations, for people.
pub(super) fn text(network: &Network, index: usize, mode: &Mode, shape: Option<&Shape>) -> String {
    let frequency = write_decimals(mode.frequency(), 3);
    let title = format!("\nShape of mode {}, {frequency} Hz", index + 1);
    let Some(shape) = shape else {
        return format!("{title}: the null vector did not settle, or holds no pressure.\n");
    };
    use Lean::{Left, Right};
    let mut table = Table::new(&[Left, Left, Right, Right, Right, Right, Right]);
    table.heading(&[
        "element", "side", "position", "|p'|", "phase", "|u'|", "phase",
    ]);
    table.heading(&["", "", "m", "Pa", "deg", "mm/s", "deg"]);
    for s in stations(network, shape) {
        table.row(vec![
            s.element.to_owned(),
            s.side.unwrap_or_default().to_owned(),
            format!("{:.3}", s.position_m),
            format!("{:.4}", s.pressure_amplitude_pa),
            degrees(s.pressure_phase_rad),
            format!("{:.4}", s.velocity_amplitude_m_s * 1e3),
            degrees(s.velocity_phase_rad),
        ]);
    }
    format!(
        "{title}, for a largest pressure amplitude of 1 Pa\n\n{}",
        table.text()
    )
}
