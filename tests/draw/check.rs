//! What holds for every drawing.

use std::path::Path;

use roxmltree::{Document, Node};
use stillflame::draw::text;

pub fn save(name: &str, svg: &str) {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("draw");
    std::fs::create_dir_all(&folder).unwrap();
    std::fs::write(folder.join(format!("{name}.svg")), svg).unwrap();
}

pub fn number(node: Node, name: &str) -> Option<f64> {
    node.attribute(name).and_then(|v| v.parse().ok())
}

/// Corners of every text, from the font's metrics.
pub fn text_corners(document: &Document) -> Vec<(String, [(f64, f64); 4])> {
    let texts = document.descendants().filter(|n| n.has_tag_name("text"));
    texts
        .map(|n| {
            let string = n.text().unwrap_or_default().to_string();
            let size = number(n, "font-size").unwrap();
            let weight = match n.attribute("font-weight") {
                Some("600") => text::Weight::Semibold,
                _ => text::Weight::Regular,
            };
            let w = text::width(&string, weight, size);
            let (x, y) = (number(n, "x").unwrap(), number(n, "y").unwrap());
            let left = match n.attribute("text-anchor") {
                Some("middle") => x - w / 2.0,
                Some("end") => x - w,
                _ => x,
            };
            let (top, bottom) = (y - text::CAP_HEIGHT * size, y + text::DESCENT * size);
            let turn = n.attribute("transform").map_or(0.0, |t| {
                t.trim_start_matches("rotate(")
                    .split(' ')
                    .next()
                    .unwrap()
                    .parse()
                    .unwrap()
            });
            let (sin, cos) = f64::to_radians(turn).sin_cos();
            let corners = [
                (left, top),
                (left + w, top),
                (left + w, bottom),
                (left, bottom),
            ]
            .map(|(px, py)| {
                (
                    x + (px - x) * cos - (py - y) * sin,
                    y + (px - x) * sin + (py - y) * cos,
                )
            });
            (string, corners)
        })
        .collect()
}

pub fn check_drawing(name: &str, svg: &str) {
    save(name, svg);
    let document = Document::parse(svg).unwrap_or_else(|e| panic!("{name}: {e}"));
    let root = document.root_element();
    let (w, h) = (
        number(root, "width").unwrap(),
        number(root, "height").unwrap(),
    );
    for (string, corners) in text_corners(&document) {
        for (x, y) in corners {
            assert!(
                (0.0..=w).contains(&x) && (0.0..=h).contains(&y),
                "{name}: {string:?} reaches ({x:.1}, {y:.1}) on {w} x {h}"
            );
        }
    }
    let attributes = document.descendants().flat_map(|n| n.attributes());
    for a in attributes.filter(|a| !matches!(a.name(), "href" | "aria-label")) {
        assert!(
            !a.value().contains("NaN") && !a.value().contains("inf"),
            "{name}: {a:?}"
        );
    }
}
