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
pub mod spectrum;
pub mod sweep;
mod table;

pub use document::{Document, Remark};

use crate::modes::Window;
use crate::problems::Problem;
use crate::units::{Dimension, write_rounded, write_signed};

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
    format!("{}, {} 1/s", band(window), span_text(window.growth))
}

/// `20 to 800 Hz`.
fn band(window: &Window) -> String {
    format!("{} Hz", span_text(window.frequency))
}

/// Both ends of a span to a thousandth of its width, and to one decimal where they are no huge numbers.
fn span_text((low, high): (f64, f64)) -> String {
    let fine = 3.0 - (high - low).log10().floor();
    let end = |x: f64| {
        let whole = x.abs().max(f64::MIN_POSITIVE).log10().floor() + 1.0;
        let digits = (whole + fine).max((whole + 1.0).min(8.0));
        // Adding zero takes the sign off a negative zero.
        write_rounded(x + 0.0, Dimension::Number, digits.clamp(2.0, 17.0) as usize)
    };
    format!("{} to {}", end(low), end(high))
}

/// A growth rate with its sign, whole where it is large.
fn rate(growth: f64) -> String {
    write_signed(growth, if growth.abs() < 9.95 { 1 } else { 0 })
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn both_ends_of_a_window_are_told_apart() {
        for (span, text) in [
            ((20.0, 800.0), "20 to 800"),
            ((-300.0, 300.0), "-300 to 300"),
            ((0.0, 1e-9), "0 to 1e-9"),
            ((300.001, 300.002), "300.001 to 300.002"),
            ((0.25, 1234.567), "0.25 to 1234.6"),
            ((-0.0, 1.0), "0 to 1"),
            ((-1e5, 1e5), "-100000 to 100000"),
            ((0.0, 2.212_345_678e154), "0 to 2.2123457e154"),
        ] {
            assert_eq!(span_text(span), text);
        }
    }

    #[test]
    fn growth_rates_carry_a_sign_and_zero_none() {
        let told = [-217.28, -0.3, -0.04, 0.0, 0.04, 9.96, 45.0].map(rate);
        assert_eq!(told, ["-217", "-0.3", "0.0", "0.0", "0.0", "+10", "+45"]);
    }
}
