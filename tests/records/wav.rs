//! WAV files, written by a general-purpose library (hound) and, for what it does not write, byte by byte.

use std::io::Cursor;

use hound::{SampleFormat, WavSpec, WavWriter};
use proptest::prelude::*;
use stillflame::measured::reading::Asked;
use stillflame::measured::reading::unit::calibration;

use crate::{noise, read_as};

pub fn asked(channels: usize, full_scale: &str) -> Asked {
    let names: Vec<String> = (1..=channels).map(|i| format!("p{i}")).collect();
    Asked {
        calibrations: names
            .iter()
            .map(|n| calibration(&format!("{n} = {full_scale}")).unwrap())
            .collect(),
        names: Some(names.join(",")),
        ..Asked::default()
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(48))]

    #[test]
    fn what_the_library_writes_is_read(bits in prop::sample::select(vec![8_u16, 16, 24, 32]), channels in 1..5_u16, n in 30..9000_usize, seed in any::<u64>()) {
        let spec = WavSpec { channels, sample_rate: 25_600, bits_per_sample: bits, sample_format: SampleFormat::Int };
        let mut bytes = Cursor::new(Vec::new());
        let mut writer = WavWriter::new(&mut bytes, spec).unwrap();
        let scale = 2f64.powi(i32::from(bits) - 1);
        let whole: Vec<i32> = noise(n * usize::from(channels), seed).iter().map(|x| (x / 10.5 * scale) as i32).collect();
        for x in &whole {
            writer.write_sample(*x).unwrap();
        }
        writer.finalize().unwrap();
        let got = read_as(bytes.get_ref(), &asked(channels.into(), "200 Pa")).unwrap();
        prop_assert_eq!((got.rate_hz, got.samples.len(), got.samples[0].len()), (25_600.0, usize::from(channels), n));
        for (i, x) in whole.iter().enumerate() {
            let (frame, channel) = (i / usize::from(channels), i % usize::from(channels));
            prop_assert_eq!(got.samples[channel][frame], f64::from(*x) / scale * 200.0);
        }
    }

    #[test]
    fn floats_of_the_library_are_read(n in 30..9000_usize, seed in any::<u64>()) {
        let spec = WavSpec { channels: 2, sample_rate: 8192, bits_per_sample: 32, sample_format: SampleFormat::Float };
        let mut bytes = Cursor::new(Vec::new());
        let mut writer = WavWriter::new(&mut bytes, spec).unwrap();
        let values: Vec<f32> = noise(2 * n, seed).iter().map(|x| *x as f32).collect();
        for x in &values {
            writer.write_sample(*x).unwrap();
        }
        writer.finalize().unwrap();
        let got = read_as(bytes.get_ref(), &asked(2, "1 Pa")).unwrap();
        for (i, x) in values.iter().enumerate() {
            prop_assert_eq!(got.samples[i % 2][i / 2], f64::from(*x));
        }
    }
}

/// A file of doubles in either byte order, with lengths of 32 or 64 bits.
pub fn doubles(values: &[f64], big: bool, long: bool) -> Vec<u8> {
    let small = |x: u32| {
        if big {
            x.to_be_bytes()
        } else {
            x.to_le_bytes()
        }
    };
    let short = |x: u16| {
        if big {
            x.to_be_bytes()
        } else {
            x.to_le_bytes()
        }
    };
    let size = u32::try_from(8 * values.len()).unwrap();
    let mut out = Vec::new();
    out.extend(if long {
        b"RF64"
    } else if big {
        b"RIFX"
    } else {
        b"RIFF"
    });
    out.extend(small(if long { u32::MAX } else { size + 36 }));
    out.extend(b"WAVE");
    if long {
        out.extend(b"ds64");
        out.extend(small(28));
        out.extend((u64::from(size) + 72).to_le_bytes());
        out.extend(u64::from(size).to_le_bytes());
        out.extend([0; 12]);
    }
    out.extend(b"fmt ");
    out.extend(small(16));
    out.extend(short(3));
    out.extend(short(1));
    out.extend(small(1000));
    out.extend(small(8000));
    out.extend(short(8));
    out.extend(short(64));
    out.extend(b"data");
    out.extend(small(if long { u32::MAX } else { size }));
    for x in values {
        out.extend(if big {
            x.to_be_bytes()
        } else {
            x.to_le_bytes()
        });
    }
    out
}

#[test]
fn doubles_in_either_order_and_length_come_out_exactly() {
    let values = noise(3000, 5);
    for (big, long) in [(false, false), (true, false), (false, true)] {
        let got = read_as(&doubles(&values, big, long), &asked(1, "1 Pa")).unwrap();
        assert_eq!(got.samples[0], values, "{big} {long}");
        assert!(got.warnings.is_empty());
    }
}

#[test]
fn volts_need_a_full_scale() {
    let bytes = doubles(&noise(300, 6), false, false);
    let mut asked = asked(1, "12.5 Pa/V");
    let told = read_as(&bytes, &asked).unwrap_err();
    assert!(told.to_string().contains("--full-scale"), "{told}");
    asked.full_scale = Some(10.0);
    let got = read_as(&bytes, &asked).unwrap();
    assert!((got.samples[0][7] / noise(300, 6)[7] - 125.0).abs() < 1e-9);
    let told = read_as(&bytes, &Asked::default()).unwrap_err();
    assert!(told.to_string().contains("without a unit"), "{told}");
}

#[test]
fn what_is_cut_or_in_the_wrong_order_is_said() {
    let values = noise(3000, 7);
    let bytes = doubles(&values, false, false);
    let cut = read_as(&bytes[..bytes.len() - 803], &asked(1, "1 Pa")).unwrap();
    assert_eq!(cut.samples[0], values[..2899]);
    assert!(cut.warnings[0].what.contains(
        "the file is cut: its head tells of 3000 samples in each channel, and 2899 are there"
    ));
    let head = read_as(&bytes[..30], &asked(1, "1 Pa")).unwrap_err();
    assert!(
        head.to_string().contains("ends before its samples begin"),
        "{head}"
    );
    let mut wrong = doubles(&values, true, false);
    let right = doubles(&values, false, false);
    let at = wrong.len() - 8 * values.len();
    wrong.splice(at.., right[at..].iter().copied());
    let told = read_as(&wrong, &asked(1, "1 Pa")).unwrap_err();
    assert!(
        told.to_string().contains("big-endian") && told.to_string().contains("other byte order"),
        "{told}"
    );
}
