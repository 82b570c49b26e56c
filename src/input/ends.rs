//! The tables `[feed]` and `[exit]`, and gases.

use super::build::{Found, sub_table};
use super::document::{Entry, Table, Value};
use super::fields::{Fields, Reader};
use crate::elements::ends::{
    EXIT_KNOBS, Exit, ExitEnd, FEED_KNOBS, Feed, FeedEnd, FeedFlow, Reflection,
};
use crate::elements::{GAS_KNOBS, GasChoice};
use crate::knobs::KnobSpec;
use crate::problems::{Problem, listed, nearest};

/// Gases a file may name, with what they are.
const GASES: &[(&str, GasChoice)] = &[("air", GasChoice::Air)];

/// Ends of either side that a file may name.
#[derive(Clone, Copy, PartialEq, Eq)]
enum End {
    Closed,
    Open,
    Reservoir,
    Anechoic,
    Choked,
    Reflection,
}

pub(super) fn feed(reader: &mut Reader, table: &Table, throat_stated: Option<bool>) -> Feed {
    let mut fields = Fields::new(table, "feed", "a feed");
    if !fields.states("gas") {
        let problem = Problem::error("feed.gas", "a feed needs `gas`");
        fields.missing(&["gas"], problem.hint("write gas = \"air\", say"));
    }
    let gas = gas(reader, &mut fields, "gas").unwrap_or(GasChoice::Air);
    let stated = fields.one_of(reader, FEED_KNOBS, &["mass_flow", "velocity", "mach"]);
    let pressure = fields.number(reader, FEED_KNOBS, "pressure");
    balance_of_statements(
        reader,
        &mut fields,
        stated.map(|(key, _)| key),
        pressure.is_some(),
        throat_stated,
    );
    let flow = match stated {
        Some(("velocity", knob)) => FeedFlow::Velocity(knob),
        Some(("mach", knob)) => FeedFlow::Mach(knob),
        Some((_, knob)) => FeedFlow::MassFlow(knob),
        None => FeedFlow::FromThroat,
    };
    let temperature = fields.required(reader, FEED_KNOBS, "temperature");
    let end = fields.required_choice(
        reader,
        "end",
        &[
            ("closed", End::Closed),
            ("open", End::Open),
            ("reservoir", End::Reservoir),
            ("anechoic", End::Anechoic),
            ("choked", End::Choked),
            ("reflection", End::Reflection),
        ],
    );
    let reflection = reflection(reader, &mut fields, FEED_KNOBS, end);
    fields.finish(reader);
    let end = match (end, reflection) {
        (Some(End::Open), _) => FeedEnd::Open,
        (Some(End::Reservoir), _) => FeedEnd::Reservoir,
        (Some(End::Anechoic), _) => FeedEnd::Anechoic,
        (Some(End::Choked), _) => FeedEnd::Choked,
        (_, Some(r)) => FeedEnd::Reflection(r),
        (Some(End::Closed | End::Reflection) | None, None) => FeedEnd::Closed,
    };
    Feed {
        gas,
        flow,
        temperature,
        pressure,
        end,
    }
}

/// The mean flow needs two of feed pressure, feed flow and throat area, and bears no third.
fn balance_of_statements(
    reader: &mut Reader,
    fields: &mut Fields<'_>,
    flow: Option<&str>,
    pressure: bool,
    throat: Option<bool>,
) {
    const FLOW: &[&str] = &["mass_flow", "velocity", "mach"];
    const EITHER: &[&str] = &["mass_flow", "velocity", "mach", "pressure"];
    let (keys, subject, what, hint) = match (flow, pressure, throat) {
        (Some(_), true, Some(false) | None)
        | (None, true, Some(true) | None)
        | (Some("mass_flow"), false, Some(true))
        | (Some(_), false, None) => return,
        (Some(flow), false, Some(true)) => {
            let what = format!(
                "`{flow}` cannot stand beside the exit's throat, which alone fixes every Mach number and so leaves the pressure open"
            );
            let p = Problem::error(format!("feed.{flow}"), what);
            reader.report_subject(p.hint("give `mass_flow` or `pressure` in its place"));
            return;
        }
        (Some(flow), true, Some(true)) => {
            let what = format!(
                "`{flow}`, `pressure` and the exit's throat are all given, and two of them say the third"
            );
            let hint = format!("remove `feed.{flow}`, `feed.pressure` or the throat of the exit");
            reader.report_subject(Problem::error(format!("feed.{flow}"), what).hint(hint));
            return;
        }
        (None, true, Some(false)) => (
            FLOW,
            "feed",
            "a feed needs its flow",
            "give `mass_flow`, `velocity` or `mach`, zero for still gas, or the throat of a choked exit",
        ),
        (Some(_), false, Some(false)) => (
            &["pressure"][..],
            "feed.pressure",
            "a feed needs `pressure`",
            "write pressure = \"101325 Pa\", say, or give the throat of a choked exit",
        ),
        (None, false, Some(true)) => (
            EITHER,
            "feed",
            "a throat alone does not say the flow: a feed needs `pressure` or `mass_flow`",
            "give `pressure`, or `mass_flow`",
        ),
        (None, false, Some(false) | None) => (
            EITHER,
            "feed",
            "a feed needs `pressure` and its flow",
            "give `pressure`, and `mass_flow`, `velocity` or `mach`, zero for still gas",
        ),
    };
    fields.missing(keys, Problem::error(subject, what).hint(hint));
}

/// The exit, and whether its condition could be read.
pub(super) fn exit(reader: &mut Reader, table: &Table) -> (Exit, bool) {
    let mut fields = Fields::new(table, "exit", "an exit");
    let end = fields.required_choice(
        reader,
        "end",
        &[
            ("closed", End::Closed),
            ("open", End::Open),
            ("anechoic", End::Anechoic),
            ("choked", End::Choked),
            ("reflection", End::Reflection),
        ],
    );
    let throat = match end {
        Some(End::Choked) | None => {
            fields.section(reader, EXIT_KNOBS, "throat_diameter", "throat_area")
        }
        Some(_) => {
            let keys = &["throat_diameter", "throat_area"];
            fields.misplaced("end", keys, "only end = \"choked\" has a throat");
            None
        }
    };
    let reflection = reflection(reader, &mut fields, EXIT_KNOBS, end);
    fields.finish(reader);
    let readable = end.is_some();
    let end = match (end, reflection) {
        (Some(End::Open), _) => ExitEnd::Open,
        (Some(End::Anechoic), _) => ExitEnd::Anechoic,
        (Some(End::Choked), _) => ExitEnd::Choked { throat },
        (_, Some(r)) => ExitEnd::Reflection(r),
        (Some(End::Closed | End::Reservoir | End::Reflection) | None, None) => ExitEnd::Closed,
    };
    (Exit { end }, readable)
}

/// The numbers of `end = "reflection"`; of an end that could not be read nothing is asked.
fn reflection(
    reader: &mut Reader,
    fields: &mut Fields<'_>,
    specs: &'static [KnobSpec],
    end: Option<End>,
) -> Option<Reflection> {
    match end {
        Some(End::Reflection) => Some(Reflection {
            coefficient: fields.required(reader, specs, "coefficient"),
            phase: fields.required(reader, specs, "phase"),
        }),
        Some(_) => {
            let keys = &["coefficient", "phase"];
            fields.misplaced(
                "end",
                keys,
                "only end = \"reflection\" has a coefficient and a phase",
            );
            None
        }
        None => {
            fields.number(reader, specs, "coefficient");
            fields.number(reader, specs, "phase");
            None
        }
    }
}

/// A gas by name or by table; `None` where it is absent or cannot be read (reported).
pub(super) fn gas(
    reader: &mut Reader,
    fields: &mut Fields<'_>,
    key: &'static str,
) -> Option<GasChoice> {
    let subject = fields.subject(key);
    let forms = "a gas is \"air\", or a table { gamma = 1.4, gas_constant = \"287 J/(kg K)\" }";
    if let Entry { node, .. } = fields.entry(reader, key)?
        && !matches!(node.value, Value::Table(_))
    {
        let Value::Text(name) = &node.value else {
            if matches!(node.value, Value::Unread) {
                return None;
            }
            let what = format!("a gas belongs here, and this is {}", node.value.noun());
            reader.report(&node.mark, Problem::error(subject, what).hint(forms));
            return None;
        };
        if let Some((_, gas)) = GASES.iter().find(|(known, _)| known == name) {
            return Some(*gas);
        }
        let hint = match nearest(name, GASES.iter().map(|(known, _)| *known)) {
            Some(meant) => format!("did you mean \"{meant}\"?"),
            None => forms.to_owned(),
        };
        let what = format!(
            "\"{}\" is no gas this program knows",
            super::fields::shown(name)
        );
        reader.report(&node.mark, Problem::error(subject, what).hint(hint));
        return None;
    }
    let Found::Table(table) = sub_table(reader, fields, key, forms) else {
        return None;
    };
    let mut fields = Fields::new(table, &subject, "a gas");
    let gamma = fields.required(reader, GAS_KNOBS, "gamma");
    let keys = ["gas_constant", "molar_mass"];
    let gas = match fields.one_of(reader, GAS_KNOBS, &keys) {
        Some(("molar_mass", molar_mass)) => GasChoice::PerfectByMolarMass { gamma, molar_mass },
        Some((_, gas_constant)) => GasChoice::PerfectByConstant {
            gamma,
            gas_constant,
        },
        None => {
            let what = format!("a gas needs {}", listed(keys.map(|k| format!("`{k}`"))));
            let hint = "such as gas_constant = \"287 J/(kg K)\"";
            fields.missing(&keys, Problem::error(subject, what).hint(hint));
            GasChoice::PerfectByConstant {
                gamma,
                gas_constant: reader.unread(),
            }
        }
    };
    fields.finish(reader);
    Some(gas)
}
