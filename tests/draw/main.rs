//! Figures from invented fields: well-formed, inside the canvas, small, the same every time, and
//! true to the field. Every figure is also written to the target folder's `tmp/draw`, to be looked at.

mod check;
mod figures;
mod profiles;

use check::check_drawing;
use figures::{
    Rows, base, full, gallery, line_gallery, locus_gallery, root_locus, rows, samples, sweep,
};
use proptest::prelude::*;
use roxmltree::Document;
use stillflame::draw::{
    Cuts, DrawError, LineFigure, Scale, Seam, StabilityMap, contour, field::Field, lines, locus,
    map, text,
};

#[test]
fn every_figure_is_well_formed_and_keeps_its_text_on_the_canvas() {
    for (name, figure) in gallery() {
        check_drawing(name, &map::render(&figure).unwrap());
    }
    for (name, figure) in line_gallery() {
        check_drawing(name, &lines::render(&figure).unwrap());
    }
    for (name, figure) in locus_gallery() {
        let svg = locus::render(&figure).unwrap();
        check_drawing(name, &svg);
        assert_eq!(svg, locus::render(&figure).unwrap());
    }
}

#[test]
fn a_locus_marks_the_round_values_of_its_parameter_on_every_trail() {
    let figure = root_locus();
    let svg = locus::render(&figure).unwrap();
    let document = Document::parse(&svg).unwrap();
    let dots = document
        .descendants()
        .filter(|n| n.attribute("r") == Some("2.3"))
        .count();
    // Eight whole milliseconds on each trail, and one in the legend.
    assert_eq!(dots, 8 * figure.trails.len() + 1);
    let mut broken = figure;
    broken.trails[0].runs[0][3].2 = f64::NAN;
    assert!(matches!(
        locus::render(&broken),
        Err(DrawError::NotFinite { .. })
    ));
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

/// From the last trusted sample to the next nothing is known: a curve ends where the hatching begins.
#[test]
fn hatching_of_a_sweep_meets_the_curves() {
    let mut figure = sweep();
    let count = figure.x_values.len();
    for untrusted in [0..1, 3..4, 40..52, count - 2..count] {
        figure.certified = (0..count).map(|i| !untrusted.contains(&i)).collect();
        for series in figure.panels.iter_mut().flat_map(|p| &mut p.series) {
            series.values = (0..count)
                .map(|i| (!untrusted.contains(&i)).then_some(1.0 + i as f64))
                .collect();
        }
        let svg = lines::render(&figure).unwrap();
        let document = Document::parse(&svg).unwrap();
        let paths = || document.descendants().filter(|n| n.has_tag_name("path"));
        let hatched = paths()
            .find(|n| n.attribute("fill").is_some_and(|f| f.ends_with("-hatch)")))
            .and_then(|n| n.attribute("d"))
            .unwrap();
        // `M left top H right ...`
        let numbers: Vec<f64> = hatched
            .split(|c: char| !(c.is_ascii_digit() || c == '.'))
            .filter_map(|n| n.parse().ok())
            .collect();
        let (left, right) = (numbers[0], numbers[2]);
        let curve = paths()
            .find(|n| n.attribute("stroke-width") == Some("1.9"))
            .and_then(|n| n.attribute("d"))
            .unwrap();
        // Each stretch begins at `M x y`; the one behind the hatching at its right edge.
        let starts: Vec<f64> = curve
            .split('M')
            .filter_map(|run| run.split(' ').next()?.parse().ok())
            .collect();
        let first = if untrusted.start == 0 { 0 } else { 1 };
        match starts.get(first) {
            Some(start) => assert!((start - right).abs() < 0.2, "{untrusted:?} {start} {right}"),
            None => assert_eq!(untrusted.end, count),
        }
        // The left edge by the scale between the first sample and the right edge.
        if untrusted.start > 0 && untrusted.end < count {
            let x = &figure.x_values;
            let part = (x[untrusted.start - 1] - x[0]) / (x[untrusted.end] - x[0]);
            let expected = starts[0] + part * (right - starts[0]);
            assert!(
                (left - expected).abs() < 0.3,
                "{untrusted:?} {left} {expected}"
            );
        }
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
fn on_either_side_of_a_cut_the_field_comes_from_its_own_side() {
    // Two planes that do not meet, parted at column 4.3 from row 2.4 upwards; below they are one.
    let axis = samples(0.0, 9.0, 10);
    let left = |x: f64, y: f64| 1.0 + 0.5 * x + y;
    let right = |x: f64, y: f64| -20.0 - 0.25 * x + 2.0 * y;
    let values = rows(&axis, &axis, |x, y| {
        let far = x > 4.3 && y > 2.4;
        Some(if far { right(x, y) } else { left(x, y) })
    });
    let seams = [Seam {
        column: 4,
        from: (4.3, 2.4),
        to: (4.3, 9.0),
    }];
    let field = Field::new(&values).cut(&seams);
    for v in [4.2, 5.0, 6.9, 8.5] {
        for u in [3.5, 4.0, 4.1, 4.299] {
            assert!(
                (field.at(u, v).unwrap() - left(u, v)).abs() < 1e-9,
                "{u} {v}"
            );
        }
        for u in [4.301, 4.7, 5.0, 5.5] {
            assert!(
                (field.at(u, v).unwrap() - right(u, v)).abs() < 1e-9,
                "{u} {v}"
            );
        }
    }
    // Lines end at the cut: none runs along it.
    for level in [-14.0, -11.0, 5.0, 8.0] {
        let found = contour::lines(&field, level, 4, |_, _| false);
        for pair in found.iter().flat_map(|l| l.windows(2)) {
            let across = (pair[0].0 < 4.3) != (pair[1].0 < 4.3);
            assert!(
                !across || pair[0].1.min(pair[1].1) < 3.0,
                "{level}: {pair:?}"
            );
        }
    }
}

#[test]
fn a_cut_and_its_points_are_drawn_with_their_legend() {
    let mut figure = full();
    let plain = map::render(&figure).unwrap();
    figure.cuts = Cuts {
        caption: "a cut".into(),
        point_caption: "a point".into(),
        seams: vec![Seam {
            column: 60,
            from: (60.4, 20.0),
            to: (60.4, 199.0),
        }],
        points: vec![(60.4, 20.0)],
    };
    let svg = map::render(&figure).unwrap();
    check_drawing("cut", &svg);
    assert!(svg.contains("a cut") && svg.contains("a point"));
    assert!(svg.len() < 200_000, "{} bytes", svg.len());
    assert!(!plain.contains("stroke-width=\"4.2\"") && svg.contains("stroke-width=\"4.2\""));
    figure.cuts.points[0].1 = f64::NAN;
    assert!(matches!(
        map::render(&figure),
        Err(DrawError::NotFinite { .. })
    ));
}

#[test]
fn of_two_by_two_points_each_is_a_quarter_of_the_figure() {
    // However different the values are: one of four grows, a quarter of the figure shows it.
    for strong in [0.1, 75.0, 1e4] {
        for corner in 0..4 {
            let value = |k: usize| Some(if k == corner { strong } else { -8.0 });
            let values: Rows = vec![vec![value(0), value(1)], vec![value(2), value(3)]];
            let field = Field::new(&values);
            let place = |k: i32| (f64::from(k) + 0.5) / 100.0;
            let grows = |(i, j)| field.at(place(i), place(j)).unwrap() > 0.0;
            let all = (0..100).flat_map(|i| (0..100).map(move |j| (i, j)));
            assert_eq!(all.filter(|p| grows(*p)).count(), 2500);
            let lines = contour::lines(&field, 0.0, 65, |_, _| false);
            let [line] = lines.as_slice() else {
                panic!("{lines:?}");
            };
            let near = |x: f64| (x - 0.5).abs() < 0.02;
            assert!(line.iter().all(|p| near(p.0) || near(p.1)));
        }
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
    // A sign that stands alone stays with its number, and no word parts behind a sign.
    let wrapped = |text, limit| text::wrap(text, text::Weight::Regular, 10.0, limit, 9);
    assert_eq!(wrapped("falls by − 5 Hz", 50.0), ["falls by", "− 5 Hz"]);
    for limit in 12..90 {
        let lines = wrapped("ab−12−34−56−78", f64::from(limit));
        assert!(
            lines.iter().rev().skip(1).all(|l| !l.ends_with('−')),
            "{lines:?}"
        );
    }
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
    fn a_number_stays_with_its_unit(
        quantities in proptest::collection::vec((-999.0..999.0f64, 0..6usize, "[a-z]{1,9}"), 1..12),
        limit in 120.0..400.0f64,
    ) {
        let units = ["Hz", "1/s", "ms", "%", "J/(kg K)", "K,"];
        let words = quantities.iter().map(|(x, unit, word)| {
            format!("{word} {} {}", text::fixed(*x, 2), units[*unit])
        });
        let sentence = words.collect::<Vec<_>>().join(" ");
        let lines = text::wrap(&sentence, text::Weight::Semibold, 11.0, limit, 99);
        prop_assert_eq!(lines.join(" "), sentence);
        for line in &lines {
            let last = line.rsplit(' ').next().unwrap();
            prop_assert!(last.replace('−', "-").parse::<f64>().is_err() && last != "J/(kg", "{}", line);
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
