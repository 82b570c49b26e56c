//! Damage of every kind done to sound networks.

use std::ops::Range;

use proptest::prelude::*;
use stillflame::input;
use stillflame::problems::{Problems, Severity};

use crate::case::assert_well_told;
use crate::cli::NETWORKS;
use crate::shipped;

/// Reads a text; whatever is wrong with it is well told.
fn read(text: &str, sets: &[String]) {
    match input::parse("rig.toml", text, sets) {
        Ok(_) => {}
        Err(Problems(all)) => {
            assert!(all.iter().any(|p| p.severity == Severity::Error));
            all.iter().for_each(assert_well_told);
        }
    }
}

#[test]
fn every_beginning_of_a_network_is_read() {
    for name in NETWORKS {
        let text = shipped(name);
        for end in (0..text.len()).filter(|i| text.is_char_boundary(*i)) {
            read(&text[..end], &[]);
        }
    }
}

/// Each number of a network's tables: its bytes with the quotes about them, and the key it stands
/// under.
fn numbers(text: &str) -> Vec<(Range<usize>, String)> {
    let mut found = Vec::new();
    let mut at = 0;
    for line in text.split_inclusive('\n') {
        let body = line.split('#').next().unwrap();
        // Inline tables hold several statements in a line.
        let mut from = 0;
        for part in body.split_inclusive(['{', ',', '}']) {
            if let Some((key, value)) = part.split_once('=') {
                let value = value.trim_end_matches(['}', ',', '{', '\n', ' ']);
                let start = part.len() - part.split_once('=').unwrap().1.len();
                let blank = value.len() - value.trim_start().len();
                let value = value.trim();
                let bare = value.trim_start_matches(['"', '-']);
                if bare.starts_with(|c: char| c.is_ascii_digit()) {
                    let start = at + from + start + blank;
                    let key = key.trim().trim_start_matches(['{', ',']).trim().to_owned();
                    found.push((start..start + value.len(), key));
                }
            }
            from += part.len();
        }
        at += line.len();
    }
    found
}

const GARBAGE: [&str; 16] = [
    "\"twelve mm\"",
    "\"\"",
    "nan",
    "inf",
    "\"nan m\"",
    "true",
    "[]",
    "{}",
    "1979-05-27",
    "\"1e999 m\"",
    "12 mm",
    "\"12 parsecs\"",
    "\"12",
    "\"1,5 m\"",
    "\"-1e999 K\"",
    "\"\u{0}\"",
];

#[test]
fn every_number_replaced_by_garbage_is_told_by_its_key() {
    let mut count = 0;
    for name in NETWORKS {
        let text = shipped(name);
        for (range, key) in numbers(&text) {
            for garbage in GARBAGE {
                let mut bad = text.clone();
                bad.replace_range(range.clone(), garbage);
                let Err(Problems(all)) = input::parse("rig.toml", &bad, &[]) else {
                    panic!("{name}: {key} = {garbage} was read");
                };
                all.iter().for_each(assert_well_told);
                let line = bad[..range.start].matches('\n').count() + 1;
                let named = all.iter().any(|p| {
                    p.severity == Severity::Error
                        && p.place.as_deref().unwrap().line == line
                        && p.subject.ends_with(&format!(".{key}"))
                });
                assert!(named, "{name}: {key} = {garbage}: {all:#?}");
                assert_eq!(all.len(), 1, "{name}: {key} = {garbage}: {all:#?}");
                count += 1;
            }
        }
    }
    assert!(count > 1000, "{count}");
}

fn any_network() -> impl Strategy<Value = String> {
    prop::sample::select(NETWORKS.to_vec()).prop_map(shipped)
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(400))]

    #[test]
    fn bytes_changed_taken_out_and_put_in_are_read(
        text in any_network(),
        changes in prop::collection::vec((any::<prop::sample::Index>(), any::<u8>(), 0usize..3), 1..6),
    ) {
        let mut bytes = text.into_bytes();
        for (at, byte, how) in changes {
            let at = at.index(bytes.len());
            match how {
                0 => bytes[at] = byte,
                1 => { bytes.remove(at); }
                _ => bytes.insert(at, byte),
            }
        }
        read(&String::from_utf8_lossy(&bytes), &[]);
    }

    #[test]
    fn marks_of_toml_put_anywhere_are_read(
        text in any_network(),
        changes in prop::collection::vec(
            (any::<prop::sample::Index>(), prop::sample::select(vec![
                "\"", "'", "[", "]", "{", "}", "=", ".", ",", "#", "\n", "\"\"\"", "'''", "[[", "\r", "\\", "\u{feff}", "e", "\t",
            ])),
            1..4,
        ),
    ) {
        let mut text = text;
        for (at, mark) in changes {
            let at = at.index(text.len());
            if text.is_char_boundary(at) {
                text.insert_str(at, mark);
            }
        }
        read(&text, &[]);
    }

    #[test]
    fn lines_in_another_order_are_read(text in any_network(), seed in any::<prop::sample::Index>(), step in 1usize..50) {
        let lines: Vec<&str> = text.lines().collect();
        let start = seed.index(lines.len());
        let mixed: Vec<&str> = (0..lines.len()).map(|i| lines[(start + i * step) % lines.len()]).collect();
        read(&mixed.join("\n"), &[]);
    }

    #[test]
    fn any_override_is_read(
        name in "[a-z_]{0,8}(\\.[a-z0-9]{0,6}){0,3}|chamber\\.(length|area)|main_flame\\.(delay|response\\.[0-9])",
        sign in "=| = |==|",
        value in "\\PC{0,12}|[0-9.]{1,4} ?(mm|ms|K)|\\{.{0,8}\\}?",
    ) {
        read(&shipped("swirl_rig"), &[format!("{name}{sign}{value}")]);
    }
}
