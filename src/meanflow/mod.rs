//! The mean flow: a network to the state at every station.
//!
//! Mass flow is the same everywhere. Stagnation enthalpy is kept except over a flame, whose static
//! temperature is stated. What remains in each element is its third balance,
//! [`Kind::third_balance`], solved on the subsonic branch element by element from the feed
//! (`crossing`). A stated throat at the exit fixes the Mach number at the first station instead
//! (`throat`). Values are found in plain numbers; derivatives follow by Newton corrections in the
//! number type asked for, and are exact.

mod crossing;
mod fault;
mod march;
mod throat;

use crate::elements::Kind;
use crate::elements::ends::{Exit, ExitEnd, Feed, FeedEnd, FeedFlow};
use crate::gas::State;
use crate::knobs::KnobId;
use crate::network::{ElementId, Layout, Network, StationId, areas};
use crate::numerics::dual::Real;
use crate::problems::{Problem, Problems};
use fault::Fault;
use march::{Chain, gas};
use throat::{Inflow, Stated};

/// Mach number above which an element modelled as loss-free is doubtful (common practice).
pub const LOSS_FREE_MACH: f64 = 0.3;

/// The steady flow through a network.
#[derive(Clone, Debug, PartialEq)]
pub struct MeanFlow<T> {
    /// The state at each station, by [`StationId`].
    pub states: Vec<State<T>>,
    /// Throat area of a choked exit (m^2); it follows from the flow where not stated.
    pub throat_area: Option<T>,
    /// Mean heat release (W) by [`ElementId`], of flames only.
    pub heat_release: Vec<Option<T>>,
    /// What qualifies the answer.
    pub warnings: Vec<Problem>,
}

impl MeanFlow<f64> {
    /// The same flow in another number type, as constants.
    pub fn lift<T: Real>(&self) -> MeanFlow<T> {
        MeanFlow {
            states: self.states.iter().map(State::lift).collect(),
            throat_area: self.throat_area.map(T::from),
            heat_release: self.heat_release.iter().map(|h| h.map(T::from)).collect(),
            warnings: self.warnings.clone(),
        }
    }
}

impl<T> MeanFlow<T> {
    /// The state at a station.
    pub fn state(&self, station: StationId) -> Option<&State<T>> {
        self.states.get(station.0)
    }
}

/// Solves the mean flow of a chain.
///
/// Exact in value and, over a number type with derivatives, in every derivative it carries.
///
/// # Errors
///
/// Names the element where flow would pass Mach 1, a flame colder than its inlet, a choked end without
/// flow, flow and pressure that are not stated or stated twice, and anything not finite.
pub fn solve<T: Real>(network: &Network<T>) -> Result<MeanFlow<T>, Problems> {
    let layout = &*network.layout;
    let (feed, exit) = ends(layout)?;
    let areas = areas::station_areas(network);
    let mut states = Vec::with_capacity(layout.links.len());
    let flow = flow_knob(feed);
    let told = |fault: Fault| Problems::from(fault.problem(layout, flow));

    let throat = stated_throat(exit).map(|s| s.area(&network.values));
    run(network, feed, throat, &areas, &mut states)?.map_err(told)?;
    let fault = |element: usize| {
        told(Fault::NotFinite {
            element: ElementId(element),
        })
    };

    let mut flowing = true;
    if let Some(first) = states.first() {
        flowing = first.velocity.value() != 0.0;
    }
    let mut problems = Problems::new();
    let last = layout.elements.len().saturating_sub(1);
    let choked_exit = matches!(exit.end, ExitEnd::Choked { .. });
    for (choked, element) in [
        (matches!(feed.end, FeedEnd::Choked), 0),
        (choked_exit, last),
    ] {
        if choked && !flowing {
            problems.push(
                Fault::NoFlow {
                    element: ElementId(element),
                }
                .problem(layout, flow),
            );
        }
    }
    if problems.any_error() {
        return Err(problems);
    }
    let throat_area = match states.last() {
        Some(s) if choked_exit => {
            Some(throat.unwrap_or_else(|| s.mass_flow() / throat::exit_flux(s)))
        }
        _ => None,
    };
    let mut heat_release = vec![None; layout.elements.len()];
    for (i, pair) in states.windows(2).enumerate() {
        let element = layout.links.get(i).map_or(last, |l| l.to.0);
        let [before, after] = pair else { continue };
        let flame = layout
            .elements
            .get(element)
            .is_some_and(|e| matches!(e.kind, Kind::Flame(_)));
        if let (true, Some(slot)) = (flame, heat_release.get_mut(element)) {
            let rise = after.stagnation_enthalpy() - before.stagnation_enthalpy();
            *slot = Some(after.mass_flow() * rise);
        }
    }
    if states.iter().any(|s| !s.is_finite())
        || throat_area.is_some_and(|a| !a.is_finite())
        || heat_release.iter().flatten().any(|q| !q.is_finite())
    {
        let at = states.iter().position(|s| !s.is_finite()).unwrap_or(last);
        return Err(fault(layout.links.get(at).map_or(last, |l| l.from.0)));
    }
    let warnings = warnings(layout, &states, &heat_release);
    Ok(MeanFlow {
        states,
        throat_area,
        heat_release,
        warnings,
    })
}

/// Both ends of a chain; an error where the layout is none.
fn ends(layout: &Layout) -> Result<(&Feed, &Exit), Problem> {
    let chain = layout.links.len() + 1 == layout.elements.len()
        && layout
            .links
            .iter()
            .enumerate()
            .all(|(i, l)| l.from.0 == i && l.to.0 == i + 1);
    let kinds = (layout.elements.first(), layout.elements.last());
    match kinds {
        (Some(feed), Some(exit)) if chain => match (&feed.kind, &exit.kind) {
            (Kind::Feed(feed), Kind::Exit(exit)) => Ok((feed, exit)),
            _ => Err(Problem::error(
                "feed",
                "a chain begins with a feed and ends with an exit",
            )),
        },
        _ => Err(Problem::error(
            "feed",
            "the mean flow of a network that is no chain is not known",
        )),
    }
}

fn stated_throat(exit: &Exit) -> Option<crate::elements::Section> {
    match exit.end {
        ExitEnd::Choked { throat } => throat,
        _ => None,
    }
}

/// The knob that states the feed's flow.
fn flow_knob(feed: &Feed) -> Option<KnobId> {
    match feed.flow {
        FeedFlow::MassFlow(k) | FeedFlow::Velocity(k) | FeedFlow::Mach(k) => Some(k),
        FeedFlow::FromThroat => None,
    }
}

/// Fills `states`. The outer error says what is stated too much or too little, the inner one why
/// no flow satisfies what is stated.
fn run<T: Real>(
    network: &Network<T>,
    feed: &Feed,
    throat: Option<T>,
    areas: &[T],
    states: &mut Vec<State<T>>,
) -> Result<Result<(), Fault>, Problem> {
    let values = &network.values;
    let layout = &*network.layout;
    let Some(&area) = areas.first() else {
        return Err(Problem::error("feed", "the network has no station"));
    };
    let chain = Chain {
        layout,
        values,
        areas,
        trial: false,
    };
    let gas = gas(feed.gas, values);
    let temperature = values[feed.temperature];
    let pressure = feed.pressure.map(|k| values[k]);
    let direct = |pressure: T, velocity: T| State {
        gas,
        pressure,
        temperature,
        velocity,
        area,
    };
    let inflow = |stated| Inflow {
        gas,
        temperature,
        area,
        stated,
    };
    let first = match (feed.flow, pressure, throat) {
        (FeedFlow::FromThroat, Some(p), Some(throat)) => {
            return Ok(throat::march(
                chain,
                inflow(Stated::Pressure(p)),
                throat,
                states,
            ));
        }
        (FeedFlow::MassFlow(k), None, Some(throat)) => {
            if values[k].value() == 0.0 {
                return Ok(Err(Fault::NoFlow {
                    element: ElementId(layout.elements.len().saturating_sub(1)),
                }));
            }
            return Ok(throat::march(
                chain,
                inflow(Stated::MassFlow(values[k])),
                throat,
                states,
            ));
        }
        (FeedFlow::Velocity(_) | FeedFlow::Mach(_), None, Some(_)) => {
            let knob = flow_knob(feed).and_then(|k| layout.knobs.get(k.0));
            let subject = knob.map_or("feed", |k| k.name.as_str());
            return Err(Problem::error(
                subject,
                "the throat area alone fixes the velocity everywhere, so that this and a throat area \
                 cannot both be stated, and no pressure follows from them",
            )
            .hint("state the mass flow or the pressure of the feed beside the throat area"));
        }
        (FeedFlow::FromThroat, _, None) => {
            return Err(Problem::error("feed", "no flow is stated")
                .hint("state mass_flow, velocity or mach, or the throat area of a choked exit"));
        }
        (_, None, _) => {
            return Err(Problem::error("feed", "no pressure is stated")
                .hint("state it, or the mass flow beside the throat area of a choked exit"));
        }
        (_, Some(_), Some(_)) => {
            return Err(Problem::error(
                "exit",
                "the throat area, the feed's pressure and the feed's flow are all stated; each \
                 follows from the other two",
            )
            .hint("leave one of them out"));
        }
        (FeedFlow::MassFlow(k), Some(p), None) => {
            direct(p, values[k] * gas.gas_constant() * temperature / (p * area))
        }
        (FeedFlow::Velocity(k), Some(p), None) => direct(p, values[k]),
        (FeedFlow::Mach(k), Some(p), None) => direct(p, values[k] * gas.sound_speed(temperature)),
    };
    Ok(chain.march(first, states))
}

fn warnings<T: Real>(
    layout: &Layout,
    states: &[State<T>],
    heat_release: &[Option<T>],
) -> Vec<Problem> {
    let mut found = Vec::new();
    let mut outside = false;
    for (i, (link, state)) in layout.links.iter().zip(states).enumerate() {
        let Some(element) = layout.elements.get(link.from.0) else {
            continue;
        };
        let name = element.name.as_str();
        // Told where the stream leaves the range, not again at every station after it.
        let beyond = state.gas.beyond_range(state.temperature);
        if let (Some(what), false) = (&beyond, outside) {
            let subject = match &element.kind {
                Kind::Feed(_) => "feed.temperature".to_owned(),
                Kind::Flame(_) => format!("{name}.burnt_temperature"),
                _ => name.to_owned(),
            };
            found.push(Problem::warning(subject, what.as_str()));
        }
        outside = beyond.is_some();
        let mach = state.value().mach().abs();
        let before = i.checked_sub(1).and_then(|i| states.get(i));
        let mach = before.map_or(mach, |s| mach.max(s.value().mach().abs()));
        let loss_free = matches!(element.kind, Kind::Duct(_) | Kind::Contraction(_));
        if loss_free && mach > LOSS_FREE_MACH {
            found.push(Problem::warning(
                name,
                format!(
                    "Mach {mach:.3} in `{name}`, which is modelled as loss-free; above Mach \
                     {LOSS_FREE_MACH} friction and losses matter"
                ),
            ));
        }
    }
    for (element, heat) in layout.elements.iter().zip(heat_release) {
        if let Some(q) = heat.map(Real::value).filter(|&q| q < 0.0) {
            let name = &element.name;
            let what = format!(
                "its mean heat release is negative, {q:.1} W: it cools the stream that reaches it"
            );
            let hint =
                "state a temperature above that of its inlet, which `stillflame flow` prints";
            found.push(Problem::warning(format!("{name}.burnt_temperature"), what).hint(hint));
        }
    }
    found
}

#[cfg(test)]
mod rig;
#[cfg(test)]
mod tests;
