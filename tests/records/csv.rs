//! Records and spectra as text.

use proptest::prelude::*;
use stillflame::measured::reading::{Asked, Line, Opened, open};

use crate::{file, noise, read, read_as};

/// How a file may be written.
#[derive(Clone, Debug)]
struct Style {
    delimiter: char,
    comma: bool,
    units: u8,
    time: bool,
    quoted: bool,
    crlf: bool,
    comment: bool,
}

fn written(style: &Style, rate: f64, a: &[f64], b: &[f64]) -> String {
    let end = if style.crlf { "\r\n" } else { "\n" };
    let delimiter = style.delimiter.to_string();
    let quote = |s: String| if style.quoted { format!("\"{s}\"") } else { s };
    let mut text = String::new();
    if style.comment {
        text += &format!("# SYNTHETIC{end}{end}");
    }
    let mut names = vec!["time", "p1", "p2"];
    let mut units = vec!["ms", "kPa", "psi"];
    if !style.time {
        names.remove(0);
        units.remove(0);
    }
    let head = |n: &str, u: &str| match style.units {
        0 => format!("{n} [{u}]"),
        1 => format!("{n} ({u})"),
        _ => n.to_owned(),
    };
    // Blanks part fields there, so that none may stand within one.
    let head = |(n, u): (&&str, &&str)| {
        let text = head(n, u);
        quote(if style.delimiter == ' ' {
            text.replace(' ', "")
        } else {
            text
        })
    };
    let heads: Vec<String> = names.iter().zip(&units).map(head).collect();
    text += &(heads.join(&delimiter) + end);
    if style.units > 1 {
        let units: Vec<String> = units.iter().map(|u| quote(format!("[{u}]"))).collect();
        text += &(units.join(&delimiter) + end);
    }
    let number = |x: f64| {
        let text = format!("{x}");
        quote(if style.comma {
            text.replace('.', ",")
        } else {
            text
        })
    };
    let rows: Vec<String> = a
        .iter()
        .zip(b)
        .enumerate()
        .map(|(i, (a, b))| {
            let time = format!("{:.6}", 1e3 * i as f64 / rate + 250.0);
            let time = quote(if style.comma {
                time.replace('.', ",")
            } else {
                time
            });
            let mut fields = vec![number(*a), number(*b)];
            if style.time {
                fields.insert(0, time);
            }
            fields.join(&delimiter)
        })
        .collect();
    text += &rows.join(end);
    text += end;
    text
}

fn styles() -> impl Strategy<Value = Style> {
    let delimiter = prop::sample::select(vec![',', ';', '\t', ' ']);
    (delimiter, any::<[bool; 5]>(), 0..3_u8).prop_map(|(delimiter, b, units)| Style {
        delimiter,
        comma: b[0] && matches!(delimiter, ';' | '\t'),
        units,
        time: b[1],
        quoted: b[2] && delimiter != ' ',
        crlf: b[3],
        comment: b[4],
    })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    /// psi by definition: lbf/in^2 = 6894.757 293 168 Pa (NIST SP 811, from memory).
    #[test]
    fn every_way_of_writing_gives_the_same_record(style in styles(), n in 40..9000_usize, seed in any::<u64>()) {
        let (a, b) = (noise(n, seed), noise(n, seed ^ 1));
        let rate = 2560.0;
        let asked = Asked { rate_hz: (!style.time).then_some(rate), ..Asked::default() };
        let got = read_as(written(&style, rate, &a, &b).as_bytes(), &asked).unwrap();
        prop_assert_eq!(got.rate_hz, rate);
        prop_assert_eq!(&got.names, &["p1", "p2"]);
        let start = if style.time { 0.25 } else { 0.0 };
        prop_assert!((got.start - start).abs() < 1e-12);
        prop_assert_eq!(got.samples[0].len(), n);
        for (x, y) in a.iter().zip(&got.samples[0]) {
            prop_assert!((1e3 * x - y).abs() <= 1e-9);
        }
        for (x, y) in b.iter().zip(&got.samples[1]) {
            prop_assert!((6_894.757_293_168_36 * x / y - 1.0).abs() < 1e-12);
        }
        prop_assert_eq!(got.notes.len(), usize::from(style.comment));
        prop_assert!(got.warnings.is_empty(), "{:?}", got.warnings);
    }

    #[test]
    fn a_stretch_is_the_part_of_the_whole(from in 0.0..2.0_f64, length in 0.1..2.0_f64) {
        let (a, b) = (noise(4000, 3), noise(4000, 4));
        let style = Style { delimiter: ',', comma: false, units: 0, time: true, quoted: false, crlf: false, comment: false, };
        let text = written(&style, 1000.0, &a, &b);
        let (from, to) = ((from * 1e3).round() / 1e3 + 0.25, ((from + length) * 1e3).round() / 1e3 + 0.25);
        let asked = Asked { span: Some((from, to)), ..Asked::default() };
        let part = read_as(text.as_bytes(), &asked).unwrap();
        let first = ((from - 0.25) * 1000.0).round() as usize;
        let last = ((to - 0.25) * 1000.0).round() as usize;
        prop_assert!((part.start - from).abs() < 1e-9);
        prop_assert_eq!(part.samples[0].len(), last.min(4000) - first);
        prop_assert!((part.samples[0][0] - 1e3 * a[first]).abs() < 1e-9);
    }
}

#[test]
fn names_on_the_command_line_stand_for_a_header() {
    let text: String = (0..50).map(|i| format!("{}.5,{},9\n", i, 2 * i)).collect();
    let asked = |names: &str| Asked {
        names: Some(names.to_owned()),
        rate_hz: Some(100.0),
        ..Asked::default()
    };
    let got = read_as(text.as_bytes(), &asked("p1 [Pa], u [m/s], -")).unwrap();
    assert_eq!(got.names, ["p1", "u"]);
    assert_eq!((got.samples[0][3], got.samples[1][3]), (3.5, 6.0));
    let told = read_as(text.as_bytes(), &asked("p1 [Pa], u [m/s]")).unwrap_err();
    assert!(
        told.to_string().contains("names 2 where the file has 3"),
        "{told}"
    );
    let told = read(text.as_bytes()).unwrap_err();
    assert!(told.to_string().contains("--names"), "{told}");
}

#[test]
fn a_calibration_turns_volts_into_pascal() {
    let text: String = (0..50)
        .map(|i| format!("{},{}\n", f64::from(i) * 0.01, f64::from(i) * 0.1))
        .collect();
    let text = format!("t,mic [mV]\n{text}");
    let calibrations =
        ["mic = 80 mV/Pa"].map(|c| stillflame::measured::reading::unit::calibration(c).unwrap());
    let asked = Asked {
        calibrations: calibrations.to_vec(),
        ..Asked::default()
    };
    let got = read_as(text.as_bytes(), &asked).unwrap();
    assert!((got.samples[0][10] - 1.0 / 80.0).abs() < 1e-12);
    // Already in a unit of its own: a calibration contradicts it.
    let told = read_as(text.replace("mV", "Pa").as_bytes(), &asked).unwrap_err();
    assert!(
        told.to_string()
            .contains("which the calibration does not take"),
        "{told}"
    );
}

#[test]
fn a_column_of_frequency_makes_a_spectrum() {
    let rows: String = (0..400)
        .map(|i| {
            let f = f64::from(i);
            let density = 25.0 / ((f - 120.0).powi(2) + 25.0) + 1e-4;
            format!(
                "{f},{density},{}\n",
                20.0 * (density.sqrt() / 20e-6).log10()
            )
        })
        .collect();
    let text = format!("f [Hz],p1 [Pa^2/Hz],p2 [dB re 20 uPa]\n{rows}");
    let file = file(text.as_bytes());
    let Ok(Opened::Spectrum(spectrum)) = open(file.path(), &Asked::default()) else {
        panic!("no spectrum");
    };
    assert_eq!(spectrum.frequency.len(), 400);
    assert_eq!(spectrum.columns[0].line, Line::Density);
    assert_eq!(spectrum.columns[1].line, Line::Rms);
    for (a, b) in spectrum.columns[0]
        .values
        .iter()
        .zip(&spectrum.columns[1].values)
    {
        assert!((a.sqrt() / b - 1.0).abs() < 1e-9);
    }
}
