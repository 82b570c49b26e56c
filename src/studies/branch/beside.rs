//! The mode of one point of a map, carried to a neighbour.

use crate::meanflow::MeanFlow;
use crate::modes::Mode;
use crate::network::Network;
use crate::studies::map::{Map, moves_mean_flow};

use super::ground::{Ground, OnPlane, Position};

/// How far from a known mode others are looked for, over its modulus.
const ROOM: f64 = 0.1;
/// Share of its modulus within which a mode carried to a point is one of the list of the point.
const SAME: f64 = 1e-8;

/// Carries modes between the points of a map.
pub struct Carrier<'a> {
    ground: Ground<'a>,
    columns: usize,
}

impl<'a> Carrier<'a> {
    /// Over the plane of a map of a network with the mean flow given.
    pub fn new(network: &'a Network, mean: &MeanFlow<f64>, map: &Map) -> Self {
        let axes = [map.across, map.up];
        let moves = axes.iter().any(|a| moves_mean_flow(network, a.knob));
        let held: Option<MeanFlow<OnPlane>> = (!moves).then(|| mean.lift());
        Carrier {
            ground: Ground {
                network,
                axes,
                held,
            },
            columns: map.across.points.max(1),
        }
    }

    fn position(&self, point: usize) -> Position {
        let (i, j) = (point % self.columns, point / self.columns);
        (i as f64, j as f64)
    }

    /// What a mode of one point is at another, on the straight line between them; `None` where it cannot be carried,
    /// since it meets another on the way or there is no mean flow.
    pub fn carried(&self, mode: &Mode, from: usize, to: usize) -> Option<Mode> {
        let reach = ROOM * mode.s.norm();
        let start = self.ground.spot(self.position(from), mode.s, reach)?;
        if !same(start.s(), mode) {
            return None;
        }
        let end = self.ground.carry(&start, self.position(to))?;
        Some(Mode {
            s: end.zero.at,
            error_bound: end.zero.error,
            multiplicity: end.zero.multiplicity,
        })
    }

    /// Whether modes of two points are one, carried either way.
    pub fn tied(&self, (a, k): (&Mode, usize), (b, l): (&Mode, usize)) -> bool {
        let there = self.carried(a, k, l).is_some_and(|m| same(m.s, b));
        there || self.carried(b, l, k).is_some_and(|m| same(m.s, a))
    }
}

fn same(s: num_complex::Complex64, mode: &Mode) -> bool {
    (s - mode.s).norm() <= mode.error_bound + SAME * mode.s.norm()
}
