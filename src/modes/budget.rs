//! Where a mode gets its growth from: the balance of acoustic energy, element by element.
//!
//! With the amplitudes `p', u'` of a mode at growth rate `sigma`, the acoustic power through a station and the
//! acoustic energy of a length `dx` of duct are, averaged over a cycle (Cantrell & Hart 1964, J. Acoust. Soc.
//! Am. 36),
//!
//! ```text
//! W  = A/2 Re[(rho u' + u p'/c^2)^* (p'/rho + u u')]  = A/(2 rho c) [(1+M)^2 |p+|^2 - (1-M)^2 |p-|^2]
//! dE = A/4 [p'^2/(rho c^2) + rho u'^2 + 2 M p'u'/c] dx = A/(2 rho c^2) [(1+M)|p+|^2 + (1-M)|p-|^2] dx
//! ```
//!
//! and `2 sigma E = W_in - W_out` holds exactly in each duct. A compact element sends out the power
//! `W_2 - W_1`, with the waves behind it *computed from those before it by its own balance*, not read off the
//! mode. What it stores itself (the kinetic energy of a slug, the compression of a plenum) is part of the
//! energy. So, over all elements and both ends,
//!
//! ```text
//! sigma = sum_e G_e/(2 E),     E = sum of all energies
//! ```
//!
//! where `G_e` is the power an element puts in. It falls into three parts: what sound alone makes of the mean
//! flow there (losses and gains), what entropy arriving adds, and what fluctuating heat release adds. By
//! the jumps of mass, momentum and energy at a flame the last is, at any Mach number,
//!
//! ```text
//! (gamma - 1)/(2 gamma p) Re[Q'^* (p' + rho u u')]      all of it behind the flame
//! ```
//!
//! which in still gas is the Rayleigh term, and with flow may have the other sign where `p'` is small or near
//! quadrature with `Q'`.

use nalgebra::{Matrix3, Vector3};
use num_complex::Complex64;

use super::{Mode, Solved, shape};
use crate::elements::Kind;
use crate::gas::State;
use crate::network::{ElementId, Network};
use crate::waves::complex::Cx;
use crate::waves::law::Law;
use crate::waves::primitive::{Block, End, Joint, Row, Start, Step, Travel};

/// One element's part in a mode.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Part {
    /// The element.
    pub element: ElementId,
    /// Its part of the growth rate by sound and mean flow (1/s): losses, radiation, steady heating.
    pub flow: f64,
    /// Its part of the growth rate by entropy that reaches it (1/s).
    pub entropy: f64,
    /// Its part of the growth rate by fluctuating heat release (1/s).
    pub heat: f64,
    /// Its part of the acoustic energy.
    pub energy: f64,
}

impl Part {
    /// Its part of the growth rate (1/s).
    pub fn growth(&self) -> f64 {
        self.flow + self.entropy + self.heat
    }
}

/// The growth rate of a mode, shared out.
#[derive(Clone, Debug, PartialEq)]
pub struct Budget {
    /// Every element in flow order.
    pub parts: Vec<Part>,
}

impl Budget {
    /// The sum of all parts (1/s): the growth rate, which nothing in the parts was made to meet.
    pub fn growth(&self) -> f64 {
        self.parts.iter().map(Part::growth).sum()
    }
}

type Waves = Vector3<Complex64>;

/// A mode whose energy, over one radian, is below this part of the power that passes has no budget: a flame at a
/// pressure node that answers to its own inlet has modes of velocity at that station alone.
const TELLING: f64 = 1e-7;

/// The budget of a mode; `None` where its shape does not settle or holds next to no acoustic energy.
pub fn budget(network: &Network, solved: &Solved, mode: &Mode) -> Option<Budget> {
    let null = shape(solved, mode)?;
    let waves: Vec<Waves> = null.waves.iter().map(|w| Vector3::from(*w)).collect();
    let chain = &solved.acoustics.chain;
    let states = &solved.mean.states;
    let mut powers = vec![started(
        &chain.start,
        mode.s,
        states.first()?,
        waves.first()?,
    )?];
    for (plane, step) in chain.steps.iter().enumerate() {
        let (before, behind) = (states.get(plane)?, states.get(plane + 1)?);
        let element = ElementId(plane + 1);
        powers.push(match step {
            Step::Travel(travel) => Power {
                energy: stored_along(travel, mode.s.re, before, behind, &waves, plane)?,
                ..Power::default()
            },
            Step::Joint(joint) => {
                let energy = stored_in(network, element, before, behind, &waves, plane)?;
                let mut power = through(joint, mode.s, (before, behind), &waves, plane)?;
                // What goes into the store is not lost.
                power.flow += 2.0 * mode.s.re * energy;
                power.energy = energy;
                power
            }
        });
    }
    powers.push(ended(&chain.end, mode.s, states.last()?, waves.last()?)?);
    let energy: f64 = powers.iter().map(|p| p.energy).sum();
    // Powers are known to rounding of the largest that passes either way at a station.
    let passing = waves.iter().zip(states).map(|(w, state)| {
        let both = w[0].norm_sqr() + w[1].norm_sqr();
        state.area * both / (2.0 * state.density() * state.sound_speed())
    });
    let passing = passing.fold(0.0, f64::max);
    if !(energy.is_finite() && energy * mode.s.norm() > TELLING * passing) {
        return None;
    }
    let parts = powers
        .iter()
        .enumerate()
        .map(|(i, p)| Part {
            element: ElementId(i),
            flow: p.flow / (2.0 * energy),
            entropy: p.entropy / (2.0 * energy),
            heat: p.heat / (2.0 * energy),
            energy: p.energy / energy,
        })
        .collect();
    Some(Budget { parts })
}

/// Power put in (W) and energy held (J), at unit amplitude of the null vector.
#[derive(Clone, Copy, Debug, Default)]
struct Power {
    flow: f64,
    entropy: f64,
    heat: f64,
    energy: f64,
}

/// Acoustic power through a station (W).
fn flux(state: &State<f64>, w: &Waves) -> f64 {
    let m = state.mach();
    let forward = (1.0 + m).powi(2) * w[0].norm_sqr();
    let backward = (1.0 - m).powi(2) * w[1].norm_sqr();
    state.area * (forward - backward) / (2.0 * state.density() * state.sound_speed())
}

/// Energy in a duct (J).
fn stored_along(
    travel: &Travel<f64>,
    sigma: f64,
    before: &State<f64>,
    behind: &State<f64>,
    waves: &[Waves],
    plane: usize,
) -> Option<f64> {
    let (entering, leaving) = (waves.get(plane)?[0], waves.get(plane + 1)?[1]);
    // integral of exp(-2 sigma x/v) over the length, as a time
    let mean = |t: f64| match sigma * t {
        0.0 => t,
        a => -(-2.0 * a).exp_m1() / (2.0 * sigma),
    };
    let m = before.mach();
    let forward = (1.0 + m).powi(2) * entering.norm_sqr() * mean(travel.downstream);
    let backward = (1.0 - m).powi(2) * leaving.norm_sqr() * mean(travel.upstream);
    Some(behind.area * (forward + backward) / (2.0 * before.density() * before.sound_speed()))
}

/// Energy in the slug of a compact element, or in a plenum (J).
fn stored_in(
    network: &Network,
    element: ElementId,
    before: &State<f64>,
    behind: &State<f64>,
    waves: &[Waves],
    plane: usize,
) -> Option<f64> {
    let velocity =
        |state: &State<f64>, w: &Waves| (w[0] - w[1]) / (state.density() * state.sound_speed());
    let (up, down) = (waves.get(plane)?, waves.get(plane + 1)?);
    let values = &network.values;
    // `rho_1 L A |u'|^2/4`, A and u' of the smaller area
    let slug = |length: f64, area: f64, u: Complex64| {
        0.25 * before.density() * length * area * u.norm_sqr()
    };
    Some(match network.kind(element) {
        Kind::Contraction(c) => slug(
            values[c.effective_length],
            behind.area,
            velocity(behind, down),
        ),
        Kind::Expansion(e) => slug(
            values[e.effective_length],
            before.area,
            velocity(before, up),
        ),
        Kind::Restriction(r) => {
            let area = r.section.map_or(before.area, |s| s.area(values));
            let u = velocity(before, up) * (before.area / area);
            slug(values[r.effective_length], area, u)
        }
        Kind::Plenum(p) => {
            let t = before.stagnation_temperature();
            let c = before.gas.sound_speed(t);
            let density = before.pressure / (before.gas.gas_constant() * t);
            0.25 * values[p.volume] * (up[0] + up[1]).norm_sqr() / (density * c * c)
        }
        Kind::Feed(_) | Kind::Exit(_) | Kind::Duct(_) | Kind::Flame(_) => 0.0,
    })
}

fn at(law: &Law<f64>, s: Complex64) -> Complex64 {
    let [f]: [Cx<f64>; 1] = law.taylor(Cx::constant(s));
    f.value()
}

fn dot(row: &Row<f64>, w: &Waves) -> Complex64 {
    row.iter().zip(w.iter()).map(|(&a, &x)| x * a).sum()
}

fn matrix(block: &Block<f64>) -> Matrix3<Complex64> {
    Matrix3::from_fn(|i, j| Complex64::from(block[i][j]))
}

/// Power a compact element sends out, its waves behind from `down x_2 = -(up x_1 + row sum F sense x)`.
fn through(
    joint: &Joint<f64>,
    s: Complex64,
    (before, behind): (&State<f64>, &State<f64>),
    waves: &[Waves],
    plane: usize,
) -> Option<Power> {
    let down = matrix(&joint.down).lu();
    let x = waves.get(plane)?;
    let row = Vector3::from_fn(|i, _| Complex64::from(joint.row[i]));
    let (mut stored, mut heat) = (Complex64::ZERO, Complex64::ZERO);
    for term in &joint.terms {
        let sensed = at(&term.law, s) * dot(&term.sense, waves.get(term.at)?);
        match term.law {
            // Storage is what a polynomial of `s` stands for.
            Law::Polynomial { .. } => stored += sensed,
            Law::Delays(_) | Law::Complex { .. } => heat += sensed,
        }
    }
    let entropy = Vector3::new(Complex64::ZERO, Complex64::ZERO, x[2]);
    let sound = x - entropy;
    let behind_it = |x: Waves, source: Complex64| {
        let right = -(matrix(&joint.up) * x + row * source);
        down.solve(&right)
    };
    let by_sound = behind_it(sound, stored)?;
    let by_entropy = behind_it(entropy, Complex64::ZERO)?;
    let by_heat = behind_it(Waves::zeros(), heat)?;
    let quiet = flux(behind, &by_sound);
    let carried = flux(behind, &(by_sound + by_entropy));
    let whole = flux(behind, &(by_sound + by_entropy + by_heat));
    Some(Power {
        flow: quiet - flux(before, x),
        entropy: carried - quiet,
        heat: whole - carried,
        energy: 0.0,
    })
}

/// Power the feed sends in, its `p+` and `e` from `p-` by its own conditions.
fn started(start: &Start<f64>, s: Complex64, state: &State<f64>, x: &Waves) -> Option<Power> {
    let mut rows = start.rows.map(|row| row.map(Complex64::from));
    if let Some((law, sense)) = &start.term {
        let f = at(law, s);
        for (a, &b) in rows[0].iter_mut().zip(sense) {
            *a += f * b;
        }
    }
    let [[a, am, ae], [b, bm, be]] = rows;
    let determinant = a * be - ae * b;
    let plus = -(am * be - ae * bm) * x[1] / determinant;
    let sent = Vector3::new(plus, x[1], Complex64::ZERO);
    plus.is_finite().then(|| Power {
        flow: flux(state, &sent),
        ..Power::default()
    })
}

/// Power the exit sends in, its `p-` from `p+` and `e` by its own condition.
fn ended(end: &End<f64>, s: Complex64, state: &State<f64>, x: &Waves) -> Option<Power> {
    let mut row = end.row.map(Complex64::from);
    if let Some((law, sense)) = &end.term {
        let f = at(law, s);
        for (a, &b) in row.iter_mut().zip(sense) {
            *a += f * b;
        }
    }
    let returned = |entropy: Complex64| -(row[0] * x[0] + row[2] * entropy) / row[1];
    let power = |minus| -flux(state, &Vector3::new(x[0], minus, Complex64::ZERO));
    let (quiet, whole) = (returned(Complex64::ZERO), returned(x[2]));
    whole.is_finite().then(|| Power {
        flow: power(quiet),
        entropy: power(whole) - power(quiet),
        ..Power::default()
    })
}
