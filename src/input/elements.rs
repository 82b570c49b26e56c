//! One `[[element]]` table: its kind decides which keys it has.

use super::build::unread_element;
use super::document::{Entry, Node, Table, Value};
use super::ends::gas;
use super::fields::{Fields, Reader};
use super::references;
use crate::elements::area_change::{self, Contraction, Expansion};
use crate::elements::duct::{self, Duct, Entropy};
use crate::elements::flame::{self, Basis, Flame, Reference, Response};
use crate::elements::plenum::{self, Plenum};
use crate::elements::restriction::{self, Restriction};
use crate::elements::{Element, Kind, Section};
use crate::flame::{KNOBS as RESPONSES, ResponseLaw};
use crate::problems::Problem;

#[derive(Clone, Copy)]
enum Word {
    Duct,
    Contraction,
    Expansion,
    Restriction,
    Plenum,
    Flame,
}

const KINDS: &[(&str, Word)] = &[
    ("duct", Word::Duct),
    ("contraction", Word::Contraction),
    ("expansion", Word::Expansion),
    ("restriction", Word::Restriction),
    ("plenum", Word::Plenum),
    ("flame", Word::Flame),
];

pub(super) fn element(reader: &mut Reader, table: &Table, name: String) -> Element {
    let mut fields = Fields::new(table, &name, "an element");
    fields.text(reader, "name");
    let Some(word) = fields.required_choice(reader, "kind", KINDS) else {
        // Its other keys cannot be judged.
        fields.abandon(reader);
        return Element {
            kind: unread_element(reader),
            name,
        };
    };
    let kind = match word {
        Word::Duct => Kind::Duct(duct(reader, &mut fields)),
        Word::Contraction => {
            fields.describes("a contraction");
            let effective_length = fields.required(reader, area_change::KNOBS, "effective_length");
            Kind::Contraction(Contraction { effective_length })
        }
        Word::Expansion => {
            fields.describes("an expansion");
            let effective_length = fields.required(reader, area_change::KNOBS, "effective_length");
            Kind::Expansion(Expansion { effective_length })
        }
        Word::Restriction => {
            fields.describes("a restriction");
            Kind::Restriction(Restriction {
                loss_coefficient: fields.required(reader, restriction::KNOBS, "loss_coefficient"),
                effective_length: fields.required(reader, restriction::KNOBS, "effective_length"),
                section: fields.section(reader, restriction::KNOBS, "diameter", "area"),
            })
        }
        Word::Plenum => {
            fields.describes("a plenum");
            Kind::Plenum(Plenum {
                volume: fields.required(reader, plenum::KNOBS, "volume"),
            })
        }
        Word::Flame => Kind::Flame(flame(reader, &mut fields)),
    };
    fields.finish(reader);
    Element { name, kind }
}

fn duct(reader: &mut Reader, fields: &mut Fields<'_>) -> Duct {
    fields.describes("a duct");
    let length = fields.required(reader, duct::KNOBS, "length");
    let section = fields
        .section(reader, duct::KNOBS, "diameter", "area")
        .unwrap_or_else(|| {
            let problem =
                Problem::error(fields.prefix.as_str(), "a duct needs `diameter` or `area`");
            fields.missing(
                &["diameter", "area"],
                problem.hint("such as diameter = \"80 mm\""),
            );
            Section::Area(reader.unread())
        });
    let stated = fields.states("entropy");
    let entropy = match fields.choice(reader, "entropy", &[("mixed", false), ("carried", true)]) {
        Some(true) => Entropy::Carried {
            dispersion: fields.required(reader, duct::KNOBS, "entropy_dispersion"),
        },
        None if stated => {
            fields.number(reader, duct::KNOBS, "entropy_dispersion");
            Entropy::Mixed
        }
        Some(false) | None => {
            let why = "only a duct with entropy = \"carried\" disperses it";
            fields.misplaced("entropy", &["entropy_dispersion"], why);
            Entropy::Mixed
        }
    };
    Duct {
        length,
        section,
        entropy,
    }
}

fn flame(reader: &mut Reader, fields: &mut Fields<'_>) -> Flame {
    fields.describes("a flame");
    let stated = fields.states("basis");
    let basis = fields.choice(
        reader,
        "basis",
        &[
            ("heat release", Basis::HeatRelease),
            ("velocity", Basis::Velocity),
        ],
    );
    let burnt_temperature = fields.number(reader, flame::KNOBS, "burnt_temperature");
    let needs_temperature = basis == Some(Basis::HeatRelease) || !stated;
    if burnt_temperature.is_none() && needs_temperature {
        let problem = Problem::error(
            fields.subject("burnt_temperature"),
            "a flame needs `burnt_temperature`, the static temperature behind it",
        );
        let hint = "such as burnt_temperature = \"1800 K\"; only basis = \"velocity\" does without";
        fields.missing(&["burnt_temperature"], problem.hint(hint));
    }
    let burnt_gas = gas(reader, fields, "burnt_gas");
    let responses = responses(reader, fields);
    fields.kept_in(
        "response",
        RESPONSES.iter().map(|s| s.key).chain(["reference"]),
    );
    Flame {
        burnt_temperature,
        burnt_gas,
        basis: basis.unwrap_or(Basis::HeatRelease),
        responses,
    }
}

fn responses(reader: &mut Reader, fields: &mut Fields<'_>) -> Vec<Response> {
    let Some(Entry { node, mark, .. }) = fields.entry(reader, "response") else {
        return Vec::new();
    };
    let flame = fields.prefix.clone();
    let subject = fields.subject("response");
    let form = "write response = { kind = \"n-tau\", interaction_index = 1.0, delay = \"3 ms\" }, \
                a list of such tables, or [[element.response]]";
    let items: Vec<&Node> = match &node.value {
        Value::Table(_) => vec![node],
        Value::List(items) if items.is_empty() => {
            reader.report(
                mark,
                Problem::error(subject, "the list of responses is empty")
                    .hint("leave response out for a flame of steady heat"),
            );
            return Vec::new();
        }
        Value::List(items) => items.iter().collect(),
        Value::Unread => return Vec::new(),
        other => {
            let what = format!("a response belongs here, and this is {}", other.noun());
            reader.report(&node.mark, Problem::error(subject, what).hint(form));
            return Vec::new();
        }
    };
    let several = items.len() > 1;
    let mut found = Vec::new();
    for (i, item) in items.into_iter().enumerate() {
        let numbered = format!("{subject}.{}", i + 1);
        reader.sources.name(&numbered, &item.mark);
        let Value::Table(table) = &item.value else {
            let what = format!("a response belongs here, and this is {}", item.value.noun());
            reader.report(&item.mark, Problem::error(numbered, what).hint(form));
            continue;
        };
        // The knobs of an only response hang under the flame itself.
        let (prefix, knobs) = if several {
            (&numbered, &numbered)
        } else {
            (&subject, &flame)
        };
        let mut fields = Fields::new(table, prefix, "a response").hung_under(knobs, &item.mark);
        if let Some(response) = response(reader, &mut fields, &flame) {
            fields.finish(reader);
            found.push(response);
        } else {
            fields.abandon(reader);
        }
    }
    found
}

/// One response; `None` where its kind is unknown, so that its other keys cannot be judged.
fn response(reader: &mut Reader, fields: &mut Fields<'_>, flame: &str) -> Option<Response> {
    let gaussian =
        fields.required_choice(reader, "kind", &[("n-tau", false), ("gaussian", true)])?;
    let interaction_index = fields.required(reader, RESPONSES, "interaction_index");
    let delay = fields.required(reader, RESPONSES, "delay");
    let law = if gaussian {
        let spread = fields.required(reader, RESPONSES, "spread");
        ResponseLaw::Gaussian {
            interaction_index,
            delay,
            spread,
        }
    } else {
        fields.misplaced("kind", &["spread"], "only kind = \"gaussian\" has a spread");
        ResponseLaw::NTau {
            interaction_index,
            delay,
        }
    };
    let reference = match fields.text(reader, "reference") {
        Some((text, mark)) => {
            references::read(reader, text, mark, fields.subject("reference"), flame)
        }
        None => Reference::OwnInlet,
    };
    Some(Response { law, reference })
}
