//! Identities every network must satisfy, over random ones that hold everything a file can state.

mod common;

use std::fmt::Display;

use num_complex::Complex64;
use rayon::prelude::*;
use stillflame::acoustics::matrix;
use stillflame::elements::Kind;
use stillflame::elements::ends::FeedFlow;
use stillflame::gas::{Gas, REFERENCE_TEMPERATURE, State};
use stillflame::modes::shapes::{self, Sample};
use stillflame::modes::{self, Mode, ModeList, Scan, Solved, Window};
use stillflame::numerics::analytic::{Analytic, Region};
use stillflame::numerics::isolate;

use common::census::Census;
use common::figures;
use common::random::{Drawn, Ends, Stream, Wish, draw};

const WINDOW: Window = Window {
    frequency: (0.0, 1000.0),
    growth: (-600.0, 600.0),
};

/// The networks of the campaign and smaller ones.
fn any() -> Wish {
    Wish {
        ducts: 1..=7,
        flames: 0..=2,
        ..Wish::default()
    }
}

/// Tries an identity on the networks of `count` seeds. It gives a figure that stays below its tolerance;
/// the largest is told, and held against the page of figures by name.
fn on_networks(
    name: &str,
    count: u64,
    wish: &Wish,
    identity: impl Fn(&Drawn) -> Result<f64, String> + Sync,
) -> f64 {
    let outcome: Vec<Result<f64, String>> = (0..count)
        .into_par_iter()
        .map(|seed| {
            let drawn = draw(7_000_000 + seed, wish);
            identity(&drawn).map_err(|fault| format!("{fault}\n{}", drawn.rig))
        })
        .collect();
    let faults: Vec<&String> = outcome.iter().filter_map(|o| o.as_ref().err()).collect();
    assert!(
        faults.is_empty(),
        "{} of {count} networks\n{}",
        faults.len(),
        faults[0]
    );
    let worst = outcome.into_iter().flatten().fold(0.0, f64::max);
    println!("{count} networks, worst {worst:.1e}");
    figures::count(&format!("{name} over"), count as usize);
    figures::worst(name, worst);
    worst
}

fn list(solved: &Solved) -> Result<ModeList, String> {
    let list = modes::find(solved, WINDOW, Scan::UntilCounted);
    if list.complete() {
        Ok(list)
    } else {
        Err(format!("{:?}", list.doubts))
    }
}

fn size(s: Complex64) -> f64 {
    s.norm().max(1.0)
}

fn within(what: impl Display, figure: f64, most: f64) -> Result<f64, String> {
    if figure <= most {
        Ok(figure)
    } else {
        Err(format!("{what}: {figure:e} exceeds {most:e}"))
    }
}

#[test]
fn everything_a_network_can_hold_is_drawn() {
    let mut census = Census::default();
    for seed in 0..600 {
        census.take(&draw(seed, &Wish::default()));
    }
    assert!(
        census.lacks().is_empty(),
        "never drawn: {:?}",
        census.lacks()
    );
}

#[test]
fn networks_are_those_of_their_seeds() {
    for seed in [0, 17, 401] {
        let again = |_| draw(seed, &Wish::default()).rig;
        assert_eq!(again(0), again(1));
        assert_ne!(again(0), draw(seed + 1, &Wish::default()).rig);
    }
}

/// A cut through a duct is no element: it moves no mode.
#[test]
fn a_split_duct_changes_no_mode() {
    on_networks("split", 250, &any(), |drawn| {
        let mut rng = fastrand::Rng::with_seed(drawn.seed);
        let ducts = drawn.rig.ducts();
        let at = ducts[rng.usize(0..ducts.len())];
        let fraction = 0.02 + 0.96 * rng.f64();
        let split = drawn.rig.split(at, fraction);
        let solved = modes::solve(&split.network()).map_err(|p| p.to_string())?;
        let (whole, cut) = (list(&drawn.solved)?, list(&solved)?);
        if whole.modes.len() != cut.modes.len() {
            return Err(format!("{:?}\n{:?}", whole.modes, cut.modes));
        }
        let mut worst = 0.0f64;
        for m in &whole.modes {
            let moved = cut.modes.iter().map(|n| (n.s - m.s).norm());
            let moved = moved.fold(f64::INFINITY, f64::min) / size(m.s);
            worst = worst.max(within(format!("{m:?}"), moved, 1e-10)?);
        }
        Ok(worst)
    });
}

/// Real coefficients: `D(conj s) = conj D(s)`.
#[test]
fn without_complex_coefficients_conjugates_are_conjugate() {
    let wish = Wish {
        ends: Ends::Real,
        ..any()
    };
    on_networks("conjugates", 400, &wish, |drawn| {
        let tape = &drawn.solved.acoustics.characteristic.tape;
        if !tape.is_symmetric() {
            return Err("not symmetric".to_owned());
        }
        let mut rng = fastrand::Rng::with_seed(drawn.seed);
        let mut worst = 0.0f64;
        for _ in 0..5 {
            let s = random_s(&mut rng);
            let (above, slope) = tape.value_and_slope(s);
            let (below, slope_below) = tape.value_and_slope(s.conj());
            let bounds = tape.bound(&Region::disc(s, 0.0));
            let apart = (below - above.conj()).norm() / bounds[0];
            let slopes_apart = (slope_below - slope.conj()).norm() / bounds[1];
            worst = worst.max(within(s, apart.max(slopes_apart), 1e-15)?);
        }
        Ok(worst)
    });
}

fn random_s(rng: &mut fastrand::Rng) -> Complex64 {
    Complex64::new(1200.0 * rng.f64() - 600.0, 6283.0 * rng.f64())
}

/// `det A / D` is the factor the elimination declares, at any `s`: no zero is lost, none is added.
#[test]
fn the_determinant_of_the_global_matrix_is_the_declared_multiple() {
    on_networks("determinant", 600, &any(), |drawn| {
        let acoustics = &drawn.solved.acoustics;
        let c = &acoustics.characteristic;
        let mut rng = fastrand::Rng::with_seed(drawn.seed);
        let (mut worst, mut sign) = (0.0f64, None);
        for _ in 0..4 {
            let s = random_s(&mut rng);
            let det = matrix::assemble(&acoustics.chain, s).determinant();
            let ours = c.tape.value_and_slope(s).0 * c.factor(s);
            // Near a zero of D only so much of it is determined.
            let natural = c.tape.bound(&Region::disc(s, 0.0))[0] * c.factor(s).norm();
            let (plus, minus) = ((det - ours).norm(), (det + ours).norm());
            worst = worst.max(within(s, plus.min(minus) / natural, 1e-10)?);
            if ours.norm() > 1e-6 * natural && *sign.get_or_insert(plus < minus) != (plus < minus) {
                return Err(format!("the sign changes at {s}"));
            }
        }
        Ok(worst)
    });
}

/// Mass flow is the same everywhere; enthalpy flow grows by what the flames release.
#[test]
fn the_mean_flow_conserves_mass_and_enthalpy() {
    let wish = Wish {
        stream: Stream::Flowing,
        ..any()
    };
    on_networks("conserved", 600, &wish, |drawn| {
        let mean = &drawn.solved.mean;
        let first = &mean.states[0];
        let flow = |s: &State<f64>| {
            s.pressure / (s.gas.gas_constant() * s.temperature) * s.velocity * s.area
        };
        // From the datum of sensible enthalpy, written anew where the gas is perfect.
        let enthalpy = |s: &State<f64>| {
            let sensible = match s.gas {
                Gas::Perfect {
                    gamma,
                    gas_constant,
                } => gamma * gas_constant / (gamma - 1.0) * (s.temperature - REFERENCE_TEMPERATURE),
                Gas::Air => s.gas.enthalpy(s.temperature),
            };
            sensible + 0.5 * s.velocity * s.velocity
        };
        let mut released = 0.0;
        let mut worst = 0.0f64;
        for (i, state) in mean.states.iter().enumerate() {
            released += mean.heat_release[i].unwrap_or(0.0);
            let mass = (flow(state) / flow(first) - 1.0).abs();
            worst = worst.max(within(format!("mass at station {i}"), mass, 1e-12)?);
            let excess = flow(state) * enthalpy(state) - flow(first) * enthalpy(first) - released;
            let carried = flow(state) * state.gas.cp(state.temperature) * state.temperature;
            let what = format!("enthalpy at station {i}");
            worst = worst.max(within(what, (excess / carried).abs(), 1e-12)?);
        }
        let stated = drawn
            .network
            .elements()
            .filter_map(|(id, e)| match &e.kind {
                Kind::Flame(f) => Some((id.0, drawn.network.values[f.burnt_temperature?])),
                _ => None,
            });
        for (at, t) in stated {
            let off = (mean.states[at].temperature / t - 1.0).abs();
            worst = worst.max(within("burnt temperature", off, 1e-14)?);
        }
        Ok(worst)
    });
}

/// At rest nothing feeds a mode but a flame that answers, or an end that reflects more than arrives.
#[test]
fn a_passive_network_at_rest_never_grows() {
    let wish = Wish {
        stream: Stream::Still,
        silent: true,
        ends: Ends::Passive,
        ..any()
    };
    let grown = on_networks("passive", 400, &wish, |drawn| {
        let list = list(&drawn.solved)?;
        let growth = |m: &Mode| m.growth() / size(m.s);
        let fastest = list.modes.iter().map(growth).fold(0.0, f64::max);
        within("growth", fastest, 1e-9)
    });
    assert!(grown <= 1e-9);
}

/// As the Mach number goes to zero every mode goes to one of the still gas, at least linearly:
/// halving it halves the distance. Entropy is mixed out, since carried entropy has no still limit.
#[test]
fn modes_go_linearly_to_those_of_still_gas() {
    const FIRST: f64 = 2e-4;
    let wish = Wish {
        stream: Stream::Variable,
        carried: false,
        ..any()
    };
    on_networks("still", 250, &wish, |drawn| {
        let Kind::Feed(feed) = &drawn.network.layout.elements[0].kind else {
            return Err("no feed".to_owned());
        };
        let FeedFlow::Mach(knob) = feed.flow else {
            return Err("no Mach number at the feed".to_owned());
        };
        // The fastest station sets how far from rest the network is.
        let states = &drawn.solved.mean.states;
        let fastest = states.iter().map(State::mach).fold(0.0, f64::max);
        let per_mach = drawn.network.values[knob] / fastest;
        let at = |mach: f64| {
            let network = drawn.network.with(knob, mach * per_mach);
            modes::solve(&network).map_err(|p| p.to_string())
        };
        let (rest, half, whole) = (at(0.0)?, at(0.5 * FIRST)?, at(FIRST)?);
        let mut worst = 0.0f64;
        for m in list(&rest)?.modes {
            let follow = |solved: &Solved| {
                let tape = &solved.acoustics.characteristic.tape;
                isolate::newton(tape, m.s, 300.0, &mut 0).ok_or("lost a mode")
            };
            let (near, far) = (follow(&half)?, follow(&whole)?);
            let (near, far) = ((near - m.s).norm(), (far - m.s).norm());
            if far > 1e-7 * size(m.s) {
                let excess = near / far - 0.5;
                worst = worst.max(within(format!("{m:?} {near:e} {far:e}"), excess, 0.02)?);
            }
        }
        Ok(worst)
    });
}

/// Acoustic power (Cantrell & Hart 1964, J. Acoust. Soc. Am. 36), averaged over a period: in each duct
/// the energy stored grows by what flows in,
///
/// ```text
/// I = p'u'(1 + M^2) + M (p'^2/(rho c) + rho c u'^2)
/// E = p'^2/(2 rho c^2) + rho u'^2/2 + M p'u'/c
/// 2 sigma integral E dx = I(in) - I(out)
/// ```
#[test]
fn acoustic_power_balances_in_every_duct() {
    on_networks("power", 250, &any(), |drawn| {
        let network = &drawn.network;
        let mut worst = 0.0f64;
        for mode in list(&drawn.solved)?.modes {
            // The null vector is exact to rounding of its largest wave, beside which pressure may be small.
            let null = modes::shape(&drawn.solved, &mode).ok_or("no null vector")?;
            let loudest = null.waves.iter().flatten().map(|w| w.norm());
            let noise = 1e-14 * loudest.fold(0.0, f64::max);
            let Some(shape) = shapes::along(network, &drawn.solved, &mode) else {
                // A flame at a pressure node, or still gas that flows to and fro at zero frequency.
                let pressure = null.waves.iter().map(|[a, b, _]| (a + b).norm());
                let pressure = pressure.fold(0.0, f64::max);
                within(format!("no shape of {mode:?}"), pressure, 1e6 * noise)?;
                continue;
            };
            let mut rest = shape.along.as_slice();
            while let Some(first) = rest.first() {
                let id = first.element;
                let count = rest.iter().take_while(|a| a.element == id).count();
                let (duct, others) = rest.split_at(count);
                rest = others;
                let inlet = network.layout.inlet(id).ok_or("no inlet")?;
                let (before, behind) = (&shape.stations[inlet.0], &shape.stations[inlet.0 + 1]);
                let state = &drawn.solved.mean.states[inlet.0];
                let stored = 2.0 * mode.growth() * energy(state, duct);
                let (enters, leaves) = (intensity(state, before), intensity(state, behind));
                let flux = gross(state, before).max(gross(state, behind));
                let error = (stored - (enters - leaves)).abs() / flux;
                let what = format!("{} at {mode:?}", network.layout.elements[id.0].name);
                let (rho, c, _) = of_state(state);
                let most = 1e-8 + noise / (flux * 2.0 * rho * c).sqrt();
                worst = worst.max(within(what, error, most)?);
            }
        }
        Ok(worst)
    });
}

/// Density (kg/m^3), sound speed (m/s) and Mach number.
fn of_state(state: &State<f64>) -> (f64, f64, f64) {
    (state.density(), state.sound_speed(), state.mach())
}

/// W/m^2.
fn intensity(state: &State<f64>, at: &Sample) -> f64 {
    let (rho, c, m) = of_state(state);
    let (p, u) = (at.pressure, at.velocity);
    let product = 0.5 * (p * u.conj()).re;
    let (pp, uu) = (0.5 * p.norm_sqr(), 0.5 * u.norm_sqr());
    product * (1.0 + m * m) + m * (pp / (rho * c) + rho * c * uu)
}

/// What both waves carry, without sign (W/m^2).
fn gross(state: &State<f64>, at: &Sample) -> f64 {
    let (rho, c, m) = of_state(state);
    let (pp, uu) = (at.pressure.norm_sqr(), at.velocity.norm_sqr());
    0.25 * (1.0 + m * m) * (pp / (rho * c) + rho * c * uu)
}

/// Energy along a duct over its area (J/m^2), exact for waves that vary exponentially between places.
fn energy(state: &State<f64>, places: &[Sample]) -> f64 {
    let (rho, c, m) = of_state(state);
    let waves = |at: &Sample| {
        let half = at.velocity * (rho * c * 0.5);
        (at.pressure * 0.5 + half, at.pressure * 0.5 - half)
    };
    let mut total = 0.0;
    for pair in places.windows(2) {
        let dx = pair[1].position - pair[0].position;
        let ((plus, minus), (next_plus, next_minus)) = (waves(&pair[0]), waves(&pair[1]));
        let pp = mean(plus.norm_sqr().into(), next_plus.norm_sqr().into()).re;
        let mm = mean(minus.norm_sqr().into(), next_minus.norm_sqr().into()).re;
        let pm = mean(plus * minus.conj(), next_plus * next_minus.conj()).re;
        // p = p+ + p-, rho c u = p+ - p-.
        let (p_p, u_u, p_u) = (pp + mm + 2.0 * pm, pp + mm - 2.0 * pm, pp - mm);
        let density =
            p_p / (2.0 * rho * c * c) + u_u / (2.0 * rho * c * c) + m * p_u / (rho * c * c);
        total += 0.5 * density * dx;
    }
    total
}

/// Mean of `a exp(k x)` over a stretch from `a` to `b`.
fn mean(a: Complex64, b: Complex64) -> Complex64 {
    let k = (b / a).ln();
    if !k.is_finite() {
        return (a + b) * 0.5;
    }
    if k.norm() < 1e-3 {
        return a * (1.0 + k / 2.0 + k * k / 6.0 + k * k * k / 24.0);
    }
    (b - a) / k
}
