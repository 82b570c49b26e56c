//! From the steps of an elimination to a tape.

use super::{MOST_SLOTS, Op, Part, Sparse, Tape};
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
        lawful: Vec<(Law<T>, Dense<T>)>,
    },
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
    pub fn map(&mut self, constant: Dense<T>, lawful: Vec<(Law<T>, Dense<T>)>) {
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
                    .map(|(f, b)| (f, matrix_product(&b, &before)))
                    .collect();
                *c = matrix_product(&constant, &before);
                return;
            }
            if lawful.is_empty() {
                *c = matrix_product(&constant, c);
                for (_, b) in l.iter_mut() {
                    *b = matrix_product(&constant, b);
                }
                return;
            }
        }
        self.ops.push(Pending::Map { constant, lawful });
    }

    /// The program; `None` where the vector would be longer than [`MOST_SLOTS`].
    pub fn finish(self) -> Option<Tape<T>> {
        if self.too_wide {
            return None;
        }
        let mut tape = Tape {
            ops: Vec::with_capacity(self.ops.len()),
            width: 1,
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
                        .map(|(f, b)| f.operations() + terms(b) + 3.0)
                        .fold(0.0, f64::max);
                    tape.rounding.values +=
                        (2.0 + terms(&constant)).max(of_laws) + 1.0 + lawful.len() as f64;
                    tape.symmetric &= lawful.iter().all(|(f, _)| f.is_symmetric());
                    tape.ops.push(Op::Map {
                        constant: Sparse::of(&constant),
                        lawful: lawful.into_iter().map(|(f, b)| (f, Part::of(&b))).collect(),
                    });
                }
            }
        }
        // First-order error analysis: a margin for the terms of second order.
        tape.rounding.values *= 1.1;
        Some(tape)
    }
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
