//! Quantities as written (`120 mm`, `430 degC`) and in SI.
//!
//! Reading is exact: a decimal in a unit that is a power of ten of the SI unit, a whole multiple of
//! one, or a shifted one becomes the double nearest to the number written (`3 ms` is the double
//! nearest 0.003). Units that are no finite decimal of SI (`psi`, `kg/h`, `deg`, `degF`) add one
//! or two further roundings.

mod decimal;
mod parse;
mod table;
mod write;

pub use parse::{QuantityError, parse, parse_number, parse_span};
pub use write::{write, write_decimals, write_rounded, write_signed};

/// The kind of quantity a number is. Decides which units may be written.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Dimension {
    /// No unit.
    Number,
    /// Length (m).
    Length,
    /// Area (m^2).
    Area,
    /// Volume (m^3).
    Volume,
    /// Absolute temperature (K); `degC` and `degF` are shifted, not scaled.
    Temperature,
    /// Pressure (Pa).
    Pressure,
    /// Mass flow (kg/s).
    MassFlow,
    /// Velocity (m/s).
    Velocity,
    /// Time (s).
    Time,
    /// Frequency (Hz).
    Frequency,
    /// Growth rate (1/s).
    Rate,
    /// Plane angle (rad).
    Angle,
    /// Specific gas constant (J/(kg K)).
    SpecificGasConstant,
    /// Molar mass [kg/mol].
    MolarMass,
}

impl Dimension {
    /// Every dimension.
    pub const ALL: [Dimension; 14] = [
        Dimension::Number,
        Dimension::Length,
        Dimension::Area,
        Dimension::Volume,
        Dimension::Temperature,
        Dimension::Pressure,
        Dimension::MassFlow,
        Dimension::Velocity,
        Dimension::Time,
        Dimension::Frequency,
        Dimension::Rate,
        Dimension::Angle,
        Dimension::SpecificGasConstant,
        Dimension::MolarMass,
    ];

    /// What it is called in a sentence, with its article.
    pub fn noun(self) -> &'static str {
        match self {
            Dimension::Number => "a plain number",
            Dimension::Length => "a length",
            Dimension::Area => "an area",
            Dimension::Volume => "a volume",
            Dimension::Temperature => "a temperature",
            Dimension::Pressure => "a pressure",
            Dimension::MassFlow => "a mass flow",
            Dimension::Velocity => "a velocity",
            Dimension::Time => "a time",
            Dimension::Frequency => "a frequency",
            Dimension::Rate => "a rate",
            Dimension::Angle => "an angle",
            Dimension::SpecificGasConstant => "a specific gas constant",
            Dimension::MolarMass => "a molar mass",
        }
    }

    /// A quantity of it as a file would state it, without quotes.
    pub fn example(self) -> &'static str {
        match self {
            Dimension::Number => "0.5",
            Dimension::Length => "120 mm",
            Dimension::Area => "50 cm^2",
            Dimension::Volume => "2.5 L",
            Dimension::Temperature => "300 K",
            Dimension::Pressure => "101325 Pa",
            Dimension::MassFlow => "30 g/s",
            Dimension::Velocity => "12 m/s",
            Dimension::Time => "3 ms",
            Dimension::Frequency => "250 Hz",
            Dimension::Rate => "-100 1/s",
            Dimension::Angle => "30 deg",
            Dimension::SpecificGasConstant => "287 J/(kg K)",
            Dimension::MolarMass => "28.96 g/mol",
        }
    }

    /// Symbol of the SI unit; empty for a plain number.
    pub fn si_unit(self) -> &'static str {
        match self {
            Dimension::Number => "",
            Dimension::Length => "m",
            Dimension::Area => "m^2",
            Dimension::Volume => "m^3",
            Dimension::Temperature => "K",
            Dimension::Pressure => "Pa",
            Dimension::MassFlow => "kg/s",
            Dimension::Velocity => "m/s",
            Dimension::Time => "s",
            Dimension::Frequency => "Hz",
            Dimension::Rate => "1/s",
            Dimension::Angle => "rad",
            Dimension::SpecificGasConstant => "J/(kg K)",
            Dimension::MolarMass => "kg/mol",
        }
    }

    /// Every unit a file may write it in, the preferred spelling of each.
    pub fn unit_names(self) -> impl Iterator<Item = &'static str> {
        table::units(self).iter().map(|u| u.name)
    }
}
