//! Where the assumptions of the model fail, as far as a window, a mean flow or a list of modes decides
//! it.

use super::{Mode, ModeList, Outside, Window, cut_on};
use crate::elements::Kind;
use crate::knobs::KnobId;
use crate::meanflow::MeanFlow;
use crate::network::{ElementId, Network};
use crate::problems::Problem;
use crate::units::{Dimension, write_decimals, write_rounded};

pub use crate::network::responses::{delays, of_responses};

/// Part of a wavelength a compact element may be long (common practice).
const COMPACT: f64 = 0.1;

/// What qualifies any answer in a window: plane waves above a cut-on, elements too long to be compact.
pub fn of_window(network: &Network, mean: &MeanFlow<f64>, window: &Window) -> Vec<Problem> {
    let mut found = Vec::new();
    let top = window.frequency.1;
    let hz = |f| write_decimals(f, 0);
    let lowest = cut_on(network, mean)
        .into_iter()
        .min_by(|a, b| a.1.total_cmp(&b.1));
    if let Some((duct, f)) = lowest
        && top > f
    {
        let what = format!(
            "the window reaches {} Hz, above the first cut-on of `{duct}` at {} Hz: waves there \
             are not plane alone",
            hz(top),
            hz(f)
        );
        found.push(
            Problem::warning(duct, what).hint(format!("search up to {} Hz", hz((0.9 * f).floor()))),
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
                "`{}` is not compact at {} Hz: {what}, {}, is more than a tenth of the wavelength, {}",
                element.name,
                hz(top),
                mm(length),
                mm(wavelength)
            );
            let hint = format!(
                "trust it up to {} Hz, or describe it by ducts",
                hz((COMPACT * c / length).floor())
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
    let place = |m: &Mode| {
        let (growth, frequency) = (m.growth(), m.frequency());
        format!(
            "{} 1/s at {} Hz",
            write_decimals(growth, 1),
            write_decimals(frequency, 1)
        )
    };
    let mut found = Vec::new();
    if let Some(m) = fastest(&outside.faster) {
        let what = format!(
            "growth faster than the window's upper edge of {} 1/s: {}, not in the list",
            write_decimals(window.growth.1, 0),
            place(&m)
        );
        let to = (1.1 * m.growth() / 50.0).ceil() * 50.0;
        let hint = format!("search growth rates up to {} 1/s", write_decimals(to, 0));
        found.push(Problem::warning("search.growth", what).hint(hint));
    }
    if let Some(m) = fastest(&outside.slower) {
        let what = format!(
            "growth below the window's lowest frequency of {} Hz: {}, not in the list",
            write_decimals(window.frequency.0, 0),
            place(&m)
        );
        let hint = "search frequencies from 0 Hz";
        found.push(Problem::warning("search.frequency", what).hint(hint));
    }
    if let Some(m) = fastest(&outside.milder) {
        let what = format!(
            "growth slower than the window's lower edge of {} 1/s: {}, not in the list",
            write_decimals(window.growth.0, 0),
            place(&m)
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
            "for {count} growth rate times delay exceeds 1 ({} at {} Hz): a response known from \
             steady forcing is extrapolated there",
            write_decimals(worst.growth().abs() * tau, 1),
            write_decimals(worst.frequency(), 1)
        );
        found.push(
            Problem::warning(name(network, delay), what)
                .hint("take the growth rates of such modes as signs, not as values"),
        );
    }
    found
}

fn name(network: &Network, knob: KnobId) -> String {
    let knob = network.layout.knobs.get(knob.0);
    knob.map_or_else(|| "network".to_owned(), |k| k.name.clone())
}
