//! NASA seven-coefficient polynomials of one species.
//!
//! `cp/R = a1 + a2 T + a3 T^2 + a4 T^3 + a5 T^4`,
//! `h/R = a6 + a1 T + a2 T^2/2 + a3 T^3/3 + a4 T^4/4 + a5 T^5/5` (K),
//! `s/R = a7 + a1 ln T + a2 T + a3 T^2/2 + a4 T^3/3 + a5 T^4/4` at one bar,
//! with `R` the molar gas constant, `h` counted from the elements at 298.15 K, and one set of
//! `a1..a7` on either side of a mid-point temperature.
//!
//! Source: McBride, Gordon & Reno 1993, *Coefficients for Calculating Thermodynamic and Transport
//! Properties of Individual Species*, NASA TM-4513.

use crate::numerics::dual::Real;

/// One set `a1..a7`, its integrals' factors worked in.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Piece {
    cp: [f64; 5],
    enthalpy: [f64; 6],
    entropy: [f64; 5],
}

impl Piece {
    /// From `a1..a7`.
    pub(crate) const fn new(a: [f64; 7]) -> Self {
        Piece {
            cp: [a[0], a[1], a[2], a[3], a[4]],
            enthalpy: [a[5], a[0], a[1] / 2.0, a[2] / 3.0, a[3] / 4.0, a[4] / 5.0],
            entropy: [a[6], a[1], a[2] / 2.0, a[3] / 3.0, a[4] / 4.0],
        }
    }

    /// `cp/R`.
    pub(crate) fn cp<T: Real>(&self, t: T) -> T {
        horner(&self.cp, t)
    }

    /// `h/R` (K).
    pub(crate) fn enthalpy<T: Real>(&self, t: T) -> T {
        horner(&self.enthalpy, t)
    }

    /// `s/R` at one bar.
    pub(crate) fn entropy<T: Real>(&self, t: T) -> T {
        horner(&self.entropy, t) + t.ln() * self.cp[0]
    }
}

fn horner<T: Real, const N: usize>(coefficients: &[f64; N], t: T) -> T {
    let mut sum = T::from(0.0);
    for &c in coefficients.iter().rev() {
        sum = sum * t + c;
    }
    sum
}

/// A species: its molar mass and its two sets of coefficients.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Species {
    /// Molar mass [kg/mol].
    pub(crate) molar_mass: f64,
    /// `a1..a7` from 200 K to 1000 K.
    pub(crate) low: [f64; 7],
    /// `a1..a7` from 1000 K to 6000 K.
    pub(crate) high: [f64; 7],
}

/// Lowest temperature of every species' polynomial below (K).
pub(crate) const LOWEST: f64 = 200.0;
/// Where the two sets meet (K).
pub(crate) const MIDDLE: f64 = 1000.0;
/// Highest temperature (K).
pub(crate) const HIGHEST: f64 = 6000.0;

// Molar masses: IUPAC standard atomic weights, abridged (2021): N 14.007, O 15.999, C 12.011,
// Ar 39.95.

/// Nitrogen, `N2`.
pub(crate) const NITROGEN: Species = Species {
    molar_mass: 28.014e-3,
    low: [
        3.53100528,
        -1.23660987e-4,
        -5.02999437e-7,
        2.43530612e-9,
        -1.40881235e-12,
        -1046.97628,
        2.96747468,
    ],
    high: [
        2.95257626,
        1.39690057e-3,
        -4.92631691e-7,
        7.86010367e-11,
        -4.60755321e-15,
        -923.948645,
        5.87189252,
    ],
};

/// Oxygen, `O2`.
pub(crate) const OXYGEN: Species = Species {
    molar_mass: 31.998e-3,
    low: [
        3.78245636,
        -2.99673415e-3,
        9.847302e-6,
        -9.68129508e-9,
        3.24372836e-12,
        -1063.94356,
        3.65767573,
    ],
    high: [
        3.66096083,
        6.56365523e-4,
        -1.41149485e-7,
        2.05797658e-11,
        -1.29913248e-15,
        -1215.97725,
        3.41536184,
    ],
};

/// Argon, `Ar`: the same from 200 K to 6000 K.
pub(crate) const ARGON: Species = Species {
    molar_mass: 39.95e-3,
    low: ARGON_SET,
    high: ARGON_SET,
};
const ARGON_SET: [f64; 7] = [2.5, 0.0, 0.0, 0.0, 0.0, -745.375, 4.37967491];

/// Carbon dioxide, `CO2`.
pub(crate) const CARBON_DIOXIDE: Species = Species {
    molar_mass: 44.009e-3,
    low: [
        2.35677352,
        8.98459677e-3,
        -7.12356269e-6,
        2.45919022e-9,
        -1.43699548e-13,
        -48371.9697,
        9.90105222,
    ],
    high: [
        4.63659493,
        2.74131991e-3,
        -9.95828531e-7,
        1.60373011e-10,
        -9.16103468e-15,
        -49024.9341,
        -1.93534855,
    ],
};
