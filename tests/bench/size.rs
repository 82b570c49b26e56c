//! What answers cost against the number of elements, of modes and of points, and the memory of a large map.
//!
//! ```sh
//! cargo bench --bench size       # writes its tables into docs/performance.md
//! ```

mod machine;
mod page;
mod rigs;

use std::hint::black_box;
use std::time::Instant;

use machine::{Outcome, load, processor};
use page::{time, today, write_between};
use rigs::{POINTS, Rig};
use stillflame::modes::{self, Scan, Window};
use stillflame::numerics::analytic::Analytic;
use stillflame::numerics::count::Walker;
use stillflame::{acoustics, input};

/// Median of some runs, in seconds.
fn median<T>(runs: usize, mut work: impl FnMut() -> T) -> f64 {
    let once = |_| {
        let began = Instant::now();
        black_box(work());
        began.elapsed().as_secs_f64()
    };
    let mut times: Vec<f64> = (0..runs).map(once).collect();
    times.sort_by(f64::total_cmp);
    times[runs / 2]
}

const FLAME: &str = r#"
[[element]]
name = "main_flame"
kind = "flame"
burnt_temperature = "1800 K"
response = { kind = "n-tau", interaction_index = 1.0, delay = "3 ms" }
"#;

/// A chain of `elements`: ducts between area changes, a flame in the middle.
fn chain(elements: usize) -> String {
    let mut text = r#"
title = "Ducts and area changes (invented)"
search = { frequency = "0 to 1000 Hz", growth = "-600 to 600 1/s" }
feed = { gas = { gamma = 1.4, gas_constant = "287 J/(kg K)" }, velocity = "0 m/s", temperature = "300 K", pressure = "101325 Pa", end = "reflection", coefficient = 0.9 }
exit = { end = "reflection", coefficient = -0.95 }
"#
    .to_owned();
    // 2 m of ducts in all, wide and narrow in turn.
    let length = 4.0 / elements as f64;
    let mut wide = true;
    for i in 0..elements {
        text += &if i % 2 == 0 {
            let diameter = if wide { 100 } else { 60 };
            format!(
                "[[element]]\nname = \"duct_{i}\"\nkind = \"duct\"\nlength = \"{length} m\"\ndiameter = \"{diameter} mm\"\n"
            )
        } else if i == (elements / 2) | 1 {
            FLAME.to_owned()
        } else {
            wide = !wide;
            let kind = if wide { "expansion" } else { "contraction" };
            format!("[[element]]\nname = \"step_{i}\"\nkind = \"{kind}\"\n")
        };
    }
    text
}

fn rig(elements: usize) -> Outcome<Rig> {
    let network = input::parse("chain.toml", &chain(elements), &[])?.network;
    let solved = modes::solve(&network)?;
    let window = Window::of(&network, &solved.mean)?;
    Ok(Rig {
        name: "chain",
        network,
        solved,
        window,
    })
}

fn elements() -> Outcome<String> {
    let mut text = "| elements | modes | `D` and `D'` in lanes | certified count | certified list | assembly |\n\
                    | --- | --- | --- | --- | --- | --- |\n"
        .to_owned();
    for number in [5, 9, 17, 33, 65] {
        let rig = rig(number)?;
        let tape = &rig.solved.acoustics.characteristic.tape;
        let points = rig.points(1024);
        let mut found = Vec::with_capacity(points.len());
        let value = median(500, || {
            found.clear();
            tape.values_and_slopes(&points, &mut found);
        }) / points.len() as f64;
        let r = rig.window.rectangle();
        let count = median(500, || {
            Walker::new(tape).symmetric(r.growth, r.omega.1).ok()
        });
        let list = || modes::find_from(&rig.solved.acoustics, rig.window, Scan::UntilCounted, &[]);
        let assembly = median(500, || acoustics::assemble(&rig.network, &rig.solved.mean));
        text += &format!(
            "| {number} | {} | {} | {} | {} | {} |\n",
            list().modes.len(),
            time(value),
            time(count),
            time(median(500, list)),
            time(assembly)
        );
    }
    Ok(text)
}

fn windows() -> Outcome<String> {
    let mut text = "| frequencies of nine elements | modes | certified count | certified list |\n\
                    | --- | --- | --- | --- |\n"
        .to_owned();
    let rig = rig(9)?;
    let tape = &rig.solved.acoustics.characteristic.tape;
    for top in [500.0, 1000.0, 2000.0, 4000.0, 8000.0] {
        let window = Window {
            frequency: (0.0, top),
            ..rig.window
        };
        let r = window.rectangle();
        let count = median(500, || {
            Walker::new(tape).symmetric(r.growth, r.omega.1).ok()
        });
        let list = || modes::find_from(&rig.solved.acoustics, window, Scan::UntilCounted, &[]);
        text += &format!(
            "| to {top} Hz | {} | {} | {} |\n",
            list().modes.len(),
            time(count),
            time(median(200, list))
        );
    }
    Ok(text)
}

/// Most memory this process has held (MB).
fn most_memory() -> Outcome<f64> {
    let told = std::fs::read_to_string("/proc/self/status")?;
    let line = told.lines().find_map(|l| l.strip_prefix("VmHWM:"));
    let kilobytes = line.and_then(|l| l.trim().strip_suffix("kB"));
    let kilobytes: f64 = kilobytes.ok_or("no VmHWM")?.trim().parse()?;
    Ok(kilobytes / 1024.0)
}

fn maps() -> Outcome<String> {
    let rig = Rig::read("6 elements", "tests/yardstick/chains/six.toml")?;
    let mut text = format!(
        "| points of a map, {}, two threads | time | a point | most memory of the process |\n| --- | --- | --- | --- |\n",
        rig.name
    );
    let two = rigs::threads(2);
    for points in [POINTS / 4, POINTS / 2, POINTS, 2 * POINTS, 5 * POINTS] {
        let runs = if points < 400 { 3 } else { 1 };
        let took = median(runs, || two.install(|| rig.map(rig.axes(points)).tally()));
        text += &format!(
            "| {points} x {points} | {} | {} | {:.0} MB |\n",
            time(took),
            time(took / (points * points) as f64),
            most_memory()?
        );
    }
    Ok(text)
}

fn main() -> Outcome<()> {
    // As `cargo test --benches` asks it: there is nothing to test.
    if !std::env::args().any(|a| a == "--bench") {
        return Ok(());
    }
    let before = load();
    let tables = [elements()?, windows()?, maps()?].join("\n");
    let text = format!(
        "Medians, measured {} on {}, {before} before, {} at the end.\n\n{tables}",
        today(),
        processor(),
        load()
    );
    println!("{text}");
    write_between("docs/performance.md", "size", &text)
}
