//! `spectrum` of the real binary: what it tells of a synthetic record, in words and in JSON, its files, and its exit codes.

use std::f64::consts::TAU;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use serde_json::Value;

const RATE: f64 = 2048.0;

/// Deviates of mean zero and unit variance, normal by the central limit of twelve uniform ones.
fn deviate(rng: &mut fastrand::Rng) -> f64 {
    (0..12).map(|_| rng.f64()).sum::<f64>() - 6.0
}

/// Two microphones: a resonance at 180 Hz with a decay rate of 20 1/s, driven by noise, and a cycle at 310 Hz that the
/// second hears half as loud and a quarter of a period late.
fn record(folder: &Path, seconds: f64) -> PathBuf {
    record_of(folder, seconds, 1.0)
}

/// The same with a cycle that wanders more or less.
fn record_of(folder: &Path, seconds: f64, wander: f64) -> PathBuf {
    let mut rng = fastrand::Rng::with_seed(7);
    let (nu, f) = (20.0_f64, 180.0);
    let a = (-nu / RATE).exp();
    let (c, s) = ((TAU * f / RATE).cos() * a, (TAU * f / RATE).sin() * a);
    let (mut x, mut y, mut drift) = (0.0, 0.0, 0.0);
    let kick = (1.0 - a * a).sqrt() * 30.0;
    let mut text =
        String::from("# SYNTHETIC record of two microphones\ntime [s],p1 [Pa],p2 [Pa]\n");
    for i in 0..(seconds * RATE) as usize {
        (x, y) = (
            c * x - s * y + kick * deviate(&mut rng),
            s * x + c * y + kick * deviate(&mut rng),
        );
        let t = i as f64 / RATE;
        // A line 0.1 Hz wide: the phase of a cycle wanders.
        drift += (0.6 / RATE * wander).sqrt() * deviate(&mut rng);
        let phase = TAU * 310.0 * t + drift;
        let p1 = x + 100.0 * phase.cos() + 0.5 * deviate(&mut rng);
        let p2 = x + 50.0 * phase.sin() + 0.5 * deviate(&mut rng);
        text += &format!("{t:.8},{p1:.4},{p2:.4}\n");
    }
    let path = folder.join("run.csv");
    std::fs::write(&path, text).unwrap();
    path
}

fn stillflame(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_stillflame"))
        .arg("spectrum")
        .args(arguments)
        .output()
        .unwrap()
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).unwrap()
}

fn json(arguments: &[&str]) -> (Value, Option<i32>) {
    let ran = stillflame(&[arguments, &["--json"]].concat());
    let value = serde_json::from_slice(&ran.stdout);
    (
        value.unwrap_or_else(|e| panic!("{e}: {}", text(&ran.stderr))),
        ran.status.code(),
    )
}

#[test]
fn a_record_is_told_in_words_files_and_json() {
    let folder = tempfile::tempdir().unwrap();
    let path = record(folder.path(), 40.0);
    let out = folder.path().join("out");
    let arguments = [path.to_str().unwrap(), "--frequency", "50 to 600 Hz"];
    let (value, code) = json(&arguments);
    assert_eq!(code, Some(0));
    assert_eq!(value["schema"], "stillflame/spectrum");
    assert_eq!(value["record"]["rate_hz"], RATE);
    assert_eq!(value["record"]["samples"], 40 * 2048);
    for (i, loud) in [(0, 1.0), (1, 0.5)] {
        let peaks = value["channels"][i]["peaks"].as_array().unwrap();
        assert_eq!(peaks.len(), 2, "{peaks:#?}");
        let of = |k: usize, field: &str, end: &str| peaks[k][field][end].as_f64().unwrap();
        assert!((of(0, "frequency_hz", "value") - 180.0).abs() < 1.0);
        // 95 % each; the seed is fixed, and twice the half width is left.
        let (low, high) = (
            of(0, "decay_rate_per_s", "low"),
            of(0, "decay_rate_per_s", "high"),
        );
        let room = 0.5 * (high - low);
        assert!(low - room < 20.0 && 20.0 < high + room, "{low} {high}");
        assert_eq!(peaks[0]["evidence"]["verdict"], "resonance driven by noise");
        assert!((of(1, "frequency_hz", "value") - 310.0).abs() < 0.2);
        let rms = 100.0 * loud / 2f64.sqrt();
        assert!(
            (of(1, "rms", "value") / rms - 1.0).abs() < 0.1,
            "{}",
            of(1, "rms", "value")
        );
        assert_eq!(peaks[1]["evidence"]["verdict"], "self-sustained cycle");
    }
    let cycle = &value["pairs"][0]["at_peaks"][1];
    assert!(cycle["coherence"].as_f64().unwrap() > 0.99);
    assert!((cycle["phase_rad"]["value"].as_f64().unwrap() + TAU / 4.0).abs() < 0.05);
    assert!((cycle["gain"]["value"].as_f64().unwrap() - 0.5).abs() < 0.02);

    let ran = stillflame(&[&arguments[..], &["--out", out.to_str().unwrap()]].concat());
    let told = text(&ran.stdout);
    for words in [
        "Hann window",
        "95 % band",
        "self-sustained cycle",
        "SYNTHETIC",
        "Caution:",
    ] {
        assert!(told.contains(words), "{words}\n{told}");
    }
    let warnings = value["warnings"].as_array().unwrap();
    assert_eq!(told.matches("warning  `").count(), warnings.len(), "{told}");
    let mut files: Vec<String> = std::fs::read_dir(&out)
        .unwrap()
        .map(|f| f.unwrap().file_name().into_string().unwrap())
        .collect();
    files.sort();
    let want = [
        "coherence.svg",
        "peaks.csv",
        "spectra.csv",
        "spectra.svg",
        "spectrogram_p1.csv",
        "spectrogram_p1.svg",
        "spectrogram_p2.csv",
        "spectrogram_p2.svg",
    ];
    assert_eq!(files, want.map(|f| format!("run_{f}")));
    for svg in files.iter().filter(|f| f.ends_with(".svg")) {
        let drawn = std::fs::read_to_string(out.join(svg)).unwrap();
        assert!(roxmltree::Document::parse(&drawn).is_ok(), "{svg}");
        assert!(drawn.len() < 200_000, "{svg}: {}", drawn.len());
    }
    let spectra = std::fs::read_to_string(out.join("run_spectra.csv")).unwrap();
    let bins = value["frequency_hz"].as_array().unwrap().len();
    assert_eq!(spectra.lines().count(), bins + 1);
}

/// A tone without any noise of its own, as of a siren, has no width: either its amplitude is right, or that it is not is said.
#[test]
fn a_pure_tone_has_its_amplitude() {
    let folder = tempfile::tempdir().unwrap();
    let path = record_of(folder.path(), 40.0, 0.0);
    let (value, code) = json(&[path.to_str().unwrap(), "--frequency", "50 to 600 Hz"]);
    assert_eq!(code, Some(0));
    let peaks = value["channels"][0]["peaks"].as_array().unwrap();
    let rms = peaks[1]["rms"]["value"].as_f64().unwrap() * 2f64.sqrt() / 100.0;
    // Amplitude by the bins about it: the fit of a noisy line is not asked.
    assert!((rms - 1.0).abs() < 0.005, "{rms} {value:#}");
}

/// Noise clipped hard has a steady envelope and must not pass for a cycle.
#[test]
fn a_clipped_channel_is_not_weighed() {
    let folder = tempfile::tempdir().unwrap();
    let path = record(folder.path(), 20.0);
    let text = std::fs::read_to_string(&path).unwrap();
    let clipped = text.lines().map(|line| match line.split_once(',') {
        Some((t, rest)) if !line.starts_with(['#', 't']) => {
            let (p1, p2) = rest.split_once(',').unwrap();
            let p1: f64 = p1.parse().unwrap();
            format!("{t},{},{p2}\n", p1.clamp(-40.0, 40.0))
        }
        _ => format!("{line}\n"),
    });
    std::fs::write(&path, clipped.collect::<String>()).unwrap();
    let (value, code) = json(&[path.to_str().unwrap(), "--frequency", "50 to 600 Hz"]);
    assert_eq!(code, Some(0));
    assert!(value["channels"][0]["clipped_samples"].as_u64().unwrap() > 1000);
    for peak in value["channels"][0]["peaks"].as_array().unwrap() {
        assert!(peak["evidence"].is_null(), "{peak}");
    }
    assert!(value["channels"][1]["peaks"][1]["evidence"]["verdict"] == "self-sustained cycle");
    let told = value["warnings"].to_string();
    assert!(
        told.contains("is clipped") && told.contains("upper limit 40"),
        "{told}"
    );
}

/// Noise alone, clipped anywhere from where it hardly matters to where little is left: no level makes a cycle of it, and where no verdict is given the
/// reason is.
#[test]
fn noise_clipped_at_any_level_is_no_cycle() {
    let folder = tempfile::tempdir().unwrap();
    let (nu, f) = (20.0_f64, 180.0);
    let a = (-nu / RATE).exp();
    let (c, s) = ((TAU * f / RATE).cos() * a, (TAU * f / RATE).sin() * a);
    let kick = (1.0 - a * a).sqrt();
    for (i, level) in [0.1, 0.3, 0.6, 1.0, 1.5, 2.0, 2.5, 3.0, 3.5, 4.5]
        .into_iter()
        .enumerate()
    {
        let mut rng = fastrand::Rng::with_seed(70 + i as u64);
        let (mut x, mut y) = (0.0, 0.0);
        let mut text = String::from("time [s],p1 [Pa]\n");
        for i in 0..(30.0 * RATE) as usize {
            (x, y) = (
                c * x - s * y + kick * deviate(&mut rng),
                s * x + c * y + kick * deviate(&mut rng),
            );
            let p: f64 = x + 0.02 * deviate(&mut rng);
            text += &format!("{:.8},{:.5}\n", i as f64 / RATE, p.clamp(-level, level));
        }
        let path = folder.path().join("run.csv");
        std::fs::write(&path, text).unwrap();
        let (value, code) = json(&[path.to_str().unwrap(), "--frequency", "50 to 600 Hz"]);
        assert_eq!(code, Some(0));
        let peaks = value["channels"][0]["peaks"].as_array().unwrap();
        assert!(!peaks.is_empty(), "{level}");
        for peak in peaks {
            let verdict = &peak["evidence"]["verdict"];
            assert_ne!(verdict, "self-sustained cycle", "{level} {peak}");
        }
        if peaks.iter().any(|p| p["evidence"].is_null()) {
            assert!(
                value["warnings"].to_string().contains("is clipped"),
                "{level}"
            );
            let told = text_of(&path);
            assert!(
                told.contains("not weighed: ") && told.contains("clipped"),
                "{told}"
            );
        }
    }
}

fn text_of(path: &Path) -> String {
    text(&stillflame(&[path.to_str().unwrap(), "--frequency", "50 to 600 Hz"]).stdout)
}

/// What comes by a pipe is read as from a file, whatever its format.
#[test]
fn a_record_may_come_by_a_pipe() {
    let folder = tempfile::tempdir().unwrap();
    let csv = record(folder.path(), 6.0);
    let wav = Path::new(env!("CARGO_MANIFEST_DIR")).join("examples/records/swirl_rig.wav");
    let names = [
        "--names",
        "p1, p2",
        "--calibration",
        "p1 = 1 kPa",
        "--calibration",
        "p2 = 1 kPa",
    ];
    for (path, more) in [(csv.as_path(), &names[..0]), (wav.as_path(), &names[..])] {
        let ask = |name: &str, input: Option<&Path>| {
            let mut command = Command::new(env!("CARGO_BIN_EXE_stillflame"));
            command.args(["spectrum", name, "--json"]).args(more);
            let mut child = command
                .stdin(std::process::Stdio::piped())
                .stdout(std::process::Stdio::piped())
                .spawn()
                .unwrap();
            let mut pipe = child.stdin.take().unwrap();
            let bytes = input.map(|p| std::fs::read(p).unwrap());
            let writer = std::thread::spawn(move || {
                use std::io::Write;
                if let Some(bytes) = bytes {
                    pipe.write_all(&bytes).unwrap();
                }
            });
            let output = child.wait_with_output().unwrap();
            writer.join().unwrap();
            assert!(output.status.success(), "{name}");
            serde_json::from_slice::<Value>(&output.stdout).unwrap()
        };
        let want = ask(path.to_str().unwrap(), None);
        for (name, told) in [("-", "standard input"), ("/dev/stdin", "/dev/stdin")] {
            let mut got = ask(name, Some(path));
            assert_eq!(got["record"]["file"], told);
            got["record"]["file"] = want["record"]["file"].clone();
            assert_eq!(got, want, "{name}");
        }
    }
    let empty = stillflame(&["-"]);
    assert!(!empty.status.success());
}

/// A recess as in a closed quarter-wave line: the amplitudes of the wall are lower than those of the sensor.
#[test]
fn a_recess_of_the_network_is_taken_out() {
    let folder = tempfile::tempdir().unwrap();
    let path = record(folder.path(), 10.0);
    let shipped = Path::new(env!("CARGO_MANIFEST_DIR")).join("networks/swirl_rig.toml");
    let plain = std::fs::read_to_string(shipped).unwrap();
    let recessed = plain.replacen(
        "element  = \"plenum\"\n",
        "element  = \"plenum\"\nrecess_length = \"120 mm\"\nrecess_diameter = \"8 mm\"\nrecess_temperature = \"300 K\"\n",
        1,
    );
    let of = |network: &str| {
        let file = folder.path().join("rig.toml");
        std::fs::write(&file, network).unwrap();
        let arguments = [
            path.to_str().unwrap(),
            "--network",
            file.to_str().unwrap(),
            "--frequency",
            "50 to 600 Hz",
        ];
        let (value, code) = json(&arguments);
        assert_eq!(code, Some(0));
        assert_eq!(value["channels"][0]["sensor"]["element"], "plenum");
        value["channels"][0]["peaks"][1]["rms"]["value"]
            .as_f64()
            .unwrap()
    };
    // sqrt(gamma R T) of dry air at 300 K is 347.2 m/s.
    let want = (TAU * 310.0 * 0.12 / 347.2).cos();
    let got = of(&recessed) / of(&plain);
    assert!((got / want - 1.0).abs() < 0.03, "{got} {want}");
}

#[test]
fn a_transducer_response_is_taken_out() {
    let folder = tempfile::tempdir().unwrap();
    let path = record(folder.path(), 10.0);
    let table = folder.path().join("p1.csv");
    std::fs::write(
        &table,
        "frequency [Hz],gain [dB],phase [deg]\n10,6.0206,0\n1000,6.0206,-90\n",
    )
    .unwrap();
    let arguments = [path.to_str().unwrap(), "--frequency", "50 to 600 Hz"];
    let given = format!("p1 = {}", table.display());
    let (plain, _) = json(&arguments);
    let (told, code) = json(&[&arguments[..], &["--transducer", &given]].concat());
    assert_eq!(code, Some(0));
    let rms = |v: &Value| {
        v["channels"][0]["peaks"][1]["rms"]["value"]
            .as_f64()
            .unwrap()
    };
    assert!((rms(&told) / rms(&plain) - 0.5).abs() < 1e-3);
    let phase = |v: &Value| {
        v["pairs"][0]["at_peaks"][1]["phase_rad"]["value"]
            .as_f64()
            .unwrap()
    };
    // p1 was heard 90 deg (310 - 10)/990 late, so p2 lags the true p1 by as much more.
    let late = TAU / 4.0 * 300.0 / 990.0;
    assert!(
        (phase(&plain) - phase(&told) - late).abs() < 0.01,
        "{} {}",
        phase(&plain),
        phase(&told)
    );
}

#[test]
fn wrong_usage_and_wrong_records_have_their_own_codes() {
    let folder = tempfile::tempdir().unwrap();
    let path = record(folder.path(), 3.0);
    let run = path.to_str().unwrap();
    let short = folder.path().join("short.csv");
    std::fs::write(&short, "t,p [Pa]\n0,1\n0.1,2\n0.2,1\n").unwrap();
    let cases: &[(&[&str], i32, &str)] = &[
        (
            &[run, "--calibration", "p9 = 3 Pa"],
            2,
            "no channel is named `p9`",
        ),
        (
            &[run, "--calibration", "p1 = 3"],
            2,
            "no unit of a calibration",
        ),
        (&[run, "--rate", "0 Hz"], 2, "above zero"),
        (
            &[run, "--names", "a [Pa]"],
            2,
            "names 1 where the file has 3",
        ),
        (
            &[run, "--frequency", "5000 to 6000 Hz"],
            2,
            "holds nothing above",
        ),
        (&[run, "--bin-width", "4 kHz"], 2, "make no segment"),
        (
            &[run, "--transducer", "p9 = x.csv"],
            2,
            "no channel is named `p9`",
        ),
        (&[run, "--set", "chamber.length = 1 m"], 2, "--network"),
        (&[run, "--rate", "4096 Hz"], 1, "--rate says"),
        (&[run, "--span", "50 to 60 s"], 1, "too short"),
        (
            &[run, "--transducer", "p1 = absent.csv"],
            1,
            "cannot be read",
        ),
        (&[run, "--network", "absent.toml"], 1, "no such file"),
        (&["absent.csv"], 1, "no such file"),
        (&[short.to_str().unwrap()], 1, "too short"),
    ];
    for (arguments, code, words) in cases {
        let ran = stillflame(arguments);
        let told = text(&ran.stderr);
        assert_eq!(ran.status.code(), Some(*code), "{arguments:?}\n{told}");
        let joined = told.split_whitespace().collect::<Vec<_>>().join(" ");
        let (joined, words) = (joined.to_lowercase(), words.to_lowercase());
        assert!(joined.contains(&words), "{arguments:?}\n{told}");
        assert!(ran.stdout.is_empty());
        let (value, again) = json(arguments);
        assert_eq!(again, Some(*code));
        assert_eq!(value["schema"], "stillflame/problems");
        assert!(!value["problems"].as_array().unwrap().is_empty());
    }
}

#[test]
fn a_spectrum_alone_gives_its_maxima() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("lines.csv");
    let rows: String = (0..800)
        .map(|i| {
            let f = 0.5 * f64::from(i);
            format!("{f},{}\n", 9.0 / ((f - 140.0).powi(2) + 9.0) + 1e-4)
        })
        .collect();
    std::fs::write(&path, format!("frequency [Hz],p [kPa^2/Hz]\n{rows}")).unwrap();
    let (value, code) = json(&[path.to_str().unwrap()]);
    assert_eq!(
        (code, value["schema"].as_str()),
        (Some(0), Some("stillflame/spectrum-lines"))
    );
    let maxima = value["maxima"].as_array().unwrap();
    assert_eq!(maxima.len(), 1);
    assert!((maxima[0]["frequency_hz"].as_f64().unwrap() - 140.0).abs() < 0.1);
    assert!((maxima[0]["width_hz"].as_f64().unwrap() - 6.0).abs() < 0.05);
    // Area under the resonance: pi times half width, in kPa^2.
    let rms = (std::f64::consts::PI * 3.0).sqrt() * 1e3;
    assert!((maxima[0]["rms"].as_f64().unwrap() / rms - 1.0).abs() < 0.02);
}
