//! `modes --shapes --out` of the real binary: the pictures of all networks that come with it.

#[path = "draw/check.rs"]
mod check;
#[path = "common/cli.rs"]
mod cli;

use std::collections::BTreeSet;
use std::path::Path;

use check::{check_drawing, check_no_text_meets_another, number};
use cli::{NETWORKS, command, json, network, run};
use roxmltree::Document;
use serde_json::Value;

/// Name and text of the pictures in a folder, in order.
fn pictures(folder: &Path) -> Vec<(String, String)> {
    let files = std::fs::read_dir(folder)
        .unwrap()
        .map(|e| e.unwrap().path());
    let mut svg: Vec<_> = files
        .filter(|p| p.extension().is_some_and(|e| e == "svg"))
        .collect();
    svg.sort();
    let read = |p: std::path::PathBuf| {
        let name = p.file_name().unwrap().to_string_lossy().into_owned();
        (name, std::fs::read_to_string(p).unwrap())
    };
    svg.into_iter().map(read).collect()
}

/// The pictures of a network, and its modes in JSON.
fn drawn(name: &str, more: &[&str]) -> (Vec<(String, String)>, Vec<Value>) {
    let folder = tempfile::tempdir().unwrap();
    let out = ["--shapes", "--out", folder.path().to_str().unwrap()];
    let ran = run("modes", &network(name), &[more, &out].concat());
    assert_eq!(ran.code, Some(0), "{}", ran.stderr);
    let (value, _) = json("modes", &network(name), &[more, &["--shapes"]].concat());
    (
        pictures(folder.path()),
        value["modes"].as_array().unwrap().clone(),
    )
}

fn title(svg: &str) -> String {
    let document = Document::parse(svg).unwrap();
    let label = document.root_element().attribute("aria-label").unwrap();
    label.to_owned()
}

#[test]
fn every_mode_of_every_network_has_its_picture() {
    for name in NETWORKS {
        let (pictures, modes) = drawn(name, &[]);
        assert_eq!(pictures.len(), modes.len(), "{name}");
        for (k, ((file, svg), mode)) in pictures.iter().zip(&modes).enumerate() {
            assert_eq!(*file, format!("{name}_shape_{}.svg", k + 1));
            assert!(svg.len() < 100_000, "{file}: {} bytes", svg.len());
            check_drawing(file.trim_end_matches(".svg"), svg);
            check_no_text_meets_another(file, svg);
            let title = title(svg);
            let hz = mode["frequency_hz"].as_f64().unwrap();
            assert!(title.starts_with(&format!("{hz:.1} Hz ")), "{title}");
            assert!(
                title.contains(mode["tendency"].as_str().unwrap()),
                "{title}"
            );
            let home = mode["mostly_in"].as_str().unwrap();
            assert!(title.ends_with(&format!("in {home}")), "{title}");
            if mode["tendency"] == "grows" {
                let growth = |p: &Value| p["growth_per_s"].as_f64().unwrap();
                let parts = mode["budget"].as_array().unwrap().iter();
                let driver = parts
                    .max_by(|a, b| growth(a).total_cmp(&growth(b)))
                    .unwrap();
                let driver = driver["element"].as_str().unwrap();
                assert!(title.contains(&format!("driven by {driver}")), "{title}");
            }
        }
    }
}

/// Units on axes, no small print below 9, a true minus before every number, coordinates to a tenth.
#[test]
fn pictures_keep_to_the_rules_of_print() {
    for name in NETWORKS {
        for (file, svg) in drawn(name, &[]).0 {
            let document = Document::parse(&svg).unwrap();
            let mut captions = Vec::new();
            for node in document.descendants().filter(|n| n.has_tag_name("text")) {
                assert!(number(node, "font-size").unwrap() >= 9.0, "{file}");
                let text = node.text().unwrap();
                captions.push(text);
                let letters: Vec<char> = text.chars().collect();
                let hyphen = letters
                    .windows(2)
                    .any(|w| w[0] == '-' && w[1].is_ascii_digit());
                assert!(!hyphen, "{file}: {text}");
            }
            for unit in ["(Pa)", "(mm/s)", "(deg)", "(m)", "(1/s)", "(%)"] {
                assert!(captions.iter().any(|c| c.ends_with(unit)), "{file}: {unit}");
            }
            for node in document.descendants() {
                for attribute in node.attributes() {
                    if !matches!(attribute.name(), "d" | "x" | "y" | "width" | "height") {
                        continue;
                    }
                    let numbers = attribute
                        .value()
                        .split(|c: char| !(c.is_ascii_digit() || c == '.'));
                    for number in numbers {
                        let decimals = number.split_once('.').map_or(0, |(_, d)| d.len());
                        assert!(decimals <= 1, "{file}: {number} in {}", attribute.name());
                    }
                }
            }
            assert_eq!(svg.matches("@font-face").count(), 2, "{file}");
            assert!(
                !svg.contains("http://") || svg.matches("http").count() == 1,
                "{file}"
            );
        }
    }
}

/// What the machine has to say about homes, fonts, languages and threads changes nothing.
#[test]
fn pictures_are_the_same_bytes_everywhere() {
    for name in ["pressurised_rig", "twenty_elements"] {
        let once = drawn(name, &[]).0;
        let folder = tempfile::tempdir().unwrap();
        let arguments = ["--shapes", "--out", folder.path().to_str().unwrap()];
        let output = command("modes", &network(name), &arguments)
            .env_clear()
            .env("RAYON_NUM_THREADS", "1")
            .env("LANG", "de_DE.UTF-8")
            .env("HOME", "/nonexistent")
            .env("FONTCONFIG_FILE", "/nonexistent")
            .output()
            .unwrap();
        assert_eq!(output.status.code(), Some(0));
        assert!(once == pictures(folder.path()), "{name}");
    }
}

/// Velocity jumps at area changes and flames: one stretch of the curve for each duct, the pressure too.
#[test]
fn curves_break_at_every_compact_element() {
    for name in NETWORKS {
        let (pictures, modes) = drawn(name, &[]);
        for ((file, svg), mode) in pictures.iter().zip(&modes) {
            let along = mode["shape"]["along"].as_array().unwrap().iter();
            let ducts: BTreeSet<&str> = along.map(|p| p["element"].as_str().unwrap()).collect();
            let document = Document::parse(svg).unwrap();
            let curves = document
                .descendants()
                .filter(|n| n.attribute("stroke-width") == Some("1.9"));
            let mut curves = curves.filter_map(|n| n.attribute("d"));
            for what in ["pressure", "velocity"] {
                let starts = curves.next().unwrap().matches('M').count();
                assert_eq!(starts, ducts.len(), "{file}: {what}");
            }
        }
    }
}

#[test]
fn without_a_folder_there_is_no_picture() {
    let folder = tempfile::tempdir().unwrap();
    let output = command("modes", &network("swirl_rig"), &["--shapes"])
        .current_dir(folder.path())
        .output()
        .unwrap();
    assert_eq!(output.status.code(), Some(0));
    assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 0);
}

/// A tube between two partly reflecting ends, which empties without oscillation.
const EMPTYING: &str = r#"
title = "A tube that empties (invented)"
[search]
frequency = "0 to 400 Hz"
growth = "-900 to 100 1/s"
[feed]
gas = { gamma = 1.4, gas_constant = "287 J/(kg K)" }
mass_flow = "0 kg/s"
temperature = "300 K"
pressure = "101325 Pa"
end = "reflection"
coefficient = 0.5
[[element]]
name = "tube"
kind = "duct"
length = "0.5 m"
diameter = "50 mm"
[exit]
end = "reflection"
coefficient = 0.5
"#;

#[test]
fn a_mode_without_oscillation_is_drawn_as_well() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("tube.toml");
    std::fs::write(&file, EMPTYING).unwrap();
    let out = folder.path().to_str().unwrap();
    let ran = run("modes", &file, &["--shapes", "--out", out]);
    assert_eq!(ran.code, Some(0), "{}", ran.stderr);
    let pictures = pictures(folder.path());
    assert_eq!(pictures.len(), 2);
    for (file, svg) in &pictures {
        check_drawing(file.trim_end_matches(".svg"), svg);
        check_no_text_meets_another(file, svg);
    }
    let title = title(&pictures[0].1);
    assert!(
        title.starts_with("A mode without oscillation decays"),
        "{title}"
    );
}
