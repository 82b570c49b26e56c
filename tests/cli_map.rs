//! `map` of the real binary.

#[path = "common/cli.rs"]
mod cli;

use cli::{NETWORKS, command, json, network, run};
use serde_json::Value;

const DELAY: &str = "main_flame.delay = 0 ms to 10 ms";
const INDEX: &str = "main_flame.interaction_index = 0 to 2";

fn arguments<'a>(across: &'a str, up: &'a str, points: &'a str) -> Vec<&'a str> {
    vec!["--across", across, "--up", up, "--points", points]
}

fn numbers(value: &Value) -> Vec<f64> {
    let items = value.as_array().unwrap();
    items.iter().map(|v| v.as_f64().unwrap()).collect()
}

fn rows(value: &Value, field: &str) -> Vec<Vec<Option<f64>>> {
    let rows = value[field].as_array().unwrap();
    rows.iter()
        .map(|r| r.as_array().unwrap().iter().map(Value::as_f64).collect())
        .collect()
}

/// The largest growth rate and its frequency by `modes`.
fn by_modes(name: &str, settings: &[String]) -> Option<(f64, f64)> {
    let set: Vec<&str> = settings
        .iter()
        .flat_map(|s| ["--set", s.as_str()])
        .collect();
    let (value, _) = json("modes", &network(name), &set);
    assert_eq!(value["complete"], true);
    let modes = value["modes"].as_array().unwrap().iter();
    modes
        .map(|m| {
            (
                m["growth_per_s"].as_f64().unwrap(),
                m["frequency_hz"].as_f64().unwrap(),
            )
        })
        .max_by(|a, b| a.0.total_cmp(&b.0))
}

fn same_as_modes(name: &str, across: (&str, &str), up: (&str, &str), points: &str) {
    let (text_across, text_up) = (
        format!("{} = {}", across.0, across.1),
        format!("{} = {}", up.0, up.1),
    );
    let (value, code) = json(
        "map",
        &network(name),
        &arguments(&text_across, &text_up, points),
    );
    assert_eq!(code, Some(0));
    assert_eq!(value["schema"], "stillflame/map");
    let (xs, ys) = (numbers(&value["across"]), numbers(&value["up"]));
    let (growth, frequency) = (
        rows(&value, "largest_growth_per_s"),
        rows(&value, "frequency_hz_there"),
    );
    let complete = value["complete"].as_array().unwrap();
    assert_eq!(
        (growth.len(), frequency.len(), complete.len()),
        (ys.len(), ys.len(), ys.len())
    );
    let unit = |field: &str| value[field].as_str().unwrap().to_owned();
    for (j, y) in ys.iter().enumerate() {
        assert_eq!(growth[j].len(), xs.len());
        for (i, x) in xs.iter().enumerate() {
            let settings = [
                format!("{} = {x} {}", across.0, unit("across_unit")),
                format!("{} = {y} {}", up.0, unit("up_unit")),
            ];
            let expected = by_modes(name, &settings);
            assert_eq!(complete[j][i], true);
            assert_eq!(growth[j][i].is_some(), expected.is_some());
            if let (Some(g), Some(f), Some((eg, ef))) = (growth[j][i], frequency[j][i], expected) {
                assert!((g - eg).abs() < 1e-8 * (1.0 + ef), "{settings:?}: {g} {eg}");
                assert!((f - ef).abs() < 1e-8 * (1.0 + ef), "{settings:?}: {f} {ef}");
            }
        }
    }
}

#[test]
fn a_map_is_the_mode_lists_of_its_points() {
    same_as_modes(
        "swirl_rig",
        ("main_flame.delay", "0 ms to 10 ms"),
        ("main_flame.interaction_index", "0 to 2"),
        "4x3",
    );
    same_as_modes(
        "staged_flame",
        ("main_flame.response.2.spread", "0.1 ms to 1.5 ms"),
        ("exit.coefficient", "-1 to -0.2"),
        "3x2",
    );
}

#[test]
fn a_map_follows_the_mean_flow_where_an_axis_moves_it() {
    same_as_modes(
        "swirl_rig",
        ("feed.mass_flow", "10 g/s to 60 g/s"),
        ("chamber.length", "0.5 m to 0.9 m"),
        "3x2",
    );
    same_as_modes(
        "pressurised_rig",
        ("main_flame.burnt_gas.gamma", "1.25 to 1.35"),
        ("chamber.diameter", "130 mm to 170 mm"),
        "2x3",
    );
}

#[test]
fn every_network_can_be_mapped() {
    for name in NETWORKS {
        let (across, up) = match name {
            "staged_flame" => (
                "main_flame.response.1.delay = 1 ms to 5 ms",
                "main_flame.response.1.interaction_index = 0 to 2",
            ),
            _ => (DELAY, INDEX),
        };
        let folder = tempfile::tempdir().unwrap();
        let out = folder.path().to_str().unwrap();
        let mut all = arguments(across, up, "7x5");
        all.extend(["--out", out]);
        let ran = run("map", &network(name), &all);
        assert_eq!(ran.code, Some(0), "{name}: {}", ran.stderr);
        assert!(
            ran.stderr.is_empty(),
            "no bar but on a terminal: {}",
            ran.stderr
        );
        let svg = std::fs::read_to_string(folder.path().join(format!("{name}_map.svg"))).unwrap();
        roxmltree::Document::parse(&svg).unwrap();
        assert!(svg.contains("design"));
        let csv = std::fs::read_to_string(folder.path().join(format!("{name}_map.csv"))).unwrap();
        assert_eq!(csv.lines().count(), 36);
        assert!(ran.stdout.contains("Wrote") && ran.stdout.contains("Caution"));
        assert!(!csv.contains("NaN") && !ran.stdout.contains("NaN"));
    }
}

#[test]
fn axes_are_exact_at_their_ends() {
    let (value, _) = json(
        "map",
        &network("swirl_rig"),
        &arguments(DELAY, INDEX, "7x4"),
    );
    let (across, up) = (numbers(&value["across"]), numbers(&value["up"]));
    assert_eq!((across[0], across[6], across[3]), (0.0, 0.01, 0.005));
    assert_eq!((up[0], up[3]), (0.0, 2.0));
    assert_eq!(
        (&value["across_knob"], &value["across_unit"]),
        (&"main_flame.delay".into(), &"s".into())
    );
    assert_eq!(value["design_point"]["across"], 0.003);
    assert_eq!(value["design_point"]["inside"], true);
    assert_eq!(value["points"]["total"], 28);
}

#[test]
fn the_design_point_is_the_file_with_its_overrides() {
    let mut all = arguments(DELAY, INDEX, "2x2");
    all.extend(["--set", "main_flame.delay = 20 ms"]);
    let (value, _) = json("map", &network("swirl_rig"), &all);
    assert_eq!(value["design_point"]["inside"], false);
    assert!(value["finding"].as_str().unwrap().contains("outside"));
}

#[test]
fn a_point_without_mean_flow_is_marked_and_counted() {
    let flow = "feed.mass_flow = 20 g/s to 400 g/s";
    let length = "chamber.length = 0.5 m to 0.9 m";
    let (value, code) = json(
        "map",
        &network("swirl_rig"),
        &arguments(flow, length, "6x3"),
    );
    assert_eq!(code, Some(0));
    let failed = value["points"]["failed"].as_u64().unwrap();
    assert!(failed > 0 && failed < 18);
    let growth = rows(&value, "largest_growth_per_s");
    for (row, complete) in growth.iter().zip(value["complete"].as_array().unwrap()) {
        assert!(row[0].is_some() && complete[0] == true);
        assert!(row[5].is_none() && complete[5] == false);
    }
    let warnings = value["warnings"].to_string();
    for words in [
        "points have no answer",
        "beyond Mach 1",
        "this delay stays fixed",
        "loss-free",
    ] {
        assert!(warnings.contains(words), "{words}: {warnings}");
    }
    let folder = tempfile::tempdir().unwrap();
    let mut all = arguments(flow, length, "6x3");
    all.extend(["--out", folder.path().to_str().unwrap()]);
    run("map", &network("swirl_rig"), &all);
    let svg = std::fs::read_to_string(folder.path().join("swirl_rig_map.svg")).unwrap();
    assert!(svg.contains(">no mean flow<"));
    // Each point without an answer is listed with its reason.
    let (value, _) = json(
        "map",
        &network("swirl_rig"),
        &arguments(flow, length, "6x3"),
    );
    let listed = value["points_without_answer"].as_array().unwrap();
    assert_eq!(
        listed.len() as u64,
        value["points"]["failed"].as_u64().unwrap()
    );
    assert!(!listed.is_empty() && listed.iter().all(|p| p["failed"] == true));
    assert!(listed[0]["why"].as_str().unwrap().contains("beyond Mach 1"));
    // Nowhere an answer: the computation failed.
    let all = arguments("feed.mass_flow = 300 g/s to 400 g/s", length, "2x2");
    let (value, code) = json("map", &network("swirl_rig"), &all);
    assert_eq!(
        (value["points"]["complete"].as_u64(), code),
        (Some(0), Some(1))
    );
}

#[test]
fn growth_that_leaves_the_window_does_not_look_calm() {
    let up = "main_flame.interaction_index = 1.8 to 2";
    let all = arguments("main_flame.delay = 1 ms to 1.4 ms", up, "5x3");
    let (value, _) = json("map", &network("swirl_rig"), &all);
    let beyond = rows(&value, "growth_outside_window_per_s");
    let window = rows(&value, "largest_growth_per_s");
    let fastest = beyond
        .iter()
        .flatten()
        .flatten()
        .fold(0.0, |a: f64, b| a.max(*b));
    assert!(fastest > 300.0);
    assert!(window.iter().flatten().flatten().all(|g| *g <= 300.0));
    assert!(
        value["warnings"]
            .to_string()
            .contains("a mode grows outside the window")
    );
    assert!(value["finding"].as_str().unwrap().contains("100 %"));
}

#[test]
fn responses_taken_far_from_steady_forcing_are_told() {
    let up = "main_flame.interaction_index = 1.9 to 2";
    let all = arguments("main_flame.delay = 8 ms to 8.1 ms", up, "3x2");
    let (value, _) = json("map", &network("swirl_rig"), &all);
    let warnings = value["warnings"].as_array().unwrap();
    let told = |w: &&Value| w["subject"] == "main_flame.delay";
    let warning = warnings.iter().find(told).unwrap()["message"]
        .as_str()
        .unwrap();
    assert!(
        warning.contains("of 6 points growth or decay rate times delay exceeds 1"),
        "{warning}"
    );
}

#[test]
fn the_same_map_has_the_same_bytes_on_any_number_of_threads() {
    let once = |threads: &str| {
        let folder = tempfile::tempdir().unwrap();
        let mut all = arguments(DELAY, INDEX, "24x16");
        all.extend(["--out", folder.path().to_str().unwrap()]);
        let mut command = command("map", &network("swirl_rig"), &all);
        command.env("RAYON_NUM_THREADS", threads).assert().success();
        let read = |name: &str| std::fs::read(folder.path().join(name)).unwrap();
        (read("swirl_rig_map.svg"), read("swirl_rig_map.csv"))
    };
    let one = once("1");
    assert!(one == once("1") && one == once("4"));
}

#[test]
fn files_of_a_map_go_to_the_working_directory_unless_told_otherwise() {
    let folder = tempfile::tempdir().unwrap();
    let all = arguments(DELAY, INDEX, "3x3");
    command("map", &network("swirl_rig"), &all)
        .current_dir(folder.path())
        .assert()
        .success();
    assert!(folder.path().join("swirl_rig_map.svg").is_file());
    assert!(folder.path().join("swirl_rig_map.csv").is_file());
    // JSON alone leaves no files about.
    let folder = tempfile::tempdir().unwrap();
    let mut command = command("map", &network("swirl_rig"), &all);
    command
        .arg("--json")
        .current_dir(folder.path())
        .assert()
        .success();
    assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 0);
}

/// A tube with an exact exceptional point: `tests/data/exceptional_points.json`, by 40-digit arithmetic.
fn tube() -> std::path::PathBuf {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR"));
    folder.join("tests/data/closed_form/rijke_open_open_L4.toml")
}

fn of_kind<'v>(value: &'v Value, kind: &str) -> Vec<&'v Value> {
    let events = value["events"].as_array().unwrap().iter();
    events.filter(|e| e["kind"] == kind).collect()
}

#[test]
fn a_map_of_one_mode_lists_the_exceptional_point_and_the_cut_from_it() {
    let data = include_str!("data/exceptional_points.json");
    let exact: Value = serde_json::from_str(data).unwrap();
    let exact = |key: &str| -> f64 { exact["exceptional"][key].as_str().unwrap().parse().unwrap() };
    let near = |value: &Value, expected: f64| {
        let value = value.as_f64().unwrap();
        assert!((value / expected - 1.0).abs() < 1e-10, "{value} {expected}");
    };
    let up = "flame.interaction_index = 0.1 to 0.8";
    let with = |across: &str, points: &str| {
        let mut all = arguments(across, up, points);
        all.extend(["--mode", "2", "--set", "flame.delay = 3.8 ms"]);
        all.extend(["--set", "flame.interaction_index = 0.3"]);
        let (value, code) = json("map", &tube(), &all);
        assert_eq!((code, &value["followed_mode"]), (Some(0), &2.into()));
        value
    };
    for points in ["2x2", "9x13", "40x30"] {
        let value = with("flame.delay = 3.6 ms to 4.2 ms", points);
        let [point] = of_kind(&value, "exceptional_point")[..] else {
            panic!("{}", value["events"]);
        };
        near(&point["across"], exact("tau"));
        near(&point["up"], exact("n"));
        near(&point["growth_per_s"], exact("s_re"));
        near(
            &point["frequency_hz"],
            exact("s_im") / std::f64::consts::TAU,
        );
        let [cut] = of_kind(&value, "cut")[..] else {
            panic!("{}", value["events"]);
        };
        near(&cut["across"], exact("tau"));
        near(&cut["up"], exact("n"));
        near(&cut["to"][0], exact("tau"));
        assert_eq!(cut["to"][1], 0.8);
    }
    // A map that holds none has no cut.
    let value = with("flame.delay = 3.6 ms to 3.85 ms", "9x13");
    assert_eq!(value["events"], Value::Array(Vec::new()));
}

#[test]
fn a_map_of_one_mode_has_the_same_bytes_on_any_number_of_threads() {
    let once = |threads: &str| {
        let folder = tempfile::tempdir().unwrap();
        let mut all = arguments(DELAY, INDEX, "24x16");
        all.extend([
            "--mode",
            "4",
            "--json",
            "--out",
            folder.path().to_str().unwrap(),
        ]);
        let mut command = command("map", &network("swirl_rig"), &all);
        let output = command.env("RAYON_NUM_THREADS", threads).output().unwrap();
        assert!(output.status.success());
        let read = |name: &str| std::fs::read(folder.path().join(name)).unwrap();
        let svg = read("swirl_rig_map_mode_4.svg");
        assert!(String::from_utf8_lossy(&svg).contains("cut: not one mode across"));
        (svg, read("swirl_rig_map_mode_4.csv"), output.stdout)
    };
    assert!(once("1") == once("2"));
}

#[test]
fn events_list_points_without_an_answer_and_are_empty_where_there_is_nothing() {
    let flow = "feed.mass_flow = 20 g/s to 400 g/s";
    let length = "chamber.length = 0.5 m to 0.9 m";
    let all = arguments(flow, length, "6x3");
    let (value, _) = json("map", &network("swirl_rig"), &all);
    let failed = of_kind(&value, "failed");
    assert_eq!(
        Some(failed.len() as u64),
        value["points"]["failed"].as_u64()
    );
    assert!(!failed.is_empty());
    for event in failed {
        assert!(event["why"].as_str().unwrap().contains("beyond Mach 1"));
        assert!(event["frequency_hz"].is_null() && event["to"].is_null());
    }
    let all = arguments(DELAY, INDEX, "3x3");
    let (value, _) = json("map", &network("swirl_rig"), &all);
    assert_eq!(value["events"], Value::Array(Vec::new()));
}

#[test]
fn a_mode_that_is_not_there_is_wrong_usage() {
    for number in ["0", "6", "9"] {
        let mut all = arguments(DELAY, INDEX, "3x3");
        all.extend(["--mode", number]);
        let ran = run("map", &network("swirl_rig"), &all);
        assert_eq!(ran.code, Some(2));
        assert!(ran.stderr.contains("has 5 modes"), "{}", ran.stderr);
    }
    // Nor can one be followed over a map that does not hold the design point.
    let mut all = arguments("main_flame.delay = 5 ms to 10 ms", INDEX, "3x3");
    all.extend(["--mode", "1"]);
    let ran = run("map", &network("swirl_rig"), &all);
    assert_eq!(ran.code, Some(2));
    assert!(ran.stderr.contains("outside the map"), "{}", ran.stderr);
}

#[test]
fn a_map_of_one_mode_tells_where_it_is_outside_the_window_from_where_it_is_not_followed_to() {
    let folder = tempfile::tempdir().unwrap();
    let mut all = arguments(DELAY, INDEX, "20x20");
    let out = folder.path().to_str().unwrap();
    all.extend(["--mode", "2", "--out", out]);
    let (value, code) = json("map", &network("swirl_rig"), &all);
    assert_eq!(code, Some(0));
    let growth = rows(&value, "largest_growth_per_s");
    let (mut outside, mut unreached) = (0, 0);
    for (known, reached) in growth.iter().zip(value["followed_to"].as_array().unwrap()) {
        for (known, reached) in known.iter().zip(reached.as_array().unwrap()) {
            match (known, reached.as_bool().unwrap()) {
                (None, true) => outside += 1,
                (None, false) => unreached += 1,
                (Some(_), reached) => assert!(reached),
            }
        }
    }
    assert!(outside > 20 && unreached > 5, "{outside} {unreached}");
    // Other modes grow outside the window at short delays.
    assert_eq!(value["growth_excluded_beyond"], false);
    let told = value["growth_outside"].as_str().unwrap();
    assert!(!told.contains("excluded"), "{told}");
    let read = |name: &str| std::fs::read_to_string(folder.path().join(name)).unwrap();
    let svg = read("swirl_rig_map_mode_2.svg");
    assert!(svg.contains("outside the window") && svg.contains("not followed so far"));
    let csv = read("swirl_rig_map_mode_2.csv");
    assert!(csv.lines().next().unwrap().ends_with(",failed,followed_to"));
    let lines = csv.lines().filter(|l| l.ends_with(",false,false")).count();
    assert_eq!(lines, unreached);
    // A map of the largest growth rate follows nothing.
    let (value, _) = json(
        "map",
        &network("swirl_rig"),
        &arguments(DELAY, INDEX, "2x2"),
    );
    assert!(value["followed_to"].is_null());
}

/// At short delays and small gains an intrinsic mode lies thousands of 1/s left of the window and moves too fast to be
/// tied; that is no meeting.
#[test]
fn meetings_of_one_mode_are_found_and_lie_near_the_window() {
    let mut all = arguments(DELAY, INDEX, "200x40");
    all.extend(["--mode", "4"]);
    let (value, _) = json("map", &network("swirl_rig"), &all);
    let meetings = of_kind(&value, "exceptional_point");
    assert!(meetings.len() >= 4, "{meetings:?}");
    for meeting in meetings {
        let at = |field: &str| meeting[field].as_f64().unwrap();
        // A quarter of the width of -300 to 300 1/s and of 20 to 800 Hz.
        assert!(at("growth_per_s").abs() <= 450.0, "{meeting}");
        assert!((-175.0..=995.0).contains(&at("frequency_hz")), "{meeting}");
    }
}
