//! The delays of a network's flames, and where a spread makes one answer before its cause.

use super::Network;
use crate::elements::Kind;
use crate::knobs::KnobId;
use crate::problems::Problem;
use crate::units::{Dimension, write_rounded};

/// Greatest part of its mean delay that the standard deviation of a Gaussian response may be: beyond three
/// standard deviations a normal density holds 0.13 % of its weight.
const WIDEST: f64 = 1.0 / 3.0;

/// Gaussian delays wider than a third of their mean.
pub fn of_responses(network: &Network) -> Vec<Problem> {
    let wide = |(delay, spread): (KnobId, Option<KnobId>)| {
        let spread = spread?;
        let (mean, width) = (network.values[delay], network.values[spread]);
        if width <= WIDEST * mean {
            return None;
        }
        let time = |t| write_rounded(t, Dimension::Time, 6);
        let name = network.layout.knobs.get(spread.0);
        let name = name.map_or("network", |k| k.name.as_str());
        let what = format!(
            "a spread of {} is more than a third of the mean delay {}, so part of the response would come \
             before its cause",
            time(width),
            time(mean)
        );
        let hint = format!("keep the spread below {}", time(WIDEST * mean));
        Some(Problem::warning(name, what).hint(hint))
    };
    delays(network).into_iter().filter_map(wide).collect()
}

/// The delay of every response with its spread.
pub fn delays(network: &Network) -> Vec<(KnobId, Option<KnobId>)> {
    let flames = network.elements().filter_map(|(_, e)| match &e.kind {
        Kind::Flame(flame) => Some(&flame.responses),
        _ => None,
    });
    flames.flatten().map(|r| r.law.delay_and_spread()).collect()
}
