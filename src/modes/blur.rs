//! What rounding of a chain's coefficients leaves open of its modes.
//!
//! A mode is proved for the chain as it was lowered, and its coefficients are rounded. Where waves grow along the network,
//! as slow entropy does in a mode that decays fast, `exp(-s t)` magnifies what little they are off: a plate that loses
//! nothing makes no entropy but for rounding, and that may be ten orders of magnitude larger where it arrives. So the
//! coefficients are moved by a rounding, to one side or the other at random, and the modes with them: by the shorter
//! of `|c_0/c_1|` and `|c_0/c_2|^(1/2)`, with `c_k` the Taylor coefficients of the moved function at the mode. This is
//! a measurement, not a bound.

use super::Mode;
use crate::numerics::analytic::{Analytic, modulus};
use crate::waves::front;
use crate::waves::primitive::{Chain, Joint, Row, Step};

/// Times the coefficients are moved.
const TIMES: u64 = 3;

/// How far: one rounding of the largest coefficient of the condition.
const FAR: f64 = 0.5 * f64::EPSILON;

/// The modes' shifts are multiplied by this: a coefficient has come by several roundings, and chance is not the worst.
const MARGIN: f64 = 8.0;

/// Adds to the errors of modes what rounding of the coefficients leaves open.
pub(super) fn widen(chain: &Chain<f64>, modes: &mut [Mode]) {
    if modes.is_empty() {
        return;
    }
    let mut farthest = vec![0.0f64; modes.len()];
    for time in 0..TIMES {
        let Ok(moved) = front::eliminate(&moved(chain, &mut Chance(time))) else {
            continue;
        };
        for (most, mode) in farthest.iter_mut().zip(modes.iter()) {
            let [c0, c1, c2, _] = moved.tape.taylor(mode.s).map(modulus);
            let shift = (c0 / c1).min((c0 / c2).sqrt());
            // Where all vanish nothing is told.
            if shift.is_finite() {
                *most = most.max(shift);
            }
        }
    }
    for (mode, most) in modes.iter_mut().zip(farthest) {
        mode.error_bound += MARGIN * most;
    }
}

/// Signs by chance, the same each time (multiplier and increment of Knuth's MMIX: *The Art of Computer Programming*,
/// section 3.3.4).
struct Chance(u64);

impl Chance {
    fn sign(&mut self) -> f64 {
        let next = self.0.wrapping_mul(6_364_136_223_846_793_005);
        self.0 = next.wrapping_add(1_442_695_040_888_963_407);
        if self.0 >> 63 == 0 { 1.0 } else { -1.0 }
    }

    /// The numbers of one condition. What is zero is so by structure and stays.
    fn moved<'a>(&mut self, condition: impl Iterator<Item = &'a mut f64>) {
        let mut numbers: Vec<&mut f64> = condition.collect();
        let largest = numbers.iter().map(|x| x.abs()).fold(0.0, f64::max);
        for x in &mut numbers {
            if **x != 0.0 {
                **x += FAR * largest * self.sign();
            }
        }
    }

    fn row(&mut self, row: &mut Row<f64>) {
        self.moved(row.iter_mut());
    }

    fn joint(&mut self, joint: &mut Joint<f64>) {
        for (up, down) in joint.up.iter_mut().zip(&mut joint.down) {
            self.moved(up.iter_mut().chain(down));
        }
        self.row(&mut joint.row);
        for term in &mut joint.terms {
            self.row(&mut term.sense);
        }
    }
}

fn moved(chain: &Chain<f64>, chance: &mut Chance) -> Chain<f64> {
    let mut chain = chain.clone();
    for row in &mut chain.start.rows {
        chance.row(row);
    }
    for step in &mut chain.steps {
        match step {
            Step::Joint(joint) => chance.joint(joint),
            Step::Travel(travel) => {
                chance.moved(std::iter::once(&mut travel.downstream));
                chance.moved(std::iter::once(&mut travel.upstream));
            }
        }
    }
    chance.row(&mut chain.end.row);
    chain
}
