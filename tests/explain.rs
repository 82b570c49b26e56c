//! What explains a mode: its growth budget adds up, its margins make it neutral, its nature is told.

use std::path::{Path, PathBuf};

use stillflame::elements::Kind;
use stillflame::flame::ResponseLaw;
use stillflame::input;
use stillflame::modes::budget::budget;
use stillflame::modes::margins::{Nature, margins, nature};
use stillflame::modes::{self, Mode, Scan, Solved, Window};
use stillflame::network::Network;

fn networks() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("networks");
    let mut all: Vec<_> = std::fs::read_dir(folder)
        .unwrap()
        .map(|e| e.unwrap().path())
        .collect();
    all.sort();
    all
}

fn solved(network: &Network) -> (Solved, Vec<Mode>) {
    let solved = modes::solve(network).unwrap();
    let window = Window::of(network, &solved.mean).unwrap();
    let list = modes::find(&solved, window, Scan::Whole);
    assert!(list.complete());
    (solved, list.modes)
}

/// The network with every gain multiplied and every delay moved.
fn varied(network: &Network, factor: f64, shift: f64) -> Network {
    let mut varied = network.clone();
    for (_, element) in network.elements() {
        let Kind::Flame(flame) = &element.kind else {
            continue;
        };
        for response in &flame.responses {
            let (n, tau) = match response.law {
                ResponseLaw::NTau {
                    interaction_index,
                    delay,
                }
                | ResponseLaw::Gaussian {
                    interaction_index,
                    delay,
                    ..
                } => (interaction_index, delay),
            };
            varied.values[n] *= factor;
            varied.values[tau] += shift;
        }
    }
    varied
}

#[test]
fn budgets_add_up_to_the_growth_rate() {
    for path in networks() {
        let network = input::read(&path, &[]).unwrap().network;
        let (solved, modes) = solved(&network);
        for mode in modes {
            let budget = budget(&network, &solved, &mode).unwrap();
            assert!((budget.growth() - mode.growth()).abs() < 1e-8 * mode.s.norm());
            let energy: f64 = budget.parts.iter().map(|p| p.energy).sum();
            assert!((energy - 1.0).abs() < 1e-12);
        }
    }
}

#[test]
fn margins_make_a_mode_neutral() {
    let (mut gains, mut delays) = (0, 0);
    for path in networks() {
        let network = input::read(&path, &[]).unwrap().network;
        let (solved, modes) = solved(&network);
        for mode in modes {
            let margins = margins(&solved, &mode);
            println!(
                "{} {:.2} Hz {:+.2} 1/s {margins:?} {:?}",
                path.display(),
                mode.frequency(),
                mode.growth(),
                nature(&solved, &mode)
            );
            let neutral = |network: &Network| {
                let solved = modes::solve(network).unwrap();
                let f = mode.frequency();
                let window = Window {
                    frequency: (0.3 * f, 2.0 * f),
                    growth: (-50.0, 50.0),
                };
                let list = modes::find(&solved, window, Scan::Whole).modes;
                list.iter().any(|m| m.growth().abs() < 1e-8 * m.s.norm())
            };
            if let Some(factor) = margins.gain {
                assert!(neutral(&varied(&network, factor, 0.0)), "gain {factor}");
                gains += 1;
            }
            if let Some(shift) = margins.delay {
                assert!(neutral(&varied(&network, 1.0, shift)), "delay {shift}");
                delays += 1;
            }
        }
    }
    assert!(gains > 10 && delays > 10, "{gains} gains, {delays} delays");
}

/// Between anechoic ends a flame has intrinsic modes only, `s tau = ln(n b) + i pi (2 k + 1)` with
/// `b = (T2/T1 - 1)/(1 + sqrt(T2/T1))` from the jump conditions in still gas.
#[test]
fn the_intrinsic_mode_is_told_with_its_gain_margin() {
    let file = "tests/data/closed_form/ita_anechoic_ntau.toml";
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join(file);
    let network = input::read(&path, &[]).unwrap().network;
    let (solved, modes) = solved(&network);
    assert!(!modes.is_empty());
    for mode in modes {
        assert_eq!(nature(&solved, &mode), Nature::Intrinsic);
        let margins = margins(&solved, &mode);
        let tau = network.values[network.layout.knob("flame.delay").unwrap()];
        let exact = (-mode.growth() * tau).exp();
        assert!((margins.gain.unwrap() / exact - 1.0).abs() < 1e-8);
        assert_eq!(margins.delay, None);
    }
}
