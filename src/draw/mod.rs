//! Arrays to SVG figures, one font, no physics.
//!
//! Lengths are user units of the SVG (1/96 inch, called px), kept to 0.1 px; x runs right and y
//! runs down. Values arrive already scaled to the unit written on their axis. Every figure is a
//! pure function of its input: equal input, equal bytes.
//!
//! ```text
//! map, lines, locus, profile, waterfall   the figures
//!   frame               title, plot rectangle, axes, legend, footnote
//!   raster, contour     a sampled field as an embedded image, its level lines
//!   region, label       outlines of marked cells, places for labels
//!   mark, tags          marks and names on curves
//!   light               what is too fine for its figure, coarser
//!   chain, names        passages drawn to scale, names with leaders
//!   contributions       bars of the parts of a sum
//!   field               interpolation that adds no extrema
//!   cut                 lines across which a field does not go on
//!   axis, colour        value to position, value to colour
//!   svg, text           elements and escaping, glyph widths
//! ```

pub mod axis;
mod bar;
pub mod chain;
pub mod colour;
pub mod contour;
pub mod contributions;
mod curves;
pub mod cut;
pub mod field;
mod frame;
mod label;
mod light;
pub mod lines;
pub mod locus;
pub mod map;
pub mod mark;
mod names;
pub mod patches;
pub mod profile;
mod raster;
mod region;
mod sheet;
#[cfg(test)]
mod sight;
mod style;
mod svg;

mod tags;
pub mod text;
pub mod waterfall;

pub use axis::{Axis, Scale};
pub use chain::{Chain, ChainEnd, EndSymbol, Passage, Plane, Symbol};
pub use contributions::{Contribution, Contributions};
pub use cut::{Cuts, Seam};
pub use lines::{LineFigure, Panel, Series, Shade};
pub use locus::{Locus, Trail};
pub use map::{DesignPoint, IsoLines, Quantity, StabilityMap, Words};
pub use mark::{Mark, Spot};
pub use profile::{Curve, ProfileFigure, ProfilePanel, ProfileWords};
pub use waterfall::Waterfall;

/// Why a figure cannot be drawn: its arrays contradict each other.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum DrawError {
    /// An axis without samples.
    #[error("{axis} has no samples")]
    NoSamples {
        /// Which axis.
        axis: &'static str,
    },
    /// Samples must be finite and strictly increasing.
    #[error("sample {index} of {axis} is {value}: samples must be finite and strictly increasing")]
    Samples {
        /// Which axis.
        axis: &'static str,
        /// Position of the first offending sample.
        index: usize,
        /// Its value.
        value: f64,
    },
    /// A logarithmic axis takes positive samples only.
    #[error("{axis} is logarithmic but starts at {value}")]
    NotPositive {
        /// Which axis.
        axis: &'static str,
        /// Its first sample.
        value: f64,
    },
    /// An array has the wrong number of rows or a row the wrong length.
    #[error("{what} has {found} entries where {expected} are needed")]
    Shape {
        /// The array, or the row of it.
        what: String,
        /// How many there are.
        found: usize,
        /// How many the axis asks for.
        expected: usize,
    },
    /// A value is infinite or not a number; an absent value is `None`.
    #[error("{what} holds {value} at row {row}, column {column}: leave it out instead")]
    NotFinite {
        /// The array.
        what: &'static str,
        /// Row (sample of y).
        row: usize,
        /// Column (sample of x).
        column: usize,
        /// The value.
        value: f64,
    },
    /// The embedded image could not be encoded.
    #[error("the image of the field could not be encoded: {0}")]
    Image(String),
}
