//! The long campaign: random networks in large numbers, each list held against four other ways to its
//! modes.
//!
//! ```sh
//! cargo bench --bench campaign              # 50,000 networks; writes its figures into docs/validation.md
//! cargo bench --bench campaign -- 2000      # a slice; prints them only
//! cargo bench --bench campaign -- 2000 7000 # another slice, from seed 7000
//! ```
//!
//! - all: number and place of the zeros of the determinant of the global matrix (`common/agreement.rs`);
//! - every fifth: rectangles halved by count alone (`common/subdivision.rs`);
//! - 6 in a thousand: the secant method from a dense grid (`common/brute.rs`);
//! - 6 in a thousand: the solver in 45 digits, `tests/yardstick/witness.py`, which works from the network
//!   file.
//!
//! It ends with an error where a list is wrong, where more than one in ten thousand is not proved, where
//! more than 2 % of the lists needed more than Newton from the grid, or where a kind of element, end or
//! law was never drawn.

#[path = "../common/mod.rs"]
mod common;
mod machine;
mod page;
mod python;

use std::collections::BTreeMap;
use std::process::Command;
use std::time::Instant;

use common::agreement::{Tally, WINDOW, campaign};
use common::random::{Drawn, Wish, draw};
use common::rig::End;
use common::{brute, subdivision};
use machine::{Outcome, file, load, processor};
use page::{time, today, write_between};
use python::{environment, run};
use rayon::prelude::*;
use serde::Deserialize;
use stillflame::modes::{self, Scan, Window};
use stillflame::numerics::zeros;

/// Networks of the whole campaign.
const WHOLE: u64 = 50_000;

/// Networks told of at a time.
const CHUNK: u64 = 1000;

/// One in how many is tried by halving, and by the two slow ways.
const HALVED: u64 = 5;
const SLOW: u64 = 166;

/// Largest distance from the modes in 45 digits, over `|s|`.
const AGREE: f64 = 1e-8;

/// What one way of trying says.
#[derive(Default)]
struct Way {
    networks: usize,
    modes: usize,
    /// Modes this way did not find: no fault of the list.
    missed: usize,
    /// Networks of which it tells nothing.
    untold: Vec<String>,
    wrong: Vec<String>,
    seconds: f64,
}

impl Way {
    fn and(mut self, other: Way) -> Way {
        self.networks += other.networks;
        self.modes += other.modes;
        self.missed += other.missed;
        self.untold.extend(other.untold);
        self.wrong.extend(other.wrong);
        self
    }
}

fn told(drawn: &Drawn, what: &str) -> String {
    format!("seed {}: {what}\n{}", drawn.seed, drawn.rig)
}

fn by_halving(seed: u64) -> Way {
    let drawn = draw(seed, &Wish::default());
    let characteristic = &drawn.solved.acoustics.characteristic.tape;
    let window = WINDOW.rectangle();
    let list = zeros::search(characteristic, &window, Scan::Whole);
    let mut way = Way {
        networks: 1,
        modes: list.zeros.len(),
        ..Way::default()
    };
    let symmetric = drawn.solved.acoustics.chain.start.term.is_none()
        && drawn.solved.acoustics.chain.end.term.is_none();
    match subdivision::cells(characteristic, &window) {
        Ok(cells) => {
            let fault = subdivision::disagreement(&cells, &list, symmetric);
            way.wrong.extend(fault.map(|f| told(&drawn, &f)));
        }
        Err(e) => way.untold.push(told(&drawn, &e)),
    }
    way
}

fn by_brute_force(seed: u64) -> Way {
    let drawn = draw(seed, &Wish::default());
    let list = modes::find(&drawn.solved, WINDOW, Scan::Whole);
    let (found, _) = brute::zeros(&drawn.solved.acoustics.chain, &WINDOW.rectangle());
    let (strange, missed) = brute::beside(&list, &found);
    let fault = (!strange.is_empty()).then(|| told(&drawn, &format!("not listed: {strange:?}")));
    Way {
        networks: 1,
        modes: list.modes.len(),
        missed,
        wrong: fault.into_iter().collect(),
        ..Way::default()
    }
}

fn each(seeds: impl Iterator<Item = u64>, way: fn(u64) -> Way) -> Way {
    let began = Instant::now();
    let seeds: Vec<u64> = seeds.collect();
    let mut all = seeds
        .into_par_iter()
        .map(way)
        .reduce(Way::default, Way::and);
    all.seconds = began.elapsed().as_secs_f64();
    all
}

/// A line of `witness.py --json`.
#[derive(Deserialize)]
struct Witness {
    file: String,
    #[serde(default)]
    modes: Vec<(f64, f64, u8)>,
    problem: Option<String>,
}

/// The window the solver in 45 digits is asked for: above the axis where a constant is complex.
fn window_of(drawn: &Drawn) -> Window {
    // The phase pi is not quite real there.
    let turns = |end: &End| matches!(end, End::Reflection { phase, .. } if *phase != 0.0);
    let complex = turns(&drawn.rig.feed.end) || turns(&drawn.rig.exit.end);
    Window {
        frequency: (if complex { 10.0 } else { 0.0 }, 1000.0),
        ..WINDOW
    }
}

fn by_witness(seeds: impl Iterator<Item = u64>) -> Outcome<Way> {
    let began = Instant::now();
    let python = environment()?;
    let folder = tempfile::tempdir()?;
    let mut networks = BTreeMap::new();
    for seed in seeds {
        let drawn = draw(seed, &Wish::default());
        let path = folder.path().join(format!("{seed}.toml"));
        let text = drawn.rig.to_string();
        let low = format!("frequency = \"{} to", window_of(&drawn).frequency.0);
        let asked = text.replacen("frequency = \"0 to", &low, 1);
        std::fs::write(&path, asked)?;
        networks.insert(path.to_string_lossy().into_owned(), drawn);
    }
    let jobs = std::thread::available_parallelism()?.to_string();
    let printed = run(Command::new(python)
        .arg(file("tests/yardstick/witness.py"))
        .args(["--jobs", &jobs, "--json"])
        .args(networks.keys()))?;
    let mut all = Way::default();
    let asked = networks.len();
    for line in String::from_utf8(printed)?.lines() {
        let witness: Witness = serde_json::from_str(line)?;
        let drawn = networks.get(&witness.file).ok_or("a file not asked for")?;
        all = all.and(beside_witness(drawn, &witness));
    }
    all.seconds = began.elapsed().as_secs_f64();
    if all.networks != asked {
        return Err(format!("{asked} networks asked, {} answered", all.networks).into());
    }
    Ok(all)
}

fn beside_witness(drawn: &Drawn, witness: &Witness) -> Way {
    let mut way = Way {
        networks: 1,
        ..Way::default()
    };
    if let Some(problem) = &witness.problem {
        way.untold.push(told(drawn, problem));
        return way;
    }
    let window = window_of(drawn);
    let list = modes::find(&drawn.solved, window, Scan::Whole);
    way.modes = list.modes.len();
    let r = window.rectangle();
    // Nearer to an edge than both are alike, either may be right.
    let clear = |re: f64, im: f64| {
        let low = if r.omega.0 > 0.0 {
            im - r.omega.0
        } else {
            f64::MAX
        };
        let edges = [re - r.growth.0, r.growth.1 - re, low, r.omega.1 - im];
        edges.iter().all(|d| *d > AGREE * re.hypot(im))
    };
    let exact = witness.modes.iter().filter(|m| clear(m.0, m.1));
    let exact: Vec<_> = exact.collect();
    let weight: usize = exact.iter().map(|m| usize::from(m.2)).sum();
    let ours = list.modes.iter().filter(|m| clear(m.s.re, m.s.im));
    let listed: usize = ours.map(|m| usize::from(m.multiplicity)).sum();
    let lacking = exact.iter().find(|m| {
        let s = num_complex::Complex64::new(m.0, m.1);
        let near = |k: &modes::Mode| (k.s - s).norm() <= AGREE * (1.0 + s.norm()) + k.error_bound;
        !list.modes.iter().any(near)
    });
    if lacking.is_some() || weight != listed {
        let what = format!("{listed} listed, {weight} in 45 digits; lacking {lacking:?}");
        way.wrong.push(told(drawn, &what));
    }
    way
}

fn main() -> Outcome<()> {
    // As `cargo test --benches` asks it: there is nothing to test.
    if !std::env::args().any(|a| a == "--bench") {
        return Ok(());
    }
    let mut numbers = std::env::args().skip(1).filter_map(|a| a.parse().ok());
    let networks: u64 = numbers.next().unwrap_or(WHOLE);
    let first: u64 = numbers.next().unwrap_or(0);
    let seeds = first..first + networks;
    let began = Instant::now();
    let mut tally = Tally::default();
    for from in seeds.clone().step_by(CHUNK as usize) {
        tally = tally.and(campaign(from..seeds.end.min(from + CHUNK)));
        eprintln!("{}", tally.told(began.elapsed().as_secs_f64()));
    }
    let seconds = began.elapsed().as_secs_f64();
    let halved = each(
        seeds.clone().filter(|s| s.is_multiple_of(HALVED)),
        by_halving,
    );
    eprintln!("halving: {:.0} s", halved.seconds);
    let brute = each(seeds.clone().filter(|s| s % SLOW == 7), by_brute_force);
    eprintln!("brute force: {:.0} s", brute.seconds);
    let witness = by_witness(seeds.filter(|s| s % SLOW == 8))?;
    let page = page(&tally, seconds, [&halved, &brute, &witness]);
    println!("{page}");
    for network in tally
        .blind
        .iter()
        .chain(&halved.untold)
        .chain(&witness.untold)
    {
        println!("tells nothing of {network}\n");
    }
    let faults = faults(&tally, [&halved, &brute, &witness], networks);
    if networks == WHOLE && faults.is_empty() {
        write_between("docs/validation.md", "campaign", &page)?;
    }
    if faults.is_empty() {
        return Ok(());
    }
    Err(faults.join("\n\n").into())
}

fn faults(tally: &Tally, ways: [&Way; 3], networks: u64) -> Vec<String> {
    let mut faults = tally.wrong.clone();
    faults.extend(ways.iter().flat_map(|w| w.wrong.clone()));
    let allowed = networks.div_ceil(10_000) as usize;
    if tally.unproven.len() > allowed {
        faults.extend(tally.unproven.clone());
    }
    if tally.fell_back * 50 > tally.networks {
        faults.push(format!("{} needed more than the grid", tally.fell_back));
    }
    let lacks = tally.census.lacks();
    if networks >= 2000 && !lacks.is_empty() {
        faults.push(format!("never drawn: {lacks:?}"));
    }
    faults
}

fn page(tally: &Tally, seconds: f64, [halved, brute, witness]: [&Way; 3]) -> String {
    let cores = std::thread::available_parallelism().map_or(1, usize::from);
    let mut text = format!(
        "Measured {} on {}, {cores} cores, {}.\n\n\
         | held against | networks | modes | wrong | it tells nothing of | modes it misses itself | time |\n\
         | --- | --- | --- | --- | --- | --- | --- |\n",
        today(),
        processor(),
        load()
    );
    let mut row = |name: &str, w: &Way| {
        text += &format!(
            "| {name} | {} | {} | {} | {} | {} | {} |\n",
            w.networks,
            w.modes,
            w.wrong.len(),
            w.untold.len(),
            w.missed,
            time(w.seconds)
        );
    };
    let all = Way {
        networks: tally.networks,
        modes: tally.modes,
        wrong: tally.wrong.clone(),
        untold: tally.blind.clone(),
        missed: 0,
        seconds,
    };
    row("determinant of the global matrix, count and place", &all);
    row("rectangles halved by count alone", halved);
    row("secant method from a dense grid", brute);
    row("independent solver, 45 digits", witness);
    let e = tally.effort;
    text += &format!(
        "\nNot proved, each flagged: {}. Needed more than Newton from the grid: {} networks, {:.2} %. Pads tried again: {}. Double \
         modes: {}. Largest error bound {:.1e} `|s|`. Evaluations per list: {:.0}. A kind of element, end or law never drawn: {}.\n",
        tally.unproven.len(),
        tally.fell_back,
        100.0 * tally.fell_back as f64 / tally.networks as f64,
        e.retries,
        tally.double,
        tally.largest_error,
        e.evaluations as f64 / tally.networks as f64,
        tally.census.lacks().len()
    );
    text
}
