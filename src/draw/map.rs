//! The stability map: a signed field over two axes, its neutral curve, and where it is unknown.

use super::axis::{Axis, Span, Tick, caption, check_samples};
use super::colour::{Limit, diverging, hex, palette};
use super::contour::{lines, simplify};
use super::field::{Field, Rows};
use super::frame::{self, CAPTION_SIZE, Entry, MARGIN, Swatch, TICK_SIZE, WIDTH};
use super::label::{Measured, Place, beside, on_line};
use super::svg::{Anchor, INK, Point, Rect, Svg, Text, closed_path, open_path, px};
use super::text::{Weight, fit, fixed, tick_labels, tidy, width};
use super::{DrawError, raster, region};

/// The signed quantity that is coloured.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Quantity {
    /// Name, without unit.
    pub label: String,
    /// Unit of the values; empty for a pure number.
    pub unit: String,
    /// One word for positive values, at the upper end of the colour bar; may be empty.
    pub above: String,
    /// One word for negative values, at the lower end; may be empty.
    pub below: String,
}

/// A second field, drawn as thin labelled lines only.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct IsoLines {
    /// Name, without unit.
    pub label: String,
    /// Unit of the values.
    pub unit: String,
    /// Rows by y, columns by x. Lines break where neighbours jump, as they do between two branches.
    pub values: Vec<Vec<Option<f64>>>,
}

/// A marked point, in axis values.
#[derive(Debug, Clone, PartialEq)]
pub struct DesignPoint {
    /// On the x axis.
    pub x: f64,
    /// On the y axis.
    pub y: f64,
    /// Printed beside the mark.
    pub label: String,
}

/// Legend texts.
#[derive(Debug, Clone, PartialEq)]
pub struct Words {
    /// The curve where the quantity is zero.
    pub zero: String,
    /// Points that are not certified.
    pub uncertified: String,
    /// Certified points without a value.
    pub absent: String,
}

impl Default for Words {
    fn default() -> Self {
        Words {
            zero: "neutral".into(),
            uncertified: "not certified".into(),
            absent: "no mode in the window".into(),
        }
    }
}

/// Everything a stability map shows. Values are scaled to the units named beside them.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct StabilityMap {
    /// The finding, in a sentence.
    pub title: String,
    /// What was computed; may be empty.
    pub subtitle: String,
    /// Small print; may be empty.
    pub footnote: String,
    /// Axis of `x_values`.
    pub x: Axis,
    /// Axis of `y_values`.
    pub y: Axis,
    /// Sample positions, strictly increasing.
    pub x_values: Vec<f64>,
    /// Sample positions, strictly increasing.
    pub y_values: Vec<f64>,
    /// What `values` are.
    pub quantity: Quantity,
    /// One row for each of `y_values`, one entry for each of `x_values`.
    pub values: Vec<Vec<Option<f64>>>,
    /// Whether the answer at a point is trusted; same shape as `values`.
    pub certified: Vec<Vec<bool>>,
    /// Optional second field.
    pub frequency: Option<IsoLines>,
    /// Optional marked point.
    pub design_point: Option<DesignPoint>,
    /// Legend texts.
    pub words: Words,
}

const PLOT_HEIGHT: f64 = 400.0;
const BAR_GAP: f64 = 20.0;
const BAR_WIDTH: f64 = 14.0;
/// Image pixels per px.
const OVERSAMPLING: f64 = 1.5;
/// Longest edge of a cell that contours are traced on, px.
const CELL: f64 = 2.5;
const LABEL_SIZE: f64 = 9.0;

/// Draws the map.
///
/// # Errors
/// Where the arrays do not fit each other or hold something that cannot be placed.
pub fn render(map: &StabilityMap) -> Result<String, DrawError> {
    check(map)?;
    let field = Field::new(&map.values);
    let limit = Limit::covering(map.values.iter().flatten().flatten().copied());
    let mut svg = Svg::default();
    patterns(&mut svg);
    let top = frame::header(&mut svg, &map.title, &map.subtitle);
    let plot = plot_area(map, &limit, top);
    let sheet = Sheet::new(map, plot);
    let (x_ticks, y_ticks) = (sheet.x.ticks(70.0), sheet.y.ticks(44.0));

    image(&mut svg, &field, &limit, &sheet)?;
    let flags = |wanted: fn(bool, bool) -> bool| {
        move |i: usize, j: usize| {
            let certified = map
                .certified
                .get(j)
                .and_then(|r| r.get(i))
                .copied()
                .unwrap_or(true);
            wanted(certified, field.sample(i, j).is_some())
        }
    };
    let absent = sheet.outline(flags(|certified, known| certified && !known));
    let doubtful = sheet.outline(flags(|certified, _| !certified));
    svg.path(&absent, &absent_style());
    frame::grid(&mut svg, plot, &x_ticks, &y_ticks, 0.11);

    let curves = Curves::of(&field, &limit, map, &sheet);
    let mut taken = Vec::new();
    let design = map
        .design_point
        .as_ref()
        .filter(|p| sheet.x.covers(p.x) && sheet.y.covers(p.y));
    let design = design.map(|p| design_label(p, &sheet, &curves));
    if let Some(d) = &design {
        taken.push(d.bounds.grown(3.0));
        taken.push(
            Rect {
                left: d.at.0,
                top: d.at.1,
                right: d.at.0,
                bottom: d.at.1,
            }
            .grown(8.0),
        );
    }
    let labels = curves.draw_thin(&mut svg, plot, &mut taken);
    svg.path(&doubtful, "fill=\"#fff\" fill-opacity=\".4\"");
    svg.path(&doubtful, &hatch_style());
    curves.draw_neutral(&mut svg);
    for label in &labels {
        label.draw(&mut svg);
    }
    if let Some(d) = &design {
        frame::marker(&mut svg, d.at);
        let base = (d.bounds.left, d.bounds.bottom - 3.0);
        svg.text(
            &Text::new(base, &d.label, 11.0)
                .weight(Weight::Semibold)
                .halo(3.0),
        );
    }
    frame::y_axis(&mut svg, plot, &map.y, &y_ticks);
    let below = frame::x_axis(&mut svg, plot, &map.x, &x_ticks);
    if map.values.iter().flatten().any(Option::is_some) {
        bar(&mut svg, map, &limit, plot);
    }
    let entries = legend_entries(map, &curves, !doubtful.is_empty(), !absent.is_empty());
    let below = frame::legend(
        &mut svg,
        &entries,
        plot.left,
        below,
        WIDTH - MARGIN - plot.left,
    );
    let mut note = map.footnote.clone();
    if let (Some(p), None) = (&map.design_point, &design) {
        note = format!("{note} {} lies outside the map.", p.label);
    }
    let height = frame::footnote(&mut svg, &note, below);
    Ok(svg.finish(WIDTH, height, &tidy(&map.title)))
}

fn check(map: &StabilityMap) -> Result<(), DrawError> {
    check_samples("the x axis", &map.x_values, map.x.scale)?;
    check_samples("the y axis", &map.y_values, map.y.scale)?;
    let (nx, ny) = (map.x_values.len(), map.y_values.len());
    check_shape("values", &map.values, nx, ny)?;
    check_shape("certified", &map.certified, nx, ny)?;
    check_finite("values", &map.values)?;
    if let Some(frequency) = &map.frequency {
        check_shape("frequency", &frequency.values, nx, ny)?;
        check_finite("frequency", &frequency.values)?;
    }
    Ok(())
}

fn check_shape<T>(what: &str, rows: &[Vec<T>], nx: usize, ny: usize) -> Result<(), DrawError> {
    if rows.len() != ny {
        return Err(DrawError::Shape {
            what: what.into(),
            found: rows.len(),
            expected: ny,
        });
    }
    match rows.iter().enumerate().find(|(_, r)| r.len() != nx) {
        None => Ok(()),
        Some((k, row)) => {
            let what = format!("row {k} of {what}");
            Err(DrawError::Shape {
                what,
                found: row.len(),
                expected: nx,
            })
        }
    }
}

fn check_finite(what: &'static str, rows: &Rows) -> Result<(), DrawError> {
    for (row, entries) in rows.iter().enumerate() {
        for (column, value) in entries.iter().enumerate() {
            if let Some(value) = value.filter(|v| !v.is_finite()) {
                return Err(DrawError::NotFinite {
                    what,
                    row,
                    column,
                    value,
                });
            }
        }
    }
    Ok(())
}

/// The plot rectangle, from the width of the labels on either side of it.
fn plot_area(map: &StabilityMap, limit: &Limit, top: f64) -> Rect {
    let bottom = top + PLOT_HEIGHT;
    let (y0, y1) = ends(&map.y_values);
    let y_ticks = Span::new(y0, y1, map.y.scale, bottom, top).ticks(44.0);
    let bar = bar_labels(limit);
    let right = BAR_GAP + BAR_WIDTH + 8.0 + frame::widest(&bar) + 9.0 + CAPTION_SIZE + MARGIN;
    Rect {
        left: frame::left_space(&y_ticks),
        top,
        right: WIDTH - right,
        bottom,
    }
}

fn ends(samples: &[f64]) -> (f64, f64) {
    (
        samples.first().copied().unwrap_or(0.0),
        samples.last().copied().unwrap_or(1.0),
    )
}

/// The samples laid out on the plot.
struct Sheet {
    plot: Rect,
    x: Span,
    y: Span,
    columns: Vec<f64>,
    rows: Vec<f64>,
}

impl Sheet {
    fn new(map: &StabilityMap, plot: Rect) -> Self {
        let (x0, x1) = ends(&map.x_values);
        let (y0, y1) = ends(&map.y_values);
        let x = Span::new(x0, x1, map.x.scale, plot.left, plot.right);
        let y = Span::new(y0, y1, map.y.scale, plot.bottom, plot.top);
        let columns = map.x_values.iter().map(|&v| x.at(v)).collect();
        let rows = map.y_values.iter().map(|&v| y.at(v)).collect();
        Sheet {
            plot,
            x,
            y,
            columns,
            rows,
        }
    }

    /// px of a position in samples.
    fn place(&self, (u, v): (f64, f64)) -> Point {
        (along(&self.columns, u), along(&self.rows, v))
    }

    fn place_all(&self, line: &[(f64, f64)]) -> Vec<Point> {
        line.iter().map(|&p| self.place(p)).collect()
    }

    /// Outline of the cells of marked samples, as path data. A spot too small to show its fill is
    /// drawn larger.
    fn outline(&self, marked: impl Fn(usize, usize) -> bool) -> String {
        const SMALLEST: f64 = 6.0;
        let x = |i: usize| corner(&self.columns, i, self.plot.left, self.plot.right);
        let y = |j: usize| corner(&self.rows, j, self.plot.bottom, self.plot.top);
        let rims = region::outlines(self.columns.len(), self.rows.len(), marked);
        let mut data = String::new();
        for rim in rims {
            let points: Vec<Point> = rim.iter().map(|&(i, j)| (x(i), y(j))).collect();
            let bounds = bounds(&points);
            if bounds.width() < SMALLEST && bounds.height() < SMALLEST {
                let (cx, cy) = (
                    (bounds.left + bounds.right) / 2.0,
                    (bounds.top + bounds.bottom) / 2.0,
                );
                let half = SMALLEST / 2.0;
                let cx = cx.clamp(self.plot.left + half, self.plot.right - half);
                let cy = cy.clamp(self.plot.top + half, self.plot.bottom - half);
                data += &Rect {
                    left: cx,
                    top: cy,
                    right: cx,
                    bottom: cy,
                }
                .grown(half)
                .path();
            } else {
                data += &closed_path(&points);
            }
        }
        data
    }
}

fn bounds(points: &[Point]) -> Rect {
    let empty = Rect {
        left: f64::INFINITY,
        top: f64::INFINITY,
        right: f64::NEG_INFINITY,
        bottom: f64::NEG_INFINITY,
    };
    points.iter().fold(empty, |r, p| Rect {
        left: r.left.min(p.0),
        top: r.top.min(p.1),
        right: r.right.max(p.0),
        bottom: r.bottom.max(p.1),
    })
}

/// Value of `nodes` at a fractional index.
fn along(nodes: &[f64], u: f64) -> f64 {
    let k = (u.max(0.0).floor() as usize).min(nodes.len().saturating_sub(1));
    match (nodes.get(k), nodes.get(k + 1)) {
        (Some(a), Some(b)) => a + (u - k as f64) * (b - a),
        (Some(a), None) => *a,
        _ => 0.0,
    }
}

/// Fractional index at which monotone `nodes` take `value`.
fn index_of(nodes: &[f64], value: f64) -> f64 {
    let rising = nodes.first() <= nodes.last();
    let k = nodes.partition_point(|&n| if rising { n <= value } else { n >= value });
    let k = k.clamp(1, nodes.len().max(2) - 1);
    match (nodes.get(k - 1), nodes.get(k)) {
        (Some(a), Some(b)) => (k - 1) as f64 + ((value - a) / (b - a)).clamp(0.0, 1.0),
        _ => 0.0,
    }
}

/// px of cell corner `i`, half-way between samples `i - 1` and `i`.
fn corner(nodes: &[f64], i: usize, start: f64, end: f64) -> f64 {
    match (i.checked_sub(1).and_then(|k| nodes.get(k)), nodes.get(i)) {
        (Some(a), Some(b)) => (a + b) / 2.0,
        (None, _) => start,
        (_, None) => end,
    }
}

fn image(svg: &mut Svg, field: &Field, limit: &Limit, sheet: &Sheet) -> Result<(), DrawError> {
    let plot = sheet.plot;
    let width = (plot.width() * OVERSAMPLING).round().max(1.0);
    let height = (plot.height() * OVERSAMPLING).round().max(1.0);
    let column = |k: usize| {
        index_of(
            &sheet.columns,
            plot.left + (k as f64 + 0.5) / width * plot.width(),
        )
    };
    let row = |k: usize| {
        index_of(
            &sheet.rows,
            plot.top + (k as f64 + 0.5) / height * plot.height(),
        )
    };
    let size = (width as usize, height as usize);
    let uri = raster::data_uri(field, limit, &palette(), size, column, row)?;
    svg.raw(&format!(
        "<image x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\" preserveAspectRatio=\"none\" \
         href=\"{uri}\"/>",
        px(plot.left),
        px(plot.top),
        px(plot.width()),
        px(plot.height()),
    ));
    Ok(())
}

/// A group of lines at one level.
struct Level {
    text: String,
    style: String,
    lines: Vec<Vec<Point>>,
}

struct Curves {
    neutral: Vec<Vec<Point>>,
    thin: Vec<Level>,
    has_frequency: bool,
    /// Points along every line, for keeping labels off them.
    crowd: Vec<Point>,
}

impl Curves {
    fn of(field: &Field, limit: &Limit, map: &StabilityMap, sheet: &Sheet) -> Self {
        let cell = (sheet.plot.width() / (field.columns.max(2) - 1) as f64)
            .max(sheet.plot.height() / (field.height().max(2) - 1) as f64);
        let fine = (cell / CELL).ceil().clamp(1.0, 64.0) as usize;
        let trace = |field: &Field, level: f64, skip: &dyn Fn(usize, usize) -> bool| {
            lines(field, level, fine, skip)
                .iter()
                .map(|line| simplify(&sheet.place_all(line), 0.07))
                .collect::<Vec<_>>()
        };
        let neutral = trace(field, 0.0, &|_, _| false);
        let mut thin = Vec::new();
        for level in limit.levels().into_iter().filter(|&l| l != 0.0) {
            let lines = trace(field, level, &|_, _| false);
            thin.push(Level {
                text: signed(level, limit.step),
                style: iso_style(level),
                lines,
            });
        }
        let mut has_frequency = false;
        if let Some(second) = &map.frequency {
            let second = Field::new(&second.values);
            let (levels, jump) = second_levels(&second);
            let texts = tick_labels(&levels);
            for (&level, text) in levels.iter().zip(texts) {
                let jumps = |i: usize, j: usize| {
                    second
                        .cell_range(i, j)
                        .is_none_or(|(low, high)| high - low > jump)
                };
                let lines = trace(&second, level, &jumps);
                has_frequency |= !lines.is_empty();
                thin.push(Level {
                    text,
                    style: second_style(),
                    lines,
                });
            }
        }
        let all = thin.iter().flat_map(|l| &l.lines).chain(&neutral);
        let crowd = all.flat_map(|line| spread(line, 4.0)).collect();
        Curves {
            neutral,
            thin,
            has_frequency,
            crowd,
        }
    }

    fn crowding(&self, r: Rect) -> usize {
        self.crowd.iter().filter(|p| r.contains(**p)).count()
    }

    /// Draws the thin lines, each broken where its label goes, and gives the labels.
    fn draw_thin(&self, svg: &mut Svg, plot: Rect, taken: &mut Vec<Rect>) -> Vec<LineLabel> {
        let inner = plot.grown(-4.0);
        let mut labels = Vec::new();
        for level in &self.thin {
            let w = width(&level.text, Weight::Regular, LABEL_SIZE);
            let mut data = String::new();
            for line in &level.lines {
                let measured = Measured::new(line);
                let total = measured.total();
                let parts = if total > 700.0 { 2.0 } else { 1.0 };
                let mut places: Vec<Place> = Vec::new();
                for k in 0..(parts as usize) {
                    if total < 2.2 * w {
                        continue;
                    }
                    let range = (total * k as f64 / parts, total * (k + 1) as f64 / parts);
                    let others = |r: Rect| {
                        // The line itself fills the box once over.
                        self.crowding(r).saturating_sub((w / 4.0) as usize)
                    };
                    let size = (w, LABEL_SIZE);
                    let place = on_line(&measured, range, size, inner, taken, &others);
                    if let Some(place) = place {
                        taken.push(place.bounds.grown(4.0));
                        places.push(place);
                        labels.push(LineLabel {
                            place,
                            text: level.text.clone(),
                        });
                    }
                }
                for piece in measured.without(&places) {
                    data += &open_path(&piece);
                }
            }
            svg.path(&data, &level.style);
        }
        labels
    }

    fn draw_neutral(&self, svg: &mut Svg) {
        let data: String = self.neutral.iter().map(|line| open_path(line)).collect();
        svg.path(&data, NEUTRAL_HALO);
        svg.path(&data, &neutral_style());
    }
}

/// Points at most `gap` apart along a line.
fn spread(line: &[Point], gap: f64) -> Vec<Point> {
    let measured = Measured::new(line);
    let n = (measured.total() / gap).floor() as usize;
    (0..=n).map(|k| measured.at(k as f64 * gap)).collect()
}

struct LineLabel {
    place: Place,
    text: String,
}

impl LineLabel {
    fn draw(&self, svg: &mut Svg) {
        let turn = self.place.turn;
        let (sin, cos) = turn.to_radians().sin_cos();
        let drop = 0.36 * LABEL_SIZE;
        let at = (
            self.place.centre.0 - drop * sin,
            self.place.centre.1 + drop * cos,
        );
        svg.text(
            &Text::new(at, &self.text, LABEL_SIZE)
                .anchor(Anchor::Middle)
                .turn(turn)
                .halo(2.0),
        );
    }
}

/// Levels of the second field, about six of them, and the range of a cell that counts as a jump
/// between branches: far above the usual, and enough to bundle lines.
fn second_levels(field: &Field) -> (Vec<f64>, f64) {
    let rows = 0..field.height();
    let values: Vec<f64> = rows
        .flat_map(|j| (0..field.columns).filter_map(move |i| field.sample(i, j)))
        .collect();
    let low = values.iter().copied().fold(f64::INFINITY, f64::min);
    let high = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if values.is_empty() || high <= low {
        return (Vec::new(), 0.0);
    }
    let levels = super::axis::round_values(low, high, 9);
    let step = match levels.as_slice() {
        [a, b, ..] => b - a,
        _ => high - low,
    };
    let cells = (0..field.height()).flat_map(|j| (0..field.columns).map(move |i| (i, j)));
    let mut ranges: Vec<f64> = cells
        .filter_map(|(i, j)| field.cell_range(i, j).map(|(a, b)| b - a))
        .collect();
    ranges.sort_by(f64::total_cmp);
    let usual = ranges.get(ranges.len() / 2).copied().unwrap_or(0.0);
    (levels, (8.0 * usual).max(0.4 * step))
}

struct DesignLabel {
    at: Point,
    label: String,
    bounds: Rect,
}

fn design_label(point: &DesignPoint, sheet: &Sheet, curves: &Curves) -> DesignLabel {
    let at = (sheet.x.at(point.x), sheet.y.at(point.y));
    let room = sheet.plot.width() - 24.0;
    let label = fit(&tidy(&point.label), Weight::Semibold, 11.0, room);
    let size = (width(&label, Weight::Semibold, 11.0), 13.0);
    let crowd = |r: Rect| curves.crowding(r);
    let bounds = beside(at, size, 10.0, sheet.plot.grown(-6.0), &crowd);
    DesignLabel { at, label, bounds }
}

const NEUTRAL_HALO: &str = "fill=\"none\" stroke=\"#fff\" stroke-width=\"4.6\" stroke-opacity=\".85\" stroke-linejoin=\"round\"";

fn neutral_style() -> String {
    format!("fill=\"none\" stroke=\"{INK}\" stroke-width=\"2.2\" stroke-linejoin=\"round\"")
}

fn iso_style(level: f64) -> String {
    let dash = if level < 0.0 {
        " stroke-dasharray=\"4.5 2.5\""
    } else {
        ""
    };
    format!(
        "fill=\"none\" stroke=\"{INK}\" stroke-opacity=\".75\" stroke-width=\".8\" \
         stroke-linejoin=\"round\"{dash}"
    )
}

fn second_style() -> String {
    format!(
        "fill=\"none\" stroke=\"{INK}\" stroke-width=\"1.3\" stroke-linecap=\"round\" \
         stroke-dasharray=\".1 3\""
    )
}

fn hatch_style() -> String {
    format!(
        "fill=\"{}\" stroke=\"{INK}\" stroke-width=\".9\"",
        Svg::url("hatch")
    )
}

fn absent_style() -> String {
    format!(
        "fill=\"{}\" stroke=\"#8b9098\" stroke-width=\".8\"",
        Svg::url("absent")
    )
}

fn patterns(svg: &mut Svg) {
    svg.define(&format!(
        "<pattern id=\"{}\" width=\"5\" height=\"5\" patternUnits=\"userSpaceOnUse\" \
         patternTransform=\"rotate(45)\"><path d=\"M0 2.5H5\" stroke=\"{INK}\"/></pattern>\
         <pattern id=\"{}\" width=\"7\" height=\"7\" patternUnits=\"userSpaceOnUse\">\
         <path d=\"M0 0H7V7H0Z\" fill=\"#f1f1f1\"/><circle cx=\"2\" cy=\"2\" r=\".8\" fill=\"#9a9ea6\"/>\
         <circle cx=\"5.5\" cy=\"5.5\" r=\".8\" fill=\"#9a9ea6\"/></pattern>",
        Svg::id("hatch"),
        Svg::id("absent"),
    ));
}

/// A level with an explicit sign.
fn signed(level: f64, step: f64) -> String {
    let labels = tick_labels(&[level, level + step]);
    let text = labels.into_iter().next().unwrap_or_default();
    if level > 0.0 {
        format!("+{text}")
    } else {
        text
    }
}

fn bar_labels(limit: &Limit) -> Vec<Tick> {
    let levels = limit.levels();
    let text = |&l: &f64| {
        if l == 0.0 {
            fixed(0.0, 0)
        } else {
            signed(l, limit.step)
        }
    };
    levels
        .iter()
        .map(|l| Tick {
            at: *l,
            label: text(l),
        })
        .collect()
}

/// The colour bar: one gradient, the levels of the map on it, arrow tips where values lie beyond.
fn bar(svg: &mut Svg, map: &StabilityMap, limit: &Limit, plot: Rect) {
    const TIP: f64 = 11.0;
    let (left, right) = (plot.right + BAR_GAP, plot.right + BAR_GAP + BAR_WIDTH);
    let top = plot.top + if limit.above { TIP } else { 0.0 };
    let bottom = plot.bottom - if limit.below { TIP } else { 0.0 };
    let span = Span::new(-limit.limit, limit.limit, super::Scale::Linear, bottom, top);
    let stop = |k: i32| {
        let t = f64::from(k) / 12.0;
        let offset = format!("{:.4}", (1.0 - t) / 2.0);
        format!(
            "<stop offset=\"{offset}\" stop-color=\"{}\"/>",
            hex(diverging(t))
        )
    };
    let positive = (0..=12).rev().map(stop);
    let below_zero = format!(
        "<stop offset=\".5\" stop-color=\"{}\"/>",
        hex(diverging(-1e-9))
    );
    let negative = (-12..=-1).rev().map(stop);
    let stops: String = positive.chain([below_zero]).chain(negative).collect();
    svg.define(&format!(
        "<linearGradient id=\"{}\" x2=\"0\" y2=\"1\">{stops}</linearGradient>",
        Svg::id("bar")
    ));
    let body = Rect {
        left,
        top,
        right,
        bottom,
    };
    svg.path(&body.path(), &format!("fill=\"{}\"", Svg::url("bar")));
    let middle = (left + right) / 2.0;
    let outline = format!("stroke=\"{INK}\" stroke-linejoin=\"round\"");
    let mut rim = vec![(left, top)];
    if limit.above {
        let tip = [(left, top), (middle, plot.top), (right, top)];
        svg.path(
            &closed_path(&tip),
            &format!("fill=\"{}\"", hex(diverging(1.0))),
        );
        rim.push((middle, plot.top));
    }
    rim.extend([(right, top), (right, bottom)]);
    if limit.below {
        let tip = [(left, bottom), (middle, plot.bottom), (right, bottom)];
        svg.path(
            &closed_path(&tip),
            &format!("fill=\"{}\"", hex(diverging(-1.0))),
        );
        rim.push((middle, plot.bottom));
    }
    rim.push((left, bottom));
    let ticks = bar_labels(limit);
    for tick in &ticks {
        let y = span.at(tick.at);
        if tick.at == 0.0 {
            svg.line((left, y), (right, y), NEUTRAL_HALO);
            svg.line((left - 4.0, y), (right + 4.0, y), &neutral_style());
        } else if tick.at.abs() < limit.limit {
            svg.line((left, y), (right, y), &iso_style(tick.at));
        }
        svg.line((right, y), (right + 4.0, y), &format!("stroke=\"{INK}\""));
        let at = (right + 8.0, y + 0.36 * TICK_SIZE);
        let weight = if tick.at == 0.0 {
            Weight::Semibold
        } else {
            Weight::Regular
        };
        svg.text(&Text::new(at, &tick.label, TICK_SIZE).weight(weight));
    }
    svg.path(&closed_path(&rim), &format!("fill=\"none\" {outline}"));

    let x = right + 8.0 + frame::widest(&ticks) + 9.0 + CAPTION_SIZE - 2.0;
    let (above, below) = (tidy(&map.quantity.above), tidy(&map.quantity.below));
    let side = |s: &str| width(s, Weight::Semibold, CAPTION_SIZE);
    let room = plot.height() - 2.0 * (side(&above).max(side(&below)) + 14.0);
    let name = caption(&map.quantity.label, &map.quantity.unit);
    let name = fit(&name, Weight::Regular, CAPTION_SIZE, room);
    let turned = |text, y, anchor, weight| {
        Text::new((x, y), text, CAPTION_SIZE)
            .anchor(anchor)
            .weight(weight)
            .turn(-90.0)
    };
    svg.text(&turned(
        &name,
        (plot.top + plot.bottom) / 2.0,
        Anchor::Middle,
        Weight::Regular,
    ));
    svg.text(&turned(&above, plot.top, Anchor::End, Weight::Semibold));
    svg.text(&turned(
        &below,
        plot.bottom,
        Anchor::Start,
        Weight::Semibold,
    ));
}

fn legend_entries(map: &StabilityMap, curves: &Curves, doubtful: bool, absent: bool) -> Vec<Entry> {
    let mut entries = Vec::new();
    let mut add = |swatch: Swatch, label: &str| {
        entries.push(Entry {
            swatch,
            label: label.to_string(),
        });
    };
    if !curves.neutral.is_empty() {
        add(
            Swatch::Line(vec![NEUTRAL_HALO.into(), neutral_style()]),
            &map.words.zero,
        );
    }
    if let (Some(second), true) = (&map.frequency, curves.has_frequency) {
        add(
            Swatch::Line(vec![second_style()]),
            &caption(&second.label, &second.unit),
        );
    }
    if doubtful {
        add(Swatch::Patch(vec![hatch_style()]), &map.words.uncertified);
    }
    if absent {
        add(Swatch::Patch(vec![absent_style()]), &map.words.absent);
    }
    entries
}
