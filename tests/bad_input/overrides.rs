//! Mistakes in `--set`.

use crate::case::{Told, one_problem};
use crate::shipped;

fn set(sets: &[&str], subject: &str, what: &str, hint: &str) {
    let told = Told {
        subject,
        what: &[what],
        hint: &[hint],
    };
    one_problem(&shipped("swirl_rig"), sets, &told);
}

#[test]
fn a_name_that_is_unknown() {
    set(
        &["¦chambr¦.length = 1 m"],
        "chambr",
        "nothing is named `chambr`",
        "did you mean `chamber`?",
    );
    set(
        &["chamber.¦lenght¦ = 1 m"],
        "chamber.lenght",
        "no key `lenght`",
        "did you mean `length`?",
    );
    set(
        &["main_flame.¦dealy¦ = 2 ms"],
        "main_flame.dealy",
        "no key",
        "did you mean `delay`?",
    );
    set(
        &["feed.¦mas_flow¦ = 1 g/s"],
        "feed.mas_flow",
        "no key",
        "did you mean `mass_flow`?",
    );
    set(
        &["¦titel¦ = x"],
        "titel",
        "nothing is named",
        "did you mean `title`?",
    );
    set(
        &["¦length¦ = 1 m"],
        "length",
        "nothing is named",
        "say whose it is, as in chamber.length",
    );
    set(
        &["¦xyzzy¦.length = 1 m"],
        "xyzzy",
        "nothing is named",
        "plenum, nozzle_in, mixing_tube",
    );
    set(
        &["¦element¦.1.length = 1 m"],
        "element",
        "by its own name",
        "chamber.length",
    );
    set(
        &["main_flame.response.¦2¦.delay = 2 ms"],
        "main_flame.response",
        "no response 2",
        "main_flame.delay",
    );
    set(
        &["main_flame.reference = ¦mixng_tube.out¦"],
        "main_flame.response.reference",
        "nothing is named `mixng_tube`",
        "did you mean `mixing_tube`?",
    );
}

#[test]
fn a_value_that_is_wrong() {
    let length = "chamber.length";
    set(
        &["chamber.length = ¦1 s¦"],
        length,
        "`s` is a unit of time",
        "m, mm",
    );
    set(
        &["chamber.length = ¦1¦"],
        length,
        "no unit",
        "length = 1 mm; it may be",
    );
    set(
        &["chamber.length = ¦1 metres¦"],
        length,
        "no unit this program knows",
        "did you mean `m`?",
    );
    set(
        &["chamber.length = ¦-1 m¦"],
        length,
        "greater than zero",
        "along the flow",
    );
    set(&["chamber.length = ¦nan¦"], length, "not finite", "120 mm");
    set(
        &["chamber.length = ¦inf m¦"],
        length,
        "not finite",
        "120 mm",
    );
    set(
        &["chamber.length = ¦1e400 m¦"],
        length,
        "larger than any number",
        "exponent",
    );
    set(
        &["¦chamber.length =¦"],
        length,
        "no value is given",
        "NAME = VALUE",
    );
    set(
        &["chamber.length = ¦{ x = 1 }¦"],
        length,
        "a table",
        "120 mm",
    );
    set(
        &["chamber.¦length¦.x = 1 m"],
        length,
        "no table",
        "write chamber.length = VALUE",
    );
    set(
        &["¦chamber¦ = 1 m"],
        "chamber",
        "a whole table",
        "chamber.KEY",
    );
    set(
        &["chamber.¦kind¦ = plenum"],
        "chamber.kind",
        "fixed",
        "in the file",
    );
    set(&["title = ¦5¦"], "title", "text belongs here", "in quotes");
    set(
        &["search.frequency = ¦20 to 10 Hz¦"],
        "search.frequency",
        "inverted",
        "lower end first",
    );
    set(
        &["feed.¦gas¦.gamma = 1.3"],
        "feed.gas",
        "no table",
        "gas_constant",
    );
}

#[test]
fn no_equals_sign_and_no_name() {
    set(&["¦chamber.length¦"], "--set", "no `=`", "NAME = VALUE");
    set(
        &["¦chamber.length: 1 m¦"],
        "--set",
        "no `=`",
        "NAME = VALUE",
    );
    set(
        &["¦= 1 m¦"],
        "--set",
        "no name stands before",
        "NAME = VALUE",
    );
    set(
        &["¦chamber..length = 1 m¦"],
        "--set",
        "no name",
        "NAME = VALUE",
    );
}

#[test]
fn the_same_number_twice() {
    set(
        &["chamber.length = 1 m", "chamber.¦length¦ = 2 m"],
        "chamber.length",
        "`chamber.length` is set twice",
        "keep one",
    );
    // The other name of the same number, and the same area in other words.
    set(
        &[
            "main_flame.delay = 1 ms",
            "main_flame.response.¦delay¦ = 1 ms",
        ],
        "main_flame.response.delay",
        "set twice",
        "keep one",
    );
    set(
        &[
            "mixing_tube.diameter = 30 mm",
            "mixing_tube.¦area¦ = 7 cm^2",
        ],
        "mixing_tube.area",
        "`diameter` is given too",
        "keep one",
    );
    set(
        &["title = x", "¦title¦ = y"],
        "title",
        "set twice",
        "keep one",
    );
}
