//! Eight numbers at once: elementary functions against forty digits, every instruction set of this machine against
//! one number at a time.

use num_complex::Complex64;
use proptest::prelude::*;
use stillflame::numerics::analytic::{Analytic, Region};
use stillflame::numerics::lanes::{
    FARTHEST_TURN, Job, LANES, Lanes, Level, exp, level, on_lanes_of, sin_cos_far,
};
use stillflame::{input, modes};

/// The instruction sets this machine has.
fn levels() -> impl Iterator<Item = Level> {
    [Level::Baseline, Level::Avx2, Level::Avx512]
        .into_iter()
        .filter(|l| *l <= level())
}

type Eight = [f64; LANES];

/// Exponential, sine and cosine of eight numbers.
struct Functions(Eight);

impl Job for Functions {
    type Output = [Eight; 3];
    #[inline(always)]
    fn run<L: Lanes>(self) -> [Eight; 3] {
        let x = L::load(&self.0);
        let (sin, cos) = sin_cos_far(x);
        let mut out = [[0.0; LANES]; 3];
        for (value, to) in [exp(x), sin, cos].into_iter().zip(&mut out) {
            value.store(to);
        }
        out
    }
}

fn functions(level: Level, x: Eight) -> [Eight; 3] {
    on_lanes_of(level, Functions(x))
}

/// Distance of neighbours at `x`.
fn ulp(x: f64) -> f64 {
    let x = x.abs().max(f64::MIN_POSITIVE);
    f64::from_bits(x.to_bits() + 1) - x
}

/// Values to forty digits by mpmath (tests/yardstick/lanes.py), as the nearest double and the rest.
#[test]
fn elementary_functions_are_as_right_as_the_rounding_counts_on() {
    let rows: Vec<(String, f64, f64, f64)> = csv::Reader::from_path(
        std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/lanes.csv"),
    )
    .unwrap()
    .deserialize()
    .map(Result::unwrap)
    .collect();
    assert!(rows.len() > 1500);
    for level in levels() {
        let mut worst = [0.0f64; 3];
        for (name, x, nearest, left) in &rows {
            let which = ["exp", "sin", "cos"]
                .iter()
                .position(|n| n == name)
                .unwrap();
            let found = functions(level, [*x; LANES])[which];
            assert!(found.iter().all(|v| v.to_bits() == found[0].to_bits()));
            let off = ((found[0] - nearest) - left).abs() / ulp(*nearest);
            worst[which] = worst[which].max(off);
            // What the rounding of a program counts on (waves::tape).
            let allowed = if name == "exp" { 1.0 } else { 1.5 };
            assert!(
                off <= allowed,
                "{name} {x} on {level:?}: {} not {nearest}, {off} ulp",
                found[0]
            );
        }
        println!("{level:?}: exp, sin, cos within {worst:.2?} ulp");
    }
}

#[test]
fn ends_of_the_range_are_those_of_one_number() {
    let x = [
        0.0,
        -0.0,
        709.78,
        711.0,
        f64::INFINITY,
        -745.0,
        -2e3,
        f64::NAN,
    ];
    for level in levels() {
        let [exp, sin, cos] = functions(level, x);
        for (i, x) in x.into_iter().enumerate() {
            let one = x.exp();
            assert_eq!(exp[i].is_nan(), one.is_nan(), "exp {x} on {level:?}");
            assert!(
                one.is_nan() || exp[i] == one || (exp[i] - one).abs() <= 2.0 * ulp(one),
                "exp {x} on {level:?}: {}",
                exp[i]
            );
            assert_eq!(sin[i].is_nan(), x.sin().is_nan(), "sin {x} on {level:?}");
            assert_eq!(cos[i].is_nan(), x.cos().is_nan(), "cos {x} on {level:?}");
        }
    }
}

/// Everything else a type of lanes does.
struct Operations(Eight, Eight, Eight);

impl Job for Operations {
    type Output = Vec<Eight>;
    #[inline(always)]
    fn run<L: Lanes>(self) -> Vec<Eight> {
        let (a, b, c) = (L::load(&self.0), L::load(&self.1), L::load(&self.2));
        let all = [
            a + b,
            a - b,
            a * b,
            -a,
            a.mul_add(b, c),
            a.neg_mul_add(b, c),
            a.scaled(3.0),
            a.scaled_add(-2.5, c),
            a.abs().sqrt(),
            a.abs(),
            a.max(b),
            a.min(b),
            L::constant(7.0),
        ];
        let mut out = vec![[0.0; LANES]; all.len()];
        for (value, to) in all.into_iter().zip(&mut out) {
            value.store(to);
        }
        out
    }
}

proptest! {
    #[test]
    fn operations_are_those_of_one_number(
        a in prop::array::uniform8(-1e3..1e3f64),
        b in prop::array::uniform8(-1e3..1e3f64),
        c in prop::array::uniform8(-1e3..1e3f64),
    ) {
        for level in levels() {
            let found = on_lanes_of(level, Operations(a, b, c));
            for i in 0..LANES {
                let (a, b, c) = (a[i], b[i], c[i]);
                let one = [
                    a + b, a - b, a * b, -a, a * b + c, c - a * b, a * 3.0, c - 2.5 * a, a.abs().sqrt(), a.abs(),
                    a.max(b), a.min(b), 7.0,
                ];
                for (k, (found, one)) in found.iter().zip(one).enumerate() {
                    let room = 2.0 * ulp((a * b).abs().max(c.abs()).max(1.0));
                    prop_assert!((found[i] - one).abs() <= room, "{k} on {level:?}: {} not {one}", found[i]);
                }
            }
        }
    }

    /// Far turns are left to the standard library; near ones agree with it.
    #[test]
    fn functions_are_those_of_one_number(
        x in prop::array::uniform8(prop_oneof![-700.0..700.0f64, -1e3 * FARTHEST_TURN..1e3 * FARTHEST_TURN]),
    ) {
        for level in levels() {
            let [_, sin, cos] = functions(level, x);
            for i in 0..LANES {
                prop_assert!((sin[i] - x[i].sin()).abs() <= 3e-16, "sin {} on {level:?}", x[i]);
                prop_assert!((cos[i] - x[i].cos()).abs() <= 3e-16, "cos {} on {level:?}", x[i]);
            }
        }
    }
}

/// Values, slopes and bounds of the networks that come with the program, in batches of every size around eight and
/// sixteen: those of one place, to rounding.
#[test]
fn a_characteristic_function_in_lanes_is_that_of_one_place() {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("networks");
    let mut networks = 0;
    for entry in std::fs::read_dir(folder).unwrap() {
        let network = input::read(&entry.unwrap().path(), &[]).unwrap().network;
        let tape = modes::solve(&network)
            .unwrap()
            .acoustics
            .characteristic
            .tape;
        networks += 1;
        let places: Vec<Complex64> = (0..41)
            .map(|i| Complex64::new(-500.0 + 25.0 * f64::from(i), 131.7 * f64::from(i)))
            .collect();
        for number in [0, 1, 7, 8, 9, 15, 16, 17, 24, 41] {
            let places = &places[..number];
            let mut found = Vec::new();
            tape.values_and_slopes(places, &mut found);
            assert_eq!(found.len(), number);
            for (&s, (value, slope)) in places.iter().zip(&found) {
                let bounds = tape.bound(&Region::disc(s, 0.0));
                let floor = |order| 2.0 * tape.rounding().floor(&bounds, s.norm(), order);
                let (one, its_slope) = tape.value_and_slope(s);
                assert!((value - one).norm() <= floor(0), "{s}: {value} not {one}");
                assert!(
                    (slope - its_slope).norm() <= floor(1),
                    "{s}: {slope} not {its_slope}"
                );
            }
            let regions: Vec<Region> = places.iter().map(|s| Region::disc(*s, 40.0)).collect();
            let mut found = Vec::new();
            tape.bounds(&regions, &mut found);
            assert_eq!(found.len(), number);
            for (region, bounds) in regions.iter().zip(&found) {
                for (a, b) in bounds.iter().zip(tape.bound(region)) {
                    assert!((a - b).abs() <= 1e-13 * b, "{region:?}: {a} not {b}");
                }
            }
        }
    }
    assert!(networks >= 5);
}
