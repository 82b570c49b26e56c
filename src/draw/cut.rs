//! Cuts of a map: lines across which the field does not go on.
//!
//! A cut is a straight line that stays between two columns of samples. Beside it a value comes from its own side alone.

use super::mark::Mark;
use super::sheet::Sheet;
use super::style::{CUT_CORE, cut_style};
use super::svg::{INK, Svg, open_path};

/// A straight line between two columns, in sample positions (column, row).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Seam {
    /// The column before it.
    pub column: usize,
    /// Its lower end.
    pub from: (f64, f64),
    /// Its upper end.
    pub to: (f64, f64),
}

impl Seam {
    /// Its column position at a row position it passes.
    pub(super) fn at(&self, v: f64) -> Option<f64> {
        let ((u0, v0), (u1, v1)) = (self.from, self.to);
        if !(v0..=v1).contains(&v) {
            return None;
        }
        let t = if v1 > v0 { (v - v0) / (v1 - v0) } else { 0.0 };
        Some(u0 + t * (u1 - u0))
    }
}

/// All cuts of a map with the points they begin at.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Cuts {
    /// What a cut is, for the legend.
    pub caption: String,
    /// What a point is, for the legend.
    pub point_caption: String,
    /// The cuts.
    pub seams: Vec<Seam>,
    /// The points, in sample positions.
    pub points: Vec<(f64, f64)>,
}

impl Cuts {
    pub(super) fn draw(&self, svg: &mut Svg, sheet: &Sheet) {
        let data: String = self
            .seams
            .iter()
            .map(|s| open_path(&sheet.place_all(&[s.from, s.to])))
            .collect();
        svg.path(&data, &cut_style());
        svg.path(&data, CUT_CORE);
    }

    pub(super) fn draw_points(&self, svg: &mut Svg, sheet: &Sheet) {
        for &point in &self.points {
            Mark::Diamond.draw(svg, sheet.place(point), INK);
        }
    }
}
