//! What is found in synthetic records of the rigs over many seeds, and whether noise and cycle are told apart.
//!
//! ```sh
//! cargo bench --bench records          # 100 seeds of each rig; writes its figures into docs/validation.md
//! cargo bench --bench records -- 20    # fewer; prints them only
//! ```
//!
//! A slice of it is among the tests (`tests/signals/peaks.rs`, `nature.rs`).

mod machine;
mod page;

#[path = "../signals/heard.rs"]
mod heard;
#[path = "../../examples/synthetic_record/play.rs"]
#[allow(dead_code, reason = "the example has more of it in use")]
mod play;
#[path = "../signals/rigs.rs"]
mod rigs;

use std::time::Instant;

use machine::{Outcome, load, processor};
use page::{time, today, write_between};
use rayon::prelude::*;

/// Seeds of the whole campaign.
const WHOLE: u64 = 100;

/// Short records (s), in which only noise and cycle are told apart.
const SHORT: f64 = 6.0;

fn main() -> Outcome<()> {
    // As `cargo test --benches` asks it: there is nothing to test.
    if !std::env::args().any(|a| a == "--bench") {
        return Ok(());
    }
    let mut numbers = std::env::args()
        .skip(1)
        .filter_map(|a| a.parse::<u64>().ok());
    let asked = numbers.next();
    let seeds = asked.unwrap_or(WHOLE).max(1);
    let began = Instant::now();
    let mut text = String::from(
        "| rig | frequency, Hz | growth rate, 1/s | bound of it | apart, widths | found | frequency | decay rate | interval over bound |\n\
         | --- | --- | --- | --- | --- | --- | --- | --- | --- |\n",
    );
    let (mut modes, mut reached, mut wrong) = (0, 0, Vec::new());
    for name in rigs::NAMES {
        let rig = rigs::rig(name);
        let heard = heard::minutes(&rig, 0..seeds);
        for h in &heard {
            wrong.extend(heard::misjudged(&rig, heard::SECONDS, h));
        }
        let short: Vec<String> = (0..seeds)
            .into_par_iter()
            .flat_map(|seed| {
                let h = heard::hear(&rig, SHORT, 5000 + seed, false);
                heard::misjudged(&rig, SHORT, &h)
            })
            .collect();
        wrong.extend(short);
        for f in heard::fared(&rig, &heard) {
            modes += 1;
            reached += usize::from(f.reached());
            text += &format!(
                "| `{name}` | {:.2} | {:.2} | {:.1} % | {:.2} | {} | {} | {} | {:.2}{} |\n",
                f.bound.frequency,
                -f.bound.decay,
                100.0 * f.bound.decay_deviation / f.bound.decay,
                f.bound.separation,
                f.seen,
                f.near,
                f.held,
                f.width,
                if f.reached() { "" } else { " (short)" }
            );
        }
        eprintln!("{name}: {:.0} s", began.elapsed().as_secs_f64());
    }
    text += &format!(
        "\n{seeds} seeds; {reached} of {modes} modes reach the target. Noise and cycle not told apart: {} of {} records. Measured {} in {} on {}, {}.\n",
        wrong.len(),
        2 * seeds as usize * rigs::NAMES.len(),
        today(),
        time(began.elapsed().as_secs_f64()),
        processor(),
        load()
    );
    println!("{text}{}", wrong.join("\n"));
    if asked.is_none() {
        write_between("docs/validation.md", "records", &text)?;
    }
    Ok(())
}
