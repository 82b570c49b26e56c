//! A function that counts how often it is asked.

use std::sync::atomic::{AtomicUsize, Ordering::Relaxed};

use num_complex::Complex64;
use stillflame::numerics::analytic::{Analytic, Region, Rounding, TAYLOR};

pub struct Counting<'f, F> {
    inner: &'f F,
    values: AtomicUsize,
    series: AtomicUsize,
    bounds: AtomicUsize,
}

/// How often.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Calls {
    pub values: usize,
    pub series: usize,
    pub bounds: usize,
}

impl<'f, F: Analytic> Counting<'f, F> {
    pub fn of(inner: &'f F) -> Self {
        Counting {
            inner,
            values: AtomicUsize::new(0),
            series: AtomicUsize::new(0),
            bounds: AtomicUsize::new(0),
        }
    }

    pub fn calls(&self) -> Calls {
        Calls {
            values: self.values.load(Relaxed),
            series: self.series.load(Relaxed),
            bounds: self.bounds.load(Relaxed),
        }
    }
}

impl<F: Analytic> Analytic for Counting<'_, F> {
    fn value_and_slope(&self, s: Complex64) -> (Complex64, Complex64) {
        self.values.fetch_add(1, Relaxed);
        self.inner.value_and_slope(s)
    }
    fn taylor(&self, s: Complex64) -> [Complex64; 4] {
        self.series.fetch_add(1, Relaxed);
        self.inner.taylor(s)
    }
    fn bound(&self, region: &Region) -> [f64; TAYLOR] {
        self.bounds.fetch_add(1, Relaxed);
        self.inner.bound(region)
    }
    fn rounding(&self) -> Rounding {
        self.inner.rounding()
    }
    fn is_symmetric(&self) -> bool {
        self.inner.is_symmetric()
    }
}
