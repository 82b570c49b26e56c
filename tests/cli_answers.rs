//! `check`, `flow` and `modes` of the real binary.

#[path = "common/cli.rs"]
mod cli;

use std::path::PathBuf;

use cli::{NETWORKS, json, network, run};
use serde_json::Value;

fn numbers(value: &Value) -> Vec<f64> {
    let items = value.as_array().unwrap();
    items.iter().map(|v| v.as_f64().unwrap()).collect()
}

fn f(value: &Value, field: &str) -> f64 {
    value[field]
        .as_f64()
        .unwrap_or_else(|| panic!("{field}: {value}"))
}

/// A network file of the test's own.
fn written(folder: &tempfile::TempDir, text: &str) -> PathBuf {
    let path = folder.path().join("own.toml");
    std::fs::write(&path, text).unwrap();
    path
}

/// Still air in one duct, closed at one end and open at the other.
const QUARTER_WAVE: &str = r#"
title = "A tube, closed and open (invented)"
[search]
frequency = "0 to 1000 Hz"
growth = "-100 to 100 1/s"
[feed]
gas = { gamma = 1.4, gas_constant = "287 J/(kg K)" }
mass_flow = "0 kg/s"
temperature = "300 K"
pressure = "101325 Pa"
end = "closed"
[[element]]
name = "tube"
kind = "duct"
length = "0.5 m"
diameter = "50 mm"
[exit]
end = "open"
"#;

#[test]
fn every_network_is_sound() {
    for name in NETWORKS {
        let ran = run("check", &network(name), &[]);
        assert_eq!(ran.code, Some(0), "{name}: {}", ran.stderr);
        let line = ran.stdout.lines().find(|l| l.starts_with("sound:"));
        let line = line.unwrap_or_else(|| panic!("{}", ran.stdout));
        for word in ["element", "K behind it", "window", "Hz", "1/s"] {
            assert!(line.contains(word), "{line}");
        }
        assert!(
            ran.stdout
                .contains("Caution: Predictions are for screening")
        );
        assert!(ran.stderr.is_empty());
        let (value, code) = json("check", &network(name), &[]);
        assert_eq!((value["sound"].as_bool(), code), (Some(true), Some(0)));
        assert_eq!(value["schema"], "stillflame/check");
    }
    let (value, _) = json("check", &network("twenty_elements"), &[]);
    assert_eq!(value["elements"], 20);
    assert_eq!(value["flames"].as_array().unwrap().len(), 2);
}

#[test]
fn flow_tells_both_sides_of_every_element_in_si() {
    const FIELDS: [&str; 7] = [
        "pressure_pa",
        "temperature_k",
        "velocity_m_s",
        "mach",
        "sound_speed_m_s",
        "density_kg_m3",
        "area_m2",
    ];
    for name in NETWORKS {
        let (value, code) = json("flow", &network(name), &[]);
        assert_eq!(
            (&value["schema"], code),
            (&"stillflame/flow".into(), Some(0))
        );
        let stations = value["stations"].as_array().unwrap();
        assert_eq!(
            (&stations[0]["element"], &stations[0]["side"]),
            (&"feed".into(), &"out".into())
        );
        let last = stations.last().unwrap();
        assert_eq!(
            (&last["element"], &last["side"]),
            (&"exit".into(), &"in".into())
        );
        // An outlet and the inlet after it are one plane; between the ends each element has both.
        assert_eq!(stations.len() % 2, 0);
        for pair in stations.chunks(2) {
            assert_eq!(
                (&pair[0]["side"], &pair[1]["side"]),
                (&"out".into(), &"in".into())
            );
            let first =
                f(&pair[0], "density_kg_m3") * f(&pair[0], "velocity_m_s") * f(&pair[0], "area_m2");
            assert!(
                (first - f(&value, "mass_flow_kg_s")).abs() <= 1e-12 * first.abs(),
                "{name}"
            );
            for field in FIELDS {
                assert_eq!(pair[0][field].as_f64(), pair[1][field].as_f64());
                assert!(f(&pair[0], field).is_finite());
            }
            let mach = f(&pair[0], "velocity_m_s") / f(&pair[0], "sound_speed_m_s");
            assert!((mach - f(&pair[0], "mach")).abs() < 1e-14);
        }
    }
    let (value, _) = json("flow", &network("pressurised_rig"), &[]);
    assert!(f(&value, "throat_area_m2") > 0.0);
    assert_eq!(value["heat_release"][0]["element"], "main_flame");
    // The numbers of the file come back to the last digit.
    assert_eq!(f(&value["stations"][0], "pressure_pa"), 8e5);
    assert_eq!(f(&value["stations"][0], "temperature_k"), 650.0);
}

#[test]
fn flow_for_people_is_in_engineers_units() {
    let ran = run("flow", &network("pressurised_rig"), &[]);
    assert_eq!(ran.code, Some(0));
    for text in [
        "kPa",
        "cm^2",
        "800.000",
        "MW",
        "Throat of the exit",
        "it follows from the flow",
    ] {
        assert!(ran.stdout.contains(text), "{text}: {}", ran.stdout);
    }
    assert!(!ran.stdout.contains("NaN"));
    let swirl = run("flow", &network("swirl_rig"), &["--set", "exit.end = open"]);
    assert!(!swirl.stdout.contains("Throat"));
}

#[test]
fn every_list_is_complete_and_sorted() {
    for name in NETWORKS {
        let (value, code) = json("modes", &network(name), &[]);
        assert_eq!(
            (&value["schema"], code),
            (&"stillflame/modes".into(), Some(0)),
            "{name}"
        );
        assert_eq!(value["complete"], true);
        let modes = value["modes"].as_array().unwrap();
        assert_eq!(value["expected"].as_u64(), Some(modes.len() as u64));
        assert!(modes.len() >= 3);
        let mut last = 0.0;
        for mode in modes {
            let (frequency, growth) = (f(mode, "frequency_hz"), f(mode, "growth_per_s"));
            assert!(frequency >= last);
            last = frequency;
            let size = growth.hypot(std::f64::consts::TAU * frequency);
            assert!(f(mode, "error_bound_per_s") < 1e-8 * size);
            assert!((f(mode, "cycle_increment") - growth / frequency).abs() <= 1e-14);
            assert!((f(mode, "damping_ratio") + growth / size).abs() <= 1e-14);
            assert_eq!(mode["multiplicity"], 1);
            assert!(f(mode, "residual") < 1e-10, "{name}: {mode}");
        }
    }
}

/// Frequencies `(2k + 1) c/(4 L)` of a tube closed at one end: a textbook relation.
#[test]
fn a_quarter_wave_tube_rings_at_its_odd_harmonics() {
    let folder = tempfile::tempdir().unwrap();
    let path = written(&folder, QUARTER_WAVE);
    let (value, code) = json("modes", &path, &["--fail-on-growth"]);
    // Neither grows nor decays: neutral within the error bound, which is no growth.
    assert_eq!(code, Some(0));
    let modes = value["modes"].as_array().unwrap();
    let c = (1.4f64 * 287.0 * 300.0).sqrt();
    assert_eq!(modes.len(), 3);
    for (k, mode) in modes.iter().enumerate() {
        let expected = (2 * k + 1) as f64 * c / 2.0;
        assert!((f(mode, "frequency_hz") - expected).abs() < 1e-8 * expected);
        assert!(f(mode, "growth_per_s").abs() < 1e-8 * expected);
        assert_eq!(mode["tendency"], "neutral");
    }
    // p' falls as a cosine from the closed end, rho c u' rises as a sine.
    let (value, _) = json("modes", &path, &["--shapes"]);
    let density = 101_325.0 / (287.0 * 300.0);
    for (k, mode) in value["modes"].as_array().unwrap().iter().enumerate() {
        let along = mode["shape"]["along"].as_array().unwrap();
        assert!(along.len() >= 17);
        for place in along {
            let angle =
                (2 * k + 1) as f64 * std::f64::consts::FRAC_PI_2 * f(place, "position_m") / 0.5;
            assert!((f(place, "pressure_amplitude_pa") - angle.cos().abs()).abs() < 1e-9);
            let u = f(place, "velocity_amplitude_m_s") * density * c;
            assert!((u - angle.sin().abs()).abs() < 1e-9);
        }
        let stations = mode["shape"]["stations"].as_array().unwrap();
        assert_eq!(stations.len(), 4);
        assert_eq!(stations[0]["side"], "out");
    }
    let (none, code) = json("modes", &path, &["--frequency", "10 to 50 Hz"]);
    assert_eq!(
        (none["complete"].as_bool(), none["expected"].as_u64(), code),
        (Some(true), Some(0), Some(0))
    );
}

#[test]
fn a_root_without_frequency_has_no_cycle_increment() {
    // A long plenum tube behind a loss empties without oscillating.
    let folder = tempfile::tempdir().unwrap();
    let text = QUARTER_WAVE
        .replace(
            "end = \"closed\"",
            "end = \"reflection\"\ncoefficient = 0.5",
        )
        .replace("end = \"open\"", "end = \"reflection\"\ncoefficient = 0.5")
        .replace("-100 to 100", "-900 to 100");
    let (value, code) = json("modes", &written(&folder, &text), &[]);
    assert_eq!(code, Some(0));
    let first = &value["modes"][0];
    // exp(2 s L/c) = 1/4 on the real axis: s = c ln(1/4)/(2 L).
    let c = (1.4f64 * 287.0 * 300.0).sqrt();
    assert_eq!(f(first, "frequency_hz"), 0.0);
    assert!((f(first, "growth_per_s") - c * 0.25f64.ln()).abs() < 1e-8 * c);
    assert!(first["cycle_increment"].is_null());
    let csv_text = run("modes", &written(&folder, &text), &[]).stdout;
    assert!(csv_text.contains("none"), "{csv_text}");
}

#[test]
fn growth_can_be_made_to_fail() {
    let grows = run("modes", &network("swirl_rig"), &["--fail-on-growth"]);
    assert_eq!(grows.code, Some(3));
    assert!(grows.stdout.contains("1 mode grows"));
    assert_eq!(run("modes", &network("swirl_rig"), &[]).code, Some(0));
    let decays = run("modes", &network("twenty_elements"), &["--fail-on-growth"]);
    assert_eq!(decays.code, Some(0));
    assert!(decays.stdout.contains("No mode found in the window grows"));
    // Growth that the window leaves out is no less dangerous.
    let hidden = ["--fail-on-growth", "--growth", "-300 to 20 1/s"];
    let hidden = run("modes", &network("swirl_rig"), &hidden);
    assert_eq!(hidden.code, Some(3));
    assert!(
        hidden
            .stdout
            .contains("faster than the window's upper edge")
    );
}

#[test]
fn a_mode_on_the_edge_leaves_the_list_unproved() {
    let (value, _) = json("modes", &network("swirl_rig"), &[]);
    let edge = f(&value["modes"][3], "frequency_hz");
    let window = format!("20 to {edge} Hz");
    let (value, code) = json("modes", &network("swirl_rig"), &["--frequency", &window]);
    assert_eq!((value["complete"].as_bool(), code), (Some(false), Some(1)));
    assert!(!value["doubts"].as_array().unwrap().is_empty());
    assert!(
        value["warnings"]
            .to_string()
            .contains("of the window's edge")
    );
    let ran = run("modes", &network("swirl_rig"), &["--frequency", &window]);
    assert!(ran.stdout.contains("NOT PROVED COMPLETE"));
}

#[test]
fn the_window_and_the_numbers_can_be_set() {
    let narrow = [
        "--frequency",
        "100 to 400 Hz",
        "--growth",
        "-0.2 1/ms to 300 1/s",
    ];
    let (value, code) = json("modes", &network("swirl_rig"), &narrow);
    assert_eq!(code, Some(0));
    assert_eq!(numbers(&value["window"]["frequency_hz"]), [100.0, 400.0]);
    assert_eq!(numbers(&value["window"]["growth_per_s"]), [-200.0, 300.0]);
    let (all, _) = json("modes", &network("swirl_rig"), &[]);
    let inside: Vec<&Value> = all["modes"]
        .as_array()
        .unwrap()
        .iter()
        .filter(|m| (100.0..400.0).contains(&f(m, "frequency_hz")))
        .collect();
    let narrow = value["modes"].as_array().unwrap();
    assert_eq!(narrow.len(), inside.len());
    for (a, b) in narrow.iter().zip(inside) {
        assert!((f(a, "frequency_hz") - f(b, "frequency_hz")).abs() < 1e-9);
    }
    let set = [
        "--set",
        "main_flame.delay = 2 ms",
        "--set",
        "chamber.length = 0.9 m",
    ];
    let (other, code) = json("modes", &network("swirl_rig"), &set);
    assert_eq!(code, Some(0));
    assert_ne!(other["modes"], all["modes"]);
}

#[test]
fn what_qualifies_an_answer_goes_with_it() {
    let said = |arguments: &[&str], name: &str, words: &[&str]| {
        let (value, _) = json("modes", &network(name), arguments);
        let text = value["warnings"].to_string();
        let report = run("modes", &network(name), arguments).stdout;
        for word in words {
            assert!(text.contains(word), "{word}: {text}");
            assert!(report.contains(word), "{word}: {report}");
        }
    };
    said(
        &["--frequency", "20 to 3000 Hz"],
        "swirl_rig",
        &["first cut-on of `plenum`", "at 2035 Hz"],
    );
    said(
        &["--set", "dump.effective_length = 80 mm"],
        "swirl_rig",
        &["`dump` is not compact at 800 Hz"],
    );
    said(
        &[],
        "twenty_elements",
        &["`vessel` is not compact at 700 Hz"],
    );
    said(&[], "staged_flame", &["growth rate times delay exceeds 1"]);
    said(&[], "flame_in_tube", &["damping rests on the ends alone"]);
    said(
        &["--set", "feed.mass_flow = 120 g/s"],
        "swirl_rig",
        &["loss-free"],
    );
    said(
        &["--set", "main_flame.spread = 2 ms"],
        "pressurised_rig",
        &["more than a third"],
    );
    let (value, _) = json("modes", &network("staged_flame"), &[]);
    let warning = &value["warnings"][0];
    assert_eq!(warning["subject"], "main_flame.response.2.delay");
    assert!(
        warning["file"]
            .as_str()
            .unwrap()
            .ends_with("staged_flame.toml")
    );
    assert!(warning["line"].is_u64() && warning["column"].is_u64());
    assert!(warning["message"].is_string() && warning["hint"].is_string());
}

#[test]
fn files_go_where_they_are_asked_for_and_say_the_same() {
    let folder = tempfile::tempdir().unwrap();
    let out = folder.path().join("new").join("results");
    let out_text = out.to_str().unwrap();
    let ran = run(
        "modes",
        &network("swirl_rig"),
        &["--shapes", "--out", out_text],
    );
    assert_eq!(ran.code, Some(0), "{}", ran.stderr);
    let csv = std::fs::read_to_string(out.join("swirl_rig_modes.csv")).unwrap();
    let mut reader = csv::Reader::from_reader(csv.as_bytes());
    assert_eq!(&reader.headers().unwrap()[0], "frequency_hz");
    let (value, _) = json("modes", &network("swirl_rig"), &[]);
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    assert_eq!(rows.len(), value["modes"].as_array().unwrap().len());
    for (row, mode) in rows.iter().zip(value["modes"].as_array().unwrap()) {
        assert_eq!(row[0].parse::<f64>().unwrap(), f(mode, "frequency_hz"));
        assert_eq!(row[1].parse::<f64>().unwrap(), f(mode, "growth_per_s"));
    }
    let shapes = std::fs::read_to_string(out.join("swirl_rig_shapes.csv")).unwrap();
    assert!(shapes.starts_with("mode,frequency_hz,growth_per_s,element,side,position_m"));
    for name in ["swirl_rig_modes.csv", "swirl_rig_shapes.csv"] {
        assert!(ran.stdout.contains(name));
    }
    let flow = run(
        "flow",
        &network("swirl_rig"),
        &["--json", "--out", out_text],
    );
    assert!(flow.stderr.contains("swirl_rig_flow.csv"));
    assert!(serde_json::from_str::<Value>(&flow.stdout).is_ok());
    let names: Vec<_> = std::fs::read_dir(&out)
        .unwrap()
        .map(|e| e.unwrap().file_name())
        .collect();
    // Two lists, the flow, and a picture of each mode.
    assert_eq!(names.len(), 3 + rows.len(), "{names:?}");
}

/// Two points cannot see what grows between them; the mode that enters the window while it grows tells.
#[test]
fn growth_between_the_points_of_a_sweep_is_not_called_excluded() {
    let more = [
        "--vary",
        "main_flame.delay = 2.5 ms to 6.3 ms",
        "--growth",
        "-50 to 20 1/s",
        "--frequency",
        "250 to 350 Hz",
        "--points",
        "2",
    ];
    let (value, _) = json("sweep", &network("swirl_rig"), &more);
    assert_eq!(value["growth_excluded_beyond"], false);
    assert!(
        value["growth_outside"]
            .as_str()
            .unwrap()
            .contains("NOT EXCLUDED")
    );
}

/// A list without a count says nothing of growth outside, however that search came out.
#[test]
fn without_a_count_growth_outside_is_not_called_excluded() {
    let wide = ["--growth", "-1e5 to 1e5 1/s"];
    let (value, code) = json("modes", &network("swirl_rig"), &wide);
    assert_eq!(code, Some(1));
    assert!(value["expected"].is_null());
    assert_eq!(value["growth_excluded_beyond"], false);
    assert!(value["growth_not_excluded_because"].is_string());
    let text = run("modes", &network("swirl_rig"), &wide).stdout;
    assert!(!text.contains("is excluded") && text.contains("NOT EXCLUDED"));
    // With one it is.
    let (value, _) = json("modes", &network("swirl_rig"), &[]);
    assert_eq!(value["growth_excluded_beyond"], true);
    assert!(value["growth_not_excluded_because"].is_null());
}

/// Beyond the growth rate up to which was searched, a response with a spread has modes ahead of its cause: a sweep
/// does not follow into there, and what it calls unstable is what its points know of.
#[test]
fn growth_beyond_what_was_searched_is_not_told_as_unstable() {
    let vary = "main_flame.delay = 0.5 ms to 10 ms";
    let more = ["--vary", vary, "--points", "41"];
    let (value, code) = json("sweep", &network("twenty_elements"), &more);
    assert_eq!(code, Some(0));
    assert!(
        value["growth_outside_window_per_s"]
            .as_array()
            .unwrap()
            .iter()
            .all(Value::is_null)
    );
    for branch in value["branches"].as_array().unwrap() {
        assert!(
            branch["largest_growth_per_s"].as_f64().unwrap() < 0.0,
            "{branch}"
        );
    }
    assert!(
        value["unstable"].as_array().unwrap().is_empty(),
        "{}",
        value["unstable"]
    );
    assert!(value["finding"].as_str().unwrap().starts_with("No mode"));
    assert_eq!(value["growth_excluded_beyond"], false);
}
