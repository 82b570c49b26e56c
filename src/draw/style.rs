//! How lines and fills look, on the plot, on a map's colour bar and in the legend.

use super::colour::{hex, oklch};
use super::light;
use super::svg::{INK, Point, Svg};
use super::text::tick_labels;

pub(super) const NEUTRAL_HALO: &str = "fill=\"none\" stroke=\"#fff\" stroke-width=\"4.6\" stroke-opacity=\".85\" stroke-linejoin=\"round\"";

pub(super) fn neutral_style() -> String {
    format!("fill=\"none\" stroke=\"{INK}\" stroke-width=\"2.2\" stroke-linejoin=\"round\"")
}

pub(super) fn iso_style(level: f64) -> String {
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

pub(super) fn second_style() -> String {
    format!(
        "fill=\"none\" stroke=\"{INK}\" stroke-width=\"1.3\" stroke-linecap=\"round\" \
         stroke-dasharray=\".1 3\""
    )
}

/// A cut is a double line: ink with a white core.
pub(super) fn cut_style() -> String {
    format!("fill=\"none\" stroke=\"{INK}\" stroke-width=\"4.2\"")
}

pub(super) const CUT_CORE: &str = "fill=\"none\" stroke=\"#fff\" stroke-width=\"2\"";

pub(super) fn patch_style() -> String {
    format!(
        "fill=\"none\" stroke=\"{INK}\" stroke-opacity=\".75\" stroke-width=\"1.1\" stroke-linecap=\"round\" \
         stroke-dasharray=\".1 2.6\""
    )
}

pub(super) fn hatch_style() -> String {
    format!(
        "fill=\"{}\" stroke=\"{INK}\" stroke-width=\".9\"",
        Svg::url("hatch")
    )
}

pub(super) fn absent_style() -> String {
    format!(
        "fill=\"{}\" stroke=\"#8b9098\" stroke-width=\".8\"",
        Svg::url("absent")
    )
}

pub(super) fn unreached_style() -> String {
    format!(
        "fill=\"{}\" stroke=\"#8b9098\" stroke-width=\".8\"",
        Svg::url("unreached")
    )
}

pub(super) fn patterns(svg: &mut Svg) {
    svg.define(&format!(
        "<pattern id=\"{}\" width=\"5\" height=\"5\" patternUnits=\"userSpaceOnUse\" \
         patternTransform=\"rotate(45)\"><path d=\"M0 2.5H5\" stroke=\"{INK}\"/></pattern>\
         <pattern id=\"{}\" width=\"7\" height=\"7\" patternUnits=\"userSpaceOnUse\">\
         <path d=\"M0 0H7V7H0Z\" fill=\"#f1f1f1\"/><circle cx=\"2\" cy=\"2\" r=\".8\" fill=\"#9a9ea6\"/>\
         <circle cx=\"5.5\" cy=\"5.5\" r=\".8\" fill=\"#9a9ea6\"/></pattern>\
         <pattern id=\"{}\" width=\"6\" height=\"6\" patternUnits=\"userSpaceOnUse\">\
         <path d=\"M0 0H6V6H0Z\" fill=\"#fff\"/><path d=\"M0 3H6\" stroke=\"#8b9098\"/></pattern>",
        Svg::id("hatch"),
        Svg::id("absent"),
        Svg::id("unreached"),
    ));
}

/// A level with an explicit sign.
pub(super) fn signed(level: f64, step: f64) -> String {
    let labels = tick_labels(&[level, level + step]);
    let text = labels.into_iter().next().unwrap_or_default();
    if level > 0.0 {
        format!("+{text}")
    } else {
        text
    }
}

/// Hue (degrees), lightness and dash of the style of a curve: neighbours differ in all three, for readers
/// without colour vision and for grey print.
const LOOK: [(f64, f64, &str); 10] = [
    (255.0, 0.46, ""),
    (45.0, 0.62, "7 2.5"),
    (160.0, 0.52, "2.5 2"),
    (330.0, 0.42, "9 2.5 2 2.5"),
    (85.0, 0.58, ""),
    (215.0, 0.64, "4 2"),
    (20.0, 0.40, "1 2"),
    (290.0, 0.58, "12 3"),
    (125.0, 0.45, "5 1.5 1 1.5 1 1.5"),
    (185.0, 0.36, "3 1"),
];

fn look(style: usize) -> (f64, f64, &'static str) {
    let looks = LOOK.get(style % LOOK.len()).copied();
    looks.unwrap_or((0.0, 0.4, ""))
}

/// How curves without a name of their own are drawn.
pub(super) const CROWD: &str = "fill=\"none\" stroke=\"#8b9098\" stroke-width=\".9\" stroke-linecap=\"round\" stroke-linejoin=\"round\"";

/// One path of many curves without a name of their own, of no more than `most` bytes; coarser than those that have one.
pub(super) fn crowd(svg: &mut Svg, curves: &[Vec<Point>], most: usize) {
    svg.path(&light::curves(curves, 0.2, most), CROWD);
}

/// Colour and width of modes at single points.
pub(super) const DOTS: (&str, f64) = ("#a4a8b0", 1.4);

/// Colour and width of the fastest of these at each point.
pub(super) const TOPS: (&str, f64) = (INK, 2.6);

/// The colour of a style.
pub(super) fn curve_colour(style: usize) -> String {
    let (hue, lightness, _) = look(style);
    let darker = 0.06 * ((style / LOOK.len()) % 3) as f64;
    hex(oklch(lightness - darker, 0.12, hue))
}

/// How a curve of a style is drawn.
pub(super) fn curve_style(style: usize) -> String {
    let (_, _, dash) = look(style);
    let dash = if dash.is_empty() {
        String::new()
    } else {
        format!(" stroke-dasharray=\"{dash}\"")
    };
    format!(
        "fill=\"none\" stroke=\"{}\" stroke-width=\"1.9\" stroke-linejoin=\"round\"{dash}",
        curve_colour(style)
    )
}
