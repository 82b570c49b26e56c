//! Which mode leads where on a map.
//!
//! The largest growth rate is continuous over a plane; the frequency of the mode that has it jumps where
//! another mode takes the lead. Two neighbours belong to one region where their frequencies differ by little, or by
//! no more than several times as much as on either side of them along the same line; where these do not say it, as
//! on a coarse map whose frequency moves fast, where the mode that leads at one, carried to the other
//! ([`Carrier`]), is the one that leads there.
//!
//! Such ties alone would not give regions: around a meeting of two modes they lead from one to the other, so all points
//! led by either would be one region. What is wanted here is where the frequency that is heard jumps.

use rayon::prelude::*;

use super::branch::beside::Carrier;
use super::map::Map;
use crate::meanflow::MeanFlow;
use crate::modes::Mode;
use crate::network::Network;

/// Points led by one mode.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Region {
    /// How many.
    pub points: usize,
    /// Lowest and highest frequency of the leading mode (Hz).
    pub frequency: (f64, f64),
    /// The mode of largest growth rate among them.
    pub fastest: Mode,
}

/// The regions of a map, the largest first.
#[derive(Clone, Debug, PartialEq)]
pub struct Regions {
    /// For each point of the map, row by row, the region it lies in; none where no mode is known.
    pub of: Vec<Option<usize>>,
    /// The regions.
    pub list: Vec<Region>,
}

/// Multiple of the difference on either side that is still no jump.
const STEPS: f64 = 4.0;
/// Differences below and above which neighbours always and never belong together, over the frequency.
const SAME: f64 = 4e-3;
const OTHER: f64 = 0.08;

/// Finds the regions of a map of a network with the mean flow given.
pub fn regions(network: &Network, mean: &MeanFlow<f64>, map: &Map) -> Regions {
    let carrier = Carrier::new(network, mean, map);
    tied(map, |a, b| carrier.tied(a, b))
}

/// Finds the regions, given whether modes of two points are one.
fn tied(map: &Map, one: impl Fn((&Mode, usize), (&Mode, usize)) -> bool + Sync) -> Regions {
    let columns = map.across.points.max(1);
    let leading: Vec<Option<Mode>> = map.points.iter().map(|p| p.fastest()).collect();
    let mode = |k: usize| leading.get(k).copied().flatten();
    let rows = leading.len() / columns;
    let mut group: Vec<usize> = (0..leading.len()).collect();
    let mut doubtful: Vec<(usize, usize)> = Vec::new();
    let mut line = |points: &[usize]| {
        for (i, pair) in points.windows(2).enumerate() {
            let &[k, l] = pair else { continue };
            let apart = |i: usize| {
                let f = |i: usize| Some(mode(*points.get(i)?)?.frequency());
                Some((f(i + 1)? - f(i)?).abs())
            };
            let (Some(here), Some(a), Some(b)) = (apart(i), mode(k), mode(l)) else {
                continue;
            };
            let beside = [i.checked_sub(1).and_then(apart), apart(i + 1)];
            let beside = beside.into_iter().flatten().fold(f64::INFINITY, f64::min);
            let beside = if beside.is_finite() { beside } else { 0.0 };
            let f = a.frequency().max(b.frequency());
            if here <= (STEPS * beside).clamp(SAME * f, OTHER * f) {
                join(&mut group, k, l);
            } else {
                doubtful.push((k, l));
            }
        }
    };
    for j in 0..rows {
        line(&(0..columns).map(|i| j * columns + i).collect::<Vec<_>>());
    }
    for i in 0..columns {
        line(&(0..rows).map(|j| j * columns + i).collect::<Vec<_>>());
    }
    doubtful.retain(|&(k, l)| root(&mut group, k) != root(&mut group, l));
    let one = |&(k, l): &(usize, usize)| {
        let modes = mode(k).zip(mode(l));
        modes.is_some_and(|(a, b)| one((&a, k), (&b, l)))
    };
    let same: Vec<bool> = doubtful.par_iter().map(one).collect();
    for (&(k, l), _) in doubtful.iter().zip(same).filter(|(_, same)| *same) {
        join(&mut group, k, l);
    }
    numbered(&leading, &mut group)
}

fn join(group: &mut [usize], k: usize, l: usize) {
    let (a, b) = (root(group, k), root(group, l));
    if let Some(parent) = group.get_mut(a.max(b)) {
        *parent = a.min(b);
    }
}

/// The first point of a group, paths halved on the way.
fn root(group: &mut [usize], mut k: usize) -> usize {
    while let Some(&parent) = group.get(k).filter(|&&p| p != k) {
        let grand = group.get(parent).copied().unwrap_or(parent);
        if let Some(slot) = group.get_mut(k) {
            *slot = grand;
        }
        k = grand;
    }
    k
}

fn numbered(leading: &[Option<Mode>], group: &mut [usize]) -> Regions {
    let mut found: Vec<(usize, Region)> = Vec::new();
    let mut place = vec![usize::MAX; leading.len()];
    for (k, mode) in leading.iter().enumerate() {
        let Some(mode) = *mode else { continue };
        let first = root(group, k);
        let f = mode.frequency();
        match place.get(first).and_then(|&i| found.get_mut(i)) {
            Some((_, region)) => {
                region.points += 1;
                region.frequency = (region.frequency.0.min(f), region.frequency.1.max(f));
                if mode.growth() > region.fastest.growth() {
                    region.fastest = mode;
                }
            }
            None => {
                if let Some(slot) = place.get_mut(first) {
                    *slot = found.len();
                }
                let region = Region {
                    points: 1,
                    frequency: (f, f),
                    fastest: mode,
                };
                found.push((first, region));
            }
        }
    }
    // The largest first; of equals the one met first.
    found.sort_by_key(|(first, region)| (usize::MAX - region.points, *first));
    for (rank, (first, _)) in found.iter().enumerate() {
        if let Some(slot) = place.get_mut(*first) {
            *slot = rank;
        }
    }
    let of = (0..leading.len())
        .map(|k| {
            leading.get(k).copied().flatten()?;
            place.get(root(group, k)).copied()
        })
        .collect();
    Regions {
        of,
        list: found.into_iter().map(|(_, region)| region).collect(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::knobs::KnobId;
    use crate::modes::Window;
    use crate::studies::map::{Axis, Found, Point};
    use num_complex::Complex64;

    fn map(frequencies: &[Option<f64>], columns: usize) -> Map {
        let axis = |points| Axis {
            knob: KnobId(0),
            low: 0.0,
            high: 1.0,
            points,
        };
        let point = |f: &Option<f64>| {
            Point::Certified(Found {
                leading: f.map(|f| Mode {
                    s: Complex64::new(f / 10.0, f * std::f64::consts::TAU),
                    error_bound: 0.0,
                    multiplicity: 1,
                }),
                ..Found::default()
            })
        };
        Map {
            across: axis(columns),
            up: axis(frequencies.len() / columns),
            window: Window {
                frequency: (0.0, 1000.0),
                growth: (-1.0, 1.0),
            },
            points: frequencies.iter().map(point).collect(),
            lists: None,
        }
    }

    #[test]
    fn a_jump_of_frequency_parts_regions() {
        let rows = [100.0, 100.3, 300.0, 300.2, 100.1, 300.1, 300.3, 300.4].map(Some);
        let regions = tied(&map(&rows, 4), |_, _| false);
        let all = tied(&map(&[Some(100.0), Some(300.0)], 2), |_, _| true);
        assert_eq!(all.of, [Some(0); 2]);
        assert_eq!(regions.list.len(), 2);
        assert_eq!(regions.list[0].points, 5);
        assert_eq!(regions.list[0].frequency, (300.0, 300.4));
        assert!((regions.list[0].fastest.frequency() - 300.4).abs() < 1e-9);
        let of = [1, 1, 0, 0, 1, 0, 0, 0].map(Some);
        assert_eq!(regions.of, of);
    }

    #[test]
    fn points_without_a_mode_belong_nowhere() {
        let regions = tied(&map(&[Some(100.0), None, Some(100.0)], 3), |_, _| true);
        assert_eq!(regions.of, [Some(0), None, Some(1)]);
        assert!(tied(&map(&[None, None], 2), |_, _| true).list.is_empty());
    }
}
