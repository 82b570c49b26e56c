//! Invented figures, plain and hostile.

use stillflame::draw::{
    Axis, DesignPoint, IsoLines, LineFigure, Locus, Mark, Panel, Quantity, Scale, Series, Shade,
    Spot, StabilityMap, Trail, text,
};

pub type Rows = Vec<Vec<Option<f64>>>;

pub fn samples(low: f64, high: f64, n: usize) -> Vec<f64> {
    (0..n)
        .map(|k| low + (high - low) * k as f64 / (n.max(2) - 1) as f64)
        .collect()
}

pub fn rows(x: &[f64], y: &[f64], f: impl Fn(f64, f64) -> Option<f64>) -> Rows {
    y.iter()
        .map(|&y| x.iter().map(|&x| f(x, y)).collect())
        .collect()
}

/// Three branches over delay (ms) and gain; the largest growth rate wins.
pub fn branches(delay: f64, gain: f64) -> (f64, f64) {
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

pub fn base(nx: usize, ny: usize) -> StabilityMap {
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

pub fn set_values(map: &mut StabilityMap, f: impl Fn(f64, f64) -> Option<f64>) {
    map.values = rows(&map.x_values, &map.y_values, f);
}

pub fn full() -> StabilityMap {
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
pub fn gallery() -> Vec<(&'static str, StabilityMap)> {
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

pub fn sweep() -> LineFigure {
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
    type Branch = (Vec<Option<f64>>, Vec<Option<f64>>);
    let series = |pick: fn(&Branch) -> &Vec<Option<f64>>| {
        let named = all.iter().enumerate();
        named
            .map(|(k, b)| Series {
                name: format!("branch {}", k + 1),
                style: k,
                values: pick(b).clone(),
                tag: (k + 1).to_string(),
            })
            .collect::<Vec<_>>()
    };
    // Two curves without a name, one of them of a single point.
    let unnamed = |a: f64, b: f64| vec![vec![(1.5, a), (4.0, b), (6.5, a)], vec![(5.0, b)]];
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
                crowd: unnamed(300.0, 400.0),
                spots: vec![Spot {
                    x: 2.0,
                    y: 235.0,
                    mark: Mark::Diamond,
                    style: None,
                    label: String::new(),
                }],
                ..Default::default()
            },
            Panel {
                y: Axis::new("Growth rate", "1/s"),
                series: series(|b| &b.1),
                shade: Some(Shade {
                    from: 0.0,
                    upwards: true,
                    label: "grows".into(),
                }),
                crowd: unnamed(-60.0, -30.0),
                spots: vec![Spot {
                    x: 4.2,
                    y: 0.0,
                    mark: Mark::Circle,
                    style: Some(0),
                    label: String::new(),
                }],
                ..Default::default()
            },
        ],
        marks: vec![
            (Mark::Circle, "neutral".into()),
            (Mark::Diamond, "two modes meet".into()),
        ],
        crowd: "2 other modes".into(),
        ..Default::default()
    }
}

pub fn line_gallery() -> Vec<(&'static str, LineFigure)> {
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

/// Three invented trails, as a root locus has them.
pub fn root_locus() -> Locus {
    let trail = |k: usize, hz: f64, turn: f64| Trail {
        name: format!("{}: about {hz} Hz", k + 1),
        tag: (k + 1).to_string(),
        style: k,
        runs: vec![
            samples(1.0, 8.0, 120)
                .into_iter()
                .map(|t| {
                    let phase = turn * t;
                    (t, hz + 60.0 * phase.cos(), 90.0 * phase.sin() - 12.0 * t)
                })
                .collect(),
        ],
    };
    let spot = |x: f64, mark, label: &str| Spot {
        x,
        y: 0.0,
        mark,
        style: Some(1),
        label: label.into(),
    };
    let unnamed = |a: f64, b: f64| vec![vec![(200.0, a), (350.0, b)], vec![(500.0, b)]];
    Locus {
        title: "Both lower modes leave the growing half-plane for delays beyond 3 ms".into(),
        subtitle: "Invented rig, 120 networks".into(),
        footnote: "Confirm by rig test before any decision on hardware.".into(),
        x: Axis::new("Frequency", "Hz"),
        y: Axis::new("Growth rate", "1/s"),
        parameter: (Axis::new("Flame delay", "ms"), 1.0, 8.0),
        shade: Some(Shade {
            from: 0.0,
            upwards: true,
            label: "grows".into(),
        }),
        trails: vec![
            trail(0, 120.0, 0.7),
            trail(1, 260.0, 1.1),
            trail(2, 410.0, 0.3),
        ],
        crowd: (unnamed(-40.0, 40.0), "2 other modes".into()),
        spots: vec![
            spot(150.0, Mark::Circle, "2.3 ms"),
            spot(300.0, Mark::Diamond, "3.1 ms"),
            spot(400.0, Mark::Cross, ""),
        ],
        marks: vec![
            (Mark::Circle, "neutral".into()),
            (Mark::Diamond, "modes meet".into()),
        ],
        ..Default::default()
    }
}

pub fn locus_gallery() -> Vec<(&'static str, Locus)> {
    let mut empty = root_locus();
    empty.trails.clear();
    empty.spots.clear();
    let mut still = root_locus();
    for run in still.trails.iter_mut().flat_map(|t| &mut t.runs) {
        run.iter_mut().for_each(|p| (p.1, p.2) = (200.0, -30.0));
    }
    let mut lone = root_locus();
    for trail in &mut lone.trails {
        trail.runs.iter_mut().for_each(|run| run.truncate(1));
    }
    let mut hostile = root_locus();
    hostile.title = "<b> & \"quotes\" ]]> ".repeat(20);
    hostile.trails[0].name = "a name far longer than any legend could hold ".repeat(9);
    hostile.trails[1].tag = "<&>".into();
    hostile.spots[0].label = "a label much too long to stand anywhere on the plot ".repeat(4);
    vec![
        ("locus", root_locus()),
        ("locus_empty", empty),
        ("locus_still", still),
        ("locus_lone", lone),
        ("locus_hostile", hostile),
    ]
}
