//! What is wrong with a network, told all at once.
//!
//! A [`Problem`] names its subject by dotted name (`chamber.length`), says what is wrong and what
//! would be right. Where it stands in the file ([`Place`]) is attached by the input layer, which
//! alone knows files; every other layer names the subject and is found by it.

use std::fmt;

/// Whether a problem forbids an answer or qualifies it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Severity {
    /// The answer stands, with this said beside it.
    Warning,
    /// No answer can be given.
    Error,
}

/// A place in a source: a file, or an override given on the command line.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Place {
    /// File name, or `--set` for an override.
    pub source: String,
    /// Line, counted from one.
    pub line: usize,
    /// Column in characters, counted from one.
    pub column: usize,
    /// Length of the marked text in characters, at least one.
    pub width: usize,
    /// The whole line the place is in, without its line end; empty where the place is a source as a whole.
    pub text: String,
}

/// One thing wrong (or doubtful), where, and what would be right.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Problem {
    /// Whether an answer is still possible.
    pub severity: Severity,
    /// Dotted name of what the problem is about: `chamber.length`, `main_flame`, `feed`.
    pub subject: String,
    /// What is wrong, one sentence without a full stop.
    pub what: String,
    /// What would be right, one sentence without a full stop.
    pub hint: Option<String>,
    /// Where it stands, once the input layer has looked it up.
    pub place: Option<Box<Place>>,
    /// Whether it lies in how the numbers of a network go together, each of which it may have.
    pub of_whole: bool,
}

impl Problem {
    /// A problem that forbids an answer.
    pub fn error(subject: impl Into<String>, what: impl Into<String>) -> Self {
        Problem {
            severity: Severity::Error,
            subject: subject.into(),
            what: what.into(),
            hint: None,
            place: None,
            of_whole: false,
        }
    }

    /// A remark that qualifies the answer.
    pub fn warning(subject: impl Into<String>, what: impl Into<String>) -> Self {
        Problem {
            severity: Severity::Warning,
            ..Self::error(subject, what)
        }
    }

    /// The same problem with advice on what would be right.
    #[must_use]
    pub fn hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = Some(hint.into());
        self
    }

    /// The same problem as one of the network as a whole.
    #[must_use]
    pub fn of_whole(mut self) -> Self {
        self.of_whole = true;
        self
    }

    /// The same problem at a known place.
    #[must_use]
    pub fn at(mut self, place: Place) -> Self {
        self.place = Some(Box::new(place));
        self
    }
}

impl fmt::Display for Problem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if let Some(p) = &self.place {
            write!(f, "{}:{}:{}: ", p.source, p.line, p.column)?;
        }
        write!(f, "`{}`: {}", self.subject, self.what)?;
        if let Some(h) = &self.hint {
            write!(f, " ({h})")?;
        }
        Ok(())
    }
}

/// Every problem found in one pass; as an error it holds at least one [`Severity::Error`].
#[derive(Clone, Debug, Default, PartialEq, Eq, thiserror::Error)]
pub struct Problems(pub Vec<Problem>);

impl fmt::Display for Problems {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        for (i, p) in self.0.iter().enumerate() {
            if i > 0 {
                writeln!(f)?;
            }
            write!(f, "{p}")?;
        }
        Ok(())
    }
}

impl Problems {
    /// Nothing wrong so far.
    pub fn new() -> Self {
        Self::default()
    }

    /// Adds one.
    pub fn push(&mut self, p: Problem) {
        self.0.push(p);
    }

    /// Whether any of them forbids an answer.
    pub fn any_error(&self) -> bool {
        self.0.iter().any(|p| p.severity == Severity::Error)
    }
}

impl From<Problem> for Problems {
    fn from(p: Problem) -> Self {
        Problems(vec![p])
    }
}

/// The candidate a mistyped word most likely stands for, if any is near: the same but for case, or
/// within a third of its length in edits (optimal string alignment), or else the only one that holds
/// it whole, as `mass_flow` holds `flow`.
pub fn nearest<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let lower = word.to_lowercase();
    let length = word.chars().count();
    let candidates: Vec<&str> = candidates.into_iter().collect();
    let near = candidates
        .iter()
        .map(|c| (strsim::osa_distance(&lower, &c.to_lowercase()), *c))
        .filter(|(edits, c)| *edits <= length.max(c.chars().count()).div_ceil(3).min(3))
        .filter(|(edits, c)| *edits < length.min(c.chars().count()) || *edits == 0)
        .min_by_key(|(edits, _)| *edits)
        .map(|(_, c)| c);
    let holds = |c: &&str| {
        let c = c.to_lowercase();
        length > 3 && c.contains(&lower) || length == 3 && c.starts_with(&lower)
    };
    let mut holders = candidates.iter().copied().filter(holds);
    near.or_else(|| holders.next().filter(|_| holders.next().is_none()))
}

/// `a, b or c`, for a sentence.
pub fn listed<S: AsRef<str>>(names: impl IntoIterator<Item = S>) -> String {
    let names: Vec<S> = names.into_iter().collect();
    let mut text = String::new();
    for (i, name) in names.iter().enumerate() {
        text.push_str(match i {
            0 => "",
            _ if i + 1 == names.len() => " or ",
            _ => ", ",
        });
        text.push_str(name.as_ref());
    }
    text
}
