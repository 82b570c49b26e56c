//! Text that is no TOML, and keys stated twice.

use crate::case::{Told, edited, one_problem};
use crate::shipped;

const LENGTH: &str = "length   = \"0.70 m\"";

fn swirl(edits: &[(&str, &str)], subject: &str, what: &str, hint: &str) {
    let told = Told {
        subject,
        what: &[what],
        hint: &[hint],
    };
    one_problem(&edited(&shipped("swirl_rig"), edits), &[], &told);
}

#[test]
fn a_broken_line_is_one_problem_and_names_its_key() {
    for (line, what, hint) in [
        (
            "length = ¦0.70 m¦",
            "`0.70 m` stands without quotes",
            "length = \"0.70 m\"",
        ),
        (
            "length = 0.70¦m¦",
            "`0.70m` stands without quotes",
            "length = \"0.70m\"",
        ),
        (
            "length = ¦long¦",
            "`long` stands without quotes",
            "length = \"long\"",
        ),
        ("length =¦¦", "`length` has no value", "length = VALUE"),
        (
            "length ¦¦\"0.7 m\"",
            "no `=` stands after `length`",
            "length = VALUE",
        ),
        (
            "length¦:¦ \"0.7 m\"",
            "`:` stands after `length`",
            "length = VALUE",
        ),
        (
            "length = \"0.7 m¦¦",
            "the quotes are not closed",
            "the quote it begins with",
        ),
        (
            "length = '0.7 m¦¦",
            "the quotes are not closed",
            "the quote it begins with",
        ),
        ("length = ¦“0.7 m”¦", "typographic", "straight double quote"),
        (
            "length = ¦.5¦",
            "`.5` is no number",
            "both sides of the point",
        ),
        ("length = \"0.7\\¦¦m\"", "a backslash", "twice"),
        (
            "length = ¦[¦\"0.7 m\",",
            "nothing closes this `[`",
            "end the value with",
        ),
    ] {
        // Where the parser sees the mistake is its own affair; it is on this line.
        swirl_on_line(line, what, hint);
    }
}

/// As [`swirl`] with the place held to the line, and to the column where the words are marked.
fn swirl_on_line(line: &str, what: &str, hint: &str) {
    let text = edited(&shipped("swirl_rig"), &[(LENGTH, &line.replace('¦', ""))]);
    let all = crate::case::problems(&text, &[]);
    let [problem] = all.as_slice() else {
        panic!("{line}: {all:#?}");
    };
    crate::case::assert_well_told(problem);
    let place = problem.place.as_deref().unwrap();
    assert_eq!(problem.subject, "chamber.length", "{problem}");
    assert_eq!(place.line, 51, "{problem}");
    let column = line.split('¦').next().unwrap().chars().count() + 1;
    assert!(place.column.abs_diff(column) <= 1, "{line}: {problem}");
    assert!(problem.what.contains(what), "{problem}");
    assert!(problem.hint.as_deref().unwrap().contains(hint), "{problem}");
}

#[test]
fn a_broken_entry_in_braces_is_told_by_its_own_key() {
    let response = "main_flame.response";
    for (old, new, key, what, hint) in [
        (
            "kind = \"n-tau\"",
            "kind = ¦n-tau¦",
            "kind",
            "`n-tau` stands without quotes",
            "kind = \"n-tau\"",
        ),
        (
            "delay = \"3 ms\"",
            "delay = ¦3 ms¦",
            "delay",
            "`3 ms` stands without quotes",
            "delay = \"3 ms\"",
        ),
        (
            "= 1.0, delay",
            "= ¦1.0 delay¦",
            "interaction_index",
            "another key",
            "a comma between",
        ),
    ] {
        swirl(&[(old, new)], &format!("{response}.{key}"), what, hint);
    }
}

#[test]
fn a_bracket_left_open_is_told_where_it_opens() {
    swirl(
        &[
            ("= { kind", "= ¦{¦ kind"),
            ("\"mixing_tube.out\" }", "\"mixing_tube.out\""),
        ],
        "main_flame.response",
        "nothing closes this `{`",
        "end the value with",
    );
    swirl(
        &[("[exit]", "[exit¦¦")],
        "TOML",
        "header of a table is not closed",
        "write [exit]",
    );
    swirl(
        &[("[[element]]", "[[element]¦¦")],
        "TOML",
        "header of a table is not closed",
        "write [[element]]",
    );
}

#[test]
fn what_is_stated_twice() {
    swirl(
        &[(LENGTH, "length = \"0.7 m\"\n¦length¦ = \"0.8 m\"")],
        "chamber.length",
        "`length` is stated on line 51 already",
        "keep one",
    );
    swirl(
        &[("delay = \"3 ms\"", "delay = \"3 ms\", ¦delay¦ = \"4 ms\"")],
        "main_flame.response.delay",
        "`delay` is stated on line 46 already",
        "keep one",
    );
    swirl(
        &[("[exit]\n", "[exit]\nend = \"open\"\n\n[¦exit¦]\n")],
        "exit",
        "[exit] stands on line 54 already",
        "keep one",
    );
    swirl(
        &[(
            "diameter = \"80 mm\"",
            "diameter = \"80 mm\"\n¦area¦ = \"50 cm^2\"",
        )],
        "chamber.area",
        "`diameter` is given too",
        "keep one",
    );
}

#[test]
fn another_kind_of_value_where_a_table_belongs() {
    let text = shipped("swirl_rig");
    let (start, rest) = text.split_once("[search]").unwrap();
    let (search, rest) = rest.split_once("[feed]").unwrap();
    let (feed, rest) = rest.split_once("[[element]]").unwrap();
    let (elements, exit) = rest.split_once("[exit]").unwrap();
    let search = format!("[search]{search}");
    let feed = format!("[feed]{feed}");
    let elements = format!("[[element]]{elements}");
    let exit = format!("[exit]{exit}");
    let cases = [
        (
            format!("{start}search = ¦5¦\n{feed}{elements}{exit}"),
            "search",
            "[search]",
        ),
        (
            format!("{start}feed = ¦5¦\n{search}{elements}{exit}"),
            "feed",
            "[feed]",
        ),
        (
            format!("{start}exit = ¦\"open\"¦\n{search}{feed}{elements}"),
            "exit",
            "[exit]",
        ),
        (
            format!("{start}¦element¦ = 5\n{search}{feed}{exit}"),
            "element",
            "[[element]]",
        ),
        (
            format!("{start}element = [¦5¦]\n{search}{feed}{exit}"),
            "element.1",
            "[[element]]",
        ),
        (
            format!("{start}¦element¦ = []\n{search}{feed}{exit}"),
            "element",
            "[[element]]",
        ),
    ];
    for (text, subject, hint) in &cases {
        let told = Told {
            subject,
            what: &[],
            hint: &[hint],
        };
        one_problem(text, &[], &told);
    }
    // Single brackets make one table of what is a list.
    let one = text.replacen("[[element]]", "[¦element¦]", 1);
    let told = Told {
        subject: "element",
        what: &["one table"],
        hint: &["[[element]]"],
    };
    one_problem(&one, &[], &told);
    let third = edited(
        &text,
        &[(
            "[[element]]\nname     = \"mixing_tube\"",
            "[¦element¦]\nname     = \"mixing_tube\"",
        )],
    );
    let told = Told {
        subject: "element",
        what: &["one table"],
        hint: &["double brackets"],
    };
    one_problem(&third, &[], &told);
    for (new, noun) in [("¦1.0¦", "a number"), ("¦\"n-tau\"¦", "text")] {
        let text = text.lines().map(|l| match l.split_once("= { kind") {
            Some((key, _)) => format!("{key}= {new}\n"),
            None => format!("{l}\n"),
        });
        let told = Told {
            subject: "main_flame.response",
            what: &["a response belongs here", noun],
            hint: &["n-tau"],
        };
        one_problem(&text.collect::<String>(), &[], &told);
    }
}
