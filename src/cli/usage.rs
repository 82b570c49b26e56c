//! A command line that does not parse: told to people, and as JSON where that is asked for.

use std::ffi::OsString;
use std::process::ExitCode;

use clap::error::ErrorKind;

use super::{Status, output};
use crate::problems::Problem;
use crate::report::document;

/// Prints why the command line was refused, or the help or the version it asks for.
pub(super) fn refuse(refused: &clap::Error, arguments: &[OsString]) -> ExitCode {
    let answer = matches!(
        refused.kind(),
        ErrorKind::DisplayHelp | ErrorKind::DisplayVersion
    );
    if !answer && asks_for_json(arguments) {
        // Where standard output is broken, the problem is on standard error all the same.
        if let Ok(json) = document::refusal("", &[problem(&refused.to_string())]) {
            let _ = output::print(&json);
        }
    }
    // There is nowhere to say that this failed.
    let _ = refused.print();
    match answer {
        true => Status::Done.into(),
        false => Status::Usage.into(),
    }
}

/// Whether `--json` stands among the options.
fn asks_for_json(arguments: &[OsString]) -> bool {
    let mut options = arguments.iter().skip(1).take_while(|a| *a != "--");
    options.any(|a| a == "--json")
}

/// The paragraphs of a refusal as a problem: what is wrong first, and tips behind it.
fn problem(refusal: &str) -> Problem {
    let mut paragraphs = refusal
        .split("\n\n")
        .map(|p| p.split_whitespace().collect::<Vec<_>>().join(" "));
    let what = paragraphs.next().unwrap_or_default();
    let what = what.strip_prefix("error: ").unwrap_or(&what);
    let problem = Problem::error("command line", what);
    let tip = |p: String| p.strip_prefix("tip: ").map(str::to_owned);
    match paragraphs.find_map(tip) {
        Some(tip) => problem.hint(tip),
        None => problem.hint("`stillflame help` names the verbs and the options of each"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_refusal_is_told_without_its_usage() {
        let text = "error: unexpected argument '--jsn' found\n\n  tip: a similar argument exists: '--json'\n\n\
                    Usage: stillflame modes <NETWORK>\n\nFor more information, try '--help'.\n";
        let problem = problem(text);
        assert_eq!(problem.what, "unexpected argument '--jsn' found");
        assert_eq!(
            problem.hint.as_deref(),
            Some("a similar argument exists: '--json'")
        );
    }

    #[test]
    fn json_is_asked_for_among_the_options_only() {
        let asks = |words: &str| {
            let words: Vec<OsString> = words.split(' ').map(OsString::from).collect();
            asks_for_json(&words)
        };
        assert!(asks("stillflame modes --json"));
        assert!(!asks("--json modes rig.toml"));
        assert!(!asks("stillflame modes -- --json"));
    }
}
