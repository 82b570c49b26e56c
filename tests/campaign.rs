//! Thousands of random networks, each list held against an independent count.
//!
//! For every network the modes between 0 and 1000 Hz, -600 and 600 1/s are listed, and then
//!
//! - the zeros of the determinant of the global matrix in the same window are counted by walking round
//!   it in small steps (`common/witness.rs`), and must be as many as the list weighs;
//! - in a circle of radius `1e-6 |s|` about every mode of the list the linear part of that determinant
//!   must outweigh the rest, so that there is one zero, and this must lie within `1e-9 |s|` of the mode
//!   beside its error bound and the rounding of the determinant.
//!
//! A list that calls itself complete and fails this is wrong; there may be none. A list that does not
//! call itself complete is unproven; there may be two in two thousand.
//!
//! `STILLFLAME_NETWORKS=20000 cargo test --release --test campaign -- --nocapture` tries more networks,
//! `STILLFLAME_FIRST=5000` other ones: network `k` is the one of seed `k`. Figures go to standard output.

#[path = "common/census.rs"]
mod census;
mod common;
#[path = "common/witness.rs"]
mod witness;

use std::time::Instant;

use rayon::prelude::*;
use stillflame::modes::{self, ModeList, Scan, Window};
use stillflame::numerics::count::Effort;

use census::Census;
use common::random::{Drawn, Wish, draw};
use witness::{Walk, longest_delay};

/// Part of the reciprocal of the longest delay the witness steps.
const STEP: f64 = 0.5;

const WINDOW: Window = Window {
    frequency: (0.0, 1000.0),
    growth: (-600.0, 600.0),
};

#[derive(Default)]
struct Tally {
    networks: usize,
    redrawn: usize,
    modes: usize,
    double: usize,
    wrong: Vec<String>,
    unproven: Vec<String>,
    effort: Effort,
    looks: usize,
    looked_again: usize,
    /// What rounding left open in the witness, over `|s|`.
    blur: f64,
    largest_error: f64,
    census: Census,
}

fn number(variable: &str, otherwise: u64) -> u64 {
    match std::env::var(variable) {
        Ok(text) => text.parse().expect("a number"),
        Err(_) => otherwise,
    }
}

#[test]
fn every_list_agrees_with_the_determinant_of_the_global_matrix() {
    let networks = number("STILLFLAME_NETWORKS", 2000);
    let first = number("STILLFLAME_FIRST", 0);
    let begun = Instant::now();
    let wish = Wish::default();
    let tally = (first..first + networks)
        .into_par_iter()
        .map(|seed| try_one(&draw(seed, &wish)))
        .reduce(Tally::default, Tally::and);
    let seconds = begun.elapsed().as_secs_f64();
    println!("{}", tally.told(seconds));
    for (word, n) in &tally.census.seen {
        println!("  {n:6} {word}");
    }
    let faults = [&tally.wrong[..], &tally.unproven[..]]
        .concat()
        .join("\n\n");
    assert!(
        tally.wrong.is_empty(),
        "{} wrong\n{faults}",
        tally.wrong.len()
    );
    let allowed = (2 * networks as usize).div_ceil(2000);
    assert!(
        tally.unproven.len() <= allowed,
        "{} unproven\n{faults}",
        tally.unproven.len()
    );
    let lacking = tally.census.lacks();
    assert!(
        networks < 2000 || lacking.is_empty(),
        "never drawn: {lacking:?}"
    );
}

fn try_one(drawn: &Drawn) -> Tally {
    let list = modes::find(&drawn.solved, WINDOW, Scan::Whole);
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
        ..Tally::default()
    };
    tally.census.take(drawn);
    let told = |what: String| format!("seed {}: {what}\n{}", drawn.seed, drawn.rig);
    let relative = |m: &modes::Mode| m.error_bound / m.s.norm().max(1.0);
    tally.largest_error = list.modes.iter().map(relative).fold(0.0, f64::max);
    let mut fault = disagreement(&list, &mut walk, &mut tally.blur);
    if fault.is_some() {
        // Two zeros beside one step may hide from it.
        walk.step /= 8.0;
        fault = disagreement(&list, &mut walk, &mut tally.blur);
        tally.looked_again = 1;
    }
    if list.complete() {
        tally.wrong.extend(fault.map(told));
    } else {
        let and = fault.map_or_else(String::new, |d| format!("; {d}"));
        tally.unproven.push(told(format!("{:?}{and}", list.doubts)));
    }
    tally.looks = walk.looks;
    tally
}

/// What the witness holds against a list.
fn disagreement(list: &ModeList, walk: &mut Walk<'_>, blur: &mut f64) -> Option<String> {
    let mirrored = walk.chain.start.term.is_none() && walk.chain.end.term.is_none();
    let (_, top) = WINDOW.rectangle().omega;
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
    let counted = walk.count(WINDOW.growth, omega, mirrored);
    if counted != Some(weight) {
        return Some(format!(
            "the list weighs {weight}, counted {counted:?}\n{:#?}",
            list.modes
        ));
    }
    for m in &list.modes {
        let size = m.s.norm().max(1.0);
        let Some((off, open)) = walk.off_by(m.s, 1e-6 * size) else {
            return Some(format!("not one zero within 1e-6 |s| of {m:?}"));
        };
        *blur = blur.max(open / size);
        if m.multiplicity != 1
            || open > 1e-7 * size
            || off > 1e-9 * size + m.error_bound + 4.0 * open
        {
            return Some(format!(
                "{off:e} from the zero, known to {open:e}, is {m:?}"
            ));
        }
    }
    None
}

impl Tally {
    fn and(mut self, other: Tally) -> Tally {
        self.networks += other.networks;
        self.redrawn += other.redrawn;
        self.modes += other.modes;
        self.double += other.double;
        self.wrong.extend(other.wrong);
        self.unproven.extend(other.unproven);
        let (e, o) = (&mut self.effort, other.effort);
        e.evaluations += o.evaluations;
        e.bounds += o.bounds;
        e.refinements += o.refinements;
        e.retries += o.retries;
        e.fallbacks += o.fallbacks;
        self.looks += other.looks;
        self.looked_again += other.looked_again;
        self.blur = self.blur.max(other.blur);
        self.largest_error = self.largest_error.max(other.largest_error);
        for (word, n) in other.census.seen {
            *self.census.seen.entry(word).or_default() += n;
        }
        self
    }

    fn told(&self, seconds: f64) -> String {
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
