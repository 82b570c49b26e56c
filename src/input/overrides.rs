//! Overrides: `chamber.length = 0.9 m` laid over the parsed document before it is read, so that an
//! override is judged by the same rules as the file.

use toml::de::DeValue;

use super::document::{self, Entry, Mark, Node, Table, Value};
use super::fields::{Reader, shown};
use crate::flame;
use crate::problems::{Problem, listed, nearest};

/// Keys that say the same thing: stating one by override takes back the others of the file.
const ALTERNATIVES: &[&[&str]] = &[
    &["mass_flow", "velocity", "mach"],
    &["diameter", "area"],
    &["throat_diameter", "throat_area"],
    &["gas_constant", "molar_mass"],
];

/// One part of a dotted name and where it stands.
type Step<'t> = (&'t str, Mark);

/// Lays each override over the document in turn. One that cannot be laid is reported.
pub(super) fn lay_all(reader: &mut Reader, root: &mut Table, overrides: &[String]) {
    for (i, text) in overrides.iter().enumerate() {
        let source = i + 1;
        if let Some((path, node)) = read(reader, text, source)
            && let Err((mark, problem)) = lay(root, &path, node)
        {
            reader.report(&mark, problem);
        }
    }
}

/// The dotted name and the value of an override.
fn read<'t>(reader: &mut Reader, text: &'t str, source: usize) -> Option<(Vec<Step<'t>>, Node)> {
    let whole = Mark::new(source, 0..text.len());
    let form = "write NAME = VALUE, such as chamber.length = 0.9 m";
    let Some((left, right)) = text.split_once('=') else {
        let what = match text.trim() {
            "" => "nothing is set".to_owned(),
            text => format!("`{}` sets nothing: it has no `=`", shown(text)),
        };
        reader.report(&whole, Problem::error("--set", what).hint(form));
        return None;
    };
    let mut at = 0;
    let mut path = Vec::new();
    for part in left.split('.') {
        let start = at + part.len() - part.trim_start().len();
        let name = part.trim();
        path.push((name, Mark::new(source, start..start + name.len())));
        at += part.len() + 1;
    }
    let name = path.iter().map(|(p, _)| *p).collect::<Vec<_>>().join(".");
    if path.iter().any(|(p, _)| p.is_empty()) {
        let what = match left.trim() {
            "" => "no name stands before the `=`".to_owned(),
            name => format!("`{}` is no name of a number or word", shown(name)),
        };
        reader.report(&whole, Problem::error("--set", what).hint(form));
        return None;
    }
    let start = left.len() + 1 + right.len() - right.trim_start().len();
    let value = right.trim();
    let mark = Mark::new(source, start..start + value.len());
    if value.is_empty() {
        let p = Problem::error(name, "no value is given");
        reader.report(&whole, p.hint(form));
        return None;
    }
    let value = if value.starts_with(['"', '\'', '{', '[']) {
        match DeValue::parse(value) {
            Ok(parsed) => moved(document::node(&parsed, source), start),
            Err(e) => {
                let span = e.span().unwrap_or(0..value.len());
                let mark = Mark::new(source, start + span.start..start + span.end);
                let p = Problem::error(name, format!("this is no value: {}", e.message()));
                reader.report(&mark, p.hint("quotes and brackets come in pairs"));
                return None;
            }
        }
    } else {
        // Bare words are text and bare numbers are numbers; `nan` and `inf` are told as numbers.
        let number = crate::units::parse_number(value);
        let plain = number.is_ok() || matches!(value.trim_start_matches(['+', '-']), "nan" | "inf");
        let value = value.to_owned();
        Node {
            mark,
            value: if plain {
                Value::Number(value)
            } else {
                Value::Text(value)
            },
        }
    };
    Some((path, value))
}

/// A node with every mark moved by the place of its value in the override.
fn moved(node: Node, by: usize) -> Node {
    let shift = |m: Mark| Mark {
        start: m.start + by,
        end: m.end + by,
        ..m
    };
    let value = match node.value {
        Value::List(items) => Value::List(items.into_iter().map(|n| moved(n, by)).collect()),
        Value::Table(t) => Value::Table(Table {
            entries: t
                .entries
                .into_iter()
                .map(|e| Entry {
                    mark: shift(e.mark),
                    node: moved(e.node, by),
                    ..e
                })
                .collect(),
        }),
        other => other,
    };
    Node {
        mark: shift(node.mark),
        value,
    }
}

type Laid = Result<(), (Mark, Problem)>;

fn lay(root: &mut Table, path: &[Step<'_>], node: Node) -> Laid {
    let Some(((first, mark), rest)) = path.split_first() else {
        return Ok(());
    };
    let fail =
        |what: String, hint: String| Err((mark.clone(), Problem::error(*first, what).hint(hint)));
    match *first {
        "title" if rest.is_empty() => put(root, first, first, mark, node),
        "feed" | "exit" | "search" => match root.table_at(first, mark) {
            Some(table) => descend(table, first, rest, mark, node),
            // No table in the file: that is told when the file is read.
            None => Ok(()),
        },
        "element" | "sensor" => fail(
            format!("an override names a {first} by its own name")
                .replace("a element", "an element"),
            "write chamber.length, say".to_owned(),
        ),
        _ => {
            let named = |n: &Node| match &n.value {
                Value::Table(t) => match &t.get("name").map(|e| &e.node.value) {
                    Some(Value::Text(name)) => Some(name.clone()),
                    _ => None,
                },
                _ => None,
            };
            let items = match root.get_mut("element").map(|e| &mut e.node.value) {
                Some(Value::List(items)) => items.as_mut_slice(),
                _ => &mut [],
            };
            let wanted = Some((*first).to_owned());
            if !items.iter().any(|n| named(n) == wanted)
                && let Some(Value::List(sensors)) =
                    root.get_mut("sensor").map(|e| &mut e.node.value)
                && let Some(Value::Table(table)) =
                    (sensors.iter_mut().find(|n| named(n) == wanted)).map(|n| &mut n.value)
            {
                return descend(table, first, rest, mark, node);
            }
            let items = match root.get_mut("element").map(|e| &mut e.node.value) {
                Some(Value::List(items)) => items.as_mut_slice(),
                _ => &mut [],
            };
            let names: Vec<String> = items.iter().filter_map(named).collect();
            let element = items.iter_mut().find(|n| named(n) == wanted);
            match element.map(|n| &mut n.value) {
                Some(Value::Table(table)) => in_element(table, first, rest, mark, node),
                _ => {
                    let known = names.iter().map(String::as_str);
                    let all = known.chain(["feed", "exit", "search", "title"]);
                    let hint = match nearest(first, all) {
                        Some(meant) => format!("did you mean `{meant}`?"),
                        None if rest.is_empty() => {
                            format!(
                                "say whose it is, as in {}.{first}",
                                names.last().map_or("feed", String::as_str)
                            )
                        }
                        None => format!(
                            "name one of {}",
                            listed(
                                names
                                    .iter()
                                    .map(String::as_str)
                                    .chain(["feed", "exit", "search"])
                            )
                        ),
                    };
                    fail(format!("nothing is named `{}`", shown(first)), hint)
                }
            }
        }
    }
}

/// Lays over an element; the keys of a flame's only response may be named without `response`.
fn in_element(table: &mut Table, name: &str, rest: &[Step<'_>], mark: &Mark, node: Node) -> Laid {
    let Some(((key, at), deeper)) = rest.split_first() else {
        return descend(table, name, rest, mark, node);
    };
    if matches!(*key, "name" | "kind") && deeper.is_empty() {
        let p = Problem::error(
            format!("{name}.{key}"),
            format!("the {key} of an element is fixed"),
        );
        return Err((at.clone(), p.hint("change it in the file")));
    }
    let response_key = flame::KNOBS.iter().any(|s| s.key == *key) || *key == "reference";
    let responds = table.get("response").is_some();
    match deeper.split_first() {
        None if response_key && responds => in_response(table, name, &[], &rest[..1], node),
        Some(((index, _), last)) if *key == "response" && index.parse::<usize>().is_ok() => {
            in_response(table, name, &deeper[..1], last, node)
        }
        Some(_) if *key == "response" => in_response(table, name, &[], deeper, node),
        _ => descend(table, name, rest, mark, node),
    }
}

/// Lays over the response of that number, or over the only one.
fn in_response(
    table: &mut Table,
    name: &str,
    number: &[Step<'_>],
    rest: &[Step<'_>],
    node: Node,
) -> Laid {
    let holder = format!("{name}.response");
    let Some((_, at)) = number.first().or(rest.first()) else {
        return Ok(());
    };
    let fail = |what: String, hint: String| {
        Err((at.clone(), Problem::error(holder.as_str(), what).hint(hint)))
    };
    let response = match table.get_mut("response").map(|e| &mut e.node) {
        None => {
            return fail(
                format!("`{name}` has no response"),
                "give it one in the file".to_owned(),
            );
        }
        Some(node) => node,
    };
    let items: &mut [Node] = match &mut response.value {
        Value::List(items) => items,
        _ => std::slice::from_mut(response),
    };
    let count = items.len();
    let index = match number.first() {
        Some((n, _)) => n.parse::<usize>().unwrap_or_default(),
        None if count == 1 => 1,
        None => {
            let key = rest.first().map_or("", |(k, _)| k);
            return fail(
                format!("`{name}` has {count} responses, and this names none of them"),
                format!("write {holder}.1.{key} for the first of them"),
            );
        }
    };
    match index
        .checked_sub(1)
        .and_then(|i| items.get_mut(i))
        .map(|n| &mut n.value)
    {
        Some(Value::Table(t)) => descend(t, &holder, rest, at, node),
        // What stands there is no table: told when the file is read.
        Some(_) => Ok(()),
        None => fail(
            format!("`{name}` has no response {index}"),
            match count {
                1 => format!("it has one response: leave the number out, as in {name}.delay"),
                _ => format!("its responses are numbered 1 to {count}"),
            },
        ),
    }
}

/// Sets the key that the rest of a dotted name leads to.
fn descend(
    table: &mut Table,
    holder: &str,
    rest: &[Step<'_>],
    holder_mark: &Mark,
    node: Node,
) -> Laid {
    match rest {
        [] => Err((
            holder_mark.clone(),
            Problem::error(
                holder,
                format!("`{holder}` is a whole table, not one value of it"),
            )
            .hint(format!("write {holder}.KEY = VALUE")),
        )),
        [(key, mark)] => put(table, &format!("{holder}.{key}"), key, mark, node),
        [(key, mark), deeper @ ..] => {
            let name = format!("{holder}.{key}");
            let gas = key.ends_with("gas");
            match table.table_at(key, mark) {
                Some(inner) => descend(inner, &name, deeper, mark, node),
                None => Err((
                    mark.clone(),
                    Problem::error(
                        name.as_str(),
                        format!("`{name}` is no table in the file, so it has no keys"),
                    )
                    .hint(if gas {
                        format!("set all of it: {name} = {{ gamma = 1.4, gas_constant = \"287 J/(kg K)\" }}")
                    } else {
                        format!("write {name} = VALUE")
                    }),
                )),
            }
        }
    }
}

/// Sets a key and takes back what the file said of the same thing by another key.
fn put(table: &mut Table, name: &str, key: &str, mark: &Mark, node: Node) -> Laid {
    if table.get(key).is_some_and(|e| e.mark.is_override()) {
        let what = format!("`{name}` is set twice");
        let p = Problem::error(name, what).hint("keep one of the two");
        return Err((mark.clone(), p));
    }
    if let Some(group) = ALTERNATIVES.iter().find(|g| g.contains(&key)) {
        table
            .entries
            .retain(|e| e.mark.is_override() || !group.contains(&e.key.as_str()));
    }
    table.set(Entry {
        key: key.to_owned(),
        mark: mark.clone(),
        node,
    });
    Ok(())
}
