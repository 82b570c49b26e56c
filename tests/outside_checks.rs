//! The page `docs/outside-checks.md` is what the program computes.

#[path = "../examples/outside_checks/text.rs"]
mod text;

#[test]
fn the_committed_page_is_the_generated_one() {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/docs/outside-checks.md");
    let (committed, generated) = (
        std::fs::read_to_string(path).unwrap(),
        text::page().unwrap(),
    );
    let mut pairs = committed.lines().zip(generated.lines());
    let line = pairs.position(|(a, b)| a != b).map(|i| i + 1);
    assert!(
        committed == generated,
        "docs/outside-checks.md differs from its generated text (line {line:?}); write it anew with\n  \
         cargo run --release --example outside_checks > docs/outside-checks.md"
    );
}
