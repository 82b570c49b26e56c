//! The JSON object around every answer.

use serde::Serialize;

use super::{CAUTION, Heading};
use crate::modes::Window;
use crate::problems::{Problem, Severity};

/// Version of the schema: raised when a field changes its meaning or goes.
const VERSION: u32 = 1;

/// One answer.
#[derive(Clone, Debug, Serialize)]
pub struct Document<'a, T> {
    schema: &'static str,
    version: u32,
    program: &'static str,
    network: &'a str,
    #[serde(skip_serializing_if = "Option::is_none")]
    title: Option<&'a str>,
    #[serde(flatten)]
    body: T,
    warnings: Vec<Remark>,
    caution: &'static str,
}

/// A problem in JSON.
#[derive(Clone, Debug, Serialize)]
pub struct Remark {
    subject: String,
    message: String,
    hint: Option<String>,
    file: Option<String>,
    line: Option<usize>,
    column: Option<usize>,
}

impl From<&Problem> for Remark {
    fn from(p: &Problem) -> Self {
        let place = p.place.as_ref();
        Remark {
            subject: p.subject.clone(),
            message: p.what.clone(),
            hint: p.hint.clone(),
            file: place.map(|p| p.source.clone()),
            line: place.map(|p| p.line),
            column: place.map(|p| p.column),
        }
    }
}

const PROGRAM: &str = concat!("stillflame ", env!("CARGO_PKG_VERSION"));

impl<'a, T: Serialize> Document<'a, T> {
    /// An answer of the given schema.
    pub fn new(schema: &'static str, heading: &Heading<'a>, body: T, warnings: &[Problem]) -> Self {
        Document {
            schema,
            version: VERSION,
            program: PROGRAM,
            network: heading.network,
            title: Some(heading.title),
            body,
            warnings: warnings.iter().map(Remark::from).collect(),
            caution: CAUTION,
        }
    }

    /// The object on one line.
    ///
    /// # Errors
    /// Where the body has no form in JSON.
    pub fn to_json(&self) -> std::io::Result<String> {
        let mut text = serde_json::to_string(self).map_err(std::io::Error::other)?;
        text.push('\n');
        Ok(text)
    }
}

#[derive(Clone, Debug, Serialize)]
struct Refusal {
    problems: Vec<Remark>,
}

/// What stands in place of an answer where there is none: the problems, and warnings apart.
///
/// # Errors
/// Where it has no form in JSON.
pub fn refusal(network: &str, problems: &[Problem]) -> std::io::Result<String> {
    let of = |severity: Severity| {
        let those = problems.iter().filter(move |p| p.severity == severity);
        those.map(Remark::from).collect()
    };
    Document {
        schema: "stillflame/problems",
        version: VERSION,
        program: PROGRAM,
        network,
        title: None,
        body: Refusal {
            problems: of(Severity::Error),
        },
        warnings: of(Severity::Warning),
        caution: CAUTION,
    }
    .to_json()
}

/// A window in JSON.
#[derive(Clone, Copy, Debug, Serialize)]
pub(super) struct WindowFields {
    frequency_hz: (f64, f64),
    growth_per_s: (f64, f64),
}

impl From<&Window> for WindowFields {
    fn from(w: &Window) -> Self {
        WindowFields {
            frequency_hz: w.frequency,
            growth_per_s: w.growth,
        }
    }
}
