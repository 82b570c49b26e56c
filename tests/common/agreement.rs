//! A list held against the zeros of the determinant of the global matrix, and figures of many.

use rayon::prelude::*;
use stillflame::modes::{self, ModeList, Scan, Window};
use stillflame::numerics::count::Effort;

use super::census::Census;
use super::random::{Drawn, Wish, draw};
use super::witness::{Walk, longest_delay};

/// Part of the reciprocal of the longest delay the witness steps.
const STEP: f64 = 0.5;

/// Where the campaign looks.
pub const WINDOW: Window = Window {
    frequency: (0.0, 1000.0),
    growth: (-600.0, 600.0),
};

#[derive(Default)]
pub struct Tally {
    pub networks: usize,
    pub redrawn: usize,
    pub modes: usize,
    pub double: usize,
    pub wrong: Vec<String>,
    pub unproven: Vec<String>,
    /// Networks of which the witness could tell nothing.
    pub blind: Vec<String>,
    pub effort: Effort,
    /// Networks that needed more than Newton from the grid.
    pub fell_back: usize,
    pub looks: usize,
    pub looked_again: usize,
    /// What rounding left open in the witness, over `|s|`.
    pub blur: f64,
    pub largest_error: f64,
    pub census: Census,
}

/// The networks of these seeds, each tried.
pub fn campaign(seeds: std::ops::Range<u64>) -> Tally {
    let wish = Wish::default();
    seeds
        .into_par_iter()
        .map(|seed| try_one(&draw(seed, &wish), WINDOW).1)
        .reduce(Tally::default, Tally::and)
}

/// The list of one network in a window, and what the witness says of it.
pub fn try_one(drawn: &Drawn, window: Window) -> (ModeList, Tally) {
    let list = modes::find(&drawn.solved, window, Scan::Whole);
    let mut walk = Walk {
        chain: &drawn.solved.acoustics.chain,
        step: STEP / longest_delay(&drawn.solved.acoustics.chain),
        looks: 0,
    };
    let mut tally = Tally {
        networks: 1,
        redrawn: drawn.redrawn,
        modes: list.modes.len(),
        double: list.modes.iter().filter(|m| m.multiplicity > 1).count(),
        effort: list.effort,
        fell_back: usize::from(list.effort.fallbacks > 0),
        ..Tally::default()
    };
    tally.census.take(drawn);
    let told = |what: String| format!("seed {}: {what}\n{}", drawn.seed, drawn.rig);
    let relative = |m: &modes::Mode| m.error_bound / m.s.norm().max(1.0);
    tally.largest_error = list.modes.iter().map(relative).fold(0.0, f64::max);
    let mut fault = disagreement(&list, &mut walk, &mut tally.blur);
    if !matches!(fault, Ok(None)) {
        // Two zeros beside one step may hide from it.
        walk.step /= 8.0;
        fault = disagreement(&list, &mut walk, &mut tally.blur);
        tally.looked_again = 1;
    }
    let fault = match fault {
        Ok(fault) => fault,
        Err(Blind) => {
            tally
                .blind
                .push(told("the witness tells nothing".to_owned()));
            None
        }
    };
    if list.complete() {
        tally.wrong.extend(fault.map(told));
    } else {
        let and = fault.map_or_else(String::new, |d| format!("; {d}"));
        tally.unproven.push(told(format!("{:?}{and}", list.doubts)));
    }
    tally.looks = walk.looks;
    (list, tally)
}

/// The determinant is lost in rounding, or overflows.
struct Blind;

/// What the witness holds against a list.
fn disagreement(
    list: &ModeList,
    walk: &mut Walk<'_>,
    blur: &mut f64,
) -> Result<Option<String>, Blind> {
    let mirrored = walk.chain.start.term.is_none() && walk.chain.end.term.is_none();
    let window = list.window;
    let (_, top) = window.rectangle().omega;
    // Without a mirror image the axis is an edge, and a mode on it is in the list.
    let omega = (if mirrored { 0.0 } else { -1e-6 }, top);
    let weight: i64 = list
        .modes
        .iter()
        .map(|m| {
            let on_axis = m.s.im
                <= if m.multiplicity > 1 {
                    m.error_bound
                } else {
                    0.0
                };
            i64::from(m.multiplicity) * if mirrored && !on_axis { 2 } else { 1 }
        })
        .sum();
    let counted = walk.count(window.growth, omega, mirrored).ok_or(Blind)?;
    if counted != weight {
        return Ok(Some(format!(
            "the list weighs {weight}, counted {counted}\n{:#?}",
            list.modes
        )));
    }
    for m in &list.modes {
        let size = m.s.norm().max(1.0);
        // Where rounding of the coefficients blurs a mode it blurs the determinant as well.
        let radius = 1e-6 * size + 100.0 * m.error_bound;
        let Some((off, open)) = walk.off_by(m.s, radius) else {
            return Ok(Some(format!("not one zero within {radius:e} of {m:?}")));
        };
        *blur = blur.max(open / size);
        if m.multiplicity != 1
            || open > 1e-7 * size + m.error_bound
            || off > 1e-9 * size + m.error_bound + 4.0 * open
        {
            return Ok(Some(format!(
                "{off:e} from the zero, known to {open:e}, is {m:?}"
            )));
        }
    }
    Ok(None)
}

impl Tally {
    /// Both together.
    pub fn and(mut self, other: Tally) -> Tally {
        self.networks += other.networks;
        self.redrawn += other.redrawn;
        self.modes += other.modes;
        self.double += other.double;
        self.wrong.extend(other.wrong);
        self.unproven.extend(other.unproven);
        self.blind.extend(other.blind);
        let (e, o) = (&mut self.effort, other.effort);
        e.evaluations += o.evaluations;
        e.bounds += o.bounds;
        e.refinements += o.refinements;
        e.retries += o.retries;
        e.fallbacks += o.fallbacks;
        self.fell_back += other.fell_back;
        self.looks += other.looks;
        self.looked_again += other.looked_again;
        self.blur = self.blur.max(other.blur);
        self.largest_error = self.largest_error.max(other.largest_error);
        for (word, n) in other.census.seen {
            *self.census.seen.entry(word).or_default() += n;
        }
        self
    }

    /// In one line.
    pub fn told(&self, seconds: f64) -> String {
        let e = self.effort;
        format!(
            "{} networks ({} redrawn), {} modes ({} double), {} wrong, {} unproven, {} fallbacks, {} pads \
             tried again; {} evaluations, {} determinants of the witness, which looked again at {} and is blurred by {:.1e} |s| at most; largest error bound {:.1e} |s|; \
             {seconds:.1} s",
            self.networks,
            self.redrawn,
            self.modes,
            self.double,
            self.wrong.len(),
            self.unproven.len(),
            e.fallbacks,
            e.retries,
            e.evaluations,
            self.looks,
            self.looked_again,
            self.blur,
            self.largest_error,
        )
    }
}
