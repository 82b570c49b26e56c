//! Profiles: a chain to scale, curves over it, bars of what adds to a sum.

use proptest::prelude::*;
use roxmltree::Document;
use stillflame::draw::{
    Axis, Chain, ChainEnd, Contribution, Contributions, Curve, DrawError, EndSymbol, Passage,
    Plane, ProfileFigure, ProfilePanel, ProfileWords, Symbol, profile,
};

use crate::check::{check_drawing, check_no_text_meets_another};

/// Passages of the given names, lengths and widths, with a plane between each two.
fn chain(parts: &[(&str, f64, f64)], symbols: &[Symbol]) -> Chain {
    let mut chain = Chain {
        ends: (
            ChainEnd {
                name: "feed: closed".into(),
                symbol: EndSymbol::Wall,
            },
            ChainEnd {
                name: "exit: open".into(),
                symbol: EndSymbol::Opening,
            },
        ),
        widest: "Ø 100 mm".into(),
        ..Chain::default()
    };
    let mut at = 0.0;
    for (k, &(name, length, width)) in parts.iter().enumerate() {
        chain.passages.push(Passage {
            name: name.into(),
            from: at,
            to: at + length,
            width,
            tinted: 2 * k > parts.len(),
        });
        at += length;
        if k + 1 < parts.len() {
            chain.planes.push(Plane {
                name: format!("plane_{k}"),
                at,
                width,
                symbol: symbols[k % symbols.len()],
            });
        }
    }
    chain
}

const SYMBOLS: [Symbol; 4] = [
    Symbol::Step,
    Symbol::Flame,
    Symbol::Pinch { free: 0.4 },
    Symbol::Vessel,
];

fn figure(chain: Chain, rows: usize) -> ProfileFigure {
    // Each passage its own stretch of |cos|, so that curves jump at every plane.
    let runs = |scale: f64| -> Vec<Vec<(f64, f64)>> {
        let passages = chain.passages.iter().enumerate();
        passages
            .map(|(k, p)| {
                let place = |i: usize| p.from + (p.to - p.from) * i as f64 / 40.0;
                let value = |x: f64| scale * (7.0 * x + k as f64).cos().abs();
                (0..=40).map(|i| (place(i), value(place(i)))).collect()
            })
            .collect()
    };
    let curve = |style, name: &str, scale| Curve {
        name: name.into(),
        style,
        runs: runs(scale),
    };
    ProfileFigure {
        title: "212.4 Hz grows at +31 1/s; driven by plane_1, 61 % of its energy in the long one"
            .into(),
        subtitle: "Invented chain. Mode 2 of 7".into(),
        footnote: "Invented numbers.".into(),
        x: Axis::new("Distance", "m"),
        panels: vec![
            ProfilePanel {
                y: Axis::new("Pressure |p′|", "Pa"),
                fixed: Some(((0.0, 1.1), vec![0.0, 0.5, 1.0])),
                curves: vec![curve(0, "pressure", 1.0)],
            },
            ProfilePanel {
                y: Axis::new("Velocity |u′|", "mm/s"),
                fixed: None,
                curves: vec![curve(1, "velocity", 3.4)],
            },
        ],
        words: ProfileWords {
            flame: "flame".into(),
            plane: "other compact element".into(),
            tinted: "burnt".into(),
        },
        bars: (rows > 0).then(|| Contributions {
            axis: Axis::new("Part of the growth rate", "1/s"),
            sides: ("damps".into(), "drives".into()),
            classes: vec!["by heat".into(), "by flow".into(), "by entropy".into()],
            rows: (0..rows)
                .map(|k| Contribution {
                    name: format!("element_{k}"),
                    values: [31.0, -12.0, 3.5]
                        .map(|v| v * (k as f64 + 0.7).sin())
                        .into(),
                    share: 100.0 / rows as f64,
                })
                .collect(),
            sum: "growth rate".into(),
            share: Axis::new("Acoustic energy", "%"),
            whole: 100.0,
        }),
        chain,
    }
}

fn gallery() -> Vec<(&'static str, ProfileFigure)> {
    let plain = [
        ("cold", 0.5, 0.1),
        ("tube", 0.1, 0.03),
        ("chamber", 0.7, 0.08),
    ];
    let mut all = vec![
        ("profile_plain", figure(chain(&plain, &SYMBOLS), 7)),
        ("profile_without_bars", figure(chain(&plain, &SYMBOLS), 0)),
        ("profile_one_duct", figure(chain(&plain[..1], &SYMBOLS), 1)),
    ];
    let names: Vec<String> = (0..24).map(|k| format!("a_rather_long_name_{k}")).collect();
    let many: Vec<(&str, f64, f64)> = names
        .iter()
        .enumerate()
        .map(|(k, n)| {
            (
                n.as_str(),
                0.02 + 0.01 * (k % 5) as f64,
                0.05 + 0.02 * (k % 3) as f64,
            )
        })
        .collect();
    all.push(("profile_crowded", figure(chain(&many, &SYMBOLS), 24)));
    let squeezed: Vec<(&str, f64, f64)> = (many.iter().enumerate())
        .map(|(k, &(n, _, w))| (n, if k == 20 { 4.0 } else { 0.001 }, w))
        .collect();
    all.push(("profile_squeezed", figure(chain(&squeezed, &SYMBOLS), 3)));
    let flat = [("pipe", 80.0, 0.01), ("hose", 40.0, 0.02)];
    all.push(("profile_flat", figure(chain(&flat, &SYMBOLS), 2)));
    let tall = [("drum", 0.02, 3.0), ("drum2", 0.03, 2.0)];
    all.push(("profile_tall", figure(chain(&tall, &SYMBOLS), 2)));
    let ends = [
        (EndSymbol::Room, EndSymbol::Sheet),
        (EndSymbol::Absorber, EndSymbol::Nozzle),
        (EndSymbol::Nozzle, EndSymbol::Absorber),
    ];
    for (name, (left, right)) in ["profile_ends_a", "profile_ends_b", "profile_ends_c"]
        .into_iter()
        .zip(ends)
    {
        let mut one = figure(chain(&plain, &SYMBOLS), 4);
        one.chain.ends.0.symbol = left;
        one.chain.ends.1.symbol = right;
        all.push((name, one));
    }
    let mut still = figure(chain(&plain, &SYMBOLS), 4);
    for row in &mut still.bars.as_mut().unwrap().rows {
        row.values.fill(0.0);
        row.share = 0.0;
    }
    all.push(("profile_still", still));
    all
}

#[test]
fn every_profile_is_well_formed_and_no_text_meets_another() {
    for (name, figure) in gallery() {
        let svg = profile::render(&figure).unwrap();
        check_drawing(name, &svg);
        check_no_text_meets_another(name, &svg);
        assert_eq!(svg, profile::render(&figure).unwrap(), "{name}");
        assert!(svg.len() < 100_000, "{name}: {} bytes", svg.len());
    }
}

/// The strokes of curves, in order of panels.
fn strokes(svg: &str) -> Vec<String> {
    let document = Document::parse(svg).unwrap();
    let curves = document.descendants().filter(|n| {
        n.attribute("stroke-width") == Some("1.9")
            && n.attribute("stroke-linejoin") == Some("round")
    });
    curves
        .filter_map(|n| n.attribute("d"))
        .filter(|d| d.matches('l').count() > 0 && d.len() > 30)
        .map(str::to_owned)
        .collect()
}

#[test]
fn a_jump_breaks_the_curve_and_is_never_a_slope() {
    let parts = [
        ("a", 0.3, 0.1),
        ("b", 0.2, 0.05),
        ("c", 0.5, 0.1),
        ("d", 0.1, 0.07),
    ];
    let svg = profile::render(&figure(chain(&parts, &SYMBOLS), 3)).unwrap();
    let curves = strokes(&svg);
    assert_eq!(curves.len(), 2, "one stroke for each panel");
    for data in curves {
        assert_eq!(
            data.matches('M').count(),
            parts.len(),
            "one stretch for each passage"
        );
    }
}

#[test]
fn passages_are_drawn_to_scale() {
    // Twice as wide is twice as high, and as long as wide is square.
    let parts = [("a", 0.3, 0.1), ("b", 0.1, 0.1), ("c", 0.9, 0.05)];
    let svg = profile::render(&figure(chain(&parts, &[Symbol::Step]), 0)).unwrap();
    let document = Document::parse(&svg).unwrap();
    let bodies: Vec<[f64; 2]> = document
        .descendants()
        .filter(|n| {
            matches!(n.attribute("fill"), Some("#eef0f3" | "#f4ddc0"))
                && n.attribute("stroke").is_none()
        })
        .filter_map(|n| n.attribute("d"))
        .map(|d| {
            // M left top H right V bottom H left Z
            let numbers: Vec<f64> = d
                .split(|c: char| c.is_alphabetic() || c == ' ')
                .filter(|s| !s.is_empty())
                .map(|s| s.parse().unwrap())
                .collect();
            [numbers[2] - numbers[0], numbers[3] - numbers[1]]
        })
        .collect();
    assert!(bodies.len() >= 2, "{bodies:?}");
    let [long, square] = [bodies[0], bodies[1]];
    assert!((long[0] - 3.0 * square[0]).abs() < 0.4, "{bodies:?}");
    assert!((square[0] - square[1]).abs() < 0.3, "{bodies:?}");
    assert!(svg.contains("drawn to scale"));
    let flat = profile::render(&figure(chain(&[("pipe", 80.0, 0.01)], &SYMBOLS), 0)).unwrap();
    assert!(
        flat.contains("enlarged") || flat.contains("not to scale"),
        "says that it is not"
    );
}

#[test]
fn what_cannot_be_placed_is_refused() {
    let good = || figure(chain(&[("a", 0.3, 0.1), ("b", 0.2, 0.05)], &SYMBOLS), 2);
    let refused = |change: &dyn Fn(&mut ProfileFigure)| {
        let mut figure = good();
        change(&mut figure);
        profile::render(&figure).unwrap_err()
    };
    assert!(profile::render(&good()).is_ok());
    assert!(matches!(
        refused(&|f| f.chain.passages.clear()),
        DrawError::NoSamples { .. }
    ));
    assert!(matches!(
        refused(&|f| f.chain.passages[1].to = 0.1),
        DrawError::Samples { index: 1, .. }
    ));
    assert!(matches!(
        refused(&|f| f.panels[1].curves[0].runs[0][3].1 = f64::NAN),
        DrawError::NotFinite {
            row: 1,
            column: 3,
            ..
        }
    ));
    assert!(matches!(
        refused(&|f| {
            f.bars.as_mut().unwrap().rows[1].values.pop();
        }),
        DrawError::Shape {
            found: 2,
            expected: 3,
            ..
        }
    ));
    assert!(matches!(
        refused(&|f| f.bars.as_mut().unwrap().rows[0].share = f64::INFINITY),
        DrawError::NotFinite { .. }
    ));
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(48))]

    /// Names of any length over passages of any length neither meet nor leave the canvas.
    #[test]
    fn names_of_any_chain_find_room(
        parts in proptest::collection::vec(("[a-z_0-9]{1,24}", 0.001..1.0f64, 0.01..0.2f64), 1..22),
        rows in 0usize..12,
    ) {
        let parts: Vec<(&str, f64, f64)> = parts.iter().map(|(n, l, w)| (n.as_str(), *l, *w)).collect();
        let svg = profile::render(&figure(chain(&parts, &SYMBOLS), rows)).unwrap();
        check_drawing("profile_any", &svg);
        check_no_text_meets_another("profile_any", &svg);
    }
}
