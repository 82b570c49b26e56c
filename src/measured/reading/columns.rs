//! From channels as a file names them to signals in SI: names, units, calibrations.

use super::open::Asked;
use super::samples::shown;
use super::unit::{self, Calibration, EXAMPLES, Label, Per, Scale};
use super::{Signal, unit::label};
use crate::measured::Quantity;
use crate::problems::{Place, Problem, nearest};

/// What one in the file stands for.
#[derive(Clone, Debug)]
pub(super) enum Stated {
    /// A unit as written, perhaps none that is known.
    Unit(String),
    /// Nothing is said.
    Nothing,
    /// The full scale of a converter.
    FullScale,
}

/// A channel as its file tells it.
#[derive(Clone, Debug)]
pub(super) struct Raw {
    pub name: String,
    pub stated: Stated,
    pub place: Option<Place>,
    /// Whether it is to be left out without a word.
    pub skipped: bool,
}

impl Raw {
    pub fn new(label: Label, place: Option<Place>) -> Raw {
        Raw {
            skipped: label.name == "-",
            name: label.name,
            stated: label.unit.map_or(Stated::Nothing, Stated::Unit),
            place,
        }
    }
}

/// Names of the command line laid over those of the file, which has so many channels.
///
/// # Errors
/// Where there are not as many.
pub(super) fn renamed(names: &str, count: usize) -> Result<Vec<Label>, Problem> {
    let labels: Vec<Label> = names.split(',').map(label).collect();
    if labels.len() != count {
        let what = format!("names {} where the file has {count} in a row", labels.len());
        return Err(Problem::error("--names", what)
            .hint("name every one in order, parted by commas; `-` leaves one out"));
    }
    Ok(labels)
}

/// The channels that are read, each with its number in the file.
pub(super) fn resolve(
    raws: Vec<Raw>,
    asked: &Asked,
    file: &str,
    problems: &mut Vec<Problem>,
) -> Vec<(usize, Signal)> {
    for c in &asked.calibrations {
        let known = || raws.iter().filter(|r| !r.skipped).map(|r| r.name.as_str());
        if !known().any(|n| n == c.name) {
            let problem = Problem::error(
                "--calibration",
                format!("no channel is named `{}`", shown(&c.name)),
            );
            problems.push(match nearest(&c.name, known()) {
                Some(meant) => problem.hint(format!("did you mean `{meant}`?")),
                None => problem.hint(format!(
                    "the channels are {}",
                    known().collect::<Vec<_>>().join(", ")
                )),
            });
        }
    }
    let mut found: Vec<(usize, Signal)> = Vec::new();
    for (i, raw) in raws.into_iter().enumerate().filter(|(_, r)| !r.skipped) {
        let at = |p: Problem| match raw.place.clone() {
            Some(place) => p.at(place),
            None => p,
        };
        if raw.name.is_empty() {
            let p = Problem::error(file, format!("channel {} has no name", i + 1));
            problems.push(at(p.hint("name the channels with --names")));
            continue;
        }
        if found.iter().any(|(_, s)| s.name == raw.name) {
            let p = Problem::error(raw.name.as_str(), "two channels have this name");
            problems.push(at(p.hint("name the channels with --names")));
            continue;
        }
        let mut calibrations = asked.calibrations.iter().filter(|c| c.name == raw.name);
        let calibration = calibrations.next();
        if calibrations.next().is_some() {
            let p = Problem::error(
                "--calibration",
                format!("`{}` is calibrated twice", raw.name),
            );
            problems.push(p.hint("keep one"));
        }
        match signal(&raw, calibration, asked.full_scale) {
            Ok(signal) => found.push((i, signal)),
            Err(problem) => problems.push(at(problem)),
        }
    }
    if found.is_empty() && problems.is_empty() {
        problems.push(Problem::error(
            file,
            "there is no channel in it but its time",
        ));
    }
    found
}

fn signal(
    raw: &Raw,
    calibration: Option<&Calibration>,
    full_scale: Option<f64>,
) -> Result<Signal, Problem> {
    let name = &raw.name;
    let fail = |what: String| Problem::error(name.as_str(), what);
    let of = |scale: Scale, written: &str| Signal {
        name: name.clone(),
        quantity: scale.quantity,
        factor: scale.factor,
        written_in: written.to_owned(),
    };
    let volts = |factor: f64| Scale {
        quantity: Quantity::Voltage,
        factor,
    };
    match (&raw.stated, calibration) {
        (Stated::FullScale, Some(c)) => match (c.per, full_scale) {
            (Per::One, _) => Ok(of(c.scale, "full scale")),
            (Per::Volt, Some(v)) => {
                Ok(of(Scale { factor: c.scale.factor * v, ..c.scale }, "full scale"))
            }
            (Per::Volt, None) => Err(fail(
                "is calibrated per volt, and how many volts full scale means is not said".to_owned(),
            )
            .hint("say it, as in --full-scale \"10 V\"")),
        },
        (Stated::FullScale, None) => match full_scale {
            Some(v) => Ok(of(volts(v), "full scale")),
            None => Err(fail("a WAV file holds parts of full scale, without a unit".to_owned())
                .hint(format!(
                    "say what full scale means, as in --calibration \"{name} = 200 Pa\", or per volt with --full-scale"
                ))),
        },
        (Stated::Nothing, Some(c)) => Ok(of(c.scale, match c.per {
            Per::Volt => "V",
            Per::One => "1",
        })),
        (Stated::Nothing, None) => Err(fail("has no unit".to_owned()).hint(format!(
            "write it behind the name, as in \"{name} [Pa]\", in the file or with --names; it may be {EXAMPLES}"
        ))),
        (Stated::Unit(unit), None) => match unit::scale(unit) {
            Some(scale) => Ok(of(scale, unit)),
            None => Err(fail(format!("`{}` is no unit of a channel", shown(unit)))
                .hint(format!("it may be {EXAMPLES}, or state a calibration"))),
        },
        (Stated::Unit(unit), Some(c)) => {
            match (unit::scale(unit).map(|s| (s.quantity, s.factor)), c.per) {
                (Some((Quantity::Voltage, v)), Per::Volt) => {
                    Ok(of(Scale { factor: c.scale.factor * v, ..c.scale }, unit))
                }
                (None | Some((Quantity::Number | Quantity::Light, _)), Per::One) => Ok(of(c.scale, unit)),
                _ => Err(fail(format!(
                    "the file gives it in {}, which the calibration does not take",
                    shown(unit)
                ))
                .hint("a calibration per volt takes volts, one without takes plain numbers")),
            }
        }
    }
}
