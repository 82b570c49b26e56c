//! Level of a channel in one pass: mean, rms, moments, extremes and how often they are met.
//!
//! Moments about the mean are merged block by block (Pebay 2008, SAND2008-6212), so that a mean much
//! larger than the fluctuation costs no digits.

use serde::Serialize;

/// Accumulated level of a channel.
#[derive(Clone, Copy, Debug, Default, PartialEq, Serialize)]
pub struct Level {
    /// Samples taken.
    pub count: u64,
    /// Samples that were not finite, which nothing else counts.
    pub not_finite: u64,
    /// Mean (unit).
    pub mean: f64,
    second: f64,
    third: f64,
    fourth: f64,
    /// Smallest sample (unit), and how many samples have exactly this value: many where a channel is
    /// clipped.
    pub lowest: (f64, u64),
    /// Largest sample (unit), and how many samples have exactly this value.
    pub highest: (f64, u64),
    /// Longest run of samples of the same value: long where a channel has stopped or is clipped.
    pub longest_run: u64,
    last: Option<f64>,
    run: u64,
}

impl Level {
    /// Nothing so far.
    pub fn new() -> Level {
        Level::default()
    }

    /// Takes the next samples.
    pub fn feed(&mut self, samples: &[f64]) {
        for block in samples.chunks(1024) {
            self.block(block);
        }
    }

    fn block(&mut self, samples: &[f64]) {
        let mut sum = 0.0;
        let mut finite = 0_u64;
        for &x in samples {
            if !x.is_finite() {
                self.not_finite += 1;
                self.last = None;
                continue;
            }
            if self.count + finite == 0 {
                (self.lowest, self.highest) = ((x, 0), (x, 0));
            }
            sum += x;
            finite += 1;
            meet(&mut self.lowest, x, |x, least| x < least);
            meet(&mut self.highest, x, |x, most| x > most);
            self.run = if self.last == Some(x) {
                self.run + 1
            } else {
                1
            };
            self.last = Some(x);
            self.longest_run = self.longest_run.max(self.run);
        }
        if finite == 0 {
            return;
        }
        let n = finite as f64;
        let mean = sum / n;
        let (mut m2, mut m3, mut m4) = (0.0, 0.0, 0.0);
        for x in samples.iter().filter(|x| x.is_finite()) {
            let d = x - mean;
            let d2 = d * d;
            m2 += d2;
            m3 += d2 * d;
            m4 += d2 * d2;
        }
        let (na, nb) = (self.count as f64, n);
        let total = na + nb;
        let d = mean - self.mean;
        let (a2, a3) = (self.second, self.third);
        self.fourth += m4
            + d.powi(4) * na * nb * (na * na - na * nb + nb * nb) / total.powi(3)
            + 6.0 * d * d * (na * na * m2 + nb * nb * a2) / (total * total)
            + 4.0 * d * (na * m3 - nb * a3) / total;
        self.third += m3
            + d.powi(3) * na * nb * (na - nb) / (total * total)
            + 3.0 * d * (na * m2 - nb * a2) / total;
        self.second += m2 + d * d * na * nb / total;
        self.mean += d * nb / total;
        self.count += finite;
    }

    /// Standard deviation (unit), the rms of the fluctuation.
    pub fn deviation(&self) -> f64 {
        (self.second / self.count as f64).sqrt()
    }

    /// Root of the mean square, mean included (unit).
    pub fn rms(&self) -> f64 {
        (self.second / self.count as f64 + self.mean * self.mean).sqrt()
    }

    /// Skewness: zero for noise.
    pub fn skewness(&self) -> f64 {
        let n = self.count as f64;
        n.sqrt() * self.third / self.second.powf(1.5)
    }

    /// Kurtosis: 3 for noise, 1.5 for a sine.
    pub fn kurtosis(&self) -> f64 {
        self.count as f64 * self.fourth / (self.second * self.second)
    }

    /// Whether every sample has the same value.
    pub fn constant(&self) -> bool {
        self.count > 0 && self.lowest.0 == self.highest.0
    }
}

/// Counts a sample that equals the extreme so far, or makes it the extreme.
fn meet(extreme: &mut (f64, u64), x: f64, beyond: impl Fn(f64, f64) -> bool) {
    if beyond(x, extreme.0) {
        *extreme = (x, 1);
    } else if x == extreme.0 {
        extreme.1 += 1;
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn moments(x: &[f64]) -> (f64, f64, f64, f64) {
        let n = x.len() as f64;
        let mean = x.iter().sum::<f64>() / n;
        let m = |k: i32| x.iter().map(|x| (x - mean).powi(k)).sum::<f64>() / n;
        (
            mean,
            m(2).sqrt(),
            m(3) / m(2).powf(1.5),
            m(4) / (m(2) * m(2)),
        )
    }

    proptest! {
        #[test]
        fn blocks_add_up(x in prop::collection::vec(-5.0..5.0_f64, 8..400), cut in 0..400_usize, offset in -1e3..1e3_f64) {
            let x: Vec<f64> = x.iter().map(|x| x + offset).collect();
            let cut = cut.min(x.len());
            let mut level = Level::new();
            level.feed(&x[..cut]);
            level.feed(&x[cut..]);
            let (mean, deviation, skewness, kurtosis) = moments(&x);
            prop_assert!((level.mean - mean).abs() < 1e-10);
            prop_assert!((level.deviation() / deviation - 1.0).abs() < 1e-9);
            prop_assert!((level.skewness() - skewness).abs() < 1e-7);
            prop_assert!((level.kurtosis() / kurtosis - 1.0).abs() < 1e-7);
            prop_assert_eq!(level.lowest.0, x.iter().copied().fold(f64::INFINITY, f64::min));
        }
    }

    #[test]
    fn a_sine_has_kurtosis_three_halves_and_clipping_shows() {
        let sine: Vec<f64> = (0..6400)
            .map(|i| 3.0 * (0.1 * f64::from(i)).sin())
            .collect();
        let mut level = Level::new();
        level.feed(&sine);
        assert!((level.kurtosis() - 1.5).abs() < 1e-2);
        let clipped: Vec<f64> = sine.iter().map(|x| x.clamp(-2.0, 2.5)).collect();
        let mut level = Level::new();
        level.feed(&clipped);
        assert!(level.lowest.1 > 1000 && level.highest.1 > 500 && level.longest_run > 10);
        level.feed(&[f64::NAN]);
        assert_eq!(level.not_finite, 1);
    }
}
