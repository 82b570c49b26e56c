//! Reading one table of the document: every key asked for is known, whatever is left is a mistake.

mod leftovers;

use super::document::{Entry, Mark, Node, Table, Value};
use super::sources::SourceMap;
use crate::elements::Section;
use crate::elements::flame::Reference;
use crate::knobs::{Knob, KnobId, KnobSpec, Range};
use crate::network::values::out_of_range;
use crate::problems::{Problem, listed, nearest};
use crate::units::{self, Dimension};

/// What reading collects: the knobs with their numbers, and every problem.
#[derive(Debug, Default)]
pub(super) struct Reader {
    pub sources: SourceMap,
    pub problems: Vec<(Option<Mark>, Problem)>,
    pub knobs: Vec<Knob>,
    pub values: Vec<f64>,
    pub references: Vec<Pending>,
    /// Keys of the whole file that stand in one of its tables.
    pub strays: Vec<String>,
}

/// A reference to be looked up once every element is known.
#[derive(Debug)]
pub(super) struct Pending {
    /// Dotted name of the key that holds it.
    pub subject: String,
    pub mark: Mark,
    /// The flame that follows it.
    pub flame: String,
    pub reference: Reference,
}

/// The knob that stands for a number of a table that is missing altogether.
const UNREAD: KnobSpec = KnobSpec {
    key: "",
    dimension: Dimension::Number,
    range: Range::Any,
    default: None,
    doc: "a number that could not be read",
};

impl Reader {
    /// Notes a problem at a mark.
    pub fn report(&mut self, mark: &Mark, problem: Problem) {
        self.problems.push((Some(mark.clone()), problem));
    }

    /// Notes a problem where its subject stands.
    pub fn report_subject(&mut self, problem: Problem) {
        let mark = self.sources.mark(&problem.subject).cloned();
        self.problems.push((mark, problem));
    }

    /// Adds a knob. A number that could not be read is NaN, which no later check complains of
    /// again; a network holding one is never handed out.
    pub fn knob(&mut self, prefix: &str, spec: &KnobSpec, value: f64) -> KnobId {
        self.knobs.push(Knob {
            name: format!("{prefix}.{}", spec.key),
            spec: *spec,
        });
        self.values.push(value);
        KnobId(self.values.len() - 1)
    }

    /// Whether a knob has a name, and does not stand for a number of something that is missing.
    pub fn is_named(&self, knob: KnobId) -> bool {
        self.knobs
            .get(knob.0)
            .is_some_and(|k| !k.spec.key.is_empty())
    }

    /// A number that could not be read.
    pub fn unread(&mut self) -> KnobId {
        self.knob("", &UNREAD, f64::NAN)
    }
}

/// A table being read.
#[derive(Debug)]
pub(super) struct Fields<'d> {
    table: &'d Table,
    /// Dotted name of the table.
    pub prefix: String,
    /// Dotted name its knobs hang under.
    knobs: String,
    /// Where to say that a key is missing, if not where the table's name stands.
    home: Option<Mark>,
    /// What the table describes, with its article: `a duct`.
    what: String,
    offered: Vec<&'static str>,
    misplaced: Vec<Misplaced>,
    /// Keys of a table under this one, with the key of that table.
    kept: Vec<(&'static str, &'static str)>,
    missing: Vec<Missing>,
}

/// Something the table needs and does not state.
#[derive(Debug)]
struct Missing {
    /// The keys that would state it.
    keys: Vec<&'static str>,
    problem: Problem,
}

/// A key that has a meaning, but not beside what is stated.
#[derive(Debug)]
struct Misplaced {
    key: &'static str,
    why: String,
    /// Whether an override made it so.
    overridden: bool,
}

impl<'d> Fields<'d> {
    pub fn new(table: &'d Table, prefix: &str, what: &str) -> Self {
        Fields {
            table,
            prefix: prefix.to_owned(),
            knobs: prefix.to_owned(),
            home: None,
            what: what.to_owned(),
            offered: Vec::new(),
            misplaced: Vec::new(),
            kept: Vec::new(),
            missing: Vec::new(),
        }
    }

    /// The same table, its knobs under another name and missing keys reported at `home`.
    pub fn hung_under(self, knobs: &str, home: &Mark) -> Self {
        Fields {
            knobs: knobs.to_owned(),
            home: Some(home.clone()),
            ..self
        }
    }

    /// Notes that the table needs one of `keys`. Told at the end, unless a misspelt key turns out
    /// to be the one.
    pub fn missing(&mut self, keys: &[&'static str], problem: Problem) {
        self.missing.push(Missing {
            keys: keys.to_vec(),
            problem,
        });
    }

    /// Says what the table describes, once known.
    pub fn describes(&mut self, what: &str) {
        what.clone_into(&mut self.what);
    }

    /// The dotted name of a key.
    pub fn subject(&self, key: &str) -> String {
        match self.prefix.as_str() {
            "" => key.to_owned(),
            prefix => format!("{prefix}.{key}"),
        }
    }

    fn knob_name(&self, key: &str) -> String {
        format!("{}.{key}", self.knobs)
    }

    /// The entry of a key, which becomes a known one.
    pub fn entry(&mut self, reader: &mut Reader, key: &'static str) -> Option<&'d Entry> {
        if !self.offered.contains(&key) {
            self.offered.push(key);
        }
        let entry = self.table.get(key)?;
        reader.sources.name(&self.subject(key), &entry.node.mark);
        Some(entry)
    }

    /// Whether a key is written.
    pub fn states(&self, key: &str) -> bool {
        self.table.get(key).is_some()
    }

    /// Declares keys that belong into a table under this one.
    pub fn kept_in(&mut self, holder: &'static str, keys: impl Iterator<Item = &'static str>) {
        self.kept.extend(keys.map(|key| (key, holder)));
    }

    /// Declares keys that have no meaning beside what `selector` says.
    pub fn misplaced(&mut self, selector: &str, keys: &[&'static str], why: &str) {
        let overridden = self
            .table
            .get(selector)
            .is_some_and(|e| e.node.mark.is_override());
        self.misplaced.extend(keys.iter().map(|key| Misplaced {
            key,
            why: why.to_owned(),
            overridden,
        }));
    }

    /// The text under a key.
    pub fn text(&mut self, reader: &mut Reader, key: &'static str) -> Option<(&'d str, &'d Mark)> {
        let Entry { node, .. } = self.entry(reader, key)?;
        match &node.value {
            Value::Text(text) => Some((text, &node.mark)),
            Value::Unread => None,
            other => {
                let what = format!("text belongs here, and this is {}", other.noun());
                let hint = if matches!(key, "name" | "title") {
                    format!("write it in quotes: {key} = \"...\"")
                } else {
                    format!("write a word in quotes: {key} = \"...\"")
                };
                reader.report(
                    &node.mark,
                    Problem::error(self.subject(key), what).hint(hint),
                );
                None
            }
        }
    }

    /// One of several words under a key. `None` where it is absent or none of them (reported).
    pub fn choice<T: Copy>(
        &mut self,
        reader: &mut Reader,
        key: &'static str,
        choices: &[(&str, T)],
    ) -> Option<T> {
        let (text, mark) = self.text(reader, key)?;
        if let Some((_, choice)) = choices.iter().find(|(word, _)| *word == text) {
            return Some(*choice);
        }
        let words = || choices.iter().map(|(word, _)| *word);
        let what = format!("{} has no {key} \"{}\"", self.what, shown(text));
        let hint = match nearest(text, words()) {
            Some(word) => format!("did you mean \"{word}\"?"),
            None => format!("it may be {}", listed(words().map(|w| format!("\"{w}\"")))),
        };
        reader.report(mark, Problem::error(self.subject(key), what).hint(hint));
        None
    }

    /// As [`Fields::choice`], and absence is a problem too.
    pub fn required_choice<T: Copy>(
        &mut self,
        reader: &mut Reader,
        key: &'static str,
        choices: &[(&str, T)],
    ) -> Option<T> {
        if !self.states(key) {
            self.offered.push(key);
            let words = listed(choices.iter().map(|(word, _)| format!("\"{word}\"")));
            let p = Problem::error(self.subject(key), format!("{} needs `{key}`", self.what));
            self.missing(&[key], p.hint(format!("`{key}` may be {words}")));
            return None;
        }
        self.choice(reader, key, choices)
    }

    /// The knob of a key: what is written, else its default, else `None`.
    pub fn number(
        &mut self,
        reader: &mut Reader,
        specs: &'static [KnobSpec],
        key: &'static str,
    ) -> Option<KnobId> {
        let Some(spec) = specs.iter().find(|s| s.key == key) else {
            unreachable!("`{key}` is missing from its knob table");
        };
        match self.entry(reader, key) {
            Some(entry) => {
                let value = self.quantity(reader, spec, &entry.node).unwrap_or(f64::NAN);
                reader.sources.name(&self.knob_name(key), &entry.node.mark);
                Some(reader.knob(&self.knobs, spec, value))
            }
            None => spec
                .default
                .map(|value| reader.knob(&self.knobs, spec, value)),
        }
    }

    /// As [`Fields::number`]; absence without a default is a problem.
    pub fn required(
        &mut self,
        reader: &mut Reader,
        specs: &'static [KnobSpec],
        key: &'static str,
    ) -> KnobId {
        if let Some(knob) = self.number(reader, specs, key) {
            return knob;
        }
        let spec = specs.iter().find(|s| s.key == key).unwrap_or(&UNREAD);
        let what = format!("{} needs `{key}`, the {}", self.what, spec.doc);
        let hint = format!("such as {key} = {}", quoted(spec.dimension));
        let problem = Problem::error(self.knob_name(key), what).hint(hint);
        self.missing(&[key], problem);
        reader.knob(&self.knobs, spec, f64::NAN)
    }

    /// The one knob stated of several that say the same; more than one is a problem.
    pub fn one_of(
        &mut self,
        reader: &mut Reader,
        specs: &'static [KnobSpec],
        keys: &[&'static str],
    ) -> Option<(&'static str, KnobId)> {
        let mut first: Option<(&'static str, KnobId)> = None;
        let mut stated: Vec<&Entry> = Vec::new();
        for key in keys {
            let knob = self.number(reader, specs, key);
            stated.extend(self.table.get(key));
            first = first.or(knob.map(|k| (*key, k)));
        }
        stated.sort_by(|a, b| a.mark.cmp(&b.mark));
        let mut stated = stated.into_iter();
        let earliest = stated.next();
        for entry in stated {
            let other = earliest.map_or("", |e| &e.key);
            let what = format!("`{other}` is given too, and the two say the same thing");
            let p = Problem::error(self.subject(&entry.key), what);
            reader.report(&entry.mark, p.hint(format!("keep one of {}", listed(keys))));
        }
        first
    }

    /// An area by diameter or by area, if stated.
    pub fn section(
        &mut self,
        reader: &mut Reader,
        specs: &'static [KnobSpec],
        diameter: &'static str,
        area: &'static str,
    ) -> Option<Section> {
        let (key, knob) = self.one_of(reader, specs, &[diameter, area])?;
        Some(if key == area {
            Section::Area(knob)
        } else {
            Section::Diameter(knob)
        })
    }

    /// The number a node states, reported where it is wrong.
    fn quantity(&self, reader: &mut Reader, spec: &KnobSpec, node: &Node) -> Option<f64> {
        let subject = self.knob_name(spec.key);
        let (KnobSpec { key, dimension, .. }, fail) =
            (spec, |what: String| Problem::error(&subject, what));
        let problem = match (&node.value, dimension) {
            (Value::Number(text), Dimension::Number) => match units::parse_number(text) {
                Ok(value) => {
                    let Some(p) = out_of_range(&subject, spec, value) else {
                        return Some(value);
                    };
                    p
                }
                Err(e) => fail(e.to_string()).hint(e.hint()),
            },
            (Value::Text(text), Dimension::Number) => match units::parse_number(text) {
                Ok(_) => fail(format!(
                    "`{}` is text, and a plain number belongs here",
                    shown(text)
                ))
                .hint(format!(
                    "write it without quotes: {key} = {}",
                    shown(text.trim())
                )),
                Err(e) => fail(e.to_string()).hint(format!(
                    "{}, without quotes: {key} = {}",
                    e.hint(),
                    dimension.example()
                )),
            },
            (Value::Text(text), _) => match units::parse(text, *dimension) {
                Ok(value) => {
                    let Some(p) = out_of_range(&subject, spec, value) else {
                        return Some(value);
                    };
                    p
                }
                Err(e) => fail(e.to_string()).hint(e.hint()),
            },
            (Value::Unread, _) => return None,
            (Value::Number(text), _) => {
                let hint = format!("write it like {key} = {}", quoted(*dimension));
                match units::parse_number(text) {
                    // `inf` and `1e400` lack more than a unit.
                    Err(e) => fail(e.to_string()).hint(hint),
                    Ok(_) => {
                        let unit = dimension.example().split_once(' ').map_or("", |(_, u)| u);
                        // On the command line a quantity needs no quotes.
                        let (how, quote) = match node.mark.is_override() {
                            true => ("", ""),
                            false => (", in quotes", "\""),
                        };
                        fail(format!(
                            "`{text}` has no unit, and {} needs one",
                            dimension.noun()
                        ))
                        .hint(format!(
                            "say in which unit{how}, such as {key} = {quote}{text} {unit}{quote}; it may be {}",
                            listed(dimension.unit_names())
                        ))
                    }
                }
            }
            (other, _) => fail(format!(
                "{} belongs here, and this is {}",
                dimension.noun(),
                other.noun()
            ))
            .hint(format!("write it like {key} = {}", quoted(*dimension))),
        };
        reader.report(&node.mark, problem);
        None
    }
}

/// An example of a dimension as a TOML value.
fn quoted(dimension: Dimension) -> String {
    match dimension {
        Dimension::Number => dimension.example().to_owned(),
        _ => format!("\"{}\"", dimension.example()),
    }
}

/// Text from the file, safe and short enough for a sentence.
pub(super) fn shown(text: &str) -> String {
    let mut chars = text.chars().flat_map(|c| {
        if c.is_control() { '\u{fffd}' } else { c }
            .to_string()
            .chars()
            .collect::<Vec<_>>()
    });
    let start: String = chars.by_ref().take(60).collect();
    if chars.next().is_some() {
        format!("{start}...")
    } else {
        start
    }
}
