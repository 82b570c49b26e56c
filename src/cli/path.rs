//! The path of a sweep as written: `main_flame.delay = 1 ms to 8 ms`, `*.delay = 0.8 to 1.2`.

use super::Failure;
use super::plane::Written;
use crate::knobs::KnobId;
use crate::network::Network;
use crate::network::values::out_of_range;
use crate::problems::Problem;
use crate::studies::path::{Parameter, Path, Run, Spacing};
use crate::units::Dimension;

/// Fewest and most points of a sweep.
const FEWEST: usize = 2;
const MOST: usize = 10_000;

/// `141`.
pub(super) fn points(text: &str) -> Result<usize, String> {
    let number: Result<usize, _> = text.trim().parse();
    match number {
        Ok(n) if (FEWEST..=MOST).contains(&n) => Ok(n),
        Ok(_) => Err(format!("a sweep takes {FEWEST} to {MOST} points")),
        Err(_) => Err("write a whole number, as in 141".to_owned()),
    }
}

/// What is asked for.
pub(super) struct Wanted<'t> {
    pub vary: &'t [String],
    pub scale: &'t [String],
    pub spacing: Spacing,
    pub points: usize,
}

impl Wanted<'_> {
    /// The path, or everything that is wrong with it.
    pub fn path(&self, network: &Network) -> Result<Path, Failure> {
        let mut knobs: Vec<(KnobId, Run)> = Vec::new();
        let mut wrong: Vec<Problem> = Vec::new();
        let mut first: Option<(Parameter, Run)> = None;
        let varied = self.vary.iter().map(|text| {
            let written = Written {
                flag: "--vary",
                text,
            };
            (written, self.varied(network, written))
        });
        let scaled = self.scale.iter().map(|text| {
            let written = Written {
                flag: "--scale",
                text,
            };
            (written, self.scaled(network, written))
        });
        for (written, read) in varied.chain(scaled) {
            match read.and_then(|read| self.fit(written, read, first.is_none())) {
                Ok((parameter, run, more)) => {
                    first.get_or_insert((parameter, run));
                    for (knob, run) in more {
                        if knobs.iter().any(|(k, _)| *k == knob) {
                            wrong.push(*twice(network, written, knob));
                        } else {
                            knobs.push((knob, run));
                        }
                    }
                }
                Err(problem) => wrong.push(*problem),
            }
        }
        if !wrong.is_empty() {
            return Err(Failure::usage(wrong));
        }
        let Some((parameter, values)) = first else {
            let problem = Problem::error("--vary", "nothing is said to vary")
                .hint("write --vary \"main_flame.delay = 1 ms to 8 ms\", or --scale \"*.delay = 0.8 to 1.2\"");
            return Err(Failure::usage([problem]));
        };
        Ok(Path {
            parameter,
            values,
            knobs,
            spacing: self.spacing,
            points: self.points,
        })
    }

    fn varied(&self, network: &Network, written: Written<'_>) -> Result<Read, Box<Problem>> {
        let (knob, from, to) = written.run(&network.layout)?;
        let run = Run { from, to };
        Ok((Parameter::Knob(knob), run, vec![(knob, run)]))
    }

    fn scaled(&self, network: &Network, written: Written<'_>) -> Result<Read, Box<Problem>> {
        written.span()?;
        let (from, to) = written.ends(written.name(), Dimension::Number)?;
        let mut knobs = Vec::new();
        for name in written.name().split(',').map(str::trim) {
            for knob in named(network, written, name)? {
                if knobs.iter().any(|(k, _)| *k == knob) {
                    return Err(twice(network, written, knob));
                }
                let value = network.values[knob];
                let run = Run {
                    from: value * from,
                    to: value * to,
                };
                let spec = network.layout.knobs.get(knob.0);
                for end in [run.from, run.to] {
                    let beyond = spec.and_then(|k| out_of_range(&k.name, &k.spec, end));
                    if let Some(problem) = beyond {
                        return Err(written.mark(problem, name));
                    }
                }
                // A factor leaves zero where it is.
                if value != 0.0 {
                    knobs.push((knob, run));
                }
            }
        }
        if knobs.is_empty() {
            let problem = Problem::error(written.flag, "a factor leaves zero where it is")
                .hint("vary it instead, from one value to another");
            return Err(written.mark(problem, written.name()));
        }
        Ok((Parameter::Factor, Run { from, to }, knobs))
    }

    /// Whether what is read can be gone along: the first upwards, ratios only where there are any.
    fn fit(&self, written: Written<'_>, read: Read, first: bool) -> Result<Read, Box<Problem>> {
        let Run { from, to } = read.1;
        if first {
            written.upwards(from, to)?;
        }
        let positive = from > 0.0 && to > 0.0;
        if self.spacing == Spacing::Geometric && !positive {
            let what = "with --log both ends must be greater than zero";
            let problem =
                Problem::error(written.name(), what).hint("leave out --log, or start above zero");
            return Err(written.mark(problem, written.span()?));
        }
        Ok(read)
    }
}

/// What one option says: its parameter, its values, and the knobs it moves.
type Read = (Parameter, Run, Vec<(KnobId, Run)>);

fn twice(network: &Network, written: Written<'_>, knob: KnobId) -> Box<Problem> {
    let name = network.layout.knobs.get(knob.0).map_or("", |k| &k.name);
    let problem = Problem::error(written.flag, format!("`{name}` is said to move twice"))
        .hint("name each number once");
    written.mark(problem, written.name())
}

/// The knobs of a name in which `*` stands for anything.
fn named(network: &Network, written: Written<'_>, name: &str) -> Result<Vec<KnobId>, Box<Problem>> {
    if name.is_empty() {
        let problem = Problem::error(written.flag, "a name is missing before the `=`").hint(
            "write NAMES = A to B, as in *.delay = 0.8 to 1.2, and one comma between two names",
        );
        return Err(written.mark(problem, written.text));
    }
    if !name.contains('*') {
        return Ok(vec![written.knob(&network.layout, name)?]);
    }
    let knobs = network.layout.knobs.iter().enumerate();
    let found: Vec<KnobId> = knobs
        .filter(|(_, k)| fits(name, &k.name))
        .map(|(i, _)| KnobId(i))
        .collect();
    if found.is_empty() {
        let what = format!("no number of the network has a name like `{name}`");
        let problem = Problem::error(written.flag, what)
            .hint("`*` stands for anything, as in *.delay or main_flame.*.delay");
        return Err(written.mark(problem, name));
    }
    Ok(found)
}

/// Whether a name fits a pattern in which `*` stands for anything.
fn fits(pattern: &str, name: &str) -> bool {
    match pattern.split_once('*') {
        None => pattern == name,
        Some((start, rest)) => name.strip_prefix(start).is_some_and(|name| {
            let tails = name.char_indices().map(|(i, _)| i).chain([name.len()]);
            tails
                .filter_map(|i| name.get(i..))
                .any(|tail| fits(rest, tail))
        }),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_star_stands_for_anything() {
        for (pattern, name, wanted) in [
            ("*.delay", "main_flame.delay", true),
            ("*.delay", "main_flame.response.2.delay", true),
            ("main_flame.*.delay", "main_flame.response.2.delay", true),
            ("main_flame.*.delay", "main_flame.delay", false),
            ("*", "exit.phase", true),
            ("a*b*c", "abc", true),
            ("a*b*c", "acb", false),
            ("*.delay", "delay", false),
            ("feed.*", "feed.pressure", true),
        ] {
            assert_eq!(fits(pattern, name), wanted, "{pattern} {name}");
        }
    }

    #[test]
    fn points_are_a_whole_number() {
        assert_eq!(points(" 141 "), Ok(141));
        for text in ["", "1", "0", "-3", "2.5", "10001", "141x2"] {
            assert!(points(text).is_err(), "{text}");
        }
    }
}
