//! How far a mode is from neutral, and what kind of mode it is, by following it while one thing is varied.
//!
//! Along a factor or a delay `q` a zero of `D(s; q)` moves by `ds/dq = -D_q/D_s`. Each step predicts along that and
//! corrects by Newton's method; a step whose correction is not small against its length is halved. What
//! is followed is one branch, not a list: no count certifies it, and beside a meeting of two branches it may
//! take either.

use num_complex::Complex64;

use super::{Mode, Solved};
use crate::acoustics::vary::{self, Varied, varied};
use crate::numerics::dual::Dual;
use crate::waves::front;
use crate::waves::primitive::Chain;
use crate::waves::tape::Tape;

/// What makes a mode neutral.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Margins {
    /// Factor on the gain of all flames, the nearest to one between [`LEAST_GAIN`] and [`MOST_GAIN`].
    pub gain: Option<f64>,
    /// Change of all delays together (s), the nearest to zero within half a period and no more than
    /// leaves every delay positive.
    pub delay: Option<f64>,
}

/// Least and greatest factor on the gain looked at.
pub const LEAST_GAIN: f64 = 1e-3;
/// See [`LEAST_GAIN`].
pub const MOST_GAIN: f64 = 10.0;

/// What a mode lives by.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Nature {
    /// It stays when gain and carried entropy go to zero: a mode of the passages.
    Acoustic,
    /// It leaves to the left when the flame's gain goes to zero: the flame's own feedback.
    Intrinsic,
    /// It leaves to the left when carried entropy goes to zero.
    Convective,
    /// It could not be followed.
    Unclear,
}

/// The gain and delay that make a mode neutral; none without a flame.
pub fn margins(solved: &Solved, mode: &Mode) -> Margins {
    let chain = &solved.acoustics.chain;
    let Some(shortest) = vary::delays(chain).reduce(f64::min) else {
        return Margins::default();
    };
    let gain = nearest(|up| {
        let end = if up { MOST_GAIN } else { LEAST_GAIN };
        Path::new(chain, Varied::Gain, mode.s).neutral(end.ln())
    });
    let half = 0.5 / mode.frequency();
    let delay = half.is_finite().then(|| {
        nearest(|up| {
            let end = if up { half } else { -half.min(shortest) };
            Path::new(chain, Varied::Delay, mode.s).neutral(end)
        })
    });
    Margins {
        gain: gain.map(f64::exp),
        delay: delay.flatten(),
    }
}

/// The answer of least modulus of both directions.
fn nearest(ask: impl Fn(bool) -> Option<f64>) -> Option<f64> {
    let found = [true, false].into_iter().filter_map(ask);
    found.min_by(|a, b| a.abs().total_cmp(&b.abs()))
}

/// What a mode lives by.
pub fn nature(solved: &Solved, mode: &Mode) -> Nature {
    let chain = &solved.acoustics.chain;
    let longest = vary::delays(chain).reduce(f64::max);
    let gone = |what: Varied, time: f64| {
        let mut path = Path::new(chain, what, mode.s);
        let followed = path.to(LEAST_GAIN.ln());
        // A mode of a loop of delay `t` moves left by ln(1/k)/t as the factor k falls; one that stays stops moving.
        let fallen = path.s.re - mode.s.re < -3.0 / time;
        match followed {
            Some(rate) => Some(rate.norm() > 0.1 / time),
            None => fallen.then_some(true),
        }
    };
    let mut unclear = false;
    if let Some(longest) = vary::entropy_delays(chain).reduce(f64::max) {
        match gone(Varied::Entropy, longest) {
            Some(true) => return Nature::Convective,
            Some(false) => {}
            None => unclear = true,
        }
    }
    if let Some(longest) = longest {
        let period = 1.0 / mode.frequency();
        match gone(Varied::Gain, longest.max(period.min(1.0)).max(1e-4)) {
            Some(true) => return Nature::Intrinsic,
            Some(false) => {}
            None => unclear = true,
        }
    }
    if unclear {
        Nature::Unclear
    } else {
        Nature::Acoustic
    }
}

/// A zero on its way along a parameter. A factor is followed in its logarithm.
struct Path<'a> {
    chain: &'a Chain<f64>,
    what: Varied,
    at: f64,
    s: Complex64,
}

/// Steps of one way.
const MOST_STEPS: usize = 400;

impl<'a> Path<'a> {
    fn new(chain: &'a Chain<f64>, what: Varied, s: Complex64) -> Self {
        Path {
            chain,
            what,
            at: 0.0,
            s,
        }
    }

    fn tape(&self, at: f64) -> Option<Tape<Dual>> {
        let value = match self.what {
            Varied::Gain | Varied::Entropy => at.exp(),
            Varied::Delay => at,
        };
        let chain = varied(self.chain, self.what, value);
        Some(front::eliminate(&chain).ok()?.tape)
    }

    /// `ds` per unit of the parameter at a zero.
    fn rate(&self, tape: &Tape<Dual>, at: f64, s: Complex64) -> Option<Complex64> {
        let [d, slope] = tape.taylor_at::<2>(s);
        let per_value = Complex64::new(d.re.d[0], d.im.d[0]);
        let rate = -per_value / slope.value();
        let rate = match self.what {
            Varied::Gain | Varied::Entropy => rate * at.exp(),
            Varied::Delay => rate,
        };
        rate.is_finite().then_some(rate)
    }

    fn corrected(tape: &Tape<Dual>, guess: Complex64) -> Option<Complex64> {
        let mut s = guess;
        for _ in 0..12 {
            let [d, slope] = tape.taylor_at::<2>(s);
            let step = d.value() / slope.value();
            if !step.is_finite() {
                return None;
            }
            s -= step;
            if step.norm() <= 1e-12 * (1.0 + s.norm()) {
                return Some(s);
            }
        }
        None
    }

    /// Moves on to `end` and returns the rate there; stops early, with `None`, where it gets no further.
    fn to(&mut self, end: f64) -> Option<Complex64> {
        let mut rate = self.rate(&self.tape(self.at)?, self.at, self.s)?;
        let whole = end - self.at;
        let mut h = whole / 24.0;
        for _ in 0..MOST_STEPS {
            if (end - self.at).abs() <= 1e-12 * whole.abs() {
                return Some(rate);
            }
            if h.abs() > (end - self.at).abs() {
                h = end - self.at;
            }
            match self.step(rate, h) {
                Some((s, next)) => {
                    self.at += h;
                    self.s = s;
                    rate = next;
                    h *= 1.5;
                }
                None => h *= 0.4,
            }
            if h.abs() < 1e-9 * whole.abs() {
                return None;
            }
        }
        None
    }

    fn step(&self, rate: Complex64, h: f64) -> Option<(Complex64, Complex64)> {
        let at = self.at + h;
        let tape = self.tape(at)?;
        let guess = self.s + rate * h;
        let s = Self::corrected(&tape, guess)?;
        let length = (s - self.s).norm();
        let small = (s - guess).norm() <= 0.15 * length + 1e-9 * s.norm();
        let next = self.rate(&tape, at, s)?;
        // A rate that turns or grows suddenly is a branch changed, or a step too long.
        let steady = (next - rate).norm() <= 0.7 * (next.norm() + rate.norm()) + 1e-9 * s.norm();
        (small && steady).then_some((s, next))
    }

    /// The parameter between here and `end` at which the growth rate first vanishes.
    fn neutral(&mut self, end: f64) -> Option<f64> {
        let began = self.s.re.signum();
        let whole = end - self.at;
        const PIECES: usize = 24;
        for i in 1..=PIECES {
            let (before, at) = (self.s, self.at);
            self.to(whole * (i as f64 / PIECES as f64))?;
            if self.s.re.signum() != began {
                return self.crossing(at, before);
            }
        }
        None
    }

    /// The zero of the growth rate between `low` and here.
    fn crossing(&self, low: f64, s_low: Complex64) -> Option<f64> {
        let (mut a, mut s_a) = (low, s_low);
        let (mut b, s_b) = (self.at, self.s);
        let (mut re_a, mut re_b) = (s_a.re, s_b.re);
        for _ in 0..60 {
            let secant = a - re_a * (b - a) / (re_b - re_a);
            let mid = 0.5 * (a + b);
            // The secant where it halves the interval as well, else the middle.
            let x = if (secant - a) * (secant - b) < 0.0 {
                secant
            } else {
                mid
            };
            let mut path = Path {
                at: a,
                s: s_a,
                ..*self
            };
            path.to(x)?;
            if path.s.re.abs() <= 1e-10 * path.s.norm() {
                return Some(x);
            }
            if path.s.re.signum() == re_a.signum() {
                (a, s_a, re_a) = (x, path.s, path.s.re);
                re_b *= 0.5;
            } else {
                (b, re_b) = (x, path.s.re);
                re_a *= 0.5;
            }
            if (b - a).abs() <= 1e-13 * (a.abs() + b.abs()) {
                return Some(x);
            }
        }
        None
    }
}
