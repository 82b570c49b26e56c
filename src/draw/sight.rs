//! The colours of figures as dichromats and a grey print show them; tests only.
//!
//! Linear sRGB (IEC 61966-2-1) goes to the responses of the three cones, `lms = T rgb`, and a missing cone
//! is replaced by what the other two make of it (Vienot, Brettel & Mollon 1999, Color Res. Appl. 24, 243;
//! their coefficients from memory, checked below to leave greys as they are):
//!
//! ```text
//! protanopia    l = 2.02344 m - 2.52581 s
//! deuteranopia  m = 0.494207 l + 1.24827 s
//! ```
//!
//! Lightness is CIE 1976 `L* = 116 (Y/Yn)^(1/3) - 16` with `Y` of sRGB, differences are those of CIELAB (ISO/CIE
//! 11664-4; white D65).

use nalgebra::{Matrix3, Vector3};

use super::colour::{Rgb, diverging, hex};
use super::contributions::fill;
use super::style::curve_style;

/// How a picture reaches its reader.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Sight {
    Full,
    Protanopia,
    Deuteranopia,
    Grey,
}

const ALL: [Sight; 4] = [
    Sight::Full,
    Sight::Protanopia,
    Sight::Deuteranopia,
    Sight::Grey,
];

fn cones() -> Matrix3<f64> {
    Matrix3::new(
        17.8824, 43.5161, 4.11935, 3.45565, 27.1554, 3.86714, 0.0299566, 0.184309, 1.46709,
    )
}

fn linear(rgb: Rgb) -> Vector3<f64> {
    Vector3::from(rgb).map(|c| match f64::from(c) / 255.0 {
        c if c <= 0.04045 => c / 12.92,
        c => ((c + 0.055) / 1.055).powf(2.4),
    })
}

/// What is seen, in linear sRGB.
fn seen(rgb: Rgb, sight: Sight) -> Vector3<f64> {
    let light = linear(rgb);
    let lms = cones() * light;
    let changed = match sight {
        Sight::Full => return light,
        Sight::Grey => return Vector3::repeat(luminance(light)),
        Sight::Protanopia => Vector3::new(2.02344 * lms.y - 2.52581 * lms.z, lms.y, lms.z),
        Sight::Deuteranopia => Vector3::new(lms.x, 0.494207 * lms.x + 1.24827 * lms.z, lms.z),
    };
    let back = cones().try_inverse().unwrap();
    (back * changed).map(|c| c.clamp(0.0, 1.0))
}

fn luminance(light: Vector3<f64>) -> f64 {
    light.dot(&Vector3::new(0.2126, 0.7152, 0.0722))
}

/// CIELAB of linear sRGB.
fn lab(light: Vector3<f64>) -> Vector3<f64> {
    let xyz = Matrix3::new(
        0.4124, 0.3576, 0.1805, 0.2126, 0.7152, 0.0722, 0.0193, 0.1192, 0.9505,
    ) * light;
    let f = |t: f64| match t {
        t if t > (6.0_f64 / 29.0).powi(3) => t.cbrt(),
        t => t / (3.0 * (6.0_f64 / 29.0).powi(2)) + 4.0 / 29.0,
    };
    let (x, y, z) = (f(xyz.x / 0.9505), f(xyz.y), f(xyz.z / 1.089));
    Vector3::new(116.0 * y - 16.0, 500.0 * (x - y), 200.0 * (y - z))
}

fn lightness(rgb: Rgb, sight: Sight) -> f64 {
    lab(seen(rgb, sight)).x
}

fn difference(a: Rgb, b: Rgb, sight: Sight) -> f64 {
    (lab(seen(a, sight)) - lab(seen(b, sight))).norm()
}

/// The colour in a value such as `#1b1e23`.
fn parsed(text: &str) -> Rgb {
    let byte = |k: usize| u8::from_str_radix(&text[k..k + 2], 16).unwrap();
    [byte(1), byte(3), byte(5)]
}

fn attribute<'a>(style: &'a str, name: &str) -> Option<&'a str> {
    style
        .split(&format!(" {name}=\""))
        .nth(1)?
        .split('"')
        .next()
}

#[test]
fn a_missing_cone_leaves_greys_alone_and_takes_red_from_green() {
    for grey in [0, 40, 128, 200, 255] {
        for sight in ALL {
            let as_seen = seen([grey; 3], sight);
            let wanted = linear([grey; 3]);
            assert!(
                (as_seen - wanted).norm() < 2e-3,
                "{sight:?} {grey}: {as_seen}"
            );
        }
    }
    // A red and a green that only the missing cone tells apart (confusion colours) become one.
    for (sight, cone) in [(Sight::Protanopia, 0), (Sight::Deuteranopia, 1)] {
        let start = Vector3::new(0.3, 0.3, 0.3);
        let mut step = Vector3::zeros();
        step[cone] = 1.0;
        let other = start + cones().try_inverse().unwrap() * step * 1.5;
        let code = |v: Vector3<f64>| -> Rgb {
            let c = v.map(|c| 255.0 * (1.055 * c.powf(1.0 / 2.4) - 0.055));
            [c.x.round() as u8, c.y.round() as u8, c.z.round() as u8]
        };
        let (a, b) = (code(start), code(other));
        assert!(difference(a, b, Sight::Full) > 10.0, "{a:?} {b:?}");
        assert!(difference(a, b, sight) < 2.0, "{a:?} {b:?}");
    }
    assert!((lightness([255; 3], Sight::Grey) - 100.0).abs() < 1e-9);
    assert_eq!(parsed(&hex([27, 30, 35])), [27, 30, 35]);
}

/// Growth and decay of equal size differ in lightness by 5 at least, so that the neutral curve is an edge
/// in every print.
#[test]
fn growth_is_darker_than_decay_for_every_reader() {
    for sight in ALL {
        for k in 0..=100 {
            let u = f64::from(k) / 100.0;
            let (decay, growth) = (diverging(-u - 1e-9), diverging(u));
            let step = lightness(decay, sight) - lightness(growth, sight);
            assert!(step > 5.0, "{sight:?} at {u}: {step}");
        }
    }
}

/// Each tenth of the scale is darker than the one inside it, by 1 in lightness at least.
#[test]
fn a_stronger_tint_is_a_larger_magnitude_for_every_reader() {
    for sight in ALL {
        for side in [-1.0, 1.0] {
            for k in 0..10 {
                let at = |k: i32| diverging(side * (f64::from(k) / 10.0 + 1e-9));
                let step = lightness(at(k), sight) - lightness(at(k + 1), sight);
                assert!(step > 1.0, "{sight:?} {side} at {k}: {step}");
            }
        }
    }
}

/// Whatever their sizes, growth and decay from a quarter of the scale on keep 20 in CIELAB for readers
/// without one kind of cone: blue against yellow is what they see. A grey print has the neutral curve, and
/// the dashes of the level lines of decay.
#[test]
fn growth_and_decay_are_two_hues_for_every_reader() {
    for sight in [Sight::Full, Sight::Protanopia, Sight::Deuteranopia] {
        for i in 5..=20 {
            for j in 5..=20 {
                let (u, v) = (f64::from(i) / 20.0, f64::from(j) / 20.0);
                let d = difference(diverging(-u), diverging(v), sight);
                assert!(d > 20.0, "{sight:?}: {u} against {v}: {d}");
            }
        }
    }
    let dashed = |level: f64| super::style::iso_style(level).contains("stroke-dasharray");
    assert!(dashed(-1.0) && !dashed(1.0));
}

/// Two line styles differ in their dashes, or in lightness by 8 at least; neighbours differ in dashes.
#[test]
fn lines_are_told_apart_by_every_reader() {
    let dash = |k: usize| attribute(&curve_style(k), "stroke-dasharray").map(str::to_owned);
    let colour = |k: usize| parsed(attribute(&curve_style(k), "stroke").unwrap());
    for i in 0..10 {
        assert_ne!(dash(i), dash(i + 1), "styles {i} and {}", i + 1);
        for j in 0..i {
            for sight in ALL {
                let step = lightness(colour(i), sight) - lightness(colour(j), sight);
                assert!(
                    dash(i) != dash(j) || step.abs() > 8.0,
                    "{sight:?}: styles {i} and {j} have equal dashes and differ by {step} in lightness"
                );
            }
        }
        // On white paper every line stands out: 30 in lightness, well above a hairline's need.
        for sight in ALL {
            assert!(lightness(colour(i), sight) < 70.0, "{sight:?}: style {i}");
        }
    }
}

/// The solid classes of bars differ in lightness by 15, the third is striped; a tinted passage differs from
/// a plain one by 4, and its flame stands between them.
#[test]
fn bars_and_passages_are_told_apart_by_every_reader() {
    let (heat, flow) = (parsed(&fill(0)), parsed(&fill(1)));
    assert!(fill(2).starts_with("url("));
    let (plain, tinted) = (parsed(super::chain::PLAIN), parsed(&super::chain::tint()));
    for sight in ALL {
        let step = lightness(flow, sight) - lightness(heat, sight);
        assert!(step > 15.0, "{sight:?}: {step}");
        let step = lightness(plain, sight) - lightness(tinted, sight);
        assert!(step > 4.0, "{sight:?}: {step}");
    }
}
