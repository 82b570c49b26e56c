//! The document as a network: the file's tables in order, then the graph and its areas.

use std::collections::BTreeMap;
use std::sync::Arc;

use super::document::{Entry, Mark, Node, Table, Value};
use super::fields::{Fields, Reader, shown};
use super::{elements, ends, references, sensors};
use crate::elements::ends::{Exit, ExitEnd, Feed, FeedEnd, FeedFlow};
use crate::elements::{Element, GasChoice, Kind, Section, duct};
use crate::knobs::Values;
use crate::network::sensors::Sensor;
use crate::network::{ElementId, FARTHEST, Layout, Link, Network, Search, areas, values};
use crate::problems::Problem;
use crate::units::{self, Dimension, QuantityError};

/// Most elements of a network.
const MOST_ELEMENTS: usize = 10_000;

/// Names an element may not have: they name something else.
const RESERVED: &[&str] = &["feed", "exit", "search", "title", "element", "sensor"];

/// Reads a whole document. What could not be read is NaN in the network and a problem in the
/// reader; with any error there, the network is fit for further checks only.
pub(super) fn network(reader: &mut Reader, root: &Table) -> Network<f64> {
    let mut fields = Fields::new(root, "", "a network");
    let title = title(reader, &mut fields);
    let search = match sub_table(reader, &mut fields, "search", "[search]") {
        Found::Table(t) => search(reader, t),
        Found::Wrong | Found::Absent => Search::default(),
    };
    let exit_table = sub_table(reader, &mut fields, "exit", "[exit]");
    let feed_table = sub_table(reader, &mut fields, "feed", "[feed]");
    // Of an exit that cannot be read it is not known whether it has a throat.
    let mut throat_stated = None;
    let exit = match exit_table {
        Found::Table(t) => {
            let (exit, readable) = ends::exit(reader, t);
            if readable {
                throat_stated = Some(matches!(exit.end, ExitEnd::Choked { throat: Some(_) }));
            }
            exit
        }
        Found::Wrong => Exit {
            end: ExitEnd::Closed,
        },
        Found::Absent => {
            let problem = Problem::error("exit", "the file has no [exit]");
            fields.missing(
                &["exit"],
                problem.hint("end it with [exit] and, say, end = \"open\""),
            );
            Exit {
                end: ExitEnd::Closed,
            }
        }
    };
    let feed = match feed_table {
        Found::Table(t) => ends::feed(reader, t, throat_stated),
        Found::Wrong => unread_feed(reader),
        Found::Absent => {
            let problem = Problem::error("feed", "the file has no [feed]");
            let hint = "begin it with [feed]: gas, mass_flow, temperature, pressure and end";
            fields.missing(&["feed"], problem.hint(hint));
            unread_feed(reader)
        }
    };
    let inner = element_list(reader, &mut fields);
    let listed = sub_list(reader, &mut fields, "sensor");
    fields.finish(reader);

    let mut elements = vec![Element {
        name: "feed".to_owned(),
        kind: Kind::Feed(feed),
    }];
    let empty = inner.is_none();
    elements.extend(inner.unwrap_or_default());
    elements.push(Element {
        name: "exit".to_owned(),
        kind: Kind::Exit(exit),
    });
    let sensors = sensors::read(reader, &listed, &elements);
    assemble(reader, title, (search, sensors), elements, empty)
}

/// Joins the elements to a chain and checks what only the whole can tell.
fn assemble(
    reader: &mut Reader,
    title: String,
    (search, sensors): (Search, Vec<Sensor>),
    elements: Vec<Element>,
    empty: bool,
) -> Network<f64> {
    let links: Vec<Link> = (1..elements.len())
        .map(|i| Link {
            from: ElementId(i - 1),
            to: ElementId(i),
        })
        .collect();
    references::check(reader, &elements);
    let (sections, unsized_stretches) = areas::assign(&elements, &links, |section| {
        let (Section::Diameter(k) | Section::Area(k)) = section;
        reader.is_named(k)
    });
    // An empty list has been complained of already.
    for problem in unsized_stretches.into_iter().filter(|_| !empty) {
        reader.report_subject(problem);
    }
    let layout = Layout {
        title,
        elements,
        links,
        station_sections: sections.iter().copied().flatten().collect(),
        knobs: std::mem::take(&mut reader.knobs),
        search,
        sensors,
    };
    let network = Network {
        layout: Arc::new(layout),
        values: Values(std::mem::take(&mut reader.values)),
    };
    let whole = areas::check(&network, &sections).into_iter();
    for problem in whole.chain(values::choked_without_flow(&network)) {
        reader.report_subject(problem.of_whole());
    }
    network
}

fn title(reader: &mut Reader, fields: &mut Fields<'_>) -> String {
    if !fields.states("title") {
        let problem = Problem::error("title", "the file has no title");
        let hint = "begin it with title = \"...\", a line for the head of reports";
        fields.missing(&["title"], problem.hint(hint));
    }
    match fields.text(reader, "title") {
        Some((text, mark)) if text.trim().is_empty() => {
            reader.report(mark, Problem::error("title", "the title is empty"));
            String::new()
        }
        Some((text, _)) => text.trim().to_owned(),
        None => String::new(),
    }
}

/// What stands under a key where a table belongs.
pub(super) enum Found<'d> {
    /// A table.
    Table(&'d Table),
    /// Something else, and reported.
    Wrong,
    /// Nothing.
    Absent,
}

/// The table under a key.
pub(super) fn sub_table<'d>(
    reader: &mut Reader,
    fields: &mut Fields<'d>,
    key: &'static str,
    header: &str,
) -> Found<'d> {
    let Some(Entry { node, mark, .. }) = fields.entry(reader, key) else {
        return Found::Absent;
    };
    match &node.value {
        Value::Table(table) => {
            reader.sources.name(&fields.subject(key), mark);
            Found::Table(table)
        }
        Value::Unread => Found::Wrong,
        other => {
            let what = format!("a table belongs here, and this is {}", other.noun());
            let hint = format!("write it as {header}");
            reader.report(
                &node.mark,
                Problem::error(fields.subject(key), what).hint(hint),
            );
            Found::Wrong
        }
    }
}

/// The tables of a list that need not be there.
fn sub_list<'d>(reader: &mut Reader, fields: &mut Fields<'d>, key: &'static str) -> Vec<&'d Node> {
    let Some(Entry { node, mark, .. }) = fields.entry(reader, key) else {
        return Vec::new();
    };
    match &node.value {
        Value::List(items) => items.iter().collect(),
        Value::Unread => Vec::new(),
        other => {
            let what = format!("a list belongs here, and this is {}", other.noun());
            let hint = format!("write each under its own [[{key}]]");
            reader.report(mark, Problem::error(key, what).hint(hint));
            Vec::new()
        }
    }
}

fn search(reader: &mut Reader, table: &Table) -> Search {
    let mut fields = Fields::new(table, "search", "a search");
    let frequency = window(reader, &mut fields, "frequency", Dimension::Frequency);
    let growth = window(reader, &mut fields, "growth", Dimension::Rate);
    fields.finish(reader);
    Search { frequency, growth }
}

fn window(
    reader: &mut Reader,
    fields: &mut Fields<'_>,
    key: &'static str,
    dimension: Dimension,
) -> Option<(f64, f64)> {
    let example = match dimension {
        Dimension::Frequency => "20 to 800 Hz",
        _ => "-300 to 300 1/s",
    };
    let fail = |what: String| Problem::error(format!("search.{key}"), what);
    if let Some(Entry { node, .. }) = fields.entry(reader, key)
        && !matches!(node.value, Value::Text(_) | Value::Unread)
    {
        let what = format!("a window belongs here, and this is {}", node.value.noun());
        let hint = format!("write it like {key} = \"{example}\"");
        reader.report(&node.mark, fail(what).hint(hint));
        return None;
    }
    let (text, mark) = fields.text(reader, key)?;
    let (low, high) = match units::parse_span(text, dimension) {
        Ok(span) => span,
        Err(e) => {
            let hint = match e {
                QuantityError::NotASpan { .. }
                | QuantityError::NotFinite { .. }
                | QuantityError::Empty { .. } => {
                    format!("write it like {key} = \"{example}\"")
                }
                _ => e.hint(),
            };
            reader.report(mark, fail(e.to_string()).hint(hint));
            return None;
        }
    };
    let problem = if low == high {
        fail("the window is empty: it ends where it begins".to_owned())
            .hint("give two different ends, the lower first")
    } else if low > high {
        fail("the window is inverted: it ends below where it begins".to_owned())
            .hint("write the lower end first")
    } else if dimension == Dimension::Frequency && low < 0.0 {
        fail("the window begins below zero frequency".to_owned())
            .hint("begin at 0 Hz: modes of negative frequency mirror those of positive")
    } else if low < -FARTHEST || high > FARTHEST {
        let farthest = units::write(FARTHEST, dimension);
        fail(format!("the window reaches beyond {farthest}"))
            .hint(format!("write it like {key} = \"{example}\""))
    } else {
        return Some((low, high));
    };
    reader.report(mark, problem);
    None
}

/// The elements between the ends; `None` where there is none, which has then been reported.
fn element_list(reader: &mut Reader, fields: &mut Fields<'_>) -> Option<Vec<Element>> {
    let hint = "list the elements in flow order, each under its own [[element]]";
    let Some(Entry { node, mark, .. }) = fields.entry(reader, "element") else {
        let problem = Problem::error("element", "the file has no [[element]]");
        fields.missing(&["element"], problem.hint(hint));
        return None;
    };
    let wrong = |noun: &str| {
        let what = format!("a list of elements belongs here, and this is {noun}");
        Problem::error("element", what).hint(hint)
    };
    let items = match &node.value {
        Value::List(items) if items.is_empty() => {
            reader.report(
                mark,
                Problem::error("element", "the list of elements is empty").hint(hint),
            );
            return None;
        }
        Value::List(items) if items.len() > MOST_ELEMENTS => {
            let what = format!(
                "the list has {} elements, more than the {MOST_ELEMENTS} a network may have",
                items.len()
            );
            reader.report(
                mark,
                Problem::error("element", what).hint("is this the right file?"),
            );
            return None;
        }
        Value::List(items) => items,
        Value::Unread => return None,
        other => {
            reader.report(mark, wrong(other.noun()));
            return None;
        }
    };
    let mut seen: BTreeMap<&str, Mark> = BTreeMap::new();
    let mut found = Vec::new();
    for (i, item) in items.iter().enumerate() {
        let Value::Table(table) = &item.value else {
            let what = format!("a table belongs here, and this is {}", item.value.noun());
            reader.report(
                &item.mark,
                Problem::error(format!("element.{}", i + 1), what).hint(hint),
            );
            found.push(Element {
                name: format!("element.{}", i + 1),
                kind: unread_element(reader),
            });
            continue;
        };
        let name = element_name(reader, table, item, i + 1, &mut seen);
        found.push(elements::element(reader, table, name));
    }
    Some(found)
}

/// The element's name, or `element.3` where it has none that can be used.
fn element_name<'d>(
    reader: &mut Reader,
    table: &'d Table,
    item: &Node,
    number: usize,
    seen: &mut BTreeMap<&'d str, Mark>,
) -> String {
    let stand_in = format!("element.{number}");
    let subject = format!("{stand_in}.name");
    let Some(entry) = table.get("name") else {
        reader.sources.name(&stand_in, &item.mark);
        reader.report(
            &item.mark,
            Problem::error(subject.as_str(), format!("element {number} needs a name"))
                .hint("give it one of its own: name = \"chamber\", say"),
        );
        return stand_in;
    };
    let Value::Text(name) = &entry.node.value else {
        // Reported as any text that is not one, when the table is read.
        reader.sources.name(&stand_in, &item.mark);
        return stand_in;
    };
    let mark = &entry.node.mark;
    let mut letters = name.chars();
    let well_formed = letters.next().is_some_and(|c| c.is_ascii_alphabetic())
        && letters.all(|c| c.is_ascii_alphanumeric() || c == '_' || c == '-');
    let problem = if !well_formed {
        Problem::error(
            subject.as_str(),
            format!("`{}` cannot be a name", shown(name)),
        )
        .hint("a name is letters a to z of either case, digits, _ and -, and begins with a letter")
    } else if RESERVED.contains(&name.as_str()) {
        Problem::error(
            subject.as_str(),
            format!("`{name}` names another part of the file"),
        )
        .hint("give the element another name")
    } else if let Some(first) = seen.get(name.as_str()) {
        let line = reader.sources.place_of(first).map_or(0, |p| p.line);
        let what = format!("`{name}` names the element on line {line} already");
        Problem::error(subject.as_str(), what).hint("each element needs a name of its own")
    } else {
        seen.insert(name, mark.clone());
        reader.sources.name(name, mark);
        return name.clone();
    };
    reader.report(mark, problem);
    reader.sources.name(&stand_in, mark);
    stand_in
}

fn unread_feed(reader: &mut Reader) -> Feed {
    Feed {
        gas: GasChoice::Air,
        flow: FeedFlow::MassFlow(reader.unread()),
        temperature: reader.unread(),
        pressure: None,
        end: FeedEnd::Closed,
    }
}

/// Stands for an element of unknown kind, so that its neighbours can be checked: a duct of unknown
/// area, with which no area disagrees.
pub(super) fn unread_element(reader: &mut Reader) -> Kind {
    Kind::Duct(duct::Duct {
        length: reader.unread(),
        section: Section::Area(reader.unread()),
        entropy: duct::Entropy::Mixed,
    })
}
