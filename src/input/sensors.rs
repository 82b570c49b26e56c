//! The tables `[[sensor]]`: where the microphones of a rig sit.

use super::document::{Node, Table, Value};
use super::fields::{Fields, Reader, shown};
use crate::elements::{Element, Kind};
use crate::network::ElementId;
use crate::network::sensors::{KNOBS, Recess, Sensor};
use crate::problems::{Problem, listed, nearest};
use crate::units::{Dimension, write_rounded};

/// Most sensors of a network.
const MOST: usize = 1000;

pub(super) fn read(reader: &mut Reader, items: &[&Node], elements: &[Element]) -> Vec<Sensor> {
    let mut found: Vec<Sensor> = Vec::new();
    for (i, item) in items.iter().enumerate() {
        let number = format!("sensor.{}", i + 1);
        if i == MOST {
            let what = format!("more than {MOST} sensors");
            reader.report(&item.mark, Problem::error(number, what));
            break;
        }
        let Value::Table(table) = &item.value else {
            let what = format!("a table belongs here, and this is {}", item.value.noun());
            let problem =
                Problem::error(number, what).hint("write each sensor under its own [[sensor]]");
            reader.report(&item.mark, problem);
            continue;
        };
        reader.sources.name(&number, &item.mark);
        let name = name(reader, table, &number, &found, elements);
        found.extend(sensor(reader, table, name, elements));
    }
    found
}

/// The name of a sensor, or its number where it has none that can be used.
fn name(
    reader: &mut Reader,
    table: &Table,
    number: &str,
    before: &[Sensor],
    elements: &[Element],
) -> String {
    let Some(entry) = table.get("name") else {
        let problem = Problem::error(format!("{number}.name"), "a sensor needs a name");
        reader.report_subject(
            problem.hint("give it that of its channel in the record: name = \"p1\", say"),
        );
        return number.to_owned();
    };
    // Anything but text is reported when the table is read.
    let Value::Text(name) = &entry.node.value else {
        return number.to_owned();
    };
    let what =
        if name.trim().is_empty() || name.contains(['.', '=']) || name.contains(char::is_control) {
            format!("`{}` cannot be a name", shown(name))
        } else if before.iter().any(|s| s.name == *name) || elements.iter().any(|e| e.name == *name)
        {
            format!("`{}` names another sensor or element already", shown(name))
        } else {
            reader.sources.name(name, &entry.node.mark);
            return name.clone();
        };
    let problem = Problem::error(format!("{number}.name"), what);
    reader.report(
        &entry.node.mark,
        problem.hint("give it a name of its own, without a dot or `=`"),
    );
    number.to_owned()
}

fn sensor(
    reader: &mut Reader,
    table: &Table,
    name: String,
    elements: &[Element],
) -> Option<Sensor> {
    let mut fields = Fields::new(table, &name, "a sensor");
    fields.text(reader, "name");
    if !fields.states("element") {
        let problem = Problem::error(
            fields.subject("element"),
            "a sensor needs `element`, the one it sits in",
        );
        fields.missing(&["element"], problem.hint("such as element = \"chamber\""));
    }
    let element = fields.text(reader, "element").and_then(|(text, mark)| {
        let at = elements.iter().position(|e| e.name == text);
        let names = || elements.iter().map(|e| e.name.as_str());
        // It may well mean an element that could not be read, which has been told.
        let unread = elements.len() < 3 || names().any(|n| n.starts_with("element."));
        if at.is_none() && !unread {
            let problem = Problem::error(
                format!("{name}.element"),
                format!("nothing is named `{}`", shown(text)),
            );
            let hint = match nearest(text, names()) {
                Some(meant) => format!("did you mean \"{meant}\"?"),
                None => format!("name one of {}", listed(names().take(20))),
            };
            reader.report(mark, problem.hint(hint));
        }
        at
    });
    let distance = fields.required(reader, KNOBS, "distance");
    let recess = [
        "recess_length",
        "recess_diameter",
        "recess_volume",
        "recess_temperature",
    ]
    .iter()
    .any(|key| fields.states(key))
    .then(|| Recess {
        length: fields.required(reader, KNOBS, "recess_length"),
        diameter: fields.required(reader, KNOBS, "recess_diameter"),
        volume: fields.required(reader, KNOBS, "recess_volume"),
        temperature: fields.required(reader, KNOBS, "recess_temperature"),
    });
    if recess.is_none() {
        // Known keys all the same, for hints on misspelt ones.
        for key in ["recess_length", "recess_diameter", "recess_temperature"] {
            fields.number(reader, KNOBS, key);
        }
    }
    fields.finish(reader);
    let element = element?;
    let at = reader.values.get(distance.0).copied().unwrap_or(f64::NAN);
    let owner = elements.get(element)?;
    let length = match &owner.kind {
        Kind::Duct(duct) => reader.values.get(duct.length.0).copied()?,
        Kind::Feed(_)
        | Kind::Exit(_)
        | Kind::Contraction(_)
        | Kind::Expansion(_)
        | Kind::Restriction(_)
        | Kind::Plenum(_)
        | Kind::Flame(_) => 0.0,
    };
    if at > length * (1.0 + 1e-9) {
        let m = |x: f64| write_rounded(x, Dimension::Length, 6);
        let (what, hint) = if length > 0.0 {
            (
                format!(
                    "{} from its inlet lies outside `{}`, which is {} long",
                    m(at),
                    owner.name,
                    m(length)
                ),
                "count the distance from the inlet of the element the sensor sits in".to_owned(),
            )
        } else {
            (
                format!(
                    "`{}` has no length along which a sensor could sit",
                    owner.name
                ),
                "write distance = \"0 m\", or name the duct beside it".to_owned(),
            )
        };
        reader.report_subject(Problem::error(format!("{name}.distance"), what).hint(hint));
    }
    Some(Sensor {
        name,
        element: ElementId(element),
        distance,
        recess,
    })
}
