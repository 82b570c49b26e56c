//! Value to colour: a diverging scale built in OKLab (B. Ottosson, 2020), and its limit.
//!
//! OKLab: `lms = M1 * rgb_linear`, `Lab = M2 * cbrt(lms)`; the inverse is used here, with lightness
//! L, and chroma C and hue h the polar form of (a, b).
//!
//! Negative values are blues, positive ones oranges to reds: the pair that all common colour-vision
//! deficiencies keep apart. Lightness falls with the magnitude on both sides, and positive values
//! are darker than negative ones throughout the scale's inner part, with a step at zero: in a grey
//! print the positive side still stands out.

/// An sRGB colour, 8 bits a channel.
pub type Rgb = [u8; 3];

/// Steps on each side of zero.
pub(super) const STEPS: usize = 120;

/// OKLCH (lightness 0 to 1, chroma, hue in degrees) to sRGB, clipped to the gamut.
pub fn oklch(lightness: f64, chroma: f64, hue_deg: f64) -> Rgb {
    let (sin, cos) = hue_deg.to_radians().sin_cos();
    let (a, b) = (chroma * cos, chroma * sin);
    let l = (lightness + 0.396_337_777_4 * a + 0.215_803_757_3 * b).powi(3);
    let m = (lightness - 0.105_561_345_8 * a - 0.063_854_172_8 * b).powi(3);
    let s = (lightness - 0.089_484_177_5 * a - 1.291_485_548_0 * b).powi(3);
    [
        4.076_741_662_1 * l - 3.307_711_591_3 * m + 0.230_969_929_2 * s,
        -1.268_438_004_6 * l + 2.609_757_401_1 * m - 0.341_319_396_5 * s,
        -0.004_196_086_3 * l - 0.703_418_614_7 * m + 1.707_614_701_0 * s,
    ]
    .map(|v| {
        let v = v.clamp(0.0, 1.0);
        let v = if v <= 0.003_130_8 {
            12.92 * v
        } else {
            1.055 * v.powf(1.0 / 2.4) - 0.055
        };
        (255.0 * v).round() as u8
    })
}

/// The diverging scale at `t` in -1..=1; zero counts as positive.
pub fn diverging(t: f64) -> Rgb {
    let u = t.abs().min(1.0);
    if t < 0.0 {
        oklch(
            0.972 - 0.30 * u,
            0.012 + 0.108 * u.powf(0.8),
            236.0 + 14.0 * u,
        )
    } else {
        oklch(
            0.905 - 0.445 * u,
            0.045 + 0.115 * u.powf(0.7),
            72.0 - 40.0 * u,
        )
    }
}

/// "#rrggbb".
pub fn hex([r, g, b]: Rgb) -> String {
    format!("#{r:02x}{g:02x}{b:02x}")
}

/// Range of the colour scale, -limit..=limit, and the step of its ticks.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Limit {
    /// Largest magnitude with a colour of its own.
    pub limit: f64,
    /// Distance between ticks and between iso-lines; divides `limit`.
    pub step: f64,
    /// Some value lies above `limit`.
    pub above: bool,
    /// Some value lies below `-limit`.
    pub below: bool,
}

impl Limit {
    /// A round limit that covers 98 % of the magnitudes, or all of them where that costs less than
    /// a quarter more range. Without any value, or with zeros only, the limit is 1.
    pub fn covering(values: impl Iterator<Item = f64>) -> Self {
        let (mut low, mut high) = (0.0_f64, 0.0_f64);
        let mut sizes: Vec<f64> = values
            .inspect(|&v| {
                low = low.min(v);
                high = high.max(v);
            })
            .map(f64::abs)
            .collect();
        sizes.sort_by(f64::total_cmp);
        let largest = low.abs().max(high);
        let rank = (0.98 * sizes.len() as f64).ceil() as usize;
        let common = sizes.get(rank.saturating_sub(1)).copied().unwrap_or(0.0);
        // Where nearly all values are zero the rare others set the scale.
        let wanted = if common == 0.0 || largest <= 1.25 * common {
            largest
        } else {
            common
        };
        let (limit, step) = round_up(wanted);
        Limit {
            limit,
            step,
            above: high > limit,
            below: low < -limit,
        }
    }

    /// Multiples of the step in -limit..=limit, counted from zero.
    pub fn levels(&self) -> Vec<f64> {
        let n = (self.limit / self.step).round() as i64;
        (-n..=n).map(|k| k as f64 * self.step).collect()
    }

    /// Palette entry of `value`: 0..STEPS below zero, from the most negative, then STEPS from zero.
    pub(super) fn entry(&self, value: f64) -> usize {
        let t = (value / self.limit).clamp(-1.0, 1.0);
        let k = ((t.abs() * STEPS as f64) as usize).min(STEPS - 1);
        if t < 0.0 { STEPS - 1 - k } else { STEPS + k }
    }
}

/// Colour of each palette entry of [`Limit::entry`].
pub(super) fn palette() -> Vec<Rgb> {
    (0..2 * STEPS)
        .map(|i| diverging((i as f64 + 0.5 - STEPS as f64) / STEPS as f64))
        .collect()
}

/// The least round number not below `wanted`, and a step that divides it into 4 to 6 parts.
fn round_up(wanted: f64) -> (f64, f64) {
    const ROUND: [(f64, f64); 10] = [
        (1.0, 0.25),
        (1.5, 0.25),
        (2.0, 0.5),
        (2.5, 0.5),
        (3.0, 0.5),
        (4.0, 1.0),
        (5.0, 1.0),
        (6.0, 1.0),
        (8.0, 2.0),
        (10.0, 2.5),
    ];
    if !(wanted > 0.0 && wanted.is_finite()) {
        return (1.0, 0.25);
    }
    let power = 10f64.powf(wanted.log10().floor());
    let (limit, step) = ROUND
        .into_iter()
        .find(|(limit, _)| limit * power >= wanted * (1.0 - 1e-12))
        .unwrap_or((10.0, 2.5));
    (limit * power, step * power)
}
