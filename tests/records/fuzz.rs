//! Mutated files of every format: a reader gives finite samples or says what is wrong, and never falls over.

use proptest::prelude::*;
use stillflame::measured::reading::{Asked, Opened, open};
use stillflame::studies::record::{Correction, Settings, survey};

use crate::universal::{Kind, dataset};
use crate::{file, noise, wav};

fn valid() -> Vec<(Vec<u8>, Asked)> {
    let (a, b) = (noise(300, 1), noise(300, 2));
    let rows = |unit: &str, delimiter: char| -> String {
        let rows: String = (0..300)
            .map(|i| {
                format!(
                    "{:.3}{delimiter}{:.4}{delimiter}{:.4}\n",
                    i as f64 * 0.001,
                    a[i],
                    b[i]
                )
            })
            .collect();
        format!(
            "# a note\n{}\n{rows}",
            unit.replace(',', &delimiter.to_string())
        )
    };
    let spectrum: String = (0..60)
        .map(|i| format!("{i},{}\n", 1.0 + (f64::from(i) * 0.3).sin().abs()))
        .collect();
    let kinds = [
        Kind {
            double: true,
            binary: Some(true),
            uneven: false,
        },
        Kind {
            double: false,
            binary: Some(false),
            uneven: false,
        },
        Kind {
            double: false,
            binary: None,
            uneven: false,
        },
        Kind {
            double: true,
            binary: None,
            uneven: true,
        },
    ];
    let mut all = vec![
        (
            rows("time [s],p1 [Pa],p2 [kPa]", ',').into_bytes(),
            Asked::default(),
        ),
        (
            rows("time,p1,p2\n[s],[Pa],[Pa]", ';').into_bytes(),
            Asked::default(),
        ),
        (
            format!("f [Hz],p [dB]\n{spectrum}").into_bytes(),
            Asked::default(),
        ),
        (wav::doubles(&a, false, false), wav::asked(1, "1 Pa")),
        (wav::doubles(&a, true, false), wav::asked(1, "1 Pa")),
        (wav::doubles(&a, false, true), wav::asked(1, "1 Pa")),
    ];
    for kind in kinds {
        let both = [
            dataset("p1", "Pa", 1000.0, &a, kind),
            dataset("p2", "Pa", 1000.0, &b, kind),
        ]
        .concat();
        all.push((both, Asked::default()));
    }
    all
}

/// A change of some bytes.
#[derive(Clone, Debug)]
enum Change {
    Set(usize, u8),
    Cut(usize),
    Remove(usize, usize),
    Repeat(usize, usize),
    Insert(usize, Vec<u8>),
}

fn changes() -> impl Strategy<Value = Vec<Change>> {
    let words: Vec<Vec<u8>> = [
        "\n", ",", "    -1\n", "nan", "1e999", "-", "\"", "58b", "data", "\u{b5}", "E+", "\0", ";",
    ]
    .iter()
    .map(|w| w.as_bytes().to_vec())
    .collect();
    // Half of the places lie in the head, where most is decided.
    let at = || prop_oneof![0..800_usize, any::<usize>()];
    let one = prop_oneof![
        (at(), any::<u8>()).prop_map(|(i, b)| Change::Set(i, b)),
        any::<usize>().prop_map(Change::Cut),
        (at(), 1..200_usize).prop_map(|(i, n)| Change::Remove(i, n)),
        (at(), 1..200_usize).prop_map(|(i, n)| Change::Repeat(i, n)),
        (at(), prop::sample::select(words)).prop_map(|(i, w)| Change::Insert(i, w)),
    ];
    prop::collection::vec(one, 1..4)
}

fn changed(mut bytes: Vec<u8>, changes: &[Change]) -> Vec<u8> {
    for change in changes {
        let n = bytes.len().max(1);
        match change {
            Change::Set(i, b) => {
                if let Some(x) = bytes.get_mut(i % n) {
                    *x = *b;
                }
            }
            Change::Cut(i) => bytes.truncate(i % n),
            Change::Remove(i, m) => {
                let from = (i % n).min(bytes.len());
                bytes.drain(from..(from + m).min(bytes.len()));
            }
            Change::Repeat(i, m) => {
                let from = (i % n).min(bytes.len());
                let part = bytes[from..(from + m).min(bytes.len())].to_vec();
                bytes.splice(from..from, part);
            }
            Change::Insert(i, w) => {
                let from = (i % n).min(bytes.len());
                bytes.splice(from..from, w.iter().copied());
            }
        }
    }
    bytes
}

#[test]
fn the_files_are_valid_to_begin_with() {
    for (i, (bytes, asked)) in valid().into_iter().enumerate() {
        let file = file(&bytes);
        match open(file.path(), &asked) {
            Ok(Opened::Record(record)) => assert!(crate::whole(*record).is_ok(), "{i}"),
            Ok(Opened::Spectrum(s)) => assert_eq!(s.frequency.len(), 60),
            Err(e) => panic!("{i}: {e}"),
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(3000))]

    #[test]
    fn no_mutation_makes_a_reader_fall_over(which in 0..10_usize, changes in changes()) {
        let (bytes, asked) = valid().swap_remove(which);
        let file = file(&changed(bytes, &changes));
        match open(file.path(), &asked) {
            Err(told) => prop_assert!(told.any_error() && told.0.iter().all(|p| !p.what.is_empty())),
            Ok(Opened::Spectrum(spectrum)) => {
                for column in &spectrum.columns {
                    prop_assert_eq!(column.values.len(), spectrum.frequency.len());
                    prop_assert!(column.values.iter().all(|x| x.is_finite()));
                }
            }
            Ok(Opened::Record(record)) => {
                prop_assert!(record.rate_hz.is_finite() && record.rate_hz > 0.0);
                match crate::whole(*record) {
                    Err(told) => prop_assert!(told.any_error()),
                    Ok(read) => {
                        prop_assert!(read.samples.iter().all(|c| c.len() == read.samples[0].len() && !c.is_empty()));
                        prop_assert!(read.samples.iter().flatten().all(|x| x.is_finite()));
                    }
                }
            }
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(150))]

    #[test]
    fn no_mutation_makes_the_analysis_fall_over(which in 0..10_usize, changes in changes()) {
        let (bytes, asked) = valid().swap_remove(which);
        let file = file(&changed(bytes, &changes));
        if let Ok(Opened::Record(record)) = open(file.path(), &asked) {
            let none = vec![Correction::default(); record.signals.len()];
            if let Err(told) = survey(*record, none, &Settings::default()) {
                prop_assert!(told.any_error());
            }
        }
    }
}
