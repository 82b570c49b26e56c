//! Trails of points over a parameter in a plane, with arrows of growing parameter.

use super::DrawError;
use super::axis::{Axis, Span};
use super::contour::simplify;
use super::frame::{self, Entry, MARGIN, Swatch, WIDTH};
use super::label::{Measured, beside};
use super::light;
use super::lines::{RIGHT, Shade, tint, with_room};
use super::mark::{Mark, Spot};
use super::style::{CROWD, DOTS, crowd, curve_colour, curve_style};
use super::svg::{GREY, INK, Point, Rect, Svg, Text, closed_path};
use super::tags::{self, Tagged};
use super::text::{CAP_HEIGHT, Weight, tidy, width};

/// One trail.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Trail {
    /// Legend text.
    pub name: String,
    /// Short name written on it.
    pub tag: String,
    /// Which of the styles it takes.
    pub style: usize,
    /// Stretches of (parameter, x, y), the parameter growing.
    pub runs: Vec<Vec<(f64, f64, f64)>>,
}

/// Everything a locus shows. Values are scaled to the units named beside them.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Locus {
    /// The finding, in a sentence.
    pub title: String,
    /// What was computed; may be empty.
    pub subtitle: String,
    /// Small print; may be empty.
    pub footnote: String,
    /// Across.
    pub x: Axis,
    /// Up.
    pub y: Axis,
    /// The parameter and both its ends.
    pub parameter: (Axis, f64, f64),
    /// Optional tint of a half-plane.
    pub shade: Option<Shade>,
    /// The trails.
    pub trails: Vec<Trail>,
    /// Trails without a name of their own, (x, y), and the legend text for all of them.
    pub crowd: (Vec<Vec<(f64, f64)>>, String),
    /// Single points, not joined to others, (x, y), and the legend text for all of them.
    pub dots: (Vec<(f64, f64)>, String),
    /// Marks, with text beside them where they have a label.
    pub spots: Vec<Spot>,
    /// Legend text of the marks.
    pub marks: Vec<(Mark, String)>,
}

const HEIGHT: f64 = 430.0;
/// Distance between arrows, px; more where there would be more than so many.
const BETWEEN_ARROWS: f64 = 90.0;
const MOST_ARROWS: f64 = 110.0;
/// Bytes of the trails, of those without a name, and of single points; and marks. With its fonts and words the figure stays
/// below 100 kB.
const SHARES: (usize, usize, usize, usize) = (15_000, 12_000, 8000, 60);
const LABEL_SIZE: f64 = 9.5;

/// Draws the figure.
///
/// # Errors
/// Where it holds something that cannot be placed.
pub fn render(figure: &Locus) -> Result<String, DrawError> {
    check(figure)?;
    let mut svg = Svg::default();
    let top = frame::header(&mut svg, &figure.title, &figure.subtitle);
    let trails = figure.trails.iter();
    let named = trails.flat_map(|t| t.runs.iter().flatten().map(|p| (p.1, p.2)));
    let points: Vec<(f64, f64)> = named
        .chain(figure.crowd.0.iter().flatten().copied())
        .chain(figure.dots.0.iter().copied())
        .collect();
    let (x0, x1) = range(points.iter().map(|p| p.0));
    let edge = figure.shade.as_ref().map(|s| s.from);
    let (y0, y1) = range(points.iter().map(|p| p.1).chain(edge));
    let right = WIDTH - MARGIN - RIGHT;
    let y = Span::new(y0, y1, figure.y.scale, top + HEIGHT, top);
    let y_ticks = y.ticks(36.0);
    let left = frame::left_space(&y_ticks);
    let plot = Rect {
        left,
        top,
        right,
        bottom: top + HEIGHT,
    };
    let x = Span::new(x0, x1, figure.x.scale, left, right);
    let x_ticks = x.ticks(70.0);
    if let Some(shade) = &figure.shade {
        tint(&mut svg, shade, plot, &y);
    }
    frame::grid(&mut svg, plot, &x_ticks, &y_ticks, 0.11);
    let unnamed = figure.crowd.0.iter();
    let on = |&(u, v): &(f64, f64)| (x.at(u), y.at(v));
    let unnamed: Vec<Vec<Point>> = unnamed.map(|c| c.iter().map(on).collect()).collect();
    crowd(&mut svg, &unnamed, SHARES.1);
    let single: Vec<Point> = figure.dots.0.iter().map(on).collect();
    light::dots(&mut svg, &single, DOTS, SHARES.2);
    let place = |&(_, u, v): &(f64, f64, f64)| (x.at(u), y.at(v));
    let tagged: Vec<Tagged> = figure
        .trails
        .iter()
        .map(|trail| Tagged {
            tag: tidy(&trail.tag),
            colour: curve_colour(trail.style),
            runs: trail
                .runs
                .iter()
                .map(|run| simplify(&run.iter().map(place).collect::<Vec<_>>(), 0.05))
                .collect(),
        })
        .collect();
    for (trail, drawn) in figure.trails.iter().zip(&tagged) {
        let data = light::curves(&drawn.runs, 0.05, SHARES.0 / tagged.len());
        svg.path(&data, &curve_style(trail.style));
    }
    let mut taken: Vec<Rect> = Vec::new();
    let (parameter, low, high) = &figure.parameter;
    let ticks = Span::new(*low, *high, parameter.scale, *low, *high);
    let steps = Span::new(*low, *high, parameter.scale, 0.0, 640.0).ticks(80.0);
    let at_ticks: Vec<f64> = steps.iter().map(|t| t.at / 640.0).collect();
    let runs = tagged.iter().flat_map(|t| &t.runs);
    let length: f64 = runs.map(|run| Measured::new(run).total()).sum();
    let between = BETWEEN_ARROWS.max(length / MOST_ARROWS);
    for (trail, drawn) in figure.trails.iter().zip(&tagged) {
        arrows(&mut svg, drawn, between, &mut taken);
        let fraction = |p: f64| (ticks.at(p) - low) / (high - low);
        for run in &trail.runs {
            for tick in &at_ticks {
                if let Some((u, v)) = on_run(run, |p| fraction(p) - tick) {
                    let at = (x.at(u), y.at(v));
                    Mark::Dot.draw(&mut svg, at, &drawn.colour);
                    taken.push(around(at, 3.0));
                }
            }
        }
    }
    let on = |s: &Spot| (x.at(s.x), y.at(s.y));
    let spots = light::spots(figure.spots.iter(), SHARES.3, on);
    for spot in &spots {
        let at = on(spot);
        let colour = spot.style.map_or(INK.to_owned(), curve_colour);
        spot.mark.draw(&mut svg, at, &colour);
        taken.push(around(at, 5.0));
    }
    tags::write(&mut svg, plot, &tagged, &mut taken);
    labels(
        &mut svg,
        &spots,
        (&x, &y),
        (plot, edge),
        &tagged,
        &mut taken,
    );
    frame::y_axis(&mut svg, plot, &figure.y, &y_ticks);
    let below = frame::x_axis(&mut svg, plot, &figure.x, &x_ticks);
    let labels: Vec<String> = steps.into_iter().map(|t| t.label).collect();
    let entries = legend_entries(figure, &labels);
    let below = frame::legend(&mut svg, &entries, left, below, WIDTH - MARGIN - left);
    let height = frame::footnote(&mut svg, &figure.footnote, below);
    Ok(svg.finish(WIDTH, height, &tidy(&figure.title)))
}

fn check(figure: &Locus) -> Result<(), DrawError> {
    let unnamed = figure.crowd.0.iter().flatten().chain(&figure.dots.0);
    let unnamed = unnamed.enumerate();
    for (column, &(u, v)) in unnamed {
        if let Some(value) = [u, v].into_iter().find(|x| !x.is_finite()) {
            return Err(DrawError::NotFinite {
                what: "a trail",
                row: 0,
                column,
                value,
            });
        }
    }
    for (row, run) in figure.trails.iter().flat_map(|t| &t.runs).enumerate() {
        for (column, &(p, u, v)) in run.iter().enumerate() {
            if let Some(value) = [p, u, v].into_iter().find(|x| !x.is_finite()) {
                return Err(DrawError::NotFinite {
                    what: "a trail",
                    row,
                    column,
                    value,
                });
            }
        }
    }
    Ok(())
}

fn range(values: impl Iterator<Item = f64>) -> (f64, f64) {
    let (low, high) = values.fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), v| {
        (a.min(v), b.max(v))
    });
    if low > high {
        (0.0, 1.0)
    } else {
        with_room(low, high)
    }
}

fn around((x, y): Point, by: f64) -> Rect {
    Rect {
        left: x,
        top: y,
        right: x,
        bottom: y,
    }
    .grown(by)
}

/// Where `f` of the parameter changes its sign along a run, by a straight line.
fn on_run(run: &[(f64, f64, f64)], f: impl Fn(f64) -> f64) -> Option<(f64, f64)> {
    const SLACK: f64 = 1e-9;
    run.windows(2).find_map(|w| {
        let [a, b] = w else { return None };
        let (fa, fb) = (f(a.0), f(b.0));
        if fa > SLACK || fb < -SLACK {
            return None;
        }
        let t = if fb > fa {
            (-fa / (fb - fa)).clamp(0.0, 1.0)
        } else {
            0.0
        };
        Some((a.1 + t * (b.1 - a.1), a.2 + t * (b.2 - a.2)))
    })
}

/// Arrow heads along the trail, the way the parameter grows.
fn arrows(svg: &mut Svg, trail: &Tagged, between: f64, taken: &mut Vec<Rect>) {
    let mut data = String::new();
    for run in &trail.runs {
        let line = Measured::new(run);
        let total = line.total();
        if total < 24.0 {
            continue;
        }
        let count = (total / between).round().max(1.0);
        for k in 0..count as usize {
            let s = total * (k as f64 + 0.5) / count;
            let (a, b) = (line.at(s - 4.0), line.at(s + 4.0));
            let length = (b.0 - a.0).hypot(b.1 - a.1);
            if length < 4.0 {
                continue;
            }
            let (c, d) = ((b.0 - a.0) / length, (b.1 - a.1) / length);
            let m = line.at(s);
            let corner = |along: f64, across: f64| {
                (m.0 + along * c - across * d, m.1 + along * d + across * c)
            };
            data += &closed_path(&[corner(5.5, 0.0), corner(-4.0, 4.2), corner(-4.0, -4.2)]);
            taken.push(around(m, 6.0));
        }
    }
    let style = format!(
        "fill=\"{}\" stroke=\"#fff\" stroke-width=\".8\" stroke-linejoin=\"round\"",
        trail.colour
    );
    svg.path(&data, &style);
}

/// The labels of marks, beside them where the least lies under.
fn labels(
    svg: &mut Svg,
    spots: &[&Spot],
    (x, y): (&Span, &Span),
    (plot, edge): (Rect, Option<f64>),
    trails: &[Tagged],
    taken: &mut Vec<Rect>,
) {
    let edge = edge.map(|at| y.at(at));
    let crowd: Vec<Point> = trails
        .iter()
        .flat_map(|t| &t.runs)
        .flat_map(|run| {
            let line = Measured::new(run);
            let n = (line.total() / 3.0).floor() as usize;
            (0..=n).map(|k| line.at(k as f64 * 3.0)).collect::<Vec<_>>()
        })
        .collect();
    for spot in spots.iter().filter(|s| !s.label.is_empty()) {
        let label = tidy(&spot.label);
        let size = (width(&label, Weight::Regular, LABEL_SIZE), LABEL_SIZE);
        let struck = |r: Rect| edge.is_some_and(|at| r.top < at && at < r.bottom);
        let others = |r: Rect| {
            if struck(r) {
                return usize::MAX;
            }
            let covered = taken.iter().filter(|t| t.overlaps(r)).count();
            20 * covered + crowd.iter().filter(|p| r.contains(**p)).count()
        };
        let at = (x.at(spot.x), y.at(spot.y));
        let place = beside(at, size, 8.0, plot.grown(-3.0), &others);
        if struck(place) || taken.iter().any(|t| t.overlaps(place)) {
            // The value stands in the table; a label over another is worse than none.
            continue;
        }
        taken.push(place);
        let base = (
            place.left,
            place.bottom - (1.0 - CAP_HEIGHT) * LABEL_SIZE / 2.0,
        );
        svg.text(&Text::new(base, &label, LABEL_SIZE).fill(GREY).halo(3.0));
    }
}

fn legend_entries(figure: &Locus, ticks: &[String]) -> Vec<Entry> {
    let mut entries: Vec<Entry> = figure
        .trails
        .iter()
        .map(|trail| Entry {
            swatch: Swatch::Line(vec![curve_style(trail.style)]),
            label: trail.name.clone(),
        })
        .collect();
    if !figure.crowd.0.is_empty() {
        entries.push(Entry {
            swatch: Swatch::Line(vec![CROWD.into()]),
            label: figure.crowd.1.clone(),
        });
    }
    if !figure.dots.0.is_empty() {
        let (colour, width) = DOTS;
        entries.push(Entry {
            swatch: Swatch::Dots(light::dot_style(colour, width)),
            label: figure.dots.1.clone(),
        });
    }
    let axis = &figure.parameter.0;
    if !ticks.is_empty() && !figure.trails.is_empty() {
        let unit = tidy(&axis.unit);
        let at = format!("at {} {unit}", ticks.join(", "));
        let label = format!("{}; arrows to larger values", at.trim_end());
        entries.push(Entry {
            swatch: Swatch::Mark(Mark::Dot),
            label,
        });
    }
    for (mark, label) in &figure.marks {
        if figure.spots.iter().any(|s| s.mark == *mark) {
            entries.push(Entry {
                swatch: Swatch::Mark(*mark),
                label: label.clone(),
            });
        }
    }
    entries
}
