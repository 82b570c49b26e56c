//! Bars of what each part adds to a sum, to the right where it is positive and to the left where it
//! is negative, and beside them each part's share of something else.

use super::axis::{Axis, Span};
use super::colour::{diverging, hex};
use super::frame::{self, Entry, MARGIN, Swatch, WIDTH};
use super::svg::{Anchor, GREY, INK, Rect, Svg, Text, open_path};
use super::text::{Weight, fit, fixed, tidy, width};

/// One part of the sum.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Contribution {
    /// Its name.
    pub name: String,
    /// What it adds, one value for each of [`Contributions::classes`].
    pub values: Vec<f64>,
    /// Its share, in the unit of [`Contributions::share`].
    pub share: f64,
}

/// The parts of a sum.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Contributions {
    /// The quantity the parts add up to.
    pub axis: Axis,
    /// Words at the negative and the positive end of its axis; may be empty.
    pub sides: (String, String),
    /// Legend texts of the classes of a part; at most three have a look of their own.
    pub classes: Vec<String>,
    /// From top to bottom.
    pub rows: Vec<Contribution>,
    /// Name of the sum, drawn below the parts.
    pub sum: String,
    /// The quantity of the second bars.
    pub share: Axis,
    /// What all shares add up to, the end of their axis.
    pub whole: f64,
}

const ROW: f64 = 17.0;
const BAR: f64 = 10.0;
const NAME_SIZE: f64 = 10.5;
const VALUE_SIZE: f64 = 9.5;
/// Room for the value at the end of a bar.
const VALUE: f64 = 48.0;
const SHARE: f64 = 150.0;
const GAP: f64 = 30.0;
const LONGEST: f64 = 130.0;
/// Part of the longest bar that can be seen.
const SEEN: f64 = 2e-3;

/// Fills of the classes: they differ in hue, in lightness and in pattern.
pub(super) fn fill(class: usize) -> String {
    match class {
        0 => hex(diverging(0.8)),
        1 => hex(diverging(-0.75)),
        _ => Svg::url("stripes"),
    }
}

fn style(class: usize) -> String {
    format!(
        "fill=\"{}\" stroke=\"{INK}\" stroke-width=\".6\"",
        fill(class)
    )
}

/// A value with as many decimals as tell it, and its sign.
fn signed(value: f64, largest: f64) -> String {
    let decimals = if largest >= 100.0 {
        0
    } else if largest >= 10.0 {
        1
    } else if largest >= 1.0 {
        2
    } else {
        3
    };
    let text = fixed(value, decimals);
    let zero = text.chars().all(|c| matches!(c, '0' | '.'));
    match value {
        _ if zero => "0".to_owned(),
        v if v > 0.0 => format!("+{text}"),
        _ => text,
    }
}

impl Contributions {
    fn net(row: &Contribution) -> f64 {
        row.values.iter().sum()
    }

    /// What stands at the positive and at the negative side of a row.
    fn reach(row: &Contribution) -> (f64, f64) {
        let sum = |side: f64| -> f64 {
            let those = row.values.iter().filter(|v| side * **v > 0.0);
            those.sum()
        };
        (sum(-1.0), sum(1.0))
    }

    /// Draws the bars from `top`; gives the y below their axes and legend.
    pub(super) fn draw(&self, svg: &mut Svg, top: f64) -> f64 {
        svg.define(&format!(
            "<pattern id=\"{}\" width=\"4\" height=\"4\" patternUnits=\"userSpaceOnUse\">\
             <path d=\"M0 0H4V4H0Z\" fill=\"#fff\"/><path d=\"M0 2H4\" stroke=\"{INK}\" \
             stroke-width=\"1.2\"/></pattern>",
            Svg::id("stripes")
        ));
        let total: f64 = self.rows.iter().map(Self::net).sum();
        let mut named: Vec<String> = self.rows.iter().map(|r| r.name.clone()).collect();
        named.push(self.sum.clone());
        let names: Vec<String> = named
            .iter()
            .map(|n| fit(&tidy(n), Weight::Regular, NAME_SIZE, LONGEST))
            .collect();
        let widest = names
            .iter()
            .map(|n| width(n, Weight::Semibold, NAME_SIZE))
            .fold(0.0, f64::max);
        let bottom = top + ROW * names.len() as f64 + 4.0;
        let right = WIDTH - MARGIN - 20.0;
        let plot = Rect {
            left: MARGIN + widest + 10.0,
            top,
            right: right - SHARE - GAP,
            bottom,
        };
        let shares = Rect {
            left: right - SHARE,
            right,
            ..plot
        };
        let (low, high) = self
            .rows
            .iter()
            .map(Self::reach)
            .chain([(total.min(0.0), total.max(0.0))])
            .fold((0.0_f64, 0.0_f64), |(a, b), (c, d)| (a.min(c), b.max(d)));
        let span = spanned(low, high, plot);
        let ticks = span.ticks(64.0);
        frame::grid(svg, plot, &ticks, &[], 0.11);
        let share_span = Span::new(
            0.0,
            self.whole,
            super::Scale::Linear,
            shares.left,
            shares.right - 34.0,
        );
        let largest = low.abs().max(high);
        let middle = |k: usize| top + 2.0 + ROW * (k as f64 + 0.5);
        for (k, row) in self.rows.iter().enumerate() {
            self.bar(svg, row, &span, middle(k));
            let (a, b) = Self::reach(row);
            value(svg, Self::net(row), (a, b), largest, &span, middle(k));
            share(svg, row.share, &share_span, middle(k));
        }
        let last = middle(self.rows.len());
        let rule = top + 2.0 + ROW * self.rows.len() as f64;
        svg.line(
            (MARGIN, rule),
            (plot.right, rule),
            &format!("stroke=\"{INK}\" stroke-width=\".8\""),
        );
        let body = bar_rect(&span, (total.min(0.0), total.max(0.0)), last);
        svg.path(&body.path(), "");
        value(
            svg,
            total,
            (total.min(0.0), total.max(0.0)),
            largest,
            &span,
            last,
        );
        for (k, name) in names.iter().enumerate() {
            let weight = match k == self.rows.len() {
                true => Weight::Semibold,
                false => Weight::Regular,
            };
            let at = (plot.left - 6.0, middle(k) + 0.36 * NAME_SIZE);
            let text = Text::new(at, name, NAME_SIZE).anchor(Anchor::End);
            svg.text(&text.weight(weight));
        }
        for (zero, rect) in [(span.at(0.0), plot), (share_span.at(0.0), shares)] {
            let line = open_path(&[(zero, rect.top), (zero, rect.bottom)]);
            svg.path(
                &line,
                &format!("fill=\"none\" stroke=\"{INK}\" stroke-width=\"1.2\""),
            );
        }
        self.axes(svg, (plot, &span), (shares, &share_span))
    }

    fn bar(&self, svg: &mut Svg, row: &Contribution, span: &Span, y: f64) {
        for side in [-1.0, 1.0] {
            let mut from = 0.0;
            for (class, v) in row
                .values
                .iter()
                .enumerate()
                .filter(|(_, v)| side * **v > 0.0)
            {
                let to = from + v;
                let body = bar_rect(span, (to.min(from), to.max(from)), y);
                from = to;
                if body.width() >= 0.3 {
                    svg.path(&body.path(), &style(class));
                }
            }
        }
    }

    /// Axes below both plots, then the legend.
    fn axes(&self, svg: &mut Svg, (plot, span): (Rect, &Span), second: (Rect, &Span)) -> f64 {
        let (shares, share_span) = second;
        for rect in [plot, shares] {
            svg.line(
                (rect.left, rect.bottom),
                (rect.right, rect.bottom),
                &format!("stroke=\"{INK}\""),
            );
        }
        frame::x_axis(svg, plot, &self.axis, &span.ticks(64.0));
        let below = frame::x_axis(svg, shares, &self.share, &share_span.ticks(40.0));
        let caption = below - 6.0;
        let (left, right) = (tidy(&self.sides.0), tidy(&self.sides.1));
        let word = |at, text| {
            let text = Text::new(at, text, NAME_SIZE);
            text.weight(Weight::Semibold).fill(GREY)
        };
        svg.text(&word((plot.left, caption), &left));
        svg.text(&word((plot.right, caption), &right).anchor(Anchor::End));
        let sides = self.rows.iter().map(Self::reach);
        let largest = sides.fold(0.0_f64, |m, (a, b)| m.max(-a).max(b));
        let used = |class: usize| {
            let mut rows = self.rows.iter();
            rows.any(|r| {
                r.values
                    .get(class)
                    .is_some_and(|v| v.abs() > SEEN * largest)
            })
        };
        let classes = self.classes.iter().enumerate().filter(|(k, _)| used(*k));
        let entries: Vec<Entry> = classes
            .map(|(k, label)| Entry {
                swatch: Swatch::Patch(vec![style(k)]),
                label: label.clone(),
            })
            .collect();
        frame::legend(svg, &entries, plot.left, below, right_room(plot))
    }
}

fn right_room(plot: Rect) -> f64 {
    WIDTH - MARGIN - plot.left
}

/// The values with room at both ends for numbers beside the bars.
fn spanned(low: f64, high: f64, plot: Rect) -> Span {
    let inner = plot.width() - 2.0 * VALUE;
    let range = if high > low { high - low } else { 1.0 };
    let room = range * VALUE / inner.max(1.0);
    Span::new(
        low - room,
        high + room,
        super::Scale::Linear,
        plot.left,
        plot.right,
    )
}

fn bar_rect(span: &Span, (from, to): (f64, f64), y: f64) -> Rect {
    Rect {
        left: span.at(from),
        right: span.at(to),
        top: y - BAR / 2.0,
        bottom: y + BAR / 2.0,
    }
}

/// The number beside a bar, at the end its sign points to.
fn value(svg: &mut Svg, net: f64, (low, high): (f64, f64), largest: f64, span: &Span, y: f64) {
    let (at, anchor) = match net < 0.0 {
        true => (span.at(low) - 5.0, Anchor::End),
        false => (span.at(high) + 5.0, Anchor::Start),
    };
    let text = signed(net, largest);
    if text == "0" {
        return;
    }
    svg.text(&Text::new((at, y + 0.36 * VALUE_SIZE), &text, VALUE_SIZE).anchor(anchor));
}

fn share(svg: &mut Svg, value: f64, span: &Span, y: f64) {
    let body = bar_rect(span, (0.0, value.max(0.0)), y);
    if body.width() >= 0.3 {
        let style = format!("fill=\"#b9bdc4\" stroke=\"{INK}\" stroke-width=\".6\"");
        svg.path(&body.path(), &style);
    }
    let text = match value {
        v if v >= 9.95 => fixed(v, 0),
        v if v >= 0.05 => fixed(v, 1),
        _ => return,
    };
    let at = (body.right + 5.0, y + 0.36 * VALUE_SIZE);
    svg.text(&Text::new(at, &text, VALUE_SIZE));
}
