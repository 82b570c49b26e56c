//! A chain of passages drawn to scale along an axis, with symbols for what has no length.
//!
//! One px stands for the same length along and across, unless the passages would come out too flat
//! or too tall: then widths are stretched by a round factor, which the drawing says.

use super::axis::Span;
use super::colour::{diverging, hex};
use super::frame::MARGIN;
use super::names::{self, Name};
use super::svg::{Anchor, GREY, INK, Point, Rect, Svg, Text, closed_path, open_path, px};
use super::text::{Weight, tidy, width};

/// A passage of constant width.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Passage {
    /// Its name.
    pub name: String,
    /// Where it begins.
    pub from: f64,
    /// Where it ends.
    pub to: f64,
    /// Its width, in the unit of the axis.
    pub width: f64,
    /// Whether it is tinted.
    pub tinted: bool,
}

/// What stands at one place of a chain.
#[derive(Debug, Clone, PartialEq)]
pub struct Plane {
    /// Its name.
    pub name: String,
    /// Where.
    pub at: f64,
    /// Width of what it stands in, in the unit of the axis.
    pub width: f64,
    /// Its symbol.
    pub symbol: Symbol,
}

/// The symbol of a plane. None is to scale.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Symbol {
    /// Nothing but the step of the walls.
    Step,
    /// A zigzag across the passage.
    Flame,
    /// Two wedges from the walls, which leave a part of the width free.
    Pinch {
        /// The part left free, 0 to 1.
        free: f64,
    },
    /// A box wider than what adjoins it.
    Vessel,
}

/// How a chain ends.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum EndSymbol {
    /// A wall.
    #[default]
    Wall,
    /// Flared lips.
    Opening,
    /// Two wedges down to a throat.
    Nozzle,
    /// A wide room.
    Room,
    /// Teeth that swallow sound.
    Absorber,
    /// A double line.
    Sheet,
}

/// An end and what is written at it.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ChainEnd {
    /// Written below the end.
    pub name: String,
    /// Its symbol.
    pub symbol: EndSymbol,
}

/// A chain of passages along the x axis of a figure.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Chain {
    /// From left to right.
    pub passages: Vec<Passage>,
    /// From left to right, in the order of the chain where several stand at one place.
    pub planes: Vec<Plane>,
    /// Its left and its right end.
    pub ends: (ChainEnd, ChainEnd),
    /// The greatest width in words, written at a bar of that length; may be empty.
    pub widest: String,
}

/// Where the chain is drawn.
pub(super) struct Ground<'a> {
    pub x: &'a Span,
    pub plot: Rect,
}

/// Half of the greatest width that is drawn, and the factor by which widths are stretched.
pub(super) struct Stretch {
    pub half: f64,
    per_unit: f64,
    factor: f64,
}

const FLATTEST: f64 = 26.0;
const TALLEST: f64 = 110.0;
/// Shift of each further symbol at one place (px), so that none hides another.
const SHIFT: f64 = 7.0;
/// How far symbols stand out above the passages (px).
const CROWN: f64 = 9.0;
const NOTE_SIZE: f64 = 9.5;
/// Fill of passages that are not tinted.
pub(super) const PLAIN: &str = "#eef0f3";

impl Chain {
    /// First and last place.
    pub(super) fn extent(&self) -> (f64, f64) {
        let first = self.passages.first().map_or(0.0, |p| p.from);
        let last = self.passages.last().map_or(1.0, |p| p.to);
        (first, last)
    }

    /// Space that the bar of the greatest width needs left of the plot.
    pub(super) fn left_space(&self) -> f64 {
        let words = width(&tidy(&self.widest), Weight::Regular, NOTE_SIZE);
        MARGIN + words + 30.0
    }

    pub(super) fn stretch(&self, x: &Span) -> Stretch {
        let widest = self.passages.iter().map(|p| p.width).fold(0.0, f64::max);
        let per_unit = (x.at(1.0) - x.at(0.0)).abs();
        let natural = widest * per_unit;
        let fits = |f: &f64| (FLATTEST..=TALLEST).contains(&(f * natural));
        let round = [
            1.0, 2.0, 3.0, 5.0, 10.0, 20.0, 0.5, 0.2, 0.1, 50.0, 100.0, 0.05,
        ];
        let factor = match round.into_iter().find(fits) {
            Some(f) => f,
            None if natural > 0.0 => 60.0 / natural,
            None => 1.0,
        };
        Stretch {
            half: 0.5 * factor * natural,
            per_unit,
            factor,
        }
    }

    /// Names of what does not name itself inside its outline, with where their leaders end.
    pub(super) fn names(&self, x: &Span, middle: f64, s: &Stretch) -> Vec<Name> {
        let passages = self.passages.iter().filter(|p| !self.named_inside(p, x, s));
        let passages = passages.map(|p| Name {
            text: p.name.clone(),
            at: (x.at((p.from + p.to) / 2.0), middle - s.half_of(p.width)),
        });
        let planes = self.shifted(x).map(|(p, at)| Name {
            text: p.name.clone(),
            at: (at, middle - self.top_of(p, s)),
        });
        passages.chain(planes).collect()
    }

    /// Planes with their px, further ones at the same place a little to the right.
    fn shifted(&self, x: &Span) -> impl Iterator<Item = (&Plane, f64)> {
        let mut last = f64::NEG_INFINITY;
        let mut shift = 0.0;
        self.planes.iter().map(move |p| {
            shift = if p.at == last { shift + SHIFT } else { 0.0 };
            last = p.at;
            (p, x.at(p.at) + shift)
        })
    }

    fn beside(&self, at: f64) -> (f64, f64) {
        let before = self.passages.iter().rev().find(|p| p.from < at);
        let behind = self.passages.iter().find(|p| p.to > at);
        let width = |p: Option<&Passage>| p.map_or(0.0, |p| p.width);
        (width(before), width(behind))
    }

    fn top_of(&self, plane: &Plane, s: &Stretch) -> f64 {
        let (before, behind) = self.beside(plane.at);
        match plane.symbol {
            Symbol::Vessel => s.half_of(before.max(behind)).max(8.0) + CROWN,
            Symbol::Step => s.half_of(before.min(behind)),
            Symbol::Flame | Symbol::Pinch { .. } => s.half_of(plane.width),
        }
    }

    fn named_inside(&self, p: &Passage, x: &Span, s: &Stretch) -> bool {
        let room = x.at(p.to) - x.at(p.from) - 34.0;
        let name = width(&tidy(&p.name), Weight::Regular, names::SIZE);
        name <= room && 2.0 * s.half_of(p.width) >= 15.0
    }

    /// Draws everything but the names above; `top` is where the drawing begins. Gives the y below.
    pub(super) fn draw(&self, svg: &mut Svg, ground: &Ground, top: f64, s: &Stretch) -> f64 {
        let x = ground.x;
        let middle = top + s.half + CROWN;
        for p in &self.passages {
            let half = s.half_of(p.width);
            let body = Rect {
                left: x.at(p.from),
                right: x.at(p.to),
                top: middle - half,
                bottom: middle + half,
            };
            let fill = if p.tinted { tint() } else { PLAIN.into() };
            svg.path(&body.path(), &format!("fill=\"{fill}\""));
        }
        for side in [-1.0, 1.0] {
            let wall: Vec<Point> = self
                .passages
                .iter()
                .flat_map(|p| {
                    let y = middle + side * s.half_of(p.width);
                    [(x.at(p.from), y), (x.at(p.to), y)]
                })
                .collect();
            let style = "fill=\"none\" stroke-width=\"1.4\" stroke-linejoin=\"round\"";
            svg.path(&open_path(&wall), &format!("{style} stroke=\"{INK}\""));
        }
        for p in self.passages.iter().filter(|p| self.named_inside(p, x, s)) {
            let at = (x.at((p.from + p.to) / 2.0), middle + 0.36 * names::SIZE);
            let name = tidy(&p.name);
            svg.text(&Text::new(at, &name, names::SIZE).anchor(Anchor::Middle));
        }
        for (plane, at) in self.shifted(x) {
            self.symbol(svg, plane, at, middle, s);
        }
        let (first, last) = (self.passages.first(), self.passages.last());
        let half = |p: Option<&Passage>| p.map_or(0.0, |p| s.half_of(p.width));
        end(
            svg,
            self.ends.0.symbol,
            (x.at(self.extent().0), middle),
            half(first),
            -1.0,
        );
        end(
            svg,
            self.ends.1.symbol,
            (x.at(self.extent().1), middle),
            half(last),
            1.0,
        );
        self.measure(svg, ground.plot.left, middle, s);
        self.below(svg, ground.plot, middle + s.half + CROWN, s)
    }

    fn symbol(&self, svg: &mut Svg, plane: &Plane, at: f64, middle: f64, s: &Stretch) {
        let half = s.half_of(plane.width);
        match plane.symbol {
            Symbol::Step => {}
            Symbol::Flame => {
                let teeth = ((half / 3.5).round() as usize).clamp(2, 12);
                let front: Vec<Point> = (0..=2 * teeth)
                    .map(|k| {
                        let y = middle - half + half * k as f64 / teeth as f64;
                        (at + if k % 2 == 0 { -2.5 } else { 3.5 }, y)
                    })
                    .collect();
                let front = open_path(&front);
                let halo = "fill=\"none\" stroke=\"#fff\" stroke-width=\"4.4\"";
                svg.path(&front, halo);
                let style = format!(
                    "fill=\"none\" stroke=\"{}\" stroke-width=\"2.2\" stroke-linejoin=\"round\"",
                    flame_colour()
                );
                svg.path(&front, &style);
            }
            Symbol::Pinch { free } => {
                let free = half * free.clamp(0.0, 0.85);
                for side in [-1.0, 1.0] {
                    let wedge = [
                        (at - 4.5, middle + side * half),
                        (at + 4.5, middle + side * half),
                        (at, middle + side * free),
                    ];
                    svg.path(&closed_path(&wedge), "");
                }
            }
            Symbol::Vessel => {
                let half = self.top_of(plane, s);
                svg.raw(&format!(
                    "<rect x=\"{}\" y=\"{}\" width=\"22\" height=\"{}\" rx=\"5\" fill=\"#fff\" \
                     stroke=\"{INK}\" stroke-width=\"1.6\"/>",
                    px(at - 11.0),
                    px(middle - half),
                    px(2.0 * half)
                ));
            }
        }
    }

    /// A bar as long as the greatest width, left of the drawing.
    fn measure(&self, svg: &mut Svg, left: f64, middle: f64, s: &Stretch) {
        if self.widest.is_empty() {
            return;
        }
        let x = left - 22.0;
        let mut bar = open_path(&[(x, middle - s.half), (x, middle + s.half)]);
        for side in [-1.0, 1.0] {
            let y = middle + side * s.half;
            bar += &open_path(&[(x - 3.0, y), (x + 3.0, y)]);
        }
        svg.path(
            &bar,
            &format!("fill=\"none\" stroke=\"{GREY}\" stroke-width=\".9\""),
        );
        let words = tidy(&self.widest);
        let text = Text::new((x - 6.0, middle), &words, NOTE_SIZE).fill(GREY);
        if width(&words, Weight::Regular, NOTE_SIZE) <= 2.0 * (s.half + CROWN) {
            svg.text(&text.anchor(Anchor::Middle).turn(-90.0));
        } else {
            let at = (x - 6.0, middle + 0.36 * NOTE_SIZE);
            svg.text(&Text {
                at,
                ..text.anchor(Anchor::End)
            });
        }
    }

    /// What is written at the ends, and the scale between.
    fn below(&self, svg: &mut Svg, plot: Rect, bottom: f64, s: &Stretch) -> f64 {
        let y = bottom + NOTE_SIZE + 3.0;
        let (left, right) = (tidy(&self.ends.0.name), tidy(&self.ends.1.name));
        let at_left = (plot.left - 12.0, y);
        svg.text(&Text::new(at_left, &left, names::SIZE).fill(GREY));
        let text = Text::new((plot.right + 12.0, y), &right, names::SIZE);
        svg.text(&text.fill(GREY).anchor(Anchor::End));
        let note = match s.factor {
            1.0 => "drawn to scale, symbols are not".to_owned(),
            f if f > 1.0 => format!("widths {f:.0} times enlarged, symbols not to scale"),
            f => format!("widths {:.0} times reduced, symbols not to scale", 1.0 / f),
        };
        let at = ((plot.left + plot.right) / 2.0, y);
        let text = Text::new(at, &note, NOTE_SIZE).anchor(Anchor::Middle);
        svg.text(&text.fill(GREY));
        y + 6.0
    }
}

impl Stretch {
    fn half_of(&self, width: f64) -> f64 {
        0.5 * self.factor * self.per_unit * width
    }

    /// Height of the drawing, from the top of the highest symbol to the foot of the lowest (px).
    pub fn middle(&self, top: f64) -> f64 {
        top + self.half + CROWN
    }
}

/// Colour of flames and of the lines that mark them.
pub(super) fn flame_colour() -> String {
    hex(diverging(0.8))
}

/// Fill of tinted passages.
pub(super) fn tint() -> String {
    hex(diverging(0.0))
}

fn end(svg: &mut Svg, symbol: EndSymbol, (x, y): Point, half: f64, out: f64) {
    let at = |along: f64, across: f64| (x + out * along, y + across);
    let line = format!("fill=\"none\" stroke=\"{INK}\" stroke-width=\"1.4\"");
    match symbol {
        EndSymbol::Wall => {
            let wall = [at(1.5, -half - 3.0), at(1.5, half + 3.0)];
            let thick = format!("fill=\"none\" stroke=\"{INK}\" stroke-width=\"3.4\"");
            svg.path(&open_path(&wall), &thick);
            let n = ((half / 3.0) as usize).clamp(2, 9);
            let strokes: String = (0..=n)
                .map(|k| {
                    let across = -half + 2.0 * half * k as f64 / n as f64;
                    open_path(&[at(3.0, across), at(8.0, across + 4.0)])
                })
                .collect();
            svg.path(
                &strokes,
                &format!("fill=\"none\" stroke=\"{INK}\" stroke-width=\".8\""),
            );
        }
        EndSymbol::Opening => {
            let lip = |side: f64| open_path(&[at(0.0, side * half), at(7.0, side * (half + 5.0))]);
            svg.path(&(lip(-1.0) + &lip(1.0)), &line);
            let mouth = open_path(&[at(0.0, -half), at(0.0, half)]);
            let thin = format!("{line} stroke-dasharray=\"2 2\"");
            svg.path(&mouth, &thin.replace("1.4", ".8"));
        }
        EndSymbol::Nozzle => {
            for side in [-1.0, 1.0] {
                let wedge = [
                    at(-0.7, side * half),
                    at(10.0, side * half),
                    at(10.0, side * 0.3 * half),
                ];
                svg.path(&closed_path(&wedge), "");
            }
        }
        EndSymbol::Room => {
            let wide = half + CROWN - 1.0;
            let room = [
                at(0.0, -half),
                at(0.0, -wide),
                at(11.0, -wide),
                at(11.0, wide),
                at(0.0, wide),
                at(0.0, half),
            ];
            svg.path(&open_path(&room), &line);
        }
        EndSymbol::Absorber => {
            let teeth = ((half / 3.5).round() as usize).clamp(2, 9);
            let mut comb: Vec<Point> = (0..=2 * teeth)
                .map(|k| {
                    let across = -half + half * k as f64 / teeth as f64;
                    at(if k % 2 == 0 { 0.0 } else { 9.0 }, across)
                })
                .collect();
            comb.extend([at(11.0, half), at(11.0, -half)]);
            svg.path(
                &closed_path(&comb),
                "fill=\"#b9bdc4\" stroke=\"#565b63\" stroke-width=\".8\"",
            );
        }
        EndSymbol::Sheet => {
            let sheet = |along: f64| open_path(&[at(along, -half), at(along, half)]);
            svg.path(&(sheet(0.0) + &sheet(4.0)), &line);
        }
    }
}
