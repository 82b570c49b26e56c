//! Results as terminal tables, CSV and JSON. Owns the output schema.
//!
//! Every JSON object is a [`Document`]: what it is, of which network, the numbers in SI and to full
//! precision, every warning, and the caution. A number that is not finite never appears.

pub mod check;
pub mod document;
mod explain;
pub mod figure;
pub mod flow;
pub mod map;
mod map_events;
pub mod modes;
pub mod problems;
pub mod profile;
pub mod shapes;
pub mod sweep;
mod table;

pub use document::{Document, Remark};

use crate::modes::Window;
use crate::problems::Problem;

/// What every report ends with.
pub const CAUTION: &str = "Predictions are for screening. Combustion oscillations break hardware and \
    hurt people: confirm by rig test, and follow local codes and licensed practice.";

/// Name and title of the network a report is of.
#[derive(Clone, Copy, Debug)]
pub struct Heading<'a> {
    /// The file as it was named.
    pub network: &'a str,
    /// Its title.
    pub title: &'a str,
}

impl Heading<'_> {
    fn text(&self) -> String {
        format!(
            "{}\n{}\n",
            problems::visible(self.title),
            problems::visible(self.network)
        )
    }
}

/// The last lines of a report for people: warnings, then the caution.
fn closing(warnings: &[Problem]) -> String {
    let mut text = String::new();
    if !warnings.is_empty() {
        text.push('\n');
        text.push_str(&problems::render(warnings));
    }
    text.push_str(&format!("\nCaution: {CAUTION}\n"));
    text
}

/// `20 to 800 Hz, -300 to 300 1/s`.
fn window_text(window: &Window) -> String {
    format!(
        "{} to {} Hz, {} to {} 1/s",
        short(window.frequency.0),
        short(window.frequency.1),
        short(window.growth.0),
        short(window.growth.1)
    )
}

/// A number with at most one decimal, where that loses nothing worth telling.
fn short(x: f64) -> String {
    let rounded = (x * 10.0).round() / 10.0;
    // Adding zero takes the sign off a negative zero.
    format!("{}", rounded + 0.0)
}

/// `1 mode`, `3 modes`.
fn counted(n: usize, word: &str) -> String {
    match n {
        1 => format!("1 {word}"),
        n => format!("{n} {word}s"),
    }
}

/// Rows as CSV, the field names as its first line.
///
/// # Errors
/// Where a row cannot be written as one line of plain fields.
fn csv_of<R: serde::Serialize>(rows: impl IntoIterator<Item = R>) -> std::io::Result<Vec<u8>> {
    let mut writer = csv::Writer::from_writer(Vec::new());
    for row in rows {
        writer.serialize(row).map_err(std::io::Error::other)?;
    }
    writer
        .into_inner()
        .map_err(|e| std::io::Error::other(e.to_string()))
}
