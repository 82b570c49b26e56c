//! Areas at the stations from neighbouring ducts.

use crate::elements::Kind;
use crate::network::Network;
use crate::numerics::dual::Real;

pub(super) fn station_areas<T: Real>(network: &Network<T>) -> Vec<T> {
    let elements = &network.layout.elements;
    let links = &network.layout.links;
    let stated = |e: usize| match elements.get(e).map(|e| &e.kind) {
        Some(Kind::Duct(d)) => Some(d.section.area(&network.values)),
        _ => None,
    };
    let passes = |e: usize| {
        matches!(
            elements.get(e).map(|e| &e.kind),
            Some(Kind::Flame(_) | Kind::Restriction(_))
        )
    };
    let mut areas: Vec<Option<T>> = links
        .iter()
        .map(|l| stated(l.from.0).or_else(|| stated(l.to.0)))
        .collect();
    for i in 1..areas.len() {
        if areas[i].is_none() && passes(links[i].from.0) {
            areas[i] = areas[i - 1];
        }
    }
    for i in (1..areas.len()).rev() {
        if areas[i - 1].is_none() && passes(links[i].from.0) {
            areas[i - 1] = areas[i];
        }
    }
    areas
        .into_iter()
        .map(|a| a.unwrap_or(T::from(f64::NAN)))
        .collect()
}
