//! A document under construction: elements, escaping, coordinates to 0.1 px.
//!
//! Style sits in attributes, not classes, and every id carries a hash of the drawing, so that
//! several figures can stand in one HTML page.

use std::fmt::Write;

use base64::Engine;
use base64::engine::general_purpose::STANDARD;

use super::text::Weight;

/// Stands for the figure's id prefix until the whole drawing is known; `escape` drops it from
/// user text, so it cannot be forged.
const PREFIX: char = '\u{1}';

/// Behind the embedded font stand families about as wide, for viewers that read no embedded fonts.
const FAMILY: &str = "Figure Sans, Inter, Helvetica, Arial, DejaVu Sans Condensed, sans-serif";

/// A point in px.
pub(super) type Point = (f64, f64);

/// An axis-aligned box in px: left, top, right, bottom.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Rect {
    pub left: f64,
    pub top: f64,
    pub right: f64,
    pub bottom: f64,
}

impl Rect {
    pub fn width(self) -> f64 {
        self.right - self.left
    }
    pub fn height(self) -> f64 {
        self.bottom - self.top
    }
    pub fn grown(self, by: f64) -> Rect {
        Rect {
            left: self.left - by,
            top: self.top - by,
            right: self.right + by,
            bottom: self.bottom + by,
        }
    }
    pub fn overlaps(self, o: Rect) -> bool {
        self.left < o.right && o.left < self.right && self.top < o.bottom && o.top < self.bottom
    }
    pub fn holds(self, o: Rect) -> bool {
        self.left <= o.left && o.right <= self.right && self.top <= o.top && o.bottom <= self.bottom
    }
    pub fn contains(self, (x, y): Point) -> bool {
        (self.left..=self.right).contains(&x) && (self.top..=self.bottom).contains(&y)
    }
    pub fn path(self) -> String {
        format!(
            "M{} {}H{}V{}H{}Z",
            px(self.left),
            px(self.top),
            px(self.right),
            px(self.bottom),
            px(self.left)
        )
    }
}

#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Anchor {
    Start,
    Middle,
    End,
}

/// One line of text; `at` is the anchor on the baseline.
#[derive(Debug, Clone)]
pub(super) struct Text<'a> {
    pub at: Point,
    pub text: &'a str,
    pub size: f64,
    pub weight: Weight,
    pub anchor: Anchor,
    pub fill: &'a str,
    /// Clockwise, degrees, about `at`.
    pub turn: f64,
    /// Width of a light outline behind the glyphs; 0 for none.
    pub halo: f64,
}

impl<'a> Text<'a> {
    pub fn new(at: Point, text: &'a str, size: f64) -> Self {
        Text {
            at,
            text,
            size,
            weight: Weight::Regular,
            anchor: Anchor::Start,
            fill: INK,
            turn: 0.0,
            halo: 0.0,
        }
    }
    pub fn anchor(self, anchor: Anchor) -> Self {
        Text { anchor, ..self }
    }
    pub fn weight(self, weight: Weight) -> Self {
        Text { weight, ..self }
    }
    pub fn fill(self, fill: &'a str) -> Self {
        Text { fill, ..self }
    }
    pub fn turn(self, turn: f64) -> Self {
        Text { turn, ..self }
    }
    pub fn halo(self, halo: f64) -> Self {
        Text { halo, ..self }
    }
}

/// Text and line colour.
pub(super) const INK: &str = "#1b1e23";
/// Colour of secondary text.
pub(super) const GREY: &str = "#565b63";

#[derive(Debug, Default)]
pub(super) struct Svg {
    defs: String,
    body: String,
}

impl Svg {
    /// Adds to the definitions; ids inside must come from [`Svg::id`].
    pub fn define(&mut self, markup: &str) {
        self.defs.push_str(markup);
    }

    /// An id unique to this figure.
    pub fn id(name: &str) -> String {
        format!("{PREFIX}{name}")
    }

    /// A reference to an id, as an attribute value.
    pub fn url(name: &str) -> String {
        format!("url(#{PREFIX}{name})")
    }

    /// Adds markup; user text in it must have been escaped.
    pub fn raw(&mut self, markup: &str) {
        self.body.push_str(markup);
    }

    /// A path with the given data and attributes.
    pub fn path(&mut self, data: &str, attributes: &str) {
        if !data.is_empty() {
            let _ = write!(self.body, "<path d=\"{data}\" {attributes}/>");
        }
    }

    pub fn line(&mut self, a: Point, b: Point, attributes: &str) {
        self.path(&open_path(&[a, b]), attributes);
    }

    pub fn text(&mut self, t: &Text) {
        if t.text.is_empty() {
            return;
        }
        let (x, y) = (px(t.at.0), px(t.at.1));
        let mut attributes = format!("x=\"{x}\" y=\"{y}\" font-size=\"{}\"", px(t.size));
        if t.weight == Weight::Semibold {
            attributes.push_str(" font-weight=\"600\"");
        }
        match t.anchor {
            Anchor::Start => {}
            Anchor::Middle => attributes.push_str(" text-anchor=\"middle\""),
            Anchor::End => attributes.push_str(" text-anchor=\"end\""),
        }
        if t.fill != INK {
            let _ = write!(attributes, " fill=\"{}\"", t.fill);
        }
        if t.turn != 0.0 {
            let _ = write!(attributes, " transform=\"rotate({} {x} {y})\"", px(t.turn));
        }
        if t.halo > 0.0 {
            let _ = write!(
                attributes,
                " stroke=\"#fff\" stroke-opacity=\".8\" stroke-width=\"{}\" \
                 stroke-linejoin=\"round\" paint-order=\"stroke\"",
                px(t.halo)
            );
        }
        let _ = write!(self.body, "<text {attributes}>{}</text>", escape(t.text));
    }

    /// The finished document; `label` is read aloud in place of the picture.
    pub fn finish(self, width: f64, height: f64, label: &str) -> String {
        let face = |weight: u32, bytes: &[u8]| {
            format!(
                "@font-face{{font-family:\"Figure Sans\";font-weight:{weight};\
                 src:url(data:font/woff2;base64,{}) format(\"woff2\")}}",
                STANDARD.encode(bytes)
            )
        };
        let (w, h) = (px(width), px(height));
        let document = format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{w}\" height=\"{h}\" \
             viewBox=\"0 0 {w} {h}\" role=\"img\" aria-label=\"{}\" font-family=\"{FAMILY}\" \
             fill=\"{INK}\"><style>{}{}</style><defs>{}</defs>\
             <rect width=\"{w}\" height=\"{h}\" fill=\"#fff\"/>{}</svg>\n",
            escape(label),
            face(400, include_bytes!("assets/sans-regular.woff2")),
            face(600, include_bytes!("assets/sans-semibold.woff2")),
            self.defs,
            self.body
        );
        let prefix = format!("f{:08x}-", fnv(document.as_bytes()) as u32);
        document.replace(PREFIX, &prefix)
    }
}

/// FNV-1a, 64 bit (Fowler, Noll, Vo): the same in every build, unlike the standard hasher.
fn fnv(bytes: &[u8]) -> u64 {
    bytes.iter().fold(0xcbf2_9ce4_8422_2325, |h, &b| {
        (h ^ u64::from(b)).wrapping_mul(0x0000_0100_0000_01b3)
    })
}

/// Escapes text for XML 1.0 and drops the characters it does not allow.
pub(super) fn escape(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            c if c.is_control() || matches!(c, '\u{fffe}' | '\u{ffff}') => {}
            c => out.push(c),
        }
    }
    out
}

/// A coordinate to one decimal, without a trailing zero.
pub(super) fn px(value: f64) -> String {
    let tenths = (value * 10.0).round() as i64;
    tenths_text(tenths)
}

fn tenths_text(tenths: i64) -> String {
    let sign = if tenths < 0 { "-" } else { "" };
    let (whole, part) = (tenths.unsigned_abs() / 10, tenths.unsigned_abs() % 10);
    match (whole, part) {
        (_, 0) => format!("{sign}{whole}"),
        (0, _) => format!("{sign}.{part}"),
        _ => format!("{sign}{whole}.{part}"),
    }
}

/// Path data of an open line; empty for fewer than two distinct points.
pub(super) fn open_path(points: &[Point]) -> String {
    path(points, false)
}

/// Path data of a closed line.
pub(super) fn closed_path(points: &[Point]) -> String {
    path(points, true)
}

/// Steps are relative and in whole tenths, so that they add up without drift.
fn path(points: &[Point], closed: bool) -> String {
    let mut out = String::new();
    let mut last: Option<(i64, i64)> = None;
    let mut steps = 0;
    for &(x, y) in points {
        let here = ((x * 10.0).round() as i64, (y * 10.0).round() as i64);
        match last {
            None => {
                let _ = write!(out, "M{} {}", tenths_text(here.0), tenths_text(here.1));
            }
            Some(p) if p == here => continue,
            Some(p) => {
                out.push(if steps == 0 { 'l' } else { ' ' });
                let dy = tenths_text(here.1 - p.1);
                let gap = if dy.starts_with('-') { "" } else { " " };
                let _ = write!(out, "{}{gap}{dy}", tenths_text(here.0 - p.0));
                steps += 1;
            }
        }
        last = Some(here);
    }
    if steps == 0 {
        return String::new();
    }
    if closed {
        out.push('Z');
    }
    out
}
