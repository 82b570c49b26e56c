//! Widths of strings from the embedded font, wrapping, and numbers as they are printed.
//!
//! The subset carries no kerning, so the width of a string is `size / em * sum(advance)`: the
//! viewer and this file agree exactly.

use std::sync::OnceLock;

use ttf_parser::Face;

/// Weight of the one sans-serif family.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Weight {
    /// 400.
    Regular,
    /// 600.
    Semibold,
}

/// Height of capitals and of lining figures, as a fraction of the font size.
pub const CAP_HEIGHT: f64 = 0.727;
/// Depth of descenders below the baseline, as a fraction of the font size.
pub const DESCENT: f64 = 0.21;

static REGULAR: &[u8] = include_bytes!("assets/sans-regular.ttf");
static SEMIBOLD: &[u8] = include_bytes!("assets/sans-semibold.ttf");

fn face(weight: Weight) -> Option<&'static Face<'static>> {
    static FACES: [OnceLock<Option<Face<'static>>>; 2] = [OnceLock::new(), OnceLock::new()];
    let [regular, semibold] = &FACES;
    let (slot, bytes) = match weight {
        Weight::Regular => (regular, REGULAR),
        Weight::Semibold => (semibold, SEMIBOLD),
    };
    slot.get_or_init(|| Face::parse(bytes, 0).ok()).as_ref()
}

/// Whether the embedded font has a glyph for `c`; the viewer's own sans-serif serves otherwise.
pub fn covers(c: char) -> bool {
    face(Weight::Regular).is_some_and(|f| f.glyph_index(c).is_some())
}

/// Width of `text` in px at font size `size` px.
///
/// A character outside the subset counts one full em, which no ordinary fallback glyph exceeds.
pub fn width(text: &str, weight: Weight, size: f64) -> f64 {
    let Some(face) = face(weight) else {
        return size * text.chars().count() as f64;
    };
    let em = f64::from(face.units_per_em());
    let advance = |c: char| {
        face.glyph_index(c)
            .and_then(|g| face.glyph_hor_advance(g))
            .map_or(em, f64::from)
    };
    size / em * text.chars().map(advance).sum::<f64>()
}

/// User text made fit to print: control characters and runs of blanks become one blank, and a
/// hyphen that stands for a sign becomes a true minus (U+2212).
pub fn tidy(text: &str) -> String {
    let words: Vec<&str> = text
        .split(|c: char| c.is_whitespace() && c != '\u{a0}' && c != '\u{202f}' || c.is_control())
        .filter(|w| !w.is_empty())
        .collect();
    let line: Vec<char> = words
        .join(" ")
        .chars()
        // No characters of XML, and marks that turn the direction of writing.
        .filter(|&c| {
            !matches!(c, '\u{fffe}' | '\u{ffff}' | '\u{200e}' | '\u{200f}')
                && !matches!(c, '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}')
        })
        .collect();
    let mut out = String::with_capacity(line.len());
    for (i, &c) in line.iter().enumerate() {
        let before = i.checked_sub(1).and_then(|k| line.get(k)).copied();
        let after = line.get(i + 1).copied();
        let sign = c == '-'
            && before.is_none_or(|b| " ([=,;".contains(b))
            && after.is_some_and(|a| a.is_ascii_digit() || a == '.');
        out.push(if sign { '\u{2212}' } else { c });
    }
    out
}

/// `text` cut to `limit` px with an ellipsis where it does not fit.
pub fn fit(text: &str, weight: Weight, size: f64, limit: f64) -> String {
    if width(text, weight, size) <= limit {
        return text.to_string();
    }
    let mut kept: Vec<char> = text.chars().collect();
    while kept.pop().is_some() {
        let short: String = kept.iter().collect();
        let short = format!("{}…", short.trim_end());
        if width(&short, weight, size) <= limit {
            return short;
        }
    }
    String::new()
}

/// `text` in at most `lines` lines of `limit` px: broken at blanks, but not between a number and its
/// unit or behind a sign, inside a word only where the word alone is too long; the last line is cut
/// with an ellipsis where the rest does not fit.
pub fn wrap(text: &str, weight: Weight, size: f64, limit: f64, lines: usize) -> Vec<String> {
    let mut out: Vec<String> = Vec::new();
    let mut rest = text.trim();
    while !rest.is_empty() && out.len() < lines {
        if out.len() + 1 == lines {
            out.push(fit(rest, weight, size, limit));
            break;
        }
        let (line, left) = first_line(rest, weight, size, limit);
        if line.is_empty() {
            break;
        }
        out.push(line.to_string());
        rest = left;
    }
    out
}

fn first_line(text: &str, weight: Weight, size: f64, limit: f64) -> (&str, &str) {
    if width(text, weight, size) <= limit {
        return (text, "");
    }
    let fits = |end: usize| {
        text.get(..end)
            .is_some_and(|s| width(s.trim_end(), weight, size) <= limit)
    };
    let at_blank = text
        .match_indices(' ')
        .map(|(i, _)| i)
        .take_while(|&i| fits(i))
        .filter(|&i| text.get(..i).is_some_and(may_end))
        .last();
    let inside = || {
        text.char_indices()
            .map(|(i, _)| i)
            .take_while(|&i| fits(i))
            .filter(|&i| text.get(..i).is_some_and(|t| !t.ends_with('\u{2212}')))
            .last()
    };
    let cut = at_blank.filter(|&i| i > 0).or_else(inside).unwrap_or(0);
    let (head, tail) = text.split_at(cut);
    (head.trim_end(), tail.trim_start())
}

/// Whether a line may end here: not behind a sign, a number, whose unit or thing counted follows, or
/// an open bracket of a unit.
fn may_end(line: &str) -> bool {
    let word = line.rsplit(' ').next().unwrap_or(line);
    let digit = |c: char| c.is_ascii_digit() || "⁰¹²³⁴⁵⁶⁷⁸⁹".contains(c);
    let part = |c: char| digit(c) || ".−+±-×⁻".contains(c);
    let number = word.contains(digit) && word.chars().all(part);
    let sign = matches!(word, "\u{2212}" | "-" | "+" | "±");
    let open = word
        .rfind("/(")
        .is_some_and(|at| !word.get(at..).unwrap_or_default().contains(')'));
    !(number || sign || open)
}

/// `value` with `decimals` decimals, a true minus sign, and no negative zero.
pub fn fixed(value: f64, decimals: usize) -> String {
    let digits = format!("{:.*}", decimals, value.abs());
    let zero = digits.chars().all(|c| matches!(c, '0' | '.'));
    if value < 0.0 && !zero {
        format!("\u{2212}{digits}")
    } else {
        digits
    }
}

/// Labels for a set of tick values, equally precise: fixed point where that stays short, and
/// `m×10ⁿ` with one shared exponent otherwise.
pub fn tick_labels(values: &[f64]) -> Vec<String> {
    let largest = values.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
    let step = values
        .windows(2)
        .filter_map(|w| {
            if let [a, b] = w {
                Some((b - a).abs())
            } else {
                None
            }
        })
        .fold(f64::INFINITY, f64::min);
    let unit = if step.is_finite() && step > 0.0 {
        step
    } else {
        largest
    };
    if largest == 0.0 || unit <= 0.0 || !unit.is_finite() {
        return values.iter().map(|&v| fixed(v, 0)).collect();
    }
    if largest < 1e5 && unit >= 1e-4 {
        let decimals = decimals(unit);
        return values.iter().map(|&v| fixed(v, decimals)).collect();
    }
    let exponent = largest.log10().floor();
    let scale = 10f64.powf(exponent);
    let decimals = decimals(unit / scale);
    let power: String = format!("{exponent:.0}").chars().map(superscript).collect();
    let label = |&v: &f64| {
        if v == 0.0 {
            "0".to_string()
        } else {
            format!("{}×10{power}", fixed(v / scale, decimals))
        }
    };
    values.iter().map(label).collect()
}

/// Fewest decimals, up to 8, that print a multiple of `unit` to a thousandth of itself.
fn decimals(unit: f64) -> usize {
    (0..8)
        .find(|&d| {
            let scaled = unit * 10f64.powi(d);
            (scaled - scaled.round()).abs() < 1e-3 * scaled.max(1e-12) && scaled.round() > 0.0
        })
        .map_or(8, |d| d as usize)
}

fn superscript(c: char) -> char {
    match c {
        '0' => '⁰',
        '1' => '¹',
        '2' => '²',
        '3' => '³',
        '4' => '⁴',
        '5' => '⁵',
        '6' => '⁶',
        '7' => '⁷',
        '8' => '⁸',
        '9' => '⁹',
        '-' => '⁻',
        other => other,
    }
}
