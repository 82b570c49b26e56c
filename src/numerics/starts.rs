//! Where Newton starts: a grid over a rectangle, and a rim about it.

use num_complex::Complex64;

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
