//! Windows of all sizes: 500 networks each within 200, 2000 (up to 3 kHz) and 5000 1/s. Some lists are
//! held against the determinant of the global matrix, some against the same found in two halves. Where
//! carried entropy grows beyond what numbers hold, or what is left of it is lost in rounding, the list
//! says so.

use num_complex::Complex64;
use rayon::prelude::*;
use stillflame::modes::{self, ModeList, Scan, Window};
use stillflame::numerics::count::CountError;
use stillflame::numerics::zeros::Doubt;

use crate::common::agreement::try_one;
use crate::common::figures;
use crate::common::random::{Drawn, Wish, draw};

#[derive(Default)]
struct Figures {
    modes: usize,
    complete: usize,
    overflow: usize,
    drowned: usize,
    blurred: usize,
    blind: usize,
    held: usize,
    unproven: Vec<String>,
    wrong: Vec<String>,
}

impl Figures {
    fn and(mut self, other: Figures) -> Figures {
        self.modes += other.modes;
        self.complete += other.complete;
        self.overflow += other.overflow;
        self.drowned += other.drowned;
        self.blurred += other.blurred;
        self.blind += other.blind;
        self.held += other.held;
        self.unproven.extend(other.unproven);
        self.wrong.extend(other.wrong);
        self
    }
}

/// The list of a window and those of its halves below and above a growth rate hold the same modes.
fn halves_disagree(drawn: &Drawn, list: &ModeList) -> Option<String> {
    let (low, high) = list.window.growth;
    // A cut that no mode lies on.
    let clear = |cut: &f64| {
        list.modes
            .iter()
            .all(|m| (m.s.re - cut).abs() > 1e-6 * m.s.norm().max(1.0) + m.error_bound)
    };
    let cut = [0.37, 0.41, 0.33, 0.45, 0.29]
        .map(|part| low + part * (high - low))
        .into_iter()
        .find(clear)?;
    let half = |growth| {
        modes::find(
            &drawn.solved,
            Window {
                growth,
                ..list.window
            },
            Scan::UntilCounted,
        )
    };
    let halves = [half((low, cut)), half((cut, high))];
    if !halves.iter().all(ModeList::complete) {
        return None;
    }
    let told = |l: &ModeList| {
        l.modes
            .iter()
            .map(|m| (m.s, m.error_bound, m.multiplicity))
            .collect::<Vec<_>>()
    };
    let parts: Vec<(Complex64, f64, u8)> = halves.iter().flat_map(told).collect();
    let whole = told(list);
    let weight = |l: &[(Complex64, f64, u8)]| l.iter().map(|m| usize::from(m.2)).sum::<usize>();
    let same = |a: &(Complex64, f64, u8)| {
        let near = |b: &&(Complex64, f64, u8)| (a.0 - b.0).norm() <= a.1 + b.1;
        parts.iter().filter(near).count() >= 1
    };
    (weight(&whole) != weight(&parts) || !whole.iter().all(same))
        .then(|| format!("{whole:?} are {parts:?} in halves at {cut}"))
}

fn one(seed: u64, trial: &Trial) -> Figures {
    let drawn = draw(20_000 + seed, &trial.wish);
    let window = Window {
        frequency: (0.0, trial.highest),
        growth: (-trial.growth, trial.growth),
    };
    let mut figures = Figures::default();
    let told = |what: String| format!("seed {}: {what}\n{}", drawn.seed, drawn.rig);
    let list = if seed.is_multiple_of(trial.held) {
        let (list, tally) = try_one(&drawn, window);
        figures.wrong.extend(tally.wrong);
        figures.blind = tally.blind.len();
        figures.held = 1;
        list
    } else {
        modes::find(&drawn.solved, window, Scan::Whole)
    };
    figures.modes = list.modes.len();
    if list.complete() {
        figures.complete = 1;
        figures
            .wrong
            .extend(halves_disagree(&drawn, &list).map(told));
    } else if matches!(
        list.doubts[..],
        [Doubt::NotCounted(CountError::Overflow { .. })]
    ) {
        figures.overflow = 1;
    } else if matches!(
        list.doubts[..],
        [Doubt::NotCounted(CountError::Drowned { .. })]
    ) {
        figures.drowned = 1;
    } else if list
        .doubts
        .iter()
        .all(|d| matches!(d, Doubt::Coarse { .. }))
    {
        figures.blurred = 1;
    } else {
        figures.unproven.push(told(format!("{:?}", list.doubts)));
        let broken = |d: &Doubt| {
            matches!(
                d,
                Doubt::Excess { .. } | Doubt::NotCounted(CountError::BoundContradicted { .. })
            )
        };
        if list.doubts.iter().any(broken) {
            figures.wrong.push(told(format!("{:?}", list.doubts)));
        }
    }
    figures
}

/// What is tried.
struct Trial {
    /// In the page of figures.
    name: &'static str,
    /// 1/s, either way.
    growth: f64,
    /// Hz.
    highest: f64,
    networks: u64,
    /// One in how many is held against the determinant.
    held: u64,
    wish: Wish,
}

impl Trial {
    fn within(name: &'static str, growth: f64, highest: f64, held: u64) -> Trial {
        Trial {
            name,
            growth,
            highest,
            networks: 500,
            held,
            wish: Wish::default(),
        }
    }

    /// None wrong, and none unproven but those lost in rounding or in overflow, or blurred by rounding of coefficients.
    fn run(&self) -> Figures {
        let all = (0..self.networks)
            .into_par_iter()
            .map(|seed| one(seed, self))
            .reduce(Figures::default, Figures::and);
        println!(
            "+-{} 1/s, to {} Hz: {} networks, {} modes, {} complete, {} overflow, {} lost in rounding, {} blurred by it, {} unproven, \
             {} wrong; {} held against the determinant, which told nothing of {}",
            self.growth,
            self.highest,
            self.networks,
            all.modes,
            all.complete,
            all.overflow,
            all.drowned,
            all.blurred,
            all.unproven.len(),
            all.wrong.len(),
            all.held,
            all.blind
        );
        let faults = [&all.wrong[..], &all.unproven[..]].concat();
        assert!(
            faults.is_empty(),
            "{} faults\n{}",
            faults.len(),
            faults.join("\n\n")
        );
        figures::count(&format!("trial {}", self.name), self.networks as usize);
        figures::about(
            &format!("trial {} not proved", self.name),
            self.networks as usize - all.complete,
        );
        figures::about(&format!("trial {} untold", self.name), all.blind);
        all
    }
}

#[test]
fn lists_of_narrow_windows_are_right() {
    assert_eq!(Trial::within("200", 200.0, 1000.0, 10).run().complete, 500);
}

#[test]
fn lists_of_wide_windows_are_right() {
    assert!(Trial::within("2000", 2000.0, 3000.0, 25).run().complete >= 490);
}

#[test]
fn lists_of_very_wide_windows_are_right_or_refused() {
    assert!(Trial::within("5000", 5000.0, 1000.0, 25).run().complete >= 440);
}

/// Entropy that takes half a second along a duct is multiplied by `exp(2500)` at -5000 1/s.
#[test]
fn entropy_carried_slowly_is_refused_where_it_overflows() {
    let trial = Trial {
        networks: 100,
        wish: Wish {
            longest_carried: 3.0,
            ..Wish::default()
        },
        ..Trial::within("carried", 5000.0, 200.0, 25)
    };
    let all = trial.run();
    assert!(all.overflow >= 1 && all.complete >= 50);
}
