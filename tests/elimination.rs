//! The elimination against the global matrix it eliminates, on random chains of primitives: local and
//! remote signals up- and downstream, own outlets, entropy carried and dropped, complex ends.

use num_complex::Complex64;
use proptest::prelude::*;
use stillflame::acoustics::matrix;
use stillflame::numerics::analytic::{Analytic, Region};
use stillflame::numerics::dual::Dual;
use stillflame::waves::front::{self, EliminationError};
use stillflame::waves::law::{Delayed, Law};
use stillflame::waves::primitive::{Chain, End, Joint, Start, Step, Term, Travel};

fn number() -> impl Strategy<Value = f64> {
    prop_oneof![4 => -1.0..1.0f64, 1 => Just(0.0)]
}

fn row() -> impl Strategy<Value = [f64; 3]> {
    [number(), number(), number()]
}

fn law() -> impl Strategy<Value = Law<f64>> {
    let delayed = (
        -2.0..2.0f64,
        0.0..0.004f64,
        prop_oneof![Just(0.0), 0.0..0.001f64],
    )
        .prop_map(|(weight, delay, spread)| Delayed {
            weight,
            delay,
            spread,
        });
    prop_oneof![
        prop::collection::vec(delayed, 1..3).prop_map(Law::Delays),
        (-1.0..1.0f64, -1e-3..1e-3f64).prop_map(|(a, b)| Law::Polynomial {
            coefficients: [a, b, 0.0],
            delay: 0.0
        }),
    ]
}

fn travel() -> impl Strategy<Value = Travel<f64>> {
    (
        1e-4..2e-3f64,
        1e-4..2e-3f64,
        prop::option::of(1e-3..5e-3f64),
    )
        .prop_map(|(downstream, upstream, entropy)| Travel {
            downstream,
            upstream,
            entropy: entropy.map(Law::pure_delay),
        })
}

fn joint() -> impl Strategy<Value = Joint<f64>> {
    // Outlets that are determined: a dominant diagonal.
    let down = [row(), row(), row()].prop_map(|mut m| {
        for (i, r) in m.iter_mut().enumerate() {
            r[i] += 3.0;
        }
        m
    });
    let terms = prop::collection::vec((law(), row(), 0usize..8), 0..3);
    ([row(), row(), row()], down, row(), terms).prop_map(|(up, down, row, terms)| Joint {
        up,
        down,
        row,
        terms: terms
            .into_iter()
            .map(|(law, sense, at)| Term { law, sense, at })
            .collect(),
    })
}

fn chain() -> impl Strategy<Value = Chain<f64>> {
    let step = prop_oneof![
        travel().prop_map(Step::Travel),
        joint().prop_map(Step::Joint)
    ];
    let end_law = || {
        let law = (-1.0..1.0f64, -1.0..1.0f64, row())
            .prop_map(|(re, im, sense)| (Law::Complex { re, im, delay: 0.0 }, sense));
        prop::option::of(law)
    };
    (
        [row(), row()],
        end_law(),
        prop::collection::vec(step, 1..9),
        row(),
        end_law(),
    )
        .prop_map(|(rows, start_term, mut steps, row, end_term)| {
            let planes = steps.len() + 1;
            for (j, step) in steps.iter_mut().enumerate() {
                if let Step::Joint(joint) = step {
                    let mut own_outlet = false;
                    joint.terms.retain_mut(|t| {
                        t.at %= planes;
                        // One signal from the own outlet at most: what elements use.
                        let own = t.at == j + 1;
                        let keep = !(own && own_outlet);
                        own_outlet |= own;
                        keep
                    });
                }
            }
            Chain {
                start: Start {
                    rows,
                    term: start_term,
                },
                steps,
                end: End {
                    row,
                    term: end_term,
                },
            }
        })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(600))]

    #[test]
    fn the_characteristic_function_is_the_determinant_up_to_its_factor(
        chain in chain(),
        points in prop::collection::vec((-300.0..300.0f64, 0.0..4000.0f64), 3),
    ) {
        let c = match front::eliminate(&chain) {
            Ok(c) => c,
            Err(EliminationError::TooMany) => return Ok(()),
            Err(e) => return Err(TestCaseError::fail(e.to_string())),
        };
        let mut sign = None;
        for (re, im) in points {
            let s = Complex64::new(re, im);
            let (d, _) = c.tape.value_and_slope(s);
            let a = matrix::assemble(&chain, s);
            // Hadamard's bound of the determinant.
            let most: f64 = a.row_iter().map(|row| row.norm()).product();
            let det = a.determinant();
            let ours = d * c.factor(s);
            // Relative to the natural size of D: near a zero only that much is determined.
            let size = c.tape.bound(&Region::disc(s, 0.0))[0] * c.factor(s).norm();
            if size == 0.0 {
                prop_assert!(det.norm() <= 1e-12 * most);
                continue;
            }
            let near = |k: f64| (det - ours * k).norm() < 1e-10 * size;
            prop_assert!(near(1.0) || near(-1.0), "det {det}, ours {ours}, size {size:e}");
            if ours.norm() > 1e-6 * size {
                let here = if near(1.0) { 1.0 } else { -1.0 };
                prop_assert_eq!(*sign.get_or_insert(here), here, "the sign changes with s");
            }
        }
    }

    /// A joint that joins like to like, however mixed its rows, is no joint. Entropy that grows by ten
    /// orders along a duct would show any rounding in what must cancel.
    #[test]
    fn a_joint_of_like_to_like_changes_nothing(
        first in joint(), mixed in joint(), re in -600.0..-500.0f64, im in 0.0..4000.0f64, end in row(),
    ) {
        prop_assume!(end[0].abs() + end[1].abs() > 0.1);
        let travel = |entropy: f64| Step::Travel(Travel {
            downstream: 1e-3,
            upstream: 1.2e-3,
            entropy: Some(Law::pure_delay(entropy)),
        });
        let like = Joint {
            up: mixed.down,
            down: mixed.down.map(|r| r.map(|x| -x)),
            row: [0.0; 3],
            terms: Vec::new(),
        };
        let first = Joint { terms: Vec::new(), ..first };
        let chain = |steps: Vec<Step<f64>>| Chain {
            start: Start { rows: [[1.0, -0.7, 0.0], [0.0, 0.0, 1.0]], term: None },
            steps,
            end: End { row: [end[0], end[1], 0.0], term: None },
        };
        let first = Step::Joint(first);
        let without = chain(vec![first.clone(), travel(0.04), travel(0.01)]);
        let with = chain(vec![first, travel(0.04), Step::Joint(like), travel(0.01)]);
        let [without, with] = [without, with].map(|c| front::eliminate(&c).unwrap().tape);
        let s = Complex64::new(re, im);
        let bound = without.bound(&Region::disc(s, 0.0))[0];
        // A first joint that lets nothing pass leaves nothing to compare with.
        prop_assume!(bound > 0.0);
        let difference = with.value_and_slope(s).0 - without.value_and_slope(s).0;
        prop_assert!(difference.norm() <= 1e-14 * bound, "{difference} of {bound}");
    }

    #[test]
    fn bounds_and_derivatives_hold_for_whole_chains(
        chain in chain(), re in -300.0..300.0f64, im in 0.0..4000.0f64, width in 0.0..100.0f64,
    ) {
        let Ok(c) = front::eliminate(&chain) else { return Ok(()) };
        let s = Complex64::new(re, im);
        let region = Region { growth: (re - width, re + width), modulus: s.norm() + width, omega: (s.im.abs() - width).max(0.0) };
        let bounds = c.tape.bound(&region);
        let values = c.tape.taylor_at::<5>(s);
        for (v, b) in values.iter().zip(bounds) {
            prop_assert!(v.value().norm() <= b * (1.0 + 1e-10) + 1e-300);
        }
        let h = 1e-4;
        let (up, _) = c.tape.value_and_slope(s + h);
        let (down, _) = c.tape.value_and_slope(s - h);
        let difference = (up - down) / (2.0 * h);
        let roundoff = 1e-10 * bounds[0] / h + bounds[3] * h * h * 10.0;
        prop_assert!((values[1].value() - difference).norm() <= roundoff + 1e-7 * bounds[1]);
    }
}

#[test]
fn a_tape_over_duals_carries_the_derivative_with_respect_to_a_delay() {
    let make = |tau: f64| -> Chain<f64> { two_ducts(tau) };
    let lifted = two_ducts(Dual::variable(0.004, 0));
    let c = front::eliminate(&lifted).unwrap();
    let s = Complex64::new(-40.0, 1300.0);
    let [d] = c.tape.taylor_at::<1>(s);
    let value = |tau: f64| {
        front::eliminate(&make(tau))
            .unwrap()
            .tape
            .value_and_slope(s)
            .0
    };
    let h = 1e-8;
    let difference = (value(0.004 + h) - value(0.004 - h)) / (2.0 * h);
    assert!((d.value() - value(0.004)).norm() < 1e-13);
    let derivative = Complex64::new(d.re.d[0], d.im.d[0]);
    assert!((derivative - difference).norm() < 1e-5 * difference.norm());
}

/// Closed duct, velocity-driven flame, open duct, over any number.
fn two_ducts<T: stillflame::numerics::dual::Real>(tau: T) -> Chain<T> {
    let k = T::from;
    let duct = || {
        Step::Travel(Travel {
            downstream: k(1e-3),
            upstream: k(1e-3),
            entropy: None,
        })
    };
    let law = Law::Delays(vec![Delayed {
        weight: k(0.8),
        delay: tau,
        spread: k(0.0),
    }]);
    Chain {
        start: Start {
            rows: [[k(1.0), k(-1.0), k(0.0)], [k(0.0), k(0.0), k(1.0)]],
            term: None,
        },
        steps: vec![
            duct(),
            Step::Joint(Joint {
                up: [
                    [k(1.0), k(-1.0), k(0.0)],
                    [k(1.0), k(1.0), k(0.0)],
                    [k(0.0); 3],
                ],
                down: [
                    [k(-1.0), k(1.0), k(0.0)],
                    [k(-1.0), k(-1.0), k(0.0)],
                    [k(0.0), k(0.0), k(1.0)],
                ],
                row: [k(1.0), k(0.0), k(0.0)],
                terms: vec![Term {
                    law,
                    sense: [k(1.0), k(-1.0), k(0.0)],
                    at: 1,
                }],
            }),
            duct(),
        ],
        end: End {
            row: [k(1.0), k(1.0), k(0.0)],
            term: None,
        },
    }
}
