//! Dry air as a thermally perfect mixture of fixed composition.
//!
//! With mole fractions `x_i` and molar masses `W_i`: `R = R_m / sum x_i W_i`, and `cp/R`, `h/R`,
//! `s/R` are the `x_i`-weighted sums of the species' ([`super::nasa`]). The entropy of mixing is a
//! constant here and left out, so entropy has a datum of its own.
//!
//! Two liberties, both far below what air tables agree to. Enthalpy and entropy of the printed sets
//! miss each other at 1000 K by 7e-10 and 2e-10 of themselves; the upper set is shifted to meet the
//! lower. Outside 200 K to 6000 K, `cp` keeps its value at the bound: the polynomials would turn it
//! negative within a few hundred kelvin. [`super::Gas::beyond_range`] tells of states out there.

use super::nasa::{
    ARGON, CARBON_DIOXIDE, HIGHEST, LOWEST, MIDDLE, NITROGEN, OXYGEN, Piece, Species,
};
use super::{MOLAR_GAS_CONSTANT, REFERENCE_TEMPERATURE};
use crate::numerics::dual::Real;

/// Species of dry air and their mole fractions before normalisation.
const COMPOSITION: [(Species, f64); 4] = [
    (NITROGEN, 0.78084),
    (OXYGEN, 0.20946),
    (ARGON, 0.00934),
    (CARBON_DIOXIDE, 0.0004),
];

/// Specific gas constant of dry air (J/(kg K)).
pub(crate) const GAS_CONSTANT: f64 = MOLAR_GAS_CONSTANT / molar_mass();

/// Polynomials below 200 K, to 1000 K, to 6000 K and above.
static PIECES: [Piece; 4] = pieces();

const fn total() -> f64 {
    let mut sum = 0.0;
    let mut i = 0;
    while i < COMPOSITION.len() {
        sum += COMPOSITION[i].1;
        i += 1;
    }
    sum
}

const fn molar_mass() -> f64 {
    let mut sum = 0.0;
    let mut i = 0;
    while i < COMPOSITION.len() {
        sum += COMPOSITION[i].1 / total() * COMPOSITION[i].0.molar_mass;
        i += 1;
    }
    sum
}

const fn mixed(high: bool) -> [f64; 7] {
    let mut sum = [0.0; 7];
    let mut i = 0;
    while i < COMPOSITION.len() {
        let (species, fraction) = COMPOSITION[i];
        let a = if high { species.high } else { species.low };
        let mut k = 0;
        while k < 7 {
            sum[k] += fraction / total() * a[k];
            k += 1;
        }
        i += 1;
    }
    sum
}

const fn cp_at(a: &[f64; 7], t: f64) -> f64 {
    a[0] + t * (a[1] + t * (a[2] + t * (a[3] + t * a[4])))
}

const fn enthalpy_at(a: &[f64; 7], t: f64) -> f64 {
    a[5] + t * (a[0] + t * (a[1] / 2.0 + t * (a[2] / 3.0 + t * (a[3] / 4.0 + t * a[4] / 5.0))))
}

/// The entropy without its logarithm: `ln` is not a constant function.
const fn entropy_less_log_at(a: &[f64; 7], t: f64) -> f64 {
    a[6] + t * (a[1] + t * (a[2] / 2.0 + t * (a[3] / 3.0 + t * a[4] / 4.0)))
}

/// The set `a` with its sixth and seventh coefficients moved so that enthalpy and entropy meet
/// those of `other` at `t`; `ln_t` is `ln t`.
const fn met(mut a: [f64; 7], other: &[f64; 7], t: f64, ln_t: f64) -> [f64; 7] {
    a[5] += enthalpy_at(other, t) - enthalpy_at(&a, t);
    a[6] += entropy_less_log_at(other, t) - entropy_less_log_at(&a, t) + (other[0] - a[0]) * ln_t;
    a
}

const LN_LOWEST: f64 = 5.298_317_366_548_036;
const LN_MIDDLE: f64 = 6.907_755_278_982_137;
const LN_HIGHEST: f64 = 8.699_514_748_210_19;

const fn pieces() -> [Piece; 4] {
    let mut low = mixed(false);
    low[5] -= enthalpy_at(&low, REFERENCE_TEMPERATURE);
    let high = met(mixed(true), &low, MIDDLE, LN_MIDDLE);
    let mut below = [0.0; 7];
    below[0] = cp_at(&low, LOWEST);
    let below = met(below, &low, LOWEST, LN_LOWEST);
    let mut above = [0.0; 7];
    above[0] = cp_at(&high, HIGHEST);
    let above = met(above, &high, HIGHEST, LN_HIGHEST);
    [
        Piece::new(below),
        Piece::new(low),
        Piece::new(high),
        Piece::new(above),
    ]
}

fn piece(t: f64) -> &'static Piece {
    let [below, low, high, above] = &PIECES;
    if t < LOWEST {
        below
    } else if t <= MIDDLE {
        low
    } else if t <= HIGHEST {
        high
    } else {
        above
    }
}

/// `cp` (J/(kg K)).
pub(crate) fn cp<T: Real>(t: T) -> T {
    piece(t.value()).cp(t) * GAS_CONSTANT
}

/// Sensible enthalpy from 298.15 K (J/kg).
pub(crate) fn enthalpy<T: Real>(t: T) -> T {
    piece(t.value()).enthalpy(t) * GAS_CONSTANT
}

/// `integral cp/T dT` (J/(kg K)), zero at no particular temperature.
pub(crate) fn entropy<T: Real>(t: T) -> T {
    piece(t.value()).entropy(t) * GAS_CONSTANT
}

/// Temperature (K) at which [`enthalpy`] is `h` (J/kg), sought from `guess` (K).
///
/// Enthalpy is continuous and increases, its slope lying between 3.4 and 4.8 times `R`, so Newton's
/// iteration contracts from any guess.
pub(crate) fn temperature_at_enthalpy(h: f64, guess: f64) -> f64 {
    let mut t = guess;
    for _ in 0..60 {
        let step = (h - enthalpy(t)) / cp(t);
        t += step;
        if step.abs() <= 1e-9 * t.abs() {
            break;
        }
    }
    t
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pieces_meet() {
        for t in [LOWEST, MIDDLE, HIGHEST] {
            let (a, b) = (t * (1.0 - 1e-15), t * (1.0 + 1e-15));
            assert!(
                ((enthalpy(b) - enthalpy(a)) / enthalpy(t)).abs() < 1e-13,
                "h at {t}"
            );
            assert!(
                ((entropy(b) - entropy(a)) / entropy(t)).abs() < 1e-13,
                "s at {t}"
            );
            assert!((cp(b) / cp(a) - 1.0).abs() < 1e-9, "cp at {t}");
        }
        assert!((LN_LOWEST - LOWEST.ln()).abs() < 1e-15);
        assert!((LN_MIDDLE - MIDDLE.ln()).abs() < 1e-15);
        assert!((LN_HIGHEST - HIGHEST.ln()).abs() < 2e-15);
    }

    #[test]
    fn molar_mass_and_oxygen_by_mass() {
        // The US Standard Atmosphere 1976 gives 28.9644 g/mol with 0.000314 of carbon dioxide.
        assert!((molar_mass() - 28.9644e-3).abs() < 3e-6);
        // Common practice: air is about 23 % oxygen by mass.
        let oxygen = 0.20946 / total() * OXYGEN.molar_mass / molar_mass();
        assert!((oxygen - 0.231).abs() < 5e-4);
    }

    #[test]
    fn cp_stays_positive_and_bounded_far_outside_the_range() {
        for t in [1.0, 50.0, 199.0, 6001.0, 2e4, 1e6] {
            let ratio = cp(t) / GAS_CONSTANT;
            assert!((3.4..4.8).contains(&ratio), "cp/R = {ratio} at {t} K");
        }
    }
}
