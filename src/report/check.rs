//! A sound network in one line.

use serde::Serialize;

use super::document::WindowFields;
use super::flow::power;
use super::{Document, Heading, closing, counted, window_text};
use crate::elements::Kind;
use crate::meanflow::MeanFlow;
use crate::modes::Window;
use crate::network::Network;
use crate::problems::Problem;
use crate::units::write_decimals;

/// A sound network to report.
#[derive(Clone, Copy, Debug)]
pub struct Check<'a> {
    /// Of which network.
    pub heading: Heading<'a>,
    /// The network.
    pub network: &'a Network,
    /// Its mean flow.
    pub mean: &'a MeanFlow<f64>,
    /// Where its modes are searched unless another window is asked for.
    pub window: Window,
    /// What qualifies it.
    pub warnings: &'a [Problem],
}

#[derive(Clone, Debug, Serialize)]
struct Flame<'a> {
    element: &'a str,
    power_w: Option<f64>,
    burnt_temperature_k: f64,
}

#[derive(Clone, Debug, Serialize)]
struct Body<'a> {
    sound: bool,
    elements: usize,
    mach: Option<(f64, f64)>,
    flames: Vec<Flame<'a>>,
    window: WindowFields,
}

impl Check<'_> {
    /// Elements between the ends.
    fn elements(&self) -> usize {
        let kinds = self.network.layout.elements.iter().map(|e| &e.kind);
        kinds
            .filter(|k| !matches!(k, Kind::Feed(_) | Kind::Exit(_)))
            .count()
    }

    /// Lowest and highest Mach number.
    fn mach(&self) -> Option<(f64, f64)> {
        let all = self.mean.states.iter().map(|s| s.mach());
        all.fold(None, |range, m| match range {
            None => Some((m, m)),
            Some((low, high)) => Some((f64::min(low, m), f64::max(high, m))),
        })
    }

    fn flames(&self) -> Vec<Flame<'_>> {
        let mut all = Vec::new();
        for (id, element) in self.network.elements() {
            let outlet = self.network.layout.outlet(id);
            if let (Kind::Flame(_), Some(behind)) =
                (&element.kind, outlet.and_then(|s| self.mean.state(s)))
            {
                all.push(Flame {
                    element: &element.name,
                    power_w: self.mean.heat_release.get(id.0).copied().flatten(),
                    burnt_temperature_k: behind.temperature,
                });
            }
        }
        all
    }

    /// As JSON.
    ///
    /// # Errors
    /// Where it has no form in JSON.
    pub fn json(&self) -> std::io::Result<String> {
        let body = Body {
            sound: true,
            elements: self.elements(),
            mach: self.mach(),
            flames: self.flames(),
            window: (&self.window).into(),
        };
        Document::new("stillflame/check", &self.heading, body, self.warnings).to_json()
    }

    /// For people.
    pub fn text(&self) -> String {
        let mut parts = vec![counted(self.elements(), "element")];
        parts.push(match self.mach() {
            Some((low, high)) if high > 0.0 => format!("Mach {low:.4} to {high:.4}"),
            _ => "still gas".to_owned(),
        });
        for flame in self.flames() {
            // In still gas no heat is released on the mean.
            let heat = flame.power_w.filter(|p| *p != 0.0).map(power);
            let heat = heat.map_or(String::new(), |p| format!(" {p},"));
            let t = flame.burnt_temperature_k;
            let t = write_decimals(t, 0);
            parts.push(format!("{}{heat} {t} K behind it", flame.element));
        }
        parts.push(format!("window {}", window_text(&self.window)));
        let heading = self.heading.text();
        let warnings = closing(self.warnings);
        format!("{heading}\nsound: {}\n{warnings}", parts.join("; "))
    }
}
