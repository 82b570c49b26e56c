//! Chains built in code, for tests.

use std::sync::Arc;

use crate::elements::ends::{EXIT_KNOBS, Exit, ExitEnd, FEED_KNOBS, Feed, FeedEnd, FeedFlow};
use crate::elements::flame::{Basis, Flame};
use crate::elements::{
    Element, GAS_KNOBS, GasChoice, Kind, Section, area_change, duct, flame, plenum, restriction,
};
use crate::gas::Gas;
use crate::knobs::{Knob, KnobId, KnobSpec, Values};
use crate::network::{ElementId, Layout, Link, Network, Search, areas};

/// How much flows.
#[derive(Clone, Copy, Debug)]
pub(super) enum Flow {
    Mass(f64),
    Velocity(f64),
    Mach(f64),
    FromThroat,
}

/// A chain under construction; the exit comes last.
pub(super) struct Rig {
    elements: Vec<Element>,
    knobs: Vec<Knob>,
    values: Vec<f64>,
}

impl Rig {
    pub(super) fn new(
        gas: Gas<f64>,
        flow: Flow,
        temperature: f64,
        pressure: Option<f64>,
        end: FeedEnd,
    ) -> Self {
        let mut rig = Rig {
            elements: vec![],
            knobs: vec![],
            values: vec![],
        };
        let gas = rig.gas("feed.gas", gas);
        let flow = match flow {
            Flow::Mass(x) => FeedFlow::MassFlow(rig.knob("feed", FEED_KNOBS, "mass_flow", x)),
            Flow::Velocity(x) => FeedFlow::Velocity(rig.knob("feed", FEED_KNOBS, "velocity", x)),
            Flow::Mach(x) => FeedFlow::Mach(rig.knob("feed", FEED_KNOBS, "mach", x)),
            Flow::FromThroat => FeedFlow::FromThroat,
        };
        let temperature = rig.knob("feed", FEED_KNOBS, "temperature", temperature);
        let pressure = pressure.map(|p| rig.knob("feed", FEED_KNOBS, "pressure", p));
        rig.push(
            "feed",
            Kind::Feed(Feed {
                gas,
                flow,
                temperature,
                pressure,
                end,
            }),
        );
        rig
    }

    fn push(&mut self, name: &str, kind: Kind) {
        self.elements.push(Element {
            name: name.to_owned(),
            kind,
        });
    }

    fn knob(&mut self, element: &str, specs: &[KnobSpec], key: &str, value: f64) -> KnobId {
        let spec = *specs.iter().find(|s| s.key == key).unwrap();
        self.knobs.push(Knob {
            name: format!("{element}.{key}"),
            spec,
        });
        self.values.push(value);
        KnobId(self.knobs.len() - 1)
    }

    fn gas(&mut self, subject: &str, gas: Gas<f64>) -> GasChoice {
        match gas {
            Gas::Air => GasChoice::Air,
            Gas::Perfect {
                gamma,
                gas_constant,
            } => GasChoice::PerfectByConstant {
                gamma: self.knob(subject, GAS_KNOBS, "gamma", gamma),
                gas_constant: self.knob(subject, GAS_KNOBS, "gas_constant", gas_constant),
            },
        }
    }

    pub(super) fn duct(mut self, name: &str, area: f64) -> Self {
        let length = self.knob(name, duct::KNOBS, "length", 0.3);
        let section = Section::Area(self.knob(name, duct::KNOBS, "area", area));
        let entropy = duct::Entropy::Mixed;
        self.push(
            name,
            Kind::Duct(duct::Duct {
                length,
                section,
                entropy,
            }),
        );
        self
    }

    pub(super) fn contraction(mut self, name: &str) -> Self {
        let effective_length = self.knob(name, area_change::KNOBS, "effective_length", 0.0);
        self.push(
            name,
            Kind::Contraction(area_change::Contraction { effective_length }),
        );
        self
    }

    pub(super) fn expansion(mut self, name: &str) -> Self {
        let effective_length = self.knob(name, area_change::KNOBS, "effective_length", 0.0);
        self.push(
            name,
            Kind::Expansion(area_change::Expansion { effective_length }),
        );
        self
    }

    pub(super) fn restriction(mut self, name: &str, loss: f64, diameter: Option<f64>) -> Self {
        let knobs = restriction::KNOBS;
        let loss_coefficient = self.knob(name, knobs, "loss_coefficient", loss);
        let effective_length = self.knob(name, knobs, "effective_length", 0.0);
        let section = diameter.map(|d| Section::Diameter(self.knob(name, knobs, "diameter", d)));
        let kind = restriction::Restriction {
            loss_coefficient,
            effective_length,
            section,
        };
        self.push(name, Kind::Restriction(kind));
        self
    }

    pub(super) fn plenum(mut self, name: &str) -> Self {
        let volume = self.knob(name, plenum::KNOBS, "volume", 0.01);
        self.push(name, Kind::Plenum(plenum::Plenum { volume }));
        self
    }

    pub(super) fn flame(mut self, name: &str, burnt: Option<f64>, gas: Option<Gas<f64>>) -> Self {
        let burnt_temperature =
            burnt.map(|t| self.knob(name, flame::KNOBS, "burnt_temperature", t));
        let burnt_gas = gas.map(|g| self.gas(&format!("{name}.burnt_gas"), g));
        let basis = Basis::HeatRelease;
        let flame = Flame {
            burnt_temperature,
            burnt_gas,
            basis,
            responses: vec![],
        };
        self.push(name, Kind::Flame(flame));
        self
    }

    /// A choked exit with a stated throat area.
    pub(super) fn throat(mut self, area: f64) -> Network<f64> {
        let throat = Some(Section::Area(self.knob(
            "exit",
            EXIT_KNOBS,
            "throat_area",
            area,
        )));
        self.exit(ExitEnd::Choked { throat })
    }

    pub(super) fn exit(mut self, end: ExitEnd) -> Network<f64> {
        self.push("exit", Kind::Exit(Exit { end }));
        let links = (1..self.elements.len())
            .map(|i| Link {
                from: ElementId(i - 1),
                to: ElementId(i),
            })
            .collect::<Vec<_>>();
        let (sections, _) = areas::assign(&self.elements, &links, |_| true);
        let layout = Layout {
            sensors: Vec::new(),
            title: "test chain".to_owned(),
            elements: self.elements,
            links,
            station_sections: sections.into_iter().flatten().collect(),
            knobs: self.knobs,
            search: Search::default(),
        };
        Network {
            layout: Arc::new(layout),
            values: Values(self.values),
        }
    }
}

/// A perfect gas much like air.
pub(super) const COLD: Gas<f64> = Gas::Perfect {
    gamma: 1.4,
    gas_constant: 287.0,
};

/// A chain of twenty-two elements with ends, one of every kind among them.
pub(super) fn long_chain(gas: Gas<f64>) -> Rig {
    Rig::new(gas, Flow::Mass(0.1), 600.0, Some(4e5), FeedEnd::Choked)
        .duct("d1", 0.010)
        .contraction("c1")
        .duct("d2", 0.004)
        .plenum("p1")
        .duct("d3", 0.006)
        .restriction("r1", 2.0, None)
        .duct("d4", 0.006)
        .contraction("c2")
        .duct("d5", 0.003)
        .expansion("e1")
        .duct("d6", 0.008)
        .flame("f1", Some(1400.0), None)
        .duct("d7", 0.008)
        .contraction("c3")
        .duct("d8", 0.006)
        .expansion("e2")
        .duct("d9", 0.009)
        .flame("f2", Some(1800.0), None)
        .duct("d10", 0.009)
        .restriction("r2", 0.5, Some(0.08))
}
