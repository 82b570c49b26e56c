//! The maxima of a spectrum that comes without its record: what can be read off lines alone.
//!
//! Nothing is known of window and averages, so no interval is given. The width is that between the points of half the
//! power on either side, straight lines between bins; the power of a density within is that of a resonance,
//! `pi/2` times width times height.

use crate::measured::reading::Line;

/// A maximum of a spectrum.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Maximum {
    /// Frequency of the largest bin, moved by the parabola through its neighbours (Hz).
    pub frequency: f64,
    /// Height: rms of the line (unit), or density (unit squared per hertz).
    pub height: f64,
    /// Root mean square (unit).
    pub rms: f64,
    /// Full width at half power (Hz), the window's among it; `None` where the spectrum does not fall to half.
    pub width: Option<f64>,
    /// Power over the median of the spectrum about it.
    pub prominence: f64,
}

/// Least power over the median about a maximum for it to be told (10 dB).
const LEAST: f64 = 10.0;

/// Part of its power to which a spectrum must fall between a maximum and a higher one for the two to be two (6 dB).
const VALLEY: f64 = 0.25;

/// Reach on either side that the median is of: part of the frequency, at least so many bins, and values looked at.
const REACH: f64 = 0.25;
const ABOUT: usize = 40;
const LOOKED_AT: usize = 200;

/// The maxima within a band, by falling power, at most `most`, and then by frequency.
pub fn maxima(
    frequency: &[f64],
    values: &[f64],
    line: Line,
    (low, high): (f64, f64),
    most: usize,
) -> Vec<Maximum> {
    let power: Vec<f64> = match line {
        Line::Density => values.to_vec(),
        Line::Rms => values.iter().map(|x| x * x).collect(),
    };
    let n = power.len().min(frequency.len());
    let mut found: Vec<(usize, Maximum)> = (1..n.saturating_sub(1))
        .filter(|&i| (low..=high).contains(&frequency[i]))
        .filter(|&i| power[i] > power[i - 1] && power[i] >= power[i + 1])
        .filter_map(|i| {
            let median = median_about(frequency, &power, i, n);
            let prominence = power[i] / median.max(f64::MIN_POSITIVE);
            if prominence < LEAST {
                return None;
            }
            let width = half(frequency, &power, i, n);
            let told = Maximum {
                frequency: vertex(frequency, &power, i),
                height: values[i],
                rms: match (line, width) {
                    (Line::Rms, _) => values[i],
                    (Line::Density, Some(w)) => (std::f64::consts::FRAC_PI_2 * w * power[i]).sqrt(),
                    (Line::Density, None) => (power[i] * (frequency[i + 1] - frequency[i])).sqrt(),
                },
                width,
                prominence,
            };
            Some((i, told))
        })
        .collect();
    found.sort_by(|a, b| b.1.prominence.total_cmp(&a.1.prominence));
    // The bins on top of a broad peak wag: its highest stands for it.
    let mut kept: Vec<(usize, Maximum)> = Vec::new();
    for (i, m) in found {
        let joined = |(k, _): &(usize, Maximum)| {
            let between = power.get(i.min(*k)..=i.max(*k)).unwrap_or_default();
            between.iter().all(|p| *p > VALLEY * power[i])
        };
        if kept.len() < most && !kept.iter().any(joined) {
            kept.push((i, m));
        }
    }
    let mut found: Vec<Maximum> = kept.into_iter().map(|(_, m)| m).collect();
    found.sort_by(|a, b| a.frequency.total_cmp(&b.frequency));
    found
}

/// The median of the power about a bin.
fn median_about(frequency: &[f64], power: &[f64], i: usize, n: usize) -> f64 {
    let far = REACH * frequency[i];
    let from = frequency.partition_point(|f| *f < frequency[i] - far);
    let to = frequency.partition_point(|f| *f <= frequency[i] + far);
    let (from, to) = (
        from.min(i.saturating_sub(ABOUT)),
        to.max(i + ABOUT + 1).min(n),
    );
    let every = (to - from).div_ceil(LOOKED_AT).max(1);
    let mut about: Vec<f64> = power[from..to].iter().copied().step_by(every).collect();
    about.sort_by(f64::total_cmp);
    about[about.len() / 2]
}

/// The top of the parabola through the logarithms of three bins.
fn vertex(frequency: &[f64], power: &[f64], i: usize) -> f64 {
    let log = |k: usize| power[k].max(f64::MIN_POSITIVE).ln();
    let (a, b, c) = (log(i - 1), log(i), log(i + 1));
    let bend = a - 2.0 * b + c;
    let shift = if bend < 0.0 {
        (0.5 * (a - c) / bend).clamp(-0.5, 0.5)
    } else {
        0.0
    };
    frequency[i] + shift * 0.5 * (frequency[i + 1] - frequency[i - 1])
}

fn half(frequency: &[f64], power: &[f64], i: usize, n: usize) -> Option<f64> {
    let level = 0.5 * power[i];
    let cross = |inside: usize, outside: usize| {
        let t = (power[inside] - level) / (power[inside] - power[outside]);
        frequency[inside] + t * (frequency[outside] - frequency[inside])
    };
    let above = (i + 1..n).find(|&k| power[k] <= level)?;
    let below = (0..i).rev().find(|&k| power[k] <= level)?;
    Some(cross(above - 1, above) - cross(below + 1, below))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A resonance `1/((f-f0)^2 + h^2)`: full width at half power `2 h`, area `pi/h`.
    #[test]
    fn a_resonance_is_read_off_its_density() {
        let (f0, h) = (211.3, 4.0);
        let frequency: Vec<f64> = (0..2000).map(|i| 0.25 * f64::from(i)).collect();
        let density: Vec<f64> = frequency
            .iter()
            .map(|f| 1.0 / ((f - f0).powi(2) + h * h) + 1e-6)
            .collect();
        let found = maxima(&frequency, &density, Line::Density, (10.0, 450.0), 5);
        assert_eq!(found.len(), 1);
        let wagging: Vec<f64> = density
            .iter()
            .enumerate()
            .map(|(i, d)| d * (1.0 + 0.1 * f64::from(i as u32 * 7919 % 17 % 5)))
            .collect();
        assert_eq!(
            maxima(&frequency, &wagging, Line::Density, (10.0, 450.0), 5).len(),
            1
        );
        let m = found[0];
        assert!((m.frequency - f0).abs() < 0.02, "{m:?}");
        assert!((m.width.unwrap() / (2.0 * h) - 1.0).abs() < 0.01);
        assert!((m.rms.powi(2) / (std::f64::consts::PI / h) - 1.0).abs() < 0.02);
    }

    #[test]
    fn noise_alone_has_no_maximum_and_short_input_is_no_fault() {
        let frequency: Vec<f64> = (0..300).map(f64::from).collect();
        let flat: Vec<f64> = (0..300)
            .map(|i| 1.0 + f64::from((i * 7) % 13) * 0.05)
            .collect();
        assert!(maxima(&frequency, &flat, Line::Rms, (0.0, 300.0), 9).is_empty());
        assert!(maxima(&[1.0], &[2.0], Line::Rms, (0.0, 3.0), 9).is_empty());
    }
}
