//! Every JSON document of every verb says what it is, and holds every warning that people are told.

#[path = "common/cli.rs"]
mod cli;

use std::path::Path;
use std::process::Command;

use cli::{NETWORKS, json, network, run};
use serde_json::Value;

/// Verbs with a JSON answer, and what they need beside the network.
const ANSWERING: &[(&str, &[&str])] = &[
    ("check", &[]),
    ("flow", &[]),
    ("modes", &[]),
    ("modes", &["--shapes", "--explain"]),
    (
        "map",
        &[
            "--across",
            "feed.temperature = 300 K to 340 K",
            "--up",
            "main_flame.burnt_temperature = 1500 K to 1700 K",
            "--points",
            "2x2",
        ],
    ),
    (
        "sweep",
        &[
            "--vary",
            "feed.temperature = 300 K to 340 K",
            "--points",
            "3",
        ],
    ),
];

/// Verbs without one, and one that asks for a record and is tried in `cli_spectrum.rs`.
const SILENT: &[&str] = &["completions", "manual", "help", "spectrum"];

/// Changes that call for warnings, where the verb takes them.
const CHANGES: &[&[&str]] = &[
    &[],
    &["--set", "main_flame.burnt_temperature = 2600 K"],
    &["--frequency", "20 to 2200 Hz"],
    &["--growth", "-300 to 5 1/s"],
];

/// The verbs of the program as its help lists them.
fn verbs() -> Vec<String> {
    let output = Command::new(env!("CARGO_BIN_EXE_stillflame"))
        .arg("--help")
        .output()
        .unwrap();
    let help = String::from_utf8(output.stdout).unwrap();
    let listed = help.lines().skip_while(|l| *l != "Commands:").skip(1);
    let listed = listed.take_while(|l| l.starts_with("  "));
    let words = listed.filter_map(|l| l.split_whitespace().next());
    words.map(str::to_owned).collect()
}

/// Cases of the verbs there are.
fn cases() -> Vec<(&'static str, Vec<&'static str>)> {
    let verbs = verbs();
    for verb in &verbs {
        let known = ANSWERING.iter().any(|(v, _)| v == verb) || SILENT.contains(&verb.as_str());
        assert!(known, "`{verb}` is not tried here");
    }
    let there = ANSWERING
        .iter()
        .filter(|(v, _)| verbs.iter().any(|w| w == v));
    let takes_window = |verb: &str| !matches!(verb, "check" | "flow");
    there
        .flat_map(|(verb, needs)| {
            let changes = CHANGES.iter().filter(move |c| {
                c.first()
                    .is_none_or(|o| *o == "--set" || takes_window(verb))
            });
            changes.map(move |c| (*verb, [needs, *c].concat()))
        })
        .collect()
}

fn check_document(value: &Value, schema: &str) {
    assert_eq!(value["schema"], schema);
    assert_eq!(value["version"], 1, "{schema}");
    let program = value["program"].as_str().unwrap();
    assert_eq!(program, concat!("stillflame ", env!("CARGO_PKG_VERSION")));
    let lists = ["warnings", "problems"].map(|l| value[l].as_array());
    for remark in lists.into_iter().flatten().flatten() {
        for field in ["subject", "message"] {
            assert!(!remark[field].as_str().unwrap().is_empty(), "{remark}");
        }
        let place = ["file", "line", "column"].map(|f| !remark[f].is_null());
        assert!(place == [true; 3] || place == [false; 3], "{remark}");
        assert!(remark["hint"].is_string() || remark["hint"].is_null());
    }
}

/// Lines that open a warning in a report for people.
fn told(report: &str) -> usize {
    let opens = |l: &&str| {
        let line = l.trim_end();
        (line.starts_with("warning  `") || line.contains("  warning  `")) && line.ends_with('`')
    };
    report.lines().filter(opens).count()
}

#[test]
fn every_document_says_what_it_is_and_holds_every_warning() {
    let mut seen = 0;
    for (verb, arguments) in cases() {
        for name in NETWORKS {
            let file = network(name);
            let folder = tempfile::tempdir().unwrap();
            let out = folder.path().to_str().unwrap();
            let (value, code) = json(verb, &file, &arguments);
            let schema = match value["problems"].is_array() {
                true => "stillflame/problems".to_owned(),
                false => format!("stillflame/{verb}"),
            };
            check_document(&value, &schema);
            let people = run(verb, &file, &[&arguments[..], &["--out", out]].concat());
            assert_eq!(people.code, code, "{verb} {arguments:?} {name}");
            let report = format!("{}{}", people.stdout, people.stderr);
            let warnings = value["warnings"].as_array().unwrap();
            assert_eq!(
                told(&report),
                warnings.len(),
                "{verb} {arguments:?} {name}: {warnings:#?}\n{report}"
            );
            for warning in warnings {
                // The report begins its sentence with a capital.
                let message = warning["message"].as_str().unwrap();
                let rest: String = message.chars().skip(1).collect();
                assert!(report.contains(&rest), "{message}\n{report}");
            }
            seen += warnings.len();
        }
    }
    assert!(seen >= 60, "only {seen} warnings were called for");
}

#[test]
fn a_refusal_is_a_document_as_well() {
    let folder = tempfile::tempdir().unwrap();
    let broken = folder.path().join("broken.toml");
    let text = std::fs::read_to_string(network("swirl_rig")).unwrap();
    let text = text.replace(
        "kind     = \"duct\"\nlength   = \"0.70 m\"",
        "kind = \"duct\"\nlength = \"-1 s\"",
    );
    std::fs::write(&broken, text).unwrap();
    let absent = folder.path().join("absent.toml");
    for (verb, arguments) in cases() {
        for file in [&broken, &absent] {
            let file: &Path = file;
            let (value, code) = json(verb, file, &arguments);
            assert_eq!(code, Some(1), "{verb}");
            check_document(&value, "stillflame/problems");
            assert!(!value["problems"].as_array().unwrap().is_empty());
            let again = run(verb, file, &[&["--json"], &arguments[..]].concat());
            // One line, nothing after it.
            assert_eq!(again.stdout.lines().count(), 1);
            assert!(again.stdout.ends_with("}\n"));
        }
    }
}
