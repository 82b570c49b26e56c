//! Where Newton starts: a grid over a rectangle, and a rim about it.

use num_complex::Complex64;

use super::analytic::{Analytic, Region};
use super::count::Rectangle;

/// Points of a staggered grid of the given pitch, at most some ten thousand.
pub fn grid(r: &Rectangle, pitch: f64) -> impl Iterator<Item = Complex64> + use<> {
    let (g, w) = (r.growth, r.omega);
    let cells = |length: f64| (length / pitch).ceil().clamp(1.0, 1e6);
    let (mut nx, mut ny) = (cells(g.1 - g.0), cells(w.1 - w.0));
    let thinning = (nx * ny / 2e4).sqrt().max(1.0);
    nx = (nx / thinning).ceil();
    ny = (ny / thinning).ceil();
    let (dx, dy) = ((g.1 - g.0) / nx, (w.1 - w.0) / ny);
    (0..ny as usize).flat_map(move |j| {
        let stagger = if j % 2 == 0 { 0.3 } else { 0.7 };
        (0..nx as usize).map(move |i| {
            Complex64::new(g.0 + (i as f64 + stagger) * dx, w.0 + (j as f64 + 0.5) * dy)
        })
    })
}

/// Growth rates at which the scale of a function is asked for.
const SCALES: usize = 8;

/// Points of a staggered grid whose pitch follows the scale on which the function varies: fine on the left, where delays
/// make it steep, and coarse on the right. At most some ten thousand.
pub fn graded<F: Analytic + ?Sized>(f: &F, r: &Rectangle) -> Vec<Complex64> {
    let (g, w) = (r.growth, r.omega);
    let (width, height) = (g.1 - g.0, w.1 - w.0);
    let regions: [Region; SCALES] = std::array::from_fn(|i| {
        let growth = g.0 + width * i as f64 / SCALES as f64;
        Region {
            omega: 0.0,
            ..Region::disc(Complex64::new(growth, w.1), 0.0)
        }
    });
    let mut bounds = Vec::with_capacity(SCALES);
    f.bounds(&regions, &mut bounds);
    let pitch = |x: f64| {
        let at = (SCALES as f64 * (x - g.0) / width).clamp(0.0, SCALES as f64 - 1.0);
        let scale = bounds
            .get(at as usize)
            .map_or(0.0, |b| b[0] / b[1].max(f64::MIN_POSITIVE));
        // A grid of one point is the coarsest, one of ten thousand the finest.
        (1.6 * scale).clamp((width * height / 2e4).sqrt(), width.max(height))
    };
    let mut points = Vec::new();
    let (mut left, mut column) = (g.0, 0);
    while left < g.1 {
        let p = pitch(left);
        // What is left over is shared out, so that no column is a sliver.
        let across = (g.1 - left) / ((g.1 - left) / p).ceil();
        let up = height / (height / p).ceil();
        for j in 0..(height / up).round() as usize {
            let stagger = if (j + column) % 2 == 0 { 0.3 } else { 0.7 };
            points.push(Complex64::new(
                left + stagger * across,
                w.0 + (j as f64 + 0.5) * up,
            ));
        }
        left += across;
        column += 1;
        if across <= 1e-9 * width {
            break;
        }
    }
    points
}

/// Points just outside, half a pitch apart: a zero at the edge has starts on one side of it only, and
/// may draw none of them.
pub fn rim(r: &Rectangle, pitch: f64, symmetric: bool) -> impl Iterator<Item = Complex64> + use<> {
    let (g, w) = (r.growth, r.omega);
    let off = 0.4 * pitch;
    let along = move |length: f64| {
        let n = (length / (0.5 * pitch)).ceil().clamp(1.0, 1e4);
        (0..n as usize).map(move |i| (i as f64 + 0.5) / n * length)
    };
    let sides = along(w.1 - w.0)
        .flat_map(move |y| [g.0 - off, g.1 + off].map(|x| Complex64::new(x, w.0 + y)));
    let bottom = (!symmetric).then_some(w.0 - off);
    let ends = along(g.1 - g.0).flat_map(move |x| {
        let rows = [Some(w.1 + off), bottom].into_iter().flatten();
        rows.map(move |y| Complex64::new(g.0 + x, y))
    });
    sides.chain(ends)
}
