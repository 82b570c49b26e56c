//! The measured figures of `docs/validation.md`.
//!
//! In the page a figure stands between `<!-- = NAME -->` and `<!-- / -->`. The test that measures it holds the page to
//! it. Renew them all: `STILLFLAME_RENEW=1 cargo test --release`.

use std::path::PathBuf;
use std::sync::{Mutex, PoisonError};

/// How much larger than told a largest difference may be: rounding differs from machine to machine.
const MACHINES: f64 = 10.0;

/// Tests of one binary run side by side.
static PAGE: Mutex<()> = Mutex::new(());

/// Holds a count, which is the same everywhere.
pub fn count(name: &str, value: usize) {
    let text = grouped(value);
    hold(name, &text, |told| told == text);
}

/// Holds a count that rounding moves, to a tenth or five.
pub fn about(name: &str, value: usize) {
    let near = |told: &str| {
        let told = told.replace(',', "").parse::<usize>();
        told.is_ok_and(|told| told.abs_diff(value) <= 5.max(told / 10))
    };
    hold(name, &grouped(value), near);
}

/// `21,490`.
fn grouped(value: usize) -> String {
    let digits = value.to_string();
    let mut text = String::new();
    for (i, digit) in digits.chars().enumerate() {
        if i > 0 && (digits.len() - i).is_multiple_of(3) {
            text.push(',');
        }
        text.push(digit);
    }
    text
}

/// Holds the largest difference met, told in one digit.
pub fn worst(name: &str, value: f64) {
    assert!(value.is_finite() && value >= 0.0, "{name}: {value}");
    let fits = |told: &str| {
        told.parse::<f64>()
            .is_ok_and(|told| value <= MACHINES * told)
    };
    hold(name, &format!("{value:.0e}"), fits);
}

fn hold(name: &str, measured: &str, fits: impl Fn(&str) -> bool) {
    let _one = PAGE.lock().unwrap_or_else(PoisonError::into_inner);
    let file = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("docs/validation.md");
    let page = std::fs::read_to_string(&file).unwrap();
    let before = format!("<!-- = {name} -->");
    let (head, rest) = page
        .split_once(&before)
        .unwrap_or_else(|| panic!("docs/validation.md has no figure {name}"));
    let (told, tail) = rest.split_once("<!-- / -->").unwrap();
    if std::env::var_os("STILLFLAME_RENEW").is_some() {
        std::fs::write(&file, format!("{head}{before}{measured}<!-- / -->{tail}")).unwrap();
        return;
    }
    assert!(
        fits(told),
        "docs/validation.md tells {told} of {name}, measured is {measured}; renew it with\n  \
         STILLFLAME_RENEW=1 cargo test --release"
    );
}
