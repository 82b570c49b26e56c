//! Counting and finding on functions whose zeros are known exactly, and the ways a certificate must
//! fail.

#[path = "common/exact.rs"]
mod exact;

use exact::Polynomial;
use num_complex::Complex64;
use proptest::prelude::*;
use stillflame::numerics::analytic::{Analytic, Region, Rounding, TAYLOR};
use stillflame::numerics::count::{CountError, Effort, Rectangle, Walker};
use stillflame::numerics::isolate::Zero;
use stillflame::numerics::ledger::{Entry, Ledger};
use stillflame::numerics::zeros::{self, Doubt, Scan};

const WINDOW: Rectangle = Rectangle {
    growth: (-600.0, 600.0),
    omega: (0.0, 6000.0),
};

fn c(re: f64, im: f64) -> Complex64 {
    Complex64::new(re, im)
}

/// Zeros well inside or outside the window's edge.
fn zero() -> impl Strategy<Value = Complex64> {
    prop_oneof![
        4 => (-900.0..900.0f64, 1.0..7500.0f64).prop_map(|(re, im)| c(re, im)),
        1 => (-900.0..900.0f64).prop_map(|re| c(re, 0.0)),
    ]
}

fn clear_of_edges(z: Complex64) -> bool {
    (z.re.abs() - 600.0).abs() > 1e-3 && (z.im - 6000.0).abs() > 1e-3
}

fn inside(z: &Complex64) -> bool {
    z.re.abs() < 600.0 && z.im < 6000.0
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(400))]

    #[test]
    fn every_zero_of_a_symmetric_polynomial_is_found(
        zeros in prop::collection::vec(zero(), 1..5),
    ) {
        prop_assume!(zeros.iter().all(|z| clear_of_edges(*z)));
        let f = Polynomial::symmetric(&zeros);
        let found = zeros::search(&f, &WINDOW, Scan::Whole);
        let exact: Vec<_> = zeros.iter().filter(|z| inside(z)).collect();
        prop_assert!(found.complete(), "{:?}", found.doubts);
        prop_assert_eq!(found.expected, Some(exact.len() as i64));
        for z in exact {
            prop_assert!(
                found.zeros.iter().any(|k| (k.at - z).norm() <= k.error + 1e-7 * z.norm()),
                "{z} not in {:?}", found.zeros
            );
        }
    }

    #[test]
    fn where_a_search_starts_does_not_change_what_it_finds(
        zeros in prop::collection::vec(zero(), 1..5),
        astray in prop::collection::vec((-900.0..900.0f64, -100.0..7500.0f64), 0..4),
        known in 0..5usize,
    ) {
        prop_assume!(zeros.iter().all(|z| clear_of_edges(*z)));
        let f = Polynomial::symmetric(&zeros);
        let from_grid = zeros::search(&f, &WINDOW, Scan::UntilCounted);
        // Some of the zeros, some of them twice, among points that are none.
        let starts: Vec<_> = astray
            .into_iter()
            .map(|(re, im)| c(re, im))
            .chain(from_grid.met.iter().copied().take(known))
            .chain(from_grid.met.iter().copied().take(1))
            .collect();
        let found = zeros::search_from(&f, &WINDOW, Scan::UntilCounted, &starts);
        prop_assert!(found.complete(), "{:?}", found.doubts);
        prop_assert_eq!(found.expected, from_grid.expected);
        for z in &from_grid.zeros {
            let same = |k: &Zero| (k.at - z.at).norm() <= k.error + z.error;
            prop_assert!(found.zeros.iter().any(same), "{z:?} not in {:?}", found.zeros);
        }
    }

    /// A factor moves no zero, not even one near the ends of the range of numbers: long delays make
    /// values of 1e150 and more far left of the imaginary axis.
    #[test]
    fn a_factor_changes_nothing(
        zeros in prop::collection::vec(zero(), 1..5),
        exponent in -250..250i32,
        symmetric in any::<bool>(),
    ) {
        prop_assume!(zeros.iter().all(|z| clear_of_edges(*z) && (z.im - 300.0).abs() > 1e-3));
        let low = if symmetric { 0.0 } else { 300.0 };
        let window = Rectangle { omega: (low, 6000.0), ..WINDOW };
        let plain = if symmetric { Polynomial::symmetric(&zeros) } else { Polynomial::with(&zeros) };
        let scaled = Scaled { inner: &plain, factor: 10f64.powi(exponent) };
        let expected = zeros::search(&plain, &window, Scan::Whole);
        let found = zeros::search(&scaled, &window, Scan::Whole);
        prop_assert_eq!(found.expected, expected.expected);
        prop_assert!(found.complete() && expected.complete(), "{:?}", found.doubts);
        prop_assert_eq!(found.zeros.len(), expected.zeros.len());
        for z in &expected.zeros {
            let near = |k: &Zero| (k.at - z.at).norm() <= k.error + z.error;
            prop_assert!(found.zeros.iter().any(near), "{z:?} not in {:?}", found.zeros);
        }
    }

    #[test]
    fn every_zero_is_found_without_symmetry(zeros in prop::collection::vec(zero(), 1..5)) {
        let window = Rectangle { growth: (-600.0, 600.0), omega: (300.0, 6000.0) };
        prop_assume!(zeros.iter().all(|z| clear_of_edges(*z) && (z.im - 300.0).abs() > 1e-3));
        let f = Polynomial::with(&zeros);
        let found = zeros::search(&f, &window, Scan::Whole);
        let exact = zeros.iter().filter(|z| inside(z) && z.im > 300.0).count();
        prop_assert!(found.complete(), "{:?}", found.doubts);
        prop_assert_eq!(found.expected, Some(exact as i64));
        prop_assert_eq!(found.zeros.iter().map(|z| usize::from(z.multiplicity)).sum::<usize>(), exact);
    }

    #[test]
    fn two_zeros_however_close_are_two(
        re in -400.0..400.0f64, im in 100.0..5000.0f64,
        apart in -13.0..1.0f64, angle in 0.0..std::f64::consts::TAU,
        third in zero(),
    ) {
        prop_assume!(clear_of_edges(third) && (third - c(re, im)).norm() > 50.0);
        let z = c(re, im);
        let other = z + Complex64::from_polar(10f64.powf(apart), angle);
        let f = Polynomial::symmetric(&[z, other, third]);
        let found = zeros::search(&f, &WINDOW, Scan::Whole);
        let exact = 2 + i64::from(inside(&third));
        prop_assert!(found.complete(), "{:?}", found.doubts);
        prop_assert_eq!(found.expected, Some(exact));
        for z in [z, other] {
            prop_assert!(found.zeros.iter().any(|k| (k.at - z).norm() <= k.error * 1.01 + 1e-6));
        }
    }

    #[test]
    fn a_zero_on_or_beside_the_edge_is_never_wrong(
        im in 100.0..5900.0f64, offset in prop_oneof![Just(0.0), -1.0..1.0f64, -1e-6..1e-6f64],
    ) {
        let z = c(600.0 + offset, im);
        let f = Polynomial::symmetric(&[z, c(-100.0, 2500.0)]);
        let found = zeros::search(&f, &WINDOW, Scan::Whole);
        if found.complete() {
            prop_assert_eq!(found.expected, Some(1 + i64::from(offset < 0.0)));
        } else {
            prop_assert!(offset.abs() < 1e-6, "{:?}", found.doubts);
            let named = found.doubts.iter().any(|d| matches!(d, Doubt::OnEdge { .. }));
            prop_assert!(named, "{:?}", found.doubts);
        }
    }

    #[test]
    fn a_zero_on_the_axis_is_listed_without_symmetry_too(
        re in -500.0..500.0f64, off in prop_oneof![Just(0.0), -1e-18..1e-18f64], third in zero(),
    ) {
        prop_assume!(third.im > 0.0 && clear_of_edges(third));
        let f = Polynomial::with(&[c(re, off), c(re, -40.0), third]);
        let found = zeros::search(&f, &WINDOW, Scan::Whole);
        prop_assert!(found.complete(), "{:?}", found.doubts);
        prop_assert_eq!(found.expected, Some(1 + i64::from(inside(&third))));
        let lowest = &found.zeros[0];
        prop_assert!(lowest.at.im >= 0.0 && (lowest.at - c(re, off)).norm() <= lowest.error + 1e-10);
    }

    #[test]
    fn zeros_of_one_delay_match_their_closed_form(
        epsilon in 0.5..3.0f64, n in 0.3..6.0f64, tau in 0.0005..0.01f64,
    ) {
        let growth = (n / (1.0 + epsilon)).ln() / tau;
        prop_assume!((growth.abs() - 600.0).abs() > 1e-3);
        let f = exact::intrinsic(epsilon, n, tau);
        let found = zeros::search(&f, &WINDOW, Scan::Whole);
        prop_assert!(found.complete(), "{:?}", found.doubts);
        let mut k = 0;
        while (2 * k + 1) as f64 * std::f64::consts::PI / tau < 6000.0 {
            let z = c(growth, (2 * k + 1) as f64 * std::f64::consts::PI / tau);
            let hit = found.zeros.iter().any(|f| (f.at - z).norm() < 1e-10 * z.norm());
            prop_assert_eq!(hit, growth.abs() < 600.0);
            k += 1;
        }
        prop_assert_eq!(found.zeros.len(), if growth.abs() < 600.0 { k } else { 0 });
    }
}

#[test]
fn an_exact_double_zero_is_one_of_multiplicity_two() {
    let z = c(-80.0, 2000.0);
    let found = zeros::search(
        &Polynomial::symmetric(&[z, z, c(50.0, 4000.0)]),
        &WINDOW,
        Scan::Whole,
    );
    assert!(found.complete(), "{:?}", found.doubts);
    assert_eq!(found.expected, Some(3));
    let double = &found.zeros[0];
    assert_eq!(double.multiplicity, 2);
    assert!((double.at - z).norm() < 1e-4);
}

/// A function times a constant.
struct Scaled<'f> {
    inner: &'f Polynomial,
    factor: f64,
}

impl Analytic for Scaled<'_> {
    fn value_and_slope(&self, s: Complex64) -> (Complex64, Complex64) {
        let (value, slope) = self.inner.value_and_slope(s);
        (value * self.factor, slope * self.factor)
    }
    fn taylor(&self, s: Complex64) -> [Complex64; 4] {
        self.inner.taylor(s).map(|c| c * self.factor)
    }
    fn bound(&self, region: &Region) -> [f64; TAYLOR] {
        self.inner.bound(region).map(|b| b * self.factor)
    }
    fn rounding(&self) -> Rounding {
        self.inner.rounding()
    }
    fn is_symmetric(&self) -> bool {
        self.inner.is_symmetric()
    }
}

/// A function with something wrong about it.
struct Faulty<'f> {
    inner: &'f Polynomial,
    pole: Option<Complex64>,
    bound_times: f64,
}

impl Analytic for Faulty<'_> {
    fn value_and_slope(&self, s: Complex64) -> (Complex64, Complex64) {
        let (v, d) = self.inner.value_and_slope(s);
        match self.pole {
            None => (v, d),
            // A conjugate pair of poles of small residue.
            Some(p) => {
                let q = |s: Complex64| (s - p) * (s - p.conj()) / 1e6;
                let dq = (s - p + s - p.conj()) / 1e6;
                (v / q(s), d / q(s) - v * dq / (q(s) * q(s)))
            }
        }
    }
    fn taylor(&self, s: Complex64) -> [Complex64; 4] {
        let mut t = self.inner.taylor(s);
        (t[0], t[1]) = self.value_and_slope(s);
        t
    }
    fn bound(&self, region: &Region) -> [f64; TAYLOR] {
        // Wide enough for the pole's factor on the contour, where the injected fault must be caught
        // by the count and not by the bound.
        let widen = if self.pole.is_some() { 1e3 } else { 1.0 };
        self.inner
            .bound(region)
            .map(|b| b * self.bound_times * widen)
    }
    fn rounding(&self) -> Rounding {
        self.inner.rounding()
    }
    fn is_symmetric(&self) -> bool {
        true
    }
}

const FAULT_FREE: [Complex64; 3] = [
    Complex64::new(-100.0, 800.0),
    Complex64::new(40.0, 2200.0),
    Complex64::new(-310.0, 4700.0),
];

fn padded() -> Rectangle {
    Rectangle {
        growth: (-624.0, 624.0),
        omega: (0.0, 6120.0),
    }
}

#[test]
fn a_dropped_zero_is_reported_missing() {
    let f = Polynomial::symmetric(&FAULT_FREE);
    let count = Walker::new(&f)
        .symmetric(padded().growth, padded().omega.1)
        .unwrap();
    assert_eq!(count, 6);
    let mut ledger = Ledger::new(&f, 300.0);
    for z in &FAULT_FREE[..2] {
        assert_eq!(ledger.offer(*z), Entry::New);
    }
    let verdict = zeros::certify(&ledger, &WINDOW, &padded(), count, Effort::default());
    assert!(!verdict.complete());
    assert_eq!(verdict.doubts, [Doubt::Missing { missing: 1 }]);
    assert_eq!(verdict.expected, Some(3));
}

/// A pad may begin at zero frequency by chance, as 2 % about 14 to 714 Hz does; without symmetry the zeros
/// are single all the same.
#[test]
fn without_symmetry_zeros_are_counted_singly_wherever_the_pad_begins() {
    let f = Polynomial::with(&FAULT_FREE);
    assert!(!f.is_symmetric());
    let window = Rectangle {
        omega: (120.0, 6000.0),
        ..WINDOW
    };
    let verdict = zeros::certify(
        &Ledger::new(&f, 300.0),
        &window,
        &padded(),
        3,
        Effort::default(),
    );
    assert_eq!(verdict.doubts, [Doubt::Missing { missing: 3 }]);
    assert_eq!(verdict.expected, Some(3));
}

#[test]
fn a_duplicate_is_known_and_never_listed_twice() {
    let f = Polynomial::symmetric(&FAULT_FREE);
    let mut ledger = Ledger::new(&f, 300.0);
    for z in &FAULT_FREE {
        assert_eq!(ledger.offer(*z), Entry::New);
    }
    for z in &FAULT_FREE {
        assert_eq!(ledger.offer(*z + 1e-9), Entry::Known);
        assert_eq!(ledger.offer(z.conj()), Entry::Known);
    }
    assert_eq!(ledger.zeros().len(), 3);
    // A list longer than the count is reported as such.
    let verdict = zeros::certify(&ledger, &WINDOW, &padded(), 4, Effort::default());
    assert_eq!(verdict.doubts, [Doubt::Excess { excess: 1 }]);
}

#[test]
fn a_pole_left_in_is_reported() {
    let inner = Polynomial::symmetric(&FAULT_FREE);
    let f = Faulty {
        inner: &inner,
        pole: Some(c(-50.0, 3100.0)),
        bound_times: 1.0,
    };
    let found = zeros::search(&f, &WINDOW, Scan::Whole);
    assert!(!found.complete());
    assert!(
        found.doubts.iter().any(|d| matches!(
            d,
            Doubt::Excess { .. } | Doubt::NotCounted(CountError::BoundContradicted { .. })
        )),
        "{:?}",
        found.doubts
    );
}

#[test]
fn a_halved_bound_is_reported() {
    // On the real axis to the right of zeros on the left the bound is attained to a few per cent, so
    // that half of it is exceeded by the values themselves.
    let zeros = [c(-900.0, 0.0), c(-1500.0, 0.0)];
    let inner = Polynomial::symmetric(&zeros);
    let window = Rectangle {
        growth: (-1000.0, 2000.0),
        omega: (0.0, 300.0),
    };
    let sound = zeros::search(
        &Faulty {
            inner: &inner,
            pole: None,
            bound_times: 1.0,
        },
        &window,
        Scan::Whole,
    );
    assert!(sound.complete(), "{:?}", sound.doubts);
    let halved = zeros::search(
        &Faulty {
            inner: &inner,
            pole: None,
            bound_times: 0.5,
        },
        &window,
        Scan::Whole,
    );
    assert!(
        matches!(
            halved.doubts[..],
            [Doubt::NotCounted(CountError::BoundContradicted { .. })]
        ),
        "{:?}",
        halved.doubts
    );
}

#[test]
fn a_halved_bound_of_a_chain_of_delays_is_reported() {
    struct Halved(stillflame::waves::tape::Tape<f64>);
    impl Analytic for Halved {
        fn value_and_slope(&self, s: Complex64) -> (Complex64, Complex64) {
            self.0.value_and_slope(s)
        }
        fn taylor(&self, s: Complex64) -> [Complex64; 4] {
            self.0.taylor(s)
        }
        fn bound(&self, region: &Region) -> [f64; TAYLOR] {
            self.0.bound(region).map(|b| 0.5 * b)
        }
        fn rounding(&self) -> Rounding {
            self.0.rounding()
        }
        fn is_symmetric(&self) -> bool {
            true
        }
    }
    let f = exact::intrinsic(1.0, 2.5, 0.003);
    assert!(zeros::search(&f, &WINDOW, Scan::Whole).complete());
    let halved = zeros::search(&Halved(f), &WINDOW, Scan::Whole);
    assert!(matches!(
        halved.doubts[..],
        [Doubt::NotCounted(CountError::BoundContradicted { .. })]
    ));
}
