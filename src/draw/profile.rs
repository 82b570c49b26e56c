//! Profiles along an axis: a chain drawn to scale, curves over it, and bars of what adds to a sum.

use super::axis::{Axis, Span, Tick};
use super::chain::{Chain, Ground, Symbol, flame_colour, tint};
use super::contour::simplify;
use super::contributions::Contributions;
use super::frame::{self, Entry, MARGIN, Swatch, WIDTH};
use super::names::Row;
use super::style::curve_style;
use super::svg::{INK, Point, Rect, Svg, open_path, px};
use super::text::{tick_labels, tidy};
use super::{DrawError, Scale};

/// A curve, broken wherever it jumps.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Curve {
    /// Legend text; curves of equal name and style share one entry.
    pub name: String,
    /// Which of the figure's styles (hue and dash) it takes.
    pub style: usize,
    /// Unbroken stretches of (x, y), from left to right.
    pub runs: Vec<Vec<(f64, f64)>>,
}

/// Curves over one y axis.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ProfilePanel {
    /// Its y axis.
    pub y: Axis,
    /// Its range, and the positions of its ticks; from the curves, and from zero, where absent.
    pub fixed: Option<((f64, f64), Vec<f64>)>,
    /// Its curves.
    pub curves: Vec<Curve>,
}

/// Legend texts of a profile.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ProfileWords {
    /// Lines at flames.
    pub flame: String,
    /// Lines at other planes.
    pub plane: String,
    /// Tinted passages.
    pub tinted: String,
}

/// Everything a profile shows. Values are scaled to the units named beside them.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ProfileFigure {
    /// The finding, in a sentence.
    pub title: String,
    /// What was computed; may be empty.
    pub subtitle: String,
    /// Small print; may be empty.
    pub footnote: String,
    /// The shared axis.
    pub x: Axis,
    /// What stands along it.
    pub chain: Chain,
    /// From top to bottom.
    pub panels: Vec<ProfilePanel>,
    /// Legend texts.
    pub words: ProfileWords,
    /// Bars below the panels.
    pub bars: Option<Contributions>,
}

const PANEL: f64 = 118.0;
const GAP: f64 = 13.0;
/// Space right of the plot, for the symbol of the chain's end.
const RIGHT: f64 = 20.0;
/// A jump at least so high gets a dot on either side (px).
const JUMP: f64 = 2.0;

/// Draws the figure.
///
/// # Errors
/// Where the arrays do not fit each other or hold something that cannot be placed.
pub fn render(figure: &ProfileFigure) -> Result<String, DrawError> {
    check(figure)?;
    let mut svg = Svg::default();
    let top = frame::header(&mut svg, &figure.title, &figure.subtitle);
    let right = WIDTH - MARGIN - RIGHT;
    let left = figure
        .panels
        .iter()
        .map(|p| frame::left_space(&y_scale(p, 0.0).1))
        .fold(figure.chain.left_space(), f64::max);
    let (x0, x1) = figure.chain.extent();
    let x = Span::new(x0, x1, figure.x.scale, left, right);
    let stretch = figure.chain.stretch(&x);

    let middle = |top: f64| stretch.middle(top);
    let row = Row::new(figure.chain.names(&x, 0.0, &stretch), left - 12.0);
    let chain_top = top + row.height;
    let names = figure.chain.names(&x, middle(chain_top), &stretch);
    Row::new(names, left - 12.0).draw(&mut svg, chain_top);
    let plot = Rect {
        left,
        right,
        top: chain_top,
        bottom: chain_top,
    };
    let ground = Ground { x: &x, plot };
    let mut y = figure.chain.draw(&mut svg, &ground, chain_top, &stretch) + 6.0;

    let x_ticks = x.ticks(70.0);
    for (k, panel) in figure.panels.iter().enumerate() {
        let r = Rect {
            top: y,
            bottom: y + PANEL,
            ..plot
        };
        let (scale, ticks) = y_scale(panel, y);
        frame::grid(&mut svg, r, &x_ticks, &ticks, 0.11);
        planes(&mut svg, figure, r, &x);
        for curve in &panel.curves {
            draw_curve(&mut svg, curve, figure, &x, &scale);
        }
        frame::y_axis(&mut svg, r, &panel.y, &ticks);
        y = r.bottom + GAP;
        if k + 1 == figure.panels.len() {
            y = frame::x_axis(&mut svg, r, &figure.x, &x_ticks);
        }
    }
    let room = WIDTH - MARGIN - left;
    let mut below = frame::legend(&mut svg, &legend_entries(figure), left, y, room);
    if let Some(bars) = &figure.bars {
        below = bars.draw(&mut svg, below + 14.0);
    }
    let height = frame::footnote(&mut svg, &figure.footnote, below);
    Ok(svg.finish(WIDTH, height, &tidy(&figure.title)))
}

fn check(figure: &ProfileFigure) -> Result<(), DrawError> {
    let passages = &figure.chain.passages;
    if passages.is_empty() {
        return Err(DrawError::NoSamples { axis: "the chain" });
    }
    let mut before = f64::NEG_INFINITY;
    for (index, p) in passages.iter().enumerate() {
        let sound = p.from.is_finite() && p.to.is_finite() && p.width.is_finite();
        if !sound || p.from < before || p.to <= p.from {
            return Err(DrawError::Samples {
                axis: "the chain",
                index,
                value: p.to,
            });
        }
        before = p.to;
    }
    let planes = figure.chain.planes.iter();
    if let Some((index, p)) = planes
        .enumerate()
        .find(|(_, p)| !p.at.is_finite() || !p.width.is_finite())
    {
        return Err(DrawError::Samples {
            axis: "the planes",
            index,
            value: p.at,
        });
    }
    for (row, panel) in figure.panels.iter().enumerate() {
        let points = panel.curves.iter().flat_map(|c| c.runs.iter().flatten());
        for (column, &(x, y)) in points.enumerate() {
            if !(x.is_finite() && y.is_finite()) {
                let value = if x.is_finite() { y } else { x };
                return Err(DrawError::NotFinite {
                    what: "a curve",
                    row,
                    column,
                    value,
                });
            }
        }
    }
    let Some(bars) = &figure.bars else {
        return Ok(());
    };
    for (row, part) in bars.rows.iter().enumerate() {
        if part.values.len() != bars.classes.len() {
            return Err(DrawError::Shape {
                what: format!("row {row} of the bars"),
                found: part.values.len(),
                expected: bars.classes.len(),
            });
        }
        let all = part.values.iter().chain([&part.share]);
        for (column, &value) in all.enumerate() {
            if !value.is_finite() {
                return Err(DrawError::NotFinite {
                    what: "a bar",
                    row,
                    column,
                    value,
                });
            }
        }
    }
    Ok(())
}

/// Scale and ticks of a panel whose top is at `top`.
fn y_scale(panel: &ProfilePanel, top: f64) -> (Span, Vec<Tick>) {
    let bottom = top + PANEL;
    if let Some(((low, high), marks)) = &panel.fixed {
        let span = Span::new(*low, *high, Scale::Linear, bottom, top);
        let ticks = marks.iter().zip(tick_labels(marks));
        let ticks = ticks.map(|(&m, label)| Tick {
            at: span.at(m),
            label,
        });
        let ticks = ticks.collect();
        return (span, ticks);
    }
    let points = panel.curves.iter().flat_map(|c| c.runs.iter().flatten());
    let (low, high) = points.fold((0.0_f64, 0.0_f64), |(a, b), p| (a.min(p.1), b.max(p.1)));
    let high = if high > low { high } else { 1.0 };
    let span = Span::new(low, high + 0.06 * (high - low), Scale::Linear, bottom, top);
    let ticks = span.ticks(22.0);
    (span, ticks)
}

/// Flames are a band, not a line: none of the curves looks like it.
fn flame_line() -> String {
    format!(
        "fill=\"none\" stroke=\"{}\" stroke-width=\"5\" stroke-opacity=\".3\"",
        flame_colour()
    )
}

fn plane_line() -> String {
    format!(
        "fill=\"none\" stroke=\"{INK}\" stroke-opacity=\".7\" stroke-width=\".8\" \
         stroke-dasharray=\"1 2.2\""
    )
}

/// Lines across a panel where something stands in the chain; one for each place.
fn planes(svg: &mut Svg, figure: &ProfileFigure, r: Rect, x: &Span) {
    let all = &figure.chain.planes;
    let flame_at = |at: f64| {
        let mut there = all.iter().filter(|p| p.at == at);
        there.any(|p| p.symbol == Symbol::Flame)
    };
    let mut last = f64::NEG_INFINITY;
    for plane in all {
        if plane.at == last {
            continue;
        }
        last = plane.at;
        let style = if flame_at(plane.at) {
            flame_line()
        } else {
            plane_line()
        };
        let at = x.at(plane.at);
        svg.line((at, r.top), (at, r.bottom), &style);
    }
}

/// Draws the runs of a curve; a run of one point is a dot, and so are the ends at a jump over a plane.
fn draw_curve(svg: &mut Svg, curve: &Curve, figure: &ProfileFigure, x: &Span, y: &Span) {
    let planes = &figure.chain.planes;
    let at_plane = |px: f64| planes.iter().any(|p| (x.at(p.at) - px).abs() < 0.05);
    let runs: Vec<Vec<Point>> = curve
        .runs
        .iter()
        .filter(|r| !r.is_empty())
        .map(|run| run.iter().map(|&(u, v)| (x.at(u), y.at(v))).collect())
        .collect();
    let (mut data, mut dots) = (String::new(), String::new());
    let mut dot = |(u, v): Point| dots += &format!("M{} {}h.1", px(u), px(v));
    for run in &runs {
        match run.as_slice() {
            [one] => dot(*one),
            many => data += &open_path(&simplify(many, 0.05)),
        }
    }
    for pair in runs.windows(2) {
        let [before, behind] = pair else { continue };
        if let (Some(&a), Some(&b)) = (before.last(), behind.first())
            && (a.0 - b.0).abs() < 0.05
            && at_plane(a.0)
            && (a.1 - b.1).abs() > JUMP
        {
            dot(a);
            dot(b);
        }
    }
    let style = curve_style(curve.style);
    svg.path(&data, &style);
    let solid = style.split(" stroke-dasharray").next().unwrap_or_default();
    let round = "stroke-width=\"3.6\" stroke-linecap=\"round\"";
    svg.path(&dots, &solid.replace("stroke-width=\"1.9\"", round));
}

fn legend_entries(figure: &ProfileFigure) -> Vec<Entry> {
    let mut entries = Vec::new();
    let mut seen: Vec<(&str, usize)> = Vec::new();
    for curve in figure.panels.iter().flat_map(|p| &p.curves) {
        let key = (curve.name.as_str(), curve.style);
        if !curve.name.is_empty() && !seen.contains(&key) {
            seen.push(key);
            entries.push(Entry {
                swatch: Swatch::Line(vec![curve_style(curve.style)]),
                label: curve.name.clone(),
            });
        }
    }
    let chain = &figure.chain;
    let is_flame = |at: f64| {
        let mut there = chain.planes.iter().filter(|p| p.at == at);
        there.any(|p| p.symbol == Symbol::Flame)
    };
    let mut add = |swatch, label: &String| {
        if !label.is_empty() {
            let label = label.clone();
            entries.push(Entry { swatch, label });
        }
    };
    if chain.planes.iter().any(|p| is_flame(p.at)) {
        add(Swatch::Line(vec![flame_line()]), &figure.words.flame);
    }
    if chain.planes.iter().any(|p| !is_flame(p.at)) {
        add(Swatch::Line(vec![plane_line()]), &figure.words.plane);
    }
    if chain.passages.iter().any(|p| p.tinted) {
        let patch = format!("fill=\"{}\" stroke=\"{INK}\" stroke-width=\".6\"", tint());
        add(Swatch::Patch(vec![patch]), &figure.words.tinted);
    }
    entries
}
