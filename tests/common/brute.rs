//! Zeros the plain way: the secant method on the determinant of the global matrix, from a dense grid.
//! It proves nothing and may miss zeros; what it finds must be in a list.

use num_complex::Complex64;
use stillflame::modes::ModeList;
use stillflame::numerics::count::Rectangle;
use stillflame::waves::primitive::Chain;

use super::witness::{determinant, longest_delay};

/// Most starts in one window.
const STARTS: f64 = 4000.0;

/// Zeros in the window, with how many starts were tried.
pub fn zeros(chain: &Chain<f64>, window: &Rectangle) -> (Vec<Complex64>, usize) {
    let (g, w) = (window.growth, window.omega);
    let pitch = (0.5 / longest_delay(chain)).max(((g.1 - g.0) * (w.1 - w.0) / STARTS).sqrt());
    let parts = |(a, b): (f64, f64)| ((b - a) / pitch).ceil().max(2.0);
    let (nx, ny) = (parts(g), parts(w));
    let mut found: Vec<Complex64> = Vec::new();
    for i in 0..(nx * ny) as usize {
        let (x, y) = ((i as f64 % nx).floor(), (i as f64 / nx).floor());
        let start = Complex64::new(
            g.0 + (x + 0.5) / nx * (g.1 - g.0),
            w.0 + (y + 0.5) / ny * (w.1 - w.0),
        );
        let Some(z) = secant(chain, start, pitch) else {
            continue;
        };
        let new = found
            .iter()
            .all(|k| (k - z).norm() > 1e-6 * (1.0 + z.norm()));
        // On an edge the list says so; what it says is tried elsewhere.
        if new && window.holds(z, 1e-7 * z.norm()) == Some(true) {
            found.push(z);
        }
    }
    (found, (nx * ny) as usize)
}

fn secant(chain: &Chain<f64>, start: Complex64, pitch: f64) -> Option<Complex64> {
    let (mut a, mut b) = (start, start + 0.05 * pitch);
    let mut at_a = determinant(chain, a)?;
    for _ in 0..60 {
        let Some(at_b) = determinant(chain, b) else {
            return Some(b);
        };
        let ratio = at_a.0 / at_b.0 * (at_a.1 - at_b.1).exp();
        let step = (b - a) / (1.0 - ratio);
        if !step.is_finite() || (b - step - start).norm() > 4.0 * pitch {
            return None;
        }
        (a, at_a, b) = (b, at_b, b - step);
        if step.norm() < 1e-11 * (1.0 + b.norm()) {
            return Some(b);
        }
    }
    None
}

/// Zeros found that no mode of the list is, and how many modes were not found.
pub fn beside(list: &ModeList, found: &[Complex64]) -> (Vec<Complex64>, usize) {
    let is = |s: Complex64, z: Complex64| (s - z).norm() <= 1e-7 * (1.0 + z.norm());
    let strange = found
        .iter()
        .filter(|z| !list.modes.iter().any(|m| is(m.s, **z)));
    let missed = list
        .modes
        .iter()
        .filter(|m| !found.iter().any(|z| is(m.s, *z)));
    (strange.copied().collect(), missed.count())
}
