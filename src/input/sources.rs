//! Where each named thing of a network stands in its file or in an override.

use std::collections::BTreeMap;

use super::document::{FILE, Mark};
use crate::problems::{Place, Problem};

/// Name under which an override is reported.
pub const OVERRIDE: &str = "--set";

/// The texts a network was read from, and the place of every name in them.
#[derive(Clone, Debug, Default)]
pub struct SourceMap {
    /// The file, then each override.
    texts: Vec<(String, String)>,
    /// Where each line of each text begins, so that a place is found without reading from the top.
    lines: Vec<Vec<usize>>,
    names: BTreeMap<String, Mark>,
}

impl SourceMap {
    pub(super) fn new(file: &str, text: &str, overrides: &[String]) -> Self {
        let mut texts = vec![(file.to_owned(), text.to_owned())];
        texts.extend(overrides.iter().map(|o| (OVERRIDE.to_owned(), o.clone())));
        let lines = texts.iter().map(|(_, text)| line_starts(text)).collect();
        SourceMap {
            texts,
            lines,
            names: BTreeMap::new(),
        }
    }

    /// Remembers where a name stands; the first mention stays.
    pub(super) fn name(&mut self, name: &str, mark: &Mark) {
        self.names
            .entry(name.to_owned())
            .or_insert_with(|| mark.clone());
    }

    /// Where a dotted name is stated. A name not stated falls back to what holds it: `chamber.length`
    /// to the name of `chamber`, that to nothing.
    pub fn place(&self, name: &str) -> Option<Place> {
        self.place_of(self.mark(name)?)
    }

    /// Gives a problem without a place the place of its subject, or the file's first line.
    pub fn locate(&self, problem: &mut Problem) {
        if problem.place.is_none() {
            problem.place = match self.mark(&problem.subject) {
                Some(mark) => self.place_of(mark),
                // The file as a whole, hence no words of its first line.
                None => self.place_of(&Mark::new(FILE, 0..0)).map(|top| Place {
                    text: String::new(),
                    ..top
                }),
            }
            .map(Box::new);
        }
    }

    pub(super) fn mark(&self, name: &str) -> Option<&Mark> {
        let mut name = name;
        loop {
            if let Some(mark) = self.names.get(name) {
                return Some(mark);
            }
            name = name.rsplit_once('.')?.0;
        }
    }

    pub(super) fn place_of(&self, mark: &Mark) -> Option<Place> {
        let (source, text) = self.texts.get(mark.source)?;
        let lines = self.lines.get(mark.source)?;
        Some(place_in(source, text, lines, mark.start, mark.end))
    }
}

fn line_starts(text: &str) -> Vec<usize> {
    let ends = text.match_indices('\n').map(|(i, _)| i + 1);
    std::iter::once(0).chain(ends).collect()
}

/// The place of a stretch of bytes; a stretch over several lines is marked to the end of its first.
pub(super) fn place(source: &str, text: &str, start: usize, end: usize) -> Place {
    place_in(source, text, &line_starts(text), start, end)
}

fn place_in(source: &str, text: &str, lines: &[usize], start: usize, end: usize) -> Place {
    let start = floor_boundary(text, start);
    let end = floor_boundary(text, end).max(start);
    let line_number = lines.partition_point(|s| *s <= start);
    let line_start = line_number
        .checked_sub(1)
        .and_then(|i| lines.get(i))
        .copied()
        .unwrap_or_default();
    let rest = text.get(line_start..).unwrap_or_default();
    let line = rest.split('\n').next().unwrap_or_default();
    let line = line.strip_suffix('\r').unwrap_or(line);
    let line_end = line_start + line.len();
    let marked = text
        .get(start..end.min(line_end).max(start))
        .unwrap_or_default();
    Place {
        source: source.to_owned(),
        line: line_number,
        column: text
            .get(line_start..start)
            .unwrap_or_default()
            .chars()
            .count()
            + 1,
        width: marked.chars().count().max(1),
        text: line.to_owned(),
    }
}

fn floor_boundary(text: &str, at: usize) -> usize {
    (0..=at.min(text.len()))
        .rev()
        .find(|i| text.is_char_boundary(*i))
        .unwrap_or(0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn places_count_characters_and_lines_from_one() {
        let text = "a = 1\r\nbé = \"x\ny\"\n";
        let p = place("f", text, text.find('"').unwrap(), text.len() - 1);
        assert_eq!(
            (p.line, p.column, p.width, p.text.as_str()),
            (2, 6, 2, "bé = \"x")
        );
        let inside = text.find('é').unwrap() + 1;
        assert_eq!(place("f", text, inside, inside).column, 2);
        let beyond = place("f", text, 999, 1000);
        assert_eq!((beyond.line, beyond.column, beyond.width), (4, 1, 1));
        assert_eq!(place("f", "", 0, 0).line, 1);
    }

    #[test]
    fn names_fall_back_to_what_holds_them() {
        let mut map = SourceMap::new("f", "chamber", &[]);
        map.name("chamber", &Mark::new(FILE, 0..7));
        assert_eq!(map.place("chamber.gas.gamma").unwrap().width, 7);
        assert_eq!(map.place("nozzle"), None);
        let mut problem = Problem::error("nozzle", "is hot");
        map.locate(&mut problem);
        assert_eq!(problem.place.unwrap().line, 1);
    }
}
