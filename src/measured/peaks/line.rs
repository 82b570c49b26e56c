//! The mean Welch estimate of a resonance, exactly: resolution, leakage and aliasing included.
//!
//! A damped oscillator driven by noise, in whatever way, has the autocovariance `R(t) = Re[C exp(s |t|)]` with
//! `s = -nu + 2 pi i f`; `Re C` is its mean square, `Im C` the asymmetry that the manner of driving and other
//! modes driven by the same noise give it. Sampled at `rate`, the mean of the Hann-windowed estimate over
//! segments of `N` samples is
//!
//! ```text
//! E P_j = c Re C [T(z e^{+i a j}) + T(z e^{-i a j}) - g_0],   T(q) = sum_{n=0}^{N-1} g_n q^n
//! z = exp(s/rate),  a = 2 pi/N,  c = 2/(rate g_0)
//! g_n = sum_m w_m w_{m+n} = (N-n)/4 + (N-n)/8 cos(a n) + e sin(a n),   e = cot(a/2)/4 - cot(a)/8
//! ```
//!
//! (products of the window summed as geometric series). `T` is then sums of `n`-independent terms in
//!
//! ```text
//! V(q) = sum q^n = (1 - q^N)/(1 - q),   U(q) = sum (N-n) q^n = N/(1 - q) - q (1 - q^N)/(1 - q)^2
//! ```
//!
//! at `q` and its two neighbours `q e^{+-i a}`, which are the next bins: `q^N = z^N` at all of them. So a narrow
//! peak needs no correction for the resolution afterwards: the fit knows what the window does to it.

use std::f64::consts::TAU;

use num_complex::Complex64;

/// The bins of a spectrum that are fitted.
#[derive(Clone, Debug)]
pub(super) struct Bins {
    rate: f64,
    segment: usize,
    first: usize,
    count: usize,
    /// `exp(i a j)` from one bin before the first to one after the last.
    turns: Vec<Complex64>,
    edge: f64,
    /// Bins that stand together for their mean, of each group.
    groups: Vec<usize>,
}

/// Values of a unit line at every bin, from its own side of the spectrum and from the other: `E P_j = Re[C (near_j + far_j)]`; and their
/// derivatives with respect to `s` (times seconds).
#[derive(Clone, Debug)]
pub(super) struct Line {
    pub(super) near: Vec<Complex64>,
    pub(super) far: Vec<Complex64>,
    pub(super) near_slope: Vec<Complex64>,
    pub(super) far_slope: Vec<Complex64>,
}

impl Bins {
    pub(super) fn new(rate: f64, segment: usize, first: usize, count: usize) -> Bins {
        let a = TAU / segment as f64;
        let turn = |j: usize| Complex64::cis(a * j as f64);
        Bins {
            rate,
            segment,
            first,
            count,
            turns: (first - 1..=first + count).map(turn).collect(),
            edge: 0.25 / (a / 2.0).tan() - 0.125 / a.tan(),
            groups: vec![1; count],
        }
    }

    /// The same bins in groups.
    pub(super) fn grouped(&self, groups: Vec<usize>) -> Bins {
        Bins {
            groups,
            ..self.clone()
        }
    }

    /// Number of bins in each group.
    pub(super) fn groups(&self) -> &[usize] {
        &self.groups
    }

    pub(super) fn frequency(&self, i: usize) -> f64 {
        (self.first + i) as f64 * self.width()
    }

    pub(super) fn width(&self) -> f64 {
        self.rate / self.segment as f64
    }

    pub(super) fn count(&self) -> usize {
        self.count
    }

    fn means(&self, values: Vec<Complex64>) -> Vec<Complex64> {
        if self.groups.len() == values.len() {
            return values;
        }
        let mut rest = values.as_slice();
        let mut mean = |count: &usize| {
            let (own, others) = rest.split_at(*count);
            rest = others;
            own.iter().sum::<Complex64>() / *count as f64
        };
        self.groups.iter().map(&mut mean).collect()
    }

    /// The mean estimate of a line with `s = (growth, 2 pi f)` and `C = 1`, as a factor of `C`.
    pub(super) fn line(&self, s: Complex64) -> Line {
        let n = self.segment as f64;
        let z = (s / self.rate).exp();
        let whole = (s * n / self.rate).exp();
        let zero = 0.375 * n;
        let scale = 2.0 / (self.rate * zero);
        let side = |conjugate: bool| {
            let mut value = vec![Complex64::new(-0.5 * scale * zero, 0.0); self.count];
            let mut slope = vec![Complex64::ZERO; self.count];
            // Terms at every bin and its neighbours, three in hand at a time.
            let at = |turn: &Complex64| {
                let turn = if conjugate { turn.conj() } else { *turn };
                Terms::new(z * turn, whole, n)
            };
            let mut terms = self.turns.iter().map(at);
            let (Some(mut before), Some(mut here)) = (terms.next(), terms.next()) else {
                return (value, slope);
            };
            for ((after, v), d) in terms.zip(&mut value).zip(&mut slope) {
                let sine = if conjugate { -self.edge } else { self.edge };
                // 1/(2 i) of a difference.
                let half_turn = |x: Complex64| Complex64::new(x.im, -x.re) * (0.5 * sine);
                *v +=
                    (here.u * 0.25 + (before.u + after.u) * 0.0625 + half_turn(after.v - before.v))
                        * scale;
                *d += (here.du * 0.25
                    + (before.du + after.du) * 0.0625
                    + half_turn(after.dv - before.dv))
                    * (scale / self.rate);
                (before, here) = (here, after);
            }
            (self.means(value), self.means(slope))
        };
        let ((near, near_slope), (far, far_slope)) = (side(true), side(false));
        Line {
            near,
            far,
            near_slope,
            far_slope,
        }
    }
}

/// `U`, `V` and `q` times their derivatives.
#[derive(Clone, Copy)]
struct Terms {
    u: Complex64,
    v: Complex64,
    du: Complex64,
    dv: Complex64,
}

impl Terms {
    fn new(q: Complex64, whole: Complex64, n: f64) -> Terms {
        let h = (Complex64::ONE - q).inv();
        let rest = Complex64::ONE - whole;
        let qh = q * h;
        let v = rest * h;
        let dv = (rest * qh - whole * n) * h;
        let u = h * n - qh * v;
        let du = qh * h * n - (qh * v - qh * h * whole * n + qh * qh * v * 2.0);
        Terms { u, v, du, dv }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::measured::Window;

    /// The sums of the definition, term by term.
    fn by_hand(rate: f64, n: usize, j: usize, s: Complex64) -> Complex64 {
        let w = Window::Hann.weights(n);
        let g = |k: usize| (0..n - k).map(|m| w[m] * w[m + k]).sum::<f64>();
        let scale = 2.0 / (rate * g(0));
        let sum: Complex64 = (0..n)
            .map(|k| {
                let angle = TAU * (k * j) as f64 / n as f64;
                let twice = if k == 0 { 1.0 } else { 2.0 };
                (s * k as f64 / rate).exp() * (twice * g(k) * angle.cos())
            })
            .sum();
        sum * scale
    }

    #[test]
    fn the_closed_form_is_the_sum() {
        for (n, rate) in [(64, 500.0), (99, 2048.0), (256, 2048.0)] {
            for (growth, f) in [(-40.0, 80.0), (-0.1, 83.0), (-300.0, 12.0), (-5.0, 249.0)] {
                let s = Complex64::new(growth, TAU * f);
                let bins = Bins::new(rate, n, 3, n / 2 - 6);
                let line = bins.line(s);
                for i in 0..bins.count() {
                    let want = by_hand(rate, n, i + 3, s);
                    let off = (line.near[i] + line.far[i] - want).norm();
                    assert!(
                        off < 1e-9 * want.norm().max(1e-3 / rate),
                        "{n} {s} {i}: {off:.1e}"
                    );
                    let h = 1e-4 * growth.abs();
                    let slope = (by_hand(rate, n, i + 3, s + h) - by_hand(rate, n, i + 3, s - h))
                        / (2.0 * h);
                    let off = (line.near_slope[i] + line.far_slope[i] - slope).norm();
                    assert!(
                        off < 1e-5 * want.norm().max(1e-3 / rate),
                        "{n} {s} {i}: {off:.1e}"
                    );
                }
            }
        }
    }

    /// Full width at half power of a resonance with a decay rate of 40 1/s: 12.7323 Hz, computed with numpy 2.4.6
    /// (`tests/data/signal_checks.json`, `lorentzian`), `nu/pi` exactly; to 1e-4.
    #[test]
    fn a_resolved_line_is_as_wide_as_published() {
        let (rate, n) = (4096.0, 1 << 17);
        let width = rate / n as f64;
        let first = (700.0 / width) as usize;
        let bins = Bins::new(rate, n, first, 6400);
        let line = bins.line(Complex64::new(-40.0, TAU * 800.0));
        let both = line.near.iter().zip(&line.far);
        let values: Vec<Complex64> = both.map(|(a, b)| a + b).collect();
        let top = values.iter().map(|v| v.re).fold(0.0, f64::max);
        let ends: Vec<f64> = values
            .windows(2)
            .enumerate()
            .filter(|(_, w)| (w[0].re - 0.5 * top) * (w[1].re - 0.5 * top) <= 0.0)
            .map(|(i, w)| {
                let part = (0.5 * top - w[0].re) / (w[1].re - w[0].re);
                bins.frequency(i) + part * width
            })
            .collect();
        assert_eq!(ends.len(), 2);
        let got = ends[1] - ends[0];
        assert!((got / 12.732_300 - 1.0).abs() < 1e-4, "{got}");
        assert!(
            (got / (40.0 / std::f64::consts::PI) - 1.0).abs() < 1e-4,
            "{got}"
        );
    }
}
