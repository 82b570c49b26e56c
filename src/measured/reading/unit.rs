//! Names with units as records write them, and calibrations as a command line does.

use crate::measured::Quantity;
use crate::units::{self, Dimension};

/// A name and, where one is written, its unit: `p1 [Pa]`, `p1 (Pa)`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Label {
    /// The name.
    pub name: String,
    /// The unit as written.
    pub unit: Option<String>,
}

/// Reads `p1 [Pa]`, `p1 (Pa)` or `p1`.
pub fn label(text: &str) -> Label {
    let text = text.trim().trim_matches('"').trim();
    for (open, close) in [('[', ']'), ('(', ')')] {
        // The first bracket: a unit may hold brackets of its own.
        if let Some(body) = text.strip_suffix(close)
            && let Some((name, unit)) = body.split_once(open)
        {
            let unit = Some(unit.trim().to_owned()).filter(|u| !u.is_empty());
            return Label {
                name: name.trim().to_owned(),
                unit,
            };
        }
    }
    Label {
        name: text.to_owned(),
        unit: None,
    }
}

/// A quantity and the SI value of one of its unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Scale {
    /// What is measured.
    pub quantity: Quantity,
    /// SI per unit.
    pub factor: f64,
}

/// Units of samples beyond those of network files.
const MORE: &[(&str, Quantity, f64)] = &[
    ("mPa", Quantity::Pressure, 1e-3),
    ("uPa", Quantity::Pressure, 1e-6),
    ("V", Quantity::Voltage, 1.0),
    ("mV", Quantity::Voltage, 1e-3),
    ("uV", Quantity::Voltage, 1e-6),
    ("W", Quantity::HeatRelease, 1.0),
    ("kW", Quantity::HeatRelease, 1e3),
    ("MW", Quantity::HeatRelease, 1e6),
    ("1", Quantity::Number, 1.0),
    ("-", Quantity::Number, 1.0),
    ("a.u.", Quantity::Light, 1.0),
];

/// Units a channel may have, for a hint.
pub const EXAMPLES: &str = "Pa, kPa, mbar, psi, m/s, V, W, or a.u. for light";

fn spelt(unit: &str) -> String {
    unit.trim().replace(['\u{b5}', '\u{3bc}'], "u")
}

/// The quantity a unit belongs to; `None` where it is none of a channel.
pub fn scale(unit: &str) -> Option<Scale> {
    let unit = spelt(unit);
    if let Some((_, quantity, factor)) = MORE.iter().find(|(u, ..)| *u == unit) {
        return Some(Scale {
            quantity: *quantity,
            factor: *factor,
        });
    }
    let dimensions = [
        (Dimension::Pressure, Quantity::Pressure),
        (Dimension::Velocity, Quantity::Velocity),
    ];
    dimensions.into_iter().find_map(|(dimension, quantity)| {
        let factor = size(&unit, dimension)?;
        Some(Scale { quantity, factor })
    })
}

/// SI per unit of a dimension.
fn size(unit: &str, dimension: Dimension) -> Option<f64> {
    let begins = unit.starts_with(|c: char| c.is_alphabetic());
    units::parse(&format!("1 {unit}"), dimension)
        .ok()
        .filter(|_| begins)
}

/// Seconds per unit, where it is one of time.
pub fn time(unit: &str) -> Option<f64> {
    size(&spelt(unit), Dimension::Time)
}

/// Hertz per unit, where it is one of frequency.
pub fn frequency(unit: &str) -> Option<f64> {
    size(&spelt(unit), Dimension::Frequency)
}

/// What a sample is multiplied with.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Per {
    /// A volt.
    Volt,
    /// One as it stands in the file.
    One,
}

/// A calibration of a channel.
#[derive(Clone, Debug, PartialEq)]
pub struct Calibration {
    /// The channel.
    pub name: String,
    /// What comes out, and how much of it for one.
    pub scale: Scale,
    /// For one of what.
    pub per: Per,
}

/// Reads `p1 = 12.3 Pa/V`, `p1 = 81.3 mV/Pa` or `p1 = 200 Pa`.
///
/// # Errors
/// What is wrong, for a sentence.
pub fn calibration(text: &str) -> Result<Calibration, String> {
    const FORM: &str =
        "write NAME = NUMBER UNIT, as in p1 = 12.3 Pa/V, p1 = 81.3 mV/Pa or p1 = 200 Pa";
    let (name, value) = text
        .split_once('=')
        .ok_or_else(|| format!("there is no `=`; {FORM}"))?;
    let (name, value) = (name.trim(), value.trim());
    if name.is_empty() {
        return Err(format!("no channel is named; {FORM}"));
    }
    let end = value.find(char::is_whitespace).unwrap_or(value.len());
    let (number, unit) = value.split_at(end);
    let number: f64 = number
        .parse()
        .map_err(|_| format!("`{number}` is no number; {FORM}"))?;
    if !number.is_finite() || number == 0.0 {
        return Err(format!("a calibration of {number} says nothing"));
    }
    let unit = unit.trim();
    let named = |scale: Scale, per: Per| Calibration {
        name: name.to_owned(),
        scale,
        per,
    };
    if let Some(found) = scale(unit) {
        let factor = number * found.factor;
        return Ok(named(Scale { factor, ..found }, Per::One));
    }
    let parts = unit
        .rsplit_once('/')
        .and_then(|(a, b)| Some((scale(a)?, scale(b)?)));
    match parts {
        Some((out, v)) if v.quantity == Quantity::Voltage => {
            let factor = number * out.factor / v.factor;
            Ok(named(Scale { factor, ..out }, Per::Volt))
        }
        Some((v, out)) if v.quantity == Quantity::Voltage => {
            let factor = out.factor / (number * v.factor);
            Ok(named(Scale { factor, ..out }, Per::Volt))
        }
        _ => Err(format!("`{unit}` is no unit of a calibration; {FORM}")),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_and_units_part() {
        for (text, name, unit) in [
            ("p1 [Pa]", "p1", Some("Pa")),
            (" p1(kPa) ", "p1", Some("kPa")),
            ("\"time (s)\"", "time", Some("s")),
            ("p1", "p1", None),
            ("p1 []", "p1", None),
            ("power [V(rms)]", "power", Some("V(rms)")),
        ] {
            let found = label(text);
            assert_eq!((found.name.as_str(), found.unit.as_deref()), (name, unit));
        }
    }

    /// lbf/in^2 and bar by definition (NIST SP 811, from memory: 6894.757 Pa).
    #[test]
    fn units_are_told_by_quantity() {
        assert!((scale("psi").unwrap().factor - 6894.757).abs() < 1e-3);
        assert_eq!(scale("\u{b5}Pa").unwrap().factor, 1e-6);
        assert_eq!(scale("m/s").unwrap().quantity, Quantity::Velocity);
        assert_eq!(
            (scale("furlong"), scale(""), scale("3 Pa"), scale("s")),
            (None, None, None, None)
        );
        assert_eq!((time("ms"), frequency("kHz")), (Some(1e-3), Some(1e3)));
    }

    #[test]
    fn calibrations_run_both_ways() {
        let of = |text| calibration(text).unwrap();
        let a = of("p1 = 12.5 Pa/V");
        assert_eq!((a.scale.factor, a.per), (12.5, Per::Volt));
        let b = of("p1 = 80 mV/Pa");
        assert!((b.scale.factor - 12.5).abs() < 1e-12);
        let c = of("u = 2 m/s/V");
        assert_eq!(
            (c.scale.factor, c.scale.quantity),
            (2.0, Quantity::Velocity)
        );
        assert_eq!(of("p1 = 2 kPa").scale.factor, 2000.0);
        for wrong in [
            "p1 12 Pa",
            "= 3 Pa",
            "p = x Pa",
            "p = 0 Pa",
            "p = 3",
            "p = 3 Pa/s",
            "p = inf Pa",
        ] {
            assert!(calibration(wrong).is_err(), "{wrong}");
        }
    }
}
