//! Welch spectra of a long record here and by scipy, in one run on one machine.
//!
//! ```sh
//! cargo bench --bench beside_scipy -- target/yardstick-venv/bin/python
//! ```
//!
//! wants a Python with `tests/yardstick/requirements.txt` installed, as `.ci/run` leaves one. Four channels at 25.6 kHz,
//! six minutes unless `STILLFLAME_SECONDS` says otherwise: fed in blocks here, as arrays in memory to scipy, which runs on one
//! core. Before a ratio is printed both must agree to 1e-10.

use std::error::Error;
use std::path::Path;
use std::process::Command;
use std::time::Instant;

use serde::Deserialize;
use stillflame::measured::{Plan, Spectra, Welch};
use stillflame::problems::{Problem, Problems};

const RATE: f64 = 25_600.0;
const CHANNELS: usize = 4;
const SEGMENTS: [usize; 3] = [1024, 8192, 32_768];

/// What `spectra.py --time` prints for each segment length.
#[derive(Deserialize)]
struct Scipy {
    seconds: f64,
    density: Vec<f64>,
}

fn spectra(channels: &[Vec<f64>], segment: usize) -> Result<Spectra, Problem> {
    let count = channels[0].len();
    let mut welch = Welch::new(Plan::hann(RATE, segment), channels.len(), &[])?;
    for start in (0..count).step_by(1 << 16) {
        let end = (start + (1 << 16)).min(count);
        let blocks: Vec<&[f64]> = channels.iter().map(|c| &c[start..end]).collect();
        welch.feed(&blocks)?;
    }
    welch.finish()
}

fn main() -> Result<(), Box<dyn Error>> {
    // As `cargo test --benches` asks it: there is nothing to test.
    if !std::env::args().any(|a| a == "--bench") {
        return Ok(());
    }
    let python = std::env::args()
        .skip(1)
        .find(|a| !a.starts_with("--"))
        .unwrap_or_else(|| "python3".to_owned());
    let seconds: f64 = std::env::var("STILLFLAME_SECONDS").map_or(Ok(360.0), |s| s.parse())?;
    let count = (seconds * RATE) as usize;
    // A sawtooth and its multiples, the same in Python: values matter to nobody's speed.
    let channels: Vec<Vec<f64>> = (1..=CHANNELS)
        .map(|c| {
            (0..count)
                .map(|k| ((k * k * c) % 1009) as f64 / 1009.0 - 0.5)
                .collect()
        })
        .collect();
    let script = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/yardstick/spectra.py");
    println!("| segment | here | scipy | scipy / here |");
    println!("| --- | --- | --- | --- |");
    for segment in SEGMENTS {
        let began = Instant::now();
        let spectra = spectra(&channels, segment).map_err(Problems::from)?;
        let here = began.elapsed().as_secs_f64();
        let output = Command::new(&python)
            .arg(&script)
            .args(["--time", &count.to_string(), &segment.to_string()])
            .output()?;
        if !output.status.success() {
            return Err(String::from_utf8_lossy(&output.stderr).into_owned().into());
        }
        let scipy: Scipy = serde_json::from_slice(&output.stdout)?;
        let largest = scipy.density.iter().copied().fold(0.0, f64::max);
        let pairs = spectra.density(0).iter().zip(&scipy.density);
        let off = pairs
            .map(|(a, b)| (a - b).abs() / largest)
            .fold(0.0, f64::max);
        if off > 1e-10 || scipy.density.len() != spectra.plan().bins() {
            return Err(format!("segment {segment}: spectra differ by {off:.1e}").into());
        }
        println!(
            "| {segment} | {here:.2} s | {:.2} s | {:.1} |",
            scipy.seconds,
            scipy.seconds / here
        );
    }
    Ok(())
}
