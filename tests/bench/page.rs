//! Figures as a page of `docs/` tells them.

use std::time::{SystemTime, UNIX_EPOCH};

use crate::machine::{Outcome, file};

/// Days since the epoch as a date (H. Hinnant, days from civil, from memory).
pub fn today() -> String {
    let now = SystemTime::now().duration_since(UNIX_EPOCH);
    let days = now.map_or(0, |d| d.as_secs() / 86_400) as i64 + 719_468;
    let era = days / 146_097;
    let of_era = days % 146_097;
    let year = (of_era - of_era / 1460 + of_era / 36_524 - of_era / 146_096) / 365;
    let of_year = of_era - (365 * year + year / 4 - year / 100);
    let shifted = (5 * of_year + 2) / 153;
    let day = of_year - (153 * shifted + 2) / 5 + 1;
    let month = if shifted < 10 {
        shifted + 3
    } else {
        shifted - 9
    };
    let year = era * 400 + year + i64::from(month <= 2);
    format!("{year}-{month:02}-{day:02}")
}

/// Puts figures between the marks `<!-- NAME -->` and `<!-- end of NAME -->` of a page.
pub fn write_between(page: &str, name: &str, figures: &str) -> Outcome<()> {
    let path = file(page);
    let text = std::fs::read_to_string(&path)?;
    let (begin, end) = (
        format!("<!-- {name} -->"),
        format!("<!-- end of {name} -->"),
    );
    let no_mark = || format!("{page} has no mark {begin}");
    let (before, rest) = text.split_once(&begin).ok_or_else(no_mark)?;
    let (_, after) = rest.split_once(&end).ok_or_else(no_mark)?;
    let new = format!("{before}{begin}\n\n{}\n\n{end}{after}", figures.trim());
    Ok(std::fs::write(path, new)?)
}

/// A time (s) in words.
pub fn time(t: f64) -> String {
    match t {
        t if t < 1e-7 => format!("{:.1} ns", t * 1e9),
        t if t < 1e-6 => format!("{:.0} ns", t * 1e9),
        t if t < 1e-4 => format!("{:.1} us", t * 1e6),
        t if t < 1e-3 => format!("{:.0} us", t * 1e6),
        t if t < 1.0 => format!("{:.2} ms", t * 1e3),
        t => format!("{t:.2} s"),
    }
}
