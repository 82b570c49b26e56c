//! What explains a mode: its growth budget adds up, its margins make it neutral, its nature is told.

mod common;

use std::path::{Path, PathBuf};

use num_complex::Complex64;
use rayon::prelude::*;

use stillflame::elements::Kind;
use stillflame::elements::flame::{Basis, Reference, Response};
use stillflame::flame::ResponseLaw;
use stillflame::input;
use stillflame::modes::budget::budget;
use stillflame::modes::margins::{Nature, margins, nature};
use stillflame::modes::shapes::Sample;
use stillflame::modes::{self, Mode, Scan, Solved, Window};
use stillflame::network::{ElementId, Network};

use common::figures;
use common::random::{Drawn, Stream, Wish, draw};

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
    figures::count("budget modes", modes);
    figures::worst("budget", most * 1e-8);
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

/// `Q'` of a flame (W) in a mode of the given stations, from the definition of its response.
fn heat_release(drawn: &Drawn, flame: ElementId, s: Complex64, stations: &[Sample]) -> Complex64 {
    let (layout, states) = (&drawn.network.layout, &drawn.solved.mean.states);
    let Kind::Flame(f) = drawn.network.kind(flame) else {
        panic!("no flame");
    };
    let (inlet, outlet) = (layout.inlet(flame).unwrap(), layout.outlet(flame).unwrap());
    let (up, down) = (states[inlet.0], states[outlet.0]);
    let per_mass_flow = match f.basis {
        Basis::HeatRelease => down.stagnation_enthalpy() - up.stagnation_enthalpy(),
        Basis::Velocity => {
            let gamma = up.gas.gamma(up.temperature);
            gamma / (gamma - 1.0) * up.pressure / up.density()
        }
    };
    let value = |knob| drawn.network.values[knob];
    let parts = f.responses.iter().map(|response| {
        let station = match &response.reference {
            Reference::OwnInlet => inlet,
            Reference::InletOf(name) => layout.inlet(layout.element(name).unwrap()).unwrap(),
            Reference::OutletOf(name) => layout.outlet(layout.element(name).unwrap()).unwrap(),
        };
        let law = match response.law {
            ResponseLaw::NTau {
                interaction_index,
                delay,
            } => value(interaction_index) * (-s * value(delay)).exp(),
            ResponseLaw::Gaussian {
                interaction_index,
                delay,
                spread,
            } => {
                let w = value(spread);
                value(interaction_index) * (-s * value(delay) + s * s * w * w / 2.0).exp()
            }
        };
        let state = states[station.0];
        law * stations[station.0].velocity * (state.density() * state.area)
    });
    parts.sum::<Complex64>() * per_mass_flow
}

/// Acoustic energy of a duct (J), from the waves at its inlet and how they change along it.
fn energy_of(drawn: &Drawn, duct: ElementId, sigma: f64, stations: &[Sample]) -> f64 {
    let layout = &drawn.network.layout;
    let inlet = layout.inlet(duct).unwrap().0;
    let (at, state) = (&stations[inlet], drawn.solved.mean.states[inlet]);
    let Kind::Duct(d) = drawn.network.kind(duct) else {
        panic!("no duct");
    };
    let length = drawn.network.values[d.length];
    let (rho, c, m) = (state.density(), state.sound_speed(), state.mach());
    let waves = [1.0, -1.0].map(|way| {
        let amplitude = 0.5 * (at.pressure + way * rho * c * at.velocity);
        let rate = -2.0 * way * sigma / (c * (1.0 + way * m));
        let along = match rate * length {
            0.0 => length,
            a => a.exp_m1() / rate,
        };
        (1.0 + way * m) * amplitude.norm_sqr() * along
    });
    state.area * (waves[0] + waves[1]) / (2.0 * rho * c * c)
}

/// With flow the heat that a flame releases meets the sound behind it as `p' + rho u u'`: from the jump of
/// mass, momentum and energy at the flame, `Q'` alone makes the waves
///
/// ```text
/// u_h = (gamma - 1) Q'/(A rho c^2 (1 - M^2)),    p_h = -rho u u_h
/// ```
///
/// behind it, which carry `(gamma - 1) Q'/c^2` in `A (rho u' + u p'/c^2)` and nothing in `p'/rho + u u'`; so the
/// power it puts in is, at any Mach number,
///
/// ```text
/// (gamma - 1)/(2 gamma p) Re[Q'^* (p' + rho u u')]        state and waves behind the flame
/// ```
///
/// Rayleigh's integral in still gas. With flow its textbook form `Re[Q'^* p']` may have the other sign, but only
/// where it is outweighed by `|Q' rho u u'|`: near a node of pressure, or near quadrature.
#[test]
fn the_share_of_heat_has_the_sign_of_the_rayleigh_integral() {
    #[derive(Default)]
    struct Tally {
        told: usize,
        skipped: usize,
        without_flow: usize,
        turned: usize,
        worst: f64,
    }
    let tally = |stream: Stream, first: u64| {
        let wish = Wish {
            stream,
            ..Wish::default()
        };
        let one = |seed: u64| {
            let drawn = draw(first + seed, &wish);
            let (network, solved) = (&drawn.network, &drawn.solved);
            let window = Window {
                frequency: (0.0, 1000.0),
                growth: (-600.0, 600.0),
            };
            let mut tally = Tally::default();
            for mode in modes::find(solved, window, Scan::UntilCounted).modes {
                let Some(budget) = budget(network, solved, &mode) else {
                    continue;
                };
                let shape = modes::shapes::along(network, solved, &mode).unwrap();
                let ducts = budget
                    .parts
                    .iter()
                    .filter(|p| matches!(network.kind(p.element), Kind::Duct(_)));
                let fullest = ducts.max_by(|a, b| a.energy.total_cmp(&b.energy)).unwrap();
                let held = energy_of(&drawn, fullest.element, mode.s.re, &shape.stations);
                let energy = held / fullest.energy;
                // What is not this large is known to rounding only.
                let parts = budget.parts.iter();
                let moduli = parts.map(|p| p.flow.abs() + p.entropy.abs() + p.heat.abs());
                let scale_of_shares = moduli.sum::<f64>() + mode.s.norm();
                for part in &budget.parts {
                    // A flame without a response, or without a gain, releases steady heat.
                    let answers = |r: &Response| r.law.delays(&network.values).weight != 0.0;
                    match network.kind(part.element) {
                        Kind::Flame(flame) if flame.responses.iter().any(answers) => {}
                        _ => continue,
                    }
                    let outlet = network.layout.outlet(part.element).unwrap().0;
                    let (behind, at) = (solved.mean.states[outlet], &shape.stations[outlet]);
                    let heat = heat_release(&drawn, part.element, mode.s, &shape.stations);
                    let (rho, c) = (behind.density(), behind.sound_speed());
                    let gamma = behind.gas.gamma(behind.temperature);
                    let met = at.pressure + rho * behind.velocity * at.velocity;
                    let scale = (gamma - 1.0) / (2.0 * rho * c * c) / (2.0 * energy);
                    let expected = scale * (heat.conj() * met).re;
                    let rayleigh = scale * (heat.conj() * at.pressure).re;
                    let told = format!(
                        "seed {} {mode:?} {part:?} {expected} {rayleigh}",
                        drawn.seed
                    );
                    tally.worst = tally
                        .worst
                        .max((part.heat - expected).abs() / scale_of_shares);
                    // Spread delays and nodes of velocity leave next to no heat, whose sign rounding decides.
                    if part.heat.abs() < 1e-9 * scale_of_shares {
                        tally.skipped += 1;
                        continue;
                    }
                    tally.told += 1;
                    assert_eq!(part.heat > 0.0, expected > 0.0, "{told}");
                    if behind.velocity == 0.0 {
                        tally.without_flow += 1;
                        assert_eq!(part.heat > 0.0, rayleigh > 0.0, "{told}");
                    } else if (part.heat > 0.0) != (rayleigh > 0.0) {
                        tally.turned += 1;
                        let moved = scale * (heat * rho * behind.velocity * at.velocity).norm();
                        assert!(rayleigh.abs() < moved, "{told}");
                    }
                }
            }
            tally
        };
        let all: Vec<Tally> = (0..300u64).into_par_iter().map(one).collect();
        all.into_iter().fold(Tally::default(), |a, b| Tally {
            told: a.told + b.told,
            skipped: a.skipped + b.skipped,
            without_flow: a.without_flow + b.without_flow,
            turned: a.turned + b.turned,
            worst: a.worst.max(b.worst),
        })
    };
    let (mut flames, mut worst) = (0, 0.0f64);
    for (stream, first) in [(Stream::Flowing, 8_100_000), (Stream::Still, 8_200_000)] {
        let t = tally(stream, first);
        flames += t.told;
        worst = worst.max(t.worst);
        println!(
            "{stream:?}: {} flames in modes, {} skipped, {} where p' alone has the other sign, off by {:.1e} at most",
            t.told, t.skipped, t.turned, t.worst
        );
        assert!(t.told > 1500, "{}", t.told);
        assert!(5 * t.skipped < t.told, "{} of {}", t.skipped, t.told);
        assert!(10 * t.turned < t.told && t.worst < 1e-10, "{}", t.turned);
        assert_eq!(t.without_flow > 0, stream == Stream::Still);
        assert_eq!(t.turned > 0, stream == Stream::Flowing);
    }
    figures::about("heat flames", flames);
    figures::worst("heat", worst);
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
