//! Records with faults: each is told with its line, and nothing is made up.

use stillflame::measured::reading::Asked;
use stillflame::problems::Problems;

use crate::{noise, read, read_as};

const HEAD: &str = "time [s],p1 [Pa],p2 [Pa]\n";

fn rows(n: usize) -> Vec<String> {
    let (a, b) = (noise(n, 1), noise(n, 2));
    (0..n)
        .map(|i| format!("{:.4},{:.3},{:.3}", i as f64 * 0.001, a[i], b[i]))
        .collect()
}

fn file(rows: &[String]) -> String {
    format!("{HEAD}{}\n", rows.join("\n"))
}

/// The message of the first problem and its line and column.
fn first(told: &Problems) -> (String, usize, usize) {
    let problem = &told.0[0];
    let place = problem
        .place
        .as_ref()
        .map_or((0, 0), |p| (p.line, p.column));
    (problem.to_string(), place.0, place.1)
}

#[test]
fn faults_of_rows_are_told_where_they_stand() {
    let cases: &[(&str, &str, usize, usize)] = &[
        (
            "0.0500,1.0",
            "line 52 has 2 fields where the header has 3",
            52,
            1,
        ),
        (
            "0.0500,1.0,2.0,3.0",
            "line 52 has 4 fields where the header has 3",
            52,
            1,
        ),
        ("0.0500,NaN,2.0", "`NaN` on line 52 is not finite", 52, 8),
        ("0.0500,1.0,inf", "`inf` on line 52 is not finite", 52, 12),
        (
            "0.0500,,2.0",
            "line 52 has nothing where a number belongs",
            52,
            8,
        ),
        ("0.0500,1.0,two", "`two` on line 52 is no number", 52, 12),
        (
            "0.0600,1.0,2.0",
            "10 samples are missing before line 52",
            52,
            1,
        ),
        ("0.0490,1.0,2.0", "time does not rise", 52, 1),
    ];
    for (row, words, line, column) in cases {
        let mut all = rows(200);
        all[50] = (*row).to_owned();
        let (text, l, c) = first(&read(file(&all).as_bytes()).unwrap_err());
        assert!(
            text.contains(words) && (l, c) == (*line, *column),
            "{row}: {l}:{c} {text}"
        );
    }
}

#[test]
fn every_fault_is_told_at_once_and_the_rest_is_counted() {
    let mut all = rows(500);
    for i in (100..200).step_by(10) {
        all[i] = format!("{:.4},nan,1.0", i as f64 * 0.001);
    }
    all[300] = "0.3000,1.0".to_owned();
    let told = read(file(&all).as_bytes()).unwrap_err().to_string();
    assert!(told.contains("and 7 more like it further on"), "{told}");
    assert!(told.contains("line 302 has 2 fields"), "{told}");
    // A stretch that leaves the faults out has none.
    let asked = Asked {
        span: Some((0.31, 0.45)),
        ..Asked::default()
    };
    assert_eq!(
        read_as(file(&all).as_bytes(), &asked).unwrap().samples[0].len(),
        140
    );
}

#[test]
fn a_file_cut_mid_line_loses_that_row_and_says_so() {
    let all = rows(200);
    let text = file(&all);
    for cut in 2..18 {
        let got = read(&text.as_bytes()[..text.len() - cut]).unwrap();
        assert_eq!(got.samples[0].len(), 199, "{cut}");
        assert!(
            got.warnings
                .iter()
                .any(|w| w.what.contains("ends in the middle of line 201")),
            "{cut}: {:?}",
            got.warnings
        );
    }
    // Only the line end is missing: nothing is lost.
    let got = read(&text.as_bytes()[..text.len() - 1]).unwrap();
    assert!(got.samples[0].len() == 200 && got.warnings.is_empty());
}

#[test]
fn heads_that_do_not_say_enough_are_refused() {
    let body = rows(100).join("\n") + "\n";
    let with = |head: &str| {
        read(format!("{head}\n{body}").as_bytes())
            .unwrap_err()
            .to_string()
    };
    assert!(with("time [s],p1,p2 [Pa]").contains("`p1`: has no unit"));
    assert!(with("time [s],p1 [furlong],p2 [Pa]").contains("`furlong` is no unit of a channel"));
    assert!(with("time [s],p1 [Pa],p1 [Pa]").contains("two channels have this name"));
    assert!(with("x [m/s],p1 [Pa],p2 [Pa]").contains("no column of time"));
    assert!(read(b"").unwrap_err().to_string().contains("empty"));
    assert!(
        read(HEAD.as_bytes())
            .unwrap_err()
            .to_string()
            .contains("no row")
    );
    assert!(
        read(b"# only words\n")
            .unwrap_err()
            .to_string()
            .contains("nothing in it but comments")
    );
    assert!(
        read(b"\x01\x00\x02\x03")
            .unwrap_err()
            .to_string()
            .contains("zero byte")
    );
    let latin = [
        HEAD.replace("p1", "p\u{e9}")
            .chars()
            .map(|c| c as u8)
            .collect::<Vec<u8>>(),
        body.clone().into_bytes(),
    ]
    .concat();
    assert!(read(&latin).unwrap_err().to_string().contains("not UTF-8"));
}

#[test]
fn rates_are_held_against_what_is_stated_and_against_the_whole() {
    let text = file(&rows(3000));
    let asked = |rate| Asked {
        rate_hz: Some(rate),
        ..Asked::default()
    };
    assert!(read_as(text.as_bytes(), &asked(1000.0)).is_ok());
    let told = read_as(text.as_bytes(), &asked(1024.0))
        .unwrap_err()
        .to_string();
    assert!(
        told.contains("--rate says 1024 Hz, and the file itself 1000 Hz"),
        "{told}"
    );
    // A clock that changes its rate half-way, each step within bounds.
    let times = (0..20_000).scan(0.0_f64, |t, i| {
        *t += if i > 9000 { 0.001_04 } else { 0.001 };
        Some(*t)
    });
    let drifting: Vec<String> = times
        .map(|t: f64| format!("{t:.6},1.0,{}", t.sin()))
        .collect();
    let told = read(file(&drifting).as_bytes()).unwrap_err().to_string();
    assert!(told.contains("sampling rate changes"), "{told}");
    let uneven: Vec<String> = (0..2000)
        .map(|i| {
            format!(
                "{:.6},{},{i}",
                f64::from(i) * 0.001 + if i % 7 == 3 { 0.0002 } else { 0.0 },
                i % 5
            )
        })
        .collect();
    let got = read(file(&uneven).as_bytes()).unwrap();
    assert!(
        got.warnings
            .iter()
            .any(|w| w.what.contains("time steps are off")),
        "{:?}",
        got.warnings
    );
}

#[test]
fn clipping_and_dead_channels_are_said() {
    let sine = |i: usize| 10.0 * (0.05 * i as f64).sin();
    let all: Vec<String> = (0..5000)
        .map(|i| {
            format!(
                "{:.4},{:.4},3.0",
                i as f64 * 0.001,
                sine(i).clamp(-9.0, 100.0)
            )
        })
        .collect();
    let got = read(file(&all).as_bytes()).unwrap();
    let told: Vec<String> = got.warnings.iter().map(ToString::to_string).collect();
    assert!(
        told.iter()
            .any(|t| t.contains("`p1`") && t.contains("lower limit -9")),
        "{told:?}"
    );
    assert!(
        told.iter()
            .any(|t| t.contains("`p2`") && t.contains("every one of its 5000 samples is 3")),
        "{told:?}"
    );
    assert_eq!(told.len(), 2);
}
