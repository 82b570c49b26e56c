//! What random networks are made of. Each list is written together with a `match` that leaves nothing
//! out: a new element, end or law does not compile here until it is named, and once named it must be
//! drawn.

use std::collections::BTreeMap;

use stillflame::elements::duct::Entropy;
use stillflame::elements::ends::{ExitEnd, FeedEnd, FeedFlow};
use stillflame::elements::flame::{Basis, Flame, Reference};
use stillflame::elements::{GasChoice, Kind, Section};
use stillflame::flame::ResponseLaw;
use stillflame::waves::law::Law;
use stillflame::waves::primitive::Step;

use crate::common::random::Drawn;

macro_rules! named {
    ($all:ident, $name:ident, $type:ty, { $($pattern:pat => $word:literal),* $(,)? }) => {
        const $all: &[&str] = &[$($word),*];

        fn $name(x: &$type) -> &'static str {
            match x {
                $($pattern => $word),*
            }
        }
    };
}

named!(KINDS, kind, Kind, {
    Kind::Feed(_) => "feed",
    Kind::Exit(_) => "exit",
    Kind::Duct(_) => "duct",
    Kind::Contraction(_) => "contraction",
    Kind::Expansion(_) => "expansion",
    Kind::Restriction(_) => "restriction",
    Kind::Plenum(_) => "plenum",
    Kind::Flame(_) => "flame",
});

named!(FEED_ENDS, feed_end, FeedEnd, {
    FeedEnd::Closed => "feed closed",
    FeedEnd::Open => "feed open",
    FeedEnd::Reservoir => "feed reservoir",
    FeedEnd::Anechoic => "feed anechoic",
    FeedEnd::Choked => "feed choked",
    FeedEnd::Reflection(_) => "feed reflection",
});

named!(EXIT_ENDS, exit_end, ExitEnd, {
    ExitEnd::Closed => "exit closed",
    ExitEnd::Open => "exit open",
    ExitEnd::Anechoic => "exit anechoic",
    ExitEnd::Choked { throat: None } => "exit choked, throat from the flow",
    ExitEnd::Choked { throat: Some(_) } => "exit choked, throat stated",
    ExitEnd::Reflection(_) => "exit reflection",
});

named!(FLOWS, flow, FeedFlow, {
    FeedFlow::MassFlow(_) => "mass flow stated",
    FeedFlow::Velocity(_) => "velocity stated",
    FeedFlow::Mach(_) => "Mach number stated",
    FeedFlow::FromThroat => "flow from the throat",
});

named!(GASES, gas, GasChoice, {
    GasChoice::Air => "air",
    GasChoice::PerfectByConstant { .. } => "perfect gas by gas constant",
    GasChoice::PerfectByMolarMass { .. } => "perfect gas by molar mass",
});

named!(SECTIONS, section, Section, {
    Section::Diameter(_) => "by diameter",
    Section::Area(_) => "by area",
});

named!(ENTROPIES, entropy, Entropy, {
    Entropy::Mixed => "entropy mixed",
    Entropy::Carried { .. } => "entropy carried",
});

named!(BASES, basis, Basis, {
    Basis::HeatRelease => "basis heat release",
    Basis::Velocity => "basis velocity",
});

named!(RESPONSES, response, ResponseLaw, {
    ResponseLaw::NTau { .. } => "n-tau",
    ResponseLaw::Gaussian { .. } => "gaussian",
});

named!(REFERENCES, reference, Reference, {
    Reference::OwnInlet => "own inlet",
    Reference::InletOf(_) => "inlet of another",
    Reference::OutletOf(_) => "outlet of another",
});

named!(LAWS, law, Law<f64>, {
    Law::Delays(_) => "law of delays",
    Law::Polynomial { .. } => "law polynomial",
    Law::Complex { .. } => "law complex",
});

/// What is no variant of a type.
const TRAITS: &[&str] = &[
    "still",
    "flowing",
    "two flames",
    "no response",
    "several responses",
    "responses that follow several stations",
    "interaction index zero",
    "interaction index negative",
    "follows a station upstream",
    "follows a station downstream",
    "follows its own outlet",
    "entropy dispersed",
    "other gas behind a flame",
    "reflection real",
    "reflection complex",
    "slug",
    "no conjugate symmetry",
    "entropy that travels",
];

const EVERYTHING: &[&[&str]] = &[
    KINDS, FEED_ENDS, EXIT_ENDS, FLOWS, GASES, SECTIONS, ENTROPIES, BASES, RESPONSES, REFERENCES,
    LAWS, TRAITS,
];

/// How many networks had each thing.
#[derive(Clone, Debug, Default)]
pub struct Census {
    pub seen: BTreeMap<&'static str, usize>,
}

impl Census {
    /// What was never drawn.
    pub fn lacks(&self) -> Vec<&'static str> {
        let all = EVERYTHING.iter().flat_map(|list| list.iter().copied());
        all.filter(|word| !self.seen.contains_key(word)).collect()
    }

    pub fn take(&mut self, drawn: &Drawn) {
        let mut words = words(drawn);
        words.sort_unstable();
        words.dedup();
        for word in words {
            *self.seen.entry(word).or_default() += 1;
        }
    }
}

fn words(drawn: &Drawn) -> Vec<&'static str> {
    let network = &drawn.network;
    let states = &drawn.solved.mean.states;
    let mut all = vec![if states[0].velocity > 0.0 {
        "flowing"
    } else {
        "still"
    }];
    let mut flames = 0;
    for (id, element) in network.elements() {
        all.push(kind(&element.kind));
        match &element.kind {
            Kind::Feed(feed) => {
                all.extend([feed_end(&feed.end), flow(&feed.flow), gas(&feed.gas)]);
            }
            Kind::Exit(exit) => all.push(exit_end(&exit.end)),
            Kind::Duct(duct) => {
                all.extend([entropy(&duct.entropy), section(&duct.section)]);
                if let Entropy::Carried { dispersion } = duct.entropy
                    && network.values[dispersion] > 0.0
                {
                    all.push("entropy dispersed");
                }
            }
            Kind::Flame(flame) => {
                flames += 1;
                all.push(basis(&flame.basis));
                if let Some(g) = &flame.burnt_gas {
                    all.extend([gas(g), "other gas behind a flame"]);
                }
                all.extend(of_responses(drawn, flame, id.0));
            }
            Kind::Restriction(r) => all.extend(r.section.iter().map(section)),
            Kind::Contraction(_) | Kind::Expansion(_) | Kind::Plenum(_) => {}
        }
    }
    if flames == 2 {
        all.push("two flames");
    }
    all.extend(of_chain(drawn));
    all
}

fn of_responses(drawn: &Drawn, flame: &Flame, own: usize) -> Vec<&'static str> {
    let layout = &drawn.network.layout;
    let mut all = Vec::new();
    match flame.responses.len() {
        0 => all.push("no response"),
        1 => {}
        _ => all.push("several responses"),
    }
    let mut stations = Vec::new();
    for r in &flame.responses {
        all.extend([response(&r.law), reference(&r.reference)]);
        let (ResponseLaw::NTau {
            interaction_index, ..
        }
        | ResponseLaw::Gaussian {
            interaction_index, ..
        }) = r.law;
        let n = drawn.network.values[interaction_index];
        if n == 0.0 {
            all.push("interaction index zero");
        } else if n < 0.0 {
            all.push("interaction index negative");
        }
        // Station k lies between elements k and k + 1.
        let station = match &r.reference {
            Reference::OwnInlet => own - 1,
            Reference::InletOf(name) => layout.element(name).map_or(0, |e| e.0) - 1,
            Reference::OutletOf(name) => layout.element(name).map_or(0, |e| e.0),
        };
        stations.push(station);
        if station == own {
            all.push("follows its own outlet");
        } else if station > own {
            all.push("follows a station downstream");
        } else if station + 1 < own {
            all.push("follows a station upstream");
        }
    }
    stations.sort_unstable();
    stations.dedup();
    if stations.len() > 1 {
        all.push("responses that follow several stations");
    }
    all
}

fn of_chain(drawn: &Drawn) -> Vec<&'static str> {
    let chain = &drawn.solved.acoustics.chain;
    let mut all = Vec::new();
    for (l, _) in chain.start.term.iter().chain(&chain.end.term) {
        all.extend([law(l), "reflection complex", "no conjugate symmetry"]);
    }
    let real = |kind: &Kind| match kind {
        Kind::Feed(f) => matches!(f.end, FeedEnd::Reflection(_)) && chain.start.term.is_none(),
        Kind::Exit(e) => matches!(e.end, ExitEnd::Reflection(_)) && chain.end.term.is_none(),
        _ => false,
    };
    if drawn.network.elements().any(|(_, e)| real(&e.kind)) {
        all.push("reflection real");
    }
    for (step, (_, element)) in chain.steps.iter().zip(drawn.network.elements().skip(1)) {
        match step {
            Step::Travel(t) => {
                if let Some(l) = &t.entropy {
                    all.extend([law(l), "entropy that travels"]);
                }
            }
            Step::Joint(joint) => {
                all.extend(joint.terms.iter().map(|t| law(&t.law)));
                let slug = matches!(
                    element.kind,
                    Kind::Contraction(_) | Kind::Expansion(_) | Kind::Restriction(_)
                );
                if slug && !joint.terms.is_empty() {
                    all.push("slug");
                }
            }
        }
    }
    all
}
