//! The same work here and in vectorised NumPy, in one run on one machine.
//!
//! ```sh
//! cargo bench --bench beside_numpy
//! ```
//!
//! makes a virtual environment in the target folder from `tests/yardstick/requirements.txt`, runs
//! `chains_numpy.py` there on the chains of six and twenty elements and the crate on the networks these
//! were exported from, and writes a table into docs/performance.md. Before it prints a ratio it checks that both
//! find the same modes to `1e-8 |s|`, and as large a part of the map growing.
//!
//! NumPy runs on one core; its map is told twice, searched at each point and followed along the delay.
//! Neither proves anything: its steps along the window's edge are short, not bounded.

mod machine;
mod page;
mod python;
mod rigs;

use std::hint::black_box;
use std::path::PathBuf;
use std::process::Command;
use std::time::Instant;

use machine::{Outcome, file, load, processor};
use num_complex::Complex64;
use page::{time, today, write_between};
use python::{environment, run};
use rigs::{POINTS, Rig};
use serde::Deserialize;
use stillflame::modes::{self, Mode, ModeList, Scan};
use stillflame::numerics::analytic::Analytic;

/// Largest relative distance between modes found here and there.
const AGREE: f64 = 1e-8;

const CHAINS: [(&str, &str); 2] = [("6 elements", "six"), ("20 elements", "twenty")];

/// What `chains_numpy.py` prints.
#[derive(Deserialize)]
struct Numpy {
    numpy: String,
    #[serde(rename = "ns_per_point_D_and_derivative")]
    ns_per_point: f64,
    us_per_mode_list: f64,
    modes: Vec<NumpyMode>,
    s_per_map_followed: f64,
    s_per_map_solved_at_each_point: f64,
    unproven_points_solved_at_each_point: usize,
    growing_fraction: f64,
}

#[derive(Deserialize)]
struct NumpyMode {
    frequency_hz: f64,
    growth_per_s: f64,
}

/// Best of some runs, in seconds.
fn best<T>(runs: usize, mut work: impl FnMut() -> T) -> f64 {
    let once = |_| {
        let began = Instant::now();
        black_box(work());
        began.elapsed().as_secs_f64()
    };
    (0..runs).map(once).fold(f64::INFINITY, f64::min)
}

fn main() -> Outcome<()> {
    // As `cargo test --benches` asks it: there is nothing to test.
    if !std::env::args().any(|a| a == "--bench") {
        return Ok(());
    }
    let python = environment()?;
    let cores = std::thread::available_parallelism()?.get();
    let mut page = format!(
        "Measured {} on {}, {cores} cores, {} before.\n\n| network | work | here | NumPy | NumPy / here |\n\
         | --- | --- | --- | --- | --- |\n",
        today(),
        processor(),
        load()
    );
    let mut version = String::new();
    for (name, chain) in CHAINS {
        let rig = Rig::read(name, &format!("tests/yardstick/chains/{chain}.toml"))?;
        let numpy = numpy(&python, chain)?;
        page += &compare(&rig, &numpy, cores)?;
        version = numpy.numpy;
    }
    page += &format!(
        "\nNumPy {version}, one core. Best of several runs each. At the end {}.\n",
        load()
    );
    println!("{page}");
    write_between("docs/performance.md", "NumPy", &page)
}

fn numpy(python: &PathBuf, chain: &str) -> Outcome<Numpy> {
    let told = run(Command::new(python)
        .arg(file("tests/yardstick/chains_numpy.py"))
        .arg("--chain")
        .arg(file(&format!("tests/yardstick/chains/{chain}.json"))))?;
    Ok(serde_json::from_slice(&told)?)
}

fn compare(rig: &Rig, numpy: &Numpy, cores: usize) -> Outcome<String> {
    let acoustics = &rig.solved.acoustics;
    let find = || modes::find_from(acoustics, rig.window, Scan::UntilCounted, &[]);
    same_modes(rig.name, &find(), &numpy.modes)?;
    let map = rig.map(rig.axes(POINTS));
    let tally = map.tally();
    let growing = |m: Option<Mode>| m.is_some_and(|m| m.growth() > 0.0);
    let part =
        map.points.iter().filter(|p| growing(p.leading())).count() as f64 / map.points.len() as f64;
    if (part - numpy.growing_fraction).abs() > 0.5 / map.points.len() as f64 {
        let there = numpy.growing_fraction;
        return Err(format!("{}: {part} of the map grows, {there} in NumPy", rig.name).into());
    }
    let unproven = tally.points - tally.complete;
    if unproven + numpy.unproven_points_solved_at_each_point > 0 {
        return Err(format!("{}: {unproven} points of the map not certified", rig.name).into());
    }

    let tape = &rig.solved.acoustics.characteristic.tape;
    let points = rig.points(1 << 14);
    let mut found = Vec::with_capacity(points.len());
    let values = best(50, || {
        found.clear();
        tape.values_and_slopes(&points, &mut found);
    });
    let mut rows = row(
        rig.name,
        "`D` and `D'` at a point",
        values / points.len() as f64,
        1e-9 * numpy.ns_per_point,
    );
    rows += &row(
        rig.name,
        "mode list",
        best(200, find),
        1e-6 * numpy.us_per_mode_list,
    );
    for (threads, words) in [
        (1, "1 thread".to_owned()),
        (cores, format!("{cores} threads")),
    ] {
        let pool = rigs::threads(threads);
        let here = best(5, || pool.install(|| rig.map(rig.axes(POINTS))));
        let work = |how| format!("map, {POINTS} x {POINTS}, {words}; {how}");
        let searched = numpy.s_per_map_solved_at_each_point;
        rows += &row(
            rig.name,
            &work("NumPy searching each point"),
            here,
            searched,
        );
        rows += &row(
            rig.name,
            &work("NumPy following"),
            here,
            numpy.s_per_map_followed,
        );
    }
    Ok(rows)
}

/// Both lists hold the same modes.
fn same_modes(name: &str, here: &ModeList, there: &[NumpyMode]) -> Outcome<()> {
    if !here.complete() || here.modes.len() != there.len() {
        let (a, b) = (here.modes.len(), there.len());
        return Err(format!("{name}: {a} modes here, {b} in NumPy").into());
    }
    for (mode, other) in here.modes.iter().zip(there) {
        let s = Complex64::new(
            other.growth_per_s,
            std::f64::consts::TAU * other.frequency_hz,
        );
        if (mode.s - s).norm() > AGREE * s.norm() {
            return Err(format!("{name}: {} here is {s} in NumPy", mode.s).into());
        }
    }
    Ok(())
}

fn row(name: &str, work: &str, here: f64, there: f64) -> String {
    let ratio = there / here;
    format!(
        "| {name} | {work} | {} | {} | {ratio:.2} |\n",
        time(here),
        time(there)
    )
}
