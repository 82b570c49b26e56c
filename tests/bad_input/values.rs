//! Values, keys, kinds, names and areas.

use crate::case::{Told, edited, one_problem, told};
use crate::shipped;

/// The line of the swirl rig that most mistakes are made in.
const LENGTH: &str = "length   = \"0.70 m\"";

fn swirl(edits: &[(&str, &str)], told: &Told<'_>) {
    one_problem(&edited(&shipped("swirl_rig"), edits), &[], told);
}

/// A value where the chamber's length belongs, marked as a whole.
fn length(value: &str, what: &[&str], hint: &[&str]) {
    let new = format!("length = ¦{value}¦");
    let subject = "chamber.length";
    let told = Told {
        subject,
        what,
        hint,
    };
    swirl(&[(LENGTH, &new)], &told);
}

#[test]
fn a_number_without_a_unit() {
    length(
        "\"0.70\"",
        &["`0.70` has no unit", "a length needs one"],
        &["mm", "in or ft"],
    );
    length(
        "0.70",
        &["`0.70` has no unit"],
        &["length = \"0.70 mm\"", "in or ft"],
    );
    length("0", &["`0` has no unit"], &["in quotes"]);
    length("-0.70", &["`-0.70` has no unit"], &["in quotes"]);
    length("0x10", &["`16` has no unit"], &["in quotes"]);
}

#[test]
fn a_wrong_unit() {
    length(
        "\"0.70 ms\"",
        &["`ms` is a unit of time", "a length is wanted"],
        &["m, mm"],
    );
    length("\"0.70 m^2\"", &["`m^2` is a unit of area"], &["m, mm"]);
    length("\"0.70 K\"", &["`K` is a unit of temperature"], &["m, mm"]);
    length(
        "\"0.70 metres\"",
        &["`metres` is no unit"],
        &["did you mean `m`?"],
    );
    length("\"0.70 MM\"", &["`MM` is no unit"], &["did you mean `mm`?"]);
    length("\"0.70 furlong\"", &["`furlong` is no unit"], &["m, mm"]);
    length("\"0.70 m long\"", &["`m long` is no unit"], &["m, mm"]);
    length("\"m\"", &["`m` is no number"], &["120 mm"]);
    length("\"0,70 m\"", &["comma"], &["decimal point"]);
    length("\"1 000 mm\"", &["no number"], &["120 mm"]);
    length("\"\"", &["nothing is written"], &["120 mm"]);
    swirl(
        &[("\"1800 K\"", "¦\"1500 celsius\"¦")],
        &Told {
            subject: "main_flame.burnt_temperature",
            what: &["`celsius` is no unit"],
            hint: &["did you mean `degC`?"],
        },
    );
    let old = "interaction_index = 1.0";
    for (new, what, hint) in [
        ("interaction_index = ¦\"1.0 m\"¦", "`m` is written", "`1.0`"),
        (
            "interaction_index = ¦\"1.0\"¦",
            "is text",
            "without quotes: interaction_index = 1.0",
        ),
        ("interaction_index = ¦\"big\"¦", "no number", "0.5"),
        ("interaction_index = ¦nan¦", "not finite", "0.5"),
        ("interaction_index = ¦-inf¦", "not finite", "0.5"),
    ] {
        let told = Told {
            subject: "main_flame.interaction_index",
            what: &[what],
            hint: &[hint],
        };
        swirl(&[(old, new)], &told);
    }
}

#[test]
fn a_number_that_is_no_length() {
    length(
        "\"-0.70 m\"",
        &["-700 mm", "greater than zero"],
        &["along the flow"],
    );
    length(
        "\"0 m\"",
        &["0 m", "greater than zero"],
        &["along the flow"],
    );
    length("\"-0 mm\"", &["greater than zero"], &["along the flow"]);
    for value in ["\"nan m\"", "\"inf m\"", "\"-inf m\"", "\"infinity mm\""] {
        length(value, &["is not finite"], &["120 mm"]);
    }
    for value in ["nan", "inf", "-inf", "+nan"] {
        length(value, &["is not finite"], &["length = \"120 mm\""]);
    }
    length("\"1e400 m\"", &["larger than any number"], &["exponent"]);
    length(
        "1e400",
        &["larger than any number"],
        &["length = \"120 mm\""],
    );
    length("\"1e-400 m\"", &["smaller than any number"], &["exponent"]);
}

#[test]
fn another_kind_of_value() {
    let like = &["length = \"120 mm\""];
    length(
        "{ value = 0.7, unit = \"m\" }",
        &["a length belongs here", "a table"],
        like,
    );
    length("[\"0.7 m\"]", &["a list"], like);
    length("true", &["true or false"], like);
    length("1979-05-27", &["a date"], like);
    let dotted = Told {
        subject: "chamber.length",
        what: &["a length belongs here", "a table"],
        hint: like,
    };
    swirl(&[(LENGTH, "¦length¦.value = 0.7")], &dotted);
    swirl(
        &[("name     = \"chamber\"", "name     = ¦7¦")],
        &told(
            "element.6.name",
            &["text belongs here", "a number"],
            &["in quotes"],
        ),
    );
    swirl(
        &[("\"duct\"\nlength   = \"0.70", "¦7¦\nlength   = \"0.70")],
        &told(
            "chamber.kind",
            &["text belongs here", "a number"],
            &["in quotes"],
        ),
    );
    swirl(
        &[("\"air\"", "¦1.4¦")],
        &told(
            "feed.gas",
            &["a gas belongs here", "a number"],
            &["\"air\"", "gamma"],
        ),
    );
    swirl(
        &[("\"air\"", "¦\"methane\"¦")],
        &told(
            "feed.gas",
            &["\"methane\" is no gas"],
            &["\"air\"", "gamma"],
        ),
    );
    swirl(
        &[("\"air\"", "¦\"Air\"¦")],
        &told(
            "feed.gas",
            &["\"Air\" is no gas"],
            &["did you mean \"air\"?"],
        ),
    );
}

#[test]
fn an_unknown_key() {
    let key = |old: &str, new: &str, subject, what: &[&str], hint: &[&str]| {
        swirl(
            &[(old, new)],
            &Told {
                subject,
                what,
                hint,
            },
        );
    };
    key(
        LENGTH,
        "¦lenght¦ = \"0.70 m\"",
        "chamber.lenght",
        &["a duct has no key `lenght`"],
        &["did you mean `length`?"],
    );
    key(
        LENGTH,
        "length = \"0.70 m\"\n¦colour¦ = \"red\"",
        "chamber.colour",
        &["a duct has no key `colour`"],
        &["length, diameter"],
    );
    key(
        "mass_flow ",
        "¦flow¦ ",
        "feed.flow",
        &["a feed has no key `flow`"],
        &["did you mean `mass_flow`?"],
    );
    key(
        "diameter = \"80 mm\"",
        "¦dia¦ = \"80 mm\"",
        "chamber.dia",
        &["a duct has no key `dia`"],
        &["did you mean `diameter`?"],
    );
    // Nothing is spelt like it, but one key is missing.
    key(
        "mass_flow ",
        "¦supply¦ ",
        "feed.supply",
        &["a feed has no key `supply`"],
        &["is `mass_flow`, `velocity` or `mach` meant"],
    );
    key(
        "delay = \"3 ms\"",
        "¦dleay¦ = \"3 ms\"",
        "main_flame.response.dleay",
        &["a response has no key"],
        &["did you mean `delay`?"],
    );
    key(
        "burnt_temperature = \"1800 K\"",
        "burnt_temperature = \"1800 K\"\n¦delay¦ = \"3 ms\"",
        "main_flame.delay",
        &["a flame has no key `delay`"],
        &["belongs into its response"],
    );
    key(
        "delay = \"3 ms\"",
        "delay = \"3 ms\", ¦spread¦ = \"1 ms\"",
        "main_flame.response.spread",
        &["only kind = \"gaussian\" has a spread"],
        &["remove `spread`"],
    );
    key(
        "[exit]",
        "[¦exti¦]",
        "exti",
        &["no key `exti`"],
        &["did you mean `exit`?"],
    );
    key(
        "[exit]",
        "[¦rig¦]\nx = 1\n[exit]",
        "rig",
        &["a network has no key `rig`"],
        &["search"],
    );
    // A key of the whole file below a header belongs to that table, in TOML.
    key(
        "[exit]\nend = \"open\"",
        "¦exit¦ = \"open\"",
        "chamber.exit",
        &["a duct has no key `exit`"],
        &["belongs to the whole file"],
    );
    let text = shipped("swirl_rig").replace("title = ", "[search]\n¦title¦ = ");
    let text = text.replacen("\n[search]\nfrequency", "\nfrequency", 1);
    let told = Told {
        subject: "search.title",
        what: &["a search has no key `title`"],
        hint: &["above the first"],
    };
    one_problem(&text, &[], &told);
}

#[test]
fn an_unknown_word() {
    let kind = "\"duct\"\nlength   = \"0.70";
    swirl(
        &[(kind, "¦\"dcut\"¦\nlength   = \"0.70")],
        &told(
            "chamber.kind",
            &["no kind \"dcut\""],
            &["did you mean \"duct\"?"],
        ),
    );
    swirl(
        &[(kind, "¦\"muffler\"¦\nlength   = \"0.70")],
        &told(
            "chamber.kind",
            &["no kind \"muffler\""],
            &["\"duct\", \"contraction\""],
        ),
    );
    swirl(
        &[("\"contraction\"", "¦\"contracton\"¦")],
        &told(
            "nozzle_in.kind",
            &["no kind"],
            &["did you mean \"contraction\"?"],
        ),
    );
    swirl(
        &[("\"n-tau\"", "¦\"ntau\"¦")],
        &told(
            "main_flame.response.kind",
            &["no kind \"ntau\""],
            &["did you mean \"n-tau\"?"],
        ),
    );
    swirl(
        &[("\"choked\"", "¦\"chocked\"¦")],
        &told(
            "feed.end",
            &["no end \"chocked\""],
            &["did you mean \"choked\"?"],
        ),
    );
    // Whether such an exit has a throat is not known, so nothing is said of the feed.
    let end = "[exit]\nend = \"open\"";
    let throat = "[exit]\nend = ¦\"chocked\"¦\nthroat_diameter = \"20 mm\"";
    swirl(
        &[(end, throat), ("pressure    = \"101325 Pa\"\n", "")],
        &told(
            "exit.end",
            &["no end \"chocked\""],
            &["did you mean \"choked\"?"],
        ),
    );
    swirl(
        &[(end, throat), ("mass_flow   = \"30 g/s\"\n", "")],
        &told(
            "exit.end",
            &["no end \"chocked\""],
            &["did you mean \"choked\"?"],
        ),
    );
}

#[test]
fn a_name_that_cannot_be_one() {
    for (name, what, hint) in [
        (
            "\"plenum\"",
            "names the element on line 21",
            "name of its own",
        ),
        ("\"mixing tube\"", "cannot be a name", "letters a to z"),
        ("\"feed\"", "another part of the file", "another name"),
        ("\"\"", "cannot be a name", "letters a to z"),
    ] {
        // The response still follows `mixing_tube`, which is no second mistake.
        let new = format!("¦{name}¦\nkind     = \"duct\"\nlength   = \"0.10 m\"");
        swirl(
            &[(
                "\"mixing_tube\"\nkind     = \"duct\"\nlength   = \"0.10 m\"",
                &new,
            )],
            &Told {
                subject: "element.3.name",
                what: &[what],
                hint: &[hint],
            },
        );
    }
}

#[test]
fn a_reference_to_nothing() {
    for (reference, what, hint) in [
        (
            "mixing_tub.out",
            "nothing is named `mixing_tub`",
            "did you mean `mixing_tube`?",
        ),
        ("xylophone", "nothing is named `xylophone`", "NAME.in"),
        (
            "mixing_tube.outlet",
            "`outlet` is no side",
            "mixing_tube.out",
        ),
        ("", "no station is named", "NAME.in"),
        ("feed.in", "the feed has no inlet", "feed.out"),
        ("exit.out", "the exit has no outlet", "exit.in"),
    ] {
        let new = format!("reference = ¦\"{reference}\"¦");
        swirl(
            &[("reference = \"mixing_tube.out\"", &new)],
            &Told {
                subject: "main_flame.response.reference",
                what: &[what],
                hint: &[hint],
            },
        );
    }
}

#[test]
fn what_is_missing() {
    let name = ("name     = \"chamber\"", "name     = ¦\"chamber\"¦");
    swirl(
        &[name, (LENGTH, "")],
        &told(
            "chamber.length",
            &["a duct needs `length`"],
            &["length = \"120 mm\""],
        ),
    );
    swirl(
        &[name, ("diameter = \"80 mm\"\n", "")],
        &told("chamber", &["needs `diameter` or `area`"], &["80 mm"]),
    );
    swirl(
        &[
            name,
            ("\"duct\"\nlength   = \"0.70", "\"duct\"\nlength   = \"0.70"),
            ("diameter = \"80 mm\"", ""),
        ],
        &told("chamber", &["needs `diameter` or `area`"], &["80 mm"]),
    );
    swirl(
        &[("[feed]", "¦[feed]¦"), ("mass_flow   = \"30 g/s\"\n", "")],
        &told("feed", &["a feed needs its flow"], &["mass_flow", "mach"]),
    );
    swirl(
        &[
            ("[feed]", "¦[feed]¦"),
            ("pressure    = \"101325 Pa\"\n", ""),
        ],
        &told(
            "feed.pressure",
            &["a feed needs `pressure`"],
            &["101325 Pa"],
        ),
    );
    let first = ("# Invented", "¦#¦ Invented");
    swirl(
        &[first, ("[exit]\nend = \"open\"", "")],
        &told("exit", &["has no [exit]"], &["end = \"open\""]),
    );
    swirl(
        &[first, ("title = ", "# title = ")],
        &told("title", &["no title"], &["title = \"...\""]),
    );
}
