//! A network as plain data that a test can draw, alter and write out as a network file: what fails
//! prints itself as a file that reproduces it.

use std::fmt::{self, Display, Formatter};

use stillflame::input;
use stillflame::network::Network;

/// A network.
#[derive(Clone, Debug, PartialEq)]
pub struct Rig {
    pub title: String,
    pub feed: Feed,
    pub pieces: Vec<Piece>,
    pub exit: Exit,
}

#[derive(Clone, Debug, PartialEq)]
pub struct Feed {
    pub gas: Gas,
    pub flow: Option<Inflow>,
    /// K.
    pub temperature: f64,
    /// Pa.
    pub pressure: Option<f64>,
    pub end: End,
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Gas {
    Air,
    /// Specific gas constant in J/(kg K).
    ByConstant {
        gamma: f64,
        gas_constant: f64,
    },
    /// Molar mass in kg/mol.
    ByMolarMass {
        gamma: f64,
        molar_mass: f64,
    },
}

/// In kg/s, in m/s, or plain.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Inflow {
    MassFlow(f64),
    Velocity(f64),
    Mach(f64),
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub enum End {
    Closed,
    Open,
    Reservoir,
    Anechoic,
    Choked,
    /// Phase in rad.
    Reflection {
        coefficient: f64,
        phase: f64,
    },
}

#[derive(Clone, Debug, PartialEq)]
pub struct Exit {
    pub end: End,
    pub throat: Option<Size>,
}

/// In m, or in m^2.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Size {
    Diameter(f64),
    Area(f64),
}

#[derive(Clone, Debug, PartialEq)]
pub struct Piece {
    pub name: String,
    pub what: What,
}

#[derive(Clone, Debug, PartialEq)]
pub enum What {
    Duct {
        /// m.
        length: f64,
        size: Size,
        /// Dispersion (s) where entropy is carried.
        carried: Option<f64>,
    },
    /// Effective length (m).
    Contraction(f64),
    /// Effective length (m).
    Expansion(f64),
    Restriction {
        loss: f64,
        /// m.
        effective_length: f64,
        opening: Option<Size>,
    },
    /// m^3.
    Plenum(f64),
    Flame {
        /// K.
        burnt_temperature: Option<f64>,
        burnt_gas: Option<Gas>,
        /// Basis velocity instead of heat release.
        velocity: bool,
        responses: Vec<Response>,
    },
}

#[derive(Clone, Debug, PartialEq)]
pub struct Response {
    pub index: f64,
    /// s.
    pub delay: f64,
    /// s; Gaussian where there is one.
    pub spread: Option<f64>,
    pub reference: Option<String>,
}

impl Rig {
    /// The network of its file.
    pub fn network(&self) -> Network {
        let text = self.to_string();
        match input::parse("random.toml", &text, &[]) {
            Ok(loaded) => loaded.network,
            Err(problems) => panic!("{problems}\n{text}"),
        }
    }
}

impl Display for Rig {
    fn fmt(&self, f: &mut Formatter<'_>) -> fmt::Result {
        writeln!(f, "title = \"{} (invented)\"\n", self.title)?;
        writeln!(f, "[search]\nfrequency = \"0 to 1000 Hz\"")?;
        writeln!(f, "growth = \"-600 to 600 1/s\"\n\n[feed]")?;
        let feed = &self.feed;
        writeln!(f, "gas = {}", feed.gas)?;
        match feed.flow {
            Some(Inflow::MassFlow(m)) => writeln!(f, "mass_flow = \"{m} kg/s\"")?,
            Some(Inflow::Velocity(u)) => writeln!(f, "velocity = \"{u} m/s\"")?,
            Some(Inflow::Mach(m)) => writeln!(f, "mach = {m}")?,
            None => {}
        }
        writeln!(f, "temperature = \"{} K\"", feed.temperature)?;
        if let Some(p) = feed.pressure {
            writeln!(f, "pressure = \"{p} Pa\"")?;
        }
        writeln!(f, "{}", feed.end)?;
        for piece in &self.pieces {
            writeln!(
                f,
                "\n[[element]]\nname = \"{}\"\n{}",
                piece.name, piece.what
            )?;
        }
        writeln!(f, "\n[exit]\n{}", self.exit.end)?;
        if let Some(throat) = self.exit.throat {
            let (key, value, unit) = throat.parts();
            writeln!(f, "throat_{key} = \"{value} {unit}\"")?;
        }
        Ok(())
    }
}

impl Display for Gas {
    fn fmt(&self, f: &mut Formatter<'_>) -> fmt::Result {
        match self {
            Gas::Air => write!(f, "\"air\""),
            Gas::ByConstant {
                gamma,
                gas_constant,
            } => write!(
                f,
                "{{ gamma = {gamma}, gas_constant = \"{gas_constant} J/(kg K)\" }}"
            ),
            Gas::ByMolarMass { gamma, molar_mass } => write!(
                f,
                "{{ gamma = {gamma}, molar_mass = \"{molar_mass} kg/mol\" }}"
            ),
        }
    }
}

impl Display for End {
    fn fmt(&self, f: &mut Formatter<'_>) -> fmt::Result {
        let word = match self {
            End::Closed => "closed",
            End::Open => "open",
            End::Reservoir => "reservoir",
            End::Anechoic => "anechoic",
            End::Choked => "choked",
            End::Reflection { .. } => "reflection",
        };
        write!(f, "end = \"{word}\"")?;
        if let End::Reflection { coefficient, phase } = self {
            // A TOML float has a point.
            write!(
                f,
                "\ncoefficient = {coefficient:?}\nphase = \"{phase} rad\""
            )?;
        }
        Ok(())
    }
}

impl Size {
    /// m^2.
    pub fn area(self) -> f64 {
        match self {
            Size::Diameter(d) => d * d * std::f64::consts::FRAC_PI_4,
            Size::Area(a) => a,
        }
    }

    fn parts(self) -> (&'static str, f64, &'static str) {
        match self {
            Size::Diameter(d) => ("diameter", d, "m"),
            Size::Area(a) => ("area", a, "m^2"),
        }
    }
}

impl Display for Size {
    fn fmt(&self, f: &mut Formatter<'_>) -> fmt::Result {
        let (key, value, unit) = self.parts();
        write!(f, "{key} = \"{value} {unit}\"")
    }
}

impl Display for What {
    fn fmt(&self, f: &mut Formatter<'_>) -> fmt::Result {
        match self {
            What::Duct {
                length,
                size,
                carried,
            } => {
                write!(f, "kind = \"duct\"\nlength = \"{length} m\"\n{size}")?;
                if let Some(d) = carried {
                    write!(f, "\nentropy = \"carried\"\nentropy_dispersion = \"{d} s\"")?;
                }
                Ok(())
            }
            What::Contraction(l) => {
                write!(f, "kind = \"contraction\"\neffective_length = \"{l} m\"")
            }
            What::Expansion(l) => write!(f, "kind = \"expansion\"\neffective_length = \"{l} m\""),
            What::Restriction {
                loss,
                effective_length,
                opening,
            } => {
                write!(f, "kind = \"restriction\"\nloss_coefficient = {loss:?}")?;
                write!(f, "\neffective_length = \"{effective_length} m\"")?;
                opening.map_or(Ok(()), |size| write!(f, "\n{size}"))
            }
            What::Plenum(v) => write!(f, "kind = \"plenum\"\nvolume = \"{v} m^3\""),
            What::Flame {
                burnt_temperature,
                burnt_gas,
                velocity,
                responses,
            } => {
                let basis = if *velocity {
                    "velocity"
                } else {
                    "heat release"
                };
                write!(f, "kind = \"flame\"\nbasis = \"{basis}\"")?;
                if let Some(t) = burnt_temperature {
                    write!(f, "\nburnt_temperature = \"{t} K\"")?;
                }
                if let Some(gas) = burnt_gas {
                    write!(f, "\nburnt_gas = {gas}")?;
                }
                responses
                    .iter()
                    .try_for_each(|r| write!(f, "\n\n  [[element.response]]{r}"))
            }
        }
    }
}

impl Display for Response {
    fn fmt(&self, f: &mut Formatter<'_>) -> fmt::Result {
        let kind = if self.spread.is_some() {
            "gaussian"
        } else {
            "n-tau"
        };
        write!(f, "\n  kind = \"{kind}\"")?;
        write!(f, "\n  interaction_index = {:?}", self.index)?;
        write!(f, "\n  delay = \"{} s\"", self.delay)?;
        if let Some(w) = self.spread {
            write!(f, "\n  spread = \"{w} s\"")?;
        }
        match &self.reference {
            Some(r) => write!(f, "\n  reference = \"{r}\""),
            None => Ok(()),
        }
    }
}
