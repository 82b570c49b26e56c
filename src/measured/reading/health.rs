//! What the samples of a channel tell of the channel itself: clipping, standstill.

use crate::problems::Problem;

/// Samples in a row at an extreme from which on the channel is taken for clipped.
const RUN: u64 = 3;

/// Runs at an extreme from which on the channel is taken for clipped.
const RUNS: u64 = 3;

/// Part of the record that one value may fill before the channel is said to have stopped, and least samples of that.
const STOPPED: f64 = 0.01;
const STOPPED_LEAST: u64 = 100;

#[derive(Clone, Copy, Debug, Default)]
struct Extreme {
    value: f64,
    count: u64,
    run: u64,
    runs: u64,
    first: u64,
}

impl Extreme {
    fn meet(&mut self, x: f64, at: u64, beyond: bool) {
        if beyond {
            *self = Extreme {
                value: x,
                count: 1,
                run: 1,
                runs: 0,
                first: at,
            };
        } else if x == self.value {
            self.count += 1;
            self.run += 1;
            self.runs += u64::from(self.run == RUN);
        } else {
            self.run = 0;
        }
    }

    fn clipped(&self) -> bool {
        self.runs >= RUNS
    }
}

/// What was seen of a channel, in the unit of the file.
#[derive(Clone, Debug, Default)]
pub struct Health {
    seen: u64,
    low: Extreme,
    high: Extreme,
    last: f64,
    run: u64,
    longest: u64,
    longest_from: u64,
}

impl Health {
    /// Takes the next samples.
    pub(super) fn feed(&mut self, samples: &[f64]) {
        for &x in samples {
            if self.seen == 0 {
                self.low.meet(x, 0, true);
                self.high.meet(x, 0, true);
                self.run = 1;
            } else {
                self.low.meet(x, self.seen, x < self.low.value);
                self.high.meet(x, self.seen, x > self.high.value);
                self.run = if x == self.last { self.run + 1 } else { 1 };
            }
            if self.run > self.longest {
                self.longest = self.run;
                self.longest_from = self.seen + 1 - self.run;
            }
            self.last = x;
            self.seen += 1;
        }
    }

    /// Whether every sample has the same value.
    pub fn constant(&self) -> bool {
        self.seen > 0 && self.low.value == self.high.value
    }

    /// Samples at a limit the channel is clipped at; zero where it is not.
    pub fn clipped(&self) -> u64 {
        if self.constant() {
            return 0;
        }
        [&self.low, &self.high]
            .into_iter()
            .filter(|e| e.clipped())
            .map(|e| e.count)
            .sum()
    }

    /// What of it qualifies an answer.
    pub(super) fn remarks(&self, name: &str, rate: f64, start: f64) -> Vec<Problem> {
        let time = |at: u64| start + at as f64 / rate;
        let mut found = Vec::new();
        if self.constant() {
            let what = format!("every one of its {} samples is {}", self.seen, self.last);
            found.push(
                Problem::warning(name, what)
                    .hint("nothing is connected, or it is the wrong channel; it has no spectrum"),
            );
            return found;
        }
        for (extreme, word) in [(&self.high, "upper"), (&self.low, "lower")] {
            if extreme.clipped() {
                let what = format!(
                    "is clipped: {} samples ({:.3} %) lie exactly at the {word} limit {} of the file, {} times three or \
                     more in a row, the first at {:.6} s",
                    extreme.count,
                    100.0 * extreme.count as f64 / self.seen as f64,
                    extreme.value,
                    extreme.runs,
                    time(extreme.first),
                );
                found.push(Problem::warning(name, what).hint(
                    "amplitudes are too low, harmonics false, and noise looks like a cycle; record again with a larger range",
                ));
            }
        }
        let least = ((STOPPED * self.seen as f64) as u64).max(STOPPED_LEAST);
        if self.longest >= least && self.clipped() == 0 {
            let what = format!(
                "stands still at one value for {} samples from {:.6} s on",
                self.longest,
                time(self.longest_from)
            );
            found.push(
                Problem::warning(name, what).hint(
                    "the channel dropped out there; ask for a stretch without it with --span",
                ),
            );
        }
        found
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of(samples: impl Iterator<Item = f64>) -> Health {
        let all: Vec<f64> = samples.collect();
        let mut health = Health::default();
        for block in all.chunks(17) {
            health.feed(block);
        }
        health
    }

    #[test]
    fn clipping_is_told_from_a_whole_sine() {
        let sine = |i: i32| (0.02 * f64::from(i)).sin();
        assert_eq!(of((0..5000).map(sine)).clipped(), 0);
        let cut = of((0..5000).map(|i| sine(i).min(0.9)));
        assert!(cut.clipped() > 500);
        let told = cut.remarks("p1", 1000.0, 0.0);
        assert!(
            told.len() == 1 && told[0].what.contains("upper limit 0.9"),
            "{told:?}"
        );
        // Coarse steps meet their extremes often, yet not in a row once they are noisy.
        let coarse = of((0..5000).map(|i| f64::from((i * 7919) % 11)));
        assert_eq!(coarse.clipped(), 0);
    }

    #[test]
    fn a_dead_channel_and_a_drop_out_are_told() {
        assert!(of(std::iter::repeat_n(3.0, 50)).constant());
        let dropped = of((0..4000).map(|i| {
            if (1000..1500).contains(&i) {
                0.0
            } else {
                f64::from((i * 37) % 101)
            }
        }));
        let told = dropped.remarks("p1", 1000.0, 0.0);
        assert!(
            told.len() == 1 && told[0].what.contains("500 samples from 1.000000 s"),
            "{told:?}"
        );
    }
}
