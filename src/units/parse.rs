//! `NUMBER UNIT` and `A to B UNIT` to SI.

use super::Dimension;
use super::decimal::Written;
use super::table::{self, Unit};
use crate::problems::nearest;

/// Why a text is no quantity of the dimension wanted.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum QuantityError {
    /// Nothing is written.
    #[error("nothing is written where {} belongs", wanted.noun())]
    Empty {
        /// The dimension wanted.
        wanted: Dimension,
    },
    /// It does not begin with a number, or goes on after its unit.
    #[error("`{text}` is no number with a unit")]
    NotANumber {
        /// The text.
        text: String,
        /// The dimension wanted.
        wanted: Dimension,
    },
    /// A comma stands where the decimal point belongs.
    #[error("`{text}` has a comma in its number")]
    Comma {
        /// The text.
        text: String,
    },
    /// Not a number, or infinite, in words.
    #[error("`{text}` is not finite")]
    NotFinite {
        /// The text.
        text: String,
        /// The dimension wanted.
        wanted: Dimension,
    },
    /// Larger than the largest double.
    #[error("`{text}` is larger than any number that can be computed with (about 1.8e308)")]
    TooLarge {
        /// The text.
        text: String,
    },
    /// Not zero but smaller than the smallest double.
    #[error("`{text}` is smaller than any number that can be computed with (about 4.9e-324)")]
    TooSmall {
        /// The text.
        text: String,
    },
    /// A number alone where a unit belongs.
    #[error("`{text}` has no unit, and {} needs one", wanted.noun())]
    MissingUnit {
        /// The number.
        text: String,
        /// The dimension wanted.
        wanted: Dimension,
    },
    /// A unit after a number without dimension.
    #[error("`{unit}` is written after a number that has no unit")]
    UnwantedUnit {
        /// The unit.
        unit: String,
        /// The number.
        number: String,
    },
    /// A unit of something else.
    #[error("`{unit}` is a unit of {}, and {} is wanted", bare(*found), wanted.noun())]
    WrongDimension {
        /// The unit.
        unit: String,
        /// What it measures.
        found: Dimension,
        /// The dimension wanted.
        wanted: Dimension,
    },
    /// No unit at all.
    #[error("`{unit}` is no unit this program knows")]
    UnknownUnit {
        /// The text where the unit belongs.
        unit: String,
        /// The nearest unit of the dimension.
        meant: Option<&'static str>,
        /// The dimension wanted.
        wanted: Dimension,
    },
    /// One quantity where a span of two belongs.
    #[error("`{text}` is no span from one value to another")]
    NotASpan {
        /// The text.
        text: String,
        /// The dimension wanted.
        wanted: Dimension,
    },
}

fn bare(dimension: Dimension) -> &'static str {
    let noun = dimension.noun();
    noun.split_once(' ').map_or(noun, |(_, n)| n)
}

impl QuantityError {
    /// What would be right.
    pub fn hint(&self) -> String {
        let like = |d: Dimension| format!("write {} like `{}`", d.noun(), d.example());
        match self {
            QuantityError::Empty { wanted }
            | QuantityError::NotANumber { wanted, .. }
            | QuantityError::NotFinite { wanted, .. } => like(*wanted),
            QuantityError::Comma { .. } => {
                "write a decimal point, and no mark between thousands".to_owned()
            }
            QuantityError::TooLarge { .. } | QuantityError::TooSmall { .. } => {
                "check the exponent".to_owned()
            }
            QuantityError::MissingUnit { text, wanted } => {
                let unit = wanted.example().split_once(' ').map_or("", |(_, u)| u);
                format!(
                    "say in which unit, such as `{text} {unit}`; it may be {}",
                    listed(wanted.unit_names())
                )
            }
            QuantityError::UnwantedUnit { number, .. } => format!("write `{number}` alone"),
            QuantityError::WrongDimension { wanted, .. } => {
                format!(
                    "{} may be in {}",
                    wanted.noun(),
                    listed(wanted.unit_names())
                )
            }
            QuantityError::UnknownUnit {
                meant: Some(meant), ..
            } => {
                format!("did you mean `{meant}`?")
            }
            QuantityError::UnknownUnit {
                meant: None,
                wanted,
                ..
            } => {
                format!(
                    "{} may be in {}",
                    wanted.noun(),
                    listed(wanted.unit_names())
                )
            }
            QuantityError::NotASpan { wanted, .. } => {
                let unit = wanted.si_unit();
                format!("write it like `{}`", format!("1 to 5 {unit}").trim_end())
            }
        }
    }
}

/// `a, b or c`.
fn listed(names: impl Iterator<Item = &'static str>) -> String {
    crate::problems::listed(names)
}

/// A quantity in SI.
///
/// # Errors
///
/// Says which part of the text is wrong; [`QuantityError::hint`] says what would be right.
pub fn parse(text: &str, wanted: Dimension) -> Result<f64, QuantityError> {
    let text = plain_number(text);
    let (number, unit) = split(&text, wanted)?;
    let unit = match (wanted, unit) {
        (Dimension::Number, None) => return finite(number, number.scaled(0), &text),
        (Dimension::Number, Some(unit)) => {
            return Err(match known(unit) {
                Some(_) => QuantityError::UnwantedUnit {
                    unit: unit.to_owned(),
                    number: text
                        .strip_suffix(unit)
                        .unwrap_or(&text)
                        .trim_end()
                        .to_owned(),
                },
                None => QuantityError::NotANumber {
                    text: text.clone(),
                    wanted,
                },
            });
        }
        (_, None) => return Err(QuantityError::MissingUnit { text, wanted }),
        (_, Some(unit)) => find(unit, wanted, &text)?,
    };
    finite(number, in_si(number, unit), &text)
}

/// A plain number, as in a document that has numbers of its own: `0.5`, `1e3`, `nan`.
///
/// # Errors
///
/// As [`parse`].
pub fn parse_number(text: &str) -> Result<f64, QuantityError> {
    parse(text, Dimension::Number)
}

/// A span `A to B UNIT` in SI, in the order written; `A` may carry a unit of its own.
///
/// # Errors
///
/// As [`parse`]; whether `A` lies below `B` is the caller's question.
pub fn parse_span(text: &str, wanted: Dimension) -> Result<(f64, f64), QuantityError> {
    let text = plain_number(text);
    if text.is_empty() {
        return Err(QuantityError::Empty { wanted });
    }
    let words: Vec<&str> = text.split(' ').collect();
    let mut at = words
        .iter()
        .enumerate()
        .filter(|(_, w)| **w == "to")
        .map(|(i, _)| i);
    let (Some(i), None) = (at.next(), at.next()) else {
        return Err(QuantityError::NotASpan { text, wanted });
    };
    let (from, to) = (words[..i].join(" "), words[i + 1..].join(" "));
    let high = parse(&to, wanted)?;
    let low = match parse(&from, wanted) {
        Err(QuantityError::MissingUnit { text: number, .. }) => {
            let (_, unit) = split(&to, wanted)?;
            parse(&format!("{number} {}", unit.unwrap_or_default()), wanted)?
        }
        other => other?,
    };
    Ok((low, high))
}

/// The text with one kind of minus sign and of blank, without blanks at its ends.
fn plain_number(text: &str) -> String {
    let plain: String = text
        .chars()
        .map(|c| if c == '\u{2212}' { '-' } else { c })
        .collect();
    plain.split_whitespace().collect::<Vec<_>>().join(" ")
}

/// The unit in the spelling of the table: `m²` as `m^2`, `kg·K` as `kg K`, `µs` as `us`.
pub(super) fn plain_unit(text: &str) -> String {
    let mut plain = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '\u{b5}' | '\u{3bc}' => plain.push('u'),
            '\u{b2}' => plain.push_str("^2"),
            '\u{b3}' => plain.push_str("^3"),
            '\u{2103}' => plain.push_str("degC"),
            '\u{2109}' => plain.push_str("degF"),
            '\u{212a}' => plain.push('K'),
            '\u{b7}' | '\u{22c5}' | '*' => plain.push(' '),
            other => plain.push(other),
        }
    }
    let mut plain = plain.split_whitespace().collect::<Vec<_>>().join(" ");
    for mark in ["/", "(", ")"] {
        plain = plain
            .replace(&format!(" {mark}"), mark)
            .replace(&format!("{mark} "), mark);
    }
    plain
}

/// The number, and the text where its unit belongs.
fn split(text: &str, wanted: Dimension) -> Result<(Written<'_>, Option<&str>), QuantityError> {
    if text.is_empty() {
        return Err(QuantityError::Empty { wanted });
    }
    let Some((number, rest)) = Written::split(text) else {
        let word = text.trim_start_matches(['+', '-']).to_ascii_lowercase();
        let text = text.to_owned();
        return Err(match word.split(' ').next() {
            Some("nan" | "inf" | "infinity") => QuantityError::NotFinite { text, wanted },
            _ => QuantityError::NotANumber { text, wanted },
        });
    };
    if let Some(after) = rest.strip_prefix(',')
        && after.starts_with(|c: char| c.is_ascii_digit())
    {
        return Err(QuantityError::Comma {
            text: text.to_owned(),
        });
    }
    let rest = rest.trim_start();
    Ok((number, (!rest.is_empty()).then_some(rest)))
}

fn known(unit: &str) -> Option<Dimension> {
    let unit = plain_unit(unit);
    Dimension::ALL
        .into_iter()
        .find(|d| table::units(*d).iter().any(|u| u.is_spelt(&unit)))
}

fn find(text: &str, wanted: Dimension, all: &str) -> Result<&'static Unit, QuantityError> {
    let plain = plain_unit(text);
    if let Some(unit) = table::units(wanted).iter().find(|u| u.is_spelt(&plain)) {
        return Ok(unit);
    }
    let unit = text.to_owned();
    if let Some(found) = known(text) {
        return Err(QuantityError::WrongDimension {
            unit,
            found,
            wanted,
        });
    }
    if text.starts_with(|c: char| c.is_ascii_digit() || ".+-".contains(c)) {
        return Err(QuantityError::NotANumber {
            text: all.to_owned(),
            wanted,
        });
    }
    let meant = match (wanted, plain.as_str()) {
        (Dimension::Temperature, "C" | "c") => Some("degC"),
        (Dimension::Temperature, "F" | "f") => Some("degF"),
        _ => nearest(&plain, wanted.unit_names()).or_else(|| table::spelt_out(&plain, wanted)),
    };
    Err(QuantityError::UnknownUnit {
        unit,
        meant,
        wanted,
    })
}

fn in_si(number: Written<'_>, unit: &Unit) -> f64 {
    if unit.shift_hundredths == 0 && unit.multiplier == 1 {
        return number.scaled(unit.exponent) * unit.times / unit.over;
    }
    let exact = number.exact().and_then(|d| {
        let shifted = if unit.shift_hundredths == 0 {
            d
        } else {
            d.plus(unit.shift_hundredths, -2)?
        };
        shifted.times(unit.multiplier)
    });
    let decimal = match exact {
        Some(d) => d.scaled(unit.exponent),
        // More digits than a double can tell apart: rounding at each step is as good.
        None => {
            (number.scaled(0) + unit.shift_hundredths as f64 / 100.0)
                * unit.multiplier as f64
                * 10f64.powi(unit.exponent)
        }
    };
    decimal * unit.times / unit.over
}

fn finite(number: Written<'_>, value: f64, text: &str) -> Result<f64, QuantityError> {
    if !value.is_finite() {
        Err(QuantityError::TooLarge {
            text: text.to_owned(),
        })
    // A shift (-273.15 degC) makes an honest zero of a number that is not small.
    } else if value == 0.0 && !number.is_zero() && number.scaled(0).abs() < 1e-200 {
        Err(QuantityError::TooSmall {
            text: text.to_owned(),
        })
    } else {
        Ok(value)
    }
}

#[cfg(test)]
#[path = "tests.rs"]
mod tests;
