//! Fit of several resonances on a floor to an averaged spectrum, by likelihood.
//!
//! An estimate `P_j` of mean `M_j` averaged over `n_d` records has a gamma density of shape `n_d`, so that minus its logarithm is
//! `n_d (P_j/M_j + ln M_j)` and a constant. The parameters are those of the least
//!
//! ```text
//! Q = sum_j (P_j/M_j + ln M_j) + (K/2) sum_k (Im C_k/(0.5 Re C_k))^2,   M_j = floor + sum_k Re[C_k L_j(s_k)]
//! ```
//!
//! (Whittle 1953; with `M_j` the exact mean of the estimate: Sykulski et al. 2019, Biometrika 106, 251). Neighbouring bins are
//! correlated by `kappa_{|i-j|}`, relative to their means; a sum over bins has the information of as many independent
//! ones over `K = sum kappa`. The second term of `Q` is what is known of the asymmetries beforehand (`ASYMMETRY`).
//!
//! With `u_j = dM_j/M_j` and `B` the second derivative of the second term, the covariance of the parameters is
//!
//! ```text
//! (F + B)^-1 (sum_ij kappa_{|i-j|} u_i u_j^T + K B) (F + B)^-1,   F = sum_j u_j u_j^T
//! ```

use std::f64::consts::{PI, TAU};

use nalgebra::linalg::Cholesky;
use nalgebra::{DMatrix, DVector, Dyn};
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

/// Resonances on a floor that is the same at all frequencies.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Model {
    pub(super) resonances: Vec<Resonance>,
    pub(super) floor: f64,
}

/// Spread of `Im C/Re C` known beforehand: it is `-nu/(2 pi f)` of a displacement driven by white noise, the opposite of a
/// velocity, and larger only where modes that overlap are driven by the same noise.
const ASYMMETRY: f64 = 0.5;

/// `Im C/Re C` in units of its spread.
fn asymmetry(c: Complex64) -> f64 {
    c.im / (ASYMMETRY * c.re)
}

/// Its derivatives with respect to the real and the imaginary part.
fn asymmetry_turns(c: Complex64) -> [f64; 2] {
    [-asymmetry(c) / c.re, 1.0 / (ASYMMETRY * c.re)]
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
        if model.resonances.iter().any(|r| r.c.re <= 0.0) {
            return None;
        }
        let mut mean = vec![model.floor; data.bins.count()];
        for (r, line) in model.resonances.iter().zip(&lines) {
            for (m, v) in mean.iter_mut().zip(&line.value) {
                *m += r.c.re * v.re - r.c.im * v.im;
            }
        }
        let asymmetries = model.resonances.iter().map(|r| asymmetry(r.c).powi(2));
        let mut q = 0.5 * data.inflation() * asymmetries.sum::<f64>();
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
        let mut slope = u.tr_mul(&misfit);
        let inflation = data.inflation();
        for (k, r) in best.model.resonances.iter().enumerate() {
            let at = EACH * k + 2;
            let (rho, turns) = (asymmetry(r.c), asymmetry_turns(r.c));
            for (i, a) in turns.iter().enumerate() {
                slope[at + i] -= inflation * rho * a;
                for (j, b) in turns.iter().enumerate() {
                    information[(at + i, at + j)] += inflation * a * b;
                }
            }
        }
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
    let inflation = data.inflation();
    let mut information = u.tr_mul(&u);
    let mut known = DMatrix::zeros(u.ncols(), u.ncols());
    for (k, r) in fitted.model.resonances.iter().enumerate() {
        let at = EACH * k + 2;
        let turns = asymmetry_turns(r.c);
        for i in 0..2 {
            for j in 0..2 {
                let part = turns[i] * turns[j] / (size[at + i] * size[at + j]);
                information[(at + i, at + j)] += inflation * part;
                known[(at + i, at + j)] += inflation * inflation * part;
            }
        }
    }
    let inverse = information.cholesky()?.inverse();
    let n = u.nrows();
    let mut middle = known;
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

/// What a resonance more would gain, to second order, with all other parameters free to follow (the score test, Rao
/// 1948).
pub(super) struct Score {
    u: DMatrix<f64>,
    information: Cholesky<f64, Dyn>,
    misfit: DVector<f64>,
    inflation: f64,
}

impl Score {
    pub(super) fn new(data: &Data, fitted: &Fitted) -> Option<Score> {
        let mut u = fitted.derivatives();
        for mut column in u.column_iter_mut() {
            let size = column.norm().max(f64::MIN_POSITIVE);
            column /= size;
        }
        let mut information = u.tr_mul(&u);
        for i in 0..u.ncols() {
            information[(i, i)] += 1e-9;
        }
        let misfit = fitted.mean.iter().zip(data.power).map(|(m, p)| p / m - 1.0);
        Some(Score {
            information: information.cholesky()?,
            misfit: DVector::from_iterator(u.nrows(), misfit),
            inflation: data.inflation(),
            u,
        })
    }

    /// Gain in twice the log-likelihood, and the mean square that brings it, of a resonance at `s`.
    pub(super) fn of(&self, data: &Data, fitted: &Fitted, s: Complex64) -> Option<(f64, f64)> {
        let line = data.bins.line(s);
        let terms = line.value.iter().zip(&fitted.mean).map(|(v, m)| v.re / m);
        let more = DVector::from_iterator(self.u.nrows(), terms);
        let shared = self.u.tr_mul(&more);
        let own = more.norm_squared() - shared.dot(&self.information.solve(&shared));
        let slope = more.dot(&self.misfit);
        // No resonance has a negative mean square.
        (own > 0.0 && slope > 0.0).then(|| (slope * slope / (own * self.inflation), slope / own))
    }
}

/// Another fit that describes the spectrum, for what it says of resonances both have, in the order of the fit chosen.
pub(super) struct Other {
    /// Akaike's criterion.
    criterion: f64,
    resonances: Vec<Resonance>,
}

fn criterion(data: &Data, fit: &Fitted) -> f64 {
    2.0 * fit.q / data.inflation() + 2.0 * (EACH * fit.model.resonances.len()) as f64
}

impl Other {
    pub(super) fn new(data: &Data, fit: &Fitted) -> Other {
        Other {
            criterion: criterion(data, fit),
            resonances: fit.model.resonances.clone(),
        }
    }

    /// Leaves out a resonance that the fit chosen has given up.
    pub(super) fn forget(&mut self, k: usize) {
        if k < self.resonances.len() {
            self.resonances.remove(k);
        }
    }
}

/// Spread of a parameter between fits that describe the spectrum about as well, as a mean square about the fit chosen: each
/// weighs `exp(-AIC/2)` against it (Burnham & Anderson 2002, Model Selection and Multimodel Inference). Where a resonance has
/// become another one in a fit, that fit does not speak of it.
pub(super) fn between(
    data: &Data,
    chosen: &Fitted,
    others: &[Other],
    k: usize,
    parameter: usize,
) -> f64 {
    let value = |r: &Resonance| match parameter {
        0 => r.decay().ln(),
        1 => r.frequency(),
        2 => r.c.re,
        _ => r.c.im,
    };
    let Some(own) = chosen.model.resonances.get(k) else {
        return 0.0;
    };
    let best = criterion(data, chosen);
    let (mut sum, mut weights) = (0.0, 1.0);
    for other in others {
        let Some(r) = other.resonances.get(k) else {
            continue;
        };
        let same = (r.frequency() - own.frequency()).abs() < own.decay() / PI
            && (r.decay() / own.decay()).ln().abs() < 0.7;
        if same {
            let weight = (0.5 * (best - other.criterion)).min(0.0).exp();
            sum += weight * (value(r) - value(own)).powi(2);
            weights += weight;
        }
    }
    sum / weights
}
