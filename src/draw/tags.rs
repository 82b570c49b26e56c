//! Short names written on curves.

use super::label::{Measured, beside, on_line};
use super::svg::{Anchor, Point, Rect, Svg, Text};
use super::text::{Weight, width};

const SIZE: f64 = 11.0;

/// A curve and the name to write on it.
pub(super) struct Tagged {
    pub tag: String,
    pub colour: String,
    /// Its stretches, px.
    pub runs: Vec<Vec<Point>>,
}

/// Writes each name on its curve once, where few other curves pass and nothing else is written. A curve
/// too short gets it beside its beginning; one too crowded stays without.
pub(super) fn write(svg: &mut Svg, plot: Rect, curves: &[Tagged], taken: &mut Vec<Rect>) {
    let crowds: Vec<Vec<Point>> = curves
        .iter()
        .map(|c| c.runs.iter().flat_map(|run| spread(run)).collect())
        .collect();
    let inner = plot.grown(-3.0);
    for (i, curve) in curves.iter().enumerate() {
        if curve.tag.is_empty() {
            continue;
        }
        let size = (width(&curve.tag, Weight::Semibold, SIZE), SIZE);
        let others = |r: Rect| -> usize {
            let rest = crowds.iter().enumerate().filter(|(j, _)| *j != i);
            rest.map(|(_, c)| c.iter().filter(|p| r.contains(**p)).count())
                .sum()
        };
        let mut runs: Vec<Measured> = curve.runs.iter().map(|r| Measured::new(r)).collect();
        runs.sort_by(|a, b| b.total().total_cmp(&a.total()));
        let place = runs
            .iter()
            .find_map(|run| on_line(run, (0.0, run.total()), size, inner, taken, &others));
        let end = runs.first().map(|run| run.at(0.0));
        let centre = place.map(|p| p.centre).or_else(|| {
            // No room on it: beside its beginning.
            let covered = |r: Rect| taken.iter().filter(|t| t.overlaps(r)).count();
            let r = beside(end?, size, 9.0, inner, &|r| 20 * covered(r) + others(r));
            let middle = ((r.left + r.right) / 2.0, (r.top + r.bottom) / 2.0);
            (covered(r) == 0).then_some(middle)
        });
        let Some((x, y)) = centre else { continue };
        taken.push(
            Rect {
                left: x,
                top: y,
                right: x,
                bottom: y,
            }
            .grown(3.0 + 0.5 * size.0.max(size.1)),
        );
        svg.text(
            &Text::new((x, y + 0.36 * SIZE), &curve.tag, SIZE)
                .anchor(Anchor::Middle)
                .weight(Weight::Semibold)
                .fill(&curve.colour)
                .halo(4.0),
        );
    }
}

/// Points at most 4 px apart along a line.
fn spread(line: &[Point]) -> Vec<Point> {
    let measured = Measured::new(line);
    let n = (measured.total() / 4.0).floor() as usize;
    (0..=n).map(|k| measured.at(k as f64 * 4.0)).collect()
}
