//! Bad usage, places that cannot be written, readers that go away, and Ctrl-C.

#[path = "common/cli.rs"]
mod cli;

use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::time::Duration;

use cli::{NETWORKS, json, network, run};

const VERBS: [&str; 5] = ["check", "flow", "modes", "sweep", "map"];
const PLANE: [&str; 4] = [
    "--across",
    "main_flame.delay = 0 ms to 10 ms",
    "--up",
    "main_flame.interaction_index = 0 to 2",
];

/// What a verb must be told beside the network.
fn needed(verb: &str) -> Vec<&'static str> {
    match verb {
        "map" => PLANE.to_vec(),
        "sweep" => vec!["--vary", "main_flame.delay = 1 ms to 8 ms"],
        _ => Vec::new(),
    }
}

fn binary() -> Command {
    Command::new(env!("CARGO_BIN_EXE_stillflame"))
}

#[test]
fn flow_beyond_mach_one_and_cold_flames_are_problems() {
    for (set, words) in [
        ("feed.mass_flow = 1 kg/s", "Mach 1"),
        (
            "main_flame.burnt_temperature = 250 K",
            "colder than its inlet",
        ),
    ] {
        for verb in ["check", "flow", "modes"] {
            let ran = run(verb, &network("swirl_rig"), &["--set", set]);
            assert_eq!(ran.code, Some(1));
            assert!(ran.stderr.contains(words), "{}", ran.stderr);
            assert!(ran.stderr.contains("swirl_rig.toml:") || ran.stderr.contains("--set:"));
        }
    }
}

#[test]
fn wrong_usage_is_two() {
    let swirl = network("swirl_rig");
    let swirl = swirl.to_str().unwrap();
    let cases: &[&[&str]] = &[
        &[],
        &["check"],
        &["mode", swirl],
        &["modes", swirl, "--growths"],
        &["modes", swirl, "--frequency", "20 to 800"],
        &["modes", swirl, "--frequency", "800 to 20 Hz"],
        &["modes", swirl, "--frequency", "20 to 20 Hz"],
        &["modes", swirl, "--frequency", "-20 to 20 Hz"],
        &["modes", swirl, "--growth", "-300 to nan 1/s"],
        &["modes", swirl, "--growth", "-300 to 300 m"],
        &["map", swirl],
        &["map", swirl, "--across", "main_flame.delay = 0 ms to 10 ms"],
    ];
    for case in cases {
        let output = binary().args(*case).output().unwrap();
        assert_eq!(output.status.code(), Some(2), "{case:?}");
        assert!(output.stdout.is_empty() && !output.stderr.is_empty());
    }
}

/// What is mistaken on the command line is 2, a network that is wrong is 1; both are JSON where asked for.
#[test]
fn every_verb_tells_wrong_usage_from_a_wrong_network() {
    let usage: &[&[&str]] = &[
        &["--set", "chamber.lenght = 1 m"],
        &["--set", "chamber.length"],
        &["--set", "chamber.length = 1 s"],
        &["--set", "chamber.length = -1 m"],
        &["--set"],
        &["--nonsense"],
        &["another.toml"],
    ];
    let of_a_search: &[&[&str]] = &[
        &["--frequency", "800 to 20 Hz"],
        &["--frequency", "20 to 800"],
        &["--growth", "-300 to nan 1/s"],
        &["--growth", "-1e6 to 1e6 1/s"],
    ];
    let network_is_wrong: &[&[&str]] = &[
        &["--set", "feed.mass_flow = 1 kg/s"],
        &["--set", "main_flame.burnt_temperature = 250 K"],
        &["--set", "chamber.diameter = 20 mm"],
        // Told at the option, as it fits neither neighbour.
        &["--set", "mixing_tube.diameter = 100 mm"],
        &["--set", "feed.mass_flow = 0 g/s"],
        &[
            "--set",
            "feed.mass_flow = 0 g/s",
            "--set",
            "exit.end = 'choked'",
        ],
    ];
    let points: &[&[&str]] = &[&["--points", "1"], &["--points", "x"]];
    let swirl = network("swirl_rig");
    for verb in VERBS {
        let told = |file: &Path, more: &[&str], expected: i32| {
            let all = [&needed(verb), more].concat();
            let (value, code) = json(verb, file, &all);
            assert_eq!(code, Some(expected), "{verb} {all:?}: {value}");
            assert_eq!(value["schema"], "stillflame/problems");
            for problem in value["problems"].as_array().unwrap() {
                assert!(problem["hint"].is_string(), "{verb} {all:?}: {problem}");
            }
            let people = run(verb, file, &all);
            assert_eq!((people.code, people.stdout.as_str()), (Some(expected), ""));
            assert!(!people.stderr.is_empty());
        };
        for more in usage {
            told(&swirl, more, 2);
        }
        if !matches!(verb, "check" | "flow") {
            of_a_search.iter().for_each(|more| told(&swirl, more, 2));
        }
        if matches!(verb, "map" | "sweep") {
            points.iter().for_each(|more| told(&swirl, more, 2));
        }
        for more in network_is_wrong {
            // A map and a sweep say so of the network as it stands too.
            told(&swirl, more, 1);
        }
        told(Path::new("nowhere.toml"), &[], 1);
        let spans: &[(&str, i32)] = &[
            ("chamber.diameter = 20 mm to 100 mm", 1),
            ("mixing_tube.diameter = 20 mm to 100 mm", 1),
            ("feed.mass_flow = 0 g/s to 10 g/s", 1),
            ("chamber.length = -1 m to 1 m", 2),
            ("chamber.length = 0 m to 1 m", 2),
            ("chamber.length = 0.5 s to 1 s", 2),
            ("chamber.lenght = 0.5 m to 1 m", 2),
        ];
        for (span, code) in spans {
            let plane = ["--across", span, PLANE[2], PLANE[3], "--points", "2x2"];
            let path = ["--vary", span, "--points", "2"];
            let all = match verb {
                "map" => &plane[..],
                "sweep" => &path[..],
                _ => continue,
            };
            let (value, found) = json(verb, &swirl, all);
            assert_eq!(found, Some(*code), "{verb} {span}: {value}");
            assert_eq!(value["schema"], "stillflame/problems");
            for problem in value["problems"].as_array().unwrap() {
                assert!(problem["hint"].is_string(), "{verb} {span}: {problem}");
            }
        }
        // The file is wrong as well: that comes first.
        told(Path::new("nowhere.toml"), &["--set", "chamber.length"], 1);
    }
    for scale in [", = 0.8 to 1.2", "= 0.8 to 1.2", "*.delay, = 0.8 to 1.2"] {
        let ran = run("sweep", &swirl, &["--scale", scale]);
        assert_eq!(ran.code, Some(2));
        assert!(ran.stderr.contains("name is missing"), "{}", ran.stderr);
    }
}

#[test]
fn wrong_axes_are_wrong_usage_and_say_what_would_be_right() {
    let of_the_network = [
        "this expansion narrows",
        "leaves the area as it is",
        "nothing flows",
    ];
    let cases = [
        (
            "main_flame.dealy = 0 ms to 10 ms",
            "did you mean `main_flame.delay`?",
        ),
        (
            "main_flam.delay = 0 ms to 10 ms",
            "did you mean `main_flame.delay`?",
        ),
        ("chamber.temperature = 1 K to 2 K", "chamber.length"),
        ("nonsense = 1 to 2", "its numbers are"),
        ("main_flame.delay", "write NAME = A to B"),
        ("= 0 ms to 1 ms", "no number named"),
        ("main_flame.delay = 3 ms", "no span"),
        ("main_flame.delay = 0 to 10", "no unit"),
        ("main_flame.delay = 0 mm to 10 mm", "unit of length"),
        ("main_flame.delay = 10 ms to 0 ms", "downwards"),
        ("main_flame.delay = 1 ms to 1 ms", "empty"),
        ("main_flame.delay = -1 ms to 1 ms", "must not be negative"),
        ("main_flame.delay = nan to inf ms", "not finite"),
        (
            "chamber.diameter = 20 mm to 100 mm",
            "this expansion narrows",
        ),
        (
            "mixing_tube.diameter = 20 mm to 100 mm",
            "leaves the area as it is",
        ),
        ("feed.mass_flow = 0 g/s to 10 g/s", "nothing flows"),
        ("main_flame.interaction_index = 0 to 1", "the same number"),
    ];
    for (across, words) in cases {
        let all = ["--across", across, PLANE[2], PLANE[3], "--points", "3x3"];
        let ran = run("map", &network("swirl_rig"), &all);
        let expected = Some(if of_the_network.contains(&words) {
            1
        } else {
            2
        });
        assert_eq!(ran.code, expected, "{across}: {}", ran.stderr);
        assert!(ran.stderr.contains(words), "{across}: {}", ran.stderr);
        assert!(ran.stdout.is_empty());
        let (value, code) = json("map", &network("swirl_rig"), &all);
        assert_eq!(
            (value["schema"].as_str(), code),
            (Some("stillflame/problems"), expected)
        );
    }
    for points in ["1x5", "5", "axb", "0x0", "5000x5000", "-3x3", ""] {
        let all = [&PLANE[..], &["--points", points]].concat();
        assert_eq!(
            run("map", &network("swirl_rig"), &all).code,
            Some(2),
            "{points}"
        );
    }
}

#[test]
fn a_place_that_cannot_be_written_is_told_before_the_work() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("a_file");
    std::fs::write(&file, "x").unwrap();
    for place in [
        file.clone(),
        file.join("below"),
        PathBuf::from("/proc/stillflame"),
    ] {
        for verb in ["flow", "modes", "map"] {
            let mut all = needed(verb);
            // A map of this size would take minutes.
            if verb == "map" {
                all.extend(["--points", "1000x1000"]);
            }
            all.extend(["--out", place.to_str().unwrap()]);
            let ran = run(verb, &network("swirl_rig"), &all);
            assert_eq!(ran.code, Some(1), "{verb} {}", place.display());
            assert!(ran.stderr.contains("cannot be written"), "{}", ran.stderr);
            assert!(ran.stdout.is_empty());
        }
    }
    assert_eq!(std::fs::read_to_string(&file).unwrap(), "x");
}

#[test]
fn a_reader_that_goes_away_is_no_failure() {
    for name in NETWORKS {
        let mut child = binary()
            .arg("modes")
            .arg(network(name))
            .arg("--shapes")
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        drop(child.stdout.take());
        let output = child.wait_with_output().unwrap();
        assert_eq!(output.status.code(), Some(0));
        assert_eq!(String::from_utf8(output.stderr).unwrap(), "");
    }
    let output = binary()
        .arg("--help")
        .stdout(Stdio::null())
        .output()
        .unwrap();
    assert!(output.status.success());
}

#[cfg(target_os = "linux")]
#[test]
fn a_full_standard_output_is_a_failure() {
    let full = std::fs::OpenOptions::new()
        .write(true)
        .open("/dev/full")
        .unwrap();
    for more in [&[][..], &["--json"]] {
        let output = binary()
            .arg("flow")
            .arg(network("swirl_rig"))
            .args(more)
            .stdout(full.try_clone().unwrap())
            .output()
            .unwrap();
        assert_eq!(output.status.code(), Some(1));
        let told = String::from_utf8(output.stderr).unwrap();
        assert!(
            told.contains("annot be written") && told.contains("Hint: "),
            "{told}"
        );
    }
}

#[cfg(unix)]
#[test]
fn an_interrupt_ends_a_long_map_at_once_and_leaves_nothing() {
    let folder = tempfile::tempdir().unwrap();
    let child = binary()
        .arg("map")
        .arg(network("twenty_elements"))
        .args(PLANE)
        .args(["--points", "1000x1000"])
        .current_dir(folder.path())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    std::thread::sleep(Duration::from_millis(1500));
    let pid = child.id().to_string();
    assert!(
        Command::new("kill")
            .args(["-INT", &pid])
            .status()
            .unwrap()
            .success()
    );
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(130));
    assert!(output.stdout.is_empty());
    assert!(
        String::from_utf8(output.stderr)
            .unwrap()
            .contains("Interrupted")
    );
    assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 0);
}

#[test]
fn help_speaks_the_trade_and_its_examples_run() {
    let text = |arguments: &[&str]| {
        let output = binary().args(arguments).output().unwrap();
        assert!(output.status.success());
        String::from_utf8(output.stdout).unwrap()
    };
    assert!(text(&["--version"]).starts_with("stillflame "));
    let top = text(&["--help"]);
    for word in [
        "check",
        "flow",
        "modes",
        "sweep",
        "map",
        "Exit codes",
        "rig test",
    ] {
        assert!(top.contains(word), "{word}");
    }
    let folder = tempfile::tempdir().unwrap();
    for verb in VERBS {
        let help = text(&[verb, "--help"]);
        for option in ["--set", "--json", "--out"] {
            assert!(help.contains(option));
        }
        let (_, example) = help.split_once("Example:").unwrap();
        let example = example.replace("\\\n", " ").replace("200x200", "4x3");
        let program = env!("CARGO_BIN_EXE_stillflame");
        let networks = Path::new(env!("CARGO_MANIFEST_DIR")).join("networks");
        let line = example
            .trim()
            .replace("stillflame ", &format!("{program} "))
            .replace("networks/", &format!("{}/", networks.display()));
        let status = Command::new("sh")
            .args(["-c", &line])
            .current_dir(folder.path())
            .stdout(Stdio::null())
            .status()
            .unwrap();
        assert!(status.success(), "{line}");
    }
    for written in ["map.svg", "sweep.svg", "locus.svg", "sweep.csv"] {
        let file = format!("results/swirl_rig_{written}");
        assert!(folder.path().join(&file).is_file(), "{file}");
    }
}
