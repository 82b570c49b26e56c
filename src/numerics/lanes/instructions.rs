//! Eight numbers on the instruction sets of x86-64, and on none in particular.
//!
//! This is the only module with `unsafe` code. An operation of an instruction set may run only on a
//! processor that has it. That is kept by privacy: the types of lanes below cannot be named outside, so that
//! code generic over [`Lanes`] meets them only through [`on_lanes`], which asks the processor
//! first. Each operation is one intrinsic or a few on values in registers: no pointer is formed but from a reference
//! to an array of eight.

#![allow(unsafe_code, reason = "intrinsics; the argument is above")]

use std::ops::{Add, Mul, Neg, Sub};
use std::sync::OnceLock;

use super::{Job, LANES, Lanes, WHOLE};
use crate::numerics::number::{Bounding, Number, Over};

/// An instruction set.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Level {
    /// What every processor has.
    Baseline,
    /// AVX2 with fused multiply-add: eight numbers in two registers.
    Avx2,
    /// AVX-512 (F, DQ): eight numbers in one register.
    Avx512,
}

/// The best instruction set of this processor.
pub fn level() -> Level {
    static LEVEL: OnceLock<Level> = OnceLock::new();
    *LEVEL.get_or_init(|| {
        #[cfg(target_arch = "x86_64")]
        {
            if is_x86_feature_detected!("avx512f") && is_x86_feature_detected!("avx512dq") {
                return Level::Avx512;
            }
            if is_x86_feature_detected!("avx2") && is_x86_feature_detected!("fma") {
                return Level::Avx2;
            }
        }
        Level::Baseline
    })
}

/// Runs a job on the best instruction set of this processor.
#[inline]
pub fn on_lanes<J: Job>(job: J) -> J::Output {
    on_lanes_of(level(), job)
}

/// Runs a job on an instruction set, or on the best one below it that this processor has.
#[inline]
pub fn on_lanes_of<J: Job>(wanted: Level, job: J) -> J::Output {
    match wanted.min(level()) {
        #[cfg(target_arch = "x86_64")]
        // SAFETY: `level` found the features on this processor.
        Level::Avx512 => unsafe { x86::on_avx512(job) },
        #[cfg(target_arch = "x86_64")]
        // SAFETY: as above; whatever has AVX-512 has AVX2 and FMA as well.
        Level::Avx2 => unsafe { x86::on_avx2(job) },
        _ => on_plain(job),
    }
}

/// Apart, so that its memory on the stack is not that of the others.
#[inline(never)]
fn on_plain<J: Job>(job: J) -> J::Output {
    job.run::<Plain>()
}

/// Operators and traits of a type of lanes by its own functions.
macro_rules! arithmetic {
    ($type:ty) => {
        impl Add for $type {
            type Output = Self;
            #[inline(always)]
            fn add(self, o: Self) -> Self {
                self.plus(o)
            }
        }
        impl Sub for $type {
            type Output = Self;
            #[inline(always)]
            fn sub(self, o: Self) -> Self {
                self.minus(o)
            }
        }
        impl Mul for $type {
            type Output = Self;
            #[inline(always)]
            fn mul(self, o: Self) -> Self {
                self.times(o)
            }
        }
        impl Neg for $type {
            type Output = Self;
            #[inline(always)]
            fn neg(self) -> Self {
                self.negated()
            }
        }
        impl From<f64> for $type {
            #[inline(always)]
            fn from(x: f64) -> Self {
                Self::splat(x)
            }
        }
        impl Number for $type {
            #[inline(always)]
            fn mul_add(self, a: Self, b: Self) -> Self {
                self.fused(a, b)
            }
            #[inline(always)]
            fn neg_mul_add(self, a: Self, b: Self) -> Self {
                self.fused_away(a, b)
            }
        }
        impl Over<f64> for $type {
            #[inline(always)]
            fn constant(x: f64) -> Self {
                Self::splat(x)
            }
            #[inline(always)]
            fn scaled(self, k: f64) -> Self {
                self.times(Self::splat(k))
            }
            #[inline(always)]
            fn scaled_add(self, k: f64, to: Self) -> Self {
                self.fused(Self::splat(k), to)
            }
            #[inline(always)]
            fn exp(self) -> Self {
                crate::numerics::lanes::exp(self)
            }
            #[inline(always)]
            fn sin_cos(self) -> (Self, Self) {
                crate::numerics::lanes::sin_cos_far(self)
            }
        }
    };
}

/// Eight numbers, one after another.
#[derive(Clone, Copy)]
struct Plain([f64; LANES]);

impl Plain {
    #[inline(always)]
    fn zip(self, o: Self, f: impl Fn(f64, f64) -> f64) -> Self {
        Plain(std::array::from_fn(|i| f(self.0[i], o.0[i])))
    }
    #[inline(always)]
    fn splat(x: f64) -> Self {
        Plain([x; LANES])
    }
    #[inline(always)]
    fn plus(self, o: Self) -> Self {
        self.zip(o, |a, b| a + b)
    }
    #[inline(always)]
    fn minus(self, o: Self) -> Self {
        self.zip(o, |a, b| a - b)
    }
    #[inline(always)]
    fn times(self, o: Self) -> Self {
        self.zip(o, |a, b| a * b)
    }
    #[inline(always)]
    fn negated(self) -> Self {
        Plain(self.0.map(|a| -a))
    }
    #[inline(always)]
    fn fused(self, a: Self, b: Self) -> Self {
        self.times(a).plus(b)
    }
    #[inline(always)]
    fn fused_away(self, a: Self, b: Self) -> Self {
        b.minus(self.times(a))
    }
}

arithmetic!(Plain);

impl Bounding for Plain {
    #[inline(always)]
    fn sqrt(self) -> Self {
        Plain(self.0.map(f64::sqrt))
    }
    #[inline(always)]
    fn abs(self) -> Self {
        Plain(self.0.map(f64::abs))
    }
    #[inline(always)]
    fn max(self, other: Self) -> Self {
        self.zip(other, |a, b| if a > b { a } else { b })
    }
    #[inline(always)]
    fn min(self, other: Self) -> Self {
        self.zip(other, |a, b| if a < b { a } else { b })
    }
}

impl Lanes for Plain {
    #[inline(always)]
    fn load(from: &[f64; LANES]) -> Self {
        Plain(*from)
    }
    #[inline(always)]
    fn store(self, to: &mut [f64; LANES]) {
        *to = self.0;
    }
    #[inline(always)]
    fn times_power_of_two(self, n: Self) -> Self {
        self.zip(n, |x, n| {
            // In two steps: the power itself may overflow or underflow where the product does not.
            let half = ((n * 0.5) + WHOLE) - WHOLE;
            let power =
                |n: f64| f64::from_bits(((n + WHOLE).to_bits() << 52).wrapping_add(1023 << 52));
            x * power(half) * power(n - half)
        })
    }
    #[inline(always)]
    fn turned(shifted: Self, sin: Self, cos: Self) -> (Self, Self) {
        let (mut s, mut c) = (sin, cos);
        for i in 0..LANES {
            let turns = shifted.0[i].to_bits();
            let (a, b) = match turns & 1 {
                0 => (sin.0[i], cos.0[i]),
                _ => (cos.0[i], sin.0[i]),
            };
            let sign = |bits: u64| (bits << 62) & (1 << 63);
            s.0[i] = f64::from_bits(a.to_bits() ^ sign(turns));
            c.0[i] = f64::from_bits(b.to_bits() ^ sign(turns.wrapping_add(1)));
        }
        (s, c)
    }
}

#[cfg(target_arch = "x86_64")]
mod x86 {
    use std::arch::x86_64::*;

    use super::*;

    /// # Safety
    /// The processor has AVX-512 F and DQ, AVX2 and FMA.
    #[target_feature(enable = "avx512f,avx512dq,avx2,fma")]
    pub(super) unsafe fn on_avx512<J: Job>(job: J) -> J::Output {
        job.run::<Wide>()
    }

    /// # Safety
    /// The processor has AVX2 and FMA.
    #[target_feature(enable = "avx2,fma")]
    pub(super) unsafe fn on_avx2<J: Job>(job: J) -> J::Output {
        job.run::<Halves>()
    }

    // SAFETY of every block below: values of these types exist only under `on_avx512` and `on_avx2`.

    /// One register of eight.
    #[derive(Clone, Copy)]
    struct Wide(__m512d);

    impl Wide {
        #[inline(always)]
        fn splat(x: f64) -> Self {
            unsafe { Wide(_mm512_set1_pd(x)) }
        }
        #[inline(always)]
        fn plus(self, o: Self) -> Self {
            unsafe { Wide(_mm512_add_pd(self.0, o.0)) }
        }
        #[inline(always)]
        fn minus(self, o: Self) -> Self {
            unsafe { Wide(_mm512_sub_pd(self.0, o.0)) }
        }
        #[inline(always)]
        fn times(self, o: Self) -> Self {
            unsafe { Wide(_mm512_mul_pd(self.0, o.0)) }
        }
        #[inline(always)]
        fn negated(self) -> Self {
            unsafe { Wide(_mm512_xor_pd(self.0, _mm512_set1_pd(-0.0))) }
        }
        #[inline(always)]
        fn fused(self, a: Self, b: Self) -> Self {
            unsafe { Wide(_mm512_fmadd_pd(self.0, a.0, b.0)) }
        }
        #[inline(always)]
        fn fused_away(self, a: Self, b: Self) -> Self {
            unsafe { Wide(_mm512_fnmadd_pd(self.0, a.0, b.0)) }
        }
    }

    arithmetic!(Wide);

    impl Bounding for Wide {
        #[inline(always)]
        fn sqrt(self) -> Self {
            unsafe { Wide(_mm512_sqrt_pd(self.0)) }
        }
        #[inline(always)]
        fn abs(self) -> Self {
            unsafe { Wide(_mm512_abs_pd(self.0)) }
        }
        #[inline(always)]
        fn max(self, other: Self) -> Self {
            unsafe { Wide(_mm512_max_pd(self.0, other.0)) }
        }
        #[inline(always)]
        fn min(self, other: Self) -> Self {
            unsafe { Wide(_mm512_min_pd(self.0, other.0)) }
        }
    }

    impl Lanes for Wide {
        #[inline(always)]
        fn load(from: &[f64; LANES]) -> Self {
            unsafe { Wide(_mm512_loadu_pd(from.as_ptr())) }
        }
        #[inline(always)]
        fn store(self, to: &mut [f64; LANES]) {
            unsafe { _mm512_storeu_pd(to.as_mut_ptr(), self.0) }
        }
        #[inline(always)]
        fn times_power_of_two(self, n: Self) -> Self {
            unsafe { Wide(_mm512_scalef_pd(self.0, n.0)) }
        }
        #[inline(always)]
        fn turned(shifted: Self, sin: Self, cos: Self) -> (Self, Self) {
            unsafe {
                let one = _mm512_set1_epi64(1);
                let turns = _mm512_castpd_si512(shifted.0);
                let odd = _mm512_test_epi64_mask(turns, one);
                let s = _mm512_mask_blend_pd(odd, sin.0, cos.0);
                let c = _mm512_mask_blend_pd(odd, cos.0, sin.0);
                let sign = _mm512_set1_epi64(i64::MIN);
                let flip = |x: __m512d, bits: __m512i| {
                    let bits = _mm512_and_si512(_mm512_slli_epi64::<62>(bits), sign);
                    _mm512_xor_pd(x, _mm512_castsi512_pd(bits))
                };
                let next = _mm512_add_epi64(turns, one);
                (Wide(flip(s, turns)), Wide(flip(c, next)))
            }
        }
    }

    /// Two registers of four.
    #[derive(Clone, Copy)]
    struct Halves(__m256d, __m256d);

    impl Halves {
        #[inline(always)]
        fn splat(x: f64) -> Self {
            let half = unsafe { _mm256_set1_pd(x) };
            Halves(half, half)
        }
        #[inline(always)]
        fn plus(self, o: Self) -> Self {
            unsafe { Halves(_mm256_add_pd(self.0, o.0), _mm256_add_pd(self.1, o.1)) }
        }
        #[inline(always)]
        fn minus(self, o: Self) -> Self {
            unsafe { Halves(_mm256_sub_pd(self.0, o.0), _mm256_sub_pd(self.1, o.1)) }
        }
        #[inline(always)]
        fn times(self, o: Self) -> Self {
            unsafe { Halves(_mm256_mul_pd(self.0, o.0), _mm256_mul_pd(self.1, o.1)) }
        }
        #[inline(always)]
        fn negated(self) -> Self {
            unsafe {
                let sign = _mm256_set1_pd(-0.0);
                Halves(_mm256_xor_pd(self.0, sign), _mm256_xor_pd(self.1, sign))
            }
        }
        #[inline(always)]
        fn fused(self, a: Self, b: Self) -> Self {
            unsafe {
                Halves(
                    _mm256_fmadd_pd(self.0, a.0, b.0),
                    _mm256_fmadd_pd(self.1, a.1, b.1),
                )
            }
        }
        #[inline(always)]
        fn fused_away(self, a: Self, b: Self) -> Self {
            unsafe {
                Halves(
                    _mm256_fnmadd_pd(self.0, a.0, b.0),
                    _mm256_fnmadd_pd(self.1, a.1, b.1),
                )
            }
        }
    }

    arithmetic!(Halves);

    impl Bounding for Halves {
        #[inline(always)]
        fn sqrt(self) -> Self {
            unsafe { Halves(_mm256_sqrt_pd(self.0), _mm256_sqrt_pd(self.1)) }
        }
        #[inline(always)]
        fn abs(self) -> Self {
            unsafe {
                let sign = _mm256_set1_pd(-0.0);
                Halves(
                    _mm256_andnot_pd(sign, self.0),
                    _mm256_andnot_pd(sign, self.1),
                )
            }
        }
        #[inline(always)]
        fn max(self, other: Self) -> Self {
            unsafe {
                Halves(
                    _mm256_max_pd(self.0, other.0),
                    _mm256_max_pd(self.1, other.1),
                )
            }
        }
        #[inline(always)]
        fn min(self, other: Self) -> Self {
            unsafe {
                Halves(
                    _mm256_min_pd(self.0, other.0),
                    _mm256_min_pd(self.1, other.1),
                )
            }
        }
    }

    impl Lanes for Halves {
        #[inline(always)]
        fn load(from: &[f64; LANES]) -> Self {
            let (a, b) = from.split_at(LANES / 2);
            unsafe { Halves(_mm256_loadu_pd(a.as_ptr()), _mm256_loadu_pd(b.as_ptr())) }
        }
        #[inline(always)]
        fn store(self, to: &mut [f64; LANES]) {
            let (a, b) = to.split_at_mut(LANES / 2);
            unsafe {
                _mm256_storeu_pd(a.as_mut_ptr(), self.0);
                _mm256_storeu_pd(b.as_mut_ptr(), self.1);
            }
        }
        #[inline(always)]
        fn times_power_of_two(self, n: Self) -> Self {
            let whole = Self::splat(WHOLE);
            let half = n.fused(Self::splat(0.5), whole).minus(whole);
            let power = |n: Self| unsafe {
                let bits = |x: __m256d| {
                    let shifted = _mm256_slli_epi64::<52>(_mm256_castpd_si256(x));
                    _mm256_castsi256_pd(_mm256_add_epi64(shifted, _mm256_set1_epi64x(1023 << 52)))
                };
                let n = n.plus(whole);
                Halves(bits(n.0), bits(n.1))
            };
            self.times(power(half)).times(power(n.minus(half)))
        }
        #[inline(always)]
        fn turned(shifted: Self, sin: Self, cos: Self) -> (Self, Self) {
            let one = |shifted: __m256d, sin: __m256d, cos: __m256d| unsafe {
                let turns = _mm256_castpd_si256(shifted);
                let odd = _mm256_castsi256_pd(_mm256_slli_epi64::<63>(turns));
                let s = _mm256_blendv_pd(sin, cos, odd);
                let c = _mm256_blendv_pd(cos, sin, odd);
                let sign = _mm256_set1_epi64x(i64::MIN);
                let flip = |x: __m256d, bits: __m256i| {
                    let bits = _mm256_and_si256(_mm256_slli_epi64::<62>(bits), sign);
                    _mm256_xor_pd(x, _mm256_castsi256_pd(bits))
                };
                let next = _mm256_add_epi64(turns, _mm256_set1_epi64x(1));
                (flip(s, turns), flip(c, next))
            };
            let (s0, c0) = one(shifted.0, sin.0, cos.0);
            let (s1, c1) = one(shifted.1, sin.1, cos.1);
            (Halves(s0, s1), Halves(c0, c1))
        }
    }
}
