//! Gas properties against values from outside the project.

use stillflame::gas::{Gas, State, choked_flux};

/// Rows of a data file: comment lines and the header dropped.
fn rows(data: &str) -> Vec<Vec<f64>> {
    data.lines()
        .filter(|l| !l.starts_with('#'))
        .skip(1)
        .map(|l| l.split(',').map(|c| c.parse().unwrap()).collect())
        .collect()
}

/// US Standard Atmosphere 1976 / ISO 2533, with the standard's own constants: 1e-5.
#[test]
fn sound_speed_of_the_standard_atmosphere() {
    let air = Gas::Perfect {
        gamma: 1.4,
        gas_constant: 8314.32 / 28.9644,
    };
    let rows = rows(include_str!("data/standard_atmosphere.csv"));
    assert_eq!(rows.len(), 12);
    for r in rows {
        assert!((air.sound_speed(r[1]) / r[2] - 1.0).abs() < 1e-5, "{r:?}");
    }
}

/// Dry air by mixture polynomials: 0.3 % (0.5 % at 250 K) of an equation of state (CoolProp 8.0.0)
/// and of two polynomial sets (Cantera 3.2.0). The composition there differs in the fourth decimal of
/// carbon dioxide. The same polynomial set must agree much better: 5e-5.
#[test]
fn dry_air_from_250_to_2000_kelvin() {
    let air = Gas::<f64>::Air;
    let rows = rows(include_str!("data/dry_air.csv"));
    assert_eq!(rows.len(), 23);
    for r in rows {
        let t = r[0];
        let own = [air.cp(t), air.gamma(t), air.sound_speed(t)];
        for (source, wide) in r[1..].chunks(3).zip([true, true, false]) {
            let tolerance = match (wide, t <= 250.0) {
                (true, true) => 5e-3,
                (true, false) => 3e-3,
                (false, _) => 5e-5,
            };
            for (a, b) in own.iter().zip(source) {
                assert!((a / b - 1.0).abs() < tolerance, "{a} against {b} at {t} K");
            }
        }
    }
}

/// Isentropic flow of a perfect gas with gamma 1.4, as tabulated in NACA Report 1135 (1953); the
/// four-figure values are from memory.
#[test]
fn isentropic_flow_tables() {
    let gas = Gas::Perfect {
        gamma: 1.4,
        gas_constant: 287.0,
    };
    for (mach, pressure, temperature) in [
        (0.3, 0.9395, 0.9823),
        (0.5, 0.8430, 0.9524),
        (0.8, 0.6560, 0.8865),
    ] {
        let s = State {
            gas,
            pressure: 1e5,
            temperature: 300.0,
            velocity: mach * gas.sound_speed(300.0),
            area: 1.0,
        };
        assert!(
            (s.pressure / s.stagnation_pressure() - pressure).abs() < 6e-5,
            "M = {mach}"
        );
        assert!((s.temperature / s.stagnation_temperature() - temperature).abs() < 6e-5);
    }
}

/// Choked flow of air: `mdot sqrt(T_t)/(A p_t) = 0.0404 s sqrt(K)/m` with gamma 1.4 and
/// R 287 J/(kg K), a handbook figure (common practice, from memory); A/A* = 2.0351 at M = 0.3 (NACA
/// Report 1135, from memory).
#[test]
fn choked_flow_parameter() {
    let gas = Gas::Perfect {
        gamma: 1.4,
        gas_constant: 287.0,
    };
    let g = choked_flux(&gas, 101_325.0, 288.15);
    assert!((g * 288.15f64.sqrt() / 101_325.0 - 0.0404).abs() < 5e-5);
    let s = State {
        gas,
        pressure: 1e5,
        temperature: 300.0,
        velocity: 0.3 * gas.sound_speed(300.0),
        area: 1.0,
    };
    let throat =
        s.mass_flow() / choked_flux(&gas, s.stagnation_pressure(), s.stagnation_temperature());
    assert!((1.0 / throat - 2.0351).abs() < 6e-5);
}
