//! A line through the numbers of a network: knobs that move together in one parameter.
//!
//! The position `u` runs from 0 to 1. A knob that goes from `a` to `b` is `a + (b - a) u` on a linear
//! path and `a (b/a)^u` on a geometric one; both ends are exact. The positions of the points come
//! from their index, `u = i/(n - 1)`, never by adding steps.

use crate::knobs::KnobId;
use crate::network::Network;
use crate::numerics::dual::Dual;

/// How a knob goes from one end to the other.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Spacing {
    /// Equal differences for equal steps.
    #[default]
    Linear,
    /// Equal ratios for equal steps; both ends have the same sign.
    Geometric,
}

/// A number that goes from one value to another, in SI.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Run {
    /// At `u = 0`.
    pub from: f64,
    /// At `u = 1`.
    pub to: f64,
}

impl Run {
    /// Its value at `u`.
    pub fn at(self, spacing: Spacing, u: f64) -> f64 {
        match spacing {
            _ if u <= 0.0 => self.from,
            _ if u >= 1.0 => self.to,
            Spacing::Linear => self.from + (self.to - self.from) * u,
            Spacing::Geometric => self.from * (u * (self.to / self.from).ln()).exp(),
        }
    }

    /// Its derivative with respect to `u`.
    pub fn slope(self, spacing: Spacing, u: f64) -> f64 {
        match spacing {
            Spacing::Linear => self.to - self.from,
            Spacing::Geometric => self.at(spacing, u) * (self.to / self.from).ln(),
        }
    }

    /// The position at which it takes a value; `None` outside its ends.
    pub fn position(self, spacing: Spacing, value: f64) -> Option<f64> {
        let u = match spacing {
            Spacing::Linear => (value - self.from) / (self.to - self.from),
            Spacing::Geometric => (value / self.from).ln() / (self.to / self.from).ln(),
        };
        (0.0..=1.0).contains(&u).then_some(u)
    }
}

/// What the parameter of a path is called by.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Parameter {
    /// The value of a knob.
    Knob(KnobId),
    /// The factor on the values of the file.
    Factor,
}

/// A path and the points on it.
#[derive(Clone, Debug, PartialEq)]
pub struct Path {
    /// What its values are values of.
    pub parameter: Parameter,
    /// The values of the parameter.
    pub values: Run,
    /// Every knob that moves.
    pub knobs: Vec<(KnobId, Run)>,
    /// How all of them go.
    pub spacing: Spacing,
    /// Number of points, both ends among them.
    pub points: usize,
}

impl Path {
    /// The position of the point of that index.
    pub fn position(&self, index: usize) -> f64 {
        let last = self.points.saturating_sub(1);
        if index >= last && last > 0 {
            return 1.0;
        }
        index as f64 / last.max(1) as f64
    }

    /// The parameter's value at a position.
    pub fn value(&self, u: f64) -> f64 {
        self.values.at(self.spacing, u)
    }

    /// The network at a position.
    pub fn at(&self, network: &Network, u: f64) -> Network {
        let mut here = network.clone();
        for &(knob, run) in &self.knobs {
            here.values[knob] = run.at(self.spacing, u);
        }
        here
    }

    /// The network at a position with its derivative along the path: what every knob changes for a
    /// unit of `u`.
    pub fn along(&self, network: &Network, u: f64) -> Network<Dual> {
        let direction: Vec<(KnobId, f64)> = self
            .knobs
            .iter()
            .map(|&(knob, run)| (knob, run.slope(self.spacing, u)))
            .collect();
        self.at(network, u).seeded_along(&direction)
    }

    /// The position of the network as it stands; `None` where it does not lie on the path.
    pub fn design(&self, network: &Network) -> Option<f64> {
        let value = match self.parameter {
            Parameter::Knob(knob) => network.values[knob],
            Parameter::Factor => 1.0,
        };
        let u = self.values.position(self.spacing, value)?;
        let on = |&(knob, run): &(KnobId, Run)| {
            let (is, here) = (network.values[knob], run.at(self.spacing, u));
            (is - here).abs() <= 1e-9 * is.abs().max((run.to - run.from).abs())
        };
        self.knobs.iter().all(on).then_some(u)
    }

    /// Whether a knob moves.
    pub fn moves(&self, knob: KnobId) -> bool {
        self.knobs.iter().any(|(k, _)| *k == knob)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn ends_are_exact_slopes_are_slopes_and_positions_lead_back(
            from in 0.01..10.0f64,
            ratio in 1.1..20.0f64,
            u in 0.01..0.99f64,
        ) {
            let run = Run { from, to: from * ratio };
            for spacing in [Spacing::Linear, Spacing::Geometric] {
                prop_assert_eq!(run.at(spacing, 0.0), run.from);
                prop_assert_eq!(run.at(spacing, 1.0), run.to);
                let value = run.at(spacing, u);
                prop_assert!((run.position(spacing, value).unwrap() - u).abs() < 1e-12);
                let h = 1e-5;
                let difference = (run.at(spacing, u + h) - run.at(spacing, u - h)) / (2.0 * h);
                prop_assert!((run.slope(spacing, u) - difference).abs() < 1e-7 * run.to);
            }
            let mean = (run.from * run.to).sqrt();
            prop_assert!((run.at(Spacing::Geometric, 0.5) - mean).abs() < 1e-12 * mean);
        }

        #[test]
        fn positions_come_from_the_index(points in 2usize..2000) {
            let path = Path {
                parameter: Parameter::Factor,
                values: Run { from: 1.0, to: 2.0 },
                knobs: Vec::new(),
                spacing: Spacing::Linear,
                points,
            };
            prop_assert_eq!(path.position(0), 0.0);
            prop_assert_eq!(path.position(points - 1), 1.0);
            prop_assert_eq!(path.value(path.position(points - 1)), 2.0);
            for i in 1..points {
                prop_assert_eq!(path.position(i), i as f64 / (points - 1) as f64);
            }
        }
    }
}
