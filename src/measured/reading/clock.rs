//! The sampling rate that a column of times tells, and whether it is kept.
//!
//! Times printed to a quantum `q` give the rate over a stretch of length `T` to `q/T`; of the rates within that the one
//! with the fewest digits is taken, as rates are set in round numbers (common practice). Every step is then held against
//! it, and at the end the mean over the whole record.

use crate::problems::Problem;

/// Part of a step by which a time may be off its place before it is told, beside the quantum.
const JITTER: f64 = 0.1;

/// Relative distance to which a sampling rate is known at best: no converter's clock keeps it better.
const KNOWN: f64 = 1e-9;

/// Relative difference of the mean rate that is no longer the clock's.
const WRONG: f64 = 1e-3;

/// Times of a record held against one rate.
#[derive(Clone, Debug)]
pub(super) struct Clock {
    rate_hz: f64,
    start: f64,
    /// Smallest difference of two times as printed (s).
    quantum: f64,
    last: f64,
    count: u64,
    jitters: u64,
    worst: f64,
}

/// What is wrong with one time.
pub(super) enum Step {
    Sound,
    /// So many samples are missing before it.
    Gap(f64),
    /// Not later than the one before.
    Back,
}

/// The rate of evenly spaced times printed to `quantum`, all in seconds; `None` where they do not rise.
pub(super) fn rate(times: &[f64], quantum: f64) -> Option<f64> {
    let mut steps: Vec<f64> = times.windows(2).map(|w| w[1] - w[0]).collect();
    if steps.is_empty() || steps.iter().any(|d| !d.is_finite()) {
        return None;
    }
    steps.sort_by(f64::total_cmp);
    let median = *steps.get(steps.len() / 2)?;
    if median <= 0.0 {
        return None;
    }
    // Where a step is missing the mean says nothing; the median does.
    let longest = steps.last().copied().unwrap_or(median);
    let whole = longest < 1.5 * median + quantum;
    let mean = (times.last()? - times.first()?) / steps.len() as f64;
    let (step, span) = if whole {
        (mean, mean * steps.len() as f64)
    } else {
        (median, median)
    };
    let slack = (quantum / span).max(KNOWN);
    Some(roundest(1.0 / step, slack))
}

/// The number with the fewest digits within a relative distance.
pub(super) fn roundest(x: f64, slack: f64) -> f64 {
    for digits in 0..17 {
        let text = format!("{x:.digits$e}");
        if let Ok(rounded) = text.parse::<f64>()
            && (rounded / x - 1.0).abs() <= slack
        {
            return rounded;
        }
    }
    x
}

/// Smallest difference two numbers can have when printed as `text`.
pub(super) fn quantum(text: &str) -> f64 {
    let (mantissa, exponent) = text.split_once(['e', 'E']).unwrap_or((text, "0"));
    let decimals = mantissa.split_once(['.', ',']).map_or(0, |(_, d)| d.len());
    let exponent: i32 = exponent.parse().unwrap_or(0);
    let decimals = i32::try_from(decimals).unwrap_or(300);
    10f64.powi((exponent - decimals).max(-300))
}

impl Clock {
    pub fn new(rate_hz: f64, quantum: f64) -> Clock {
        Clock {
            rate_hz,
            start: f64::NAN,
            quantum,
            last: f64::NAN,
            count: 0,
            jitters: 0,
            worst: 0.0,
        }
    }

    /// Takes the next time.
    pub fn tick(&mut self, time: f64) -> Step {
        let before = std::mem::replace(&mut self.last, time);
        self.count += 1;
        if self.count == 1 {
            self.start = time;
            return Step::Sound;
        }
        let off = (time - before) * self.rate_hz - 1.0;
        let slack = self.quantum * self.rate_hz;
        if time <= before && slack < 1.0 {
            return Step::Back;
        }
        if off > 0.5 + slack {
            return Step::Gap(off.round().max(1.0));
        }
        if off.abs() > JITTER + slack {
            self.jitters += 1;
            self.worst = self.worst.max(off.abs());
        }
        Step::Sound
    }

    /// What the whole record tells.
    pub fn remarks(&self, file: &str) -> Vec<Problem> {
        let mut found = Vec::new();
        if self.count < 3 {
            return found;
        }
        let steps = (self.count - 1) as f64;
        let mean = (self.last - self.start) / steps;
        let off = mean * self.rate_hz - 1.0;
        let known = 2.0 * self.quantum / (self.last - self.start) + 1e-9;
        if off.abs() > WRONG {
            let what = format!(
                "the sampling rate changes: it begins with {} Hz, and over the whole record it is {:.6} Hz",
                self.rate_hz,
                1.0 / mean
            );
            found.push(Problem::error(file, what).hint("cut the record where the rate changes"));
        } else if off.abs() > known {
            let what = format!(
                "over the whole record the sampling rate is {:.6} Hz, {:+.1} ppm off the {} Hz reckoned with",
                1.0 / mean,
                1e6 * (1.0 / (mean * self.rate_hz) - 1.0),
                self.rate_hz
            );
            found.push(Problem::warning(file, what).hint("state the rate with --rate"));
        }
        if self.jitters > 0 {
            let what = format!(
                "{} of {} time steps are off by more than {:.0} % of a step, at worst {:.0} %",
                self.jitters,
                self.count - 1,
                100.0 * JITTER,
                100.0 * self.worst
            );
            found.push(Problem::warning(file, what).hint(
                "the samples are taken as evenly spaced; uneven ones smear high frequencies",
            ));
        }
        found
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rates_come_out_round_from_printed_times() {
        for (rate_hz, decimals) in [
            (25600.0, 6),
            (51200.0, 7),
            (44100.0, 6),
            (8192.0, 12),
            (1000.0, 3),
            (33.5, 4),
        ] {
            let times: Vec<f64> = (0..4096)
                .map(|i| {
                    format!("{:.decimals$}", f64::from(i) / rate_hz + 0.25)
                        .parse()
                        .unwrap()
                })
                .collect();
            assert_eq!(
                rate(&times, 10f64.powi(-(decimals as i32))),
                Some(rate_hz),
                "{rate_hz}"
            );
        }
        assert_eq!(rate(&[0.0, 0.0, 0.0], 1e-3), None);
        assert_eq!(rate(&[1.0], 1e-3), None);
    }

    #[test]
    fn the_quantum_is_read_off_the_digits() {
        for (text, want) in [
            ("0.25", 1e-2),
            ("3", 1.0),
            ("1.5e-3", 1e-4),
            ("2,125", 1e-3),
        ] {
            assert!((quantum(text) / want - 1.0).abs() < 1e-12, "{text}");
        }
    }

    #[test]
    fn gaps_steps_back_and_drift_are_found() {
        let mut clock = Clock::new(1000.0, 1e-9);
        assert!(matches!(clock.tick(0.0), Step::Sound));
        assert!(matches!(clock.tick(0.001), Step::Sound));
        assert!(matches!(clock.tick(0.005), Step::Gap(g) if g == 3.0));
        assert!(matches!(clock.tick(0.004), Step::Back));
        let mut clock = Clock::new(1000.0, 1e-9);
        for i in 0..5000 {
            assert!(matches!(
                clock.tick(f64::from(i) * 0.001 * 1.0001),
                Step::Sound
            ));
        }
        let told = clock.remarks("f");
        assert!(
            told.len() == 1 && told[0].what.contains("-100.0 ppm"),
            "{told:?}"
        );
    }
}
