//! `sweep` of the real binary.

#[path = "common/cli.rs"]
mod cli;

use cli::{NETWORKS, command, json, network, run};
use serde_json::Value;

const DELAY: &str = "main_flame.delay = 1 ms to 8 ms";

/// A run whose files go into a folder that is thrown away.
fn in_scratch(verb: &str, name: &str, more: &[&str]) -> cli::Ran {
    let folder = tempfile::tempdir().unwrap();
    let out = ["--out", folder.path().to_str().unwrap()];
    run(verb, &network(name), &[&out, more].concat())
}

fn f(value: &Value, field: &str) -> f64 {
    value[field]
        .as_f64()
        .unwrap_or_else(|| panic!("{field}: {value}"))
}

fn list<'v>(value: &'v Value, field: &str) -> &'v [Value] {
    value[field].as_array().unwrap()
}

/// The modes of a point of a sweep are those that `modes` finds with the same settings.
fn same_as_modes(name: &str, sweep: &[&str], settings: impl Fn(&Value, usize) -> Vec<String>) {
    let (value, code) = json("sweep", &network(name), sweep);
    assert_eq!(code, Some(0));
    for (i, point) in list(&value, "points").iter().enumerate() {
        let settings = settings(point, i);
        let set: Vec<&str> = settings
            .iter()
            .flat_map(|s| ["--set", s.as_str()])
            .collect();
        let (alone, _) = json("modes", &network(name), &set);
        let (found, wanted) = (list(point, "modes"), list(&alone, "modes"));
        assert_eq!(found.len(), wanted.len(), "{settings:?}");
        assert_eq!(point["complete"], alone["complete"]);
        for (m, n) in found.iter().zip(wanted) {
            for field in ["frequency_hz", "growth_per_s"] {
                let scale = 1.0 + f(n, "frequency_hz");
                assert!(
                    (f(m, field) - f(n, field)).abs() < 1e-8 * scale,
                    "{settings:?}"
                );
            }
            assert!(m["branch"].as_u64().unwrap() > 0);
        }
    }
}

#[test]
fn a_sweep_is_the_mode_lists_of_its_points() {
    same_as_modes(
        "swirl_rig",
        &["--vary", DELAY, "--points", "8"],
        |point, i| {
            assert!((f(point, "value") - (1.0 + i as f64) * 1e-3).abs() < 1e-15);
            vec![format!("main_flame.delay = {} s", f(point, "value"))]
        },
    );
}

#[test]
fn a_sweep_follows_the_mean_flow_and_ties_numbers_together() {
    same_as_modes(
        "swirl_rig",
        &[
            "--vary",
            "feed.mass_flow = 20 g/s to 45 g/s",
            "--vary",
            "main_flame.delay = 4.5 ms to 2 ms",
            "--points",
            "6",
        ],
        |point, i| {
            let u = i as f64 / 5.0;
            vec![
                format!("feed.mass_flow = {} kg/s", f(point, "value")),
                format!("main_flame.delay = {} ms", 4.5 - 2.5 * u),
            ]
        },
    );
}

#[test]
fn a_factor_scales_every_number_of_a_name() {
    let (value, _) = json(
        "sweep",
        &network("staged_flame"),
        &["--scale", "*.delay = 0.8 to 1.25", "--log", "--points", "5"],
    );
    assert_eq!(
        (&value["parameter"], &value["spacing"]),
        (&"factor".into(), &"logarithmic".into())
    );
    let knobs = list(&value, "knobs");
    assert_eq!(knobs.len(), 3);
    for knob in knobs {
        assert!(knob["name"].as_str().unwrap().ends_with(".delay"));
        assert!((f(knob, "to") / f(knob, "from") - 1.25 / 0.8).abs() < 1e-12);
    }
    let values: Vec<f64> = list(&value, "points")
        .iter()
        .map(|p| f(p, "value"))
        .collect();
    assert_eq!((values[0], values[4]), (0.8, 1.25));
    assert!(
        (values[2] - 1.0).abs() < 1e-14,
        "the middle of 0.8 and 1.25 by ratio"
    );
    assert!((f(&value["design_point"], "value") - 1.0).abs() < 1e-12);
    let knobs: Vec<(String, f64)> = knobs
        .iter()
        .map(|k| (k["name"].as_str().unwrap().to_owned(), f(k, "from") / 0.8))
        .collect();
    same_as_modes(
        "staged_flame",
        &["--scale", "*.delay = 0.8 to 1.25", "--log", "--points", "5"],
        |point, _| {
            let factor = f(point, "value");
            let set = |(name, base): &(String, f64)| format!("{name} = {} s", base * factor);
            knobs.iter().map(set).collect()
        },
    );
}

#[test]
fn neutral_values_are_where_modes_says_so() {
    let (value, _) = json("sweep", &network("swirl_rig"), &["--vary", DELAY]);
    let neutral: Vec<&Value> = list(&value, "events")
        .iter()
        .filter(|e| {
            matches!(
                e["kind"].as_str().unwrap(),
                "becomes_unstable" | "becomes_stable"
            )
        })
        .collect();
    assert!(neutral.len() > 10, "{neutral:?}");
    for event in neutral {
        let set = format!("main_flame.delay = {} s", f(event, "value"));
        let (alone, _) = json("modes", &network("swirl_rig"), &["--set", &set]);
        let frequency = f(event, "frequency_hz");
        let size = std::f64::consts::TAU * frequency;
        assert!(f(event, "growth_per_s").abs() < 1e-6 * size);
        let mode = list(&alone, "modes").iter().min_by(|a, b| {
            let away = |m: &Value| (f(m, "frequency_hz") - frequency).abs();
            away(a).total_cmp(&away(b))
        });
        let mode = mode.unwrap();
        assert!(f(mode, "growth_per_s").abs() < 1e-6 * size, "{set}: {mode}");
        assert!((f(mode, "frequency_hz") - frequency).abs() < 1e-6);
    }
}

#[test]
fn the_object_has_the_fields_it_promises() {
    let (value, code) = json("sweep", &network("swirl_rig"), &["--vary", DELAY]);
    assert_eq!(
        (value["schema"].as_str(), code),
        (Some("stillflame/sweep"), Some(0))
    );
    let points = list(&value, "points");
    assert_eq!(points.len(), 141);
    for point in points {
        let fields: Vec<&String> = point.as_object().unwrap().keys().collect();
        assert_eq!(fields, ["complete", "modes", "problem", "value"]);
        assert!(point["problem"].is_null() && point["complete"] == true);
        for mode in list(point, "modes") {
            let fields: Vec<&String> = mode.as_object().unwrap().keys().collect();
            assert_eq!(fields, ["branch", "frequency_hz", "growth_per_s"]);
        }
    }
    for event in list(&value, "events") {
        let fields: Vec<&String> = event.as_object().unwrap().keys().collect();
        let wanted = [
            "branches",
            "edge",
            "frequency_hz",
            "growth_per_s",
            "kind",
            "value",
        ];
        assert_eq!(fields, wanted);
        let through = matches!(event["kind"].as_str().unwrap(), "enters" | "leaves");
        assert_eq!(event["edge"].is_string(), through);
    }
    assert_eq!(value["counts"]["complete"], 141);
    assert!(value["evaluations"].as_u64().unwrap() > 141 * 10);
    assert_eq!(
        (&value["parameter"], &value["parameter_unit"]),
        (&"main_flame.delay".into(), &"s".into())
    );
    let branches = list(&value, "branches").len() as u64;
    let largest = points.iter().flat_map(|p| list(p, "modes"));
    let largest = largest.filter_map(|m| m["branch"].as_u64()).max();
    assert_eq!(largest, Some(branches));
}

#[test]
fn points_without_mean_flow_are_told_and_not_passed_over() {
    let vary = [
        "--vary",
        "feed.mass_flow = 20 g/s to 400 g/s",
        "--points",
        "12",
    ];
    let (value, code) = json("sweep", &network("swirl_rig"), &vary);
    assert_eq!(code, Some(0));
    let points = list(&value, "points");
    let failed: Vec<&Value> = points.iter().filter(|p| p["modes"].is_null()).collect();
    assert!(!failed.is_empty() && failed.len() < points.len());
    for point in failed {
        assert_eq!(point["complete"], false);
        assert!(point["problem"].as_str().unwrap().len() > 20);
    }
    let warnings = value["warnings"].to_string();
    for words in [
        "points have no answer",
        "beyond Mach 1",
        "this delay stays fixed",
        "the sweep",
    ] {
        assert!(warnings.contains(words), "{words}: {warnings}");
    }
    let ran = run(
        "sweep",
        &network("swirl_rig"),
        &[&vary[..], &["--out", "/dev/null/x"]].concat(),
    );
    assert_eq!(ran.code, Some(1));
    let all = [
        "--vary",
        "feed.mass_flow = 300 g/s to 400 g/s",
        "--points",
        "3",
    ];
    let (value, code) = json("sweep", &network("swirl_rig"), &all);
    assert_eq!(
        (value["counts"]["complete"].as_u64(), code),
        (Some(0), Some(1))
    );
}

#[test]
fn a_throat_that_follows_the_flow_is_told() {
    let vary = [
        "--vary",
        "feed.temperature = 600 K to 700 K",
        "--points",
        "3",
    ];
    let (value, _) = json("sweep", &network("pressurised_rig"), &vary);
    let warnings = value["warnings"].to_string();
    assert!(
        warnings.contains("throat area follows from the flow"),
        "{warnings}"
    );
}

#[test]
fn every_network_can_be_swept_and_drawn() {
    for name in NETWORKS {
        for (vary, log) in [
            (vec!["--scale", "*.delay = 0.5 to 2"], true),
            (vec!["--vary", "feed.temperature = 300 K to 500 K"], false),
        ] {
            let folder = tempfile::tempdir().unwrap();
            let mut all = vary.clone();
            all.extend(["--points", "61", "--out", folder.path().to_str().unwrap()]);
            if log {
                all.push("--log");
            }
            let ran = run("sweep", &network(name), &all);
            assert_eq!(ran.code, Some(0), "{name}: {}{}", ran.stderr, ran.stdout);
            assert!(ran.stderr.is_empty(), "{}", ran.stderr);
            assert!(ran.stdout.contains("branch") && ran.stdout.contains("Caution"));
            for figure in ["sweep", "locus"] {
                let file = folder.path().join(format!("{name}_{figure}.svg"));
                let svg = std::fs::read_to_string(file).unwrap();
                roxmltree::Document::parse(&svg).unwrap();
                assert!(svg.len() < 100_000, "{name} {figure}: {} bytes", svg.len());
                let (_, drawn) = svg.split_once("</style>").unwrap();
                assert!(!drawn.contains("NaN") && drawn.contains(">grows<"));
            }
            let csv = folder.path().join(format!("{name}_sweep.csv"));
            let csv = std::fs::read_to_string(csv).unwrap();
            let width = csv.lines().next().unwrap().matches(',').count();
            assert!(csv.lines().count() > 61 && width >= 6);
            assert!(!csv.contains("NaN") && !ran.stdout.contains("NaN"));
        }
    }
}

#[test]
fn the_same_sweep_has_the_same_bytes_on_any_number_of_threads() {
    let once = |threads: &str| {
        let folder = tempfile::tempdir().unwrap();
        let out = folder.path().to_str().unwrap();
        let all = ["--vary", DELAY, "--points", "71", "--out", out];
        let mut command = command(
            "sweep",
            &network("staged_flame"),
            &["--scale", "*.delay = 0.5 to 2"],
        );
        command
            .args(&all[2..])
            .env("RAYON_NUM_THREADS", threads)
            .assert()
            .success();
        ["sweep.svg", "locus.svg", "sweep.csv"]
            .map(|name| std::fs::read(folder.path().join(format!("staged_flame_{name}"))).unwrap())
    };
    let one = once("1");
    assert!(one == once("1") && one == once("4"));
}

#[test]
fn a_path_that_cannot_be_gone_is_wrong_usage_and_says_what_would_be_right() {
    let cases: [(&[&str], &str); 12] = [
        (&[], "Nothing is said to vary"),
        (
            &["--vary", "main_flame.dely = 1 ms to 2 ms"],
            "main_flame.delay",
        ),
        (&["--vary", "main_flame.delay = 2 ms to 1 ms"], "downwards"),
        (
            &["--vary", "main_flame.delay = 2 ms to 2 ms"],
            "both its ends are the same",
        ),
        (&["--vary", "main_flame.delay = 2 m to 3 m"], "a time"),
        (&["--vary", "main_flame.delay 2 ms"], "o `=` stands"),
        (&["--vary", "main_flame.delay = -1 ms to 3 ms"], "negative"),
        (
            &["--vary", "main_flame.delay = 0 ms to 3 ms", "--log"],
            "greater than zero",
        ),
        (
            &["--vary", DELAY, "--vary", "main_flame.delay = 1 ms to 2 ms"],
            "move twice",
        ),
        (
            &["--vary", DELAY, "--scale", "*.delay = 1 to 2"],
            "move twice",
        ),
        (&["--scale", "*.dlay = 1 to 2"], "`*` stands for anything"),
        (&["--scale", "main_flame.delay = -1 to 2"], "negative"),
    ];
    for (arguments, wanted) in cases {
        let ran = run("sweep", &network("swirl_rig"), arguments);
        assert_eq!(ran.code, Some(2), "{arguments:?}: {}", ran.stderr);
        assert!(ran.stderr.contains(wanted), "{wanted}: {}", ran.stderr);
        assert!(ran.stdout.is_empty());
    }
    let ran = run(
        "sweep",
        &network("swirl_rig"),
        &["--vary", DELAY, "--points", "1"],
    );
    assert_eq!(ran.code, Some(2));
}

#[test]
fn one_step_is_told_as_one() {
    for more in [&[][..], &["--log"]] {
        let all = [&["--vary", DELAY, "--points", "2"], more].concat();
        let ran = in_scratch("sweep", "swirl_rig", &all);
        assert!(
            ran.stdout.contains("from 1 ms to 8 ms in 1 step\n"),
            "{}",
            ran.stdout
        );
    }
}

#[test]
fn the_headline_and_the_design_line_name_the_band() {
    for frequency in ["20 to 500 Hz", "20 to 25 Hz"] {
        let all = ["--vary", DELAY, "--points", "9", "--frequency", frequency];
        let ran = in_scratch("sweep", "swirl_rig", &all);
        let mut lines = ran.stdout.lines();
        assert!(lines.nth(3).unwrap().contains(frequency), "{}", ran.stdout);
        let design = lines.find(|l| l.starts_with("Design point")).unwrap();
        assert!(design.contains(frequency), "{design}");
    }
}

/// A terminal and a script read one minus sign, and no zero has any.
/// A plane about every network as it stands.
const PLANE: [&str; 4] = [
    "--across",
    "feed.temperature = 250 K to 800 K",
    "--up",
    "main_flame.burnt_temperature = 1400 K to 2200 K",
];

#[test]
fn numbers_in_words_have_one_minus_sign() {
    let neutral = ["--set", "main_flame.interaction_index = 0"];
    let mut minus = 0;
    for name in NETWORKS {
        for (verb, more) in [
            ("check", vec![]),
            ("flow", vec![]),
            ("modes", vec!["--shapes", "--explain"]),
            ("modes", [&["--shapes", "--explain"], &neutral[..]].concat()),
            (
                "sweep",
                vec![
                    "--scale",
                    "*.interaction_index = 0.01 to 1",
                    "--points",
                    "5",
                ],
            ),
            ("map", [&PLANE[..], &["--points", "3x3"]].concat()),
            (
                "map",
                [&PLANE[..], &["--points", "2x2", "--mode", "1"]].concat(),
            ),
        ] {
            // The flame of this network answers by numbered responses.
            if name == "staged_flame" && more.contains(&"--set") {
                continue;
            }
            let people = in_scratch(verb, name, &more);
            let all = [&["--json"], &more[..]].concat();
            let scripts = run(verb, &network(name), &all);
            for text in [&people.stdout, &people.stderr, &scripts.stdout] {
                assert!(!text.contains('\u{2212}'), "{verb} {name}: {text}");
            }
            for word in people.stdout.split([' ', '\n', ',', ';', '(']) {
                if let Ok(number) = word.parse::<f64>() {
                    assert!(
                        number != 0.0 || !word.starts_with('-'),
                        "{verb} {name}: {word}"
                    );
                    minus += usize::from(number < 0.0);
                }
            }
        }
    }
    assert!(minus > 100, "{minus}");
}

#[test]
fn a_window_and_its_doubts_are_told_in_few_digits() {
    let swirl = network("swirl_rig");
    let narrow = run("modes", &swirl, &["--frequency", "300 to 300.000000001 Hz"]);
    assert!(
        narrow.stdout.contains("300 to 300.000000001 Hz"),
        "{}",
        narrow.stdout
    );
    for set in [
        "feed.temperature = 1e300 K",
        "main_flame.burnt_temperature = 1e300 K",
        "feed.pressure = 1e300 Pa",
    ] {
        for name in ["swirl_rig", "flame_in_tube"] {
            for verb in ["check", "flow", "modes"] {
                let ran = run(verb, &network(name), &["--set", set]);
                for text in [&ran.stdout, &ran.stderr] {
                    let longest = text
                        .split(|c: char| !c.is_ascii_digit())
                        .map(str::len)
                        .max();
                    assert!(longest < Some(20), "{verb} {name} {set}: {text}");
                }
            }
        }
    }
    // Without a window of its own, in a gas far beyond its data.
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("hot.toml");
    let tube = "title = \"Hot tube (invented)\"\n[feed]\ngas = \"air\"\nmass_flow = \"0 kg/s\"\n\
                temperature = \"1e300 K\"\npressure = \"1 bar\"\nend = \"closed\"\n[[element]]\nname = \"tube\"\n\
                kind = \"duct\"\nlength = \"1 m\"\ndiameter = \"60 mm\"\n[exit]\nend = \"open\"\n";
    std::fs::write(&path, tube).unwrap();
    for verb in ["check", "flow", "modes"] {
        let ran = run(verb, &path, &[]);
        let longest = ran
            .stdout
            .split(|c: char| !c.is_ascii_digit())
            .map(str::len)
            .max();
        assert!(longest < Some(20), "{}", ran.stdout);
    }
    let (value, _) = json("check", &path, &[]);
    assert_eq!(value["window"]["frequency_hz"][1], 1e5);
    // Far beyond what can be counted: said, and no list is called complete.
    let huge = run("modes", &swirl, &["--growth", "-1e5 to 1e5 1/s"]);
    assert_eq!(huge.code, Some(1));
    assert!(huge.stdout.contains("NOT PROVED COMPLETE") && huge.stdout.contains("Hint: "));
}
