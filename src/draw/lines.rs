//! Line figures: one or more panels over a shared x axis.

use super::DrawError;
use super::axis::{Axis, Span, check_samples};
use super::colour::{diverging, hex};
use super::frame::{self, Entry, MARGIN, Swatch, WIDTH};
use super::light;
use super::mark::{Mark, Spot};
use super::sheet::ends;
use super::style::{CROWD, DOTS, TOPS, crowd, curve_colour, curve_style, hatch_style, patterns};
use super::svg::{Anchor, GREY, INK, Point, Rect, Svg, Text, px};
use super::tags::{self, Tagged};
use super::text::{Weight, fit, tidy};

/// One curve of a panel.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Series {
    /// Legend text; curves of equal name and style share one entry.
    pub name: String,
    /// Which of the figure's styles (hue and dash) it takes; equal in every panel for one thing.
    pub style: usize,
    /// One value for each x sample; a gap where there is none.
    pub values: Vec<Option<f64>>,
    /// Short name written on the curve; may be empty.
    pub tag: String,
}

/// A tinted half-plane.
#[derive(Debug, Clone, PartialEq)]
pub struct Shade {
    /// Its edge, always in view.
    pub from: f64,
    /// Up from the edge, or down.
    pub upwards: bool,
    /// One word for it, printed beside the panel; may be empty.
    pub label: String,
}

/// Curves over one y axis.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Panel {
    /// Its y axis.
    pub y: Axis,
    /// Its curves.
    pub series: Vec<Series>,
    /// Optional tint.
    pub shade: Option<Shade>,
    /// Curves without a name of their own, below the others.
    pub crowd: Vec<Vec<(f64, f64)>>,
    /// Single points, not joined to others.
    pub dots: Vec<(f64, f64)>,
    /// Those of them that lead, drawn over the others.
    pub tops: Vec<(f64, f64)>,
    /// Marks on it.
    pub spots: Vec<Spot>,
}

/// Everything a line figure shows. Values are scaled to the units named beside them.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct LineFigure {
    /// The finding, in a sentence.
    pub title: String,
    /// What was computed; may be empty.
    pub subtitle: String,
    /// Small print; may be empty.
    pub footnote: String,
    /// The shared axis.
    pub x: Axis,
    /// Sample positions, strictly increasing.
    pub x_values: Vec<f64>,
    /// Whether the answer at a sample is trusted; empty where that does not apply.
    pub certified: Vec<bool>,
    /// Legend text for samples that are not.
    pub uncertified: String,
    /// An x position to mark, and its legend text.
    pub mark: Option<(f64, String)>,
    /// From top to bottom.
    pub panels: Vec<Panel>,
    /// Legend text of the marks.
    pub marks: Vec<(Mark, String)>,
    /// Legend text of curves without a name of their own.
    pub crowd: String,
    /// Legend texts of single points, and of those that lead.
    pub dots: (String, String),
}

const GAP: f64 = 14.0;
/// Bytes of all curves and single points, the share of curves that have a name, and of points that lead; and
/// marks. With its fonts and words the figure stays below 100 kB.
const BYTES: usize = 44_000;
const NAMED: f64 = 0.4;
const LEADING: f64 = 0.1;
const MOST_MARKS: usize = 100;
/// Space right of the plot, for the words beside tinted half-planes.
pub(super) const RIGHT: f64 = 20.0;
const MARK: &str = "fill=\"none\" stroke=\"#1b1e23\" stroke-dasharray=\"1.5 2\"";

/// Draws the figure.
///
/// # Errors
/// Where the arrays do not fit each other or hold something that cannot be placed.
pub fn render(figure: &LineFigure) -> Result<String, DrawError> {
    check(figure)?;
    let mut svg = Svg::default();
    patterns(&mut svg);
    let top = frame::header(&mut svg, &figure.title, &figure.subtitle);
    let height = match figure.panels.len() {
        0 | 1 => 380.0,
        2 => 215.0,
        _ => 170.0,
    };
    let rects = |left: f64| {
        (0..figure.panels.len()).map(move |k| {
            let top = top + k as f64 * (height + GAP);
            Rect {
                left,
                top,
                right: WIDTH - MARGIN - RIGHT,
                bottom: top + height,
            }
        })
    };
    let y_span = |panel: &Panel, r: Rect| {
        let (low, high) = y_range(panel);
        Span::new(low, high, panel.y.scale, r.bottom, r.top)
    };
    let left = figure
        .panels
        .iter()
        .zip(rects(0.0))
        .map(|(panel, r)| frame::left_space(&y_span(panel, r).ticks(36.0)))
        .fold(0.0, f64::max);

    let (x0, x1) = ends(&figure.x_values);
    let x = Span::new(x0, x1, figure.x.scale, left, WIDTH - MARGIN - RIGHT);
    let x_ticks = x.ticks(70.0);
    let mark = figure.mark.as_ref().filter(|(at, _)| x.covers(*at));
    let mut below = top;
    for (k, (panel, r)) in figure.panels.iter().zip(rects(left)).enumerate() {
        let y = y_span(panel, r);
        let y_ticks = y.ticks(36.0);
        if let Some(shade) = &panel.shade {
            tint(&mut svg, shade, r, &y);
        }
        frame::grid(&mut svg, r, &x_ticks, &y_ticks, 0.11);
        doubtful(&mut svg, figure, r, &x);
        if let Some((at, _)) = mark {
            svg.line((x.at(*at), r.top), (x.at(*at), r.bottom), MARK);
        }
        let place = |&(u, v): &(f64, f64)| (x.at(u), y.at(v));
        let unnamed = panel.crowd.iter();
        let bytes = BYTES / figure.panels.len();
        let share = |s: f64| (s * bytes as f64) as usize;
        let most = share(NAMED) / panel.series.len().max(1);
        let drawn: Vec<[String; 2]> = panel
            .series
            .iter()
            .map(|s| curve(s, figure, (&x, &y), most))
            .collect();
        // What those leave is for the rest: half of it, where there is both.
        let named: usize = drawn.iter().flatten().map(String::len).sum();
        let parts = if panel.dots.is_empty() { 1 } else { 2 };
        let rest = bytes.saturating_sub(named + share(LEADING)) / parts;
        let lines: Vec<Vec<Point>> = unnamed.map(|c| c.iter().map(place).collect()).collect();
        crowd(&mut svg, &lines, rest);
        let most = [
            (&panel.dots, DOTS, rest),
            (&panel.tops, TOPS, share(LEADING)),
        ];
        for (points, look, most) in most {
            let places: Vec<Point> = points.iter().map(place).collect();
            light::dots(&mut svg, &places, look, most);
        }
        for ([lines, dots], series) in drawn.iter().zip(&panel.series) {
            let style = curve_style(series.style);
            svg.path(lines, &style);
            let solid = style.split(" stroke-dasharray").next().unwrap_or_default();
            let dot = solid.replace(
                "stroke-width=\"1.9\"",
                "stroke-width=\"4\" stroke-linecap=\"round\"",
            );
            svg.path(dots, &dot);
        }
        names_and_marks(&mut svg, panel, figure, r, (&x, &y));
        frame::y_axis(&mut svg, r, &panel.y, &y_ticks);
        if k + 1 == figure.panels.len() {
            below = frame::x_axis(&mut svg, r, &figure.x, &x_ticks);
        }
    }
    let entries = legend_entries(figure, mark);
    let below = frame::legend(&mut svg, &entries, left, below, WIDTH - MARGIN - left);
    let height = frame::footnote(&mut svg, &figure.footnote, below);
    Ok(svg.finish(WIDTH, height, &tidy(&figure.title)))
}

fn check(figure: &LineFigure) -> Result<(), DrawError> {
    check_samples("the x axis", &figure.x_values, figure.x.scale)?;
    let expected = figure.x_values.len();
    let fits = |what: String, found: usize| {
        if found == expected {
            Ok(())
        } else {
            Err(DrawError::Shape {
                what,
                found,
                expected,
            })
        }
    };
    if !figure.certified.is_empty() {
        fits("certified".into(), figure.certified.len())?;
    }
    for (row, panel) in figure.panels.iter().enumerate() {
        let single = panel.dots.iter().chain(&panel.tops);
        for (column, &(u, v)) in panel.crowd.iter().flatten().chain(single).enumerate() {
            if let Some(value) = [u, v].into_iter().find(|x| !x.is_finite()) {
                return Err(DrawError::NotFinite {
                    what: "a curve",
                    row,
                    column,
                    value,
                });
            }
        }
        for series in &panel.series {
            fits(format!("series {:?}", series.name), series.values.len())?;
            for (column, value) in series.values.iter().enumerate() {
                let Some(value) = *value else { continue };
                if !value.is_finite() {
                    return Err(DrawError::NotFinite {
                        what: "a series",
                        row,
                        column,
                        value,
                    });
                }
                if panel.y.scale == super::Scale::Logarithmic && value <= 0.0 {
                    return Err(DrawError::NotPositive {
                        axis: "a y axis",
                        value,
                    });
                }
            }
        }
    }
    Ok(())
}

/// Range of a panel: its values and the edge of its shade, with a little room on both sides.
fn y_range(panel: &Panel) -> (f64, f64) {
    let values = panel
        .series
        .iter()
        .flat_map(|s| s.values.iter().flatten().copied())
        .chain(panel.crowd.iter().flatten().map(|p| p.1))
        .chain(panel.dots.iter().chain(&panel.tops).map(|p| p.1));
    let logarithmic = panel.y.scale == super::Scale::Logarithmic;
    let edge = panel
        .shade
        .as_ref()
        .map(|s| s.from)
        .filter(|e| !logarithmic || *e > 0.0);
    let (low, high) = values
        .chain(edge)
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), v| {
            (a.min(v), b.max(v))
        });
    if logarithmic && low <= high {
        let room = (high / low).powf(0.05).max(1.2);
        return (low / room, high * room);
    }
    if low > high {
        return if logarithmic { (1.0, 10.0) } else { (0.0, 1.0) };
    }
    with_room(low, high)
}

/// A range with a little room on both sides.
pub(super) fn with_room(low: f64, high: f64) -> (f64, f64) {
    let room = match 0.06 * (high - low) {
        r if r > 1e-12 * high.abs().max(low.abs()) => r,
        _ if high == 0.0 => 1.0,
        _ => 0.1 * high.abs(),
    };
    (low - room, high + room)
}

/// Draws a tinted half-plane and the word for it.
pub(super) fn tint(svg: &mut Svg, shade: &Shade, r: Rect, y: &Span) {
    let edge = y.at(shade.from).clamp(r.top, r.bottom);
    let (tint, area) = if shade.upwards {
        (diverging(0.0), Rect { bottom: edge, ..r })
    } else {
        (diverging(-0.15), Rect { top: edge, ..r })
    };
    svg.path(
        &area.path(),
        &format!("fill=\"{}\" fill-opacity=\".6\"", hex(tint)),
    );
    svg.line(
        (r.left, edge),
        (r.right, edge),
        &format!("stroke=\"{INK}\" stroke-width=\"1.4\""),
    );
    let label = fit(
        &tidy(&shade.label),
        Weight::Semibold,
        10.5,
        area.height().max(40.0),
    );
    let at = (r.right + 13.0, (area.top + area.bottom) / 2.0);
    let text = Text::new(at, &label, 10.5)
        .weight(Weight::Semibold)
        .fill(GREY);
    svg.text(&text.anchor(Anchor::Middle).turn(-90.0));
}

fn doubtful(svg: &mut Svg, figure: &LineFigure, r: Rect, x: &Span) {
    let nodes: Vec<f64> = figure.x_values.iter().map(|&v| x.at(v)).collect();
    let mut data = String::new();
    let mut start: Option<usize> = None;
    let flags = figure.certified.iter().copied().chain([true]);
    for (i, certified) in flags.enumerate() {
        match (certified, start) {
            (false, None) => start = Some(i),
            (true, Some(first)) => {
                // From the last trusted sample to the next: between, nothing is known either.
                let before = first.checked_sub(1).and_then(|k| nodes.get(k));
                let left = before.map_or(r.left, |x| *x);
                let right = nodes.get(i).map_or(r.right, |x| *x);
                let middle = ((left + right) / 2.0).clamp(r.left + 2.0, r.right - 2.0);
                let (left, right) = (left.min(middle - 2.0), right.max(middle + 2.0));
                data += &Rect { left, right, ..r }.path();
                start = None;
            }
            _ => {}
        }
    }
    svg.path(&data, &hatch_style());
}

/// The stretches of a curve between its gaps, px.
fn runs(series: &Series, figure: &LineFigure, x: &Span, y: &Span) -> Vec<Vec<Point>> {
    let points = figure.x_values.iter().zip(&series.values);
    let points: Vec<Option<Point>> = points
        .map(|(&u, v)| v.map(|v| (x.at(u), y.at(v))))
        .collect();
    let runs = points.split(Option::is_none);
    runs.map(|run| run.iter().copied().flatten().collect())
        .collect()
}

/// Draws the marks of a panel and writes the names of its curves, clear of each other.
fn names_and_marks(svg: &mut Svg, panel: &Panel, figure: &LineFigure, r: Rect, at: (&Span, &Span)) {
    let (x, y) = at;
    let mut taken = Vec::new();
    let seen = panel.spots.iter();
    let seen = seen.filter(|s| x.covers(s.x) && y.covers(s.y));
    let most = MOST_MARKS / figure.panels.len();
    for spot in light::spots(seen, most, |s| (x.at(s.x), y.at(s.y))) {
        let place = (x.at(spot.x), y.at(spot.y));
        let colour = spot.style.map_or(INK.to_owned(), curve_colour);
        spot.mark.draw(svg, place, &colour);
        let (left, top) = place;
        taken.push(
            Rect {
                left,
                top,
                right: left,
                bottom: top,
            }
            .grown(5.0),
        );
    }
    let tagged: Vec<Tagged> = panel
        .series
        .iter()
        .map(|series| Tagged {
            tag: tidy(&series.tag),
            colour: curve_colour(series.style),
            runs: runs(series, figure, x, y),
        })
        .collect();
    tags::write(svg, r, &tagged, &mut taken);
}

/// Path data of the stretches of a curve between its gaps, of no more than `most` bytes, and of stretches of one sample.
fn curve(series: &Series, figure: &LineFigure, at: (&Span, &Span), most: usize) -> [String; 2] {
    let runs = runs(series, figure, at.0, at.1);
    let (single, long): (Vec<_>, Vec<_>) = runs.into_iter().partition(|run| run.len() == 1);
    let dot = |(u, v): &Point| format!("M{} {}h.1", px(*u), px(*v));
    let dots = single.iter().flatten().map(dot).collect();
    [light::curves(&long, 0.05, most), dots]
}

fn legend_entries(figure: &LineFigure, mark: Option<&(f64, String)>) -> Vec<Entry> {
    let mut entries = Vec::new();
    let mut seen: Vec<(&str, usize)> = Vec::new();
    for series in figure.panels.iter().flat_map(|p| &p.series) {
        let key = (series.name.as_str(), series.style);
        if !series.name.is_empty() && !seen.contains(&key) {
            seen.push(key);
            let swatch = Swatch::Line(vec![curve_style(series.style)]);
            entries.push(Entry {
                swatch,
                label: series.name.clone(),
            });
        }
    }
    if figure.panels.iter().any(|p| !p.crowd.is_empty()) {
        entries.push(Entry {
            swatch: Swatch::Line(vec![CROWD.into()]),
            label: figure.crowd.clone(),
        });
    }
    let panels = || figure.panels.iter();
    let (dots, tops) = &figure.dots;
    for (any, (colour, width), label) in [
        (panels().any(|p| !p.tops.is_empty()), TOPS, tops),
        (panels().any(|p| !p.dots.is_empty()), DOTS, dots),
    ] {
        if any {
            entries.push(Entry {
                swatch: Swatch::Dots(light::dot_style(colour, width)),
                label: label.clone(),
            });
        }
    }
    for (mark, label) in &figure.marks {
        let drawn = figure.panels.iter().flat_map(|p| &p.spots);
        if drawn.clone().any(|s| s.mark == *mark) {
            entries.push(Entry {
                swatch: Swatch::Mark(*mark),
                label: label.clone(),
            });
        }
    }
    if let Some((_, label)) = mark {
        entries.push(Entry {
            swatch: Swatch::Line(vec![MARK.into()]),
            label: label.clone(),
        });
    }
    if figure.certified.contains(&false) {
        let swatch = Swatch::Patch(vec![hatch_style()]);
        entries.push(Entry {
            swatch,
            label: figure.uncertified.clone(),
        });
    }
    entries
}
