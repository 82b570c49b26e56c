//! Growth rates beyond the window, where growing ground of a map borders on ground without a mode in the window.
//!
//! A point whose list is complete and empty, with growth excluded, decays faster than the window reaches: between it and
//! a point that grows lies a neutral value. Where is told by the mode that grows there, carried to the empty point; where it
//! leaves the band of frequency on the way, or cannot be carried, by the lowest growth rate of the window, which
//! every mode of the band at the empty point lies below.

use rayon::prelude::*;

use super::branch::beside::Carrier;
use super::map::Map;
use crate::meanflow::MeanFlow;
use crate::modes::Tendency;
use crate::network::Network;

/// The growth rate (1/s) of the leading mode at empty points beside points that grow; negative. None elsewhere.
pub fn beyond(network: &Network, mean: &MeanFlow<f64>, map: &Map) -> Vec<Option<f64>> {
    let columns = map.across.points.max(1);
    let carrier = Carrier::new(network, mean, map);
    let empty = |k: usize| {
        let point = map.points.get(k);
        point.is_some_and(|p| p.complete() && p.excluded() && p.fastest().is_none())
    };
    let (low, high) = map.window.growth;
    let floor = if low < 0.0 { low } else { low - high };
    let top = map.window.frequency.1;
    let value = |k: usize| {
        if !empty(k) {
            return None;
        }
        let beside = neighbours(k, columns, map.points.len());
        let modes = beside.filter_map(|l| Some((l, map.points.get(l)?.fastest()?)));
        let all: Vec<_> = modes.collect();
        if !all.iter().any(|(_, m)| m.tendency() == Tendency::Grows) {
            return None;
        }
        let carried = all.iter().filter_map(|(l, m)| carrier.carried(m, *l, k));
        let known = carried.filter(|m| m.frequency() <= top && m.growth() < 0.0);
        let fastest = known.map(|m| m.growth()).reduce(f64::max);
        Some(fastest.unwrap_or(floor))
    };
    (0..map.points.len()).into_par_iter().map(value).collect()
}

/// The points of the cells about a point of a plane.
fn neighbours(k: usize, columns: usize, points: usize) -> impl Iterator<Item = usize> {
    let (i, j) = (k % columns, k / columns);
    let (left, right) = (i.saturating_sub(1), (i + 1).min(columns - 1));
    let rows = j.saturating_sub(1)..=j + 1;
    let all = rows.flat_map(move |j| (left..=right).map(move |i| j * columns + i));
    all.filter(move |l| *l != k && *l < points)
}
