//! A chain with one thing varied that leaves the mean flow alone, and its derivative in it.

use crate::numerics::dual::{Dual, Real};
use crate::waves::law::{Delayed, Law};
use crate::waves::primitive::{Chain, Step};

/// What is varied, of all flames or ducts together.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Varied {
    /// A factor on every flame's response.
    Gain,
    /// A time (s) added to every delay of the responses.
    Delay,
    /// A factor on the entropy that ducts carry.
    Entropy,
}

/// The chain with `what` at `value`, derivative one there.
pub fn varied(chain: &Chain<f64>, what: Varied, value: f64) -> Chain<Dual> {
    let value = Dual::variable(value, 0);
    let mut chain: Chain<Dual> = chain.lift();
    for step in &mut chain.steps {
        match (step, what) {
            (Step::Joint(joint), Varied::Gain | Varied::Delay) => {
                for term in &mut joint.terms {
                    adjust(&mut term.law, what, value);
                }
            }
            (Step::Travel(travel), Varied::Entropy) => {
                if let Some(law) = &mut travel.entropy {
                    adjust(law, what, value);
                }
            }
            (Step::Travel(_), _) | (Step::Joint(_), Varied::Entropy) => {}
        }
    }
    chain
}

/// Storage is a polynomial of `s` and stays as it is.
fn adjust(law: &mut Law<Dual>, what: Varied, value: Dual) {
    let Law::Delays(delays) = law else { return };
    for Delayed { weight, delay, .. } in delays {
        match what {
            Varied::Gain | Varied::Entropy => *weight = *weight * value,
            Varied::Delay => *delay += value,
        }
    }
}

/// The delays of all flames' responses (s).
pub fn delays(chain: &Chain<f64>) -> impl Iterator<Item = f64> {
    chain
        .steps
        .iter()
        .filter_map(|step| match step {
            Step::Joint(joint) => Some(&joint.terms),
            Step::Travel(_) => None,
        })
        .flatten()
        .filter_map(|term| match &term.law {
            Law::Delays(delays) => Some(delays),
            Law::Polynomial { .. } | Law::Complex { .. } => None,
        })
        .flatten()
        .filter(|d| !d.weight.is_exactly_zero())
        .map(|d| d.delay)
}

/// The times (s) entropy takes through the ducts that carry it.
pub fn entropy_delays(chain: &Chain<f64>) -> impl Iterator<Item = f64> {
    chain
        .steps
        .iter()
        .filter_map(|step| match step {
            Step::Travel(travel) => travel.entropy.as_ref(),
            Step::Joint(_) => None,
        })
        .filter_map(|law| match law {
            Law::Delays(delays) => delays.first().map(|d| d.delay),
            Law::Polynomial { .. } | Law::Complex { .. } => None,
        })
}
