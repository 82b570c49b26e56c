//! Networks and paths for the tests.

use std::ops::ControlFlow;
use std::path::{Path as File, PathBuf};

use stillflame::input;
use stillflame::meanflow;
use stillflame::modes::Window;
use stillflame::network::Network;
use stillflame::studies::path::{Parameter, Path, Run, Spacing};
use stillflame::studies::sweep::{self, State, Sweep};

pub fn file(name: &str) -> PathBuf {
    File::new(env!("CARGO_MANIFEST_DIR")).join(name)
}

pub fn network(name: &str, settings: &[String]) -> Network {
    input::read(&file(name), settings)
        .unwrap_or_else(|p| panic!("{p}"))
        .network
}

/// A path of one knob or of several that move together.
pub fn path(network: &Network, runs: &[(&str, f64, f64)], points: usize) -> Path {
    let knob = |name: &str| network.layout.knob(name).unwrap();
    let knobs: Vec<_> = runs
        .iter()
        .map(|&(name, from, to)| (knob(name), Run { from, to }))
        .collect();
    Path {
        parameter: Parameter::Knob(knobs[0].0),
        values: knobs[0].1,
        knobs,
        spacing: Spacing::Linear,
        points,
    }
}

pub fn window(network: &Network) -> Window {
    let mean = meanflow::solve(network).unwrap();
    Window::of(network, &mean).unwrap()
}

pub fn sweep(network: &Network, path: &Path, window: Window) -> Sweep {
    let mean = meanflow::solve(network).unwrap();
    sweep::sweep(network, &mean, path, window, || ControlFlow::Continue(())).unwrap()
}

/// Every point has a list that was counted, and each of its modes a branch of its own, where modes could be followed.
pub fn check(sweep: &Sweep) {
    for point in &sweep.points {
        if matches!(point.state, State::Failed(_)) {
            assert!(point.modes.is_empty());
            continue;
        }
        assert!(point.effort.evaluations > 0 && point.effort.bounds > 0);
        if point.state == State::Certified {
            let mut branches: Vec<usize> = point.modes.iter().filter_map(|(b, _)| *b).collect();
            let on_branches = branches.len();
            branches.sort_unstable();
            branches.dedup();
            assert_eq!(branches.len(), on_branches, "at {}", point.u);
            let followed = !sweep.is_unresolved(point.u);
            assert!(
                !followed || on_branches == point.modes.len(),
                "at {}",
                point.u
            );
        }
    }
    for branch in &sweep.branches {
        assert!(branch.trace.windows(2).all(|w| w[0].u <= w[1].u));
    }
}
