//! A model held against an averaged spectral matrix: its mean at every bin, the likelihood, and the derivatives.
//!
//! With `L L^H = S_j`, `G = L^-1` whitens: `G S_j G^H = 1`. `G P_j G^H - 1` is then noise of equal size in all its elements, and the derivatives
//! of `G S_j G^H` at fixed `G` are what it is compared with. Hermitian matrices are written as real numbers with the same sum of squares.

use std::f64::consts::{SQRT_2, TAU};

use nalgebra::DMatrix;
use num_complex::Complex64;

use super::line::Line;
use super::model::{Data, MOST_SENSORS, Model, known};

/// A model with what it gives.
#[derive(Clone, Debug)]
pub(super) struct Fitted {
    pub(super) model: Model,
    lines: Vec<Line>,
    /// `G_j` with `G S G^H = 1`.
    pub(super) whitener: Vec<Complex64>,
    /// `sum_j (tr S^-1 P + ln det S)` and what is known of the drives beforehand.
    pub(super) q: f64,
}

impl Fitted {
    /// `None` where the mean is not positive everywhere.
    pub(super) fn of(data: &Data, model: Model) -> Option<Fitted> {
        let lines = model
            .resonances
            .iter()
            .map(|r| data.bins.line(r.s))
            .collect();
        Fitted::with(data, model, lines)
    }

    fn with(data: &Data, model: Model, lines: Vec<Line>) -> Option<Fitted> {
        if model
            .resonances
            .iter()
            .any(|r| r.square().is_nan() || r.square() <= 0.0)
        {
            return None;
        }
        let (n, cells) = (data.sensors, data.cells());
        let mut fitted = Fitted {
            whitener: vec![Complex64::ZERO; cells * data.groups()],
            model,
            lines,
            q: 0.0,
        };
        let mut q = 0.0;
        let mut mean = vec![Complex64::ZERO; cells];
        let mut residual = vec![Complex64::ZERO; cells];
        for j in 0..data.groups() {
            fitted.mean(j, &mut mean);
            let g = &mut fitted.whitener[j * cells..(j + 1) * cells];
            let logarithm = whiten(&mean, n, g)?;
            sandwich(g, data.at(j), n, &mut residual);
            let trace = (0..n).map(|i| residual[i * n + i].re).sum::<f64>();
            q += data.weight(j) * (logarithm + trace);
        }
        for r in &fitted.model.resonances {
            let known = known(r).iter().map(|e| e.norm_sqr()).sum::<f64>();
            q += 0.5 * data.inflation() * known;
        }
        fitted.q = q;
        q.is_finite().then_some(fitted)
    }

    /// `S_j`.
    pub(super) fn mean(&self, j: usize, mean: &mut [Complex64]) {
        let n = self.model.floor.len();
        mean.fill(Complex64::ZERO);
        for (r, line) in self.model.resonances.iter().zip(&self.lines) {
            let (near, far) = (line.near[j] * 0.5, line.far[j] * 0.5);
            for a in 0..n {
                for b in 0..n {
                    let c = r.shape[a] * r.drive[b];
                    mean[a * n + b] += near * c + (far * c).conj();
                }
            }
        }
        for a in 0..n {
            for b in 0..=a {
                let v = mean[a * n + b] + mean[b * n + a].conj();
                mean[a * n + b] = v;
                mean[b * n + a] = v.conj();
            }
            mean[a * n + a].re += self.model.floor[a];
        }
    }

    /// The diagonal of `S_j` at one sensor, for every bin.
    pub(super) fn of_sensor(&self, data: &Data, sensor: usize) -> Vec<f64> {
        let all = 0..self.model.resonances.len();
        let at =
            |j| self.model.floor[sensor] + all.clone().map(|k| self.own(k, j, sensor)).sum::<f64>();
        (0..data.groups()).map(at).collect()
    }

    /// `S_j` of the resonance `k` alone, at one sensor.
    pub(super) fn own(&self, k: usize, j: usize, sensor: usize) -> f64 {
        let (r, line) = (&self.model.resonances[k], &self.lines[k]);
        let c = r.shape[sensor] * r.drive[sensor];
        (c * (line.near[j] + line.far[j])).re
    }

    /// A model as it stands, or with less of what makes its mean negative somewhere.
    pub(super) fn mended(data: &Data, model: &Model) -> Option<Fitted> {
        let of = |kept: f64, floor: f64| {
            let mut model = model.clone();
            for r in &mut model.resonances {
                let level = r.square();
                for (b, c) in r.drive.iter_mut().zip(&r.shape) {
                    let alone = c.conj() * level;
                    *b = alone + (*b - alone) * kept;
                }
            }
            let least = floor * model.floor.iter().fold(0.0, |m: f64, f| m.max(*f));
            model.floor.iter_mut().for_each(|f| *f = f.max(least));
            Fitted::of(data, model)
        };
        Fitted::of(data, model.clone())
            .or_else(|| of(0.9, 1e-3))
            .or_else(|| of(0.5, 1e-2))
            .or_else(|| of(0.0, 0.1))
    }

    fn g(&self, j: usize) -> &[Complex64] {
        let cells = self.model.floor.len().pow(2);
        &self.whitener[j * cells..(j + 1) * cells]
    }

    /// `G (P - S) G^H` at every bin, as columns of real numbers.
    pub(super) fn misfit(&self, data: &Data) -> Vec<f64> {
        let (n, cells) = (data.sensors, data.cells());
        let mut all = Vec::with_capacity(cells * data.groups());
        let mut white = vec![Complex64::ZERO; cells];
        for j in 0..data.groups() {
            sandwich(self.g(j), data.at(j), n, &mut white);
            for i in 0..n {
                white[i * n + i].re -= 1.0;
            }
            let root = data.weight(j).sqrt();
            white.iter_mut().for_each(|w| *w *= root);
            flatten(&white, n, &mut all);
        }
        all
    }

    /// Derivatives of `G S G^H` at fixed `G`: a row for each parameter, real numbers of all bins one after the other.
    pub(super) fn derivatives(&self, data: &Data) -> DMatrix<f64> {
        let (n, cells, each) = (data.sensors, data.cells(), data.each());
        let rows = data.parameters(&self.model);
        let mut u = DMatrix::zeros(rows, cells * data.groups());
        let mut columns = [[Complex64::ZERO; MOST_SENSORS]; MOST_SENSORS];
        for j in 0..data.groups() {
            let g = self.g(j);
            for a in 0..n {
                for i in 0..n {
                    columns[a][i] = g[i * n + a];
                }
            }
            let root = data.weight(j).sqrt();
            let mut out = |row: usize, terms: &[Rank]| put(&mut u, row, j, root, n, terms);
            for (k, (r, line)) in self.model.resonances.iter().zip(&self.lines).enumerate() {
                let row = each * k;
                let (near, far) = (line.near[j] * 0.5, line.far[j] * 0.5);
                let (near_slope, far_slope) = (line.near_slope[j] * 0.5, line.far_slope[j] * 0.5);
                let x = apply(g, n, &r.shape, false);
                let x_far = apply(g, n, &r.shape, true);
                let t = apply(g, n, &r.drive, true);
                let t_far = apply(g, n, &r.drive, false);
                for (i, ds) in [Complex64::from(r.s.re), Complex64::new(0.0, TAU)]
                    .into_iter()
                    .enumerate()
                {
                    let terms = [
                        (near_slope * ds, &x, &t),
                        ((far_slope * ds).conj(), &x_far, &t_far),
                    ];
                    out(row + i, &terms);
                }
                let mut next = row + 2;
                for (a, column) in columns.iter().enumerate().take(n) {
                    for turn in [Complex64::ONE, Complex64::I] {
                        out(
                            next,
                            &[
                                (near * turn, &x, column),
                                ((far * turn).conj(), &x_far, column),
                            ],
                        );
                        next += 1;
                    }
                    if a == r.loudest {
                        continue;
                    }
                    for turn in [Complex64::ONE, Complex64::I] {
                        out(
                            next,
                            &[
                                (near * turn, column, &t),
                                ((far * turn).conj(), column, &t_far),
                            ],
                        );
                        next += 1;
                    }
                }
            }
            let first = each * self.model.resonances.len();
            for (a, column) in columns.iter().enumerate().take(n) {
                out(first + a, &[(Complex64::from(0.5), column, column)]);
            }
        }
        u
    }

    /// The model a step of the parameters away; steps in decay and frequency are held within reach.
    pub(super) fn moved(&self, data: &Data, step: &[f64]) -> Model {
        let mut model = self.model.clone();
        for (r, step) in model.resonances.iter_mut().zip(step.chunks(data.each())) {
            let nu = r.decay();
            let most = (nu / TAU).max(data.bins.width());
            let decay =
                (nu * step[0].clamp(-0.7, 0.7).exp()).clamp(data.least_decay(), data.most_decay());
            let frequency =
                (r.frequency() + step[1].clamp(-most, most)).max(0.25 * data.bins.width());
            r.s = Complex64::new(-decay, TAU * frequency);
            let mut next = 2;
            let mut turn = || {
                next += 2;
                Complex64::new(step[next - 2], step[next - 1])
            };
            for a in 0..data.sensors {
                r.drive[a] += turn();
                if a != r.loudest {
                    r.shape[a] += turn();
                }
            }
            r.normalise();
        }
        let first = data.each() * model.resonances.len();
        for (f, step) in model.floor.iter_mut().zip(&step[first..]) {
            *f += step;
        }
        model
    }
}

/// `(factor, v, w)` for `factor v w^H`.
type Rank<'a> = (
    Complex64,
    &'a [Complex64; MOST_SENSORS],
    &'a [Complex64; MOST_SENSORS],
);

/// Puts the terms and their conjugate transpose into a row at bin `j`.
fn put(u: &mut DMatrix<f64>, row: usize, j: usize, root: f64, n: usize, terms: &[Rank]) {
    let mut at = j * n * n;
    for i in 0..n {
        let sum: f64 = terms
            .iter()
            .map(|(f, v, w)| (f * v[i] * w[i].conj()).re)
            .sum();
        u[(row, at)] = 2.0 * root * sum;
        at += 1;
        let root = root * SQRT_2;
        for l in 0..i {
            let sum: Complex64 = terms
                .iter()
                .map(|(f, v, w)| f * v[i] * w[l].conj() + (f * v[l]).conj() * w[i])
                .sum();
            u[(row, at)] = root * sum.re;
            u[(row, at + 1)] = root * sum.im;
            at += 2;
        }
    }
}

/// A Hermitian matrix as real numbers whose sum of squares is that of its elements, in the order of [`put`].
pub(super) fn flatten(white: &[Complex64], n: usize, out: &mut Vec<f64>) {
    for i in 0..n {
        out.push(white[i * n + i].re);
        for l in 0..i {
            let v = white[i * n + l] * SQRT_2;
            out.extend([v.re, v.im]);
        }
    }
}

/// `G v` or `G conj(v)`.
fn apply(g: &[Complex64], n: usize, v: &[Complex64], conjugate: bool) -> [Complex64; MOST_SENSORS] {
    let mut out = [Complex64::ZERO; MOST_SENSORS];
    for i in 0..n {
        for a in 0..=i {
            let v = if conjugate { v[a].conj() } else { v[a] };
            out[i] += g[i * n + a] * v;
        }
    }
    out
}

/// `G P G^H`, `G` lower triangular.
pub(super) fn sandwich(g: &[Complex64], p: &[Complex64], n: usize, out: &mut [Complex64]) {
    let mut half = [Complex64::ZERO; MOST_SENSORS * MOST_SENSORS];
    for i in 0..n {
        for b in 0..n {
            half[i * n + b] = (0..=i).map(|a| g[i * n + a] * p[a * n + b]).sum();
        }
    }
    for i in 0..n {
        for l in 0..n {
            out[i * n + l] = (0..=l).map(|b| half[i * n + b] * g[l * n + b].conj()).sum();
        }
    }
}

/// Lower triangle `L` of a Hermitian matrix `L L^H`, inverted in place of it; the logarithm of its determinant. `None` where it is not positive.
fn whiten(s: &[Complex64], n: usize, g: &mut [Complex64]) -> Option<f64> {
    if n == 1 {
        let v = s[0].re;
        if v.is_nan() || v <= 0.0 {
            return None;
        }
        g[0] = Complex64::from(v.sqrt().recip());
        return Some(v.ln());
    }
    let mut l = [Complex64::ZERO; MOST_SENSORS * MOST_SENSORS];
    let mut logarithm = 0.0;
    for i in 0..n {
        for j in 0..=i {
            let mut sum = s[i * n + j];
            for k in 0..j {
                sum -= l[i * n + k] * l[j * n + k].conj();
            }
            if i == j {
                if sum.re.is_nan() || sum.re <= 1e-14 * s[i * n + i].re {
                    return None;
                }
                l[i * n + i] = Complex64::from(sum.re.sqrt());
                logarithm += sum.re.ln();
            } else {
                l[i * n + j] = sum / l[j * n + j].re;
            }
        }
    }
    g.fill(Complex64::ZERO);
    for j in 0..n {
        for i in j..n {
            let mut sum = if i == j {
                Complex64::ONE
            } else {
                Complex64::ZERO
            };
            for k in j..i {
                sum -= l[i * n + k] * g[k * n + j];
            }
            g[i * n + j] = sum / l[i * n + i].re;
        }
    }
    Some(logarithm)
}
