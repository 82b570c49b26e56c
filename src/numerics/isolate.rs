//! Proof that a disc holds exactly one zero, or exactly two, with an error bound.
//!
//! With `f(z + h) = c_0 + c_1 h + R`, `|R| <= B_2 r^2` on `|h| <= r`, Rouche's theorem against the linear
//! part gives exactly one zero in the disc of radius `r` when `|c_1| r > |c_0| + B_2 r^2`: for every `r`
//! between the roots `r-` and `r+` of that quadratic. `r-` bounds the error of `z`; the disc of radius
//! `r+` holds no other zero. Where `B_2` is too far above `|c_2|` for that, `|R| <= |c_2| r^2 + |c_3| r^3 + B_4 r^4`.
//! Likewise against the quadratic part: exactly two zeros when
//! `|c_2| r^2 > |c_0| + |c_1| r + |c_3| r^3 + B_4 r^4`. The computed `c_k` are widened by the rounding floor.

use num_complex::Complex64;

use super::analytic::{Analytic, Region, Rounding, TAYLOR, modulus, quotient};

/// A disc with a known number of zeros.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Zero {
    /// Best estimate: the zero, or the middle of two.
    pub at: Complex64,
    /// The zero, or both, lie no farther from it.
    pub error: f64,
    /// No other zero lies nearer than this.
    pub radius: f64,
    /// One or two.
    pub multiplicity: u8,
    /// Proven to lie on the real axis.
    pub real: bool,
    /// The function there is zero to rounding: no arithmetic of this precision tells more.
    pub settled: bool,
}

/// The scale on which a function varies between the real axis and `z`: `B_0/B_1`, the reciprocal of an
/// effective delay.
pub fn scale<F: Analytic + ?Sized>(f: &F, z: Complex64) -> f64 {
    let b = f.bound(&Region {
        omega: 0.0,
        ..Region::disc(z, 0.0)
    });
    b[0] / b[1].max(f64::MIN_POSITIVE)
}

/// Newton from many starts at once.
///
/// Each goes on until its step is at rounding level or no longer shrinks; it comes to nothing where it leaves `reach`
/// about its start or does not settle.
#[derive(Default)]
pub struct Newton {
    runs: Vec<Run>,
    reached: Vec<Option<Complex64>>,
    active: Vec<usize>,
    places: Vec<Complex64>,
    values: Vec<(Complex64, Complex64)>,
}

#[derive(Clone, Copy)]
struct Run {
    start: Complex64,
    z: Complex64,
    last: f64,
    steps: usize,
}

/// Most steps.
const MOST_STEPS: usize = 40;

/// Steps after which each must be shorter than the one before by a fifth: towards two zeros that all but coincide they
/// are halved, towards one they do better.
const FREE_STEPS: usize = 6;

impl Newton {
    /// What is reached from each start, in their order.
    pub fn run<F: Analytic + ?Sized>(
        &mut self,
        f: &F,
        starts: &[Complex64],
        reach: f64,
        evaluations: &mut usize,
    ) -> &[Option<Complex64>] {
        let last = f64::INFINITY;
        self.runs.clear();
        let begin = |&start: &Complex64| Run {
            start,
            z: start,
            last,
            steps: 0,
        };
        self.runs.extend(starts.iter().map(begin));
        self.reached.clear();
        self.reached.resize(starts.len(), None);
        self.active.clear();
        self.active.extend(0..starts.len());
        for _ in 0..MOST_STEPS {
            if self.active.is_empty() {
                break;
            }
            *evaluations += self.active.len();
            let (runs, reached) = (&mut self.runs, &mut self.reached);
            self.places.clear();
            self.places.extend(self.active.iter().map(|&i| runs[i].z));
            self.values.clear();
            f.values_and_slopes(&self.places, &mut self.values);
            let mut values = self.values.iter();
            self.active.retain(|&i| {
                let Some(&(value, slope)) = values.next() else {
                    return false;
                };
                match runs[i].step(value, slope, reach) {
                    Step::On => true,
                    Step::Done(z) => {
                        reached[i] = z;
                        false
                    }
                }
            });
        }
        for &i in &self.active {
            let run = &self.runs[i];
            let near = run.last <= 1e-6 * (modulus(run.z) + reach);
            self.reached[i] = near.then_some(run.z);
        }
        &self.reached
    }
}

enum Step {
    On,
    Done(Option<Complex64>),
}

impl Run {
    fn step(&mut self, value: Complex64, slope: Complex64, reach: f64) -> Step {
        let step = quotient(value, slope);
        if !step.is_finite() {
            return Step::Done((value.norm() == 0.0).then_some(self.z));
        }
        let (size, far) = (modulus(step), modulus(self.z));
        let settled = size <= 8.0 * f64::EPSILON * far;
        // Rounding noise: a step already small that grows again.
        let noise = size >= self.last && self.last <= 1e-9 * (far + reach);
        if noise {
            return Step::Done(Some(self.z));
        }
        self.steps += 1;
        if self.steps > FREE_STEPS && size > 0.8 * self.last {
            return Step::Done(None);
        }
        self.z -= step;
        if settled {
            return Step::Done(Some(self.z));
        }
        if (self.z - self.start).norm_sqr() > reach * reach {
            return Step::Done(None);
        }
        self.last = size;
        Step::On
    }
}

/// Newton from one start.
pub fn newton<F: Analytic + ?Sized>(
    f: &F,
    start: Complex64,
    reach: f64,
    evaluations: &mut usize,
) -> Option<Complex64> {
    let mut run = Run {
        start,
        z: start,
        last: f64::INFINITY,
        steps: 0,
    };
    for _ in 0..MOST_STEPS {
        *evaluations += 1;
        let (value, slope) = f.value_and_slope(run.z);
        if let Step::Done(reached) = run.step(value, slope, reach) {
            return reached;
        }
    }
    (run.last <= 1e-6 * (modulus(run.z) + reach)).then_some(run.z)
}

/// Proves one zero near `z`, which Newton has reached, in a disc no larger than `reach`.
pub fn simple<F: Analytic + ?Sized>(f: &F, z: Complex64, reach: f64) -> Option<Zero> {
    let proved = simples(f, &[z], reach);
    proved.into_iter().next().flatten()
}

/// The same for many places at once, in their order.
pub fn simples<F: Analytic + ?Sized>(f: &F, at: &[Complex64], reach: f64) -> Vec<Option<Zero>> {
    let rounding = f.rounding();
    let mut values = Vec::with_capacity(at.len());
    f.values_and_slopes(at, &mut values);
    let begin = |(&z, &(value, slope)): (&Complex64, &(Complex64, Complex64))| Proof {
        z,
        far: modulus(z),
        value: modulus(value),
        slope: modulus(slope),
        reach,
        best: None,
        settled: false,
    };
    let mut proofs: Vec<Proof> = at.iter().zip(&values).map(begin).collect();
    let (mut regions, mut bounds) = (Vec::new(), Vec::new());
    // A smaller disc has a smaller bound; the widest proof wins.
    for _ in 0..12 {
        regions.clear();
        let open = proofs.iter().filter(|p| p.is_open());
        regions.extend(open.map(|p| Region::disc(p.z, p.reach)));
        if regions.is_empty() {
            break;
        }
        bounds.clear();
        f.bounds(&regions, &mut bounds);
        let open = proofs.iter_mut().filter(|p| p.is_open());
        for (proof, bounds) in open.zip(&bounds) {
            proof.narrow(&rounding, bounds);
        }
    }
    proofs.iter().map(|p| p.told(f, &rounding, reach)).collect()
}

/// A proof of one zero in the making.
struct Proof {
    z: Complex64,
    far: f64,
    value: f64,
    slope: f64,
    /// The next disc tried.
    reach: f64,
    /// The least and the greatest radius proved so far.
    best: Option<(f64, f64)>,
    settled: bool,
}

impl Proof {
    fn is_open(&self) -> bool {
        self.best.is_none_or(|(_, outer)| self.reach > outer)
    }

    fn narrow(&mut self, rounding: &Rounding, bounds: &[f64; TAYLOR]) {
        let floor = |order| rounding.floor(bounds, self.far, order);
        let (e, a) = (self.value + floor(0), self.slope - floor(1));
        // Divided by the slope: its square may overflow where it does not.
        let (e, curvature) = (e / a, bounds[2] / a);
        let root = 1.0 - 4.0 * curvature * e;
        if a > 0.0 && root > 0.0 {
            let sum = 1.0 + root.sqrt();
            let inner = 2.0 * e / sum;
            let outer = if 2.0 * curvature * self.reach > sum {
                sum / (2.0 * curvature)
            } else {
                self.reach
            };
            if inner < outer && self.best.is_none_or(|(_, o)| outer > o) {
                self.best = Some((inner, outer));
                self.settled = self.value <= 2.0 * floor(0);
            }
            if outer < self.reach {
                // The bound, not the reach, limits the disc: shrink towards where both meet.
                self.reach = 1.5 * outer;
                return;
            }
        }
        self.reach *= 0.25;
    }

    fn told<F: Analytic + ?Sized>(&self, f: &F, rounding: &Rounding, widest: f64) -> Option<Zero> {
        let (mut best, mut settled) = (self.best, self.settled);
        if best.is_none() {
            best = outweighed(f, self.z, widest, 1);
            let here = f.bound(&Region::disc(self.z, 0.0));
            settled = self.value <= 2.0 * rounding.floor(&here, self.far, 0);
        }
        let (error, radius) = best?;
        Some(Zero {
            at: self.z,
            error,
            radius,
            multiplicity: 1,
            real: false,
            settled,
        })
    }
}

/// Proves two zeros near `z` and tells them apart where rounding allows.
pub fn pair<F: Analytic + ?Sized>(
    f: &F,
    z: Complex64,
    reach: f64,
    evaluations: &mut usize,
) -> Option<Vec<Zero>> {
    let mut z = z;
    // The middle of two close zeros is a zero of the slope.
    for _ in 0..30 {
        *evaluations += 1;
        let [_, c1, c2, _] = f.taylor(z);
        let step = quotient(c1, c2) * 0.5;
        if !step.is_finite() {
            return None;
        }
        if step.norm() > reach {
            return None;
        }
        z -= step;
        if step.norm() <= 8.0 * f64::EPSILON * (z.norm() + reach) {
            break;
        }
    }
    let [c0, c1, c2, _] = f.taylor(z);
    let (error, radius) = outweighed(f, z, reach, 2)?;
    let both = Zero {
        at: z,
        error,
        radius,
        multiplicity: 2,
        real: false,
        settled: true,
    };
    let (c0, c1) = (quotient(c0, c2), quotient(c1, c2));
    let root = (c1 * c1 - c0 * 4.0).sqrt();
    let mut halves = Vec::new();
    for sign in [1.0, -1.0] {
        let guess = z + (-c1 + root * sign) * 0.5;
        if let Some(zero) =
            newton(f, guess, 4.0 * both.error, evaluations).and_then(|z| simple(f, z, both.radius))
        {
            halves.push(zero);
        }
    }
    if let [a, b] = halves[..] {
        let apart = (a.at - b.at).norm();
        // Each disc of radius `error` holds one zero; disjoint discs hold two.
        if apart > a.error + b.error {
            return Some(vec![a, b]);
        }
    }
    Some(vec![both])
}

/// Least and greatest radius found of a disc about `z` that holds as many zeros as the `order` says:
/// `|c_order| r^order` outweighs the other coefficients to the third and `B_4 r^4`. The coefficients
/// themselves may be far below their bounds.
fn outweighed<F: Analytic + ?Sized>(
    f: &F,
    z: Complex64,
    reach: f64,
    order: usize,
) -> Option<(f64, f64)> {
    let (rounding, here) = (f.rounding(), f.bound(&Region::disc(z, 0.0)));
    let sizes = f.taylor(z).map(|c| c.norm());
    let floor = |k| rounding.floor(&here, z.norm(), k);
    let most: [f64; 4] = std::array::from_fn(|k| sizes[k] + floor(k));
    let mut r = reach;
    let (mut least, mut greatest) = (None, None);
    while r > 1e-12 * (reach + z.norm()) {
        let powers = [1.0, r, r * r, r * r * r];
        let terms = most.iter().zip(powers).map(|(c, p)| c * p);
        let others = terms.enumerate().filter(|(k, _)| *k != order);
        let rest =
            others.map(|(_, t)| t).sum::<f64>() + f.bound(&Region::disc(z, r))[4] * r.powi(4);
        if (sizes[order] - floor(order)) * powers[order] > rest {
            greatest = greatest.or(Some(r));
            least = Some(r);
        } else if least.is_some() {
            break;
        }
        r *= 0.8;
    }
    Some((least?, greatest?))
}
