//! Marks on curves, told apart by shape.

use super::svg::{INK, Point, Svg, px};

/// What a mark looks like.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Mark {
    /// An open circle.
    Circle,
    /// A filled diamond.
    Diamond,
    /// An open triangle.
    Triangle,
    /// An open square.
    Box,
    /// A filled square.
    Square,
    /// Two crossed strokes.
    Cross,
    /// A small disc.
    Dot,
    /// A disc in a ring.
    Target,
}

/// A mark at a place in the units of a figure's axes.
#[derive(Debug, Clone, PartialEq)]
pub struct Spot {
    /// Along x.
    pub x: f64,
    /// Along y.
    pub y: f64,
    /// Its look.
    pub mark: Mark,
    /// The style of the curve it belongs to; of no curve where there is none.
    pub style: Option<usize>,
    /// Text beside it; may be empty.
    pub label: String,
}

impl Mark {
    /// Draws it about a point.
    pub(super) fn draw(self, svg: &mut Svg, (x, y): Point, colour: &str) {
        let at = |dx: f64, dy: f64| format!("{} {}", px(x + dx), px(y + dy));
        let open = format!(
            "fill=\"#fff\" stroke=\"{colour}\" stroke-width=\"1.6\" stroke-linejoin=\"round\""
        );
        let filled = format!("fill=\"{colour}\" stroke=\"#fff\" stroke-width=\".8\"");
        match self {
            Mark::Circle => svg.raw(&format!(
                "<circle cx=\"{}\" cy=\"{}\" r=\"3.4\" {open}/>",
                px(x),
                px(y)
            )),
            Mark::Dot => svg.raw(&format!(
                "<circle cx=\"{}\" cy=\"{}\" r=\"2.3\" {filled}/>",
                px(x),
                px(y)
            )),
            Mark::Target => svg.raw(&format!(
                "<circle cx=\"{0}\" cy=\"{1}\" r=\"4.6\" {open}/><circle cx=\"{0}\" cy=\"{1}\" r=\"1.7\" \
                 fill=\"{colour}\"/>",
                px(x),
                px(y)
            )),
            Mark::Diamond => {
                let data = format!("M{}L{} {} {}Z", at(0.0, -5.5), at(5.5, 0.0), at(0.0, 5.5), at(-5.5, 0.0));
                svg.path(&data, &format!("fill=\"{INK}\" stroke=\"#fff\" stroke-width=\".8\""));
            }
            Mark::Triangle => {
                let data = format!("M{}L{} {}Z", at(0.0, -4.0), at(3.8, 2.8), at(-3.8, 2.8));
                svg.path(&data, &open);
            }
            Mark::Box | Mark::Square => {
                let look = if self == Mark::Box { &open } else { &filled };
                let data = format!("M{}h6.4v6.4h-6.4Z", at(-3.2, -3.2));
                svg.path(&data, look);
            }
            Mark::Cross => {
                let data = format!("M{}L{}M{}L{}", at(-3.5, -3.5), at(3.5, 3.5), at(-3.5, 3.5), at(3.5, -3.5));
                svg.path(&data, &format!("fill=\"none\" stroke=\"{colour}\" stroke-width=\"1.6\""));
            }
        }
    }
}
