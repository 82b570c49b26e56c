//! The page `docs/network-file.md` is what the program does: it equals its generated text, leaves no key
//! untold, and the networks in it read.

#[path = "../examples/network_file_reference/text.rs"]
mod text;

use std::path::Path;

use stillflame::elements::knob::KnobSpec;
use stillflame::elements::{
    GAS_KNOBS, area_change, duct,
    ends::{EXIT_KNOBS, FEED_KNOBS},
    flame, plenum, restriction,
};
use stillflame::input;

/// The fenced blocks of TOML in a page.
fn networks(page: &str) -> Vec<&str> {
    let blocks = page.split("```toml\n").skip(1);
    blocks.filter_map(|b| b.split("```").next()).collect()
}

#[test]
fn the_committed_page_is_the_generated_one() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("docs/network-file.md");
    let committed = std::fs::read_to_string(path).unwrap();
    let generated = text::reference();
    let differs = committed
        .lines()
        .zip(generated.lines())
        .position(|(a, b)| a != b);
    assert!(
        committed == generated,
        "docs/network-file.md differs from its generated text (first at line {:?}); write it anew with\n  \
         cargo run --release --example network_file_reference > docs/network-file.md",
        differs.map(|i| i + 1)
    );
}

#[test]
fn every_key_is_told_with_what_its_absence_means() {
    let page = text::reference();
    assert!(
        !page.contains("UNTOLD"),
        "a key without default is not told"
    );
    let tables: [&[KnobSpec]; 9] = [
        FEED_KNOBS,
        GAS_KNOBS,
        duct::KNOBS,
        area_change::KNOBS,
        restriction::KNOBS,
        plenum::KNOBS,
        flame::KNOBS,
        flame::RESPONSE_KNOBS,
        EXIT_KNOBS,
    ];
    for spec in tables.iter().flat_map(|t| t.iter()) {
        let row = format!("| `{}` |", spec.key);
        assert!(
            page.lines()
                .any(|l| l.starts_with(&row) && l.ends_with(&format!("| {} |", spec.doc))),
            "{} is missing",
            spec.key
        );
    }
}

#[test]
fn networks_on_the_page_read_without_problems() {
    let page = text::reference();
    let found = networks(&page);
    assert_eq!(found.len(), 2);
    for (i, network) in found.into_iter().enumerate() {
        let name = format!("network {} of the page", i + 1);
        if let Err(problems) = input::parse(&name, network, &[]) {
            panic!("{problems}");
        }
    }
}

#[test]
fn networks_in_the_readme_read_without_problems() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("README.md");
    let readme = std::fs::read_to_string(path).unwrap();
    let found = networks(&readme);
    assert!(!found.is_empty());
    for network in found {
        if let Err(problems) = input::parse("README.md", network, &[]) {
            panic!("{problems}");
        }
    }
}
