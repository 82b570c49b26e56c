//! The colour bar of a map.

use super::axis::{Span, Tick, caption};
use super::colour::{Limit, diverging, hex};
use super::frame::{self, CAPTION_SIZE, TICK_SIZE};
use super::map::Quantity;
use super::style::{NEUTRAL_HALO, iso_style, neutral_style, signed};
use super::svg::{Anchor, INK, Rect, Svg, Text, closed_path};
use super::text::{Weight, fit, fixed, tidy, width};

const GAP: f64 = 20.0;
const WIDTH: f64 = 14.0;

/// Space that the bar needs right of the plot, up to the canvas margin.
pub(super) fn space(limit: &Limit) -> f64 {
    GAP + WIDTH + 8.0 + frame::widest(&bar_labels(limit)) + 9.0 + CAPTION_SIZE
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
pub(super) fn bar(svg: &mut Svg, quantity: &Quantity, limit: &Limit, plot: Rect) {
    const TIP: f64 = 11.0;
    let (left, right) = (plot.right + GAP, plot.right + GAP + WIDTH);
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
    let (above, below) = (tidy(&quantity.above), tidy(&quantity.below));
    let side = |s: &str| width(s, Weight::Semibold, CAPTION_SIZE);
    let room = plot.height() - 2.0 * (side(&above).max(side(&below)) + 14.0);
    let name = caption(&quantity.label, &quantity.unit);
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
