//! The units: `SI = (written + shift) * multiplier * 10^exponent * times / over`.
//!
//! Factors are exact by definition: the international yard and pound (1959: 1 ft = 0.3048 m, 1 lb =
//! 0.453 592 37 kg), standard gravity 9.806 65 m/s^2 and the standard atmosphere 101 325 Pa (SI
//! Brochure, 9th edition, and ISO 80000-1 annexes).

use std::f64::consts::PI;

use super::Dimension;

/// One unit, how it is spelt and what it is in SI.
#[derive(Clone, Copy, Debug)]
pub(super) struct Unit {
    /// Preferred spelling.
    pub name: &'static str,
    /// Other spellings, after [`super::parse::plain_unit`].
    pub aliases: &'static [&'static str],
    /// Hundredths added to the written number before scaling.
    pub shift_hundredths: i128,
    /// Whole factor.
    pub multiplier: i128,
    /// Power of ten.
    pub exponent: i32,
    /// Factor that is no finite decimal.
    pub times: f64,
    /// Divisor that leaves no finite decimal.
    pub over: f64,
}

impl Unit {
    /// Whether `text`, after [`super::parse::plain_unit`], names the unit.
    pub fn is_spelt(&self, text: &str) -> bool {
        self.name == text || self.aliases.contains(&text)
    }
}

const fn ten(name: &'static str, aliases: &'static [&'static str], exponent: i32) -> Unit {
    Unit {
        name,
        aliases,
        shift_hundredths: 0,
        multiplier: 1,
        exponent,
        times: 1.0,
        over: 1.0,
    }
}

const fn whole(name: &'static str, multiplier: i128, exponent: i32) -> Unit {
    Unit {
        multiplier,
        ..ten(name, &[], exponent)
    }
}

const fn ratio(name: &'static str, multiplier: i128, exponent: i32, over: f64) -> Unit {
    Unit {
        over,
        ..whole(name, multiplier, exponent)
    }
}

const LENGTH: &[Unit] = &[
    ten("m", &["metre", "meter"], 0),
    ten("mm", &[], -3),
    ten("cm", &[], -2),
    ten("um", &[], -6),
    ten("km", &[], 3),
    Unit {
        aliases: &["inch"],
        ..whole("in", 254, -4)
    },
    whole("ft", 3048, -4),
];

const AREA: &[Unit] = &[
    ten("m^2", &["m2"], 0),
    ten("cm^2", &["cm2"], -4),
    ten("mm^2", &["mm2"], -6),
    Unit {
        aliases: &["in2", "sq in"],
        ..whole("in^2", 254 * 254, -8)
    },
    Unit {
        aliases: &["ft2", "sq ft"],
        ..whole("ft^2", 3048 * 3048, -8)
    },
];

const VOLUME: &[Unit] = &[
    ten("m^3", &["m3"], 0),
    ten("L", &["l", "dm^3", "dm3"], -3),
    ten("mL", &["ml"], -6),
    ten("cm^3", &["cm3"], -6),
    ten("mm^3", &["mm3"], -9),
    Unit {
        aliases: &["in3"],
        ..whole("in^3", 254 * 254 * 254, -12)
    },
    Unit {
        aliases: &["ft3"],
        ..whole("ft^3", 3048 * 3048 * 3048, -12)
    },
];

const TEMPERATURE: &[Unit] = &[
    ten("K", &["kelvin"], 0),
    Unit {
        shift_hundredths: 27_315,
        ..ten("degC", &["\u{b0}C"], 0)
    },
    Unit {
        shift_hundredths: 45_967,
        aliases: &["\u{b0}F"],
        ..ratio("degF", 5, 0, 9.0)
    },
];

const PRESSURE: &[Unit] = &[
    ten("Pa", &[], 0),
    ten("hPa", &[], 2),
    ten("kPa", &[], 3),
    ten("MPa", &[], 6),
    ten("mbar", &[], 2),
    ten("bar", &[], 5),
    // lbf/in^2 = 0.45359237 * 9.80665 / 0.0254^2 Pa.
    ratio("psi", 44_482_216_152_605, -5, 64_516.0),
    whole("atm", 101_325, 0),
];

const MASS_FLOW: &[Unit] = &[
    ten("kg/s", &[], 0),
    ten("g/s", &[], -3),
    ten("mg/s", &[], -6),
    ratio("g/min", 1, -3, 60.0),
    ratio("kg/min", 1, 0, 60.0),
    ratio("kg/h", 1, 0, 3600.0),
    whole("lb/s", 45_359_237, -8),
    ratio("lb/min", 45_359_237, -8, 60.0),
    ratio("lb/h", 45_359_237, -8, 3600.0),
];

const VELOCITY: &[Unit] = &[
    ten("m/s", &[], 0),
    ten("cm/s", &[], -2),
    ten("mm/s", &[], -3),
    whole("ft/s", 3048, -4),
    ratio("km/h", 10, 0, 36.0),
];

const TIME: &[Unit] = &[
    ten("s", &["sec"], 0),
    ten("ms", &[], -3),
    ten("us", &[], -6),
    whole("min", 60, 0),
];

const FREQUENCY: &[Unit] = &[ten("Hz", &[], 0), ten("kHz", &[], 3)];

const RATE: &[Unit] = &[ten("1/s", &["s^-1"], 0), ten("1/ms", &["ms^-1"], 3)];

const ANGLE: &[Unit] = &[
    ten("rad", &[], 0),
    Unit {
        aliases: &["\u{b0}"],
        times: PI,
        ..ratio("deg", 1, 0, 180.0)
    },
];

const SPECIFIC_GAS_CONSTANT: &[Unit] = &[
    ten(
        "J/(kg K)",
        &[
            "J/kg/K",
            "J/kg-K",
            "J/(K kg)",
            "J kg^-1 K^-1",
            "m^2/(s^2 K)",
        ],
        0,
    ),
    ten(
        "kJ/(kg K)",
        &[
            "kJ/kg/K",
            "kJ/kg-K",
            "kJ/(K kg)",
            "kJ kg^-1 K^-1",
            "J/(g K)",
        ],
        3,
    ),
];

const MOLAR_MASS: &[Unit] = &[
    ten("kg/mol", &[], 0),
    ten("g/mol", &[], -3),
    ten("kg/kmol", &[], -3),
];

/// The units of a dimension, the SI unit first.
pub(super) const fn units(dimension: Dimension) -> &'static [Unit] {
    match dimension {
        Dimension::Number => &[],
        Dimension::Length => LENGTH,
        Dimension::Area => AREA,
        Dimension::Volume => VOLUME,
        Dimension::Temperature => TEMPERATURE,
        Dimension::Pressure => PRESSURE,
        Dimension::MassFlow => MASS_FLOW,
        Dimension::Velocity => VELOCITY,
        Dimension::Time => TIME,
        Dimension::Frequency => FREQUENCY,
        Dimension::Rate => RATE,
        Dimension::Angle => ANGLE,
        Dimension::SpecificGasConstant => SPECIFIC_GAS_CONSTANT,
        Dimension::MolarMass => MOLAR_MASS,
    }
}

/// Units as they are said, for a hint on what stands in their place.
const SPELT_OUT: &[(&str, &str)] = &[
    ("metre", "m"),
    ("meter", "m"),
    ("millimetre", "mm"),
    ("millimeter", "mm"),
    ("centimetre", "cm"),
    ("centimeter", "cm"),
    ("inch", "in"),
    ("inche", "in"),
    ("feet", "ft"),
    ("foot", "ft"),
    ("litre", "L"),
    ("liter", "L"),
    ("kelvin", "K"),
    ("celsiu", "degC"),
    ("degree celsiu", "degC"),
    ("fahrenheit", "degF"),
    ("pascal", "Pa"),
    ("bara", "bar"),
    ("atmosphere", "atm"),
    ("second", "s"),
    ("sec", "s"),
    ("millisecond", "ms"),
    ("msec", "ms"),
    ("microsecond", "us"),
    ("minute", "min"),
    ("hertz", "Hz"),
    ("kilohertz", "kHz"),
    ("degree", "deg"),
    ("radian", "rad"),
    ("rad/", "1/s"),
];

/// The unit of a dimension that a word such as `metres` says.
pub(super) fn spelt_out(word: &str, wanted: Dimension) -> Option<&'static str> {
    let word = word.to_lowercase();
    let singular = word.strip_suffix('s').unwrap_or(&word);
    let (_, name) = SPELT_OUT.iter().find(|(said, _)| *said == singular)?;
    let mut names = units(wanted).iter().map(|u| u.name);
    names.find(|n| n == name)
}
