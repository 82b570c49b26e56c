//! How the lines and fills of a map look, on the plot, on its colour bar and in its legend.

use super::svg::{INK, Svg};
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

pub(super) fn patterns(svg: &mut Svg) {
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
pub(super) fn signed(level: f64, step: f64) -> String {
    let labels = tick_labels(&[level, level + step]);
    let text = labels.into_iter().next().unwrap_or_default();
    if level > 0.0 {
        format!("+{text}")
    } else {
        text
    }
}
