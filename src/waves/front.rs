//! Elimination of a chain along the flow into its characteristic function.
//!
//! The front is the subspace of all solutions of the conditions met so far, in the coordinates
//! `(p+, p-, e)` at the plane reached, followed by the signals in transit: those *remembered* from a
//! plane passed, and those *awaited* from a plane to come, each a free coordinate until it is closed
//! there. The subspace has one dimension and one more for each awaited signal; its minors
//! ([`exterior`]) are what the tape carries. The end's condition leaves one number,
//! `D(s)`.
//!
//! Each distance is scaled by `exp(-s t-)`, so that only decaying exponentials occur for growing `s`:
//! `p+ -> exp(-s (t+ + t-)) p+`, `p- -> p-`. A signal in transit would take the same factor; it is
//! folded into the delay of the law that uses it. Hence, with `t_k` the sum of `t-` between the planes
//! where the `k`-th awaited signal is opened and closed,
//!
//! ```text
//! det A(s) = +- prod_joints det(down) prod_k exp(s t_k) D(s)
//! ```
//!
//! where `A` is the global matrix, its distances written as `p-_2 exp(-s t-) = p-_1`.

use num_complex::Complex64;

use super::exterior::{self, Dense};
use super::law::Law;
use super::primitive::{Block, Chain, Joint, Place, Plane, Row, Step, Travel};
use super::tape::{Entry, Origin, Tape, Writer};
use crate::numerics::dual::Real;
use crate::numerics::fine::Fine;

/// The characteristic function of a chain with the factor that relates it to its global matrix.
#[derive(Clone, Debug, PartialEq)]
pub struct Characteristic<T> {
    /// `D(s)`.
    pub tape: Tape<T>,
    /// `prod det(down)` over the joints, over the scale of the tape's value.
    pub joints: T,
    /// `sum_k t_k` (s).
    pub closed_late: T,
}

impl Characteristic<f64> {
    /// `det A(s)/D(s)` up to its sign: nowhere zero.
    pub fn factor(&self, s: Complex64) -> Complex64 {
        self.joints * (s * self.closed_late).exp()
    }
}

/// Why a chain has no characteristic function.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
pub enum EliminationError {
    /// The three conditions of a joint do not determine what leaves it.
    #[error("the balance of step {0} does not determine the state behind it")]
    Singular(usize),
    /// Terms of one joint that sense its own outlet differ in what they sense.
    #[error("step {0} senses its own outlet in two ways")]
    OwnOutlet(usize),
    /// More signals are in transit at once than the elimination holds.
    #[error("too many signals from remote stations are in transit at once")]
    TooMany,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Coordinate {
    Plus,
    Minus,
    Entropy,
    /// Term `term` of step `step`, sensed at a plane passed or to come.
    Signal {
        step: usize,
        term: usize,
    },
}

struct Front<'a, T> {
    chain: &'a Chain<T>,
    coordinates: Vec<Coordinate>,
    /// Delay folded away since a coordinate appeared; zero for the waves.
    held: Vec<T>,
    grade: usize,
    writer: Writer<T>,
    joints: T,
    closed_late: T,
}

/// Eliminates a chain.
///
/// The constants of the program are differences of products that may all but cancel, and a wave that
/// grows by ten orders of magnitude along a duct enlarges what rounding leaves of them. So they are
/// worked out in twice the precision and rounded once.
///
/// # Errors
/// See [`EliminationError`].
pub fn eliminate<T: Real>(chain: &Chain<T>) -> Result<Characteristic<T>, EliminationError> {
    let fine = walk(&chain.map(Fine::exact))?;
    Ok(Characteristic {
        tape: fine.tape.map(Fine::rounded),
        joints: fine.joints.rounded(),
        closed_late: fine.closed_late.rounded(),
    })
}

fn walk<T: Real>(chain: &Chain<T>) -> Result<Characteristic<T>, EliminationError> {
    let zero = T::from(0.0);
    let mut front = Front {
        chain,
        coordinates: Vec::new(),
        held: Vec::new(),
        grade: 1,
        writer: Writer::default(),
        joints: T::from(1.0),
        closed_late: zero,
    };
    front.start();
    for (j, step) in chain.steps.iter().enumerate() {
        front.arrive(j);
        match step {
            Step::Travel(t) => front.travel(t, j + 1),
            Step::Joint(joint) => front.joint(joint, j)?,
        }
    }
    front.arrive(chain.steps.len());
    front.end();
    let (tape, scale) = front.writer.finish().ok_or(EliminationError::TooMany)?;
    Ok(Characteristic {
        tape,
        joints: front.joints * scale,
        closed_late: front.closed_late,
    })
}

fn cross<T: Real>(a: &Row<T>, b: &Row<T>) -> Row<T> {
    [
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]
}

impl<T: Real> Front<'_, T> {
    /// The line on which both conditions of the start hold: the cross product of its rows.
    fn start(&mut self) {
        let start = &self.chain.start;
        let keep = self.waves_at(0);
        let column = |row: &Row<T>| -> Dense<T> {
            let v = cross(row, &start.rows[1]);
            v.iter().take(keep).map(|&x| vec![x]).collect()
        };
        let entry = |(law, sense): &(Law<T>, Row<T>)| Entry {
            law: law.clone(),
            matrix: column(sense),
            origin: origin(Place::Start, T::from(0.0)),
        };
        let lawful = start.term.iter().map(entry).collect();
        let constant = column(&start.rows[0]);
        self.set_waves(keep, Vec::new());
        self.writer.map(constant, lawful);
    }

    /// Number of wave coordinates worth carrying at a plane: three where entropy is used, else two.
    fn waves_at(&self, plane: Plane) -> usize {
        let used = |row: &Row<T>| !row[2].is_exactly_zero();
        let by_step = match self.chain.steps.get(plane) {
            Some(Step::Travel(t)) => t.entropy.is_some(),
            Some(Step::Joint(j)) => j.up.iter().any(used),
            None => {
                let end = &self.chain.end;
                used(&end.row) || end.term.iter().any(|(_, sense)| used(sense))
            }
        };
        let by_term = self
            .terms()
            .any(|(_, _, t)| t.at == plane && used(&t.sense));
        if by_step || by_term { 3 } else { 2 }
    }

    fn terms(&self) -> impl Iterator<Item = (usize, usize, &super::primitive::Term<T>)> {
        self.chain.steps.iter().enumerate().flat_map(|(j, step)| {
            let terms = match step {
                Step::Joint(joint) => joint.terms.as_slice(),
                Step::Travel(_) => &[],
            };
            terms.iter().enumerate().map(move |(k, t)| (j, k, t))
        })
    }

    fn set_waves(&mut self, waves: usize, signals: Vec<(Coordinate, T)>) {
        let zero = T::from(0.0);
        let all = [Coordinate::Plus, Coordinate::Minus, Coordinate::Entropy];
        self.coordinates = all.into_iter().take(waves).collect();
        self.held = vec![zero; waves];
        for (c, held) in signals {
            self.coordinates.push(c);
            self.held.push(held);
        }
    }

    fn waves(&self) -> usize {
        self.coordinates
            .iter()
            .filter(|c| !matches!(c, Coordinate::Signal { .. }))
            .count()
    }

    fn signals(&self) -> Vec<(Coordinate, T)> {
        let pairs = self
            .coordinates
            .iter()
            .copied()
            .zip(self.held.iter().copied());
        pairs
            .filter(|(c, _)| matches!(c, Coordinate::Signal { .. }))
            .collect()
    }

    fn index(&self, c: Coordinate) -> Option<usize> {
        self.coordinates.iter().position(|&x| x == c)
    }

    /// A row on the waves as a row on all coordinates.
    fn on_waves(&self, sense: &Row<T>) -> Vec<T> {
        let waves = self.waves();
        let mut row = vec![T::from(0.0); self.coordinates.len()];
        row[..waves].copy_from_slice(&sense[..waves]);
        row
    }

    fn unit(&self, i: usize) -> Vec<T> {
        let mut row = vec![T::from(0.0); self.coordinates.len()];
        row[i] = T::from(1.0);
        row
    }

    /// At a plane: remembers what later joints sense here, closes what earlier ones await.
    fn arrive(&mut self, plane: Plane) {
        let here: Vec<(usize, usize, Row<T>)> = self
            .terms()
            .filter(|(j, _, t)| t.at == plane && (*j > plane || *j + 1 < plane))
            .map(|(j, k, t)| (j, k, t.sense))
            .collect();
        for (step, term, sense) in here {
            let signal = Coordinate::Signal { step, term };
            if step > plane {
                let mut rows: Dense<T> =
                    (0..self.coordinates.len()).map(|i| self.unit(i)).collect();
                rows.push(self.on_waves(&sense));
                let minors = exterior::compound(&rows, self.coordinates.len(), self.grade);
                self.writer.map(minors, Vec::new());
                self.coordinates.push(signal);
                self.held.push(T::from(0.0));
            } else if let Some(q) = self.index(signal) {
                let condition: Vec<T> = self.on_waves(&sense).into_iter().map(|x| -x).collect();
                let constant = exterior::close(&condition, self.grade, q);
                let lawful = exterior::close(&self.unit(q), self.grade, q);
                let entry = Entry::of(Law::pure_delay(self.held[q]), lawful);
                self.writer.map(constant, vec![entry]);
                self.closed_late += self.held[q];
                self.coordinates.remove(q);
                self.held.remove(q);
                self.grade -= 1;
            }
        }
    }

    fn travel(&mut self, t: &Travel<T>, next: Plane) {
        let d = self.coordinates.len();
        if self.waves() == 3 {
            let entropy = t.entropy.as_ref().filter(|_| self.waves_at(next) == 3);
            let keep = if entropy.is_some() { 3 } else { 2 };
            let mut rows: Dense<T> = (0..d).map(|i| self.unit(i)).collect();
            let mut lawful = Vec::new();
            if let Some(law) = entropy {
                let one = self.unit(2);
                rows[2] = vec![T::from(0.0); d];
                lawful.push(Entry {
                    law: law.delayed(t.upstream),
                    matrix: exterior::rank_one_compound(&rows, &one, &one, self.grade),
                    origin: origin(Place::Entropy(next - 1), t.upstream),
                });
            } else {
                rows.remove(2);
            }
            let constant = exterior::compound(&rows, d, self.grade);
            let signals = self.signals();
            self.set_waves(keep, signals);
            self.writer.map(constant, lawful);
        }
        let subsets = exterior::subsets(self.coordinates.len(), self.grade);
        let around = t.downstream + t.upstream;
        let delays: Vec<T> = subsets
            .iter()
            .map(|set| {
                if set.contains(&0) {
                    around
                } else {
                    T::from(0.0)
                }
            })
            .collect();
        self.writer.scale(&delays);
        for (c, held) in self.coordinates.iter().zip(&mut self.held) {
            if matches!(c, Coordinate::Signal { .. }) {
                *held += t.upstream;
            }
        }
    }

    fn joint(&mut self, joint: &Joint<T>, j: usize) -> Result<(), EliminationError> {
        let inverse = invert(&joint.down).ok_or(EliminationError::Singular(j))?;
        self.joints = self.joints * determinant(&joint.down);
        for (k, t) in joint.terms.iter().enumerate() {
            if t.at > j + 1 {
                let opened = exterior::open(self.coordinates.len(), self.grade);
                self.writer.map(opened, Vec::new());
                self.coordinates
                    .push(Coordinate::Signal { step: j, term: k });
                self.held.push(T::from(0.0));
                self.grade += 1;
            }
        }
        let d = self.coordinates.len();
        let waves_in = self.waves();
        let keep = self.waves_at(j + 1);
        // x_2 = T x_1 + o sum F_k w_k, with T = -down^-1 up and o = -down^-1 row.
        let o: Row<T> = std::array::from_fn(|i| -dot(&inverse[i], &joint.row));
        let transfer: Block<T> = std::array::from_fn(|i| {
            std::array::from_fn(|c| {
                -(inverse[i][0] * joint.up[0][c]
                    + inverse[i][1] * joint.up[1][c]
                    + inverse[i][2] * joint.up[2][c])
            })
        });
        let used = |c: &Coordinate| matches!(c, Coordinate::Signal { step, term } if *step == j && joint.terms[*term].at < j);
        let kept: Vec<(Coordinate, T)> = self
            .signals()
            .into_iter()
            .filter(|(c, _)| !used(c))
            .collect();
        let mut rows: Dense<T> = transfer
            .iter()
            .take(keep)
            .map(|r| {
                let mut row = vec![T::from(0.0); d];
                row[..waves_in].copy_from_slice(&r[..waves_in]);
                row
            })
            .collect();
        let mut out: Vec<T> = o[..keep].to_vec();
        for (c, _) in &kept {
            if let Some(i) = self.index(*c) {
                rows.push(self.unit(i));
                out.push(T::from(0.0));
            }
        }
        let constant = exterior::compound(&rows, d, self.grade);
        let mut lawful = Vec::new();
        let mut own_outlet: Option<Row<T>> = None;
        for (k, t) in joint.terms.iter().enumerate() {
            let signal = Coordinate::Signal { step: j, term: k };
            let place = Place::Term { step: j, term: k };
            if t.at == j + 1 {
                // (1 - kappa F) x_2 = (1 - kappa F) T x_1 + o F h.T x_1 + ..., kappa = h.o: the
                // denominator is cleared once, whatever the grade.
                if own_outlet.is_some_and(|h| !same(&h, &t.sense)) {
                    return Err(EliminationError::OwnOutlet(j));
                }
                own_outlet = Some(t.sense);
                let through: Row<T> = std::array::from_fn(|c| {
                    t.sense[0] * transfer[0][c]
                        + t.sense[1] * transfer[1][c]
                        + t.sense[2] * transfer[2][c]
                });
                let sense = self.on_waves(&through);
                let kappa = dot(&t.sense, &o);
                let mut part = exterior::rank_one_compound(&rows, &out, &sense, self.grade);
                for (line, base) in part.iter_mut().zip(&constant) {
                    for (x, &c) in line.iter_mut().zip(base) {
                        *x -= kappa * c;
                    }
                }
                lawful.push(Entry {
                    law: t.law.clone(),
                    matrix: part,
                    origin: origin(place, T::from(0.0)),
                });
            } else {
                let (later, sense) = match self.index(signal) {
                    Some(i) => (self.held[i], self.unit(i)),
                    None => (T::from(0.0), self.on_waves(&t.sense)),
                };
                lawful.push(Entry {
                    law: t.law.delayed(later),
                    matrix: exterior::rank_one_compound(&rows, &out, &sense, self.grade),
                    origin: origin(place, later),
                });
            }
        }
        self.set_waves(keep, kept);
        self.writer.map(constant, lawful);
        Ok(())
    }

    fn end(&mut self) {
        let end = &self.chain.end;
        let constant = vec![self.on_waves(&end.row)];
        let entry = |(law, sense): &(Law<T>, Row<T>)| Entry {
            law: law.clone(),
            matrix: vec![self.on_waves(sense)],
            origin: origin(Place::End, T::from(0.0)),
        };
        let lawful = end.term.iter().map(entry).collect();
        self.writer.map(constant, lawful);
    }
}

fn origin<T>(place: Place, later: T) -> Option<Origin<T>> {
    Some(Origin { place, later })
}

fn dot<T: Real>(a: &Row<T>, b: &Row<T>) -> T {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

fn same<T: Real>(a: &Row<T>, b: &Row<T>) -> bool {
    a.iter().zip(b).all(|(&x, &y)| (x - y).is_exactly_zero())
}

/// Determinant of a block.
pub fn determinant<T: Real>(m: &Block<T>) -> T {
    dot(&m[0], &cross(&m[1], &m[2]))
}

/// Inverse by cofactors; `None` where singular to rounding.
fn invert<T: Real>(m: &Block<T>) -> Option<Block<T>> {
    let det = determinant(m);
    let size: f64 = m
        .iter()
        .map(|r| r.iter().map(|x| x.value().abs()).sum::<f64>())
        .product();
    if det.value().abs() <= 1e-14 * size || !det.is_finite() {
        return None;
    }
    let columns = [
        cross(&m[1], &m[2]),
        cross(&m[2], &m[0]),
        cross(&m[0], &m[1]),
    ];
    Some(std::array::from_fn(|i| {
        std::array::from_fn(|j| columns[j][i] / det)
    }))
}
