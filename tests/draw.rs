//! Figures from invented fields: well-formed, inside the canvas, small, the same every time, and
//! true to the field. Every figure is also written to the target folder's `tmp/draw`, to be looked at.

use std::path::Path;

use proptest::prelude::*;
use roxmltree::{Document, Node};
use stillflame::draw::{
    Axis, DesignPoint, DrawError, IsoLines, LineFigure, Panel, Quantity, Scale, Series, Shade,
    StabilityMap, contour, field::Field, lines, map, text,
};

type Rows = Vec<Vec<Option<f64>>>;

fn samples(low: f64, high: f64, n: usize) -> Vec<f64> {
    (0..n)
        .map(|k| low + (high - low) * k as f64 / (n.max(2) - 1) as f64)
        .collect()
}

fn rows(x: &[f64], y: &[f64], f: impl Fn(f64, f64) -> Option<f64>) -> Rows {
    y.iter()
        .map(|&y| x.iter().map(|&x| f(x, y)).collect())
        .collect()
}

/// Three branches over delay (ms) and gain; the largest growth rate wins.
fn branches(delay: f64, gain: f64) -> (f64, f64) {
    let branch = |hz: f64, loss: f64, weight: f64| {
        let phase = std::f64::consts::TAU * hz * delay / 1000.0;
        (
            90.0 * weight * gain * phase.sin() - loss - 8.0 * delay,
            hz - 30.0 * gain * phase.cos(),
        )
    };
    [
        branch(110.0, 25.0, 1.0),
        branch(235.0, 45.0, 1.6),
        branch(390.0, 80.0, 1.9),
    ]
    .into_iter()
    .max_by(|a, b| a.0.total_cmp(&b.0))
    .unwrap()
}

fn base(nx: usize, ny: usize) -> StabilityMap {
    let x_values = samples(0.0, 10.0, nx);
    let y_values = samples(0.0, 2.0, ny);
    let values = rows(&x_values, &y_values, |x, y| Some(branches(x, y).0));
    StabilityMap {
        title: "The design point decays; a flame delay 0.4 ms longer or shorter lets it grow"
            .into(),
        subtitle: "Invented atmospheric swirl rig, one burner, 200 × 200 networks".into(),
        footnote: "Computed from a linear network model with the flame response as stated. \
                   Confirm by rig test before any decision on hardware."
            .into(),
        x: Axis::new("Flame delay", "ms"),
        y: Axis::new("Interaction index", ""),
        quantity: Quantity {
            label: "Largest growth rate".into(),
            unit: "1/s".into(),
            above: "grows".into(),
            below: "decays".into(),
        },
        certified: vec![vec![true; nx]; ny],
        values,
        x_values,
        y_values,
        design_point: Some(DesignPoint {
            x: 4.2,
            y: 1.3,
            label: format!("design, {} 1/s", text::fixed(branches(4.2, 1.3).0, 0)),
        }),
        ..StabilityMap::default()
    }
}

fn set_values(map: &mut StabilityMap, f: impl Fn(f64, f64) -> Option<f64>) {
    map.values = rows(&map.x_values, &map.y_values, f);
}

fn full() -> StabilityMap {
    let mut map = base(200, 200);
    map.frequency = Some(IsoLines {
        label: "Frequency".into(),
        unit: "Hz".into(),
        values: rows(&map.x_values, &map.y_values, |x, y| Some(branches(x, y).1)),
    });
    for (j, row) in map.certified.iter_mut().enumerate() {
        for (i, flag) in row.iter_mut().enumerate() {
            let (x, y) = (i as f64 - 150.0, j as f64 - 160.0);
            *flag = x * x / 500.0 + y * y / 150.0 > 1.0 && (i, j) != (60, 100);
        }
    }
    for (j, row) in map.values.iter_mut().enumerate() {
        for (i, value) in row.iter_mut().enumerate() {
            if (i as f64) < 26.0 - 0.004 * (j as f64 - 30.0).powi(2) {
                *value = None;
            }
        }
    }
    map
}

/// Every figure of the gallery, by name.
fn gallery() -> Vec<(&'static str, StabilityMap)> {
    let mut all = vec![
        ("full", full()),
        ("plain", base(200, 200)),
        ("coarse", base(13, 9)),
    ];

    let mut saturated = base(120, 90);
    set_values(&mut saturated, |x, y| {
        let spot = (-((x - 7.0).powi(2) + (10.0 * (y - 1.4)).powi(2)) / 0.4).exp();
        Some(60.0 * (x - 4.0 + y).sin() - 10.0 + 2500.0 * spot - if x > 9.8 { 900.0 } else { 0.0 })
    });
    saturated.design_point = Some(DesignPoint {
        x: 10.0,
        y: 2.0,
        label: "corner case".into(),
    });
    all.push(("saturated", saturated));

    let mut two = base(2, 2);
    two.values = vec![vec![Some(-12.0), Some(3.0)], vec![Some(8.0), Some(-4.0)]];
    two.certified = vec![vec![true, true], vec![true, false]];
    two.design_point = None;
    all.push(("two_by_two", two));

    let mut column = base(1, 40);
    column.x_values = vec![3.0];
    set_values(&mut column, |_, y| Some(40.0 * y - 30.0));
    column.design_point = Some(DesignPoint {
        x: 3.0,
        y: 0.0,
        label: "bottom edge".into(),
    });
    all.push(("one_column", column));

    let mut row = base(40, 1);
    row.y_values = vec![1.0];
    set_values(&mut row, |x, _| (x < 6.0).then_some(-5.0 + x));
    all.push(("one_row", row));

    let mut single = base(1, 1);
    set_values(&mut single, |_, _| Some(-7.0));
    all.push(("single", single));

    let mut constant = base(30, 30);
    set_values(&mut constant, |_, _| Some(0.0));
    all.push(("constant_zero", constant));

    let mut damped = base(30, 30);
    set_values(&mut damped, |_, _| Some(-42.0));
    all.push(("constant_damped", damped));

    let mut nothing = base(20, 20);
    set_values(&mut nothing, |_, _| None);
    all.push(("all_absent", nothing));

    let mut failed = base(20, 20);
    set_values(&mut failed, |_, _| None);
    failed.certified = vec![vec![false; 20]; 20];
    all.push(("all_uncertified", failed));

    let mut logarithmic = base(60, 60);
    logarithmic.x = Axis {
        label: "Plenum volume".into(),
        unit: "L".into(),
        scale: Scale::Logarithmic,
    };
    logarithmic.x_values = (0..60)
        .map(|k| 10f64.powf(-1.0 + 3.0 * k as f64 / 59.0))
        .collect();
    logarithmic.design_point = Some(DesignPoint {
        x: 8.0,
        y: 1.9,
        label: "design".into(),
    });
    set_values(&mut logarithmic, |x, y| {
        Some(30.0 * (2.0 * x.ln()).sin() * y - 5.0)
    });
    all.push(("logarithmic", logarithmic));

    let mut hostile = base(50, 50);
    hostile.title = "<b>\"R&D\" 'title'</b> that goes on & on: ".to_string()
        + &"the growth rate at -12.5 degrees stays below −4 1/s whatever the burner does, "
            .repeat(6);
    hostile.subtitle = "火炎\u{7}の\u{1}応答 Ωμέγα κ ≤ 3 · 10⁻³ m² at 430 °C – \u{202e}☃".into();
    hostile.x.label = "An axis label far too long for any plot that we draw here, ".repeat(4);
    hostile.y.label = "]]> & <y>".into();
    hostile.quantity.label =
        "A quantity with a name so long that it cannot fit beside the bar".into();
    hostile.quantity.above = "grows without bound".into();
    hostile.design_point = Some(DesignPoint {
        x: 0.0,
        y: 2.0,
        label: "a <design> point with a very long label ".repeat(5),
    });
    hostile.footnote = "Unbreakable".repeat(60);
    hostile.words.zero = "neutral & <bold>".into();
    all.push(("hostile", hostile));

    let mut outside = base(40, 40);
    outside.design_point = Some(DesignPoint {
        x: 12.0,
        y: 1.0,
        label: "The design".into(),
    });
    all.push(("outside", outside));

    let mut specks = base(200, 200);
    for (j, row) in specks.certified.iter_mut().enumerate() {
        for (i, flag) in row.iter_mut().enumerate() {
            *flag = (i * 7919 + j * 104_729) % 997 != 0;
        }
    }
    all.push(("specks", specks));
    all
}

fn sweep() -> LineFigure {
    let x_values = samples(1.0, 8.0, 141);
    let branch = |k: usize, hz: f64, gain: f64, loss: f64| {
        let frequency = x_values.iter().map(|&t| {
            let phase = std::f64::consts::TAU * hz * t / 1000.0;
            (k != 2 || !(3.0..3.6).contains(&t)).then(|| hz - 18.0 * phase.cos() * gain)
        });
        let growth = x_values.iter().map(|&t| {
            let phase = std::f64::consts::TAU * hz * t / 1000.0;
            (k != 2 || !(3.0..3.6).contains(&t)).then(|| 90.0 * gain * phase.sin() - loss)
        });
        (frequency.collect::<Vec<_>>(), growth.collect::<Vec<_>>())
    };
    let all: Vec<_> = [
        (110.0, 1.0, 25.0),
        (235.0, 1.3, 45.0),
        (390.0, 0.9, 60.0),
        (560.0, 0.5, 90.0),
    ]
    .into_iter()
    .enumerate()
    .map(|(k, (hz, gain, loss))| branch(k, hz, gain, loss))
    .collect();
    let series = |pick: fn(&(Vec<Option<f64>>, Vec<Option<f64>>)) -> &Vec<Option<f64>>| {
        let named = all.iter().enumerate();
        named
            .map(|(k, b)| Series {
                name: format!("branch {}", k + 1),
                style: k,
                values: pick(b).clone(),
            })
            .collect::<Vec<_>>()
    };
    LineFigure {
        title: "Branch 1 grows for delays up to 4.2 ms; branch 2 takes over beyond".into(),
        subtitle: "Invented atmospheric swirl rig, sweep of the flame delay, 141 networks".into(),
        footnote: "Confirm by rig test before any decision on hardware.".into(),
        x: Axis::new("Flame delay", "ms"),
        certified: (0..141)
            .map(|k| !(100..112).contains(&k) && k != 20)
            .collect(),
        x_values: x_values.clone(),
        uncertified: "not certified".into(),
        mark: Some((3.0, "design, 3 ms".into())),
        panels: vec![
            Panel {
                y: Axis::new("Frequency", "Hz"),
                series: series(|b| &b.0),
                shade: None,
            },
            Panel {
                y: Axis::new("Growth rate", "1/s"),
                series: series(|b| &b.1),
                shade: Some(Shade {
                    from: 0.0,
                    upwards: true,
                    label: "grows".into(),
                }),
            },
        ],
    }
}

fn line_gallery() -> Vec<(&'static str, LineFigure)> {
    let mut spectrum = sweep();
    spectrum.title = "One peak stands 40 dB above the rest".into();
    spectrum.mark = None;
    spectrum.certified.clear();
    spectrum.panels.truncate(1);
    spectrum.panels[0].y = Axis {
        label: "Amplitude".into(),
        unit: "Pa".into(),
        scale: Scale::Logarithmic,
    };
    spectrum.panels[0].series.truncate(1);
    for (k, v) in spectrum.panels[0].series[0].values.iter_mut().enumerate() {
        let f = k as f64 - 60.0;
        *v = Some(900.0 / (1.0 + f * f) + 3.0 + (k as f64 * 1.7).sin());
    }
    let mut dots = sweep();
    for series in dots.panels.iter_mut().flat_map(|p| &mut p.series) {
        for (k, v) in series.values.iter_mut().enumerate() {
            *v = v.filter(|_| k % 5 == 0);
        }
    }
    let mut empty = sweep();
    for series in empty.panels.iter_mut().flat_map(|p| &mut p.series) {
        series.values.fill(None);
    }
    let mut single = sweep();
    single.x_values.truncate(1);
    single.certified = vec![false];
    single
        .panels
        .iter_mut()
        .flat_map(|p| &mut p.series)
        .for_each(|s| s.values.truncate(1));
    vec![
        ("sweep", sweep()),
        ("spectrum", spectrum),
        ("dots", dots),
        ("empty_lines", empty),
        ("single_lines", single),
    ]
}

fn save(name: &str, svg: &str) {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("draw");
    std::fs::create_dir_all(&folder).unwrap();
    std::fs::write(folder.join(format!("{name}.svg")), svg).unwrap();
}

fn number(node: Node, name: &str) -> Option<f64> {
    node.attribute(name).and_then(|v| v.parse().ok())
}

/// Corners of every text, from the font's metrics.
fn text_corners(document: &Document) -> Vec<(String, [(f64, f64); 4])> {
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

fn check_drawing(name: &str, svg: &str) {
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

#[test]
fn every_figure_is_well_formed_and_keeps_its_text_on_the_canvas() {
    for (name, figure) in gallery() {
        check_drawing(name, &map::render(&figure).unwrap());
    }
    for (name, figure) in line_gallery() {
        check_drawing(name, &lines::render(&figure).unwrap());
    }
}

#[test]
fn equal_input_gives_equal_bytes_and_a_large_map_stays_small() {
    let svg = map::render(&full()).unwrap();
    assert_eq!(svg, map::render(&full()).unwrap());
    println!("200 x 200 with everything: {} bytes", svg.len());
    assert!(svg.len() < 200_000, "{} bytes", svg.len());
}

#[test]
fn hatch_and_quiet_fill_stand_exactly_where_they_are_needed() {
    for (name, figure) in gallery() {
        let svg = map::render(&figure).unwrap();
        let document = Document::parse(&svg).unwrap();
        let filled = |what: &str| {
            let fills = document.descendants().filter_map(|n| n.attribute("fill"));
            fills.filter(|f| f.ends_with(&format!("-{what})"))).count()
        };
        let doubtful = figure.certified.iter().flatten().any(|c| !c);
        let mut both = figure
            .certified
            .iter()
            .flatten()
            .zip(figure.values.iter().flatten());
        let absent = both.any(|(c, v)| *c && v.is_none());
        // Once on the map and once in the legend.
        assert_eq!(
            filled("hatch"),
            if doubtful { 2 } else { 0 },
            "{name}: hatch"
        );
        assert_eq!(
            filled("absent"),
            if absent { 2 } else { 0 },
            "{name}: quiet fill"
        );
    }
}

#[test]
fn a_sweep_hatches_untrusted_samples_and_breaks_at_gaps() {
    let doubtful = |figure: &LineFigure| {
        let svg = lines::render(figure).unwrap();
        let document = Document::parse(&svg).unwrap();
        let fills = document.descendants().filter_map(|n| n.attribute("fill"));
        fills.filter(|f| f.ends_with("-hatch)")).count()
    };
    let mut figure = sweep();
    assert_eq!(doubtful(&figure), 3, "two panels and the legend");
    figure.certified.fill(true);
    assert_eq!(doubtful(&figure), 0);

    // A gap of branch 3 makes two strokes of it: its path starts twice.
    let svg = lines::render(&figure).unwrap();
    let document = Document::parse(&svg).unwrap();
    let starts = |style: usize, data: &str| {
        let curves = document
            .descendants()
            .filter(|n| n.attribute("stroke-width") == Some("1.9"));
        let curve = curves.filter_map(|n| n.attribute("d")).nth(style).unwrap();
        curve.matches(data).count()
    };
    assert_eq!((starts(0, "M"), starts(2, "M")), (1, 2));

    figure.panels[0].series[1].values.pop();
    assert!(matches!(
        lines::render(&figure),
        Err(DrawError::Shape { .. })
    ));
}

#[test]
fn neutral_lines_follow_the_zeros_of_the_field() {
    // x^2 + y^2 = 1 on [-1.5, 1.5]^2: a circle of radius 1.
    for (n, fine, tolerance) in [(200, 1, 1e-4), (13, 8, 2e-3)] {
        let axis = samples(-1.5, 1.5, n);
        let values = rows(&axis, &axis, |x, y| Some(x * x + y * y - 1.0));
        let found = contour::lines(&Field::new(&values), 0.0, fine, |_, _| false);
        assert_eq!(found.len(), 1, "one loop");
        assert_eq!(found[0].first(), found[0].last(), "closed");
        let step = 3.0 / (n - 1) as f64;
        let point = |p: &(f64, f64)| (p.0 * step - 1.5, p.1 * step - 1.5);
        for (x, y) in found[0].iter().map(point) {
            assert!(
                (x.hypot(y) - 1.0).abs() < tolerance,
                "({x}, {y}) with n = {n}"
            );
        }
        let pairs = found[0].windows(2).map(|w| (point(&w[0]), point(&w[1])));
        let length: f64 = pairs.map(|(p, q)| (p.0 - q.0).hypot(p.1 - q.1)).sum();
        assert!(
            (length - std::f64::consts::TAU).abs() < 0.02,
            "length {length}"
        );
    }
}

#[test]
fn lines_stop_at_holes() {
    let axis = samples(0.0, 10.0, 11);
    let hole = |x: f64| (4.5..6.5).contains(&x);
    let values = rows(&axis, &axis, |x, y| (!hole(x)).then_some(y - 5.25));
    let found = contour::lines(&Field::new(&values), 0.0, 4, |_, _| false);
    assert_eq!(found.len(), 2);
    for p in found.iter().flatten() {
        assert!(p.0 <= 4.0 || p.0 >= 7.0, "a point beside the hole: {p:?}");
        assert!((p.1 - 5.25).abs() < 1e-12);
    }
}

#[test]
fn contradictory_arrays_are_refused_with_their_place() {
    let refused = |change: &dyn Fn(&mut StabilityMap)| {
        let mut figure = base(4, 3);
        change(&mut figure);
        map::render(&figure).unwrap_err()
    };
    let cut = refused(&|m| {
        m.values[1].pop();
    });
    assert_eq!(
        cut,
        DrawError::Shape {
            what: "row 1 of values".into(),
            found: 3,
            expected: 4
        }
    );
    let infinite = refused(&|m| m.values[2][3] = Some(f64::INFINITY));
    assert!(matches!(
        infinite,
        DrawError::NotFinite {
            row: 2,
            column: 3,
            ..
        }
    ));
    assert!(matches!(
        refused(&|m| m.x_values.clear()),
        DrawError::NoSamples { .. }
    ));
    let twice = refused(&|m| m.y_values[1] = m.y_values[0]);
    assert!(matches!(twice, DrawError::Samples { index: 1, .. }));
    let negative = refused(&|m| m.x.scale = Scale::Logarithmic);
    assert!(matches!(negative, DrawError::NotPositive { .. }));
}

#[test]
fn numbers_carry_a_true_minus_and_equal_precision() {
    assert_eq!(text::tick_labels(&[-0.5, 0.0, 0.5]), ["−0.5", "0.0", "0.5"]);
    assert_eq!(text::tick_labels(&[-200.0, 0.0]), ["−200", "0"]);
    assert_eq!(text::tick_labels(&[0.0, 2.5e6]), ["0", "2.5×10⁶"]);
    assert_eq!(text::fixed(-0.001, 1), "0.0");
    assert_eq!(
        text::tidy("at -3 °C, low-swirl\n  burner"),
        "at −3 °C, low-swirl burner"
    );
    for c in "AZaz09ÀÿαωΔΩ−°×–¹²³⁻₀…≤√".chars() {
        assert!(text::covers(c), "{c}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn interpolation_stays_between_the_samples_of_a_cell(
        values in proptest::collection::vec(-10.0..10.0f64, 25),
        u in 0.0..4.0f64,
        v in 0.0..4.0f64,
    ) {
        let values: Rows = values.chunks(5).map(|r| r.iter().copied().map(Some).collect()).collect();
        let field = Field::new(&values);
        let (low, high) = field.cell_range(u as usize, v as usize).unwrap();
        let value = field.at(u, v).unwrap();
        prop_assert!((low..=high).contains(&value));
        prop_assert_eq!(field.at(u.floor(), v.floor()), field.sample(u as usize, v as usize));
    }

    #[test]
    fn wrapped_lines_fit(words in "[A-Za-z0-9 äé−]{0,200}", limit in 20.0..300.0f64) {
        for line in text::wrap(&words, text::Weight::Regular, 11.0, limit, 4) {
            prop_assert!(text::width(&line, text::Weight::Regular, 11.0) <= limit);
        }
    }

    #[test]
    fn any_string_gives_well_formed_xml(title in "\\PC{0,60}|[\\x00-\\x7f]{0,40}") {
        let mut figure = base(3, 3);
        figure.title = title.clone();
        figure.x.unit = title;
        let svg = map::render(&figure).unwrap();
        prop_assert!(Document::parse(&svg).is_ok());
    }
}
