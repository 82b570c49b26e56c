//! Which mode leads where on a map.
//!
//! The largest growth rate is continuous over a plane; the frequency of the mode that has it jumps where
//! another mode takes the lead. Two neighbours belong to one region where their frequencies differ by little, or by
//! no more than several times as much as on either side of them along the same line.
//!
//! Ties of modes from point to point (see [`branch`](super::branch)) would not give regions: around a meeting of two
//! modes they lead from one to the other, so all points led by either would be one region. What is wanted
//! here is where the frequency that is heard jumps, and that can be seen from the leading modes alone.

use super::map::Map;
use crate::modes::Mode;

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

/// Finds the regions.
pub fn regions(map: &Map) -> Regions {
    let columns = map.across.points.max(1);
    let leading: Vec<Option<Mode>> = map.points.iter().map(|p| p.fastest()).collect();
    let mode = |k: usize| leading.get(k).copied().flatten();
    let rows = leading.len() / columns;
    let mut group: Vec<usize> = (0..leading.len()).collect();
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
                let (a, b) = (root(&mut group, k), root(&mut group, l));
                if let Some(parent) = group.get_mut(a.max(b)) {
                    *parent = a.min(b);
                }
            }
        }
    };
    for j in 0..rows {
        line(&(0..columns).map(|i| j * columns + i).collect::<Vec<_>>());
    }
    for i in 0..columns {
        line(&(0..rows).map(|j| j * columns + i).collect::<Vec<_>>());
    }
    numbered(&leading, &mut group)
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
        let regions = regions(&map(&rows, 4));
        assert_eq!(regions.list.len(), 2);
        assert_eq!(regions.list[0].points, 5);
        assert_eq!(regions.list[0].frequency, (300.0, 300.4));
        assert!((regions.list[0].fastest.frequency() - 300.4).abs() < 1e-9);
        let of = [1, 1, 0, 0, 1, 0, 0, 0].map(Some);
        assert_eq!(regions.of, of);
    }

    #[test]
    fn points_without_a_mode_belong_nowhere() {
        let regions = regions(&map(&[Some(100.0), None, Some(100.0)], 3));
        assert_eq!(regions.of, [Some(0), None, Some(1)]);
        assert!(super::regions(&map(&[None, None], 2)).list.is_empty());
    }
}
