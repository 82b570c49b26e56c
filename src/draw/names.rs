//! Names above a drawing, each with a leader to what it names, none over another.
//!
//! Where each name wants to stand at `w_i` and neighbours need the distance `d_i`, the places
//! `x_i` are the least squares of `x_i - w_i` under `x_(i+1) - x_i >= d_i`. With
//! `y_i = x_i - (d_0 + .. + d_(i-1))` that is monotone regression of `y`, solved by pooling
//! adjacent violators (Barlow et al. 1972, "Statistical inference under order restrictions").

use super::frame::{MARGIN, WIDTH};
use super::svg::{Anchor, GREY, Point, Svg, Text, open_path};
use super::text::{CAP_HEIGHT, Weight, fit, tidy, width};

/// Size of the names (px).
pub(super) const SIZE: f64 = 10.0;
/// Longest name before it is cut (px).
const LONGEST: f64 = 120.0;
/// Farthest that a level name may stand from what it names before all names are turned (px).
const FARTHEST: f64 = 42.0;
/// Turns of names that do not fit side by side, from the most readable to the narrowest (degrees).
const TURNS: [f64; 3] = [-52.0, -68.0, -90.0];
/// Height of the leaders between names and drawing (px).
const LEADER: f64 = 16.0;

/// A name, and the point its leader ends at.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Name {
    pub text: String,
    pub at: Point,
}

/// Names laid out, not yet drawn.
pub(super) struct Row {
    names: Vec<Name>,
    places: Vec<f64>,
    /// Degrees.
    turn: f64,
    /// Height that names and leaders need above the drawing (px).
    pub height: f64,
}

impl Row {
    /// Lays out names between `left` and the canvas's right margin, in order of their points.
    pub fn new(mut names: Vec<Name>, left: f64) -> Row {
        for name in &mut names {
            name.text = fit(&tidy(&name.text), Weight::Regular, SIZE, LONGEST);
        }
        names.retain(|n| !n.text.is_empty());
        names.sort_by(|a, b| a.at.0.total_cmp(&b.at.0));
        let wanted: Vec<f64> = names.iter().map(|n| n.at.0).collect();
        let sizes: Vec<f64> = names
            .iter()
            .map(|n| width(&n.text, Weight::Regular, SIZE))
            .collect();
        let right = WIDTH - MARGIN;
        let half: Vec<f64> = sizes.iter().map(|w| w / 2.0).collect();
        let gaps = |size: &dyn Fn(usize) -> f64| -> Vec<f64> {
            (1..names.len()).map(|i| size(i - 1) + size(i)).collect()
        };
        let half_of = |i: usize| half.get(i).copied().unwrap_or(0.0) + 5.0;
        let low: Vec<f64> = half.iter().map(|h| left + h).collect();
        let high: Vec<f64> = half.iter().map(|h| right - h).collect();
        let level = spread(&wanted, &gaps(&half_of), &low, &high);
        let astray = level
            .iter()
            .zip(&wanted)
            .map(|(x, w)| (x - w).abs())
            .fold(0.0, f64::max);
        let crowded = gaps(&half_of).iter().sum::<f64>() > right - left;
        if !crowded && astray <= FARTHEST {
            let height = if names.is_empty() {
                0.0
            } else {
                SIZE + LEADER + 4.0
            };
            return Row {
                names,
                places: level,
                turn: 0.0,
                height,
            };
        }
        // The bottoms of turned names must be this far apart along the drawing.
        let distance = |turn: f64| 1.15 * SIZE / turn.to_radians().sin().abs();
        let room = right - SIZE - left;
        let fitting = TURNS
            .into_iter()
            .find(|&t| distance(t) * names.len() as f64 <= room);
        let Some(turn) = fitting else {
            let most = (room / distance(-90.0)).max(1.0) as usize;
            return Row::new(thinned(names, most), left);
        };
        let (sin, cos) = turn.to_radians().sin_cos();
        let distance = distance(turn);
        let low = vec![left; names.len()];
        let high: Vec<f64> = sizes.iter().map(|w| right - w * cos - SIZE).collect();
        let places = spread(&wanted, &gaps(&|_| distance / 2.0), &low, &high);
        let longest = sizes.iter().copied().fold(0.0, f64::max);
        Row {
            names,
            places,
            turn,
            height: longest * sin.abs() + SIZE * cos + LEADER,
        }
    }

    /// Draws the names over a drawing whose top is at `top`.
    pub fn draw(&self, svg: &mut Svg, top: f64) {
        let foot = top - LEADER;
        let mut leaders = String::new();
        for (name, &x) in self.names.iter().zip(&self.places) {
            leaders += &open_path(&[
                (x, foot + 2.0),
                (x, foot + 4.0),
                (name.at.0, top - 2.0),
                name.at,
            ]);
        }
        let thin = "fill=\"none\" stroke=\"#8b9098\" stroke-width=\".7\"";
        svg.path(&leaders, thin);
        for (name, &x) in self.names.iter().zip(&self.places) {
            let text = Text::new((x, foot), &name.text, SIZE).fill(GREY);
            if self.turn != 0.0 {
                let shifted = (x + 0.5 * CAP_HEIGHT * SIZE, foot - 1.0);
                svg.text(&Text {
                    at: shifted,
                    ..text.turn(self.turn)
                });
            } else {
                svg.text(&text.anchor(Anchor::Middle));
            }
        }
    }
}

/// `most` names of more, evenly chosen; the others stay without a name.
fn thinned(names: Vec<Name>, most: usize) -> Vec<Name> {
    let all = names.len();
    let kept = |i: &usize| i * most / all != (i + 1) * most / all;
    let names = names.into_iter().enumerate();
    names.filter(|(i, _)| kept(i)).map(|(_, n)| n).collect()
}

/// Places nearest to the wanted ones, in order, at least the gaps apart, within the bounds as far
/// as those leave room.
fn spread(wanted: &[f64], gaps: &[f64], low: &[f64], high: &[f64]) -> Vec<f64> {
    let mut offset = 0.0;
    let offsets: Vec<f64> = std::iter::once(0.0)
        .chain(gaps.iter().map(|g| {
            offset += g;
            offset
        }))
        .take(wanted.len())
        .collect();
    // Blocks of equal `y`: their sum and size.
    let mut blocks: Vec<(f64, usize)> = Vec::new();
    for (w, o) in wanted.iter().zip(&offsets) {
        let mut block = (w - o, 1);
        while let Some(&(sum, n)) = blocks.last() {
            if sum * block.1 as f64 <= block.0 * n as f64 {
                break;
            }
            block = (block.0 + sum, block.1 + n);
            blocks.pop();
        }
        blocks.push(block);
    }
    let mut y: Vec<f64> = blocks
        .iter()
        .flat_map(|&(sum, n)| std::iter::repeat_n(sum / n as f64, n))
        .collect();
    let mut least = f64::NEG_INFINITY;
    for ((y, l), o) in y.iter_mut().zip(low).zip(&offsets) {
        least = least.max(l - o);
        *y = y.max(least);
    }
    let mut most = f64::INFINITY;
    for ((y, h), o) in y.iter_mut().zip(high).zip(&offsets).rev() {
        most = most.min(h - o);
        *y = y.min(most);
    }
    y.iter().zip(&offsets).map(|(y, o)| y + o).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn names_keep_their_distance_and_stay_inside(
            mut wanted in proptest::collection::vec(0.0..600.0f64, 1..25),
            gap in 1.0..24.0f64,
        ) {
            wanted.sort_by(f64::total_cmp);
            let n = wanted.len();
            let x = spread(&wanted, &vec![gap; n - 1], &vec![0.0; n], &vec![600.0; n]);
            for pair in x.windows(2) {
                prop_assert!(pair[1] - pair[0] >= gap - 1e-9);
            }
            prop_assert!(x[0] >= -1e-9 && x[n - 1] <= 600.0 + 1e-9);
            // Names that do not crowd stay where they want to be.
            if wanted.windows(2).all(|p| p[1] - p[0] >= gap) {
                for (x, w) in x.iter().zip(&wanted) {
                    prop_assert!((x - w).abs() < 1e-9);
                }
            }
        }
    }
}
