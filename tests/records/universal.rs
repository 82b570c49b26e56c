//! Datasets 58 in text and binary, in either byte order. `tests/yardstick/records.py` holds files of a general-purpose
//! library against the same reader.

use std::fmt::Write;

use proptest::prelude::*;
use stillflame::measured::reading::Asked;

use crate::{noise, read, read_as};

#[derive(Clone, Copy, Debug)]
pub struct Kind {
    pub double: bool,
    /// Big-endian or not; text where there is none.
    pub binary: Option<bool>,
    pub uneven: bool,
}

pub fn dataset(name: &str, unit: &str, rate: f64, values: &[f64], kind: Kind) -> Vec<u8> {
    let size = if kind.double { 8 } else { 4 };
    let mut text = String::from("    -1\n");
    match kind.binary {
        None => text += "    58\n",
        Some(big) => {
            let order = if big { 2 } else { 1 };
            let bytes = size * values.len();
            let _ = writeln!(
                text,
                "    58b{order:6}{:6}{:12}{bytes:12}{:6}{:6}{:12}{:12}",
                2, 11, 0, 0, 0, 0
            );
        }
    }
    text += "An invented record\nNONE\n01-Jan-00 00:00:00\nNONE\nNONE\n";
    let _ = writeln!(
        text,
        "{:5}{:10}{:5}{:10} {name:10}{:10}{:4} {:10}{:10}{:4}",
        1, 0, 0, 0, 1, 1, "NONE", 0, 0
    );
    let (kind_of, step) = (if kind.double { 4 } else { 2 }, 1.0 / rate);
    let spacing = i32::from(!kind.uneven);
    let _ = writeln!(
        text,
        "{kind_of:10}{:10}{spacing:10}{}{}{}",
        values.len(),
        e13(0.0),
        e13(step),
        e13(0.0)
    );
    let _ = writeln!(
        text,
        "{:10}{:5}{:5}{:5} {:20} {:20}",
        17, 0, 0, 0, "Time", "s"
    );
    let _ = writeln!(
        text,
        "{:10}{:5}{:5}{:5} {:20} {unit:20}",
        15, 0, 0, 0, "Pressure"
    );
    for _ in 0..2 {
        let _ = writeln!(
            text,
            "{:10}{:5}{:5}{:5} {:20} {:20}",
            0, 0, 0, 0, "NONE", "NONE"
        );
    }
    let mut out = text.into_bytes();
    if let Some(big) = kind.binary {
        for x in values {
            let y = *x as f32;
            match (kind.double, big) {
                (true, true) => out.extend(x.to_be_bytes()),
                (true, false) => out.extend(x.to_le_bytes()),
                (false, true) => out.extend(y.to_be_bytes()),
                (false, false) => out.extend(y.to_le_bytes()),
            }
        }
        out.push(b'\n');
    } else {
        let mut fields: Vec<String> = Vec::new();
        for (i, x) in values.iter().enumerate() {
            if kind.uneven {
                fields.push(e13(i as f64 * step));
            }
            fields.push(if kind.double {
                format!("{:>20}", exponent(*x, 12))
            } else {
                e13(*x)
            });
        }
        let per_line = if kind.double { 4 } else { 6 };
        for line in fields.chunks(per_line) {
            out.extend((line.concat() + "\n").into_bytes());
        }
    }
    out.extend(b"    -1\n");
    out
}

fn e13(x: f64) -> String {
    format!("{:>13}", exponent(x, 5))
}

/// `1.5E+01`, as Fortran and C write it.
fn exponent(x: f64, digits: usize) -> String {
    let text = format!("{x:.digits$E}");
    let (mantissa, power) = text.split_once('E').unwrap();
    let power: i32 = power.parse().unwrap();
    format!(
        "{mantissa}E{}{:02}",
        if power < 0 { '-' } else { '+' },
        power.abs()
    )
}

fn kinds() -> impl Strategy<Value = Kind> {
    let binary = prop::option::of(any::<bool>());
    (any::<bool>(), binary, any::<bool>()).prop_map(|(double, binary, uneven)| Kind {
        double,
        binary,
        uneven: uneven && binary.is_none(),
    })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn every_kind_of_dataset_gives_the_same_record(kind in kinds(), n in 40..9000_usize, seed in any::<u64>()) {
        let (a, b) = (noise(n, seed), noise(n, seed ^ 1));
        let mut bytes = dataset("p1", "Pa", 2560.0, &a, kind);
        // Units, which are not read, between the two.
        bytes.extend(b"    -1\n   164\n         1  SI units             2\n  1.0 1.0 1.0\n    -1\n");
        bytes.extend(dataset("p2", "kPa", 2560.0, &b, kind));
        let got = read(&bytes).unwrap();
        prop_assert_eq!(got.rate_hz, 2560.0);
        prop_assert_eq!(&got.names, &["p1", "p2"]);
        prop_assert!(got.warnings.is_empty(), "{:?}", got.warnings);
        let digits = match (kind.double, kind.binary) {
            (true, Some(_)) => 1e-15,
            (true, None) => 1e-11,
            (false, Some(_)) => 1e-6,
            (false, None) => 1e-4,
        };
        for (want, got, factor) in [(&a, &got.samples[0], 1.0), (&b, &got.samples[1], 1e3)] {
            prop_assert_eq!(want.len(), got.len());
            for (x, y) in want.iter().zip(got) {
                prop_assert!((x * factor - y).abs() <= digits * factor * x.abs().max(1e-3), "{} {}", x, y);
            }
        }
    }
}

const BINARY: Kind = Kind {
    double: true,
    binary: Some(false),
    uneven: false,
};

#[test]
fn rates_come_out_round_of_six_digits() {
    for rate in [44_100.0, 51_200.0, 8192.0, 1000.0, 25_600.0] {
        let got = read(&dataset("p1", "Pa", rate, &noise(100, 1), BINARY)).unwrap();
        assert!(
            (got.rate_hz / rate - 1.0).abs() < 1e-5,
            "{rate}: {}",
            got.rate_hz
        );
    }
}

#[test]
fn faults_of_a_dataset_are_told() {
    let values = noise(400, 2);
    let sound = dataset("p1", "Pa", 1000.0, &values, BINARY);
    let told = |bytes: &[u8]| read(bytes).unwrap_err().to_string();
    // Byte order.
    let swapped = String::from_utf8_lossy(&sound[..200]).replace("58b     1", "58b     2");
    let wrong = [swapped.as_bytes(), &sound[200..]].concat();
    assert!(
        told(&wrong).contains("other byte order"),
        "{}",
        told(&wrong)
    );
    // A unit that is missing, and its cure.
    let bare = dataset("p1", "NONE", 1000.0, &values, BINARY);
    assert!(told(&bare).contains("has no unit"), "{}", told(&bare));
    let asked = Asked {
        names: Some("mic [Pa]".to_owned()),
        ..Asked::default()
    };
    assert_eq!(read_as(&bare, &asked).unwrap().samples[0], values);
    // Cut.
    let cut = read(&sound[..sound.len() - 1000]).unwrap();
    assert!(cut.samples[0].len() < 400 && cut.samples[0] == values[..cut.samples[0].len()]);
    assert!(
        cut.warnings[0].what.contains("is cut") || cut.warnings[0].what.contains("closes"),
        "{:?}",
        cut.warnings
    );
    assert!(
        told(&sound[..300]).contains("ends in the head"),
        "{}",
        told(&sound[..300])
    );
    // Channels that do not belong together.
    let slow = dataset("p2", "Pa", 500.0, &values, BINARY);
    assert!(told(&[sound.clone(), slow].concat()).contains("sampled at 500 Hz"));
    let short = dataset("p2", "Pa", 1000.0, &values[..300], BINARY);
    assert!(told(&[sound.clone(), short].concat()).contains("300 samples"));
    assert!(told(&[sound.clone(), sound].concat()).contains("two channels have this name"));
    // A letter among the numbers, with its place.
    let text = dataset(
        "p1",
        "Pa",
        1000.0,
        &values,
        Kind {
            binary: None,
            ..BINARY
        },
    );
    let text = String::from_utf8(text).unwrap();
    let lines: Vec<&str> = text.lines().collect();
    let broken = text.replacen(lines[20], &lines[20].replacen("E", "x", 1), 1);
    let problem = read(broken.as_bytes()).unwrap_err();
    let place = problem.0[0].place.as_ref().unwrap();
    assert_eq!((place.line, place.column), (21, 1), "{problem}");
}
