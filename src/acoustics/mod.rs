//! Linear acoustics of a network about its mean flow: every element lowered to wave primitives, the
//! chain of them eliminated into one characteristic function, and the global matrix as its witness.

pub mod matrix;
pub mod vary;

use num_complex::Complex64;

use crate::elements::flame::Reference;
use crate::elements::lowering::Between;
use crate::elements::{Kind, Sensed};
use crate::gas::State;
use crate::meanflow::MeanFlow;
use crate::network::{ElementId, Layout, Network};
use crate::numerics::dual::{Grad, Real};
use crate::problems::{Problem, Problems};
use crate::waves::front::{self, Characteristic, EliminationError};
use crate::waves::primitive::{Chain, Plane, Step};

/// The acoustics of one network.
#[derive(Clone, Debug, PartialEq)]
pub struct Acoustics<T> {
    /// Its primitives; planes are the stations.
    pub chain: Chain<T>,
    /// Its characteristic function.
    pub characteristic: Characteristic<T>,
}

impl<const M: usize> Acoustics<Grad<f64, M>> {
    /// Taylor coefficients `D^(k)/k!` at `s`, orders 0 to `N - 1`, each with its derivative along every direction
    /// the network is seeded in.
    pub fn taylor<const N: usize>(&self, s: Complex64) -> [(Complex64, [Complex64; M]); N] {
        let tape = &self.characteristic.tape;
        tape.taylor_at::<N>(s).map(|c| {
            let derivative = |i: usize| Complex64::new(c.re.d[i], c.im.d[i]);
            (c.value(), std::array::from_fn(derivative))
        })
    }
}

/// Lowers a network and eliminates it.
///
/// # Errors
/// A network that is no chain from feed to exit, an unknown reference, or a balance that does not
/// determine its outlet.
pub fn assemble<T: Real>(
    network: &Network<T>,
    mean: &MeanFlow<T>,
) -> Result<Acoustics<T>, Problems> {
    eliminated(network, lower(network, mean)?)
}

fn eliminated<T: Real>(network: &Network<T>, chain: Chain<T>) -> Result<Acoustics<T>, Problems> {
    let characteristic = front::eliminate(&chain).map_err(|e| told(&e, network))?;
    Ok(Acoustics {
        chain,
        characteristic,
    })
}

/// The same, from the acoustics of a network like this one: where only numbers of laws differ (a response, a storage, a
/// reflection, carried entropy) they are put in place of the old ones and nothing is eliminated again.
///
/// # Errors
/// As for [`assemble`].
pub fn assemble_like(
    before: Acoustics<f64>,
    network: &Network,
    mean: &MeanFlow<f64>,
) -> Result<Acoustics<f64>, Problems> {
    let chain = lower(network, mean)?;
    if !chain.same_but_for_laws(&before.chain) {
        return eliminated(network, chain);
    }
    let Characteristic {
        tape,
        joints,
        closed_late,
    } = before.characteristic;
    match tape.with_laws_of(&chain) {
        Some(tape) => Ok(Acoustics {
            chain,
            characteristic: Characteristic {
                tape,
                joints,
                closed_late,
            },
        }),
        None => eliminated(network, chain),
    }
}

fn told<T>(error: &EliminationError, network: &Network<T>) -> Problems {
    let name = |step: usize| {
        network
            .layout
            .elements
            .get(step + 1)
            .map_or_else(|| "network".into(), |e| e.name.clone())
    };
    match error {
        EliminationError::Singular(step) => Problem::error(
            name(*step),
            "its linear balance does not determine the waves behind it",
        )
        .hint("a flow at Mach 1 does this; lower the mass flow or widen the passage"),
        EliminationError::OwnOutlet(step) => Problem::error(
            name(*step),
            "it follows its own outlet in two different ways",
        ),
        EliminationError::TooMany => Problem::error(
            "network",
            "too many flames follow stations across one another",
        )
        .hint("move some references to the flame's own inlet"),
    }
    .into()
}

/// The primitives of a network.
///
/// # Errors
/// A network that is no chain from feed to exit, or an unknown reference.
pub fn lower<T: Real>(network: &Network<T>, mean: &MeanFlow<T>) -> Result<Chain<T>, Problems> {
    let no_chain = || {
        Problem::error(
            "network",
            "its elements do not form one chain from feed to exit",
        )
    };
    let elements = &network.layout.elements;
    let [first, middle @ .., last] = elements.as_slice() else {
        return Err(no_chain().into());
    };
    let (Kind::Feed(feed), Kind::Exit(exit)) = (&first.kind, &last.kind) else {
        return Err(no_chain().into());
    };
    let (Some(inlet), Some(outlet)) = (mean.states.first(), mean.states.last()) else {
        return Err(no_chain().into());
    };
    let mut steps = Vec::with_capacity(middle.len());
    let mut sensed = Vec::new();
    for (plane, (element, pair)) in middle.iter().zip(mean.states.windows(2)).enumerate() {
        let [up, down] = pair else { continue };
        sensed.clear();
        if let Kind::Flame(flame) = &element.kind {
            for response in &flame.responses {
                let plane =
                    plane_of(&network.layout, &response.reference, plane).ok_or_else(|| {
                        Problem::error(&element.name, "its response follows no station")
                    })?;
                let state = state_at(mean, plane).ok_or_else(no_chain)?;
                sensed.push(Sensed { state, plane });
            }
        }
        let between = Between { up, down, plane };
        let step: Step<T> = element
            .kind
            .lower(&between, &network.values, &sensed)
            .ok_or_else(no_chain)?;
        steps.push(step);
    }
    if steps.len() + 1 != mean.states.len() {
        return Err(no_chain().into());
    }
    Ok(Chain {
        start: feed.lower(inlet, &network.values),
        steps,
        end: exit.lower(outlet, &network.values),
    })
}

fn state_at<T>(mean: &MeanFlow<T>, plane: Plane) -> Option<&State<T>> {
    mean.states.get(plane)
}

/// The plane a reference means, for a flame whose inlet is `own`.
fn plane_of(layout: &Layout, reference: &Reference, own: Plane) -> Option<Plane> {
    let id = |name: &str| -> Option<ElementId> { layout.element(name) };
    match reference {
        Reference::OwnInlet => Some(own),
        Reference::InletOf(name) => id(name).and_then(|e| layout.inlet(e)).map(|s| s.0),
        Reference::OutletOf(name) => id(name).and_then(|e| layout.outlet(e)).map(|s| s.0),
    }
}
