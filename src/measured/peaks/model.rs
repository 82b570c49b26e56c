//! Resonances as several sensors hear them: the mean of the averaged spectral matrix, and its derivatives.
//!
//! Linear modes driven by noise, in whatever way, have between sensors `a` and `b` the covariance
//!
//! ```text
//! E[x_a(t0 + t) x_b(t0)] = sum_k Re[c_a b_b exp(s t)]_k + floor_a delta_ab,   t >= 0
//! ```
//!
//! (steady covariance of `x' = A x + noise` in the basis of its modes): `c` is the shape of the mode at the sensors, `b` what drives it there. With noise of
//! its own `b` is the conjugate of `c` times the mean square and little more; modes driven by the same noise give each other the rest, so that the spectrum
//! is that of a sum of modes and not a sum of spectra. With `n_j` and `f_j` the mean estimates of the lines at `s` and at its conjugate (`line`), the
//! mean of the estimates `P_j` is
//!
//! ```text
//! S_j = F + F^H + floor,   F = sum_k [n c b^T + conj(f c b^T)]/2
//! ```
//!
//! One of the `c` is 1, that of the sensor where the mode is loudest. Of one sensor `S_j = floor + sum_k Re[b (n + f)]`.

use std::f64::consts::TAU;

use nalgebra::DMatrix;
use num_complex::Complex64;

use super::line::Bins;

/// One resonance.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Resonance {
    /// Growth rate and angular frequency (1/s).
    pub(super) s: Complex64,
    /// Sensor where it is loudest.
    pub(super) loudest: usize,
    /// Shape at the sensors: 1 at the loudest.
    pub(super) shape: Vec<Complex64>,
    /// What drives it there (unit squared).
    pub(super) drive: Vec<Complex64>,
}

impl Resonance {
    /// Driven by noise of its own, `level` times the shape by its conjugate.
    pub(super) fn alone(s: Complex64, shape: Vec<Complex64>, level: f64) -> Resonance {
        let drive = shape.iter().map(|c| c.conj() * level).collect();
        let mut own = Resonance {
            s,
            loudest: 0,
            shape,
            drive,
        };
        own.normalise();
        own
    }

    pub(super) fn decay(&self) -> f64 {
        -self.s.re
    }

    pub(super) fn frequency(&self) -> f64 {
        self.s.im / TAU
    }

    /// Mean square where it is loudest (unit squared).
    pub(super) fn square(&self) -> f64 {
        self.drive[self.loudest].re
    }

    /// `|c^H d|^2/(|c|^2 |d|^2)` of two shapes (modal assurance criterion, Allemang & Brown 1982): 1 where they are one.
    pub(super) fn likeness(&self, other: &Resonance) -> f64 {
        let pairs = self.shape.iter().zip(&other.shape);
        let inner: Complex64 = pairs.map(|(c, d)| c.conj() * d).sum();
        let size = |r: &Resonance| r.shape.iter().map(|c| c.norm_sqr()).sum::<f64>();
        inner.norm_sqr() / (size(self) * size(other))
    }

    /// Makes the largest of the shape 1.
    pub(super) fn normalise(&mut self) {
        let size = |c: &Complex64| c.norm_sqr();
        let largest = (0..self.shape.len())
            .max_by(|a, b| size(&self.shape[*a]).total_cmp(&size(&self.shape[*b])));
        let Some(largest) = largest else { return };
        let by = self.shape[largest];
        self.loudest = largest;
        self.shape.iter_mut().for_each(|c| *c /= by);
        self.drive.iter_mut().for_each(|b| *b *= by);
    }
}

/// Resonances on floors that are the same at all frequencies, one for each sensor.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Model {
    pub(super) resonances: Vec<Resonance>,
    pub(super) floor: Vec<f64>,
}

/// Spread of `b/m - conj(c)` known beforehand, `m` the mean square where the resonance is loudest. It is `-nu/(2 pi f)` of a displacement driven by white noise, the opposite of a
/// velocity, and larger only where modes that overlap are driven by the same noise.
fn asymmetry(sensors: usize) -> f64 {
    // One sensor hardly tells asymmetry from width where modes overlap; several do, and are left to.
    if sensors == 1 { 0.5 } else { 2.0 }
}

/// An averaged spectral matrix as it is fitted.
pub(super) struct Data<'a> {
    pub(super) bins: Bins,
    /// Number of sensors.
    pub(super) sensors: usize,
    /// `mean X_a conj(X_b)` at every bin, `a` the slower.
    pub(super) power: Vec<Complex64>,
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

    /// Number of bins, or of groups of bins.
    pub(super) fn groups(&self) -> usize {
        self.bins.groups().len()
    }

    /// Bins in a group.
    pub(super) fn weight(&self, group: usize) -> f64 {
        self.bins.groups().get(group).map_or(1.0, |n| *n as f64)
    }

    /// The same with bins in groups of at most `size`, for a quicker fit; alone where a line stands out from its neighbours.
    pub(super) fn grouped(&self, size: usize) -> Data<'_> {
        let (n, cells) = (self.bins.count(), self.cells());
        let loud = |j: usize| -> f64 {
            (0..self.sensors)
                .map(|a| self.at(j)[a * self.sensors + a].re)
                .sum()
        };
        let loud: Vec<f64> = (0..n).map(loud).collect();
        let mut fine = vec![false; n];
        for j in 0..n {
            let (from, to) = (j.saturating_sub(BESIDE), (j + BESIDE).min(n - 1));
            if loud[j] > OUTSTANDING * loud[from].min(loud[to]) {
                let reach = 2 * BESIDE;
                fine[j.saturating_sub(reach)..(j + reach).min(n)].fill(true);
            }
        }
        let mut groups = Vec::new();
        let mut power = Vec::new();
        let mut at = 0;
        while at < n {
            let free = fine[at..].iter().take(size).take_while(|f| !**f).count();
            let count = free.max(1);
            for i in 0..cells {
                let sum: Complex64 = (at..at + count).map(|j| self.at(j)[i]).sum();
                power.push(sum / count as f64);
            }
            groups.push(count);
            at += count;
        }
        Data {
            bins: self.bins.grouped(groups),
            power,
            ..*self
        }
    }

    /// Parameters of each resonance: ln decay, frequency, the drives, the shape but where it is 1.
    pub(super) fn each(&self) -> usize {
        4 * self.sensors
    }

    /// Real numbers in a matrix of one bin.
    pub(super) fn cells(&self) -> usize {
        self.sensors * self.sensors
    }

    pub(super) fn parameters(&self, model: &Model) -> usize {
        self.each() * model.resonances.len() + self.sensors
    }

    pub(super) fn at(&self, bin: usize) -> &[Complex64] {
        let cells = self.cells();
        &self.power[bin * cells..(bin + 1) * cells]
    }

    /// Least decay rate a fit may reach: far below what the segments resolve.
    pub(super) fn least_decay(&self) -> f64 {
        1e-3 * self.bins.width()
    }

    pub(super) fn most_decay(&self) -> f64 {
        TAU * self.bins.width() * self.bins.count() as f64
    }
}

/// Bins to the neighbours a line is held against, and the power over theirs from which on it stands out.
const BESIDE: usize = 6;
const OUTSTANDING: f64 = 12.0;

/// Most sensors fitted together.
pub(super) const MOST_SENSORS: usize = 8;

/// `(b/m - conj(c))` over its spread at the sensors, `m` the mean square where the resonance is loudest.
pub(super) fn known(r: &Resonance) -> Vec<Complex64> {
    let m = r.square();
    let each = r.shape.iter().zip(&r.drive);
    let spread = asymmetry(r.shape.len());
    each.map(|(c, b)| (b / m - c.conj()) / spread).collect()
}

/// The same as real numbers, with its derivatives by the parameters of the resonance: one row for each number.
pub(super) fn known_turns(data: &Data, r: &Resonance) -> (Vec<f64>, DMatrix<f64>) {
    let values: Vec<f64> = known(r).iter().flat_map(|e| [e.re, e.im]).collect();
    let mut turns = DMatrix::zeros(values.len(), data.each());
    let (m, spread) = (r.square(), asymmetry(data.sensors));
    let mut next = 2;
    for a in 0..data.sensors {
        turns[(2 * a, next)] += 1.0 / (m * spread);
        turns[(2 * a + 1, next + 1)] += 1.0 / (m * spread);
        if a == r.loudest {
            for (i, b) in r.drive.iter().enumerate() {
                turns[(2 * i, next)] -= b.re / (m * m * spread);
                turns[(2 * i + 1, next)] -= b.im / (m * m * spread);
            }
            next += 2;
        } else {
            turns[(2 * a, next + 2)] -= 1.0 / spread;
            turns[(2 * a + 1, next + 3)] += 1.0 / spread;
            next += 4;
        }
    }
    (values, turns)
}
