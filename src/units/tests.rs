use proptest::prelude::*;

use super::super::{Dimension, parse, parse_span, write, write_rounded};
use super::*;

/// Factors from definitions; psi, degF and lb/h from NIST SP 811 (2008), appendix B.8 (from memory).
#[test]
fn units_have_their_defined_size() {
    for (text, dimension, si) in [
        ("0.5 m", Dimension::Length, 0.5),
        ("120 mm", Dimension::Length, 0.12),
        ("3 ms", Dimension::Time, 0.003),
        ("3 µs", Dimension::Time, 3e-6),
        ("1 in", Dimension::Length, 0.0254),
        ("3 ft", Dimension::Length, 0.9144),
        ("1 in²", Dimension::Area, 6.4516e-4),
        ("50 cm^2", Dimension::Area, 0.005),
        ("7 mm2", Dimension::Area, 7e-6),
        ("2.5 L", Dimension::Volume, 0.0025),
        ("430 degC", Dimension::Temperature, 703.15),
        ("0.1 °C", Dimension::Temperature, 273.25),
        ("32 degF", Dimension::Temperature, 273.15),
        ("1 atm", Dimension::Pressure, 101_325.0),
        ("1013.25 mbar", Dimension::Pressure, 101_325.0),
        ("1013.25 hPa", Dimension::Pressure, 101_325.0),
        ("3.2 bar", Dimension::Pressure, 320_000.0),
        ("30 g/s", Dimension::MassFlow, 0.03),
        ("1 lb/s", Dimension::MassFlow, 0.453_592_37),
        ("3600 kg/h", Dimension::MassFlow, 1.0),
        ("36 km/h", Dimension::Velocity, 10.0),
        ("0.8 kHz", Dimension::Frequency, 800.0),
        ("-300 1/s", Dimension::Rate, -300.0),
        ("0.3 1/ms", Dimension::Rate, 300.0),
        ("180 deg", Dimension::Angle, std::f64::consts::PI),
        ("287 J/(kg K)", Dimension::SpecificGasConstant, 287.0),
        ("0.287 kJ/(kg·K)", Dimension::SpecificGasConstant, 287.0),
        ("28.96 g/mol", Dimension::MolarMass, 0.02896),
        ("28.96 kg/kmol", Dimension::MolarMass, 0.02896),
        ("-0.9", Dimension::Number, -0.9),
        ("5mm", Dimension::Length, 0.005),
        ("1e-1 m", Dimension::Length, 0.1),
    ] {
        assert_eq!(parse(text, dimension), Ok(si), "{text}");
    }
    let cold = parse("\u{2212}40 °F", Dimension::Temperature).unwrap();
    assert!((cold - 233.15).abs() < 1e-12, "{cold}");
    let psi = parse("1 psi", Dimension::Pressure).unwrap();
    assert!((psi - 6_894.757_293_168_361).abs() < 1e-9, "{psi}");
    let pound_hour = parse("1 lb/h", Dimension::MassFlow).unwrap();
    assert!(
        (pound_hour / 1.259_979e-4 - 1.0).abs() < 1e-6,
        "{pound_hour}"
    );
}

#[test]
fn each_mistake_has_its_own_error() {
    use QuantityError as E;
    let length = |t: &str| parse(t, Dimension::Length).unwrap_err();
    assert!(matches!(length(" "), E::Empty { .. }));
    assert!(matches!(length("half a metre"), E::NotANumber { .. }));
    assert!(matches!(length("1.2.3 m"), E::NotANumber { .. }));
    assert!(matches!(length("1 2 m"), E::NotANumber { .. }));
    assert!(matches!(length("0,5 m"), E::Comma { .. }));
    assert!(matches!(length("nan m"), E::NotFinite { .. }));
    assert!(matches!(length("-inf m"), E::NotFinite { .. }));
    assert!(matches!(length("1e400 m"), E::TooLarge { .. }));
    assert!(matches!(
        length("1e99999999999999999999 m"),
        E::TooLarge { .. }
    ));
    assert!(matches!(length("1e-400 m"), E::TooSmall { .. }));
    assert!(matches!(length("0.5"), E::MissingUnit { .. }));
    assert!(matches!(
        length("0.5 ms"),
        E::WrongDimension {
            found: Dimension::Time,
            ..
        }
    ));
    assert!(matches!(
        length("0.5 MM"),
        E::UnknownUnit {
            meant: Some("mm"),
            ..
        }
    ));
    assert!(matches!(
        length("0.5 furlong"),
        E::UnknownUnit { meant: None, .. }
    ));
    let temperature = parse("20 C", Dimension::Temperature).unwrap_err();
    assert!(matches!(
        temperature,
        E::UnknownUnit {
            meant: Some("degC"),
            ..
        }
    ));
    let number = parse("0.5 m", Dimension::Number).unwrap_err();
    assert!(matches!(number, E::UnwantedUnit { .. }));
    assert_eq!(number.hint(), "write `0.5` alone");
    assert!(matches!(
        parse_span("20 Hz", Dimension::Frequency).unwrap_err(),
        E::NotASpan { .. }
    ));
}

#[test]
fn spans_share_or_carry_units() {
    let frequency = |t: &str| parse_span(t, Dimension::Frequency);
    assert_eq!(frequency("20 to 800 Hz"), Ok((20.0, 800.0)));
    assert_eq!(frequency("20 Hz to 0.8 kHz"), Ok((20.0, 800.0)));
    assert_eq!(
        parse_span("-300 to 300 1/s", Dimension::Rate),
        Ok((-300.0, 300.0))
    );
    assert_eq!(parse_span("0 to 2", Dimension::Number), Ok((0.0, 2.0)));
    assert!(matches!(
        frequency("20 to 800"),
        Err(QuantityError::MissingUnit { .. })
    ));
    assert!(matches!(
        frequency("20 m to 800 Hz"),
        Err(QuantityError::WrongDimension { .. })
    ));
}

#[test]
fn written_quantities_read_well() {
    for (si, dimension, text) in [
        (0.003, Dimension::Time, "3 ms"),
        (0.0005, Dimension::Time, "0.5 ms"),
        (0.7, Dimension::Length, "700 mm"),
        (12.5, Dimension::Length, "12.5 m"),
        (0.0, Dimension::Length, "0 m"),
        (101_325.0, Dimension::Pressure, "101.325 kPa"),
        (0.03, Dimension::MassFlow, "30 g/s"),
        (-300.0, Dimension::Rate, "-300 1/s"),
        (0.02896, Dimension::MolarMass, "28.96 g/mol"),
        (std::f64::consts::PI / 6.0, Dimension::Angle, "30 deg"),
        (1e-30, Dimension::Number, "1e-30"),
    ] {
        assert_eq!(write(si, dimension), text);
    }
    assert_eq!(
        write_rounded(0.005_026_548_245_743_669, Dimension::Area, 4),
        "50.27 cm^2"
    );
}

fn any_dimension() -> impl Strategy<Value = Dimension> {
    prop::sample::select(Dimension::ALL.to_vec())
}

proptest! {
    #[test]
    fn what_is_written_reads_back_exactly(value in prop::num::f64::NORMAL, d in any_dimension()) {
        // The margin leaves room for the factor of the largest unit printed in.
        prop_assume!(value.abs() < 1e300 && value.abs() > 1e-300);
        let text = write(value, d);
        prop_assert_eq!(parse(&text, d), Ok(value), "{}", text);
    }

    #[test]
    fn powers_of_ten_round_once(whole in -99_999i64..99_999, places in 0usize..12, d in any_dimension()) {
        let digits = format!("{whole}.{:0places$}1", 0);
        for unit in table::units(d) {
            if unit.multiplier == 1 && unit.over == 1.0 && unit.shift_hundredths == 0 {
                let once: f64 = format!("{digits}e{}", unit.exponent).parse().unwrap();
                prop_assert_eq!(parse(&format!("{digits} {}", unit.name), d), Ok(once));
            }
        }
    }

    #[test]
    fn celsius_and_inches_round_once(hundredths in -27_000i64..300_000) {
        let text = |n: i64| format!("{}{}.{:02}", if n < 0 { "-" } else { "" }, n.abs() / 100, n.abs() % 100);
        let kelvin: f64 = text(hundredths + 27_315).parse().unwrap();
        prop_assert_eq!(parse(&format!("{} degC", text(hundredths)), Dimension::Temperature), Ok(kelvin));
        let metres: f64 = format!("{}e-6", hundredths * 254).parse().unwrap();
        prop_assert_eq!(parse(&format!("{} in", text(hundredths)), Dimension::Length), Ok(metres));
    }

    #[test]
    fn no_text_panics(text in "\\PC{0,24}", d in any_dimension()) {
        if let Err(e) = parse(&text, d) {
            prop_assert!(!e.to_string().is_empty() && !e.hint().is_empty());
        }
        let _ = parse_span(&text, d);
    }
}
