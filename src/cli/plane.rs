//! The plane of a map as written: `main_flame.delay = 0 ms to 10 ms`, `200x200`.

use super::Failure;
use crate::knobs::{Knob, KnobId};
use crate::network::values::out_of_range;
use crate::network::{Layout, Network};
use crate::problems::{Place, Problem, listed, nearest};
use crate::studies::map::Axis;
use crate::units::{Dimension, parse_span};

/// Fewest and most points along an axis.
const FEWEST: usize = 2;
const MOST: usize = 1000;

/// Columns and rows of a map.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Points {
    pub across: usize,
    pub up: usize,
}

/// `200x200`.
pub(super) fn points(text: &str) -> Result<Points, String> {
    let form = "write columns x rows, as in 200x200";
    let (across, up) = text
        .split_once(['x', 'X', '\u{d7}'])
        .ok_or_else(|| form.to_owned())?;
    let number = |text: &str| -> Result<usize, String> {
        let n: usize = text.trim().parse().map_err(|_| form.to_owned())?;
        if (FEWEST..=MOST).contains(&n) {
            Ok(n)
        } else {
            Err(format!("each axis takes {FEWEST} to {MOST} points"))
        }
    };
    Ok(Points {
        across: number(across)?,
        up: number(up)?,
    })
}

/// Both axes of a plane, or everything that is wrong with them.
pub(super) fn axes(
    network: &Network,
    across: &str,
    up: &str,
    points: Points,
) -> Result<(Axis, Axis), Failure> {
    let written_across = Written {
        flag: "--across",
        text: across,
    };
    let written_up = Written {
        flag: "--up",
        text: up,
    };
    let read = (
        written_across.axis(&network.layout, points.across),
        written_up.axis(&network.layout, points.up),
    );
    let (across, up) = match read {
        (Ok(across), Ok(up)) => (across, up),
        (a, b) => {
            let wrong = [a.err(), b.err()].into_iter().flatten();
            return Err(Failure::usage(wrong.map(|p| *p).collect::<Vec<_>>()));
        }
    };
    if across.knob == up.knob {
        let what = "--across and --up name the same number";
        let problem = Problem::error("--up", what).hint("a map needs two different ones");
        return Err(Failure::usage([
            *written_up.mark(problem, written_up.name())
        ]));
    }
    Ok((across, up))
}

/// A name and a span as written.
#[derive(Clone, Copy)]
pub(super) struct Written<'t> {
    pub flag: &'static str,
    pub text: &'t str,
}

impl<'t> Written<'t> {
    /// What stands before the `=`.
    pub fn name(&self) -> &'t str {
        self.text.split('=').next().unwrap_or_default().trim()
    }

    /// A problem at some part of the text.
    pub fn mark(&self, problem: Problem, part: &str) -> Box<Problem> {
        let before = self.text.find(part).and_then(|at| self.text.get(..at));
        Box::new(problem.at(Place {
            source: self.flag.to_owned(),
            line: 1,
            column: before.unwrap_or_default().chars().count() + 1,
            width: part.chars().count().max(1),
            text: self.text.to_owned(),
        }))
    }

    /// What stands behind the `=`.
    pub fn span(&self) -> Result<&'t str, Box<Problem>> {
        let form = "write NAME = A to B, as in main_flame.delay = 0 ms to 10 ms";
        match self.text.split_once('=') {
            Some((_, span)) => Ok(span.trim()),
            None => {
                let problem = Problem::error(self.flag, "no `=` stands between a name and a span");
                Err(self.mark(problem.hint(form), self.text))
            }
        }
    }

    /// Both ends of the span, which differ.
    pub fn ends(&self, name: &str, dimension: Dimension) -> Result<(f64, f64), Box<Problem>> {
        let span = self.span()?;
        let fail =
            |what: String, hint: String| self.mark(Problem::error(name, what).hint(hint), span);
        let (from, to) = parse_span(span, dimension).map_err(|e| fail(e.to_string(), e.hint()))?;
        if from == to {
            let what = "the span is empty: both its ends are the same";
            let hint = "write two different values, as in 1 to 2";
            return Err(fail(what.to_owned(), hint.to_owned()));
        }
        Ok((from, to))
    }

    /// The knob of a name that stands in the text.
    pub fn knob(&self, layout: &Layout, name: &str) -> Result<KnobId, Box<Problem>> {
        layout.knob(name).ok_or_else(|| {
            let what = format!("the network has no number named `{name}`");
            let problem = Problem::error(self.flag, what).hint(meant(layout, name));
            self.mark(problem, name)
        })
    }

    /// A knob and both ends of its span, each of which it may hold.
    pub fn run(&self, layout: &Layout) -> Result<(KnobId, f64, f64), Box<Problem>> {
        let span = self.span()?;
        let name = self.name();
        let knob = self.knob(layout, name)?;
        let dimension = |k: &Knob| k.spec.dimension;
        let known = layout.knobs.get(knob.0);
        let (from, to) = self.ends(name, known.map_or(Dimension::Number, dimension))?;
        for end in [from, to] {
            if let Some(problem) = known.and_then(|k| out_of_range(name, &k.spec, end)) {
                return Err(self.mark(problem, span));
            }
        }
        Ok((knob, from, to))
    }

    fn axis(&self, layout: &Layout, points: usize) -> Result<Axis, Box<Problem>> {
        let (knob, low, high) = self.run(layout)?;
        self.upwards(low, high)?;
        Ok(Axis {
            knob,
            low,
            high,
            points,
        })
    }

    /// Refuses a span that runs downwards.
    pub fn upwards(&self, from: f64, to: f64) -> Result<(), Box<Problem>> {
        if from < to {
            return Ok(());
        }
        let problem = Problem::error(self.name(), "the span runs downwards")
            .hint("write the lower value first, as in 1 to 2");
        Err(self.mark(problem, self.span()?))
    }
}

/// What a name that is no knob may have meant.
fn meant(layout: &Layout, name: &str) -> String {
    let names = || layout.knobs.iter().map(|k| k.name.as_str());
    if let Some(near) = nearest(name, names()) {
        return format!("did you mean `{near}`?");
    }
    let element = name.split('.').next().unwrap_or_default();
    let of = |element: &str| -> Vec<&str> {
        let start = format!("{element}.");
        names().filter(|n| n.starts_with(&start)).collect()
    };
    let own = of(element);
    if !own.is_empty() {
        return format!("`{element}` has {}", listed(own));
    }
    let elements = layout.elements.iter().map(|e| e.name.as_str());
    match nearest(element, elements) {
        Some(near) if !of(near).is_empty() => {
            format!("did you mean `{near}`? It has {}", listed(of(near)))
        }
        _ => format!("its numbers are {}", listed(names())),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn points_are_columns_and_rows() {
        let wanted = Points {
            across: 200,
            up: 100,
        };
        for text in ["200x100", "200 x 100", "200X100", "200\u{d7}100"] {
            assert_eq!(points(text), Ok(wanted), "{text}");
        }
        for text in [
            "",
            "200",
            "200x",
            "x",
            "1x200",
            "200x1",
            "0x0",
            "1001x200",
            "-5x5",
            "2.5x3",
            "axb",
            "99999999999999999999x2",
        ] {
            assert!(points(text).is_err(), "{text}");
        }
    }
}
