//! The networks that come with the program read without errors and are what they say.

use std::path::{Path, PathBuf};

use stillflame::elements::Kind;
use stillflame::input::{self, Loaded};
use stillflame::network::areas;

fn path(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("networks")
        .join(name)
}

fn load(name: &str) -> Loaded {
    input::read(&path(name), &[]).unwrap_or_else(|p| panic!("{name}:\n{p}"))
}

#[test]
fn every_network_reads_and_says_that_it_is_invented() {
    let mut count = 0;
    for entry in std::fs::read_dir(path("")).unwrap() {
        let file = entry.unwrap().path();
        let loaded = input::read(&file, &[]).unwrap_or_else(|p| panic!("{p}"));
        let layout = &loaded.network.layout;
        assert!(layout.title.contains("invented"), "{}", layout.title);
        assert!(
            std::fs::read_to_string(&file)
                .unwrap()
                .starts_with("# Invented scenario")
        );
        assert!(layout.search.frequency.is_some() && layout.search.growth.is_some());
        assert_eq!(layout.station_sections.len(), layout.links.len());
        assert!(areas::check_areas(&loaded.network).is_empty());
        assert!(stillflame::network::values::check_values(&loaded.network).is_empty());
        assert_eq!(layout.knobs.len(), loaded.network.values.0.len());
        for knob in &layout.knobs {
            assert!(layout.knob(&knob.name).is_some(), "{}", knob.name);
            assert!(loaded.sources.place(&knob.name).is_some(), "{}", knob.name);
        }
        count += 1;
    }
    assert_eq!(count, 5);
}

#[test]
fn warnings_are_those_the_scenarios_ask_for() {
    let subjects = |name: &str| -> Vec<String> {
        load(name).warnings.into_iter().map(|w| w.subject).collect()
    };
    assert_eq!(subjects("flame_in_tube.toml"), ["exit"]);
    for name in [
        "swirl_rig.toml",
        "pressurised_rig.toml",
        "staged_flame.toml",
        "twenty_elements.toml",
    ] {
        assert!(subjects(name).is_empty(), "{name}: {:?}", subjects(name));
    }
}

#[test]
fn twenty_elements_are_twenty_and_two_of_them_burn() {
    let loaded = load("twenty_elements.toml");
    let inner = loaded.network.elements().count() - 2;
    let flames = loaded
        .network
        .elements()
        .filter(|(_, e)| matches!(e.kind, Kind::Flame(_)))
        .count();
    assert_eq!((inner, flames), (20, 2));
}

#[test]
fn the_knobs_of_the_map_are_there() {
    for name in ["swirl_rig.toml", "flame_in_tube.toml"] {
        let network = load(name).network;
        for knob in ["main_flame.delay", "main_flame.interaction_index"] {
            assert!(network.layout.knob(knob).is_some());
        }
        let short = network.layout.knob("main_flame.delay");
        assert_eq!(network.layout.knob("main_flame.response.delay"), short);
        assert_eq!(network.layout.knob("main_flame.response.1.delay"), short);
        assert_eq!(network.values[short.unwrap()], 0.003);
    }
    let staged = load("staged_flame.toml").network.layout;
    assert!(staged.knob("main_flame.response.2.spread").is_some());
    assert!(staged.knob("main_flame.delay").is_none());
}
