//! Flow that cannot be, and windows of search.

use crate::case::{Told, edited, one_problem, told};
use crate::shipped;

fn swirl(edits: &[(&str, &str)], told: &Told<'_>) {
    one_problem(&edited(&shipped("swirl_rig"), edits), &[], told);
}

#[test]
fn a_choked_end_without_flow() {
    swirl(
        &[("\"30 g/s\"", "\"0 g/s\""), ("\"choked\"", "¦\"choked\"¦")],
        &told(
            "feed.end",
            &["choked, but nothing flows", "`feed.mass_flow`"],
            &["state a flow"],
        ),
    );
    // Both ends are choked for one flow of zero.
    let pressurised = edited(
        &shipped("pressurised_rig"),
        &[("\"1.2 kg/s\"", "¦\"0 kg/s\"¦")],
    );
    one_problem(
        &pressurised,
        &[],
        &told(
            "feed.mass_flow",
            &["nothing flows", "both ends are choked"],
            &["state a flow"],
        ),
    );
}

#[test]
fn what_a_throat_does_not_bear_beside_it() {
    let throat = (
        "end = \"open\"",
        "end = \"choked\"\nthroat_diameter = \"20 mm\"",
    );
    let no_pressure = ("pressure    = \"101325 Pa\"\n", "");
    let flow = "mass_flow   = \"30 g/s\"";
    for (key, value) in [("velocity", "\"3 m/s\""), ("mach", "0.1")] {
        let new = format!("{key} = ¦{value}¦");
        let subject = format!("feed.{key}");
        swirl(
            &[throat, no_pressure, (flow, &new)],
            &told(
                &subject,
                &["cannot stand beside the exit's throat"],
                &["`mass_flow` or `pressure`"],
            ),
        );
    }
    swirl(
        &[throat, (flow, "mass_flow   = ¦\"30 g/s\"¦")],
        &told(
            "feed.mass_flow",
            &["two of them say the third"],
            &["remove `feed.mass_flow`"],
        ),
    );
    swirl(
        &[
            throat,
            no_pressure,
            ("mass_flow   = \"30 g/s\"\n", ""),
            ("[feed]", "¦[feed]¦"),
        ],
        &told("feed", &["a throat alone"], &["`pressure`, or `mass_flow`"]),
    );
}

#[test]
fn flow_beyond_mach_one() {
    let name = (
        "name             = \"nozzle_in\"",
        "name             = ¦\"nozzle_in\"¦",
    );
    swirl(
        &[("\"30 g/s\"", "\"300 g/s\""), name],
        &told(
            "nozzle_in",
            &[
                "flow beyond Mach 1 in `nozzle_in`",
                "0.3000 kg/s",
                "at most",
            ],
            &["less flow"],
        ),
    );
    swirl(
        &[("\"30 g/s\"", "¦\"30 kg/s\"¦")],
        &told(
            "feed.mass_flow",
            &["flow beyond Mach 1 in `feed`", "Mach "],
            &["subsonic"],
        ),
    );
    for mach in ["1.0", "1.5"] {
        let new = format!("mach = ¦{mach}¦");
        swirl(
            &[("mass_flow   = \"30 g/s\"", &new)],
            &told(
                "feed.mach",
                &["less than 1"],
                &["Mach number at the first station"],
            ),
        );
    }
    // A hole too small for the flow.
    let plate = "[[element]]\nname = ¦\"plate\"¦\nkind = \"restriction\"\nloss_coefficient = 1.0\ndiameter = \"5 mm\"\n\n\
                 [[element]]\nname = \"behind\"\nkind = \"duct\"\nlength = \"1 m\"\ndiameter = \"80 mm\"\n\n[exit]";
    swirl(
        &[("[exit]", plate)],
        &told(
            "plate",
            &["flow beyond Mach 1 in `plate`", "its open area"],
            &["less flow"],
        ),
    );
}

const HEATED: &str = r#"title = "Heated pipe (invented)"
[feed]
gas = { gamma = 1.4, gas_constant = "287 J/(kg K)" }
mach = 0.5
temperature = "300 K"
pressure = "1 bar"
end = "anechoic"
[[element]]
name = "cold"
kind = "duct"
length = "1 m"
diameter = "80 mm"
[[element]]
name = ¦"burner"¦
kind = "flame"
burnt_temperature = "1800 K"
[[element]]
name = "hot"
kind = "duct"
length = "1 m"
diameter = "80 mm"
[exit]
end = "anechoic"
"#;

/// The hottest a stream of inlet Mach number `M` in a constant area can get, at `M = 1/sqrt(gamma)`
/// on the Rayleigh line: `T/T_1 = (1 + gamma M^2)^2/(4 gamma M^2)` (derived from continuity, momentum and
/// the gas law), beyond which heating chokes.
#[test]
fn thermal_choking() {
    let (gamma, m): (f64, f64) = (1.4, 0.5);
    let square = gamma * m * m;
    let hottest = 300.0 * (1.0 + square).powi(2) / (4.0 * square);
    let number = format!("{hottest:.1} K");
    one_problem(
        HEATED,
        &[],
        &told(
            "burner",
            &[
                "flow beyond Mach 1 in `burner`",
                "thermal choking",
                "1800.0 K",
                &number,
            ],
            &["lower burnt temperature"],
        ),
    );
}

#[test]
fn a_flame_colder_than_its_inlet() {
    for cold in ["250 K", "-30 degC"] {
        let new = format!("¦\"{cold}\"¦");
        swirl(
            &[("\"1800 K\"", &new)],
            &told(
                "main_flame.burnt_temperature",
                &["colder than its inlet", "K before it"],
                &["state a temperature above"],
            ),
        );
    }
    swirl(
        &[("\"1800 K\"", "¦\"-300 degC\"¦")],
        &told(
            "main_flame.burnt_temperature",
            &["-26.85 K", "greater than zero"],
            &["static temperature"],
        ),
    );
}

#[test]
fn windows_that_are_none() {
    let like = "frequency = \"20 to 800 Hz\"";
    for (window, what, hint) in [
        (
            "\"20 to 20 Hz\"",
            "the window is empty",
            "two different ends",
        ),
        (
            "\"800 to 20 Hz\"",
            "the window is inverted",
            "lower end first",
        ),
        ("\"-20 to 800 Hz\"", "below zero frequency", "begin at 0 Hz"),
        ("\"20 to 800 ms\"", "`ms` is a unit of time", "Hz or kHz"),
        ("\"20 to 800\"", "no unit", "Hz"),
        (
            "\"20 to 800 hertz\"",
            "no unit this program knows",
            "did you mean `Hz`?",
        ),
        ("\"20 Hz\"", "no span", like),
        ("\"20-800 Hz\"", "no span", like),
        ("\"20 to 800 to 900 Hz\"", "no span", like),
        ("\"nan to 800 Hz\"", "not finite", like),
        ("\"20 to inf Hz\"", "not finite", like),
        ("\"\"", "nothing is written", like),
        (
            "[20, 800]",
            "a window belongs here, and this is a list",
            like,
        ),
        ("20", "a window belongs here, and this is a number", like),
        (
            "{ from = 20 }",
            "a window belongs here, and this is a table",
            like,
        ),
    ] {
        let new = format!("frequency = ¦{window}¦");
        swirl(
            &[("frequency = \"20 to 800 Hz\"", &new)],
            &told("search.frequency", &[what], &[hint]),
        );
    }
    for (window, what, hint) in [
        (
            "\"5 to 5 1/s\"",
            "the window is empty",
            "two different ends",
        ),
        (
            "\"300 to -300 1/s\"",
            "the window is inverted",
            "lower end first",
        ),
        ("\"-300 to 300 Hz\"", "`Hz` is a unit of frequency", "1/s"),
        (
            "\"-1e308 to 1e308 1/s\"",
            "the window reaches beyond",
            "growth = \"-300 to 300 1/s\"",
        ),
        ("\"-300 to 300\"", "no unit", "1/s"),
        (
            "300",
            "a window belongs here",
            "growth = \"-300 to 300 1/s\"",
        ),
    ] {
        let new = format!("growth = ¦{window}¦");
        swirl(
            &[("growth    = \"-300 to 300 1/s\"", &new)],
            &told("search.growth", &[what], &[hint]),
        );
    }
}
