//! From the feed to the exit, element by element.

use super::crossing::{Crossing, Energy, Failure};
use super::fault::Fault;
use crate::elements::flame::Flame;
use crate::elements::port::Port;
use crate::elements::{Element, GasChoice, Kind};
use crate::gas::{Gas, MOLAR_GAS_CONSTANT, State, choked_flux};
use crate::knobs::Values;
use crate::network::{ElementId, Layout};
use crate::numerics::dual::Real;

/// Share of its inlet's temperature by which a flame may lie below it: the stream between two flames stated
/// equally hot slows down and warms by less. Such a flame is remarked on; one colder still is refused.
const COOLING_TAKEN: f64 = 0.01;

/// The gas a network names, with its numbers.
pub(super) fn gas<T: Real>(choice: GasChoice, values: &Values<T>) -> Gas<T> {
    match choice {
        GasChoice::Air => Gas::Air,
        GasChoice::PerfectByConstant {
            gamma,
            gas_constant,
        } => Gas::Perfect {
            gamma: values[gamma],
            gas_constant: values[gas_constant],
        },
        GasChoice::PerfectByMolarMass { gamma, molar_mass } => Gas::Perfect {
            gamma: values[gamma],
            gas_constant: T::from(MOLAR_GAS_CONSTANT) / values[molar_mass],
        },
    }
}

/// A chain with its areas, ready to be marched from any first state.
pub(super) struct Chain<'a, T> {
    pub(super) layout: &'a Layout,
    pub(super) values: &'a Values<T>,
    /// Area at each station (m^2).
    pub(super) areas: &'a [T],
    /// A flow tried on the way to the answer: a flame may be colder than its inlet in it.
    pub(super) trial: bool,
}

impl<T: Real> Chain<'_, T> {
    /// Fills `states` with the state at each station, the first being `first`.
    pub(super) fn march(&self, first: State<T>, states: &mut Vec<State<T>>) -> Result<(), Fault> {
        states.clear();
        let feed = ElementId(0);
        let start = first.value();
        let sound = start.pressure > 0.0
            && start.temperature > 0.0
            && start.area > 0.0
            && first.is_finite();
        if !sound {
            return Err(Fault::NotFinite { element: feed });
        }
        let mach = start.mach();
        if mach >= 1.0 {
            return Err(Fault::SupersonicFeed { mach });
        }
        let mass_flow = first.mass_flow();
        let mut enthalpy = first.stagnation_enthalpy();
        let mut up = first;
        states.push(first);
        for (link, &area) in self.layout.links.iter().zip(self.areas).skip(1) {
            let Some(element) = self.layout.elements.get(link.from.0) else {
                return Err(Fault::NotFinite { element: link.from });
            };
            let here = Here {
                id: link.from,
                element,
                values: self.values,
                trial: self.trial,
            };
            up = match &element.kind {
                Kind::Duct(_) | Kind::Feed(_) | Kind::Exit(_) => up,
                Kind::Flame(flame) => {
                    let down = here.flame(flame, &up, mass_flow, area)?;
                    enthalpy = down.stagnation_enthalpy();
                    down
                }
                _ => here.adiabatic(&up, mass_flow, enthalpy, area)?,
            };
            states.push(up);
        }
        Ok(())
    }
}

/// One element and the numbers of its network.
struct Here<'a, T> {
    id: ElementId,
    element: &'a Element,
    values: &'a Values<T>,
    trial: bool,
}

impl<T: Real> Here<'_, T> {
    fn adiabatic(
        &self,
        up: &State<T>,
        mass_flow: T,
        enthalpy: T,
        area: T,
    ) -> Result<State<T>, Fault> {
        let port = Port::of(up);
        self.passage(up, &port)?;
        let crossing = Crossing {
            up: port,
            mass_flow,
            gas: up.gas,
            area,
            energy: Energy::Kept(enthalpy),
        };
        let p = up.pressure.value();
        self.solve(&crossing, up, p, |most| Fault::Choked {
            element: self.id,
            mach: up.value().mach(),
            mass_flow: mass_flow.value(),
            most,
        })
    }

    fn flame(
        &self,
        flame: &Flame,
        up: &State<T>,
        mass_flow: T,
        area: T,
    ) -> Result<State<T>, Fault> {
        if flame.burnt_temperature.is_none() && flame.burnt_gas.is_none() {
            return Ok(*up);
        }
        let burnt = flame
            .burnt_temperature
            .map_or(up.temperature, |k| self.values[k]);
        let (asked, inlet) = (burnt.value(), up.temperature.value());
        if asked < inlet * (1.0 - COOLING_TAKEN) && !self.trial {
            return Err(Fault::Colder {
                element: self.id,
                asked,
                inlet,
            });
        }
        let port = Port::of(up);
        let crossing = Crossing {
            up: port,
            mass_flow,
            gas: flame.burnt_gas.map_or(up.gas, |g| gas(g, self.values)),
            area,
            energy: Energy::Stated(burnt),
        };
        // At given temperature the impulse is `p + k/p`: its larger root is the subsonic branch's.
        let impulse = port.pressure.value() + port.momentum_flux.value();
        let flux = mass_flow.value() / area.value();
        let r = crossing.gas.gas_constant().value();
        let root = impulse * impulse - 4.0 * flux * flux * r * asked;
        let hottest = impulse * impulse / (4.0 * flux * flux * r);
        let choked = Fault::ThermallyChoked {
            element: self.id,
            mach: up.value().mach(),
            asked,
            hottest,
        };
        if root < 0.0 {
            return Err(choked);
        }
        let p = 0.5 * (impulse + root.sqrt());
        self.solve(&crossing, up, p, |_| choked)
    }

    fn solve(
        &self,
        crossing: &Crossing<T>,
        up: &State<T>,
        pressure: f64,
        choked: impl Fn(f64) -> Fault,
    ) -> Result<State<T>, Fault> {
        let t = up.temperature.value();
        let number = |k| self.values[k];
        let found = crossing.solve(&self.element.kind, pressure, t, number);
        let not_finite = Fault::NotFinite { element: self.id };
        match found {
            Ok(down) if down.is_finite() && down.temperature.value() > 0.0 => {
                if down.value().mach() < 1.0 {
                    Ok(down)
                } else {
                    Err(choked(self.most(up, crossing)))
                }
            }
            Ok(_) | Err(Failure::NotFinite) => Err(not_finite),
            Err(Failure::Choked) => Err(choked(self.most(up, crossing))),
        }
    }

    /// Greatest mass flow (kg/s) the stagnation pressure left behind the element could drive through
    /// the area there.
    fn most(&self, up: &State<T>, crossing: &Crossing<T>) -> f64 {
        let up = up.value();
        let port = Port::of(&up);
        let left = match &self.element.kind {
            Kind::Plenum(_) => up.pressure,
            Kind::Restriction(r) => {
                let open = r.widening(port.area, |k| self.values[k].value());
                let dynamic = port.momentum_flux * open * open * 0.5;
                port.stagnation_pressure - self.values[r.loss_coefficient].value() * dynamic
            }
            _ => port.stagnation_pressure,
        };
        let t_t = up.stagnation_temperature();
        choked_flux(&crossing.gas.value(), left.max(0.0), t_t) * crossing.area.value()
    }

    /// A restriction whose open area is stated must be able to pass the flow at all.
    fn passage(&self, up: &State<T>, port: &Port<T>) -> Result<(), Fault> {
        let Kind::Restriction(r) = &self.element.kind else {
            return Ok(());
        };
        let Some(section) = r.section else {
            return Ok(());
        };
        let area = section.area(self.values).value();
        let mass_flow = port.mass_flow.value();
        let up = up.value();
        // No need to work the choked flux `G` out far below it: `G^2 R T_t/p_t^2` exceeds `1/e` for any
        // gas, and `R T/p^2` at the inlet exceeds `R T_t/p_t^2`.
        let flux = mass_flow / area;
        if flux * flux * up.gas.gas_constant() * up.temperature < 0.25 * up.pressure * up.pressure {
            return Ok(());
        }
        let most = area
            * choked_flux(
                &up.gas,
                up.stagnation_pressure(),
                up.stagnation_temperature(),
            );
        if mass_flow < most {
            Ok(())
        } else {
            Err(Fault::ChokedPassage {
                element: self.id,
                mass_flow,
                most,
            })
        }
    }
}
