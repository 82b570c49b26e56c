//! Where the assumptions of the model fail, as far as a window, a mean flow or a list of modes decides
//! it.

use super::{Mode, ModeList, Outside, Window, cut_on};
use crate::elements::Kind;
use crate::flame::ResponseLaw;
use crate::knobs::KnobId;
use crate::meanflow::MeanFlow;
use crate::network::{ElementId, Network};
use crate::problems::Problem;
use crate::units::{Dimension, write_rounded};

/// Part of a wavelength a compact element may be long (common practice).
const COMPACT: f64 = 0.1;

/// What qualifies any answer in a window: plane waves above a cut-on, elements too long to be compact.
pub fn of_window(network: &Network, mean: &MeanFlow<f64>, window: &Window) -> Vec<Problem> {
    let mut found = Vec::new();
    let top = window.frequency.1;
    let lowest = cut_on(network, mean)
        .into_iter()
        .min_by(|a, b| a.1.total_cmp(&b.1));
    if let Some((duct, f)) = lowest
        && top > f
    {
        let what = format!(
            "the window reaches {top:.0} Hz, above the first cut-on of `{duct}` at {f:.0} Hz: waves there \
             are not plane alone"
        );
        found.push(
            Problem::warning(duct, what).hint(format!("search up to {:.0} Hz", (0.9 * f).floor())),
        );
    }
    for (id, element) in network.elements() {
        let Some((what, length)) = extent(network, &element.kind) else {
            continue;
        };
        let Some(c) = slowest(network, mean, id) else {
            continue;
        };
        let wavelength = c / top;
        if length > COMPACT * wavelength {
            let mm = |x| write_rounded(x, Dimension::Length, 3);
            let text = format!(
                "`{}` is not compact at {top:.0} Hz: {what}, {}, is more than a tenth of the wavelength, {}",
                element.name,
                mm(length),
                mm(wavelength)
            );
            let hint = format!(
                "trust it up to {:.0} Hz, or describe it by ducts",
                (COMPACT * c / length).floor()
            );
            found.push(Problem::warning(&element.name, text).hint(hint));
        }
    }
    found
}

/// The length of an element taken as compact (m), and what it is.
fn extent(network: &Network, kind: &Kind) -> Option<(&'static str, f64)> {
    let slug = |k: KnobId| Some(("its effective length", network.values[k]));
    match kind {
        Kind::Contraction(c) => slug(c.effective_length),
        Kind::Expansion(e) => slug(e.effective_length),
        Kind::Restriction(r) => slug(r.effective_length),
        Kind::Plenum(p) => Some((
            "the edge of a cube of its volume",
            network.values[p.volume].cbrt(),
        )),
        Kind::Feed(_) | Kind::Exit(_) | Kind::Duct(_) | Kind::Flame(_) => None,
    }
}

/// The lower of the sound speeds on both sides (m/s).
fn slowest(network: &Network, mean: &MeanFlow<f64>, id: ElementId) -> Option<f64> {
    let layout = &network.layout;
    [layout.inlet(id), layout.outlet(id)]
        .into_iter()
        .flatten()
        .filter_map(|station| mean.state(station))
        .map(|state| state.sound_speed())
        .reduce(f64::min)
}

/// Modes that grow outside the window.
pub fn of_growth_outside(window: &Window, outside: &Outside) -> Vec<Problem> {
    let fastest = |modes: &[Mode]| {
        let by_growth = |a: &&Mode, b: &&Mode| a.growth().total_cmp(&b.growth());
        modes.iter().max_by(by_growth).copied()
    };
    let mut found = Vec::new();
    if let Some(m) = fastest(&outside.faster) {
        let what = format!(
            "growth faster than the window's upper edge of {:.0} 1/s: {:.1} 1/s at {:.1} Hz, not in the list",
            window.growth.1,
            m.growth(),
            m.frequency()
        );
        let to = (1.1 * m.growth() / 50.0).ceil() * 50.0;
        let hint = format!("search growth rates up to {to:.0} 1/s");
        found.push(Problem::warning("search.growth", what).hint(hint));
    }
    if let Some(m) = fastest(&outside.slower) {
        let what = format!(
            "growth below the window's lowest frequency of {:.0} Hz: {:.1} 1/s at {:.1} Hz, not in the list",
            window.frequency.0,
            m.growth(),
            m.frequency()
        );
        let hint = "search frequencies from 0 Hz";
        found.push(Problem::warning("search.frequency", what).hint(hint));
    }
    if let Some(m) = fastest(&outside.milder) {
        let what = format!(
            "growth slower than the window's lower edge of {:.0} 1/s: {:.1} 1/s at {:.1} Hz, not in the list",
            window.growth.0,
            m.growth(),
            m.frequency()
        );
        let hint = "search growth rates from 0 1/s or below";
        found.push(Problem::warning("search.growth", what).hint(hint));
    }
    found
}

/// What qualifies the modes of a list: growth so fast that a response is taken far from where it was
/// measured, `|growth| delay > 1`.
pub fn of_modes(network: &Network, list: &ModeList) -> Vec<Problem> {
    let mut found = Vec::new();
    for (delay, _) in delays(network) {
        let tau = network.values[delay];
        let beyond = || list.modes.iter().filter(|m| m.growth().abs() * tau > 1.0);
        let Some(worst) = beyond().max_by(|a, b| a.growth().abs().total_cmp(&b.growth().abs()))
        else {
            continue;
        };
        let count = match beyond().count() {
            1 => "1 mode".to_owned(),
            n => format!("{n} modes"),
        };
        let what = format!(
            "for {count} growth rate times delay exceeds 1 ({:.1} at {:.1} Hz): a response known from \
             steady forcing is extrapolated there",
            worst.growth().abs() * tau,
            worst.frequency()
        );
        found.push(
            Problem::warning(name(network, delay), what)
                .hint("take the growth rates of such modes as signs, not as values"),
        );
    }
    found
}

/// Gaussian delays wider than a third of their mean.
pub fn of_responses(network: &Network) -> Vec<Problem> {
    let mut found = Vec::new();
    for (delay, spread) in delays(network) {
        let Some(spread) = spread else { continue };
        let (mean, width) = (network.values[delay], network.values[spread]);
        if width > mean / 3.0 {
            let time = |t| write_rounded(t, Dimension::Time, 4);
            let what = format!(
                "a spread of {} is more than a third of the mean delay {}, so part of the response would \
                 come before its cause",
                time(width),
                time(mean)
            );
            found.push(Problem::warning(name(network, spread), what));
        }
    }
    found
}

/// The delay of every response with its spread.
pub fn delays(network: &Network) -> Vec<(KnobId, Option<KnobId>)> {
    network
        .elements()
        .filter_map(|(_, e)| match &e.kind {
            Kind::Flame(flame) => Some(&flame.responses),
            _ => None,
        })
        .flatten()
        .map(|r| match r.law {
            ResponseLaw::NTau { delay, .. } => (delay, None),
            ResponseLaw::Gaussian { delay, spread, .. } => (delay, Some(spread)),
        })
        .collect()
}

fn name(network: &Network, knob: KnobId) -> String {
    let knob = network.layout.knobs.get(knob.0);
    knob.map_or_else(|| "network".to_owned(), |k| k.name.clone())
}
