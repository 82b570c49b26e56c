//! What explains a mode: its growth budget adds up, its margins make it neutral, its nature is told.

mod common;

use std::path::{Path, PathBuf};

use rayon::prelude::*;

use stillflame::elements::Kind;
use stillflame::flame::ResponseLaw;
use stillflame::input;
use stillflame::modes::budget::budget;
use stillflame::modes::margins::{Nature, margins, nature};
use stillflame::modes::shapes::Sample;
use stillflame::modes::{self, Mode, Scan, Solved, Window};
use stillflame::network::Network;

use common::random::{Stream, Wish, draw};

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

/// 500 random networks with flow: the parts, each from its own formula, add up to 1e-8 of the eigenvalue.
#[test]
fn budgets_of_random_networks_add_up() {
    let wish = Wish {
        stream: Stream::Flowing,
        ..Wish::default()
    };
    let worst: Vec<(usize, f64)> = (0..500u64)
        .into_par_iter()
        .map(|seed| {
            let drawn = draw(8_000_000 + seed, &wish);
            let solved = &drawn.solved;
            let window = Window {
                frequency: (0.0, 1000.0),
                growth: (-600.0, 600.0),
            };
            let list = modes::find(solved, window, Scan::UntilCounted);
            let told = list.modes.iter().filter_map(|mode| {
                let budget = budget(&drawn.network, solved, mode)?;
                let scale = 1e-8 * mode.s.norm().max(1.0) + mode.error_bound;
                let off = (budget.growth() - mode.growth()).abs() / scale;
                assert!(off < 1.0, "{off} {mode:?}\n{}", drawn.rig);
                Some(off)
            });
            told.fold((0, 0.0), |(n, worst), off| (n + 1, off.max(worst)))
        })
        .collect();
    let modes: usize = worst.iter().map(|w| w.0).sum();
    let most = worst.iter().map(|w| w.1).fold(0.0, f64::max);
    println!("{modes} modes, worst {most:.1e} of what is allowed");
    assert!(modes > 3000);
}

/// In still gas the share of heat is the Rayleigh integral `(gamma-1)/(gamma p) Re(p'^* Q')/(4 E)`, where
/// `(gamma-1)/(gamma p) Q' = A (u_2' - u_1')`, and `E` the integral of `A (p'^2/(rho c^2) + rho u'^2)/4`.
#[test]
fn the_share_of_heat_is_the_rayleigh_integral() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("networks/flame_in_tube.toml");
    let network = input::read(&path, &[]).unwrap().network;
    let (solved, modes) = solved(&network);
    let flame = network.layout.element("main_flame").unwrap();
    let inlet = network.layout.inlet(flame).unwrap().0;
    for mode in modes {
        let budget = budget(&network, &solved, &mode).unwrap();
        let shape = modes::shapes::along(&network, &solved, &mode).unwrap();
        let (up, down) = (shape.stations[inlet], shape.stations[inlet + 1]);
        // Volume flow made at the flame, in phase with pressure; the tube has one area, left out.
        let rayleigh = (up.pressure.conj() * (down.velocity - up.velocity)).re;
        let density = |a: &Sample| {
            let state = solved.mean.states[network.layout.inlet(a.element).unwrap().0];
            let (rho, c) = (state.density(), state.sound_speed());
            0.25 * (a.pressure.norm_sqr() / (rho * c * c) + rho * a.velocity.norm_sqr())
        };
        // Standing parts of both energies cancel, so that what is left bends little between the places.
        let energy: f64 = shape
            .along
            .windows(2)
            .map(|pair| {
                0.5 * (density(&pair[0]) + density(&pair[1]))
                    * (pair[1].position - pair[0].position)
            })
            .sum();
        let heat = budget.parts[flame.0].heat;
        let expected = rayleigh / (4.0 * energy);
        assert!((heat / expected - 1.0).abs() < 1e-3, "{heat} {expected}");
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
