//! Fit of several resonances on a floor to averaged spectra, by likelihood.
//!
//! The estimates `P_j` of a spectral matrix of mean `S_j` (`model`), averaged over `n_d` records, are distributed as Wishart matrices, of one sensor
//! as gamma variates of shape `n_d`: minus the logarithm of their density is `n_d (tr S_j^-1 P_j + ln det S_j)` and a constant. The parameters are those of the least
//!
//! ```text
//! Q = sum_j (tr S_j^-1 P_j + ln det S_j) + (K/2) sum_k |e_k|^2
//! ```
//!
//! (Whittle 1953; with `S_j` the exact mean of the estimate: Sykulski et al. 2019, Biometrika 106, 251). Neighbouring bins are
//! correlated by `kappa_{|i-j|}`, relative to their means; a sum over bins has the information of as many independent
//! ones over `K = sum kappa`. The second term of `Q` is what is known of the drives beforehand (`model`).
//!
//! With `G_j S_j G_j^H = 1`, `u_j` the real numbers in `G_j dS_j G_j^H` and `B` the second derivative of the second term, the covariance of the parameters is
//!
//! ```text
//! (F + B)^-1 (sum_ij kappa_{|i-j|} u_i u_j^T + K B) (F + B)^-1,   F = sum_j u_j u_j^T
//! ```

use std::f64::consts::PI;

use nalgebra::linalg::Cholesky;
use nalgebra::{DMatrix, DVector, Dyn};
use num_complex::Complex64;

use super::fitted::{Fitted, flatten, sandwich};
use super::line::Line;
use super::model::{Data, Resonance, known_turns};

/// Adds what is known beforehand to `F` and to the slope of `-Q`.
fn add_known(
    data: &Data,
    fitted: &Fitted,
    information: &mut DMatrix<f64>,
    mut slope: Option<&mut DVector<f64>>,
) {
    let (each, inflation) = (data.each(), data.inflation());
    for (k, r) in fitted.model.resonances.iter().enumerate() {
        let (values, turns) = known_turns(data, r);
        let mut part = information.view_mut((each * k, each * k), (each, each));
        part += turns.tr_mul(&turns) * inflation;
        if let Some(slope) = slope.as_deref_mut() {
            let pull = turns.tr_mul(&DVector::from_vec(values)) * inflation;
            let mut part = slope.rows_mut(each * k, each);
            part -= pull;
        }
    }
}

/// Minimises `Q` from a start by scoring with damping (Levenberg 1944, Marquardt 1963); ends where a step
/// gains less than `tolerance` or after `most` steps.
pub(super) fn minimise(data: &Data, start: Fitted, most: usize, tolerance: f64) -> Fitted {
    let mut best = start;
    let mut damping = 1e-3;
    for _ in 0..most {
        let u = best.derivatives(data);
        let mut information = &u * u.transpose();
        let mut slope = &u * DVector::from_vec(best.misfit(data));
        add_known(data, &best, &mut information, Some(&mut slope));
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
                Fitted::of(data, best.moved(data, step.as_slice()))
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

/// Covariance of the parameters.
pub(super) fn covariance(data: &Data, fitted: &Fitted) -> DMatrix<f64> {
    let mut u = fitted.derivatives(data);
    let mut known = DMatrix::zeros(u.nrows(), u.nrows());
    add_known(data, fitted, &mut known, None);
    let size: Vec<f64> = (u.row_iter().zip(known.diagonal().iter()))
        .map(|(row, k)| (row.norm_squared() + k).sqrt().max(f64::MIN_POSITIVE))
        .collect();
    for (mut row, s) in u.row_iter_mut().zip(&size) {
        row /= *s;
    }
    for i in 0..size.len() {
        for j in 0..size.len() {
            known[(i, j)] /= size[i] * size[j];
        }
    }
    let (cells, all) = (data.cells(), u.ncols());
    let mut middle = &known * data.inflation();
    let mut information = known;
    for (apart, kappa) in data.kappa.iter().enumerate() {
        let some = all.saturating_sub(apart * cells);
        let products = u.columns(0, some) * u.columns(apart * cells, some).transpose();
        if apart == 0 {
            information += &products;
            middle += products * *kappa;
        } else {
            middle += (&products + products.transpose()) * *kappa;
        }
    }
    let inverse = inverse(information);
    let mut covariance = &inverse * middle * &inverse;
    for i in 0..size.len() {
        for j in 0..size.len() {
            covariance[(i, j)] /= size[i] * size[j];
        }
    }
    covariance
}

/// Least eigenvalue of an information of unit diagonal that is more than rounding.
const ROUNDING: f64 = 1e-13;

/// Inverse of an information of unit diagonal. What the record says nothing of, two lines in one place or a width far below a bin, gets a variance so large
/// that nobody takes it for known, and leaves the rest alone.
fn inverse(information: DMatrix<f64>) -> DMatrix<f64> {
    if let Some(root) = information.clone().cholesky() {
        return root.inverse();
    }
    let eigen = information.symmetric_eigen();
    let inverted = eigen.eigenvalues.map(|e| e.max(ROUNDING).recip());
    &eigen.eigenvectors * DMatrix::from_diagonal(&inverted) * eigen.eigenvectors.transpose()
}

/// Where the variance of the mean square of a resonance stands in the covariance.
pub(super) fn place_of_square(data: &Data, k: usize, r: &Resonance) -> usize {
    // Drives and shapes of the sensors before, each a complex number.
    data.each() * k + 2 + 4 * r.loudest
}

/// What a resonance more would gain, to second order, with all other parameters free to follow (the score test, Rao
/// 1948).
pub(super) struct Score {
    u: DMatrix<f64>,
    information: Cholesky<f64, Dyn>,
    misfit: DVector<f64>,
    /// `G^H [G (P - S) G^H] G` at every bin.
    pull: Vec<Complex64>,
    inflation: f64,
}

impl Score {
    pub(super) fn new(data: &Data, fitted: &Fitted) -> Option<Score> {
        let mut u = fitted.derivatives(data);
        for mut row in u.row_iter_mut() {
            let size = row.norm().max(f64::MIN_POSITIVE);
            row /= size;
        }
        let mut information = &u * u.transpose();
        for i in 0..u.nrows() {
            information[(i, i)] += 1e-9;
        }
        let (n, cells) = (data.sensors, data.cells());
        let mut pull = Vec::with_capacity(data.power.len());
        let mut white = vec![Complex64::ZERO; cells];
        for (j, g) in fitted.whitener.chunks_exact(cells).enumerate() {
            sandwich(g, data.at(j), n, &mut white);
            for i in 0..n {
                white[i * n + i].re -= 1.0;
            }
            let weight = data.weight(j);
            for a in 0..n {
                for b in 0..n {
                    let mut sum = Complex64::ZERO;
                    for i in a..n {
                        for l in b..n {
                            sum += g[i * n + a].conj() * white[i * n + l] * g[l * n + b] * weight;
                        }
                    }
                    pull.push(sum);
                }
            }
        }
        Some(Score {
            information: information.cholesky()?,
            misfit: DVector::from_vec(fitted.misfit(data)),
            inflation: data.inflation(),
            pull,
            u,
        })
    }

    /// Gain in twice the log-likelihood of a resonance at `s` that noise of its own drives, and the resonance.
    pub(super) fn of(
        &self,
        data: &Data,
        fitted: &Fitted,
        s: Complex64,
    ) -> Option<(f64, Resonance)> {
        let line = data.bins.line(s);
        let (n, cells) = (data.sensors, data.cells());
        // The shape it is most likely to have.
        let mut slope = DMatrix::zeros(n, n);
        for ((near, far), pull) in line
            .near
            .iter()
            .zip(&line.far)
            .zip(self.pull.chunks_exact(cells))
        {
            for a in 0..n {
                for b in 0..n {
                    slope[(a, b)] += pull[a * n + b] * near.re + pull[b * n + a] * far.re;
                }
            }
        }
        self.with_line(data, fitted, s, &line, &top(slope).1)
    }

    /// The same in a shape given.
    pub(super) fn with(
        &self,
        data: &Data,
        fitted: &Fitted,
        s: Complex64,
        shape: &[Complex64],
    ) -> Option<(f64, Resonance)> {
        self.with_line(data, fitted, s, &data.bins.line(s), shape)
    }

    fn with_line(
        &self,
        data: &Data,
        fitted: &Fitted,
        s: Complex64,
        line: &Line,
        shape: &[Complex64],
    ) -> Option<(f64, Resonance)> {
        let (n, cells) = (data.sensors, data.cells());
        let mut more = Vec::with_capacity(self.misfit.len());
        let mut part = vec![Complex64::ZERO; cells];
        let mut white = vec![Complex64::ZERO; cells];
        for (j, g) in fitted.whitener.chunks_exact(cells).enumerate() {
            for a in 0..n {
                for b in 0..n {
                    let c = shape[a] * shape[b].conj();
                    part[a * n + b] = c * line.near[j].re + c.conj() * line.far[j].re;
                }
            }
            sandwich(g, &part, n, &mut white);
            let root = data.weight(j).sqrt();
            white.iter_mut().for_each(|w| *w *= root);
            flatten(&white, n, &mut more);
        }
        let more = DVector::from_vec(more);
        let shared = &self.u * &more;
        let own = more.norm_squared() - shared.dot(&self.information.solve(&shared));
        let slope = more.dot(&self.misfit);
        // No resonance has a negative mean square.
        (own > 0.0 && slope > 0.0).then(|| {
            let gain = slope * slope / (own * self.inflation);
            (gain, Resonance::alone(s, shape.to_vec(), slope / own))
        })
    }
}

/// Largest eigenvalue of a Hermitian matrix and its vector.
pub(super) fn top(m: DMatrix<Complex64>) -> (f64, Vec<Complex64>) {
    if m.nrows() == 1 {
        return (m[(0, 0)].re, vec![Complex64::ONE]);
    }
    let eigen = m.symmetric_eigen();
    let at = eigen.eigenvalues.imax();
    (
        eigen.eigenvalues[at],
        eigen.eigenvectors.column(at).iter().copied().collect(),
    )
}

/// Another fit that describes the spectrum, for what it says of resonances both have, in the order of the fit chosen.
pub(super) struct Other {
    /// Akaike's criterion.
    criterion: f64,
    resonances: Vec<Resonance>,
}

fn criterion(data: &Data, fit: &Fitted) -> f64 {
    2.0 * fit.q / data.inflation() + 2.0 * (data.each() * fit.model.resonances.len()) as f64
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

/// What of a resonance is asked.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Asked {
    /// ln decay rate.
    Decay,
    /// Frequency (Hz).
    Frequency,
    /// Mean square where it is loudest.
    Square,
}

impl Asked {
    pub(super) fn of(self, r: &Resonance) -> f64 {
        match self {
            Asked::Decay => r.decay().ln(),
            Asked::Frequency => r.frequency(),
            Asked::Square => r.square(),
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
    asked: Asked,
) -> f64 {
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
            sum += weight * (asked.of(r) - asked.of(own)).powi(2);
            weights += weight;
        }
    }
    sum / weights
}
