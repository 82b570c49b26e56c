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

mod common;

use std::time::Instant;

use common::agreement::campaign;
use common::figures;

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
    let tally = campaign(first..first + networks);
    let seconds = begun.elapsed().as_secs_f64();
    println!("{}", tally.told(seconds));
    for (word, n) in &tally.census.seen {
        println!("  {n:6} {word}");
    }
    let faults = [&tally.wrong[..], &tally.unproven[..], &tally.blind[..]]
        .concat()
        .join("\n\n");
    assert!(
        tally.wrong.is_empty(),
        "{} wrong\n{faults}",
        tally.wrong.len()
    );
    assert!(
        tally.blind.is_empty(),
        "{} untold by the witness\n{faults}",
        tally.blind.len()
    );
    if (first, networks) == (0, 2000) {
        figures::count("campaign networks", tally.networks);
        figures::count("campaign modes", tally.modes);
        figures::count("campaign wrong", tally.wrong.len());
        figures::about("campaign not proved", tally.unproven.len());
        figures::about("campaign more than the grid", tally.effort.fallbacks);
        figures::worst("campaign error bound", tally.largest_error);
    }
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
