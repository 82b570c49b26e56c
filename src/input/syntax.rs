//! A file's text as a document, and what breaks the rules of TOML in it.
//!
//! The parser recovers from an error but trips over its traces: one brace left open makes an error of
//! every line below. So errors are taken one by one. The line of the first is told and, where it can
//! be seen which key it states, replaced by that key with a value that counts as unread, byte for byte
//! as long, so that every other place in the file stays where it is. Then the text is parsed anew.

use std::ops::Range;

use toml::de::{DeTable, Error};

use super::document::{self, FILE, Mark, Table, Value};
use super::fields::{Reader, shown};
use crate::problems::Problem;

/// Most broken lines, and most keys stated twice, told of one file: what has more is hardly a network
/// file.
const MOST: usize = 20;

/// The document of a text, with a value that counts as unread where a line is broken. `None` where a
/// broken line leaves it open which table the lines below belong to; all that is broken is reported.
pub(super) fn document(reader: &mut Reader, text: &str) -> Option<Table> {
    let mut mended = text.to_owned();
    let mut broken: Vec<(usize, Mark, String, Problem)> = Vec::new();
    let mut unread: Vec<usize> = Vec::new();
    let mut whole = true;
    let (root, errors) = loop {
        let (parsed, errors) = DeTable::parse_recoverable(&mended);
        let first = errors
            .iter()
            .filter(|e| !is_duplicate(e))
            .min_by_key(|e| e.span().map_or(usize::MAX, |s| s.start));
        let Some(error) = first else {
            break (document::table(parsed.get_ref(), FILE), errors);
        };
        let (line, mark) = blamed(&mended, error);
        let statement = mended.get(line.clone()).unwrap_or_default();
        let mut inner = String::new();
        let problem = match mended.get(mark.clone()) {
            Some(open @ ("{" | "[")) if mark.end == mark.start + 1 && mark.start > line.start => {
                let close = if open == "{" { "}" } else { "]" };
                Problem::error("TOML", format!("nothing closes this `{open}`"))
                    .hint(format!("end the value with `{close}`"))
            }
            _ => {
                let (part, at) = part_at(statement, mark.start.saturating_sub(line.start));
                let problem = diagnosis(part, at > 0, error.message());
                if let (true, Some(key)) = (at > 0, key_of(part)) {
                    key.clone_into(&mut inner);
                }
                problem
            }
        };
        // A line mended before and still at fault is beyond mending.
        let inside = open_bracket(mended.get(..line.start).unwrap_or_default()).is_some();
        let repaired = unread_line(statement, inside);
        if unread.contains(&line.start) {
            whole = false;
            break (Table::default(), Vec::new());
        }
        broken.push((line.start, Mark::new(FILE, mark), inner, problem));
        whole &= repaired.is_some();
        if broken.len() == MOST || statement.is_empty() {
            if let Some((.., last)) = broken.last_mut().filter(|_| errors.len() > 1) {
                last.what += "; no more broken lines are told after this one";
            }
            whole = false;
            break (Table::default(), Vec::new());
        }
        if repaired.is_some() {
            unread.push(line.start);
        }
        let length = line.len();
        mended.replace_range(line, &repaired.unwrap_or_else(|| "#".repeat(length)));
    };
    let mut root = root;
    for start in unread {
        forget(&mut root, start);
    }
    for (start, mark, inner, mut problem) in broken {
        if let Some(name) = root.name_at(start) {
            problem.subject = match inner.as_str() {
                "" => name,
                inner => format!("{name}.{inner}"),
            };
        }
        reader.report(&mark, problem);
    }
    if whole {
        whole = duplicates(reader, text, &root, &errors);
    }
    whole.then_some(root)
}

fn is_duplicate(error: &Error) -> bool {
    error.message().contains("duplicate key")
}

/// The bytes of the line a place is in, without its line end and the blanks before it.
fn line_at(text: &str, at: usize) -> Range<usize> {
    let before = text.get(..at).unwrap_or_default();
    let start = before.rfind('\n').map_or(0, |i| i + 1);
    let rest = text.get(start..).unwrap_or_default();
    let line = rest.split('\n').next().unwrap_or_default();
    let indent = line.len() - line.trim_start().len();
    start + indent..start + line.trim_end().len().max(indent)
}

/// The line at fault, and what to mark in it.
fn blamed(text: &str, error: &Error) -> (Range<usize>, Range<usize>) {
    let span = error.span().unwrap_or(text.len()..text.len());
    let mut at = span.start.min(text.len());
    while !text.is_char_boundary(at) {
        at -= 1;
    }
    let opened = if error.message().contains("multi-line") {
        let before = text.get(..at).unwrap_or_default();
        before.rfind("\"\"\"").max(before.rfind("'''"))
    } else {
        open_bracket(text).filter(|open| *open < at)
    };
    match opened {
        Some(open) if line_at(text, open) != line_at(text, at) => {
            (line_at(text, open), open..open + 1)
        }
        _ => (line_at(text, at), at..span.end.max(at)),
    }
}

/// The first bracket or brace of a value that nothing closes, as far as a look at the quotes tells.
fn open_bracket(text: &str) -> Option<usize> {
    let mut open = Vec::new();
    let mut at = 0;
    for line in text.split_inclusive('\n') {
        let mut quote = None;
        let header = line.trim_start().starts_with('[') && open.is_empty();
        for (i, c) in line.char_indices().filter(|_| !header) {
            match (quote, c) {
                (None, '#') => break,
                (None, '"' | '\'') => quote = Some(c),
                (Some(q), c) if c == q => quote = None,
                (None, '{' | '[') => open.push(at + i),
                (None, '}' | ']') => {
                    open.pop();
                }
                _ => {}
            }
        }
        at += line.len();
    }
    open.first().copied()
}

/// The bare or dotted key a line begins with.
fn key_of(line: &str) -> Option<&str> {
    let end = line
        .find(|c: char| !(c.is_ascii_alphanumeric() || "_-.".contains(c)))
        .unwrap_or(line.len());
    let key = line.get(..end)?;
    let sound = !key.is_empty() && key.split('.').all(|part| !part.is_empty());
    sound.then_some(key)
}

/// A line as long that states the same key and no more; `None` where it is not seen to state one.
/// Inside brackets a comma at its end stays.
fn unread_line(line: &str, inside: bool) -> Option<String> {
    let key = key_of(line)?;
    let comma = if inside && line.ends_with(',') {
        ","
    } else {
        ""
    };
    let stated = format!("{key}=0{comma}");
    let blanks = line.len().checked_sub(stated.len())?;
    Some(stated + &" ".repeat(blanks))
}

/// Makes the value of the key that stands at a place an unread one.
fn forget(table: &mut Table, start: usize) {
    for entry in &mut table.entries {
        if entry.mark.start == start && !matches!(entry.node.value, Value::Table(_)) {
            entry.node.value = Value::Unread;
        }
        match &mut entry.node.value {
            // The first part of a dotted key stands where the whole does.
            Value::Table(inner) if entry.mark.start == start => inner
                .entries
                .iter_mut()
                .for_each(|e| e.node.value = Value::Unread),
            Value::Table(inner) => forget(inner, start),
            Value::List(items) => {
                for item in items {
                    if let Value::Table(inner) = &mut item.value {
                        forget(inner, start);
                    }
                }
            }
            _ => {}
        }
    }
}

/// The statement of a line that a place in it belongs to, and where it begins: all of the line, or one
/// KEY = VALUE of a table in braces.
fn part_at(line: &str, at: usize) -> (&str, usize) {
    let (mut start, mut end, mut quote, mut depth) = (0, line.len(), None, 0);
    for (i, c) in line.char_indices() {
        match (quote, c) {
            (None, '"' | '\'') => quote = Some(c),
            (Some(q), c) if c == q => quote = None,
            (None, '{' | ',' | '}') => {
                if i >= at && depth > 0 {
                    end = i;
                    break;
                }
                depth += match c {
                    '{' => 1,
                    '}' => -1,
                    _ => 0,
                };
                if depth > 0 {
                    start = i + 1;
                }
            }
            _ => {}
        }
    }
    let part = line.get(start..end).unwrap_or(line);
    let blanks = part.len() - part.trim_start().len();
    (part.trim(), start + blanks)
}

/// What is wrong with a line, or with an entry in braces, as far as it and the parser tell.
fn diagnosis(line: &str, inside: bool, message: &str) -> Problem {
    let told = |what: String, hint: String| Problem::error("TOML", what).hint(hint);
    let general = || {
        let hint = "lines are KEY = VALUE, and a value with a unit stands in quotes";
        told(message.to_owned(), hint.to_owned())
    };
    if line.starts_with('[') {
        let name = line.trim_matches(|c: char| "[] \t".contains(c));
        let right = if line.starts_with("[[") {
            format!("[[{}]]", shown(name))
        } else {
            format!("[{}]", shown(name))
        };
        let what = match message.contains("unclosed") {
            true => "the header of a table is not closed".to_owned(),
            false => format!("the header of a table cannot be read: {message}"),
        };
        return told(what, format!("write {right} on a line of its own"));
    }
    let Some(key) = key_of(line) else {
        return general();
    };
    let after = line.get(key.len()..).unwrap_or_default().trim_start();
    let form = format!("write {key} = VALUE");
    let Some(value) = after.strip_prefix('=') else {
        return match after.chars().next() {
            Some(':') => told(format!("`:` stands after `{key}` where `=` belongs"), form),
            _ => told(format!("no `=` stands after `{key}`"), form),
        };
    };
    let value = value.trim();
    let bare = value.split('#').next().unwrap_or_default().trim_end();
    match bare.chars().next() {
        None => told(format!("`{key}` has no value"), form),
        Some('=') => told(format!("a second `=` stands after `{key}`"), form),
        Some('\u{201c}' | '\u{201d}' | '\u{201e}' | '\u{2018}' | '\u{2019}') => told(
            "these quotes are typographic ones".to_owned(),
            "use the straight double quote, \"...\"".to_owned(),
        ),
        Some('"' | '\'') if message.contains("escape") => told(
            "a backslash in double quotes begins a special character, and this one is unknown"
                .to_owned(),
            "write the backslash twice, or the text in single quotes".to_owned(),
        ),
        Some('"' | '\'') if message.contains("unexpected") => told(
            format!("something stands after the value of `{key}`"),
            "a line ends with its value; a remark begins with #".to_owned(),
        ),
        Some(quote @ ('"' | '\'')) if value.matches(quote).count() == 2 => told(
            format!("the text of `{key}` holds a character that cannot stand in it"),
            "write it anew, without characters that cannot be seen".to_owned(),
        ),
        Some('"' | '\'') if message.contains("string") => told(
            "the quotes are not closed".to_owned(),
            "end the value with the quote it begins with".to_owned(),
        ),
        Some('{' | '[') if !message.contains("quoted") => told(
            format!(
                "the brackets after `{key}` do not come in pairs, or no comma parts what is in them: {message}"
            ),
            "end { with }, [ with ], and put a comma between entries".to_owned(),
        ),
        Some('"' | '\'') => general(),
        Some(_) if bare.contains('=') => told(
            format!("`{key}` and another key are stated in one"),
            match inside {
                true => "put a comma between the two".to_owned(),
                false => "give each a line of its own".to_owned(),
            },
        ),
        Some(_)
            if bare
                .bytes()
                .all(|b| b.is_ascii_digit() || b"+-_.,eE".contains(&b)) =>
        {
            let hint = if bare.contains(',') {
                "write a decimal point, and no mark between thousands"
            } else {
                "write digits on both sides of the point, no zero before others, as in 0.5 or 1e3"
            };
            told(
                format!("`{}` is no number as TOML writes it", shown(bare)),
                hint.to_owned(),
            )
        }
        Some(_) => told(
            format!("`{}` stands without quotes", shown(bare)),
            format!("write {key} = \"{}\"", shown(bare)),
        ),
    }
}

/// Reports what is stated twice. Whether the rest can be judged all the same.
fn duplicates(reader: &mut Reader, text: &str, root: &Table, errors: &[Error]) -> bool {
    let mut whole = true;
    let mut spans: Vec<Range<usize>> = errors.iter().filter_map(Error::span).collect();
    spans.sort_by_key(|s| s.start);
    // Keys under a header that stands twice are not told as well.
    let mut told_until = 0;
    let mut told = 0;
    for span in spans.into_iter().filter(|s| !s.is_empty()) {
        if span.start < told_until {
            continue;
        }
        if told == MOST {
            break;
        }
        told += 1;
        let key = text.get(span.clone()).unwrap_or_default();
        let line = text.get(line_at(text, span.start)).unwrap_or_default();
        let header = line.starts_with('[');
        let mark = Mark::new(FILE, span.clone());
        if header {
            let below = text.get(span.end..).unwrap_or_default();
            told_until = below.find("\n[").map_or(text.len(), |i| span.end + i + 1);
        }
        if header && key == "element" {
            if whole {
                let (mark, what) = match single_element(text) {
                    Some(start) => (
                        Mark::new(FILE, start..start + key.len()),
                        "[element] is one table, and the elements are a list",
                    ),
                    None => (
                        mark,
                        "a table of an element stands before the first [[element]]",
                    ),
                };
                let hint = "write each element under its own [[element]], in double brackets";
                reader.report(&mark, Problem::error(key, what).hint(hint));
            }
            whole = false;
            continue;
        }
        let problem = if header {
            let first = text.lines().position(|l| l.trim() == line.trim());
            let first = first.map_or(0, |i| i + 1);
            Problem::error(key, format!("{line} stands on line {first} already"))
                .hint("keep one of the two, with all its keys")
        } else {
            let earlier = root.latest_before(key, span.start);
            let name = earlier.and_then(|m| root.name_at(m.start));
            let place = earlier.and_then(|m| reader.sources.place_of(m));
            let line = place.map_or(0, |p| p.line);
            let what = format!("`{key}` is stated on line {line} already");
            Problem::error(name.unwrap_or_else(|| key.to_owned()), what).hint("keep one of the two")
        };
        let mut problem = problem;
        if told == MOST {
            problem.what += "; nothing more that is stated twice is told after this";
        }
        reader.report(&mark, problem);
    }
    whole
}

/// Where the first header of the elements in single brackets has its key.
fn single_element(text: &str) -> Option<usize> {
    let mut at = 0;
    for line in text.split_inclusive('\n') {
        if line.trim_start().starts_with("[element]") {
            return Some(at + line.find('e')?);
        }
        at += line.len();
    }
    None
}
