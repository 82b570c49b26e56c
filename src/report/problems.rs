//! Problems for a terminal or a log: each with its place, the line it stands in, a mark under the
//! very words, what is wrong and what would be right.
//!
//! Plain text without colour, so that it reads the same in a log. Two blanks mark the layers:
//!
//! ```text
//! rig.toml:14:12  error  `chamber.length`
//!   length   = "0.5 ms"
//!              ~~~~~~~~
//!   `ms` is a unit of time, and a length is wanted.
//!   Hint: a length may be in m, mm, cm, um, km, in or ft.
//! ```

use std::fmt::Write;

use crate::problems::{Place, Problem, Severity};

/// Widest part of a source line shown (characters).
const WIDEST: usize = 100;

/// Problems one below the other, and a last line that counts them. Empty for no problems.
pub fn render(problems: &[Problem]) -> String {
    let mut out = String::new();
    for problem in problems {
        one(&mut out, problem);
        out.push('\n');
    }
    let count = |s: Severity| problems.iter().filter(|p| p.severity == s).count();
    let (errors, warnings) = (count(Severity::Error), count(Severity::Warning));
    let plural = |n: usize, word: &str| match n {
        1 => format!("1 {word}"),
        n => format!("{n} {word}s"),
    };
    let counts = match (errors, warnings) {
        (0, 0) => return out,
        (e, 0) => plural(e, "error"),
        (0, w) => plural(w, "warning"),
        (e, w) => format!("{}, {}", plural(e, "error"), plural(w, "warning")),
    };
    out.push_str(&counts);
    out.push('\n');
    out
}

fn one(out: &mut String, problem: &Problem) {
    let severity = match problem.severity {
        Severity::Warning => "warning",
        Severity::Error => "error",
    };
    let subject = visible(&problem.subject);
    // Writing to a string cannot fail.
    let _ = match &problem.place {
        Some(p) => writeln!(
            out,
            "{}:{}:{}  {severity}  `{subject}`",
            visible(&p.source),
            p.line,
            p.column
        ),
        None => writeln!(out, "{severity}  `{subject}`"),
    };
    if let Some(place) = &problem.place
        && !place.text.trim().is_empty()
    {
        let (line, mark) = excerpt(place);
        let _ = write!(out, "  {line}\n  {mark}\n");
    }
    let _ = writeln!(out, "  {}", sentence(&problem.what));
    if let Some(hint) = &problem.hint {
        let _ = writeln!(out, "  Hint: {}", sentence_as_is(hint));
    }
}

/// The part of the line about the mark, and a line of `~` under the marked characters.
fn excerpt(place: &Place) -> (String, String) {
    let chars: Vec<char> = visible(&place.text).chars().collect();
    let indent = chars.iter().take_while(|c| **c == ' ').count();
    let at = place.column.saturating_sub(1).min(chars.len());
    let from = if chars.len().saturating_sub(indent) <= WIDEST {
        indent.min(at)
    } else {
        // A third of the width leads up to the mark.
        at.saturating_sub(WIDEST / 3).max(indent.min(at))
    };
    let to = chars.len().min(from + WIDEST);
    let lead = if from > indent { "..." } else { "" };
    let trail = if to < chars.len() { "..." } else { "" };
    let shown: String = chars.get(from..to).unwrap_or_default().iter().collect();
    let width = place.width.min(to.saturating_sub(at)).max(1);
    let mark = format!(
        "{}{}",
        " ".repeat(lead.len() + at - from),
        "~".repeat(width)
    );
    (format!("{lead}{shown}{trail}"), mark)
}

/// Text as one line that a terminal shows character by character: no tab, escape or control.
pub(super) fn visible(text: &str) -> String {
    text.chars()
        .map(|c| match c {
            '\t' => ' ',
            c if c.is_control() || turns_text(c) => '\u{fffd}',
            c => c,
        })
        .collect()
}

/// Marks and overrides of writing direction, which make a line read otherwise than it is written.
fn turns_text(c: char) -> bool {
    matches!(c, '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}')
}

/// A message with a capital where it begins with a word, and a full stop.
fn sentence(text: &str) -> String {
    let text = visible(text);
    let mut chars = text.chars();
    let capital: String = match chars.next() {
        Some(first) => first.to_uppercase().chain(chars).collect(),
        None => text,
    };
    sentence_as_is(&capital)
}

fn sentence_as_is(text: &str) -> String {
    let text = visible(text);
    if text.ends_with(['?', '.', '!']) {
        text
    } else {
        format!("{text}.")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn placed(text: &str, column: usize, width: usize) -> Problem {
        Problem::error("chamber.length", "this is wrong")
            .hint("did you mean `x`?")
            .at(Place {
                source: "rig.toml".to_owned(),
                line: 14,
                column,
                width,
                text: text.to_owned(),
            })
    }

    #[test]
    fn the_mark_stands_under_its_words() {
        let text = render(&[placed("  length\t= \"0.5 ms\"", 12, 8)]);
        let expected = "rig.toml:14:12  error  `chamber.length`\n  length = \"0.5 ms\"\n           ~~~~~~~~\n  \
                        This is wrong.\n  Hint: did you mean `x`?\n\n1 error\n";
        assert_eq!(text, expected);
    }

    #[test]
    fn nothing_turns_the_direction_of_writing() {
        for c in ['\u{202e}', '\u{2066}', '\u{200f}'] {
            assert_eq!(visible(&format!("a{c}b")), "a\u{fffd}b");
        }
        assert_eq!(visible("Brüder \u{5d0}"), "Brüder \u{5d0}");
    }

    #[test]
    fn long_and_hostile_lines_stay_short_and_harmless() {
        let line = format!("{}WRONG{}\u{1b}[31m", "a".repeat(5000), "b".repeat(5000));
        let text = render(&[placed(&line, 5001, 5)]);
        assert!(text.lines().all(|l| l.chars().count() < 120), "{text}");
        let lines: Vec<&str> = text.lines().collect();
        assert_eq!(lines[1].find("WRONG"), lines[2].find("~~~~~"));
        assert!(!render(&[placed("\u{1b}[31m", 1, 1)]).contains('\u{1b}'));
    }

    #[test]
    fn a_mark_outside_its_line_does_no_harm() {
        assert!(render(&[placed("short", 400, 400)]).contains('~'));
        assert_eq!(render(&[]), "");
    }
}
