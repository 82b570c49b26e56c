//! Looking for the zeros that were counted.

use num_complex::Complex64;

use super::analytic::{Analytic, quotient};
use super::count::{CountError, Rectangle, Walker};
use super::isolate::{self, Newton, Zero};
use super::ledger::{Entry, Ledger};
use super::starts;
use super::zeros::{Scan, count};

/// The second step of Newton over the first where a zero draws it.
const DRAWN: f64 = 0.5;

/// Starts nearer to each other than this share of the pitch of the grid are likely to lead to one zero.
const NEIGHBOURS: f64 = 0.6;

/// Most rounds of Newton with the zeros found divided out.
const MOST_DIVISIONS: usize = 8;

/// Most guesses of one such round.
const MOST_DIVIDED: usize = 8;

/// Where Newton may start.
#[derive(Clone, Copy)]
struct Guess {
    from: Complex64,
    /// A step of Newton on.
    next: Complex64,
    /// Square of the length of that step.
    step: f64,
}

/// A search for the zeros counted in a padded window.
pub(super) struct Hunt<'a, F: ?Sized> {
    pub f: &'a F,
    pub padded: &'a Rectangle,
    pub count: i64,
    pub symmetric: bool,
    pub pitch: f64,
    pub scan: Scan,
    pub starts: &'a [Complex64],
}

impl<F: Analytic + ?Sized> Hunt<'_, F> {
    /// Looks for them until the weights add up to the count, or nothing is left to try.
    pub fn run(&self, ledger: &mut Ledger<'_, F>, walker: &mut Walker<'_, F>) {
        let near = |start: &Complex64| self.padded.holds(*start, self.pitch) != Some(false);
        let known: Vec<Complex64> = self.starts.iter().copied().filter(near).collect();
        self.approach(ledger, walker, &mut Newton::default(), &known);
        if self.counted(ledger) {
            return;
        }
        let graded = starts::graded(self.f, self.padded);
        self.scan(ledger, walker, graded.into_iter());
        if self.weight(ledger) < self.count {
            let rim = starts::rim(self.padded, self.pitch, self.symmetric);
            self.scan(ledger, walker, rim);
        }
        if self.weight(ledger) < self.count {
            self.scan(ledger, walker, starts::grid(self.padded, self.pitch));
        }
        if self.weight(ledger) >= self.count {
            return;
        }
        walker.effort.fallbacks += 1;
        self.deflated(ledger, walker, 0.5 * self.pitch);
        if self.weight(ledger) >= self.count {
            return;
        }
        let whole = Cell {
            r: *self.padded,
            half: self.symmetric,
        };
        self.subdivide(ledger, walker, whole, self.count, 0);
    }

    fn inside(&self, zero: &Zero) -> bool {
        let mut z = zero.at;
        if self.symmetric {
            z.im = z.im.max(zero.error);
        }
        self.padded.holds(z, zero.error) != Some(false)
    }

    fn weight(&self, ledger: &Ledger<'_, F>) -> i64 {
        ledger
            .zeros()
            .iter()
            .filter(|z| self.inside(z))
            .map(|z| ledger.weight(z))
            .sum()
    }

    /// Whether nothing more is to be looked for.
    fn counted(&self, ledger: &Ledger<'_, F>) -> bool {
        self.scan == Scan::UntilCounted && self.weight(ledger) >= self.count
    }

    /// Newton from those of the starts where its first step is short: first where the second is far shorter, as it is
    /// near a zero and is not where the function is all but an exponential; then where it is short with the zeros found
    /// divided out; then from all.
    fn scan(
        &self,
        ledger: &mut Ledger<'_, F>,
        walker: &mut Walker<'_, F>,
        starts: impl Iterator<Item = Complex64>,
    ) {
        let places: Vec<Complex64> = starts.collect();
        let mut guesses = self.step(&places, walker);
        let near = |g: &Guess| g.step <= self.farthest() && !ledger.covers(g.next);
        guesses.retain(near);
        let places: Vec<Complex64> = guesses.iter().map(|g| g.next).collect();
        let seconds = self.step(&places, walker);
        let mut drawn = Vec::with_capacity(seconds.len());
        let mut others = Vec::with_capacity(seconds.len());
        for (first, second) in guesses.iter().zip(seconds) {
            if second.step <= DRAWN * DRAWN * first.step {
                drawn.push(second);
            } else {
                others.push(second);
            }
        }
        if self.pursue(ledger, walker, drawn) || self.weight(ledger) >= self.count {
            return;
        }
        if self.divided(ledger, walker, &others) || self.weight(ledger) >= self.count {
            return;
        }
        self.pursue(ledger, walker, others);
    }

    /// Square of the longest step of Newton from a start that is followed.
    fn farthest(&self) -> f64 {
        (1.2 * self.pitch).powi(2)
    }

    /// One step of Newton from each place.
    fn step(&self, places: &[Complex64], walker: &mut Walker<'_, F>) -> Vec<Guess> {
        walker.effort.evaluations += places.len();
        let mut values = Vec::with_capacity(places.len());
        self.f.values_and_slopes(places, &mut values);
        let guess = |(&z, &(value, slope)): (&Complex64, &(Complex64, Complex64))| {
            let step = quotient(value, slope);
            Guess {
                from: z,
                next: z - step,
                step: step.norm_sqr(),
            }
        };
        places.iter().zip(&values).map(guess).collect()
    }

    /// Newton from guesses, those of the shortest steps first, one for each neighbourhood, since the discs they lead to
    /// spare most of the others. Whether nothing more is to be looked for.
    fn pursue(
        &self,
        ledger: &mut Ledger<'_, F>,
        walker: &mut Walker<'_, F>,
        mut guesses: Vec<Guess>,
    ) -> bool {
        guesses.sort_by(|a, b| a.step.total_cmp(&b.step));
        let mut newton = Newton::default();
        let mut chosen: Vec<Complex64> = Vec::new();
        let apart = (NEIGHBOURS * self.pitch).powi(2);
        while !guesses.is_empty() {
            chosen.clear();
            guesses.retain(|g| {
                if !g.step.is_finite() || ledger.covers(g.next) {
                    return false;
                }
                let alone = chosen.iter().all(|c| (c - g.next).norm_sqr() > apart);
                if alone {
                    chosen.push(g.next);
                }
                !alone
            });
            if self.approach(ledger, walker, &mut newton, &chosen) && self.counted(ledger) {
                return true;
            }
        }
        false
    }

    /// Newton from guesses whose last step, with the zeros found divided out, is short: `1/(f'/f - sum m/(s - z))`
    /// needs no further value. Whether nothing more is to be looked for.
    fn divided(
        &self,
        ledger: &mut Ledger<'_, F>,
        walker: &mut Walker<'_, F>,
        guesses: &[Guess],
    ) -> bool {
        let mut newton = Newton::default();
        for _ in 0..MOST_DIVISIONS {
            let without = |g: &Guess| {
                let step = self
                    .without_known(ledger, g.from, (g.from - g.next).inv())
                    .inv();
                Guess {
                    next: g.from - step,
                    step: step.norm_sqr(),
                    ..*g
                }
            };
            let mut nearest: Vec<Guess> = guesses.iter().map(without).collect();
            nearest.retain(|g| g.step <= self.farthest() && !ledger.covers(g.next));
            nearest.sort_by(|a, b| a.step.total_cmp(&b.step));
            nearest.truncate(MOST_DIVIDED);
            let chosen: Vec<Complex64> = nearest.iter().map(|g| g.next).collect();
            if !self.approach(ledger, walker, &mut newton, &chosen) {
                return false;
            }
            if self.counted(ledger) {
                return true;
            }
        }
        false
    }

    /// `f'/f` at a place, given it there, with the zeros found divided out.
    fn without_known(&self, ledger: &Ledger<'_, F>, z: Complex64, rate: Complex64) -> Complex64 {
        let mut rate = rate;
        for k in ledger.zeros() {
            let m = f64::from(k.multiplicity);
            rate -= m / (z - k.at);
            if self.symmetric && !k.real {
                rate -= m / (z - k.at.conj());
            }
        }
        rate
    }

    /// Newton from guesses; whether a new zero is found.
    fn approach(
        &self,
        ledger: &mut Ledger<'_, F>,
        walker: &mut Walker<'_, F>,
        newton: &mut Newton,
        guesses: &[Complex64],
    ) -> bool {
        let evaluations = &mut walker.effort.evaluations;
        let reached = newton.run(self.f, guesses, 4.0 * self.pitch, evaluations);
        ledger.offer_all(reached.iter().copied().flatten())
    }

    /// Newton on `f` divided by its known zeros: `step = 1/(f'/f - sum m/(s - z))`.
    fn deflated(&self, ledger: &mut Ledger<'_, F>, walker: &mut Walker<'_, F>, pitch: f64) {
        for start in starts::grid(self.padded, pitch) {
            let mut z = start;
            for _ in 0..25 {
                walker.effort.evaluations += 1;
                let (value, slope) = self.f.value_and_slope(z);
                let rate = self.without_known(ledger, z, quotient(slope, value));
                let step = rate.inv();
                if !step.is_finite() || (z - step - start).norm() > 6.0 * pitch {
                    break;
                }
                z -= step;
                if step.norm() < 1e-6 * pitch {
                    let evaluations = &mut walker.effort.evaluations;
                    let reached = isolate::newton(self.f, z, pitch, evaluations).unwrap_or(z);
                    if ledger.offer(reached) == Entry::New && self.weight(ledger) >= self.count {
                        return;
                    }
                    break;
                }
            }
        }
    }

    fn subdivide(
        &self,
        ledger: &mut Ledger<'_, F>,
        walker: &mut Walker<'_, F>,
        cell: Cell,
        count: i64,
        depth: usize,
    ) {
        let known: i64 = ledger
            .zeros()
            .iter()
            .filter(|z| cell.r.holds(z.at, 0.0) != Some(false))
            .map(|z| {
                if cell.half {
                    ledger.weight(z)
                } else {
                    i64::from(z.multiplicity)
                }
            })
            .sum();
        if count <= known || depth > 60 {
            return;
        }
        let middle = cell.middle();
        let reach = (cell.r.growth.1 - cell.r.growth.0).hypot(cell.r.omega.1 - cell.r.omega.0);
        let evaluations = &mut walker.effort.evaluations;
        let before = self.weight(ledger);
        let reached = isolate::newton(self.f, middle, reach, evaluations);
        ledger.offer(reached.unwrap_or(middle));
        if reached.is_none() && reach < 1e-3 * self.pitch {
            // Slow convergence on a small cell: two zeros nearly coincide; their middle is offered.
            ledger.offer(middle);
        }
        if count <= known + self.weight(ledger) - before {
            return;
        }
        for fraction in [0.5, 0.4683, 0.5391, 0.4219] {
            let (a, b) = cell.split(fraction);
            if let (Ok(na), Ok(nb)) = (a.count(walker), b.count(walker)) {
                let weight_of_b = if cell.half && !b.half { 2 * nb } else { nb };
                if na + weight_of_b == count {
                    self.subdivide(ledger, walker, a, na, depth + 1);
                    self.subdivide(ledger, walker, b, nb, depth + 1);
                    return;
                }
            }
        }
    }
}

/// A rectangle; `half` where it stands on the real axis and is counted with its mirror image.
#[derive(Clone, Copy)]
struct Cell {
    r: Rectangle,
    half: bool,
}

impl Cell {
    fn middle(&self) -> Complex64 {
        Complex64::new(
            0.5 * (self.r.growth.0 + self.r.growth.1),
            0.5 * (self.r.omega.0 + self.r.omega.1),
        )
    }

    fn count<F: Analytic + ?Sized>(&self, walker: &mut Walker<'_, F>) -> Result<i64, CountError> {
        count(walker, &self.r, self.half)
    }

    /// Halves the longer side; the first part keeps the real axis.
    fn split(&self, fraction: f64) -> (Cell, Cell) {
        let (mut a, mut b) = (*self, *self);
        let (g, w) = (self.r.growth, self.r.omega);
        if g.1 - g.0 > w.1 - w.0 {
            let cut = g.0 + fraction * (g.1 - g.0);
            a.r.growth.1 = cut;
            b.r.growth.0 = cut;
        } else {
            let cut = w.0 + fraction * (w.1 - w.0);
            a.r.omega.1 = cut;
            b.r.omega.0 = cut;
            b.half = false;
        }
        (a, b)
    }
}
