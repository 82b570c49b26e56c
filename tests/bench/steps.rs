//! How long each step takes, from one value of `D(s)` to a whole stability map.
//!
//! ```sh
//! cargo bench --bench steps               # all
//! cargo bench --bench steps -- "mode list"  # those whose name holds the words
//! ```

#[path = "../common/mod.rs"]
mod common;
mod rigs;

use std::hint::black_box;
use std::time::{Duration, Instant};

use common::heater;
use criterion::measurement::WallTime;
use criterion::{
    BenchmarkGroup, Criterion, SamplingMode, Throughput, criterion_group, criterion_main,
};
use num_complex::Complex64;
use rigs::{POINTS, Rig};
use stillflame::modes::{self, Scan, Solved};
use stillflame::numerics::analytic::{Analytic, Region};
use stillflame::numerics::count::Walker;

const RIGS: [(&str, &str); 3] = [
    ("6 elements", "tests/yardstick/chains/six.toml"),
    ("20 elements", "tests/yardstick/chains/twenty.toml"),
    ("20 with flow, 2 flames", "networks/twenty_elements.toml"),
];

fn rigs() -> Vec<Rig> {
    let read = |(name, path)| Rig::read(name, path).expect("a network that can be solved");
    RIGS.into_iter().map(read).collect()
}

fn each(c: &mut Criterion, step: &str, run: impl Fn(&mut BenchmarkGroup<'_, WallTime>, &Rig)) {
    let mut group = c.benchmark_group(step);
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

fn list(c: &mut Criterion) {
    each(c, "mode list", |group, rig| {
        group.bench_function(rig.name, |b| {
            b.iter(|| {
                let list = modes::find(black_box(&rig.solved), rig.window, Scan::Whole);
                assert!(list.complete());
                list
            });
        });
    });
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
    let mut group = c.benchmark_group("list beside an exceptional point");
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

fn map(c: &mut Criterion) {
    let two = rigs::threads(2);
    each(c, "map, 200 x 200, two threads", |group, rig| {
        group.sample_size(10).sampling_mode(SamplingMode::Flat);
        group.warm_up_time(Duration::from_millis(1));
        group.measurement_time(Duration::from_secs(1));
        group.bench_function(rig.name, |b| {
            b.iter(|| {
                let map = two.install(|| rig.map(rig.axes(POINTS)));
                assert_eq!(map.tally().failed, 0);
                map
            });
        });
    });
}

criterion_group!(
    steps,
    values,
    values_in_lanes,
    bounds,
    count,
    list,
    exceptional,
    solve,
    point,
    map
);
criterion_main!(steps);
