//! The page `docs/network-file.md` is what the program does: it equals its generated text, leaves no key
//! untold, and the networks in it and in the README read.

#[path = "../examples/network_file_reference/text.rs"]
mod text;

use std::path::Path;

use stillflame::input;
use stillflame::problems::Problems;

fn file(name: &str) -> std::io::Result<String> {
    std::fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join(name))
}

/// Reads every fenced block of TOML in a page; returns how many there are.
fn read_networks(name: &str, page: &str) -> Result<usize, Problems> {
    let mut count = 0;
    for block in page.split("```toml\n").skip(1) {
        input::parse(name, block.split("```").next().unwrap_or_default(), &[])?;
        count += 1;
    }
    Ok(count)
}

#[test]
fn the_committed_page_is_the_generated_one() {
    let (committed, generated) = (file("docs/network-file.md").unwrap(), text::reference());
    let mut pairs = committed.lines().zip(generated.lines());
    let line = pairs.position(|(a, b)| a != b).map(|i| i + 1);
    assert!(
        committed == generated,
        "docs/network-file.md differs from its generated text (line {line:?}); write it anew with\n  \
         cargo run --release --example network_file_reference > docs/network-file.md"
    );
}

#[test]
fn every_key_is_told_with_what_its_absence_means() {
    let page = text::reference();
    assert!(
        !page.contains(text::UNTOLD),
        "a key without default is untold"
    );
    for (table, specs) in text::TABLES {
        for spec in *specs {
            let (start, end) = (format!("| `{}` |", spec.key), format!("| {} |", spec.doc));
            let told = |l: &str| l.starts_with(&start) && l.ends_with(&end);
            assert!(page.lines().any(told), "{} of {table} is missing", spec.key);
        }
    }
}

#[test]
fn networks_on_the_page_and_in_the_readme_read() {
    assert_eq!(read_networks("page", &text::reference()).unwrap(), 2);
    assert_eq!(
        read_networks("README.md", &file("README.md").unwrap()).unwrap(),
        1
    );
}
