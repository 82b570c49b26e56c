//! The mean flow across one compact element: the state behind it from the state before it.
//!
//! With `mdot` the mass flow, `A` the area behind the element, `R` the gas constant there and `p, T, u`
//! the static state there,
//!
//! ```text
//! u = mdot R T/(p A)
//! h(T) + u^2/2 = h_t          stagnation enthalpy is kept; or T is stated, behind a flame
//! F(p) = 0                    the element's third balance
//! ```
//!
//! The first two give `u, T` for any `p > 0`, at rest as well, so that one unknown is left. In it every
//! third balance is a quantity of the inlet less the stagnation pressure or the impulse `p + rho u^2`
//! behind the element. Both are convex functions of `p` at given `mdot` and `h_t` (or `T`), least where
//! the flow is sonic (Mach `1/sqrt(gamma)` where `T` is given), and rise with `p` above that. So `F` is
//! concave, falls on the subsonic branch and has one root there or none. Newton's iteration started
//! on that branch approaches the root from above and never passes it; an iterate with `F <= 0` and
//! `F' >= 0` proves that there is none.

use crate::elements::Kind;
use crate::elements::port::Port;
use crate::gas::{Gas, REFERENCE_TEMPERATURE, State, implicit};
use crate::knobs::KnobId;
use crate::numerics::dual::{Dual, Real};

/// What closes the energy balance of an element.
#[derive(Clone, Copy, Debug)]
pub(super) enum Energy<N> {
    /// Stagnation enthalpy (J/kg), kept.
    Kept(N),
    /// Static temperature (K) behind it, stated.
    Stated(N),
}

/// What is known of the flow through an element before its third balance is solved.
#[derive(Clone, Copy, Debug)]
pub(super) struct Crossing<N> {
    /// Fluxes at its inlet.
    pub(super) up: Port<N>,
    /// Mass flow (kg/s).
    pub(super) mass_flow: N,
    /// Gas behind it.
    pub(super) gas: Gas<N>,
    /// Area behind it (m^2).
    pub(super) area: N,
    /// Its energy balance.
    pub(super) energy: Energy<N>,
}

/// Why there is no state behind an element.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Failure {
    /// No subsonic state satisfies the balance.
    Choked,
    /// A number came out not finite.
    NotFinite,
}

impl<N: Real> Crossing<N> {
    /// The state behind the element if its static pressure is `pressure` (Pa); `guess` (K) is where a
    /// temperature is sought from.
    fn down(&self, pressure: N, guess: f64) -> State<N> {
        let per_kelvin = self.mass_flow * self.gas.gas_constant() / (pressure * self.area);
        let temperature = match self.energy {
            Energy::Stated(t) => t,
            Energy::Kept(h_t) => static_temperature(&self.gas, h_t, per_kelvin, guess),
        };
        State {
            gas: self.gas,
            pressure,
            temperature,
            velocity: per_kelvin * temperature,
            area: self.area,
        }
    }

    /// The third balance (Pa) at that pressure, and the temperature behind (K). An element that
    /// balances nothing keeps the pressure.
    fn third(
        &self,
        kind: &Kind,
        pressure: N,
        guess: f64,
        number: impl Fn(KnobId) -> N,
    ) -> (N, f64) {
        let down = self.down(pressure, guess);
        let port = Port::of(&down);
        let balance = kind.third_balance(&self.up, &port, number);
        (
            balance.unwrap_or(self.up.pressure - pressure),
            down.temperature.value(),
        )
    }

    fn map<M>(&self, f: impl Fn(N) -> M) -> Crossing<M> {
        Crossing {
            up: Port {
                pressure: f(self.up.pressure),
                velocity: f(self.up.velocity),
                mass_flow: f(self.up.mass_flow),
                momentum_flux: f(self.up.momentum_flux),
                enthalpy_flow: f(self.up.enthalpy_flow),
                stagnation_pressure: f(self.up.stagnation_pressure),
                area: f(self.up.area),
            },
            mass_flow: f(self.mass_flow),
            gas: self.gas.map(&f),
            area: f(self.area),
            energy: match self.energy {
                Energy::Kept(h) => Energy::Kept(f(h)),
                Energy::Stated(t) => Energy::Stated(f(t)),
            },
        }
    }

    /// The state behind the element, sought from pressure `pressure` (Pa) and temperature
    /// `temperature` (K).
    pub(super) fn solve(
        &self,
        kind: &Kind,
        pressure: f64,
        temperature: f64,
        number: impl Fn(KnobId) -> N,
    ) -> Result<State<N>, Failure> {
        let corrections = implicit::corrections::<N>();
        // The step after a step of `d` is of the order of `d^2`: to rounding, which waves that grow along
        // the network magnify. A carried derivative divides by the slope, which then must be the root's own.
        let tolerance = if corrections == 0 { 1e-9 } else { 1e-12 };
        let plain = self.map(|x| Dual::constant(x.value()));
        let plain_number = |k| Dual::constant(number(k).value());
        let root = newton(tolerance, pressure, temperature, |p, guess| {
            plain.third(kind, Dual::variable(p, 0), guess, plain_number)
        })?;
        let mut p = N::from(root.pressure);
        for _ in 0..corrections {
            p -= self.third(kind, p, root.temperature, &number).0 / root.slope;
        }
        Ok(self.down(p, root.temperature))
    }
}

struct Root {
    pressure: f64,
    temperature: f64,
    slope: f64,
}

/// Newton's iteration on the subsonic branch of a third balance.
fn newton(
    tolerance: f64,
    mut p: f64,
    mut temperature: f64,
    third: impl Fn(f64, f64) -> (Dual, f64),
) -> Result<Root, Failure> {
    let mut on_branch = false;
    let mut last = f64::INFINITY;
    for _ in 0..200 {
        let (f, t) = third(p, temperature);
        temperature = t;
        let (value, [slope]) = (f.v, f.d);
        if !(value.is_finite() && slope.is_finite() && t > 0.0) {
            return Err(Failure::NotFinite);
        }
        if slope >= 0.0 {
            // Before the branch is reached, towards it: the flow slows as pressure rises.
            if on_branch {
                return Err(Failure::Choked);
            }
            p *= 2.0;
            continue;
        }
        on_branch = true;
        let step = -value / slope;
        let size = (step / p).abs();
        // Of the order of one on the branch but for the square root at its end.
        let steep = slope < -0.1;
        p += step;
        if p <= 0.0 {
            return Err(Failure::Choked);
        }
        let at_rounding = size < 1e-9 && size >= last;
        let enough = if steep { tolerance } else { 1e-14 };
        if size <= enough || at_rounding {
            return Ok(Root {
                pressure: p,
                temperature,
                slope,
            });
        }
        last = size;
    }
    Err(Failure::Choked)
}

/// Static temperature (K) of a stream with stagnation enthalpy `h_t` (J/kg) whose velocity is
/// `per_kelvin` (m/(s K)) times it: `h(T) + (k T)^2/2 = h_t`, sought from `guess` (K).
///
/// For a perfect gas `T = 2 T_t/(1 + sqrt(1 + 2 k^2 T_t/cp))`, which holds at rest.
fn static_temperature<N: Real>(gas: &Gas<N>, h_t: N, per_kelvin: N, guess: f64) -> N {
    let square = per_kelvin * per_kelvin;
    match gas {
        Gas::Perfect { .. } => {
            let cp = gas.cp(h_t);
            let t_t = h_t / cp + REFERENCE_TEMPERATURE;
            let root = (square * t_t / cp * 2.0 + 1.0).sqrt();
            t_t * 2.0 / (root + 1.0)
        }
        Gas::Air => {
            let air = Gas::<f64>::Air;
            let (k2, h) = (square.value(), h_t.value());
            let (mut t, mut slope) = (guess, 1.0);
            for _ in 0..60 {
                slope = air.cp(t) + k2 * t;
                let step = (h - air.enthalpy(t) - 0.5 * k2 * t * t) / slope;
                t += step;
                // Curvature is mild: a step of 1e-8 leaves less than rounding.
                if step.abs() <= 1e-8 * t.abs() {
                    break;
                }
            }
            if implicit::corrections::<N>() > 0 {
                slope = air.cp(t) + k2 * t;
            }
            implicit::carry(t, slope, |t: N| {
                gas.enthalpy(t) + square * t * t * 0.5 - h_t
            })
        }
    }
}
