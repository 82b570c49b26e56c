//! From the steps of an elimination to a tape.

use super::{Lawful, MOST_SLOTS, Op, Origin, Part, Sparse, Tape};
use crate::numerics::analytic::Rounding;
use crate::numerics::dual::Real;
use crate::waves::exterior::Dense;
use crate::waves::law::Law;

/// Writes a tape, joining what can be joined.
pub struct Writer<T> {
    ops: Vec<Pending<T>>,
    too_wide: bool,
}

enum Pending<T> {
    Scale(Vec<(T, Vec<usize>)>),
    Map {
        constant: Dense<T>,
        lawful: Vec<Entry<T>>,
    },
}

/// A law and what it is multiplied by.
pub struct Entry<T> {
    /// The law.
    pub law: Law<T>,
    /// The matrix.
    pub matrix: Dense<T>,
    /// Where in the chain the law stands; `None` where the elimination made it.
    pub origin: Option<Origin<T>>,
}

impl<T> Entry<T> {
    /// A law that stands in no chain.
    pub fn of(law: Law<T>, matrix: Dense<T>) -> Self {
        Entry {
            law,
            matrix,
            origin: None,
        }
    }
}

impl<T: Real> Default for Writer<T> {
    /// An empty program.
    fn default() -> Self {
        Writer {
            ops: Vec::new(),
            too_wide: false,
        }
    }
}

impl<T: Real> Writer<T> {
    /// `v_i -> exp(-s t_i) v_i` with one delay for each slot.
    pub fn scale(&mut self, delays: &[T]) {
        let mut groups: Vec<(T, Vec<usize>)> = Vec::new();
        for (i, &t) in delays.iter().enumerate() {
            if t.is_exactly_zero() {
                continue;
            }
            match groups.iter_mut().find(|(d, _)| (*d - t).is_exactly_zero()) {
                Some((_, slots)) => slots.push(i),
                None => groups.push((t, vec![i])),
            }
        }
        if let Some(Pending::Scale(last)) = self.ops.last_mut()
            && last.len() == groups.len()
            && last.iter().zip(&groups).all(|(a, b)| a.1 == b.1)
        {
            for (a, b) in last.iter_mut().zip(groups) {
                a.0 += b.0;
            }
            return;
        }
        if !groups.is_empty() {
            self.ops.push(Pending::Scale(groups));
        }
    }

    /// `v -> (C + sum F_k B_k) v`.
    pub fn map(&mut self, constant: Dense<T>, lawful: Vec<Entry<T>>) {
        self.too_wide |= constant.len() > MOST_SLOTS;
        if let Some(Pending::Map {
            constant: c,
            lawful: l,
        }) = self.ops.last_mut()
        {
            if l.is_empty() {
                let before = std::mem::take(c);
                *l = lawful
                    .into_iter()
                    .map(|entry| Entry {
                        matrix: matrix_product(&entry.matrix, &before),
                        ..entry
                    })
                    .collect();
                *c = matrix_product(&constant, &before);
                return;
            }
            if lawful.is_empty() {
                *c = matrix_product(&constant, c);
                for entry in l.iter_mut() {
                    entry.matrix = matrix_product(&constant, &entry.matrix);
                }
                return;
            }
        }
        self.ops.push(Pending::Map { constant, lawful });
    }

    /// The program, and what its value is to be multiplied by; `None` where the vector would be longer than
    /// [`MOST_SLOTS`].
    pub fn finish(mut self) -> Option<(Tape<T>, T)> {
        if self.too_wide {
            return None;
        }
        let factor = balance(&mut self.ops);
        let start = self.start();
        let mut tape = Tape {
            ops: Vec::with_capacity(self.ops.len()),
            width: start.len(),
            start,
            rounding: Rounding {
                values: 0.0,
                arguments: 2.0,
            },
            symmetric: true,
        };
        for op in self.ops {
            match op {
                Pending::Scale(groups) => {
                    for (delay, slots) in groups {
                        // exp to 1 ulp, sine and cosine to 1.5 (1 ulp is two roundings), their product, and one
                        // complex product.
                        tape.rounding.values += 9.0;
                        tape.ops.push(Op::Scale {
                            delay,
                            slots: slots.iter().map(|&i| i as u8).collect(),
                        });
                    }
                }
                Pending::Map { constant, lawful } => {
                    tape.width = tape.width.max(constant.len());
                    let terms = |m: &Dense<T>| {
                        m.iter()
                            .map(|r| r.iter().filter(|x| !x.is_exactly_zero()).count())
                            .max()
                            .unwrap_or(0) as f64
                    };
                    // Laws of one map lie on parallel paths: the longest counts, sums add one each. A column
                    // times a row is right to two roundings, and is multiplied once more.
                    let of_laws = lawful
                        .iter()
                        .map(|e| e.law.operations() + terms(&e.matrix) + 3.0)
                        .fold(0.0, f64::max);
                    tape.rounding.values +=
                        (2.0 + terms(&constant)).max(of_laws) + 1.0 + lawful.len() as f64;
                    tape.symmetric &= lawful.iter().all(|e| e.law.is_symmetric());
                    tape.ops.push(Op::Map {
                        constant: Sparse::of(&constant),
                        lawful: lawful
                            .into_iter()
                            .map(|e| Lawful {
                                part: Part::of(&e.matrix),
                                law: e.law,
                                origin: e.origin,
                            })
                            .collect(),
                    });
                }
            }
        }
        // First-order error analysis: a margin for the terms of second order.
        tape.rounding.values *= 1.1;
        Some((tape, factor))
    }
}

impl<T: Real> Writer<T> {
    /// The vector the program starts from, ones and zeros: that of its first map, which then is left out, where it is
    /// constant. Balanced, a row of one coefficient is one.
    fn start(&mut self) -> Vec<bool> {
        let ones = match self.ops.first() {
            Some(Pending::Map { constant, lawful }) if lawful.is_empty() => {
                let one = |x: &T| (*x - 1.0).is_exactly_zero();
                let column = |row: &Vec<T>| match row.as_slice() {
                    [x] if one(x) => Some(true),
                    [x] if x.is_exactly_zero() => Some(false),
                    _ => None,
                };
                constant.iter().map(column).collect::<Option<Vec<bool>>>()
            }
            _ => None,
        };
        match ones {
            Some(ones) => {
                self.ops.remove(0);
                ones
            }
            None => vec![true],
        }
    }
}

/// A constant coefficient below this share of what laws put into its row does not set the row's scale.
const FAINT: f64 = 1e-8;

/// Gives each slot the scale in which the largest constant coefficient of its row is one: a product less for each row,
/// and a vector that stays of order one. What the value is then to be multiplied by.
fn balance<T: Real>(ops: &mut [Pending<T>]) -> T {
    let one = T::from(1.0);
    let mut scales = vec![one];
    for op in ops {
        let Pending::Map { constant, lawful } = op else {
            continue;
        };
        let matrices = lawful.iter_mut().map(|e| &mut e.matrix);
        for row in std::iter::once(&mut *constant).chain(matrices).flatten() {
            for (x, &scale) in row.iter_mut().zip(&scales) {
                *x = *x * scale;
            }
        }
        let size = |x: &T| x.value().abs();
        let largest = |row: &Vec<T>| {
            let by_size = |a: &(usize, &T), b: &(usize, &T)| size(a.1).total_cmp(&size(b.1));
            row.iter().enumerate().max_by(by_size).map(|(j, &x)| (j, x))
        };
        scales.clear();
        for (i, row) in constant.iter_mut().enumerate() {
            let by_laws = lawful.iter().filter_map(|e| e.matrix.get(i));
            let most = by_laws.flatten().map(size).fold(0.0, f64::max);
            let lead = largest(row).filter(|(_, x)| size(x) > FAINT * most && size(x) > 0.0);
            let Some((lead, scale)) = lead else {
                scales.push(one);
                continue;
            };
            let by_laws = lawful.iter_mut().filter_map(|e| e.matrix.get_mut(i));
            for x in row.iter_mut().chain(by_laws.flatten()) {
                *x = *x / scale;
            }
            if let Some(x) = row.get_mut(lead) {
                *x = one;
            }
            scales.push(scale);
        }
    }
    scales.first().copied().unwrap_or(one)
}

fn matrix_product<T: Real>(a: &Dense<T>, b: &Dense<T>) -> Dense<T> {
    let columns = b.first().map_or(0, Vec::len);
    a.iter()
        .map(|row| {
            (0..columns)
                .map(|j| {
                    let mut sum = T::from(0.0);
                    for (&x, line) in row.iter().zip(b) {
                        if !x.is_exactly_zero() && !line[j].is_exactly_zero() {
                            sum += x * line[j];
                        }
                    }
                    sum
                })
                .collect()
        })
        .collect()
}
