//! Eight numbers at once.
//!
//! An arithmetic written over [`Lanes`] is compiled once for each instruction set of
//! `instructions` and run on the best one the processor has ([`on_lanes`]). Exponential, sine
//! and cosine are written once too, over those operations:
//!
//! - `exp x = 2^n exp r`, `n` the whole number nearest to `x/ln 2`, `|r| <= ln 2/2`, by a minimax polynomial
//!   for `(exp r - 1 - r)/r^2` of degree nine (relative error 3.6e-18, from Remez exchange in 50 digits);
//! - sine and cosine of `r = y - n pi/2`, `pi/2` in three parts (Cody & Waite 1980, *Software Manual for
//!   the Elementary Functions*), `|r| <= pi/4`, by the polynomials of degree 13 and 14 of Sun's fdlibm
//!   (`k_sin.c`, `k_cos.c`, 1993). Beyond [`FARTHEST_TURN`] each lane is worked out by the standard library.
//!
//! Held against values to forty digits: within 1 ulp for the exponential, 1.5 ulp for sine and cosine.

mod both;
mod instructions;

use super::number::Bounding;
pub use both::Both;
pub use instructions::{Level, level, on_lanes, on_lanes_of};

/// Numbers worked on at once.
pub const LANES: usize = 8;

/// Largest modulus of an angle that is reduced in lanes: 2^20 quarter turns.
pub const FARTHEST_TURN: f64 = 1_647_099.0;

/// Eight numbers.
pub trait Lanes: Bounding + From<f64> {
    /// Eight numbers from memory.
    fn load(from: &[f64; LANES]) -> Self;
    /// Eight numbers to memory.
    fn store(self, to: &mut [f64; LANES]);
    /// `2^n self` for whole `n`, `|n| <= 1100`.
    fn times_power_of_two(self, n: Self) -> Self;
    /// Sine and cosine of `r + n pi/2` from those of `r`; `shifted` is `n` plus [`WHOLE`].
    fn turned(shifted: Self, sin: Self, cos: Self) -> (Self, Self);
}

/// Added to a number and taken off again it leaves the nearest whole number, `|x| < 2^51`; the low bits of
/// the sum are that number in two's complement.
pub const WHOLE: f64 = 6_755_399_441_055_744.0;

/// Work written over lanes.
pub trait Job {
    /// What it makes.
    type Output;
    /// Does it. To be inlined always: only so is it compiled for the instruction set of `L`.
    fn run<L: Lanes>(self) -> Self::Output;
}

/// `a_0 + a_1 x + ...`, highest coefficient first.
#[inline(always)]
fn horner<L: Lanes>(x: L, coefficients: &[f64]) -> L {
    let mut sum = L::from(0.0);
    for (i, &c) in coefficients.iter().enumerate() {
        sum = if i == 0 {
            L::from(c)
        } else {
            sum.mul_add(x, L::from(c))
        };
    }
    sum
}

/// Exponential.
#[inline(always)]
pub fn exp<L: Lanes>(x: L) -> L {
    const LN2_HIGH: f64 = 6.931_471_803_691_238e-1;
    const LN2_LOW: f64 = 1.908_214_929_270_587_7e-10;
    const EVEN: [f64; 5] = [
        2.763_030_625_029_36e-7,
        2.480_149_294_963_387e-5,
        1.388_888_894_375_996_5e-3,
        4.166_666_666_652_972_5e-2,
        0.500_000_000_000_001_1,
    ];
    const ODD: [f64; 5] = [
        2.500_001_883_318_737_4e-8,
        2.755_758_680_389_532_6e-6,
        1.984_126_950_577_377_6e-4,
        8.333_333_333_494_976e-3,
        0.166_666_666_666_664_1,
    ];
    // What is not a number stays so: it is the second of both.
    let x = L::from(710.0).min(L::from(-760.0).max(x));
    let shifted = x.mul_add(L::from(std::f64::consts::LOG2_E), L::from(WHOLE));
    let n = shifted - L::from(WHOLE);
    let r = n.neg_mul_add(L::from(LN2_HIGH), x);
    let r = n.neg_mul_add(L::from(LN2_LOW), r);
    let square = r * r;
    let tail = horner(square, &ODD).mul_add(r, horner(square, &EVEN));
    (tail.mul_add(square, r) + L::from(1.0)).times_power_of_two(n)
}

/// Sine and cosine.
#[inline(always)]
pub fn sin_cos<L: Lanes>(y: L) -> (L, L) {
    const PARTS: [f64; 3] = [
        1.570_796_326_734_125_6,
        6.077_100_506_303_966e-11,
        2.022_266_248_795_950_6e-21,
    ];
    const SIN: [f64; 6] = [
        1.589_690_995_211_55e-10,
        -2.505_076_025_340_686_3e-8,
        2.755_731_370_707_006_8e-6,
        -1.984_126_982_985_795e-4,
        8.333_333_333_322_49e-3,
        -1.666_666_666_666_663_2e-1,
    ];
    const COS: [f64; 6] = [
        -1.135_964_755_778_819_5e-11,
        2.087_572_321_298_175e-9,
        -2.755_731_435_139_066_3e-7,
        2.480_158_728_947_673e-5,
        -1.388_888_888_887_411e-3,
        4.166_666_666_666_66e-2,
    ];
    let shifted = y.mul_add(L::from(std::f64::consts::FRAC_2_PI), L::from(WHOLE));
    let n = shifted - L::from(WHOLE);
    let mut r = y;
    for part in PARTS {
        r = n.neg_mul_add(L::from(part), r);
    }
    let z = r * r;
    let sin = (horner(z, &SIN) * z).mul_add(r, r);
    // 1 - z/2 is rounded; what it lost goes with the small terms.
    let half = z * L::from(0.5);
    let most = L::from(1.0) - half;
    let lost = (L::from(1.0) - most) - half;
    let cos = most + (z * z).mul_add(horner(z, &COS), lost);
    L::turned(shifted, sin, cos)
}

/// Sine and cosine of angles of any size.
#[inline(always)]
pub fn sin_cos_far<L: Lanes>(y: L) -> (L, L) {
    let mut angles = [0.0; LANES];
    y.store(&mut angles);
    let mut near = true;
    for angle in angles {
        near &= angle.abs() <= FARTHEST_TURN;
    }
    if near { sin_cos(y) } else { one_by_one(angles) }
}

#[cold]
fn one_by_one<L: Lanes>(angles: [f64; LANES]) -> (L, L) {
    (
        L::load(&angles.map(f64::sin)),
        L::load(&angles.map(f64::cos)),
    )
}
