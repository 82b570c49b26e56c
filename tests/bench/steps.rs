//! How long each step takes, from one value of `D(s)` to a whole stability map.
//!
//! ```sh
//! cargo bench --bench steps               # all; writes the medians into docs/performance.md
//! cargo bench --bench steps -- "mode list"  # those whose name holds the words
//! ```

#[path = "../common/mod.rs"]
mod common;
mod machine;
mod page;
mod rigs;

use std::hint::black_box;
use std::path::PathBuf;
use std::time::{Duration, Instant};

use common::heater;
use criterion::measurement::WallTime;
use criterion::{BenchmarkGroup, Criterion, SamplingMode, Throughput, criterion_group};
use machine::{Outcome, file, load, processor};
use num_complex::Complex64;
use page::{time, today, write_between};
use rayon::prelude::*;
use rigs::{POINTS, Rig};
use stillflame::acoustics;
use stillflame::modes::{self, Scan, Solved};
use stillflame::numerics::analytic::{Analytic, Region};
use stillflame::numerics::count::Walker;
use stillflame::numerics::lanes::{self, Job, LANES, Lanes};
use stillflame::studies::map::Axis;

/// Six elements with 32 modes, most of them of carried entropy: too slow for maps here.
const CONVECTIVE: &str = "6 with flow, entropy";

const RIGS: [(&str, &str); 4] = [
    ("6 elements", "tests/yardstick/chains/six.toml"),
    (
        "6 with flow, entropy",
        "tests/yardstick/chains/six_flow.toml",
    ),
    ("20 elements", "tests/yardstick/chains/twenty.toml"),
    ("20 with flow, 2 flames", "networks/twenty_elements.toml"),
];

fn rigs() -> Vec<Rig> {
    let read = |(name, path)| Rig::read(name, path).expect("a network that can be solved");
    RIGS.into_iter().map(read).collect()
}

fn each(c: &mut Criterion, step: &str, run: impl Fn(&mut BenchmarkGroup<'_, WallTime>, &Rig)) {
    let mut group = c.benchmark_group(step);
    group.warm_up_time(Duration::from_millis(500));
    group.measurement_time(Duration::from_secs(2));
    for rig in rigs() {
        run(&mut group, &rig);
    }
    group.finish();
}

fn values(c: &mut Criterion) {
    each(c, "D and slope at a point", |group, rig| {
        let tape = &rig.solved.acoustics.characteristic.tape;
        let points = rig.points(1024);
        let mut next = points.iter().cycle();
        group.bench_function(rig.name, |b| {
            b.iter(|| next.next().map(|&s| tape.value_and_slope(black_box(s))));
        });
    });
}

/// 1024 points at once: a thousandth of the time is that of a point.
fn values_in_lanes(c: &mut Criterion) {
    each(c, "D and slope at 1024 points", |group, rig| {
        let tape = &rig.solved.acoustics.characteristic.tape;
        let points = rig.points(1024);
        let mut found = Vec::with_capacity(points.len());
        group.throughput(Throughput::Elements(points.len() as u64));
        group.bench_function(rig.name, |b| {
            b.iter(|| {
                found.clear();
                tape.values_and_slopes(black_box(&points), &mut found);
                found.last().copied()
            });
        });
    });
}

fn bounds(c: &mut Criterion) {
    each(c, "bounds over a segment", |group, rig| {
        let tape = &rig.solved.acoustics.characteristic.tape;
        let r = rig.window.rectangle();
        let region = Region::segment(
            Complex64::new(r.growth.0, r.omega.0),
            Complex64::new(r.growth.1, r.omega.1),
        );
        group.bench_function(rig.name, |b| b.iter(|| tape.bound(black_box(&region))));
    });
}

fn count(c: &mut Criterion) {
    each(c, "certified count", |group, rig| {
        let tape = &rig.solved.acoustics.characteristic.tape;
        let r = rig.window.rectangle();
        group.bench_function(rig.name, |b| {
            b.iter(|| {
                Walker::new(tape)
                    .symmetric(black_box(r.growth), r.omega.1)
                    .expect("no zero on the edge")
            });
        });
    });
}

/// Lists of the whole window, as `modes` makes them, and until the count is reached, as studies do.
fn list(c: &mut Criterion) {
    for (step, scan) in [
        ("mode list", Scan::UntilCounted),
        ("mode list, whole window", Scan::Whole),
    ] {
        each(c, step, |group, rig| {
            group.bench_function(rig.name, |b| {
                b.iter(|| {
                    let acoustics = black_box(&rig.solved.acoustics);
                    let list = modes::find_from(acoustics, rig.window, scan, &[]);
                    assert!(list.complete());
                    list
                });
            });
        });
    }
}

/// A bare loop of 1024 complex exponentials at the width of the lanes: what the processor can do at most.
struct Exponentials<'a> {
    growth: &'a [[f64; LANES]],
    angle: &'a [[f64; LANES]],
}

impl Job for Exponentials<'_> {
    type Output = [f64; LANES];
    #[inline(always)]
    fn run<L: Lanes>(self) -> [f64; LANES] {
        let (mut re, mut im) = (L::from(0.0), L::from(0.0));
        for (growth, angle) in self.growth.iter().zip(self.angle) {
            let r = lanes::exp(L::load(growth));
            let (sin, cos) = lanes::sin_cos(L::load(angle));
            re = r.mul_add(cos, re);
            im = r.mul_add(sin, im);
        }
        let mut sum = [0.0; LANES];
        (re + im).store(&mut sum);
        sum
    }
}

fn exponentials(c: &mut Criterion) {
    let spread = |from: f64, step: f64| -> Vec<[f64; LANES]> {
        let value = |i: usize, j: usize| from + step * (i * LANES + j) as f64;
        (0..1024 / LANES)
            .map(|i| std::array::from_fn(|j| value(i, j)))
            .collect()
    };
    let (growth, angle) = (spread(-1.0, 0.002), spread(-17.0, 0.03));
    let mut group = c.benchmark_group("exponentials");
    group.throughput(Throughput::Elements(1024));
    group.bench_function("1024", |b| {
        b.iter(|| {
            lanes::on_lanes(Exponentials {
                growth: black_box(&growth),
                angle: black_box(&angle),
            })
        });
    });
    group.finish();
}

/// Lists of a heater in an open tube at and beside its exceptional points: all in turn, and the one
/// that takes most work.
fn exceptional(c: &mut Criterion) {
    let points = heater::points();
    let all: Vec<Solved> = points
        .iter()
        .flat_map(|p| p.beside.iter().map(|b| heater::solved(&p.x_f, b)))
        .collect();
    let find = |solved: &Solved| {
        let list = modes::find(black_box(solved), heater::WINDOW, Scan::Whole);
        assert!(list.complete());
        list
    };
    let slowest = all.iter().max_by_key(|solved| {
        let begun = Instant::now();
        for _ in 0..5 {
            find(solved);
        }
        begun.elapsed()
    });
    let slowest = slowest.expect("points");
    let mut group = c.benchmark_group(EXCEPTIONAL);
    let mut next = all.iter().cycle();
    group.bench_function("all in turn", |b| b.iter(|| next.next().map(find)));
    group.bench_function("the slowest", |b| b.iter(|| find(slowest)));
    group.finish();
}

/// From a network to `D(s)`: mean flow, balances, elimination.
fn solve(c: &mut Criterion) {
    each(c, "mean flow and acoustics", |group, rig| {
        group.bench_function(rig.name, |b| {
            b.iter(|| modes::solve(black_box(&rig.network)).expect("a flow"));
        });
    });
}

/// The network assembled anew with another delay and gain, its list, and what grows beyond.
fn point(c: &mut Criterion) {
    let one = rigs::threads(1);
    each(c, "a point of a map", |group, rig| {
        let mut axes = rig.axes(1);
        (axes.0.low, axes.1.low) = (0.004, 1.3);
        group.bench_function(rig.name, |b| {
            one.install(|| {
                b.iter(|| {
                    let map = rig.map(black_box(axes));
                    assert!(map.points[0].complete());
                    map
                });
            });
        });
    });
}

/// Two knobs that move the mean flow: burnt temperature of the main flame and temperature of the feed.
fn flow_axes(rig: &Rig) -> (Axis, Axis) {
    (
        rig.axis("main_flame.burnt_temperature", 1500.0, 2000.0, POINTS),
        rig.axis("feed.temperature", 300.0, 600.0, POINTS),
    )
}

/// The map with nothing carried over from point to point: acoustics assembled, modes searched from a grid, growth beyond
/// the window sought from the window's edge on. Number of points proved complete.
fn map_anew(rig: &Rig, (across, up): (Axis, Axis)) -> usize {
    let row = |j: usize| {
        let mut here = rig.network.clone();
        here.values[up.knob] = up.value(j);
        let complete = |i: &usize| {
            here.values[across.knob] = across.value(*i);
            let acoustics = acoustics::assemble(&here, &rig.solved.mean).expect("balances");
            let start = rig.window.growth.1;
            modes::find_all_from(&acoustics, rig.window, start, &[])
                .0
                .complete()
        };
        (0..across.points).filter(complete).count()
    };
    (0..up.points).into_par_iter().map(row).sum()
}

fn maps(c: &mut Criterion) {
    let (one, two) = (rigs::threads(1), rigs::threads(2));
    let plane = |rig: &Rig| rig.axes(POINTS);
    type Work<'a> = Box<dyn Fn(&Rig) -> usize + 'a>;
    let anew = |rig: &Rig| map_anew(rig, plane(rig));
    let followed = |rig: &Rig| rig.map(plane(rig)).tally().complete;
    let flow = |rig: &Rig| rig.map(flow_axes(rig)).tally().complete;
    let works: [(&str, Work<'_>); 4] = [
        (ANEW, Box::new(|rig| one.install(|| anew(rig)))),
        (FOLLOWED, Box::new(|rig| one.install(|| followed(rig)))),
        (
            FOLLOWED_BY_TWO,
            Box::new(|rig| two.install(|| followed(rig))),
        ),
        (FLOW, Box::new(|rig| one.install(|| flow(rig)))),
    ];
    for (name, work) in works {
        each(c, name, |group, rig| {
            if rig.name == CONVECTIVE {
                return;
            }
            group.sample_size(10).sampling_mode(SamplingMode::Flat);
            group.warm_up_time(Duration::from_millis(1));
            group.measurement_time(Duration::from_secs(1));
            group.bench_function(rig.name, |b| {
                b.iter(|| {
                    let complete = work(rig);
                    assert_eq!(complete, POINTS * POINTS);
                    complete
                });
            });
        });
    }
}

const EXCEPTIONAL: &str = "list beside an exceptional point";
const ANEW: &str = "map, each point anew, one thread";
const FOLLOWED: &str = "map, followed, one thread";
const FOLLOWED_BY_TWO: &str = "map, followed, two threads";
const FLOW: &str = "map over knobs of the flow, one thread";

/// What the page tells: words, the group criterion keeps the medians under, its share of them, and the mark set for six and
/// twenty elements.
const ROWS: [(&str, &str, f64, &str); 12] = [
    (
        "`D` and `D'`, in lanes, each of 1024",
        "D and slope at 1024 points",
        1024.0,
        "12 / 32 ns",
    ),
    ("`D` and `D'`, one alone", "D and slope at a point", 1.0, ""),
    (
        "bounds over a segment, one alone",
        "bounds over a segment",
        1.0,
        "",
    ),
    ("certified count", "certified count", 1.0, "4 us / -"),
    (
        "certified list, until counted",
        "mode list",
        1.0,
        "20 / 60 us",
    ),
    (
        "certified list, whole window",
        "mode list, whole window",
        1.0,
        "",
    ),
    (
        "mean flow and acoustics",
        "mean flow and acoustics",
        1.0,
        "",
    ),
    (
        "a point of a map, nothing known",
        "a point of a map",
        1.0,
        "",
    ),
    (
        "map 200 x 200, gain and delay, each point anew, one thread",
        ANEW,
        1.0,
        "1.5 / 4 s",
    ),
    (
        "the same, followed and counted, one thread",
        FOLLOWED,
        1.0,
        "0.5 / 1.3 s",
    ),
    ("the same, two threads", FOLLOWED_BY_TWO, 1.0, ""),
    (
        "map 200 x 200 over two knobs of the mean flow, one thread",
        FLOW,
        1.0,
        "2.5 s",
    ),
];

/// A median in seconds.
fn median(group: &str, name: &str) -> Outcome<f64> {
    let tidy = |text: &str| text.replace(['?', '"', '/', '\\', '*', '<', '>', ':', '|', '^'], "_");
    let target = std::env::var_os("CARGO_TARGET_DIR").map_or_else(|| file("target"), PathBuf::from);
    let folder = target.join("criterion").join(tidy(group)).join(tidy(name));
    let estimates = folder.join("new/estimates.json");
    let text =
        std::fs::read_to_string(&estimates).map_err(|e| format!("{}: {e}", estimates.display()))?;
    let told: serde_json::Value = serde_json::from_str(&text)?;
    let nanoseconds = told["median"]["point_estimate"].as_f64();
    Ok(1e-9 * nanoseconds.ok_or("no median")?)
}

fn figures() -> Outcome<String> {
    let mut text = format!(
        "Medians of `cargo bench --bench steps` on {}, {} cores, lanes of {:?}, {}, at the end {}.\n\n| quantity | {} | mark, 6 / 20 elements |\n| --- | --- | --- | --- | --- | --- |\n",
        processor(),
        std::thread::available_parallelism()?,
        lanes::level(),
        today(),
        load(),
        RIGS.map(|(name, _)| name).join(" | "),
    );
    for (words, group, share, mark) in ROWS {
        let told = |(name, _): &(&str, &str)| match *name {
            CONVECTIVE if group.starts_with("map") => Ok("-".to_owned()),
            name => Ok(time(median(group, name)? / share)),
        };
        let times: Vec<String> = RIGS.iter().map(told).collect::<Outcome<_>>()?;
        text += &format!("| {words} | {} | {mark} |\n", times.join(" | "));
    }
    let beside = |name| Ok::<_, Box<dyn std::error::Error>>(time(median(EXCEPTIONAL, name)?));
    text += &format!(
        "\nA list at or beside an exceptional point, rounding of the coefficients and all: {} in the mean over all of them, {} the \
         slowest.\n",
        beside("all in turn")?,
        beside("the slowest")?
    );
    let exponential = median("exponentials", "1024")? / 1024.0;
    let value = |name| Ok(median("D and slope at 1024 points", name)? / 1024.0);
    let six: Outcome<f64> = value(RIGS[0].0);
    let both =
        |name| -> Outcome<f64> { Ok(median(FOLLOWED, name)? / median(FOLLOWED_BY_TWO, name)?) };
    text += &format!(
        "\nA bare loop of complex exponentials at the same width takes {} for each; the chain of six elements holds four of them, which \
         is {:.2} of its value (mark 0.4). Two threads against one on the followed map (mark 1.8): {}.\n",
        time(exponential),
        4.0 * exponential / six?,
        RIGS.map(|(name, _)| both(name).map_or("-".into(), |r| format!("{r:.2}")))
            .join(", "),
    );
    Ok(text)
}

criterion_group!(
    steps,
    values,
    values_in_lanes,
    exponentials,
    bounds,
    count,
    list,
    exceptional,
    solve,
    point,
    maps
);

fn main() -> Outcome<()> {
    steps();
    Criterion::default().configure_from_args().final_summary();
    // Words that choose some leave the page as it is.
    let chosen = std::env::args().skip(1).any(|a| !a.starts_with("--"));
    if chosen || !std::env::args().any(|a| a == "--bench") {
        return Ok(());
    }
    write_between("docs/performance.md", "steps", &figures()?)
}
