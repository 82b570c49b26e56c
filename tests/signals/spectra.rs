//! Spectra against general-purpose libraries, and their uncertainties over many records.

use proptest::prelude::*;
use serde_json::{Value, json};
use stillflame::measured::{
    Detrend, Envelopes, Plan, Scaling, Spectra, Spectrogram, Welch, Window,
};

use crate::ground;

const RATE: f64 = 2048.0;

fn welch(plan: Plan, channels: &[&[f64]]) -> Spectra {
    let mut welch = Welch::of_all_pairs(plan, channels.len()).unwrap();
    welch.feed(channels).unwrap();
    welch.finish().unwrap()
}

fn plan(window: Window, segment: usize, overlap: usize, detrend: Detrend) -> Plan {
    Plan {
        rate_hz: RATE,
        segment,
        overlap,
        window,
        detrend,
    }
}

/// scipy.signal.welch 1.17.1, to 1e-10 of each value.
#[test]
fn welch_gives_what_scipy_gives() {
    let checks = ground::checks();
    let told = &checks["welch"];
    let x = ground::recipe(32_768);
    for (got, want) in x.iter().zip(told["x_first5"].as_array().unwrap()) {
        assert!((got - want.as_f64().unwrap()).abs() < 1e-14);
    }
    let hann = plan(Window::Hann, 1024, 512, Detrend::Constant);
    let boxcar = plan(Window::Boxcar, 1024, 0, Detrend::Nothing);
    let cases = [
        ("density", hann, Scaling::Density),
        ("spectrum", hann, Scaling::Spectrum),
        ("boxcar_density", boxcar, Scaling::Density),
    ];
    for (name, plan, scaling) in cases {
        let want = &told["results"][name];
        let spectra = welch(plan, &[&x]);
        let power = spectra.power(0, scaling);
        assert_eq!(power.len() as u64, want["nbins"].as_u64().unwrap());
        for (bin, pair) in want["bins"].as_object().unwrap() {
            let bin: usize = bin.parse().unwrap();
            let value = pair[1].as_f64().unwrap();
            assert_eq!(spectra.frequency(bin), pair[0].as_f64().unwrap());
            let off = (power[bin] / value - 1.0).abs();
            assert!(off < 1e-10, "{name}, bin {bin}: {off:.1e}");
        }
        let sum: f64 = power.iter().sum::<f64>() * 2.0;
        let value = want["sum_P_df"].as_f64().unwrap();
        assert!((sum / value - 1.0).abs() < 1e-10, "{name}");
        let segments = if plan.overlap > 0 {
            told["n_segments_50pct"].as_u64().unwrap()
        } else {
            32
        };
        assert_eq!(spectra.segments() as u64, segments);
    }
}

/// Writes spectra of two channels for `tests/yardstick/spectra.py`, which computes them with scipy.
#[test]
fn spectra_are_written_for_the_comparison_in_python() {
    let x = ground::recipe(32_768);
    let y = ground::second(&x);
    let mut cases: Vec<Value> = Vec::new();
    let plans = [
        (Window::Hann, "hann", 1024, 512, Detrend::Constant),
        (Window::Hann, "hann", 1000, 750, Detrend::Constant),
        (Window::Hann, "hann", 999, 333, Detrend::Nothing),
        (Window::Boxcar, "boxcar", 512, 0, Detrend::Nothing),
        (Window::Boxcar, "boxcar", 512, 100, Detrend::Constant),
        (Window::FlatTop, "flattop", 2048, 1536, Detrend::Constant),
        (Window::FlatTop, "flattop", 255, 127, Detrend::Constant),
    ];
    for (window, name, segment, overlap, detrend) in plans {
        let spectra = welch(plan(window, segment, overlap, detrend), &[&x, &y]);
        let cross = spectra.cross(0, 1).unwrap();
        let coherence: Vec<f64> = spectra
            .relation(0, 1)
            .unwrap()
            .iter()
            .map(|r| r.coherence)
            .collect();
        cases.push(json!({
            "window": name,
            "segment": segment,
            "overlap": overlap,
            "detrend": matches!(detrend, Detrend::Constant),
            "density": spectra.power(0, Scaling::Density),
            "spectrum": spectra.power(1, Scaling::Spectrum),
            "cross_re": cross.iter().map(|c| c.re).collect::<Vec<f64>>(),
            "cross_im": cross.iter().map(|c| c.im).collect::<Vec<f64>>(),
            "coherence": coherence,
        }));
    }
    let text = json!({ "rate_hz": RATE, "samples": 32_768, "cases": cases }).to_string();
    std::fs::write(ground::written("spectra.json"), text).unwrap();
}

proptest! {
    /// However a record is cut into blocks, the spectra are the same bits.
    #[test]
    fn blocks_do_not_matter(segment in 8..400_usize, part in 0.0..0.95_f64, cuts in prop::collection::vec(0..5000_usize, 0..6)) {
        let overlap = (segment as f64 * part) as usize;
        let plan = plan(Window::Hann, segment, overlap, Detrend::Constant);
        let x = ground::recipe(5000);
        let y = ground::second(&x);
        let whole = welch(plan, &[&x, &y]);
        let mut cuts = cuts;
        cuts.extend([0, 5000]);
        cuts.sort_unstable();
        let mut parts = Welch::of_all_pairs(plan, 2).unwrap();
        for pair in cuts.windows(2) {
            parts.feed(&[&x[pair[0]..pair[1]], &y[pair[0]..pair[1]]]).unwrap();
        }
        prop_assert_eq!(parts.finish().unwrap(), whole);
    }

    /// With a boxcar and nothing shared or taken out, the density adds up to the mean square.
    #[test]
    fn power_is_kept(segment in 8..200_usize, count in 1..20_usize) {
        let x = ground::recipe(segment * count);
        let spectra = welch(plan(Window::Boxcar, segment, 0, Detrend::Nothing), &[&x]);
        let sum: f64 = spectra.density(0).iter().sum::<f64>() * spectra.plan().bin_width();
        let square = x.iter().map(|x| x * x).sum::<f64>() / x.len() as f64;
        prop_assert!((sum / square - 1.0).abs() < 1e-12);
    }
}

#[test]
fn a_delay_is_a_phase() {
    let x: Vec<f64> = ground::recipe(65_536).iter().map(|x| x - 0.3).collect();
    let y = ground::second(&x);
    let spectra = welch(plan(Window::Hann, 256, 128, Detrend::Constant), &[&x, &y]);
    let relation = &spectra.relation(0, 1).unwrap()[25];
    let late = -std::f64::consts::TAU * spectra.frequency(25) * 3.0 / RATE;
    assert!((relation.phase - late).abs() < 5e-3, "{relation:?} {late}");
    assert!(relation.coherence > 0.99);
    let back = spectra.relation(1, 0).unwrap()[25];
    assert!((back.phase + relation.phase).abs() < 1e-12);
}

/// Of white noise, 95 % bands hold the true density, gain and phase about as often as they say, and the
/// random error is that of `1/sqrt(n_d)`.
#[test]
fn bands_hold_as_often_as_they_say() {
    let mut random = fastrand::Rng::with_seed(6);
    let (mut held, mut gains, mut phases, mut all) = (0, 0, 0, 0);
    let (mut squares, mut random_error) = (0.0, 0.0);
    for _ in 0..60 {
        let x: Vec<f64> = (0..8192)
            .map(|_| 3.0_f64.sqrt() * (2.0 * random.f64() - 1.0))
            .collect();
        let y: Vec<f64> = x
            .iter()
            .map(|x| 0.5 * x + 0.8 * (2.0 * random.f64() - 1.0))
            .collect();
        let spectra = welch(plan(Window::Hann, 256, 128, Detrend::Constant), &[&x, &y]);
        let truth = 2.0 / RATE;
        random_error = spectra.random_error();
        let relations = spectra.relation(0, 1).unwrap();
        for j in (4..124).step_by(4) {
            let (low, high) = spectra.band(j);
            let p = spectra.density(0)[j];
            held += i32::from(p * low <= truth && truth <= p * high);
            gains += i32::from(relations[j].gain().holds(0.5));
            phases += i32::from(relations[j].phase_interval().holds(0.0));
            squares += (p / truth - 1.0).powi(2);
            all += 1;
        }
    }
    let part = |n: i32| f64::from(n) / f64::from(all);
    assert!((part(held) - 0.95).abs() < 0.02, "{}", part(held));
    // The disc of the transfer function bounds gain and phase together: each holds more often.
    assert!(
        part(gains) > 0.95 && part(phases) > 0.95,
        "{} {}",
        part(gains),
        part(phases)
    );
    let measured = (squares / f64::from(all)).sqrt();
    assert!(
        (measured / random_error - 1.0).abs() < 0.05,
        "{measured} {random_error}"
    );
}

/// The random error measured over many records by the reference, within 5 %.
#[test]
fn random_error_is_that_measured() {
    let checks = ground::checks();
    for row in checks["random_error"]["montecarlo(K,measured,theory,1/sqrtK)"]
        .as_array()
        .unwrap()
    {
        let count = row[0].as_u64().unwrap() as usize;
        let x = ground::recipe(512 * (count + 1));
        let spectra = welch(plan(Window::Hann, 1024, 512, Detrend::Constant), &[&x]);
        assert_eq!(spectra.segments(), count);
        let measured = row[1].as_f64().unwrap();
        let theory = row[2].as_f64().unwrap();
        assert!((spectra.random_error() / measured - 1.0).abs() < 0.05);
        assert!((spectra.random_error() / theory - 1.0).abs() < 1e-10);
    }
}

#[test]
fn rows_of_a_spectrogram_average_to_the_spectrum() {
    let x = ground::recipe(20_480);
    let cut = plan(Window::Hann, 512, 0, Detrend::Constant);
    let mut rows = Spectrogram::new(cut, 1, 4).unwrap();
    for block in x.chunks(777) {
        rows.feed(&[block]).unwrap();
    }
    let rows = rows.finish().unwrap().remove(0);
    assert_eq!(rows.len(), 10);
    assert!((rows[1].time - (2048.0 + 1024.0) / RATE).abs() < 1e-12);
    let whole = welch(cut, &[&x]);
    for (j, want) in whole.density(0).iter().enumerate() {
        let mean = rows.iter().map(|r| r.density[j]).sum::<f64>() / 10.0;
        assert!((mean / want - 1.0).abs() < 1e-10);
    }
}

#[test]
fn envelopes_of_noise_and_of_a_tone_differ() {
    let mut random = fastrand::Rng::with_seed(2);
    let noise: Vec<f64> = (0..65_536).map(|_| random.f64() - 0.5).collect();
    let tone = ground::recipe(65_536);
    let mut envelopes = Envelopes::new(Plan::hann(RATE, 256), 2).unwrap();
    envelopes.feed(&[&noise, &tone]).unwrap();
    let told = envelopes.finish().unwrap();
    let (noise, tone) = (told[0][25], told[1][25]);
    assert!(
        (noise.ratio - 2.0).abs() < 0.25 && (noise.log_deficit + 0.577).abs() < 0.1,
        "{noise:?}"
    );
    assert!(
        (tone.ratio - 1.0).abs() < 0.01 && tone.log_deficit > -0.01,
        "{tone:?}"
    );
    assert!(tone.coherence > 0.99 && noise.coherence < 0.4);
}

#[test]
fn bad_plans_and_records_are_refused_in_words() {
    let refused = |p: Plan| Welch::new(p, 1, &[]).err().unwrap().to_string();
    let sound = Plan::hann(RATE, 1024);
    assert!(
        refused(Plan {
            rate_hz: 0.0,
            ..sound
        })
        .contains("sampling rate")
    );
    assert!(
        refused(Plan {
            segment: 4,
            overlap: 0,
            ..sound
        })
        .contains("too short")
    );
    assert!(
        refused(Plan {
            overlap: 1024,
            ..sound
        })
        .contains("overlap")
    );
    assert!(Welch::new(sound, 2, &[(0, 2)]).is_err());
    let mut welch = Welch::new(sound, 2, &[]).unwrap();
    assert!(welch.feed(&[&[0.0; 10]]).is_err());
    assert!(welch.feed(&[&[0.0; 10], &[0.0; 9]]).is_err());
    welch.feed(&[&[0.0; 1023], &[0.0; 1023]]).unwrap();
    let short = welch.finish().unwrap_err().to_string();
    assert!(short.contains("1023 samples"), "{short}");
    let mut welch = Welch::new(sound, 1, &[]).unwrap();
    welch.feed(&[&[f64::NAN; 2048]]).unwrap();
    assert!(
        welch
            .finish()
            .unwrap_err()
            .to_string()
            .contains("not finite")
    );
    assert!(Spectrogram::new(sound, 1, 0).is_err());
}
