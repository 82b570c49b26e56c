//! A level over time and frequency, as an image with its colour bar.
//!
//! The scale is sequential: lightness falls throughout, so that it reads the same in grey print and to readers without
//! one kind of cone. Values below its lower end take its lightest colour.

use super::axis::{Axis, Span, check_samples};
use super::colour::{Rgb, hex, oklch};
use super::frame::{self, CAPTION_SIZE, MARGIN, TICK_SIZE, WIDTH};
use super::raster;
use super::sheet::ends;
use super::svg::{Anchor, INK, Rect, Svg, Text, px};
use super::text::{Weight, fit, tidy};
use super::{DrawError, Scale};

/// Everything the figure shows.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Waterfall {
    /// The finding, in a sentence.
    pub title: String,
    /// What was computed; may be empty.
    pub subtitle: String,
    /// Small print; may be empty.
    pub footnote: String,
    /// The axis of time.
    pub x: Axis,
    /// Middles of the columns, evenly spaced and rising.
    pub x_values: Vec<f64>,
    /// The axis of frequency.
    pub y: Axis,
    /// Middles of the rows, evenly spaced and rising.
    pub y_values: Vec<f64>,
    /// Levels, a column for each time with a value for each frequency.
    pub columns: Vec<Vec<f64>>,
    /// What a level is.
    pub level: Axis,
    /// Lowest and highest level with a colour of its own.
    pub range: (f64, f64),
}

/// Colours of the scale.
const STEPS: usize = 64;

/// Height of the plot (px), and most rows and columns of the image.
const HEIGHT: f64 = 360.0;
const MOST: usize = 360;

fn colour(t: f64) -> Rgb {
    oklch(
        0.98 - 0.74 * t,
        0.02 + 0.12 * (std::f64::consts::PI * t).sin(),
        100.0 + 190.0 * t,
    )
}

/// Largest of neighbouring values, so that no line is lost where there are more values than pixels.
fn pooled(values: &[f64], n: usize) -> Vec<f64> {
    let part = |i: usize| i * values.len() / n;
    (0..n)
        .map(|i| {
            let part = values
                .get(part(i)..part(i + 1).max(part(i) + 1))
                .unwrap_or_default();
            part.iter().copied().fold(f64::NEG_INFINITY, f64::max)
        })
        .collect()
}

/// The range of an axis of evenly spaced cells.
fn rim(middles: &[f64]) -> (f64, f64) {
    let (first, last) = ends(middles);
    let half = match middles.len() {
        0 | 1 => 0.5 * first.abs().max(1.0),
        n => 0.5 * (last - first) / (n - 1) as f64,
    };
    (first - half, last + half)
}

fn check(figure: &Waterfall) -> Result<(), DrawError> {
    check_samples("the x axis", &figure.x_values, Scale::Linear)?;
    check_samples("the y axis", &figure.y_values, Scale::Linear)?;
    let fits = |what: String, found: usize, expected: usize| match found == expected {
        true => Ok(()),
        false => Err(DrawError::Shape {
            what,
            found,
            expected,
        }),
    };
    fits(
        "columns".into(),
        figure.columns.len(),
        figure.x_values.len(),
    )?;
    for (i, column) in figure.columns.iter().enumerate() {
        fits(format!("column {i}"), column.len(), figure.y_values.len())?;
        if let Some((row, value)) = column.iter().enumerate().find(|(_, v)| v.is_nan()) {
            return Err(DrawError::NotFinite {
                what: "levels",
                row,
                column: i,
                value: *value,
            });
        }
    }
    let (low, high) = figure.range;
    if !(low.is_finite() && high.is_finite() && low < high) {
        return Err(DrawError::Samples {
            axis: "the levels",
            index: 1,
            value: high,
        });
    }
    Ok(())
}

/// Draws the figure.
///
/// # Errors
/// Where the arrays do not fit each other or hold something that cannot be placed.
pub fn render(figure: &Waterfall) -> Result<String, DrawError> {
    check(figure)?;
    let mut svg = Svg::default();
    let top = frame::header(&mut svg, &figure.title, &figure.subtitle);
    let (y0, y1) = rim(&figure.y_values);
    let (x0, x1) = rim(&figure.x_values);
    let (low, high) = figure.range;
    let bar = Span::new(low, high, Scale::Linear, top + HEIGHT, top).ticks(36.0);
    let right = WIDTH - MARGIN - CAPTION_SIZE - frame::widest(&bar) - 50.0;
    let y = Span::new(y0, y1, Scale::Linear, top + HEIGHT, top);
    let y_ticks = y.ticks(36.0);
    let plot = Rect {
        left: frame::left_space(&y_ticks),
        top,
        right,
        bottom: top + HEIGHT,
    };
    let x_ticks = Span::new(x0, x1, Scale::Linear, plot.left, plot.right).ticks(70.0);

    let (width, height) = (
        figure.x_values.len().min(MOST),
        figure.y_values.len().min(MOST),
    );
    let tall: Vec<Vec<f64>> = figure.columns.iter().map(|c| pooled(c, height)).collect();
    let rows: Vec<Vec<f64>> = (0..height)
        .rev()
        .map(|j| {
            let row: Vec<f64> = tall
                .iter()
                .map(|c| c.get(j).copied().unwrap_or(low))
                .collect();
            pooled(&row, width)
        })
        .collect();
    let entry = |v: &f64| {
        let t = ((v - low) / (high - low)).clamp(0.0, 1.0);
        ((t * STEPS as f64) as usize).min(STEPS - 1) as u8 + 1
    };
    let pixels: Vec<u8> = rows.iter().flatten().map(entry).collect();
    let palette: Vec<Rgb> = (0..STEPS)
        .map(|i| colour((i as f64 + 0.5) / STEPS as f64))
        .collect();
    let uri = raster::image_uri(&pixels, &palette, width, height)?;
    svg.raw(&format!(
        "<image x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\" preserveAspectRatio=\"none\" \
         image-rendering=\"optimizeSpeed\" href=\"{uri}\"/>",
        px(plot.left),
        px(plot.top),
        px(plot.width()),
        px(plot.height())
    ));
    frame::y_axis(&mut svg, plot, &figure.y, &y_ticks);
    let below = frame::x_axis(&mut svg, plot, &figure.x, &x_ticks);
    colour_bar(&mut svg, figure, plot, &bar);
    let height = frame::footnote(&mut svg, &figure.footnote, below + 4.0);
    Ok(svg.finish(WIDTH, height, &tidy(&figure.title)))
}

fn colour_bar(svg: &mut Svg, figure: &Waterfall, plot: Rect, ticks: &[super::axis::Tick]) {
    let body = Rect {
        left: plot.right + 16.0,
        right: plot.right + 30.0,
        ..plot
    };
    let stop = |k: i32| {
        let t = f64::from(k) / 16.0;
        format!(
            "<stop offset=\"{:.4}\" stop-color=\"{}\"/>",
            1.0 - t,
            hex(colour(t))
        )
    };
    let stops: String = (0..=16).rev().map(stop).collect();
    let id = Svg::id("level");
    svg.define(&format!(
        "<linearGradient id=\"{id}\" x2=\"0\" y2=\"1\">{stops}</linearGradient>"
    ));
    svg.path(&body.path(), &format!("fill=\"{}\"", Svg::url("level")));
    svg.path(&body.path(), &format!("fill=\"none\" stroke=\"{INK}\""));
    for tick in ticks {
        svg.line(
            (body.right, tick.at),
            (body.right + 4.0, tick.at),
            &format!("stroke=\"{INK}\""),
        );
        let at = (body.right + 8.0, tick.at + 0.36 * TICK_SIZE);
        svg.text(&Text::new(at, &tick.label, TICK_SIZE));
    }
    let caption = fit(
        &figure.level.caption(),
        Weight::Regular,
        CAPTION_SIZE,
        plot.height() + 30.0,
    );
    let at = (WIDTH - MARGIN, (plot.top + plot.bottom) / 2.0);
    svg.text(
        &Text::new(at, &caption, CAPTION_SIZE)
            .anchor(Anchor::Middle)
            .turn(-90.0),
    );
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_scale_darkens_throughout() {
        // Relative luminance of sRGB (IEC 61966-2-1).
        let luminance = |[r, g, b]: Rgb| {
            let linear = |v: u8| ((f64::from(v) / 255.0 + 0.055) / 1.055).powf(2.4);
            0.2126 * linear(r) + 0.7152 * linear(g) + 0.0722 * linear(b)
        };
        let all: Vec<f64> = (0..=32)
            .map(|i| luminance(colour(f64::from(i) / 32.0)))
            .collect();
        assert!(all.windows(2).all(|w| w[1] < w[0]), "{all:?}");
    }

    #[test]
    fn no_line_is_lost_in_pooling() {
        let mut values = vec![0.0; 1000];
        values[777] = 5.0;
        for n in [1, 7, 360, 999] {
            assert!(pooled(&values, n).contains(&5.0), "{n}");
        }
    }
}
