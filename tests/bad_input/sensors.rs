//! Sensors that sit nowhere, outside their element, or lack what they need.

use crate::case::{Told, edited, one_problem, told};
use crate::shipped;

const P1: &str = "element  = \"plenum\"\ndistance = \"0.25 m\"";

fn swirl(new: &str, told: &Told<'_>) {
    one_problem(&edited(&shipped("swirl_rig"), &[(P1, new)]), &[], told);
}

#[test]
fn a_sensor_sits_within_an_element_that_is_there() {
    swirl(
        "element  = \"plenum\"\ndistance = ¦\"0.51 m\"¦",
        &told(
            "p1.distance",
            &["510 mm", "outside `plenum`", "500 mm"],
            &["inlet"],
        ),
    );
    swirl(
        "element  = \"dump\"\ndistance = ¦\"0.25 m\"¦",
        &told("p1.distance", &["`dump` has no length"], &["0 m"]),
    );
    swirl(
        "element  = ¦\"plenm\"¦\ndistance = \"0.25 m\"",
        &told(
            "p1.element",
            &["nothing is named `plenm`"],
            &["did you mean \"plenum\"?"],
        ),
    );
    swirl(
        "element  = \"plenum\"\ndistance = ¦\"0.25 s\"¦",
        &told("p1.distance", &["`s` is a unit of time"], &["m, mm"]),
    );
}

#[test]
fn a_recess_is_told_whole() {
    swirl(
        "element  = \"plenum\"\ndistance = \"0.25 m\"\nrecess_length = \"30 mm\"\nrecess_diameter = \"2 mm\"\nrecess_temperature = ¦\"-300 degC\"¦",
        &told("p1.recess_temperature", &["greater than zero"], &[]),
    );
    swirl(
        "element  = \"plenum\"\ndistance = \"0.25 m\"\n¦recess_lenght¦ = \"30 mm\"",
        &told(
            "p1.recess_lenght",
            &["no key `recess_lenght`"],
            &["recess_length"],
        ),
    );
}

#[test]
fn an_override_moves_a_sensor() {
    one_problem(
        &shipped("swirl_rig"),
        &["p2.distance = ¦0.71 m¦"],
        &told("p2.distance", &["710 mm", "outside `chamber`"], &["inlet"]),
    );
}

#[test]
fn sensors_change_nothing_that_is_computed() {
    let with = shipped("swirl_rig");
    let without = with.split("\n[[sensor]]").next().unwrap();
    assert_ne!(with, without);
    let list = |text: &str| {
        let network = stillflame::input::parse("rig.toml", text, &[])
            .unwrap()
            .network;
        let solved = stillflame::modes::solve(&network).unwrap();
        let window = stillflame::modes::Window::of(&network, &solved.mean).unwrap();
        let list = stillflame::modes::find(&solved, window, stillflame::modes::Scan::Whole);
        list.modes.iter().map(|m| m.s).collect::<Vec<_>>()
    };
    assert_eq!(list(&with), list(without));
}
