//! Patches of a map: samples that belong together, their borders and their names.
//!
//! A border passes half-way between two samples of different patches. In a cell with two such edges it
//! joins their middles; where three or four patches meet, the first two edges are joined.

use super::contour::{Line, Links, simplify};
use super::map::StabilityMap;
use super::sheet::Sheet;
use super::style::patch_style;
use super::svg::{Anchor, Point, Rect, Svg, Text, open_path};
use super::text::{Weight, tidy, width};

/// Which patch each sample belongs to.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Patches {
    /// What a border means, for the legend.
    pub caption: String,
    /// Rows by y, columns by x: index into `names`.
    pub index: Vec<Vec<Option<usize>>>,
    /// Printed in each patch that has room for it.
    pub names: Vec<String>,
}

const SIZE: f64 = 9.0;
const HEIGHT: f64 = 11.0;

/// Longest way a border is taken aside from the stairs of its cells, px.
const STAIRS: f64 = 1.6;

impl Patches {
    fn at(&self, i: usize, j: usize) -> Option<usize> {
        self.index.get(j)?.get(i).copied().flatten()
    }

    fn size(&self) -> (usize, usize) {
        (self.index.first().map_or(0, Vec::len), self.index.len())
    }

    fn borders(&self) -> Vec<Line> {
        let (nx, ny) = self.size();
        let mut links = Links::new(nx, ny);
        let along_y = nx * ny;
        for j in 0..ny.saturating_sub(1) {
            for i in 0..nx.saturating_sub(1) {
                let corners = [
                    self.at(i, j),
                    self.at(i + 1, j),
                    self.at(i + 1, j + 1),
                    self.at(i, j + 1),
                ];
                let [Some(a), Some(b), Some(c), Some(d)] = corners else {
                    continue;
                };
                let (x, y) = (i as f64, j as f64);
                let edges = [
                    (a != b, j * nx + i, (x + 0.5, y)),
                    (b != c, along_y + j * nx + i + 1, (x + 1.0, y + 0.5)),
                    (d != c, (j + 1) * nx + i, (x + 0.5, y + 1.0)),
                    (a != d, along_y + j * nx + i, (x, y + 0.5)),
                ];
                let mut parted = edges.into_iter().filter(|e| e.0).map(|e| (e.1, e.2));
                if let (Some(p), Some(q)) = (parted.next(), parted.next()) {
                    links.link(p, q);
                }
            }
        }
        links.join()
    }

    /// Draws the borders; whether there are any.
    pub(super) fn draw_borders(&self, svg: &mut Svg, sheet: &Sheet) -> bool {
        let mut data = String::new();
        for line in self.borders() {
            let line = simplify(&sheet.place_all(&line), STAIRS);
            data += &open_path(&line);
        }
        svg.path(&data, &patch_style());
        !data.is_empty()
    }

    /// Writes each name into its patch where it covers nothing of `taken`.
    pub(super) fn draw_names(
        &self,
        svg: &mut Svg,
        sheet: &Sheet,
        taken: &mut Vec<Rect>,
        crowd: impl Fn(Rect) -> usize,
    ) {
        let depth = self.depths();
        for (k, name) in self.names.iter().enumerate() {
            let name = tidy(name);
            let half = 0.5 * width(&name, Weight::Regular, SIZE) + 2.0;
            let bounds = |(x, y): Point| Rect {
                left: x - half,
                top: y - 0.5 * HEIGHT,
                right: x + half,
                bottom: y + 0.5 * HEIGHT,
            };
            let mut best: Option<(f64, Point)> = None;
            for (j, row) in self.index.iter().enumerate() {
                for (i, &patch) in row.iter().enumerate() {
                    if patch != Some(k) {
                        continue;
                    }
                    let at = sheet.place((i as f64, j as f64));
                    let r = bounds(at);
                    if !sheet.plot.grown(-3.0).holds(r) || taken.iter().any(|t| t.overlaps(r)) {
                        continue;
                    }
                    let inside = [
                        (r.left, at.1),
                        (r.right, at.1),
                        (at.0, r.top),
                        (at.0, r.bottom),
                    ]
                    .into_iter()
                    .all(|p| {
                        let (i, j) = sheet.nearest(p);
                        self.at(i, j) == Some(k)
                    });
                    if !inside {
                        continue;
                    }
                    let depth = depth.get(j).and_then(|r| r.get(i)).copied().unwrap_or(0);
                    let score = f64::from(depth.min(40)) - 6.0 * crowd(r) as f64;
                    if best.is_none_or(|(s, _)| score > s) {
                        best = Some((score, at));
                    }
                }
            }
            if let Some((_, at)) = best {
                taken.push(bounds(at).grown(2.0));
                svg.text(
                    &Text::new((at.0, at.1 + 0.35 * SIZE), &name, SIZE)
                        .anchor(Anchor::Middle)
                        .halo(2.5),
                );
            }
        }
    }

    /// Samples between each sample and the nearest other patch, along rows and columns and across.
    fn depths(&self) -> Vec<Vec<u32>> {
        let (nx, ny) = self.size();
        let mut depth = vec![vec![0u32; nx]; ny];
        let get = |depth: &[Vec<u32>], i: usize, j: usize, own: Option<usize>| match self.at(i, j) {
            patch if patch == own => depth.get(j).and_then(|r| r.get(i)).copied().unwrap_or(0),
            _ => 0,
        };
        let mut pass = |forward: bool| {
            for jj in 0..ny {
                let j = if forward { jj } else { ny - 1 - jj };
                for ii in 0..nx {
                    let i = if forward { ii } else { nx - 1 - ii };
                    let own = self.at(i, j);
                    let (dx, dy) = if forward { (-1isize, -1isize) } else { (1, 1) };
                    let near = [(dx, 0), (0, dy), (dx, dy), (-dx, dy)];
                    let least = near
                        .into_iter()
                        .map(
                            |(a, b)| match (i.checked_add_signed(a), j.checked_add_signed(b)) {
                                (Some(i), Some(j)) if i < nx && j < ny => get(&depth, i, j, own),
                                _ => 0,
                            },
                        )
                        .min()
                        .unwrap_or(0);
                    if let Some(slot) = depth.get_mut(j).and_then(|r| r.get_mut(i)) {
                        *slot = if forward {
                            least + 1
                        } else {
                            (*slot).min(least + 1)
                        };
                    }
                }
            }
        };
        pass(true);
        pass(false);
        depth
    }
}

/// The patches of a map with a lone row or column doubled.
pub(super) fn doubled(map: &mut StabilityMap, column: bool, row: bool) {
    if let Some(patches) = &mut map.patches {
        if column {
            patches
                .index
                .iter_mut()
                .for_each(|r| r.extend_from_within(..));
        }
        if row {
            patches.index.extend_from_within(..);
        }
    }
}
