//! Network files: TOML with positions to a [`Network`], and every problem of one in one pass.
//!
//! The document is read from the parsed tree and not through derived deserialisers, which lose the
//! places of keys. The order of work: bytes, text, TOML, overrides laid over it, tables to
//! elements, graph, areas, remarks.

mod build;
mod document;
mod elements;
mod ends;
mod fields;
mod file;
mod overrides;
mod references;
mod remarks;
mod sensors;
mod sources;
mod syntax;

use std::path::Path;

pub use file::LARGEST_FILE;
pub use sources::{OVERRIDE, SourceMap};

use crate::network::Network;
use crate::problems::{Problem, Problems, Severity};
use fields::Reader;

/// A network read without errors.
#[derive(Clone, Debug)]
pub struct Loaded {
    /// The network.
    pub network: Network<f64>,
    /// What qualifies it, as far as the file alone can tell, in the order of the file.
    pub warnings: Vec<Problem>,
    /// Where each of its names stands.
    pub sources: SourceMap,
}

/// Reads a network file with overrides (`chamber.length = 0.9 m`) laid over it.
///
/// # Errors
///
/// Every problem of the file and the overrides, in the order of their places; warnings among them.
pub fn read(path: &Path, overrides: &[String]) -> Result<Loaded, Problems> {
    let text = file::text(path)?;
    parse(&path.display().to_string(), &text, overrides)
}

/// Reads a network from text; `name` stands for the file in problems.
///
/// # Errors
///
/// As [`read`].
pub fn parse(name: &str, text: &str, overrides: &[String]) -> Result<Loaded, Problems> {
    let mut reader = Reader {
        sources: SourceMap::new(name, text, overrides),
        ..Reader::default()
    };
    let Some(mut root) = syntax::document(&mut reader, text) else {
        return Err(Problems(ordered(reader).0));
    };
    if reader.problems.is_empty() && root.entries.is_empty() {
        reader.problems.push((
            None,
            Problem::error(name, "the file is empty: it states nothing")
                .hint("a network has a title, [feed], [[element]]s and [exit]"),
        ));
        return Err(Problems(ordered(reader).0));
    }
    overrides::lay_all(&mut reader, &mut root, overrides);
    let network = build::network(&mut reader, &root);
    if !reader
        .problems
        .iter()
        .any(|(_, p)| p.severity == Severity::Error)
    {
        for remark in remarks::remarks(&network) {
            reader.report_subject(remark);
        }
    }
    let (problems, sources) = ordered(reader);
    let problems = Problems(problems);
    if problems.any_error() {
        return Err(problems);
    }
    Ok(Loaded {
        network,
        warnings: problems.0,
        sources,
    })
}

/// The problems in the order of their places, each with its place.
fn ordered(reader: Reader) -> (Vec<Problem>, SourceMap) {
    let Reader {
        sources,
        mut problems,
        ..
    } = reader;
    problems.sort_by(|(a, _), (b, _)| a.cmp(b));
    let problems = problems
        .into_iter()
        .map(|(mark, mut problem)| {
            problem.place = mark.and_then(|m| sources.place_of(&m)).map(Box::new);
            sources.locate(&mut problem);
            problem
        })
        .collect();
    (problems, sources)
}
