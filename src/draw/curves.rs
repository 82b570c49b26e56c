//! The lines of a map: the neutral curve, iso-lines with their labels, lines of the second field.

use super::colour::Limit;
use super::contour::{lines, simplify};
use super::field::Field;
use super::label::{Measured, Place, on_line};
use super::map::StabilityMap;
use super::sheet::Sheet;
use super::style::{NEUTRAL_HALO, iso_style, neutral_style, second_style, signed};
use super::svg::{Anchor, Point, Rect, Svg, Text, open_path};
use super::text::{Weight, tick_labels, tidy, width};

/// Longest edge of a cell that contours are traced on, px.
const CELL: f64 = 2.5;
const LABEL_SIZE: f64 = 9.0;

/// A group of lines at one level.
struct Level {
    text: String,
    /// Of the second field, whose lines mean nothing without their label.
    second: bool,
    style: String,
    lines: Vec<Vec<Point>>,
}

pub(super) struct Curves {
    pub neutral: Vec<Vec<Point>>,
    thin: Vec<Level>,
    /// Points along every line, for keeping labels off them.
    crowd: Vec<Point>,
}

impl Curves {
    pub fn of(field: &Field, limit: &Limit, map: &StabilityMap, sheet: &Sheet) -> Self {
        let cell = (sheet.plot.width() / (field.columns.max(2) - 1) as f64)
            .max(sheet.plot.height() / (field.height().max(2) - 1) as f64);
        let fine = (cell / CELL).ceil().clamp(1.0, 64.0) as usize;
        let halves = field.halves();
        // Between two samples there is a step, in the middle of a part; lines would bundle there.
        let steps = halves.0 || halves.1;
        let fine = if steps { fine | 1 } else { fine };
        let trace = |field: &Field, level: f64, skip: &dyn Fn(usize, usize) -> bool| {
            lines(field, level, fine, skip)
                .iter()
                .map(|line| simplify(&sheet.place_all(line), 0.07))
                .collect::<Vec<_>>()
        };
        let whole: Vec<Vec<Option<f64>>> = map
            .values
            .iter()
            .enumerate()
            .map(|(j, row)| {
                let beyond = map.beyond.get(j);
                let beyond = |i: usize| beyond.and_then(|b| b.get(i)).copied().flatten();
                let values = row.iter().enumerate();
                values.map(|(i, v)| v.or_else(|| beyond(i))).collect()
            })
            .collect();
        let whole = Field::new(&whole).cut(&map.cuts.seams);
        let neutral = trace(&whole, 0.0, &|_, _| false);
        let mut thin = Vec::new();
        for level in limit.levels().into_iter().filter(|&l| l != 0.0 && !steps) {
            let lines = trace(field, level, &|_, _| false);
            thin.push(Level {
                text: signed(level, limit.step),
                second: false,
                style: iso_style(level),
                lines,
            });
        }
        // Of two samples cut apart, lines would be drawn from one alone.
        let coarse = steps || field.columns < 3 || field.height() < 3;
        if let Some(second) = map.frequency.as_ref().filter(|_| !coarse) {
            let unit = &second.unit;
            let second = Field::new(&second.values).cut(&map.cuts.seams);
            let (levels, jump) = second_levels(&second);
            let texts = tick_labels(&levels);
            for (&level, text) in levels.iter().zip(texts) {
                let jumps = |i: usize, j: usize| {
                    field.cell_range(i, j).is_none()
                        || second
                            .cell_range(i, j)
                            .is_none_or(|(low, high)| high - low > jump)
                };
                let mut lines = trace(&second, level, &jumps);
                // Scraps between two branches say nothing.
                lines.retain(|line| Measured::new(line).total() > 30.0);
                let text = format!("{text} {}", tidy(unit)).trim_end().to_string();
                thin.push(Level {
                    text,
                    second: true,
                    style: second_style(),
                    lines,
                });
            }
        }
        // The neutral curve counts four times: a label on it would hide what matters.
        let weighty = std::iter::repeat_n(&neutral, 4).flatten();
        let all = thin.iter().flat_map(|l| &l.lines).chain(weighty);
        let crowd = all.flat_map(|line| spread(line, 4.0)).collect();
        Curves {
            neutral,
            thin,
            crowd,
        }
    }

    pub fn crowding(&self, r: Rect) -> usize {
        self.crowd.iter().filter(|p| r.contains(**p)).count()
    }

    /// Draws the thin lines, each broken where its label goes, and gives the labels. A label covers
    /// none of `taken` and stands on `plain` points only, away from hatching and holes.
    pub fn draw_thin(
        &self,
        svg: &mut Svg,
        plot: Rect,
        taken: &mut Vec<Rect>,
        plain: impl Fn(Point) -> bool,
    ) -> Vec<LineLabel> {
        let inner = plot.grown(-4.0);
        let mut labels = Vec::new();
        for level in &self.thin {
            let w = width(&level.text, Weight::Regular, LABEL_SIZE);
            let mut data = String::new();
            for line in &level.lines {
                let measured = Measured::new(line);
                let total = measured.total();
                let parts = if total > 700.0 { 2.0 } else { 1.0 };
                let mut places: Vec<Place> = Vec::new();
                for k in 0..(parts as usize) {
                    if total < 2.2 * w {
                        continue;
                    }
                    let range = (total * k as f64 / parts, total * (k + 1) as f64 / parts);
                    let others = |r: Rect| {
                        let middle = ((r.left + r.right) / 2.0, (r.top + r.bottom) / 2.0);
                        let spots = [
                            middle,
                            (r.left, r.top),
                            (r.right, r.top),
                            (r.left, r.bottom),
                            (r.right, r.bottom),
                        ];
                        if !spots.into_iter().all(&plain) {
                            return usize::MAX;
                        }
                        // The line itself fills the box once over.
                        self.crowding(r).saturating_sub((w / 4.0) as usize)
                    };
                    let size = (w, LABEL_SIZE);
                    let place = on_line(&measured, range, size, inner, taken, &others);
                    if let Some(place) = place {
                        taken.push(place.bounds.grown(4.0));
                        places.push(place);
                        labels.push(LineLabel {
                            place,
                            text: level.text.clone(),
                            second: level.second,
                        });
                    }
                }
                if level.second && places.is_empty() {
                    continue;
                }
                for piece in measured.without(&places) {
                    data += &open_path(&piece);
                }
            }
            svg.path(&data, &level.style);
        }
        labels
    }

    pub fn draw_neutral(&self, svg: &mut Svg) {
        let data: String = self.neutral.iter().map(|line| open_path(line)).collect();
        svg.path(&data, NEUTRAL_HALO);
        svg.path(&data, &neutral_style());
    }
}

/// Points at most `gap` apart along a line.
fn spread(line: &[Point], gap: f64) -> Vec<Point> {
    let measured = Measured::new(line);
    let n = (measured.total() / gap).floor() as usize;
    (0..=n).map(|k| measured.at(k as f64 * gap)).collect()
}

pub(super) struct LineLabel {
    place: Place,
    text: String,
    /// Whether it stands on a line of the second field.
    pub second: bool,
}

impl LineLabel {
    pub fn draw(&self, svg: &mut Svg) {
        let turn = self.place.turn;
        let (sin, cos) = turn.to_radians().sin_cos();
        let drop = 0.36 * LABEL_SIZE;
        let at = (
            self.place.centre.0 - drop * sin,
            self.place.centre.1 + drop * cos,
        );
        svg.text(
            &Text::new(at, &self.text, LABEL_SIZE)
                .anchor(Anchor::Middle)
                .turn(turn)
                .halo(2.0),
        );
    }
}

/// Levels of the second field, about six of them, and the range of a cell that counts as a jump
/// between branches: far above the usual, and enough to bundle lines.
fn second_levels(field: &Field) -> (Vec<f64>, f64) {
    let rows = 0..field.height();
    let values: Vec<f64> = rows
        .flat_map(|j| (0..field.columns).filter_map(move |i| field.sample(i, j)))
        .collect();
    let low = values.iter().copied().fold(f64::INFINITY, f64::min);
    let high = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if values.is_empty() || high <= low {
        return (Vec::new(), 0.0);
    }
    let levels = super::axis::round_values(low, high, 9);
    let step = match levels.as_slice() {
        [a, b, ..] => b - a,
        _ => high - low,
    };
    let cells = (0..field.height()).flat_map(|j| (0..field.columns).map(move |i| (i, j)));
    let mut ranges: Vec<f64> = cells
        .filter_map(|(i, j)| field.cell_range(i, j).map(|(a, b)| b - a))
        .collect();
    ranges.sort_by(f64::total_cmp);
    let usual = ranges.get(ranges.len() / 2).copied().unwrap_or(0.0);
    (levels, (8.0 * usual).max(0.4 * step))
}
