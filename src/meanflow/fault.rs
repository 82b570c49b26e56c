//! Why a mean flow does not exist, in numbers; told in words once, when it is reported.

use crate::knobs::KnobId;
use crate::network::{ElementId, Layout};
use crate::problems::Problem;

/// Why there is no mean flow.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Fault {
    /// The flow stated at the feed is supersonic at the first station.
    SupersonicFeed { mach: f64 },
    /// No subsonic state behind an element passes the mass flow (kg/s); `most` of it could.
    Choked {
        element: ElementId,
        mach: f64,
        mass_flow: f64,
        most: f64,
    },
    /// The open area of a restriction cannot pass the mass flow (kg/s).
    ChokedPassage {
        element: ElementId,
        mass_flow: f64,
        most: f64,
    },
    /// A flame is asked for more than the hottest static temperature (K) heating can reach.
    ThermallyChoked {
        element: ElementId,
        mach: f64,
        asked: f64,
        hottest: f64,
    },
    /// A flame's stated temperature (K) lies below its inlet's.
    Colder {
        element: ElementId,
        asked: f64,
        inlet: f64,
    },
    /// A choked nozzle's throat (m^2) is not smaller than the passage before it.
    WideThroat { throat: f64, passage: f64 },
    /// A choked end, but nothing flows.
    NoFlow { element: ElementId },
    /// A number of a station is not finite or not positive where it must be.
    NotFinite { element: ElementId },
}

impl Fault {
    /// Whether less flow could mend it.
    pub(super) fn is_choking(self) -> bool {
        matches!(
            self,
            Fault::SupersonicFeed { .. }
                | Fault::Choked { .. }
                | Fault::ChokedPassage { .. }
                | Fault::ThermallyChoked { .. }
        )
    }

    /// The fault in words; `flow` is the knob that states the feed's flow.
    pub(super) fn problem(self, layout: &Layout, flow: Option<KnobId>) -> Problem {
        let name = |e: ElementId| {
            layout
                .elements
                .get(e.0)
                .map_or("network", |e| e.name.as_str())
        };
        let mach_number = |m| figure(m, 3);
        let flow_rate = |m| figure(m, 4);
        let kelvin = |t| figure(t, 1);
        let less = "less flow, more pressure or wider passages would keep it subsonic";
        match self {
            Fault::SupersonicFeed { mach } => Problem::error(
                flow.and_then(|k| layout.knobs.get(k.0)).map_or("feed", |k| k.name.as_str()),
                format!("flow beyond Mach 1 in `feed`: Mach {} at the first station", mach_number(mach)),
            )
            .hint("only subsonic flow is described; state less flow or a higher pressure"),
            Fault::Choked {
                element,
                mach,
                mass_flow,
                most,
            } => Problem::error(
                name(element),
                format!(
                    "flow beyond Mach 1 in `{}`: {} kg/s arrive at Mach {}, at most {} kg/s can leave it",
                    name(element),
                    flow_rate(mass_flow),
                    mach_number(mach),
                    flow_rate(most)
                ),
            )
            .hint(less),
            Fault::ChokedPassage {
                element,
                mass_flow,
                most,
            } => Problem::error(
                name(element),
                format!(
                    "flow beyond Mach 1 in `{}`: {} kg/s arrive, its open area passes at most {} kg/s",
                    name(element),
                    flow_rate(mass_flow),
                    flow_rate(most)
                ),
            )
            .hint(less),
            Fault::ThermallyChoked {
                element,
                mach,
                asked,
                hottest,
            } => Problem::error(
                name(element),
                format!(
                    "flow beyond Mach 1 in `{}`: heated from Mach {} in a constant area, the static \
                     temperature cannot exceed {} K and {} K is stated (thermal choking)",
                    name(element),
                    mach_number(mach),
                    kelvin(hottest),
                    kelvin(asked)
                ),
            )
            .hint("a lower burnt temperature, less flow or a wider passage would keep it subsonic"),
            Fault::Colder {
                element,
                asked,
                inlet,
            } => Problem::error(
                format!("{}.burnt_temperature", name(element)),
                format!(
                    "the flame is colder than its inlet: {} K behind it, {} K before it",
                    figure(asked, 2),
                    figure(inlet, 2)
                ),
            )
            .hint(format!("state a temperature above {} K", figure(inlet, 2))),
            Fault::WideThroat { throat, passage } => Problem::error(
                "exit",
                format!(
                    "the throat of {throat:.6e} m^2 is not smaller than the passage before it \
                     ({passage:.6e} m^2), so flow would be beyond Mach 1 there"
                ),
            )
            .hint("a choked nozzle's throat is narrower than the passage that feeds it"),
            Fault::NoFlow { element } => Problem::error(
                name(element),
                format!("`{}` is choked but nothing flows", name(element)),
            )
            .hint("state a flow at the feed, or another end"),
            Fault::NotFinite { element } => Problem::error(
                name(element),
                format!(
                    "the mean flow behind `{}` has a number that is not finite or not positive",
                    name(element)
                ),
            )
            .hint("check the numbers of this element and of the feed for extreme values"),
        }
    }
}

/// A number for a sentence, to so many places unless it is far from one.
fn figure(x: f64, places: usize) -> String {
    if x == 0.0 || (1e-3..1e6).contains(&x.abs()) {
        format!("{x:.places$}")
    } else {
        format!("{x:.places$e}")
    }
}
