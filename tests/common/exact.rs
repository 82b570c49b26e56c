//! Functions whose zeros are known exactly, to hold counting and finding against.

use num_complex::Complex64;
use stillflame::numerics::analytic::{Analytic, Region, Rounding, TAYLOR};
use stillflame::waves::law::{Delayed, Law};
use stillflame::waves::tape::{Entry, Tape, Writer};

/// Length unit of the plane of `s` in which the polynomials below have coefficients of order one.
pub const UNIT: f64 = 1000.0;

/// `prod (s - z_k)/UNIT` by its coefficients in `s/UNIT`, lowest first.
#[derive(Clone, Debug)]
pub struct Polynomial {
    coefficients: Vec<Complex64>,
    symmetric: bool,
}

impl Polynomial {
    /// With the given zeros, each with its conjugate unless real.
    pub fn symmetric(zeros: &[Complex64]) -> Self {
        let mut p = Self::with(&[]);
        for z in zeros {
            let x = z / UNIT;
            if z.im == 0.0 {
                p.multiply(&[-x, Complex64::new(1.0, 0.0)]);
            } else {
                let (a, b) = (-2.0 * x.re, x.norm_sqr());
                p.multiply(&[b.into(), a.into(), Complex64::new(1.0, 0.0)]);
            }
        }
        p.symmetric = true;
        p
    }

    /// With the given zeros and no others.
    pub fn with(zeros: &[Complex64]) -> Self {
        let mut p = Polynomial {
            coefficients: vec![Complex64::new(1.0, 0.0)],
            symmetric: false,
        };
        for z in zeros {
            p.multiply(&[-z / UNIT, Complex64::new(1.0, 0.0)]);
        }
        p
    }

    fn multiply(&mut self, factor: &[Complex64]) {
        let mut product =
            vec![Complex64::new(0.0, 0.0); self.coefficients.len() + factor.len() - 1];
        for (i, a) in self.coefficients.iter().enumerate() {
            for (j, b) in factor.iter().enumerate() {
                product[i + j] += a * b;
            }
        }
        self.coefficients = product;
    }

    fn series<const N: usize>(&self, s: Complex64) -> [Complex64; N] {
        let x = s / UNIT;
        let mut t = [Complex64::new(0.0, 0.0); N];
        for c in self.coefficients.iter().rev() {
            for k in (1..N).rev() {
                t[k] = t[k] * x + t[k - 1];
            }
            t[0] = t[0] * x + c;
        }
        let mut scale = 1.0;
        for t in &mut t {
            *t *= scale;
            scale /= UNIT;
        }
        t
    }
}

impl Analytic for Polynomial {
    fn value_and_slope(&self, s: Complex64) -> (Complex64, Complex64) {
        let [a, b] = self.series::<2>(s);
        (a, b)
    }

    fn taylor(&self, s: Complex64) -> [Complex64; 4] {
        self.series(s)
    }

    fn bound(&self, region: &Region) -> [f64; TAYLOR] {
        let moduli = Polynomial {
            coefficients: self.coefficients.iter().map(|c| c.norm().into()).collect(),
            symmetric: true,
        };
        moduli.series::<TAYLOR>(region.modulus.into()).map(|c| c.re)
    }

    fn rounding(&self) -> Rounding {
        // Horner: two operations a degree, and those that formed the coefficients.
        Rounding {
            values: 8.0 * self.coefficients.len() as f64,
            arguments: 1.0,
        }
    }

    fn is_symmetric(&self) -> bool {
        self.symmetric
    }
}

/// `1 + epsilon + n exp(-s tau)` with zeros `(ln(n/(1 + epsilon)) + i (2k + 1) pi)/tau`.
pub fn intrinsic(epsilon: f64, n: f64, tau: f64) -> Tape<f64> {
    let mut writer = Writer::default();
    let law = Law::Delays(vec![Delayed {
        weight: n,
        delay: tau,
        spread: 0.0,
    }]);
    let entry = Entry::of(law, vec![vec![1.0]]);
    writer.map(vec![vec![1.0 + epsilon]], vec![entry]);
    writer.finish().expect("one slot").0
}
