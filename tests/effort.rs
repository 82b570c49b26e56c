//! How much work a list takes, held against a committed snapshot, so that a quiet slow-down fails
//! without anything being timed.
//!
//! Counted are the calls of the function itself, whoever makes them, and what the search tells of its
//! own work, for the default list of every network in `networks/` and for the first networks of the
//! campaign together. Where the work changes on purpose, write the snapshot anew and commit it:
//!
//! ```sh
//! STILLFLAME_RENEW=1 cargo test --release --test effort
//! ```

mod common;

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};
use stillflame::modes::{self, Solved, Window};
use stillflame::numerics::count::Effort;
use stillflame::numerics::zeros::{self, Scan};

use common::counting::Counting;
use common::random::{Wish, draw};

/// Part by which work may grow before the snapshot must be renewed.
const GROWTH: f64 = 0.02;

/// Part by which it may shrink: a snapshot far above the truth would hide the next slow-down.
const SHRINKAGE: f64 = 0.2;

/// Work by kind.
type Work = BTreeMap<String, usize>;

#[derive(Debug, PartialEq, Serialize, Deserialize)]
struct Snapshot {
    about: String,
    lists: BTreeMap<String, Work>,
}

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

fn committed() -> PathBuf {
    root().join("tests/data/effort.json")
}

fn work_of(solved: &Solved, window: Window, into: &mut Work) {
    let f = Counting::of(&solved.acoustics.characteristic.tape);
    let found = zeros::search(&f, &window.rectangle(), Scan::Whole);
    assert!(found.complete(), "{:?}", found.doubts);
    let calls = f.calls();
    let Effort {
        evaluations,
        bounds,
        refinements,
        retries,
        fallbacks,
    } = found.effort;
    for (kind, n) in [
        ("values and slopes", calls.values),
        ("Taylor series", calls.series),
        ("majorants", calls.bounds),
        ("evaluations told", evaluations),
        ("bounds told", bounds),
        ("refinements", refinements),
        ("retries", retries),
        ("fallbacks", fallbacks),
    ] {
        *into.entry(kind.to_owned()).or_default() += n;
    }
}

fn measured() -> Snapshot {
    let mut lists = BTreeMap::new();
    for entry in std::fs::read_dir(root().join("networks")).unwrap() {
        let path = entry.unwrap().path();
        let network = stillflame::input::read(&path, &[]).unwrap().network;
        let solved = modes::solve(&network).unwrap();
        let window = Window::of(&network, &solved.mean).unwrap();
        let name = path.file_name().unwrap().to_string_lossy().into_owned();
        work_of(&solved, window, lists.entry(name).or_default());
    }
    let window = Window {
        frequency: (0.0, 1000.0),
        growth: (-600.0, 600.0),
    };
    let together = lists.entry("200 random networks".to_owned()).or_default();
    for seed in 0..200 {
        work_of(&draw(seed, &Wish::default()).solved, window, together);
    }
    Snapshot {
        about: "Work of each default list. Renew: STILLFLAME_RENEW=1 cargo test --release --test effort"
            .to_owned(),
        lists,
    }
}

/// What has changed too much, one line each.
fn changes(before: &Snapshot, now: &Snapshot) -> Vec<String> {
    let mut all = Vec::new();
    let names = |s: &Snapshot| s.lists.keys().cloned().collect::<Vec<_>>();
    if names(before) != names(now) {
        all.push(format!(
            "lists: {:?} became {:?}",
            names(before),
            names(now)
        ));
    }
    for (name, work) in &now.lists {
        for (kind, &n) in work {
            let Some(&m) = before.lists.get(name).and_then(|w| w.get(kind)) else {
                all.push(format!("{name}: no {kind} in the snapshot"));
                continue;
            };
            let rare = matches!(kind.as_str(), "retries" | "fallbacks");
            let most = if rare { 0.0 } else { GROWTH * m as f64 };
            let least = SHRINKAGE * m as f64;
            if n as f64 > m as f64 + most || (n as f64) < m as f64 - least {
                all.push(format!("{name}: {kind} {m} became {n}"));
            }
        }
    }
    all
}

#[test]
fn lists_take_the_work_they_took() {
    let now = measured();
    if std::env::var_os("STILLFLAME_RENEW").is_some() {
        let text = serde_json::to_string_pretty(&now).unwrap();
        std::fs::write(committed(), text + "\n").unwrap();
    }
    let text = std::fs::read_to_string(committed()).unwrap();
    let before: Snapshot = serde_json::from_str(&text).unwrap();
    let changes = changes(&before, &now);
    assert!(
        changes.is_empty(),
        "the work of a list has changed:\n  {}\nIf that is meant, renew the snapshot and commit it:\n  \
         STILLFLAME_RENEW=1 cargo test --release --test effort",
        changes.join("\n  ")
    );
}

#[test]
fn a_slow_down_is_seen_and_so_is_a_stale_snapshot() {
    let with = |values: usize, fallbacks: usize| {
        let work = [("values and slopes", values), ("fallbacks", fallbacks)];
        let work = work.map(|(k, n)| (k.to_owned(), n)).into_iter().collect();
        Snapshot {
            about: String::new(),
            lists: [("a".to_owned(), work)].into_iter().collect(),
        }
    };
    let before = with(1000, 0);
    for (values, fallbacks, seen) in [
        (1000, 0, 0),
        (1020, 0, 0),
        (1021, 0, 1),
        (800, 0, 0),
        (799, 0, 1),
        (1000, 1, 1),
        (1500, 2, 2),
    ] {
        let found = changes(&before, &with(values, fallbacks));
        assert_eq!(found.len(), seen, "{found:?}");
    }
    let mut more = with(1000, 0);
    more.lists.insert("b".to_owned(), Work::new());
    assert_eq!(changes(&before, &more).len(), 1);
}
