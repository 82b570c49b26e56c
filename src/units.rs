//! Quantities as written (`120 mm`, `430 degC`) and in SI.

/// The kind of quantity a number is. Decides which units may be written.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Dimension {
    /// No unit.
    Number,
    /// Length [m].
    Length,
    /// Area [m^2].
    Area,
    /// Volume [m^3].
    Volume,
    /// Absolute temperature [K]; `degC` and `degF` are shifted, not scaled.
    Temperature,
    /// Pressure [Pa].
    Pressure,
    /// Mass flow [kg/s].
    MassFlow,
    /// Velocity [m/s].
    Velocity,
    /// Time [s].
    Time,
    /// Frequency [Hz].
    Frequency,
    /// Growth rate [1/s].
    Rate,
    /// Plane angle [rad].
    Angle,
    /// Specific gas constant [J/(kg K)].
    SpecificGasConstant,
    /// Molar mass [kg/mol].
    MolarMass,
}
