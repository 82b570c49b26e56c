//! The stability map: a signed field over two axes, its neutral curve, and where it is unknown.

use super::axis::{Axis, Span, caption, check_samples};
use super::bar;
use super::colour::{Limit, palette};
use super::curves::Curves;
use super::cut::Cuts;
use super::field::{Field, Rows};
use super::frame::{self, Entry, MARGIN, Swatch, WIDTH};
use super::label::beside;
use super::mark::Mark;
use super::patches::{self, Patches};
use super::sheet::{Sheet, ends, index_of};
use super::style::{
    CUT_CORE, NEUTRAL_HALO, absent_style, cut_style, hatch_style, neutral_style, patch_style,
    patterns, second_style, unreached_style,
};
use super::svg::{Point, Rect, Svg, Text, px};
use super::text::{Weight, fit, tidy, width};
use super::{DrawError, raster};

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
    /// Points where no value was sought.
    pub unreached: String,
}

impl Default for Words {
    fn default() -> Self {
        Words {
            zero: "neutral".into(),
            uncertified: "not certified".into(),
            absent: "no mode in the window".into(),
            unreached: "not reached".into(),
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
    /// Values where nothing is coloured, for the zero curve alone; same shape as `values`, or empty.
    pub beyond: Vec<Vec<Option<f64>>>,
    /// Whether the answer at a point is trusted; same shape as `values`.
    pub certified: Vec<Vec<bool>>,
    /// Whether a value was sought at a point; same shape as `values`, or empty where it was at all.
    pub reached: Vec<Vec<bool>>,
    /// Optional second field.
    pub frequency: Option<IsoLines>,
    /// Optional patches of samples that belong together.
    pub patches: Option<Patches>,
    /// Lines across which both fields do not go on.
    pub cuts: Cuts,
    /// Optional marked point.
    pub design_point: Option<DesignPoint>,
    /// Legend texts.
    pub words: Words,
}

const PLOT_HEIGHT: f64 = 400.0;
/// Image pixels per px.
const OVERSAMPLING: f64 = 1.5;
/// Draws the map.
///
/// # Errors
/// Where the arrays do not fit each other or hold something that cannot be placed.
pub fn render(map: &StabilityMap) -> Result<String, DrawError> {
    check(map)?;
    let map = &spread_single(map);
    let field = Field::new(&map.values).cut(&map.cuts.seams);
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
    let is_reached = |i: usize, j: usize| {
        let row = map.reached.get(j);
        row.and_then(|r| r.get(i)).copied().unwrap_or(true)
    };
    let empty = flags(|certified, known| certified && !known);
    let absent = sheet.outline(|i, j| empty(i, j) && is_reached(i, j), false);
    let unreached = sheet.outline(|i, j| empty(i, j) && !is_reached(i, j), false);
    let doubtful = sheet.outline(flags(|certified, _| !certified), true);
    svg.path(&absent, &absent_style());
    svg.path(&unreached, &unreached_style());
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
    let is_plain = flags(|certified, known| certified && known);
    let plain = |p: Point| {
        let (i, j) = sheet.nearest(p);
        is_plain(i, j)
    };
    // A border through the cells does not fit samples that stand for their halves.
    let halves = field.halves();
    let parted = map
        .patches
        .as_ref()
        .filter(|_| !halves.0 && !halves.1)
        .is_some_and(|patches| patches.draw_borders(&mut svg, &sheet));
    let labels = curves.draw_thin(&mut svg, plot, &mut taken, plain);
    svg.path(&doubtful, "fill=\"#fff\" fill-opacity=\".4\"");
    svg.path(&doubtful, &hatch_style());
    map.cuts.draw(&mut svg, &sheet);
    curves.draw_neutral(&mut svg);
    map.cuts.draw_points(&mut svg, &sheet);
    for label in &labels {
        label.draw(&mut svg);
    }
    if let Some(patches) = &map.patches {
        patches.draw_names(&mut svg, &sheet, &mut taken, |r| curves.crowding(r));
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
        bar::bar(&mut svg, &map.quantity, &limit, plot);
    }
    let entries = legend_entries(
        map,
        !curves.neutral.is_empty(),
        labels.iter().any(|l| l.second),
        parted,
        [&doubtful, &absent, &unreached].map(|data| !data.is_empty()),
    );
    let below = frame::legend(
        &mut svg,
        &entries,
        plot.left,
        below,
        WIDTH - MARGIN - plot.left,
    );
    let mut note = map.footnote.clone();
    if let (Some(p), None) = (&map.design_point, &design) {
        note = format!(
            "{note} Not shown, outside the axes: {}.",
            p.label.trim_end_matches('.')
        );
    }
    let height = frame::footnote(&mut svg, &note, below);
    Ok(svg.finish(WIDTH, height, &tidy(&map.title)))
}

/// The map with a lone row or column doubled, so that it fills its axis like any other.
fn spread_single(map: &StabilityMap) -> StabilityMap {
    fn doubled<T: Clone>(rows: &mut Vec<Vec<T>>, column: bool, row: bool) {
        if column {
            rows.iter_mut().for_each(|r| r.extend_from_within(..));
        }
        if row {
            rows.extend_from_within(..);
        }
    }
    let mut map = map.clone();
    let (column, row) = (map.x_values.len() == 1, map.y_values.len() == 1);
    doubled(&mut map.values, column, row);
    doubled(&mut map.certified, column, row);
    doubled(&mut map.reached, column, row);
    doubled(&mut map.beyond, column, row);
    if let Some(second) = &mut map.frequency {
        doubled(&mut second.values, column, row);
    }
    patches::doubled(&mut map, column, row);
    map
}

fn check(map: &StabilityMap) -> Result<(), DrawError> {
    check_samples("the x axis", &map.x_values, map.x.scale)?;
    check_samples("the y axis", &map.y_values, map.y.scale)?;
    let (nx, ny) = (map.x_values.len(), map.y_values.len());
    check_shape("values", &map.values, nx, ny)?;
    check_shape("certified", &map.certified, nx, ny)?;
    if !map.reached.is_empty() {
        check_shape("reached", &map.reached, nx, ny)?;
    }
    if !map.beyond.is_empty() {
        check_shape("beyond", &map.beyond, nx, ny)?;
        check_finite("beyond", &map.beyond)?;
    }
    check_finite("values", &map.values)?;
    if let Some(frequency) = &map.frequency {
        check_shape("frequency", &frequency.values, nx, ny)?;
        check_finite("frequency", &frequency.values)?;
    }
    let seams = map.cuts.seams.iter().flat_map(|s| [s.from, s.to]);
    for (k, (u, v)) in seams.chain(map.cuts.points.iter().copied()).enumerate() {
        if let Some(value) = [u, v].into_iter().find(|x| !x.is_finite()) {
            return Err(DrawError::NotFinite {
                what: "cuts",
                row: k,
                column: 0,
                value,
            });
        }
    }
    if let Some(patches) = &map.patches {
        check_shape("patches", &patches.index, nx, ny)?;
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
    let right = bar::space(limit) + MARGIN;
    Rect {
        left: frame::left_space(&y_ticks),
        top,
        right: WIDTH - right,
        bottom,
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

fn legend_entries(
    map: &StabilityMap,
    neutral: bool,
    second: bool,
    parted: bool,
    [doubtful, absent, unreached]: [bool; 3],
) -> Vec<Entry> {
    let mut entries = Vec::new();
    let mut add = |swatch: Swatch, label: &str| {
        entries.push(Entry {
            swatch,
            label: label.to_string(),
        });
    };
    if neutral {
        add(
            Swatch::Line(vec![NEUTRAL_HALO.into(), neutral_style()]),
            &map.words.zero,
        );
    }
    if let (Some(field), true) = (&map.frequency, second) {
        add(
            Swatch::Line(vec![second_style()]),
            &caption(&field.label, &field.unit),
        );
    }
    if let (Some(patches), true) = (&map.patches, parted) {
        add(Swatch::Line(vec![patch_style()]), &patches.caption);
    }
    if !map.cuts.seams.is_empty() {
        let look = vec![cut_style(), CUT_CORE.into()];
        add(Swatch::Line(look), &map.cuts.caption);
    }
    if !map.cuts.points.is_empty() {
        add(Swatch::Mark(Mark::Diamond), &map.cuts.point_caption);
    }
    if doubtful {
        add(Swatch::Patch(vec![hatch_style()]), &map.words.uncertified);
    }
    if absent {
        add(Swatch::Patch(vec![absent_style()]), &map.words.absent);
    }
    if unreached {
        add(Swatch::Patch(vec![unreached_style()]), &map.words.unreached);
    }
    entries
}
