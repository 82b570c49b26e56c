//! Fit of several resonances on a floor to an averaged spectrum, by likelihood.
//!
//! An estimate `P_j` of mean `M_j` averaged over `n_d` records has a gamma density; the parameters are those of the
//! least
//!
//! ```text
//! Q = sum_j (P_j/M_j + ln M_j),   M_j = floor_j + sum_k Re[C_k L_j(s_k)]
//! ```
//!
//! (Whittle 1953; with `M_j` the exact mean of the estimate as in Sykulski et al. 2019, Biometrika 106, 251). With
//! `u_j = dM_j/M_j` the Fisher matrix is `F = sum u_j u_j^T`; neighbouring bins are correlated by `kappa_{|i-j|}`,
//! so the covariance of the parameters is `F^-1 (sum_ij kappa_{|i-j|} u_i u_j^T) F^-1`.

use std::f64::consts::TAU;

use nalgebra::{DMatrix, DVector};
use num_complex::Complex64;

use super::line::{Bins, Line};

/// One resonance.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Resonance {
    /// Growth rate and angular frequency (1/s).
    pub(super) s: Complex64,
    /// Autocovariance `Re[C exp(s t)]` (unit squared).
    pub(super) c: Complex64,
}

impl Resonance {
    pub(super) fn decay(&self) -> f64 {
        -self.s.re
    }

    pub(super) fn frequency(&self) -> f64 {
        self.s.im / TAU
    }
}

/// Resonances on a floor `floor + slope (f_0/f)^2`, `f_0` the first frequency fitted.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Model {
    pub(super) resonances: Vec<Resonance>,
    pub(super) floor: f64,
}

/// Parameters of each resonance: ln decay, frequency, real and imaginary part of `C`.
pub(super) const EACH: usize = 4;

/// An averaged spectrum as it is fitted.
pub(super) struct Data<'a> {
    pub(super) bins: &'a Bins,
    pub(super) power: &'a [f64],
    /// Covariance of estimates so many bins apart, relative to their means.
    pub(super) kappa: &'a [f64],
}

impl Data<'_> {
    /// `kappa` summed over all neighbours: what one unit of `Q` counts for.
    pub(super) fn inflation(&self) -> f64 {
        let [own, others @ ..] = self.kappa else {
            return 1.0;
        };
        own + 2.0 * others.iter().sum::<f64>()
    }

    /// Least decay rate a fit may reach: far below what the segments resolve.
    fn least_decay(&self) -> f64 {
        0.02 * self.bins.width()
    }

    fn most_decay(&self) -> f64 {
        TAU * self.bins.width() * self.bins.count() as f64
    }
}

/// A model with what it gives.
#[derive(Clone, Debug)]
pub(super) struct Fitted {
    pub(super) model: Model,
    /// Mean at every bin.
    pub(super) mean: Vec<f64>,
    lines: Vec<Line>,
    pub(super) q: f64,
}

impl Fitted {
    /// `None` where the mean is not positive everywhere.
    pub(super) fn of(data: &Data, model: Model) -> Option<Fitted> {
        let lines: Vec<Line> = model
            .resonances
            .iter()
            .map(|r| data.bins.line(r.s))
            .collect();
        Fitted::with(data, model, lines)
    }

    fn with(data: &Data, model: Model, lines: Vec<Line>) -> Option<Fitted> {
        let mut mean = vec![model.floor; data.bins.count()];
        for (r, line) in model.resonances.iter().zip(&lines) {
            for (m, v) in mean.iter_mut().zip(&line.value) {
                *m += r.c.re * v.re - r.c.im * v.im;
            }
        }
        let mut q = 0.0;
        for (m, p) in mean.iter().zip(data.power) {
            if *m <= 0.0 {
                return None;
            }
            q += p / m + m.ln();
        }
        q.is_finite().then_some(Fitted {
            model,
            mean,
            lines,
            q,
        })
    }

    /// `u_j`: derivatives of the mean over the mean, one column for each parameter.
    fn derivatives(&self) -> DMatrix<f64> {
        let (n, k) = (self.mean.len(), self.lines.len());
        let mut u = DMatrix::zeros(n, EACH * k + 1);
        for (i, (r, line)) in self.model.resonances.iter().zip(&self.lines).enumerate() {
            let (nu, c) = (r.decay(), r.c);
            for (j, (v, d)) in line.value.iter().zip(&line.slope).enumerate() {
                let m = self.mean[j];
                let moved = c * d;
                u[(j, EACH * i)] = -nu * moved.re / m;
                u[(j, EACH * i + 1)] = -TAU * moved.im / m;
                u[(j, EACH * i + 2)] = v.re / m;
                u[(j, EACH * i + 3)] = -v.im / m;
            }
        }
        for (j, m) in self.mean.iter().enumerate() {
            u[(j, EACH * k)] = 1.0 / m;
        }
        u
    }

    /// The model a step of the parameters away; steps in decay and frequency are held within reach.
    fn moved(&self, data: &Data, step: &DVector<f64>) -> Model {
        let mut model = self.model.clone();
        for (i, r) in model.resonances.iter_mut().enumerate() {
            let at = EACH * i;
            let nu = r.decay();
            let most = (nu / TAU).max(data.bins.width());
            let decay =
                (nu * step[at].clamp(-0.7, 0.7).exp()).clamp(data.least_decay(), data.most_decay());
            let frequency =
                (r.frequency() + step[at + 1].clamp(-most, most)).max(0.25 * data.bins.width());
            r.s = Complex64::new(-decay, TAU * frequency);
            r.c += Complex64::new(step[at + 2], step[at + 3]);
        }
        model.floor += step[EACH * self.lines.len()];
        model
    }
}

/// Minimises `Q` from a start by scoring with damping (Levenberg 1944, Marquardt 1963); ends where a step
/// gains less than `tolerance` or after `most` steps.
pub(super) fn minimise(data: &Data, start: Fitted, most: usize, tolerance: f64) -> Fitted {
    let mut best = start;
    let mut damping = 1e-3;
    for _ in 0..most {
        let u = best.derivatives();
        let mut information = u.tr_mul(&u);
        let misfit = DVector::from_iterator(
            best.mean.len(),
            best.mean.iter().zip(data.power).map(|(m, p)| p / m - 1.0),
        );
        let slope = u.tr_mul(&misfit);
        // Unit diagonal: parameters differ in size by many orders.
        let size: Vec<f64> = (0..slope.len())
            .map(|i| information[(i, i)].sqrt().max(f64::MIN_POSITIVE))
            .collect();
        let scaled =
            DVector::from_iterator(slope.len(), slope.iter().zip(&size).map(|(g, s)| g / s));
        for i in 0..slope.len() {
            for j in 0..slope.len() {
                information[(i, j)] /= size[i] * size[j];
            }
        }
        let mut gain = None;
        for _ in 0..8 {
            let mut damped = information.clone();
            for i in 0..slope.len() {
                damped[(i, i)] += damping;
            }
            let step = damped.cholesky().map(|c| c.solve(&scaled));
            let tried = step.and_then(|mut step| {
                for (x, s) in step.iter_mut().zip(&size) {
                    *x /= s;
                }
                Fitted::of(data, best.moved(data, &step))
            });
            match tried {
                Some(next) if next.q < best.q => {
                    gain = Some(best.q - next.q);
                    best = next;
                    damping = (damping * 0.2_f64).max(1e-9);
                    break;
                }
                _ => damping = (damping * 8.0_f64).min(1e6),
            }
        }
        if gain.is_none_or(|g| g < tolerance) {
            break;
        }
    }
    best
}

/// Covariance of the parameters; `None` where the information is singular.
pub(super) fn covariance(data: &Data, fitted: &Fitted) -> Option<DMatrix<f64>> {
    let mut u = fitted.derivatives();
    let size: Vec<f64> = u.column_iter().map(|c| c.norm()).collect();
    for (mut column, s) in u.column_iter_mut().zip(&size) {
        column /= s.max(f64::MIN_POSITIVE);
    }
    let inverse = u.tr_mul(&u).cholesky()?.inverse();
    let n = u.nrows();
    let mut middle = DMatrix::zeros(u.ncols(), u.ncols());
    for (apart, kappa) in data.kappa.iter().enumerate().take(n) {
        let products = u.rows(0, n - apart).tr_mul(&u.rows(apart, n - apart));
        if apart == 0 {
            middle += products * *kappa;
        } else {
            middle += (&products + products.transpose()) * *kappa;
        }
    }
    let mut covariance = &inverse * middle * &inverse;
    for i in 0..size.len() {
        for j in 0..size.len() {
            covariance[(i, j)] /= size[i] * size[j];
        }
    }
    Some(covariance)
}
