//! What every figure shares: header, axes, grid, legend, footnote.

use super::axis::{Axis, Tick};
use super::mark::Mark;
use super::svg::{Anchor, GREY, INK, Rect, Svg, Text, px};
use super::text::{Weight, fit, tidy, width, wrap};

/// Width of every figure.
pub(super) const WIDTH: f64 = 720.0;
/// Free space along the rim of the canvas.
pub(super) const MARGIN: f64 = 14.0;

pub(super) const TICK_SIZE: f64 = 10.5;
pub(super) const CAPTION_SIZE: f64 = 11.5;
const LEGEND_SIZE: f64 = 10.5;
const FOOTNOTE_SIZE: f64 = 9.0;
const TICK: f64 = 4.0;

/// Longest line of running text: a viewer that reads no embedded fonts may take a wider one.
const LINE: f64 = 0.9 * WIDTH;

/// Draws title and subtitle from the top; gives the y where the rest may start.
pub(super) fn header(svg: &mut Svg, title: &str, subtitle: &str) -> f64 {
    let (title, subtitle) = (tidy(title), tidy(subtitle));
    let mut y = MARGIN;
    // A title that needs more than two lines is set smaller before any of it is cut.
    let size = if wrap(&title, Weight::Semibold, 15.0, LINE, 3).len() <= 2 {
        15.0
    } else {
        13.0
    };
    for line in wrap(&title, Weight::Semibold, size, LINE, 3) {
        y += size;
        svg.text(&Text::new((MARGIN, y), &line, size).weight(Weight::Semibold));
        y += 0.3 * size;
    }
    for line in wrap(&subtitle, Weight::Regular, 11.0, LINE, 3) {
        y += 13.0;
        svg.text(&Text::new((MARGIN, y), &line, 11.0).fill(GREY));
        y += 2.0;
    }
    y + 12.0
}

/// Space that the y axis needs left of the plot.
pub(super) fn left_space(ticks: &[Tick]) -> f64 {
    MARGIN + CAPTION_SIZE + 8.0 + widest(ticks) + TICK + 4.0
}

/// Width of the widest tick label.
pub(super) fn widest(ticks: &[Tick]) -> f64 {
    ticks
        .iter()
        .map(|t| width(&t.label, Weight::Regular, TICK_SIZE))
        .fold(0.0, f64::max)
}

/// Light grid lines.
pub(super) fn grid(svg: &mut Svg, plot: Rect, x: &[Tick], y: &[Tick], opacity: f64) {
    let mut data = String::new();
    for t in x {
        if t.at - plot.left > 1.0 && plot.right - t.at > 1.0 {
            data += &format!("M{} {}V{}", px(t.at), px(plot.top), px(plot.bottom));
        }
    }
    for t in y {
        if t.at - plot.top > 1.0 && plot.bottom - t.at > 1.0 {
            data += &format!("M{} {}H{}", px(plot.left), px(t.at), px(plot.right));
        }
    }
    let style =
        format!("fill=\"none\" stroke=\"{INK}\" stroke-opacity=\"{opacity}\" stroke-width=\".7\"");
    svg.path(&data, &style);
}

/// Frame, ticks, tick labels and caption of the y axis, left of the plot.
pub(super) fn y_axis(svg: &mut Svg, plot: Rect, axis: &Axis, ticks: &[Tick]) {
    border(svg, plot);
    let data: String = ticks
        .iter()
        .map(|t| format!("M{} {}h-{}", px(plot.left), px(t.at), px(TICK)))
        .collect();
    svg.path(&data, &format!("fill=\"none\" stroke=\"{INK}\""));
    for t in ticks {
        let at = (plot.left - TICK - 4.0, t.at + 0.36 * TICK_SIZE);
        svg.text(&Text::new(at, &t.label, TICK_SIZE).anchor(Anchor::End));
    }
    let room = plot.height() + 30.0;
    let (caption, size) = shrunk(&axis.caption(), room);
    let at = (MARGIN + CAPTION_SIZE - 1.0, (plot.top + plot.bottom) / 2.0);
    svg.text(
        &Text::new(at, &caption, size)
            .anchor(Anchor::Middle)
            .turn(-90.0),
    );
}

/// A caption set smaller where it is too long, and cut only where that does not do; with its size.
fn shrunk(caption: &str, room: f64) -> (String, f64) {
    const LEAST: f64 = 6.5;
    let full = width(caption, Weight::Regular, CAPTION_SIZE);
    let size = (CAPTION_SIZE * room / full).clamp(LEAST, CAPTION_SIZE);
    (fit(caption, Weight::Regular, 0.999 * size, room), size)
}

/// Ticks, labels and caption of the x axis, below the plot; gives the y below all of them.
pub(super) fn x_axis(svg: &mut Svg, plot: Rect, axis: &Axis, ticks: &[Tick]) -> f64 {
    let data: String = ticks
        .iter()
        .map(|t| format!("M{} {}v{}", px(t.at), px(plot.bottom), px(TICK)))
        .collect();
    svg.path(&data, &format!("fill=\"none\" stroke=\"{INK}\""));
    let base = plot.bottom + TICK + 3.0 + TICK_SIZE;
    for t in ticks {
        svg.text(&Text::new((t.at, base), &t.label, TICK_SIZE).anchor(Anchor::Middle));
    }
    let y = base + 8.0 + CAPTION_SIZE;
    let (caption, size) = shrunk(&axis.caption(), plot.width() + 60.0);
    let at = ((plot.left + plot.right) / 2.0, y);
    svg.text(&Text::new(at, &caption, size).anchor(Anchor::Middle));
    y + 6.0
}

pub(super) fn border(svg: &mut Svg, plot: Rect) {
    svg.path(&plot.path(), &format!("fill=\"none\" stroke=\"{INK}\""));
}

/// How a legend entry looks: markup drawn in a box 24 px wide and 12 px high.
pub(super) struct Entry {
    pub swatch: Swatch,
    pub label: String,
}

pub(super) enum Swatch {
    /// Attributes of horizontal lines drawn over each other.
    Line(Vec<String>),
    /// Attributes of rectangles drawn over each other.
    Patch(Vec<String>),
    /// Attributes of three dots.
    Dots(String),
    /// A mark.
    Mark(Mark),
}

/// Lays entries in rows from `left` and `top`, at most `room` wide; gives the y below them.
pub(super) fn legend(svg: &mut Svg, entries: &[Entry], left: f64, top: f64, room: f64) -> f64 {
    const ROW: f64 = 18.0;
    const SWATCH: f64 = 24.0;
    if entries.is_empty() {
        return top;
    }
    let (mut x, mut y) = (left, top + 6.0);
    for entry in entries {
        let label = fit(
            &tidy(&entry.label),
            Weight::Regular,
            LEGEND_SIZE,
            room - SWATCH - 6.0,
        );
        let size = SWATCH + 6.0 + width(&label, Weight::Regular, LEGEND_SIZE);
        if x > left && x + size > left + room {
            (x, y) = (left, y + ROW);
        }
        let middle = y + 6.0;
        match &entry.swatch {
            Swatch::Line(styles) => {
                for style in styles {
                    svg.line((x, middle), (x + SWATCH, middle), style);
                }
            }
            Swatch::Dots(style) => {
                let data = [6.0, 12.0, 18.0].map(|d| format!("M{} {}h0", px(x + d), px(middle)));
                svg.path(&data.concat(), style);
            }
            Swatch::Mark(mark) => mark.draw(svg, (x + SWATCH / 2.0, middle), INK),
            Swatch::Patch(styles) => {
                let r = Rect {
                    left: x,
                    top: y,
                    right: x + SWATCH,
                    bottom: y + 12.0,
                };
                for style in styles {
                    svg.path(&r.path(), style);
                }
            }
        }
        let at = (x + SWATCH + 6.0, middle + 0.36 * LEGEND_SIZE);
        svg.text(&Text::new(at, &label, LEGEND_SIZE));
        x += size + 20.0;
    }
    y + ROW
}

/// The design point's mark.
pub(super) fn marker(svg: &mut Svg, (x, y): (f64, f64)) {
    let (x, y) = (px(x), px(y));
    svg.raw(&format!(
        "<circle cx=\"{x}\" cy=\"{y}\" r=\"5\" fill=\"#fff\" stroke=\"#fff\" stroke-width=\"4.5\"/>\
         <circle cx=\"{x}\" cy=\"{y}\" r=\"5\" fill=\"#fff\" stroke=\"{INK}\" stroke-width=\"1.8\"/>\
         <circle cx=\"{x}\" cy=\"{y}\" r=\"1.8\"/>"
    ));
}

/// Small print at the foot; gives the height of the canvas.
pub(super) fn footnote(svg: &mut Svg, text: &str, top: f64) -> f64 {
    let mut y = top + 4.0;
    for line in wrap(&tidy(text), Weight::Regular, FOOTNOTE_SIZE, LINE, 6) {
        y += FOOTNOTE_SIZE + 3.0;
        svg.text(&Text::new((MARGIN, y), &line, FOOTNOTE_SIZE).fill(GREY));
    }
    y + MARGIN - 2.0
}
