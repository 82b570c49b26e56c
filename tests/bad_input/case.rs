//! One mistake in a network, and the one problem it must give.
//!
//! A mistake is written as edits of a sound network. In the text put in, `¦` stands before and behind
//! the words the problem must mark, and is taken out before the network is read; so the place expected
//! is counted here and not by the program.

use std::path::Path;

use stillflame::problems::{Problem, Problems, Severity};
use stillflame::{input, modes};

use crate::cli::{json, run};

/// What a problem must say: its subject, words of what is wrong, words of what would be right.
pub struct Told<'a> {
    pub subject: &'a str,
    pub what: &'a [&'a str],
    pub hint: &'a [&'a str],
}

pub fn told<'a>(subject: &'a str, what: &'a [&'a str], hint: &'a [&'a str]) -> Told<'a> {
    Told {
        subject,
        what,
        hint,
    }
}

/// A place in a text: line and column from one, and the number of characters marked.
type Marked = (usize, usize, usize);

/// Takes the marks out of a text.
fn unmarked(text: &str) -> (String, Option<Marked>) {
    let Some((before, rest)) = text.split_once('¦') else {
        return (text.to_owned(), None);
    };
    let (words, after) = rest.split_once('¦').expect("marks come in pairs");
    let line = before.matches('\n').count() + 1;
    let column = before.rsplit('\n').next().unwrap().chars().count() + 1;
    let width = words.chars().count().max(1);
    (
        format!("{before}{words}{after}"),
        Some((line, column, width)),
    )
}

/// A network with edits made in turn; each must find what it replaces.
pub fn edited(text: &str, edits: &[(&str, &str)]) -> String {
    let mut text = text.to_owned();
    for (old, new) in edits {
        assert!(text.contains(old), "nothing reads {old:?}");
        text = text.replacen(old, new, 1);
    }
    text
}

/// Every problem of a text up to the acoustics, errors and warnings, each with its place.
pub fn problems(text: &str, sets: &[String]) -> Vec<Problem> {
    match input::parse("rig.toml", text, sets) {
        Err(Problems(all)) => all,
        Ok(loaded) => match modes::solve(&loaded.network) {
            Ok(_) => Vec::new(),
            Err(Problems(mut all)) => {
                all.iter_mut().for_each(|p| loaded.sources.locate(p));
                all
            }
        },
    }
}

/// What must hold of every problem, whatever it is about.
pub fn assert_well_told(problem: &Problem) {
    let all = format!(
        "{} {} {}",
        problem.subject,
        problem.what,
        problem.hint.as_deref().unwrap_or_default()
    );
    assert!(!problem.subject.is_empty() && !problem.what.is_empty());
    assert!(!problem.what.ends_with('.'), "{all}");
    assert!(problem.hint.is_some(), "no hint: {all}");
    assert!(problem.place.is_some(), "no place: {all}");
    assert!(!all.contains("NaN"), "{all}");
}

/// The text and the overrides, marks among them, give exactly this one problem: through the library,
/// and from the program in words and as JSON.
pub fn one_problem(text: &str, sets: &[&str], told: &Told<'_>) {
    let (text, in_text) = unmarked(text);
    let (sets, in_sets): (Vec<String>, Vec<Option<Marked>>) =
        sets.iter().map(|s| unmarked(s)).unzip();
    let in_set = in_sets.into_iter().flatten().next();
    let (line, column, width) = in_set.or(in_text).expect("no place is marked");

    let all = problems(&text, &sets);
    let [problem] = all.as_slice() else {
        panic!("{} problems for one mistake, {sets:?}: {all:#?}", all.len());
    };
    assert_well_told(problem);
    assert_eq!(problem.severity, Severity::Error, "{problem}");
    assert_eq!(problem.subject, told.subject, "{problem}");
    let place = problem.place.as_deref().unwrap();
    let source = if in_set.is_some() {
        "--set"
    } else {
        "rig.toml"
    };
    assert_eq!(place.source, source, "{problem}");
    assert_eq!(
        (place.line, place.column, place.width),
        (line, column, width),
        "{problem}"
    );
    for word in told.what {
        assert!(problem.what.contains(word), "{word:?}: {problem}");
    }
    for word in told.hint {
        let hint = problem.hint.as_deref().unwrap();
        assert!(hint.contains(word), "{word:?}: {problem}");
    }

    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("rig.toml");
    std::fs::write(&path, &text).unwrap();
    let options: Vec<&str> = sets.iter().flat_map(|s| ["--set", s]).collect();
    // A mistake in an override is one of the command line, unless only the flow shows it.
    let mistyped = input::read(&path, &[]).is_ok()
        && in_set.is_some()
        && input::parse("rig.toml", &text, &sets).is_err();
    told_by_the_program(&path, &options, problem, if mistyped { 2 } else { 1 });
}

/// The program refuses the file with this problem only, and prints nothing that looks like a result.
fn told_by_the_program(path: &Path, sets: &[&str], problem: &Problem, expected: i32) {
    let place = problem.place.as_deref().unwrap();
    let source = match place.source.as_str() {
        "rig.toml" => path.display().to_string(),
        other => other.to_owned(),
    };
    let ran = run("modes", path, sets);
    assert_eq!(ran.code, Some(expected), "{}", ran.stderr);
    assert_eq!(ran.stdout, "");
    let head = format!(
        "{source}:{}:{}  error  `{}`\n",
        place.line, place.column, problem.subject
    );
    assert!(ran.stderr.starts_with(&head), "{head}{}", ran.stderr);
    assert!(ran.stderr.ends_with("\n1 error\n"), "{}", ran.stderr);
    for unwanted in ["NaN", "panicked", "RUST_BACKTRACE"] {
        assert!(!ran.stderr.contains(unwanted), "{}", ran.stderr);
    }
    if !place.text.is_empty() {
        // The mark stands under the very words, however long the line.
        let mut lines = ran.stderr.lines().skip(1);
        let (shown, mark) = (lines.next().unwrap(), lines.next().unwrap());
        let at = mark.find('~').unwrap();
        let marked: String = place
            .text
            .chars()
            .skip(place.column - 1)
            .take(place.width.min(20))
            .collect();
        let there: String = shown.chars().skip(at).collect();
        assert!(there.starts_with(&marked), "{}", ran.stderr);
    }
    let (value, code) = json("modes", path, sets);
    assert_eq!(code, Some(expected));
    assert_eq!(value["schema"], "stillflame/problems");
    let found = value["problems"].as_array().unwrap();
    assert_eq!(found.len(), 1, "{value}");
    assert_eq!(value["warnings"].as_array().unwrap().len(), 0);
    let found = &found[0];
    assert_eq!(found["subject"], problem.subject);
    assert_eq!(found["file"], source);
    assert_eq!(found["line"], place.line);
    assert_eq!(found["column"], place.column);
}
