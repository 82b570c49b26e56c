//! Files that are no networks, and a file of many mistakes.

use std::path::Path;

use stillflame::input;
use stillflame::problems::{Problem, Problems, Severity};

use crate::case::{assert_well_told, edited, problems};
use crate::cli::{json, run};
use crate::shipped;

/// Every verb, with what it must be told beside the network.
const VERBS: [&[&str]; 4] = [
    &["check"],
    &["flow"],
    &["modes"],
    &[
        "map",
        "--across",
        "main_flame.delay = 0 ms to 10 ms",
        "--up",
        "main_flame.interaction_index = 0 to 2",
    ],
];

/// The only problem of a file, which every verb tells too, in words and as JSON.
fn only_problem(path: &Path) -> Problem {
    let Err(Problems(mut all)) = input::read(path, &[]) else {
        panic!("{} was read", path.display());
    };
    assert_eq!(all.len(), 1, "{all:?}");
    let problem = all.remove(0);
    assert_eq!(problem.severity, Severity::Error);
    assert!(problem.hint.is_some());
    assert_eq!(problem.subject, path.display().to_string());
    for words in VERBS {
        let (verb, more) = words.split_first().unwrap();
        let ran = run(verb, path, more);
        assert_eq!((ran.code, ran.stdout.as_str()), (Some(1), ""));
        assert!(ran.stderr.contains(&problem.subject) && ran.stderr.ends_with("1 error\n"));
        assert!(!ran.stderr.contains("panicked"));
        let (value, code) = json(verb, path, more);
        assert_eq!(code, Some(1));
        assert_eq!(value["schema"], "stillflame/problems");
        assert_eq!(value["problems"].as_array().unwrap().len(), 1);
    }
    problem
}

#[test]
fn a_file_that_is_not_there_or_is_none() {
    let folder = tempfile::tempdir().unwrap();
    let at = |name: &str| folder.path().join(name);
    std::fs::write(at("rig_one.toml"), "x").unwrap();
    let hint = |p: Problem| p.hint.unwrap();
    let missing = only_problem(&at("rig_on.toml"));
    assert!(missing.what.contains("no such file"));
    assert!(hint(missing).contains("rig_one.toml?"));
    assert!(hint(only_problem(&at("elsewhere.toml"))).contains("check the path"));
    assert!(hint(only_problem(&at("nowhere/rig.toml"))).contains("no directory"));
    assert!(hint(only_problem(&at("rig_one.toml/rig.toml"))).contains("not a directory"));
    assert!(only_problem(folder.path()).what.contains("a directory"));
}

#[test]
fn bytes_that_are_no_network() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("rig.toml");
    let told = |bytes: &[u8]| {
        std::fs::write(&path, bytes).unwrap();
        only_problem(&path)
    };
    for empty in ["", "\n \n\t\n", "# only a remark\n", "\u{feff}"] {
        let p = told(empty.as_bytes());
        assert!(p.what.contains("the file is empty"), "{p}");
        let place = p.place.unwrap();
        assert_eq!((place.line, place.column, place.text.as_str()), (1, 1, ""));
    }
    let latin: Vec<u8> = shipped("swirl_rig")
        .replace("1800 K", "1527 °C")
        .chars()
        .map(|c| u8::try_from(u32::from(c)).unwrap())
        .collect();
    let p = told(&latin);
    assert!(
        p.what.contains("0xb0") && p.what.contains("not UTF-8"),
        "{p}"
    );
    assert!(p.hint.unwrap().contains("degree sign"));
    let place = p.place.unwrap();
    assert_eq!((place.line, place.column), (45, 27));
    assert!(told(b"\x7fELF\x02\x01\x01\0\0\0").what.contains("not text"));
    let utf16: Vec<u8> = std::iter::once(0xfeff)
        .chain("title = \"x\"".encode_utf16())
        .flat_map(u16::to_le_bytes)
        .collect();
    assert!(told(&utf16).hint.unwrap().contains("UTF-16"));
    assert!(
        told(&[0x89, b'P', b'N', b'G', 0xff])
            .what
            .contains("not UTF-8")
    );
    let p = told(&vec![b'x'; 50_000_000]);
    assert!(
        p.what.contains("47.7 MiB") && p.what.contains("1 MiB"),
        "{p}"
    );
    assert!(p.hint.unwrap().contains("few kilobytes"));
}

/// A large file of another purpose is refused with a few problems, not with a hundred thousand.
#[test]
fn large_files_of_other_purpose_are_told_of_in_short() {
    let numbered = |line: &dyn Fn(usize) -> String| (0..60_000).map(line).collect::<String>();
    for text in [
        numbered(&|i| format!("key{i} = {i}\n")),
        numbered(&|_| "key = 1\n".to_owned()),
        numbered(&|_| "key = 1 m\n".to_owned()),
        numbered(&|_| "[key\n".to_owned()),
        numbered(&|_| "[[element]]\n".to_owned()),
        numbered(&|i| format!("[table{i}]\n")),
        format!("key = {}", "[".repeat(500_000)),
    ] {
        let all = problems(&text, &[]);
        let start: String = text.chars().take(30).collect();
        assert!((1..=50).contains(&all.len()), "{}: {start}", all.len());
        all.iter().for_each(assert_well_told);
    }
}

#[test]
fn a_mark_of_byte_order_and_line_ends_of_another_system_are_no_mistake() {
    let text = format!("\u{feff}{}", shipped("swirl_rig").replace('\n', "\r\n"));
    assert_eq!(problems(&text, &[]), []);
}

#[test]
fn ten_mistakes_are_told_in_one_run() {
    let text = edited(
        &shipped("swirl_rig"),
        &[
            ("\"20 to 800 Hz\"", "\"800 to 20 Hz\""),
            ("\"30 g/s\"", "\"30 m/s\""),
            ("\"300 K\"", "\"-300 degC\""),
            ("\"101325 Pa\"", "101325"),
            ("\"0.50 m\"", "0.50 m"),
            (
                "effective_length = \"10 mm\"",
                "efective_length = \"10 mm\"",
            ),
            ("\"30 mm\"", "\"nan mm\""),
            ("\"expansion\"", "\"expantion\""),
            ("mixing_tube.out", "mixing_tub.out"),
            ("name     = \"chamber\"", "name     = \"plenum\""),
            ("end = \"open\"", "end = \"opne\""),
        ],
    );
    let expected = [
        (10, "search.frequency", "inverted"),
        (15, "feed.mass_flow", "unit of velocity"),
        (16, "feed.temperature", "greater than zero"),
        (17, "feed.pressure", "no unit"),
        (23, "plenum.length", "without quotes"),
        (29, "nozzle_in.efective_length", "no key"),
        (35, "mixing_tube.diameter", "not finite"),
        (39, "dump.kind", "no kind"),
        (46, "main_flame.response.reference", "nothing is named"),
        (49, "element.6.name", "names the element on line 21"),
        (55, "exit.end", "no end"),
    ];
    let all = problems(&text, &[]);
    for problem in &all {
        assert_well_told(problem);
    }
    let found: Vec<(usize, &str)> = all
        .iter()
        .map(|p| (p.place.as_deref().unwrap().line, p.subject.as_str()))
        .collect();
    assert_eq!(found, expected.map(|(line, subject, _)| (line, subject)));
    for (problem, (_, _, word)) in all.iter().zip(expected) {
        assert!(problem.what.contains(word), "{problem}");
    }

    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("rig.toml");
    std::fs::write(&path, text).unwrap();
    let ran = run("modes", &path, &["--set", "plenum.lengt = 1 m"]);
    assert_eq!((ran.code, ran.stdout.as_str()), (Some(1), ""));
    assert!(ran.stderr.ends_with("12 errors\n"), "{}", ran.stderr);
}
