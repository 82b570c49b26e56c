//! Modes of whole networks against values found outside the project.
//!
//! - `tests/data/closed_form.json`: closed dispersion relations, solved in 40-digit arithmetic; formula
//!   and source stand in each case.
//! - `tests/data/witness_modes.json`: invented random networks solved by the independent global-matrix
//!   solver in `tests/yardstick/` with mpmath.

mod common;

use std::path::{Path, PathBuf};

use num_complex::Complex64;
use serde_json::Value;
use stillflame::gas::State;
use stillflame::modes::{self, ModeList, Scan, Window};
use stillflame::{input, meanflow};

use common::figures;

/// Demanded of every eigenvalue, relative to its modulus.
const TOLERANCE: f64 = 1e-8;

fn data(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("tests/data")
        .join(name)
}

fn json(name: &str) -> Value {
    serde_json::from_str(&std::fs::read_to_string(data(name)).unwrap()).unwrap()
}

fn eigenvalue(v: &Value) -> Complex64 {
    let part = |key: &str| v[key].as_str().unwrap().parse::<f64>().unwrap();
    Complex64::new(part("s_re"), part("s_im"))
}

fn modes_of(name: &str, toml: &str) -> ModeList {
    let loaded = input::parse(name, toml, &[]).unwrap_or_else(|p| panic!("{name}:\n{p}"));
    let solved = modes::solve(&loaded.network).unwrap_or_else(|p| panic!("{name}:\n{p}"));
    let window = Window::of(&loaded.network, &solved.mean).unwrap();
    modes::find(&solved, window, Scan::Whole)
}

/// Each expected eigenvalue has a mode within tolerance, and there are no others. Returns the
/// largest relative difference.
fn compare(name: &str, list: &ModeList, exact: &[(Complex64, usize)]) -> Result<f64, String> {
    if !list.complete() {
        return Err(format!("{name}: {:?}", list.doubts));
    }
    let total: usize = exact.iter().map(|(_, m)| m).sum();
    if list.expected != Some(total) {
        return Err(format!(
            "{name}: expected {:?}, outside {total}\n{:#?}",
            list.expected, list.modes
        ));
    }
    let mut worst = 0.0f64;
    for (s, multiplicity) in exact {
        let nearest = list
            .modes
            .iter()
            .min_by(|a, b| (a.s - s).norm().total_cmp(&(b.s - s).norm()))
            .ok_or_else(|| format!("{name}: no modes"))?;
        let difference = (nearest.s - s).norm() / s.norm().max(1.0);
        if difference > TOLERANCE {
            return Err(format!(
                "{name}: {s} differs from {} by {difference:e}",
                nearest.s
            ));
        }
        if usize::from(nearest.multiplicity) != *multiplicity {
            return Err(format!("{name}: {s} multiplicity {}", nearest.multiplicity));
        }
        if difference > 1e-12 {
            println!(
                "{name}: {s} differs by {difference:.1e}, bound {:.1e}",
                nearest.error_bound / s.norm()
            );
        }
        worst = worst.max(difference);
    }
    Ok(worst)
}

#[test]
fn closed_dispersion_relations() {
    let all = json("closed_form.json");
    let cases = all["cases"].as_object().unwrap();
    assert_eq!(cases.len(), 12);
    let mut faults = Vec::new();
    for (name, case) in cases {
        let toml = std::fs::read_to_string(data(case["network"].as_str().unwrap())).unwrap();
        let list = modes_of(name, &toml);
        let count = case["count"].as_u64().unwrap() as usize;
        let values: Vec<Complex64> = case["eigenvalues"]
            .as_array()
            .unwrap()
            .iter()
            .map(eigenvalue)
            .collect();
        // A case may list fewer eigenvalues than its window holds: then one is double.
        let double = count == values.len() + 1 && values.len() == 1;
        let exact: Vec<_> = values
            .into_iter()
            .map(|s| (s, if double { 2 } else { 1 }))
            .collect();
        match compare(name, &list, &exact) {
            Ok(worst) => println!(
                "{name}: {} modes, largest difference {worst:.1e}",
                exact.len()
            ),
            Err(fault) => faults.push(fault),
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn fifty_networks_of_the_independent_solver() {
    let all = json("witness_modes.json");
    let networks = all["networks"].as_array().unwrap();
    assert_eq!(networks.len(), 50);
    let mut faults = Vec::new();
    let mut worst = 0.0f64;
    let mut total = 0;
    for network in networks {
        let name = network["id"].as_str().unwrap();
        let list = modes_of(name, network["toml"].as_str().unwrap());
        let exact: Vec<_> = network["modes"]
            .as_array()
            .unwrap()
            .iter()
            .map(|m| (eigenvalue(m), m["multiplicity"].as_u64().unwrap() as usize))
            .collect();
        total += exact.len();
        match compare(name, &list, &exact) {
            Ok(difference) => worst = worst.max(difference),
            Err(fault) => faults.push(format!("{}\n  {fault}", network["about"])),
        }
    }
    println!(
        "{} networks, {total} modes, largest difference {worst:.1e}",
        networks.len()
    );
    assert!(
        faults.is_empty(),
        "{} faults\n{}",
        faults.len(),
        faults.join("\n")
    );
}

/// Every station of the same networks: pressure, temperature, velocity, density, sound speed, Mach number.
#[test]
fn the_mean_flow_of_fifty_networks() {
    /// Relative.
    const MOST: f64 = 1e-12;
    type Quantity = (&'static str, fn(&State<f64>) -> f64);
    let quantities: [Quantity; 7] = [
        ("pressure_pa", |s| s.pressure),
        ("temperature_k", |s| s.temperature),
        ("velocity_m_s", |s| s.velocity),
        ("density_kg_m3", State::density),
        ("sound_speed_m_s", State::sound_speed),
        ("mach", State::mach),
        ("area_m2", |s| s.area),
    ];
    let all = json("witness_modes.json");
    let (mut stations, mut worst) = (0, 0.0f64);
    for network in all["networks"].as_array().unwrap() {
        let name = network["id"].as_str().unwrap();
        let loaded = input::parse(name, network["toml"].as_str().unwrap(), &[]).unwrap();
        let mean = meanflow::solve(&loaded.network).unwrap();
        let layout = &loaded.network.layout;
        for there in network["mean_flow"].as_array().unwrap() {
            let element = layout.element(there["element"].as_str().unwrap()).unwrap();
            let station = match there["side"].as_str() {
                Some("in") => layout.inlet(element),
                _ => layout.outlet(element),
            };
            let here = mean.state(station.unwrap()).unwrap();
            for (key, of) in quantities {
                let exact: f64 = there[key].as_str().unwrap().parse().unwrap();
                let difference = (of(here) - exact).abs() / exact.abs().max(f64::MIN_POSITIVE);
                let difference = if exact == 0.0 {
                    of(here).abs()
                } else {
                    difference
                };
                assert!(
                    difference < MOST,
                    "{name}, {}, {}: {key} differs by {difference:e}",
                    there["element"],
                    there["side"]
                );
                worst = worst.max(difference);
            }
            stations += 1;
        }
    }
    println!("{stations} stations, largest difference {worst:.1e}");
    figures::count("stations over", stations);
    figures::worst("stations", worst);
    assert!(stations > 500);
}

/// Rounding of coefficients, magnified by slow entropy in modes that decay fast: what an error says must hold the
/// modes in 45 digits. `tests/data/blurred_modes.json`: random networks (invented) picked because the determinant of
/// their global matrix disagreed; modes by `tests/yardstick/witness.py --json`.
#[test]
fn errors_hold_modes_that_rounding_of_coefficients_moves() {
    let all = json("blurred_modes.json");
    let mut moved = 0;
    for case in all["cases"].as_array().unwrap() {
        let name = case["name"].as_str().unwrap();
        let list = modes_of(name, case["network"].as_str().unwrap());
        let exact = case["modes"].as_array().unwrap();
        assert_eq!(list.modes.len(), exact.len(), "{name}");
        for s in exact {
            let s = Complex64::new(s[0].as_f64().unwrap(), s[1].as_f64().unwrap());
            let off = |m: &&modes::Mode| (m.s - s).norm();
            let nearest = list.modes.iter().min_by(|a, b| off(a).total_cmp(&off(b)));
            let mode = nearest.unwrap();
            let off = off(&mode);
            // The numbers of the data end somewhere.
            assert!(
                off <= mode.error_bound + 1e-13 * s.norm(),
                "{name}: {mode:?} is {off:e} from {s}"
            );
            moved += usize::from(off > 1e-9 * s.norm());
        }
    }
    assert!(moved >= 4, "{moved} modes are blurred");
}
