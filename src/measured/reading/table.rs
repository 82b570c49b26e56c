//! Text in columns: comments, header, units row, rows of fields, whatever parts them.

use std::fs::File;
use std::io::BufReader;
use std::path::Path;

use super::columns::renamed;
use super::lines::{Found, Lines};
use super::samples::{place, shown};
use super::unit::{Label, label};
use crate::problems::{Place, Problem, Problems};

/// What parts fields.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Delimiter {
    Byte(u8),
    Blanks,
}

/// The head of a column.
#[derive(Clone, Debug)]
pub(super) struct Heading {
    pub label: Label,
    pub place: Option<Place>,
}

/// A file of columns, its header read.
pub(super) struct Table {
    pub file: String,
    pub heads: Vec<Heading>,
    /// What comments before the header say.
    pub notes: Vec<String>,
    lines: Lines<BufReader<File>>,
    delimiter: Delimiter,
    decimal_comma: bool,
    /// Whether the line in the buffer is a row not handed out yet.
    held: bool,
    fields: Vec<(usize, usize)>,
}

/// Most comments kept.
const MOST_NOTES: usize = 8;

impl Table {
    /// Opens a file and reads its header; `names` stand in place of the names it has.
    pub fn open(path: &Path, file: &str, names: Option<&str>) -> Result<Table, Problems> {
        let opened =
            File::open(path).map_err(|e| Problem::error(file, format!("cannot be read: {e}")))?;
        let mut table = Table {
            file: file.to_owned(),
            heads: Vec::new(),
            notes: Vec::new(),
            lines: Lines::new(BufReader::with_capacity(1 << 18, opened)),
            delimiter: Delimiter::Blanks,
            decimal_comma: false,
            held: false,
            fields: Vec::new(),
        };
        if !table.next()? {
            let problem = Problem::error(file, "there is nothing in it but comments");
            return Err(problem
                .hint("a record has a header and rows of numbers")
                .into());
        }
        table.delimiter = delimiter(table.lines.text());
        table.split();
        let numbers = |t: &Table| (0..t.fields.len()).all(|i| t.number(i).is_some());
        table.decimal_comma =
            table.delimiter == Delimiter::Byte(b';') || table.delimiter == Delimiter::Byte(b'\t');
        let headless = numbers(&table);
        if !headless {
            table.heads = table.headings();
            if table.next()? {
                table.split();
                let bare = table.heads.iter().all(|h| h.label.unit.is_none());
                if bare
                    && table.fields.len() == table.heads.len()
                    && !numbers(&table)
                    && !table.any_number()
                {
                    for i in 0..table.heads.len() {
                        let unit = table
                            .field(i)
                            .trim_matches(['[', ']', '(', ')', '"', ' '])
                            .to_owned();
                        if let Some(head) = table.heads.get_mut(i) {
                            head.label.unit = Some(unit).filter(|u| !u.is_empty());
                        }
                    }
                } else {
                    table.held = true;
                }
            }
        } else {
            table.held = true;
        }
        if let Some(names) = names {
            let count = if headless {
                table.fields.len()
            } else {
                table.heads.len()
            };
            table.heads = renamed(names, count)?
                .into_iter()
                .map(|label| Heading { label, place: None })
                .collect();
        } else if headless {
            let what = "the file begins with numbers: its columns have no names";
            let at = place(
                file,
                table.lines.number(),
                table.lines.text(),
                0,
                table.lines.text().len(),
            );
            return Err(Problem::error(file, what)
                .hint("name them, as in --names \"time [s], p1 [Pa], p2 [Pa]\"")
                .at(at)
                .into());
        }
        Ok(table)
    }

    fn headings(&self) -> Vec<Heading> {
        let text = self.lines.text();
        (self.fields.iter())
            .map(|&(start, end)| Heading {
                label: label(text.get(start..end).unwrap_or_default()),
                place: Some(place(&self.file, self.lines.number(), text, start, end)),
            })
            .collect()
    }

    /// Reads the next line that is neither blank nor a comment into the buffer; false at the end.
    fn next(&mut self) -> Result<bool, Problem> {
        loop {
            match self.lines.next() {
                Found::End => return Ok(false),
                Found::Fault(what) => return Err(Problem::error(self.file.as_str(), what)),
                Found::Line => {}
            }
            if !self.lines.is_text() {
                let what = "this line is not UTF-8 text";
                let text = self.lines.text();
                let at = place(
                    &self.file,
                    self.lines.number(),
                    text,
                    text.len(),
                    text.len(),
                );
                return Err(Problem::error(self.file.as_str(), what)
                    .hint("save the file as UTF-8; in an older encoding a degree or micro sign is the usual cause")
                    .at(at));
            }
            let text = self.lines.text().trim_start();
            let mark = ['#', '%', '!'];
            if text.starts_with(mark) {
                let note = text.trim_start_matches(mark).trim();
                if self.notes.len() < MOST_NOTES && self.heads.is_empty() && !note.is_empty() {
                    self.notes
                        .push(note.chars().filter(|c| !c.is_control()).take(200).collect());
                }
            } else if !text.is_empty() {
                return Ok(true);
            }
        }
    }

    /// Reads the next row; false at the end.
    ///
    /// # Errors
    /// Where the file cannot be read on or is no text.
    pub fn row(&mut self) -> Result<bool, Problem> {
        if std::mem::take(&mut self.held) || self.next()? {
            self.split();
            return Ok(true);
        }
        Ok(false)
    }

    fn split(&mut self) {
        self.fields.clear();
        let text = self.lines.text();
        match self.delimiter {
            Delimiter::Blanks => {
                let mut at = 0;
                for word in text.split_ascii_whitespace() {
                    let start = at + text.get(at..).and_then(|t| t.find(word)).unwrap_or(0);
                    at = start + word.len();
                    self.fields.push((start, at));
                }
            }
            Delimiter::Byte(delimiter) => {
                let (mut start, mut quoted) = (0, false);
                for (i, b) in text.bytes().enumerate() {
                    if b == b'"' {
                        quoted = !quoted;
                    } else if b == delimiter && !quoted {
                        self.fields.push((start, i));
                        start = i + 1;
                    }
                }
                self.fields.push((start, text.len()));
            }
        }
    }

    /// Number of fields of the row.
    pub fn width(&self) -> usize {
        self.fields.len()
    }

    /// A field of the row without blanks and quotes around it.
    pub fn field(&self, i: usize) -> &str {
        let range = self.fields.get(i).copied().unwrap_or_default();
        let text = self.lines.text().get(range.0..range.1).unwrap_or_default();
        text.trim_matches([' ', '\t', '"'])
    }

    /// A field as a number; infinite and "not a number" among them.
    pub fn number(&self, i: usize) -> Option<f64> {
        let text = self.field(i);
        if let Ok(x) = text.parse() {
            return Some(x);
        }
        if self.decimal_comma && text.contains(',') {
            return text.replacen(',', ".", 1).parse().ok();
        }
        // Fortran writes doubles with a D.
        text.contains(['d', 'D'])
            .then(|| text.replace(['d', 'D'], "e").parse().ok())?
    }

    fn any_number(&self) -> bool {
        (0..self.fields.len()).any(|i| self.number(i).is_some())
    }

    /// The place of a field of the row, or of the whole row.
    pub fn place(&self, field: Option<usize>) -> Place {
        let text = self.lines.text();
        let range = field.and_then(|i| self.fields.get(i)).copied();
        let (start, end) = range.unwrap_or((0, text.len()));
        place(&self.file, self.lines.number(), text, start, end)
    }

    /// The number of the row's line.
    pub fn line(&self) -> u64 {
        self.lines.number()
    }

    /// Whether the row's line has no end, as the last line of a file that was cut.
    pub fn cut(&self) -> bool {
        !self.lines.ended()
    }

    /// Bytes read so far.
    pub fn bytes(&self) -> u64 {
        self.lines.bytes()
    }

    /// What is wrong with a field that is no finite number.
    pub fn bad(&self, i: usize) -> Problem {
        let name = self
            .heads
            .get(i)
            .map_or(self.file.as_str(), |h| h.label.name.as_str());
        let what = match (self.field(i), self.number(i)) {
            ("", _) => format!("line {} has nothing where a number belongs", self.line()),
            (text, Some(_)) => format!("`{}` on line {} is not finite", shown(text), self.line()),
            (text, None) => format!("`{}` on line {} is no number", shown(text), self.line()),
        };
        Problem::error(name, what)
            .hint("a missing sample cannot be made up; take a stretch without it with --span")
            .at(self.place(Some(i)))
    }

    /// What is wrong with a row that is not as wide as the header.
    pub fn ragged(&self) -> Problem {
        let what = format!(
            "line {} has {} where the header has {}",
            self.line(),
            fields(self.width()),
            self.heads.len()
        );
        Problem::error(self.file.as_str(), what)
            .hint("every row has one number for each column")
            .at(self.place(None))
    }
}

fn fields(n: usize) -> String {
    if n == 1 {
        "1 field".to_owned()
    } else {
        format!("{n} fields")
    }
}

fn delimiter(header: &str) -> Delimiter {
    [b'\t', b';', b',']
        .into_iter()
        .find(|d| header.bytes().any(|b| b == *d))
        .map_or(Delimiter::Blanks, Delimiter::Byte)
}
