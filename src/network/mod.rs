//! The network: elements joined by links, and the numbers that describe them.
//!
//! A [`Layout`] is the graph and says nothing in numbers; a [`Network`] is a layout with one value
//! for each knob, over any [`Real`](crate::numerics::dual::Real). Stations are the links of the graph: the plane where one
//! element ends is the plane where the next begins.

pub mod areas;
pub mod responses;
pub mod sensors;
pub mod values;

use std::sync::Arc;

use crate::elements::{Element, Kind, Section};
use crate::knobs::{Knob, KnobId, Values};
use crate::numerics::dual::{Dual, Grad};

/// Index of an element in [`Layout::elements`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct ElementId(pub usize);

/// Index of a link, which is a station, in [`Layout::links`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct StationId(pub usize);

/// A plane through which one element's outlet feeds the next one's inlet.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Link {
    /// The element that ends here.
    pub from: ElementId,
    /// The element that begins here.
    pub to: ElementId,
}

/// The graph of a network, the meaning of each number, and where to search.
#[derive(Clone, Debug)]
pub struct Layout {
    /// Title for reports.
    pub title: String,
    /// The elements; the first is the feed, the last the exit, the others in flow order.
    pub elements: Vec<Element>,
    /// The stations, in flow order.
    pub links: Vec<Link>,
    /// What says the area of each station, one for each link (see [`areas`]).
    pub station_sections: Vec<Section>,
    /// What each number of [`Values`] is.
    pub knobs: Vec<Knob>,
    /// The window the file asks for.
    pub search: Search,
    /// Where sensors sit, in the order of the file.
    pub sensors: Vec<sensors::Sensor>,
}

/// A window in the plane of frequency and growth rate as a file states it; what is not stated is
/// filled in from the network (see `modes::window`).
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Search {
    /// Lowest and highest frequency (Hz).
    pub frequency: Option<(f64, f64)>,
    /// Lowest and highest growth rate (1/s).
    pub growth: Option<(f64, f64)>,
}

/// Farthest a window may reach (Hz and 1/s): far beyond what plane waves in combustors are good for, and
/// near enough for a search to end in seconds.
pub const FARTHEST: f64 = 1e5;

/// A layout with its numbers.
#[derive(Clone, Debug)]
pub struct Network<T = f64> {
    /// The graph, shared by every variant of the network.
    pub layout: Arc<Layout>,
    /// Its numbers in SI.
    pub values: Values<T>,
}

impl Layout {
    /// The element of that name. `feed` and `exit` name the ends.
    pub fn element(&self, name: &str) -> Option<ElementId> {
        self.elements
            .iter()
            .position(|e| e.name == name)
            .map(ElementId)
    }

    /// The knob of that dotted name. Of a flame's only response `main_flame.response.delay` and
    /// `main_flame.response.1.delay` are other names of `main_flame.delay`.
    pub fn knob(&self, name: &str) -> Option<KnobId> {
        let named = |name: &str| self.knobs.iter().position(|k| k.name == name).map(KnobId);
        named(name).or_else(|| {
            let (flame, key) = name.split_once(".response.")?;
            named(&format!(
                "{flame}.{}",
                key.strip_prefix("1.").unwrap_or(key)
            ))
        })
    }

    /// The station where an element begins; `None` for the feed.
    pub fn inlet(&self, e: ElementId) -> Option<StationId> {
        self.links.iter().position(|l| l.to == e).map(StationId)
    }

    /// The station where an element ends; `None` for the exit.
    pub fn outlet(&self, e: ElementId) -> Option<StationId> {
        self.links.iter().position(|l| l.from == e).map(StationId)
    }
}

impl<T> Network<T> {
    /// The elements with their ids, in flow order.
    pub fn elements(&self) -> impl Iterator<Item = (ElementId, &Element)> {
        self.layout
            .elements
            .iter()
            .enumerate()
            .map(|(i, e)| (ElementId(i), e))
    }

    /// What an element is.
    pub fn kind(&self, e: ElementId) -> &Kind {
        &self.layout.elements[e.0].kind
    }
}

impl Network<f64> {
    /// The same network as duals, derivative one at `knob`.
    pub fn seeded(&self, knob: KnobId) -> Network<Dual> {
        self.seeded_along(&[(knob, 1.0)])
    }

    /// The same network with a direction for each knob named, and the derivative given along it.
    pub fn seeded_each<const N: usize>(&self, knobs: [(KnobId, f64); N]) -> Network<Grad<f64, N>> {
        Network {
            layout: Arc::clone(&self.layout),
            values: self.values.seeded_each(knobs),
        }
    }

    /// The same network as duals, with the derivative given at each knob named.
    pub fn seeded_along(&self, direction: &[(KnobId, f64)]) -> Network<Dual> {
        Network {
            layout: Arc::clone(&self.layout),
            values: self.values.seeded_along(direction),
        }
    }

    /// The same network with one number replaced.
    #[must_use]
    pub fn with(&self, knob: KnobId, value: f64) -> Network<f64> {
        let mut n = self.clone();
        n.values[knob] = value;
        n
    }
}
