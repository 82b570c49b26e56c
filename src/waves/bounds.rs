//! Bounds that are wrong must show: for every law, every primitive and every order there is a program
//! that attains its bound, so that half of any one bound is exceeded by a value.
//!
//! A program attains its bounds at a real `s` where all products in it have coefficients of one sign, or
//! of signs that alternate with the order, as those of a delay do. The same check that no bound passes
//! when halved is passed by the sound ones.

use num_complex::Complex64;
use proptest::prelude::*;

use super::complex::Cx;
use super::front;
use super::law::{Delayed, Law, delay_majorant, real_product};
use super::primitive::{Chain, End, Joint, Start, Step, Term, Travel};
use super::tape::{Arithmetic, Entry, Tape, Writer};
use crate::numerics::analytic::{Analytic, Region, TAYLOR};

/// Something that has a bound of its own.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Bounded {
    /// The factor `exp(-s t)` of a distance.
    Distance,
    Sharp,
    Spread,
    Polynomial,
    Complex,
}

const LAWS: [Bounded; 4] = [
    Bounded::Sharp,
    Bounded::Spread,
    Bounded::Polynomial,
    Bounded::Complex,
];

/// A new law must be named here, and has then to attain its bounds below.
fn bounded(law: &Law<f64>) -> Bounded {
    match law {
        Law::Delays(d) if d.iter().all(|d| d.spread == 0.0) => Bounded::Sharp,
        Law::Delays(_) => Bounded::Spread,
        Law::Polynomial { .. } => Bounded::Polynomial,
        Law::Complex { .. } => Bounded::Complex,
    }
}

/// Bounds over a region, of which the `order`-th is halved for one thing.
struct Halved<'a> {
    region: &'a Region,
    fault: Option<(Bounded, usize)>,
}

impl Halved<'_> {
    fn spoilt(&self, what: Bounded, mut bounds: [f64; TAYLOR]) -> [f64; TAYLOR] {
        if let Some((fault, order)) = self.fault
            && fault == what
        {
            bounds[order] *= 0.5;
        }
        bounds
    }
}

impl Arithmetic<f64> for Halved<'_> {
    type Element = [f64; TAYLOR];
    fn zero(&self) -> Self::Element {
        [0.0; TAYLOR]
    }
    fn one(&self) -> Self::Element {
        [1.0, 0.0, 0.0, 0.0, 0.0]
    }
    fn add(&self, a: Self::Element, b: Self::Element) -> Self::Element {
        std::array::from_fn(|i| a[i] + b[i])
    }
    fn scaled(&self, k: f64, x: Self::Element) -> Self::Element {
        x.map(|x| k.abs() * x)
    }
    fn add_scaled(&self, sum: Self::Element, k: f64, x: Self::Element) -> Self::Element {
        std::array::from_fn(|i| sum[i] + k.abs() * x[i])
    }
    fn product(&self, a: Self::Element, b: Self::Element) -> Self::Element {
        real_product(&a, &b)
    }
    type Delay = Self::Element;
    fn delayed(&self, e: Self::Element, _: f64, x: Self::Element) -> Self::Element {
        real_product(&e, &x)
    }
    fn delay(&self, t: f64) -> Self::Element {
        self.spoilt(Bounded::Distance, delay_majorant(self.region, t))
    }
    fn answer(&self, law: &Law<f64>, x: Self::Element) -> Self::Element {
        real_product(&self.law(law), &x)
    }
    fn law(&self, law: &Law<f64>) -> Self::Element {
        self.spoilt(bounded(law), law.majorant(self.region))
    }
}

/// The orders at which a coefficient exceeds its bound.
fn exceeded(values: &[Cx<f64>; TAYLOR], bounds: &[f64; TAYLOR]) -> Vec<usize> {
    let above = |k: &usize| values[*k].value().norm() > bounds[*k] * (1.0 + 1e-11);
    (0..TAYLOR).filter(above).collect()
}

/// A law that attains its bounds at `s = -100` (within a tenth where it is spread), and again where
/// the distribution has faded.
fn attaining(what: Bounded) -> Option<Law<f64>> {
    let delays = |spread: f64| {
        let delayed = |weight, delay| Delayed {
            weight,
            delay,
            spread,
        };
        Law::Delays(vec![delayed(0.7, 3e-3), delayed(1.4, 5e-3)])
    };
    match what {
        Bounded::Distance => None,
        Bounded::Sharp => Some(delays(0.0)),
        Bounded::Spread => Some(delays(4e-4)),
        Bounded::Polynomial => Some(Law::Polynomial {
            coefficients: [0.6, -2e-3, 5e-6],
            delay: 2e-3,
        }),
        Bounded::Complex => Some(Law::Complex {
            re: -0.3,
            im: 0.8,
            delay: 1.5e-3,
        }),
    }
}

/// Whether bounds worked out in two ways are the same to rounding.
fn agree(a: [f64; TAYLOR], b: [f64; TAYLOR]) -> bool {
    a.iter().zip(b).all(|(a, b)| (a - b).abs() <= 1e-13 * b)
}

const PLACE: Complex64 = Complex64::new(-100.0, 0.0);

#[test]
fn half_of_any_order_of_any_law_is_exceeded() {
    for law in LAWS.into_iter().filter_map(attaining) {
        // On the real axis the measure itself counts.
        let region = Region::disc(PLACE, 0.0);
        let values = law.taylor(Cx::constant(PLACE));
        let sound = law.majorant(&region);
        assert!(exceeded(&values, &sound).is_empty(), "{law:?}");
        for order in 0..TAYLOR {
            let mut halved = sound;
            halved[order] *= 0.5;
            assert_eq!(exceeded(&values, &halved), [order], "{law:?}");
        }
    }
    // A single spread delay far above the axis, where its closed form counts.
    let faded = Law::Delays(vec![Delayed {
        weight: 1.3,
        delay: 0.02,
        spread: 5e-3,
    }]);
    let s = Complex64::new(-300.0, 2600.0);
    let values = faded.taylor(Cx::constant(s));
    let sound = faded.majorant(&Region::disc(s, 0.0));
    assert!(exceeded(&values, &sound).is_empty());
    for order in 0..TAYLOR {
        let mut halved = sound;
        halved[order] *= 0.5;
        assert_eq!(exceeded(&values, &halved), [order]);
    }
}

/// `x+` behind is `F x+` at plane `at`, the other waves pass.
fn joint(law: Law<f64>, at: usize) -> Step<f64> {
    let unit = |i: usize, size: f64| std::array::from_fn(|j| if i == j { size } else { 0.0 });
    Step::Joint(Joint {
        up: [[0.0; 3], unit(1, 1.0), unit(2, 1.0)],
        down: [unit(0, -1.0), unit(1, -1.0), unit(2, -1.0)],
        row: [1.0, 0.0, 0.0],
        terms: vec![Term {
            law,
            sense: [1.0, 0.0, 0.0],
            at,
        }],
    })
}

/// Chains whose `D` is one product, or several of one sign, with the law at each place where one may stand.
fn chains(law: &Law<f64>) -> Vec<(&'static str, Chain<f64>)> {
    let travel = |entropy: Option<Law<f64>>| {
        Step::Travel(Travel {
            downstream: 2e-3,
            upstream: 1e-3,
            entropy,
        })
    };
    let start = |entropy: [f64; 3]| Start {
        rows: [[1.0, -1.0, 0.0], entropy],
        term: None,
    };
    let (still, driven) = ([0.0, 0.0, 1.0], [1.0, 0.0, -1.0]);
    let chain = |start, steps, row| Chain {
        start,
        steps,
        end: End { row, term: None },
    };
    let (waves, onward) = ([1.0, 1.0, 0.0], [1.0, 0.0, 0.0]);
    let answering = Start {
        rows: [[1.0, 0.0, 0.0], still],
        term: Some((law.clone(), [0.0, -1.0, 0.0])),
    };
    let mut heard = chain(start(still), vec![travel(None)], [0.0; 3]);
    heard.end.term = Some((law.clone(), onward));
    vec![
        ("distance", chain(start(still), vec![travel(None)], waves)),
        ("start", chain(answering, vec![travel(None)], onward)),
        ("end", heard),
        (
            "joint",
            chain(
                start(still),
                vec![joint(law.clone(), 0), travel(None)],
                onward,
            ),
        ),
        (
            "joint that remembers",
            chain(
                start(still),
                vec![travel(None), joint(law.clone(), 0)],
                onward,
            ),
        ),
        (
            "entropy",
            chain(
                start(driven),
                vec![travel(Some(law.clone()))],
                [0.0, 0.0, 1.0],
            ),
        ),
    ]
}

#[test]
fn half_of_any_bound_shows_at_every_place_a_law_may_stand() {
    let region = Region::disc(PLACE, 0.0);
    let bounds = |tape: &Tape<f64>, fault| {
        tape.run(&Halved {
            region: &region,
            fault,
        })
    };
    for what in LAWS {
        let law = attaining(what).unwrap();
        for (place, chain) in chains(&law) {
            let tape = front::eliminate(&chain).unwrap().tape;
            let values = tape.taylor_at::<TAYLOR>(PLACE);
            let sound = bounds(&tape, None);
            assert!(exceeded(&values, &sound).is_empty(), "{place}, {what:?}");
            assert!(agree(sound, tape.bound(&region)), "{place}, {what:?}");
            // Every order of the whole program is attained, so that half of it would show.
            for (v, b) in values.iter().zip(sound) {
                let part = v.value().norm() / b;
                assert!(part > 0.9, "{place}, {what:?}: {part}");
            }
            for order in 0..TAYLOR {
                let fault = if place == "distance" {
                    Bounded::Distance
                } else {
                    what
                };
                let caught = exceeded(&values, &bounds(&tape, Some((fault, order))));
                assert!(caught.contains(&order), "{place}, {fault:?}, order {order}");
            }
        }
    }
}

/// A program of positive numbers and alternating laws, several paths wide.
fn positive() -> impl Strategy<Value = Tape<f64>> {
    let matrix = |rows: usize, columns: usize| {
        prop::collection::vec(prop::collection::vec(0.1..1.0f64, columns), rows)
    };
    let law = prop_oneof![
        (0.1..2.0f64, 0.0..0.01f64).prop_map(|(weight, delay)| Law::Delays(vec![Delayed {
            weight,
            delay,
            spread: 0.0
        }])),
        ([0.1..1.0f64, 0.1..1.0f64, 0.1..1.0f64], 0.0..0.01f64).prop_map(|([a, b, c], delay)| {
            Law::Polynomial {
                coefficients: [a, -1e-3 * b, 1e-6 * c],
                delay,
            }
        }),
    ];
    let layer = (
        matrix(3, 3),
        prop::collection::vec((law, matrix(3, 3)), 1..3),
        prop::array::uniform3(1e-4..5e-3f64),
    );
    (
        matrix(3, 1),
        prop::collection::vec(layer, 1..4),
        matrix(1, 3),
    )
        .prop_map(|(first, layers, last)| {
            let mut writer = Writer::default();
            writer.map(first, Vec::new());
            for (constant, lawful, delays) in layers {
                writer.scale(&delays);
                let entries = lawful.into_iter().map(|(law, m)| Entry::of(law, m));
                writer.map(constant, entries.collect());
            }
            writer.map(last, Vec::new());
            writer.finish().unwrap().0
        })
}

proptest! {
    /// Sums and products of bounds add nothing of their own, at any order: a program of positive terms
    /// attains them, and half of the bound of any one thing in it is exceeded.
    #[test]
    fn programs_of_positive_terms_attain_their_bounds(
        tape in positive(), re in -500.0..0.0f64, order in 0..TAYLOR,
    ) {
        let s = Complex64::new(re, 0.0);
        let region = Region::disc(s, 0.0);
        let bounds = |fault| tape.run(&Halved { region: &region, fault });
        let values = tape.taylor_at::<TAYLOR>(s);
        prop_assert!(agree(bounds(None), tape.bound(&region)));
        for (v, b) in values.iter().zip(bounds(None)) {
            prop_assert!((v.value().norm() / b - 1.0).abs() < 1e-11);
        }
        let present = [Bounded::Distance]
            .into_iter()
            .chain(tape.laws().flatten().map(bounded));
        for what in present {
            // A polynomial without delay has no coefficients beyond the second.
            if what == Bounded::Distance || order <= 2 {
                let caught = exceeded(&values, &bounds(Some((what, order))));
                prop_assert!(caught.contains(&order), "{what:?}, order {order}: {caught:?}");
            }
        }
    }
}
