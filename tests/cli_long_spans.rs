//! Sweeps over spans that modes cross many times, and maps whose leading mode moves fast, of the real binary.

#[path = "common/cli.rs"]
mod cli;

use cli::{NETWORKS, json, network, run};
use serde_json::Value;

/// The figures of a sweep of the swirl rig over its flame's delay, and its object.
fn sweep(span: &str, points: &str) -> ([String; 2], Value) {
    let folder = tempfile::tempdir().unwrap();
    let out = folder.path().to_str().unwrap();
    let vary = format!("main_flame.delay = {span}");
    let all = ["--vary", &vary, "--points", points, "--out", out];
    let (value, code) = json("sweep", &network("swirl_rig"), &all);
    assert_eq!(code, Some(0));
    let figure = |name: &str| {
        let file = folder.path().join(format!("swirl_rig_{name}.svg"));
        std::fs::read_to_string(file).unwrap()
    };
    ([figure("sweep"), figure("locus")], value)
}

#[test]
fn long_spans_stay_light_and_say_what_was_not_followed() {
    for (span, points, followed) in [
        ("1 ms to 60 ms", "2", true),
        ("1 ms to 60 ms", "141", true),
        ("0 ms to 125 ms", "2", false),
        ("0 ms to 125 ms", "3", false),
        ("0 ms to 125 ms", "141", false),
        ("0 ms to 400 ms", "5", false),
    ] {
        let (figures, value) = sweep(span, points);
        for svg in &figures {
            assert!(svg.len() < 100_000, "{span}, {points}: {} bytes", svg.len());
            assert!(svg.contains(&format!(
                "{points} points reported, the list of each proved"
            )));
            roxmltree::Document::parse(svg).unwrap();
        }
        let gaps = value["not_followed"].as_array().unwrap();
        assert_eq!(gaps.is_empty(), followed, "{span}, {points}");
        let finding = value["finding"].as_str().unwrap();
        assert_eq!(
            finding.contains("modes not followed"),
            !followed,
            "{finding}"
        );
        let warned = value["warnings"].as_array().unwrap().iter();
        let warned = warned.filter(|w| w["message"].as_str().unwrap().contains("too fast for"));
        assert_eq!(warned.count(), usize::from(!followed));
        for svg in &figures {
            let dots = svg.contains("modes at points computed, not followed between");
            assert_eq!(dots, !followed);
        }
        // No branch is a scrap of a stretch over which nothing is followed.
        let (branches, events) = (&value["branches"], &value["events"]);
        for branch in branches.as_array().unwrap() {
            let end = |field: &str| branch[field].as_f64().unwrap();
            let holds = |gap: &Value| {
                gap[0].as_f64().unwrap() <= end("from") && end("to") <= gap[1].as_f64().unwrap()
            };
            assert!(!gaps.iter().any(holds), "{branch}");
        }
        assert!(branches.as_array().unwrap().len() < 1000);
        assert!(events.as_array().unwrap().len() < 3000);
        // What is told of a mode's branch is a branch that is told of.
        for mode in value["points"]
            .as_array()
            .unwrap()
            .iter()
            .flat_map(|p| p["modes"].as_array().unwrap())
        {
            if let Some(b) = mode["branch"].as_u64() {
                assert!(b >= 1 && b as usize <= branches.as_array().unwrap().len());
            }
        }
    }
}

#[test]
fn every_network_stays_light_over_delays_far_from_its_own() {
    for name in NETWORKS {
        let folder = tempfile::tempdir().unwrap();
        let out = folder.path().to_str().unwrap();
        let all = [
            "--scale",
            "*.delay = 0.01 to 30",
            "--points",
            "4",
            "--out",
            out,
        ];
        assert_eq!(run("sweep", &network(name), &all).code, Some(0), "{name}");
        for figure in ["sweep", "locus"] {
            let file = folder.path().join(format!("{name}_{figure}.svg"));
            let bytes = std::fs::metadata(file).unwrap().len();
            assert!(bytes < 100_000, "{name} {figure}: {bytes} bytes");
        }
    }
}

const BETWEEN_ANECHOIC_ENDS: &str = r#"
title = "Flame between anechoic ends (invented)"
search = { frequency = "20 to 800 Hz", growth = "-300 to 300 1/s" }
feed = { gas = { gamma = 1.4, gas_constant = "287 J/(kg K)" }, mass_flow = "0 kg/s", temperature = "300 K", pressure = "1 bar", end = "anechoic" }
exit = { end = "anechoic" }
[[element]]
name = "cold"
kind = "duct"
length = "0.2 m"
diameter = "80 mm"
[[element]]
name = "flame"
kind = "flame"
burnt_temperature = "1800 K"
response = { kind = "n-tau", interaction_index = 2.0, delay = "1 ms" }
[[element]]
name = "hot"
kind = "duct"
length = "0.2 m"
diameter = "80 mm"
"#;

/// The first intrinsic mode lies at `1/(2 tau)` and leads alone below 800 Hz: it is one region on maps whose frequency
/// moves by a half, a tenth and a twentieth per cell.
#[test]
fn one_mode_is_one_region_on_any_grid() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("anechoic.toml");
    std::fs::write(&file, BETWEEN_ANECHOIC_ENDS).unwrap();
    for points in ["5x4", "20x20", "40x3"] {
        let plane = [
            "--across",
            "flame.delay = 0.64 ms to 1.8 ms",
            "--up",
            "flame.interaction_index = 1 to 4",
            "--points",
            points,
        ];
        let (value, code) = json("map", &file, &plane);
        assert_eq!(code, Some(0));
        let regions = value["leading_regions"].as_array().unwrap();
        assert_eq!(regions.len(), 1, "{points}: {regions:?}");
        let low = regions[0]["frequency_hz"][0].as_f64().unwrap();
        let high = regions[0]["frequency_hz"][1].as_f64().unwrap();
        assert!((low - 0.5 / 1.8e-3).abs() < 1e-6 && (high - 0.5 / 0.64e-3).abs() < 1e-6);
    }
}

/// The places of the neutral curve of a map, px, line by line.
fn neutral_curve(svg: &str) -> Vec<Vec<(f64, f64)>> {
    let halo = svg
        .find("stroke-opacity=\".85\"")
        .or_else(|| svg.find("stroke-width=\"5\""));
    let start = svg[..halo.unwrap()].rfind("d=\"").unwrap() + 3;
    let data = &svg[start..start + svg[start..].find('"').unwrap()];
    let mut lines = Vec::new();
    for line in data.split('M').filter(|l| !l.is_empty()) {
        let closed = line.contains(['Z', 'z']);
        // A sign stands for a blank.
        let spaced: String = line.replace('-', " -");
        let numbers: Vec<f64> = spaced
            .split(|c: char| !(c.is_ascii_digit() || c == '.' || c == '-'))
            .filter(|n| !n.is_empty())
            .map(|n| n.parse().unwrap())
            .collect();
        let (mut x, mut y) = (numbers[0], numbers[1]);
        let mut places = vec![(x, y)];
        for step in numbers[2..].chunks(2) {
            (x, y) = (x + step[0], y + step[1]);
            places.push((x, y));
        }
        if closed {
            places.push(places[0]);
        }
        lines.push(places);
    }
    lines
}

/// In a window of growth so narrow that growing ground borders on ground without a mode, the neutral curve has no end but at
/// the rim of the plot, and lies where it lies in a wide window.
#[test]
fn the_neutral_curve_closes_against_ground_without_a_mode() {
    let folder = tempfile::tempdir().unwrap();
    let curve = |growth: &str| {
        let all = [
            "--across",
            "main_flame.delay = 0 ms to 10 ms",
            "--up",
            "feed.mass_flow = 10 g/s to 160 g/s",
            "--points",
            "40x30",
            "--growth",
            growth,
            "--out",
            folder.path().to_str().unwrap(),
        ];
        assert_eq!(run("map", &network("swirl_rig"), &all).code, Some(0));
        let svg = std::fs::read_to_string(folder.path().join("swirl_rig_map.svg")).unwrap();
        assert!(svg.len() < 200_000);
        let image = &svg[svg.find("<image").unwrap()..];
        let side = |name: &str| -> f64 {
            let from = image.find(&format!(" {name}=\"")).unwrap() + name.len() + 3;
            image[from..].split('"').next().unwrap().parse().unwrap()
        };
        let (left, top) = (side("x"), side("y"));
        let (right, bottom) = (left + side("width"), top + side("height"));
        let lines = neutral_curve(&svg);
        for line in &lines {
            let (first, last) = (line[0], line[line.len() - 1]);
            let apart = (first.0 - last.0).hypot(first.1 - last.1);
            for (x, y) in [first, last].into_iter().filter(|_| apart > 0.3) {
                let rim = [x - left, right - x, y - top, bottom - y];
                let off = rim.into_iter().fold(f64::INFINITY, |a, b| a.min(b.abs()));
                assert!(off < 0.3, "{growth}: ends at {x}, {y}");
            }
        }
        lines
    };
    let (narrow, wide) = (curve("-20 to 20 1/s"), curve("-300 to 300 1/s"));
    let places = |lines: &[Vec<(f64, f64)>]| -> Vec<(f64, f64)> { lines.concat() };
    let (narrow, wide) = (places(&narrow), places(&wide));
    assert!(narrow.len() > 100);
    let nearest = |(x, y): (f64, f64), all: &[(f64, f64)]| {
        let off = all.iter().map(|(u, v)| (x - u).hypot(y - v));
        off.fold(f64::INFINITY, f64::min)
    };
    let off: Vec<f64> = narrow.iter().map(|p| nearest(*p, &wide)).collect();
    let near = off.iter().filter(|d| **d < 8.0).count();
    assert!(
        near as f64 > 0.95 * off.len() as f64,
        "{near} of {}",
        off.len()
    );
}

/// Every object says in one way whether growth is excluded, and why not.
#[test]
fn growth_not_excluded_has_one_shape() {
    let swirl = network("swirl_rig");
    let plane = [
        "--across",
        "main_flame.delay = 2 ms to 4 ms",
        "--up",
        "main_flame.interaction_index = 0.5 to 1.5",
        "--points",
        "3x3",
    ];
    let vary = ["--vary", "main_flame.delay = 2 ms to 4 ms", "--points", "3"];
    let of_one = [&plane[..], &["--mode", "1"]].concat();
    for growth in ["-300 to 300 1/s", "-50 to 10 1/s"] {
        for (verb, more) in [
            ("modes", &[][..]),
            ("sweep", &vary),
            ("map", &plane),
            ("map", &of_one),
        ] {
            let all = [more, &["--growth", growth]].concat();
            let (value, code) = json(verb, &swirl, &all);
            assert_eq!(code, Some(0), "{verb} {growth}");
            let excluded = value["growth_excluded_beyond"].as_bool().unwrap();
            assert_eq!(
                excluded,
                growth.starts_with("-300") && more.len() < 8,
                "{verb} {growth}"
            );
            let why = &value["growth_not_excluded_because"];
            assert_eq!(why.is_null(), excluded, "{verb} {growth}: {why}");
            assert!(excluded || !why.as_str().unwrap().is_empty());
        }
    }
}

/// A picture stands alone.
#[test]
fn a_picture_does_not_speak_of_warnings_it_does_not_show() {
    let folder = tempfile::tempdir().unwrap();
    let out = folder.path().to_str().unwrap();
    let all = [
        "--vary",
        "main_flame.delay = 2 ms to 4 ms",
        "--points",
        "5",
        "--growth",
        "-50 to 10 1/s",
        "--out",
        out,
    ];
    let ran = run("sweep", &network("swirl_rig"), &all);
    assert!(
        ran.stdout.contains("told in the warnings"),
        "{}",
        ran.stdout
    );
    for name in ["sweep", "locus"] {
        let file = folder.path().join(format!("swirl_rig_{name}.svg"));
        let svg = std::fs::read_to_string(file).unwrap();
        assert!(!svg.contains("warnings") && svg.contains("growth outside the window"));
    }
}

/// Wherever a reported point has a mode that grows, in the window or outside, the point lies in an unstable stretch.
#[test]
fn what_grows_at_a_point_lies_in_an_unstable_stretch() {
    let mut growing = 0;
    for (span, points, more) in [
        ("200 ms to 300 ms", "3", [""; 0].as_slice()),
        ("200 ms to 230 ms", "3", &[]),
        ("200 ms to 290 ms", "8", &[]),
        ("0 ms to 125 ms", "9", &[]),
        ("3 ms to 60 ms", "20", &["--growth", "-50 to 20 1/s"]),
        ("10 ms to 60 ms", "3", &["--frequency", "20 to 5000 Hz"]),
        ("3 ms to 30 ms", "3", &["--frequency", "20 to 5000 Hz"]),
    ] {
        let vary = format!("main_flame.delay = {span}");
        let mut all = vec!["--vary", vary.as_str(), "--points", points];
        all.extend(more);
        let (value, _) = json("sweep", &network("swirl_rig"), &all);
        let number = |v: &Value| v.as_f64().unwrap();
        let stretches = value["unstable"].as_array().unwrap();
        for point in value["points"].as_array().unwrap() {
            let modes = point["modes"].as_array().unwrap().iter();
            let grows = |m: &Value| number(&m["growth_per_s"]) > 1e-6;
            if !modes.clone().any(grows) {
                continue;
            }
            growing += 1;
            let at = number(&point["value"]);
            let holds = |s: &Value| {
                let slack = 1e-12 * at.abs();
                number(&s[0]) - slack <= at && at <= number(&s[1]) + slack
            };
            assert!(stretches.iter().any(holds), "{span}, {points}: {at} grows");
        }
        let finding = value["finding"].as_str().unwrap();
        assert!(finding.contains("Unstable"), "{span}: {finding}");
    }
    assert!(growing >= 30, "{growing}");
}
