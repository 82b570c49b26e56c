//! The flow through a choked nozzle whose throat area is stated.
//!
//! With `M` the Mach number at the first station, `A_n` the throat area, `G` the flux at Mach 1 from
//! the stagnation conditions at the exit: `r(M) = mdot/(A_n G(p_t, T_t)) - 1 = 0`.
//!
//! Every steady balance is homogeneous in pressure: at given temperatures `mdot`, `p_t` and every
//! loss grow as the feed's pressure. So `r` depends on `M` alone, is -1 at rest and rises with `M`; the
//! stated pressure or mass flow only scales the answer.

use std::cell::Cell;

use argmin::core::{CostFunction, Executor};
use argmin::solver::brent::BrentRoot;

use super::fault::Fault;
use super::march::Chain;
use crate::gas::{Gas, State, choked_flux, implicit};
use crate::knobs::Values;
use crate::numerics::dual::{Dual, Real};

/// What the file states of the flow beside the throat.
#[derive(Clone, Copy, Debug)]
pub(super) enum Stated<T> {
    /// Static pressure at the first station (Pa).
    Pressure(T),
    /// Mass flow (kg/s).
    MassFlow(T),
}

/// The stream at the first station but for its Mach number.
#[derive(Clone, Copy, Debug)]
pub(super) struct Inflow<T> {
    pub(super) gas: Gas<T>,
    /// Static temperature (K).
    pub(super) temperature: T,
    /// Area (m^2).
    pub(super) area: T,
    pub(super) stated: Stated<T>,
}

impl<T: Real> Inflow<T> {
    fn at(&self, mach: T) -> State<T> {
        let velocity = mach * self.gas.sound_speed(self.temperature);
        let pressure = match self.stated {
            Stated::Pressure(p) => p,
            Stated::MassFlow(m) => {
                m * self.gas.gas_constant() * self.temperature / (velocity * self.area)
            }
        };
        State {
            gas: self.gas,
            pressure,
            temperature: self.temperature,
            velocity,
            area: self.area,
        }
    }

    fn map<U>(&self, f: impl Fn(T) -> U) -> Inflow<U> {
        Inflow {
            gas: self.gas.map(&f),
            temperature: f(self.temperature),
            area: f(self.area),
            stated: match self.stated {
                Stated::Pressure(p) => Stated::Pressure(f(p)),
                Stated::MassFlow(m) => Stated::MassFlow(f(m)),
            },
        }
    }
}

/// A chain fed by a stream of unknown Mach number and ended by a throat.
struct Nozzled<'a, T> {
    chain: Chain<'a, T>,
    inflow: Inflow<T>,
    /// Throat area (m^2).
    throat: T,
}

impl<T: Real> Nozzled<'_, T> {
    fn residual(&self, mach: T, states: &mut Vec<State<T>>) -> Result<T, Fault> {
        self.chain.march(self.inflow.at(mach), states)?;
        let last = states.last().copied().unwrap_or(self.inflow.at(mach));
        Ok(last.mass_flow() / (self.throat * exit_flux(&last)) - 1.0)
    }
}

/// Flux at Mach 1 (kg/(s m^2)) from the stagnation conditions of a state.
pub(super) fn exit_flux<T: Real>(state: &State<T>) -> T {
    choked_flux(
        &state.gas,
        state.stagnation_pressure(),
        state.stagnation_temperature(),
    )
}

/// Fills `states` with the flow that chokes the throat of area `throat` (m^2).
pub(super) fn march<T: Real>(
    chain: Chain<'_, T>,
    inflow: Inflow<T>,
    throat: T,
    states: &mut Vec<State<T>>,
) -> Result<(), Fault> {
    if let Some(passage) = chain.areas.last().map(|a| a.value())
        && throat.value() >= passage
    {
        return Err(Fault::WideThroat {
            throat: throat.value(),
            passage,
        });
    }
    let values = Values(chain.values.0.iter().map(|x| x.value()).collect());
    let areas: Vec<f64> = chain.areas.iter().map(|x| x.value()).collect();
    let plain = Nozzled {
        chain: Chain {
            layout: chain.layout,
            values: &values,
            areas: &areas,
            trial: true,
        },
        inflow: inflow.map(Real::value),
        throat: throat.value(),
    };
    let near = bracketed(&plain)?;
    let (mach, slope) = polished(&plain, near)?;

    let whole = Nozzled {
        chain,
        inflow,
        throat,
    };
    let mut m = T::from(mach);
    for _ in 0..implicit::corrections::<T>() {
        m -= whole.residual(m, states)? / slope;
    }
    whole.chain.march(inflow.at(m), states)
}

/// The root to about 1e-6 of itself.
fn bracketed(plain: &Nozzled<'_, f64>) -> Result<f64, Fault> {
    let search = Search {
        plain,
        fault: Cell::new(None),
    };
    // `r + 1` is nearly proportional to the Mach number: one feasible point tells the scale.
    let mut probe = 0.02;
    let mut scale = search.residual(probe)?;
    while search.fault.take().is_some() && probe > 1e-9 {
        probe *= 0.1;
        scale = search.residual(probe)?;
    }
    let estimate = probe / (scale + 1.0);
    let (mut low, mut high) = (0.0, (1.1 * estimate).clamp(1e-9, 1.0));
    while search.residual(high)? < 0.0 && high < 1.0 {
        (low, high) = (high, (1.3 * high).min(1.0));
    }
    let found = Executor::new(&search, BrentRoot::new(low, high, 1e-6 * high))
        .configure(|s| s.max_iters(100))
        .run();
    let root = found
        .ok()
        .and_then(|r| r.state.best_param.or(r.state.param));
    let stopped_by = search.fault.take();
    match root {
        Some(m)
            if search.residual(m).is_ok_and(|r| r.abs() < 1e-3)
                && search.fault.take().is_none() =>
        {
            Ok(m)
        }
        // The throat asks for more than an element before it can pass.
        _ => Err(stopped_by.unwrap_or(Fault::NotFinite {
            element: crate::network::ElementId(0),
        })),
    }
}

/// The root to rounding, and the residual's slope there.
fn polished(plain: &Nozzled<'_, f64>, near: f64) -> Result<(f64, f64), Fault> {
    let lift = |x: f64| Dual::constant(x);
    let values = plain.chain.values.lift::<Dual>();
    let areas: Vec<Dual> = plain.chain.areas.iter().map(|&a| lift(a)).collect();
    let dual = Nozzled {
        chain: Chain {
            layout: plain.chain.layout,
            values: &values,
            areas: &areas,
            trial: true,
        },
        inflow: plain.inflow.map(lift),
        throat: lift(plain.throat),
    };
    let mut states = Vec::with_capacity(areas.len());
    let (mut mach, mut slope) = (near, 1.0);
    for _ in 0..8 {
        let r = dual.residual(Dual::variable(mach, 0), &mut states)?;
        [slope] = r.d;
        let step = r.v / slope;
        mach -= step;
        if step.abs() <= 1e-12 * mach.abs() {
            break;
        }
    }
    Ok((mach, slope))
}

/// The residual as a function to bracket: flow that chokes on its way counts as too much.
struct Search<'a> {
    plain: &'a Nozzled<'a, f64>,
    /// The last choking met.
    fault: Cell<Option<Fault>>,
}

impl Search<'_> {
    fn residual(&self, mach: f64) -> Result<f64, Fault> {
        if mach <= 0.0 {
            return Ok(-1.0);
        }
        let mut states = Vec::with_capacity(self.plain.chain.areas.len());
        match self.plain.residual(mach, &mut states) {
            Err(fault) if fault.is_choking() => {
                self.fault.set(Some(fault));
                Ok(1.0)
            }
            other => other,
        }
    }
}

impl CostFunction for &Search<'_> {
    type Param = f64;
    type Output = f64;

    fn cost(&self, mach: &f64) -> Result<f64, argmin::core::Error> {
        self.residual(*mach)
            .map_err(|fault| argmin::core::Error::msg(format!("{fault:?}")))
    }
}
