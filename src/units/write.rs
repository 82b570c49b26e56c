//! SI to `NUMBER UNIT`.

use super::{Dimension, parse};

/// A unit to print in: its name, its power of ten of the SI unit, and the least magnitude in SI it
/// is used for.
type Shown = (&'static str, i32, f64);

fn shown(dimension: Dimension) -> &'static [Shown] {
    match dimension {
        Dimension::Number => &[("", 0, 0.0)],
        Dimension::Length => &[("m", 0, 1.0), ("mm", -3, 0.0)],
        Dimension::Area => &[("m^2", 0, 1.0), ("cm^2", -4, 1e-4), ("mm^2", -6, 0.0)],
        Dimension::Volume => &[("m^3", 0, 1.0), ("L", -3, 1e-3), ("cm^3", -6, 0.0)],
        Dimension::Temperature => &[("K", 0, 0.0)],
        Dimension::Pressure => &[("MPa", 6, 1e7), ("kPa", 3, 1e3), ("Pa", 0, 0.0)],
        Dimension::MassFlow => &[("kg/s", 0, 1.0), ("g/s", -3, 0.0)],
        Dimension::Velocity => &[("m/s", 0, 0.0)],
        Dimension::Time => &[("s", 0, 1.0), ("ms", -3, 1e-4), ("us", -6, 0.0)],
        Dimension::Frequency => &[("Hz", 0, 0.0)],
        Dimension::Rate => &[("1/s", 0, 0.0)],
        Dimension::Angle => &[("rad", 0, 0.0)],
        Dimension::SpecificGasConstant => &[("J/(kg K)", 0, 0.0)],
        Dimension::MolarMass => &[("g/mol", -3, 0.0)],
    }
}

/// An SI value as a file would state it, with the fewest digits that read back as the same double:
/// `0.003` of a time is `3 ms`.
pub fn write(value: f64, dimension: Dimension) -> String {
    if dimension == Dimension::Angle {
        let degrees = format!("{} deg", value.to_degrees());
        let rounded = write_rounded(value, dimension, 12);
        if let Some(text) = [rounded, degrees]
            .into_iter()
            .find(|t| parse(t, dimension) == Ok(value))
        {
            return text;
        }
    }
    in_unit(&format!("{value:e}"), value, dimension)
}

/// An SI value for a sentence, to a number of significant digits.
pub fn write_rounded(value: f64, dimension: Dimension, digits: usize) -> String {
    let places = digits.saturating_sub(1);
    if dimension == Dimension::Angle && value.is_finite() {
        let degrees = value.to_degrees();
        return format!("{} deg", plain(&format!("{degrees:.places$e}"), 0));
    }
    in_unit(&format!("{value:.places$e}"), value, dimension)
}

/// From here on the digits before the point say nothing, and the number is written with an exponent.
const BEYOND: f64 = 1e9;

/// A number for a sentence or a table, to so many decimals: a hyphen for a minus, no negative zero,
/// with an exponent where it is huge.
pub fn write_decimals(value: f64, decimals: usize) -> String {
    if value.abs() >= BEYOND {
        return format!("{value:.3e}");
    }
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        Some(digits) if is_zero(digits) => digits.to_owned(),
        _ => text,
    }
}

/// The same with its sign, which zero has none of.
pub fn write_signed(value: f64, decimals: usize) -> String {
    let text = write_decimals(value, decimals);
    match text.as_str() {
        t if t.starts_with('-') || is_zero(t) => text,
        t => format!("+{t}"),
    }
}

fn is_zero(digits: &str) -> bool {
    digits.bytes().all(|b| matches!(b, b'0' | b'.'))
}

fn in_unit(scientific: &str, value: f64, dimension: Dimension) -> String {
    let units = shown(dimension);
    // Zero in the first unit, as `0 m`.
    let fits = |u: &&Shown| value == 0.0 || value.abs() >= u.2;
    let Some((name, exponent, _)) = units.iter().find(fits).or(units.last()) else {
        return value.to_string();
    };
    let number = if value.is_finite() {
        plain(scientific, -exponent)
    } else {
        value.to_string()
    };
    format!("{number} {name}").trim_end().to_owned()
}

/// A number in scientific notation times `10^shift`, without an exponent where that reads well.
fn plain(scientific: &str, shift: i32) -> String {
    let (mantissa, exponent) = scientific.split_once('e').unwrap_or((scientific, "0"));
    let exponent = exponent.parse::<i32>().unwrap_or_default() + shift;
    let (sign, magnitude) = match mantissa.strip_prefix('-') {
        Some(m) => ("-", m),
        None => ("", mantissa),
    };
    let (whole, fraction) = magnitude.split_once('.').unwrap_or((magnitude, ""));
    let digits = format!("{whole}{fraction}");
    let digits = match digits.trim_end_matches('0') {
        "" => return format!("{sign}0"),
        d => d,
    };
    let count = i32::try_from(digits.len()).unwrap_or(i32::MAX);
    let zeros = |n: i32| "0".repeat(usize::try_from(n).unwrap_or_default());
    let text = match exponent {
        e if (-5..0).contains(&e) => format!("0.{}{digits}", zeros(-e - 1)),
        e if (0..12).contains(&e) && e + 1 >= count => format!("{digits}{}", zeros(e + 1 - count)),
        e if (0..12).contains(&e) => {
            let (a, b) = digits.split_at(usize::try_from(e + 1).unwrap_or_default());
            format!("{a}.{b}")
        }
        e => {
            let (a, b) = digits.split_at(1);
            let point = if b.is_empty() { "" } else { "." };
            format!("{a}{point}{b}e{e}")
        }
    };
    format!("{sign}{text}")
}
