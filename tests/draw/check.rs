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
    // Running text at the left margin leaves room for a viewer whose font is a tenth wider.
    let texts = document.descendants().filter(|n| n.has_tag_name("text"));
    for (node, (string, corners)) in texts.zip(text_corners(&document)) {
        let running =
            node.attribute("text-anchor").is_none() && node.attribute("transform").is_none();
        let (left, right) = (corners[0].0, corners[1].0);
        assert!(
            !(running && left < 15.0) || left + 1.08 * (right - left) <= w,
            "{name}: {string:?} reaches {right:.1} of {w}"
        );
    }
    let attributes = document.descendants().flat_map(|n| n.attributes());
    for a in attributes.filter(|a| !matches!(a.name(), "href" | "aria-label")) {
        assert!(
            !a.value().contains("NaN") && !a.value().contains("inf"),
            "{name}: {a:?}"
        );
    }
}

/// Whether two boxes, turned or not, share any area: no edge of either parts them.
fn meet(a: &[(f64, f64); 4], b: &[(f64, f64); 4]) -> bool {
    let parts = |p: &[(f64, f64); 4], q: &[(f64, f64); 4]| {
        (0..4).any(|k| {
            let (from, to) = (p[k], p[(k + 1) % 4]);
            let (nx, ny) = (to.1 - from.1, from.0 - to.0);
            let side = |x: &(f64, f64)| (x.0 - from.0) * nx + (x.1 - from.1) * ny;
            // A tenth of a px may be lost to rounding.
            let slack = 0.15 * nx.hypot(ny);
            q.iter().all(|x| side(x) >= -slack)
        })
    };
    !parts(a, b) && !parts(b, a)
}

pub fn check_no_text_meets_another(name: &str, svg: &str) {
    let document = Document::parse(svg).unwrap();
    let all = text_corners(&document);
    for (i, (text, corners)) in all.iter().enumerate() {
        for (other, others) in &all[..i] {
            assert!(!meet(corners, others), "{name}: {text:?} over {other:?}");
        }
    }
}

#[test]
fn the_check_sees_texts_that_meet() {
    let square = |x: f64, y: f64| [(x, y), (x + 10.0, y), (x + 10.0, y + 5.0), (x, y + 5.0)];
    assert!(meet(&square(0.0, 0.0), &square(9.0, 4.0)));
    assert!(!meet(&square(0.0, 0.0), &square(10.5, 0.0)));
    // A turned box in the bounds of another, beside it.
    let turned = [(8.0, -6.0), (14.0, 0.0), (12.0, 2.0), (6.0, -4.0)];
    assert!(!meet(&square(0.0, 0.0), &turned));
    assert!(meet(&square(3.0, -3.0), &turned));
}
