//! A long WAV record to power densities here and by scipy, each from the file, in one run on one machine.
//!
//! ```sh
//! STILLFLAME_SECONDS=3600 cargo bench --bench record_beside_scipy -- target/yardstick-venv/bin/python
//! ```
//!
//! wants a Python with `tests/yardstick/requirements.txt` installed, as `.ci/run` leaves one. Four channels at 25.6 kHz of 16
//! bits, six minutes unless `STILLFLAME_SECONDS` says otherwise. scipy maps the file into memory and takes one channel after
//! the other, which is kinder to it than arrays of doubles. Before a ratio is printed both must agree to 1e-10.

use std::error::Error;
use std::io::{BufWriter, Write};
use std::path::Path;
use std::process::Command;
use std::time::Instant;

use serde::Deserialize;
use stillflame::measured::reading::{Asked, Opened, open, unit::calibration};
use stillflame::measured::{Plan, Welch};
use stillflame::problems::Problems;

const RATE: u32 = 25_600;
const CHANNELS: u16 = 4;
const SEGMENT: usize = 8192;

/// What Python prints.
#[derive(Deserialize)]
struct Scipy {
    seconds: f64,
    density: Vec<f64>,
}

const SCRIPT: &str = "
import json, sys, time
import numpy as np
from scipy import signal
from scipy.io import wavfile
began = time.perf_counter()
rate, data = wavfile.read(sys.argv[1], mmap=True)
all = [signal.welch(data[:, i] / 32768.0, fs=rate, window='hann', nperseg=int(sys.argv[2]))[1] for i in range(data.shape[1])]
seconds = time.perf_counter() - began
print(json.dumps({'seconds': seconds, 'density': all[0].tolist()}))
";

fn write(path: &Path, frames: u32) -> std::io::Result<()> {
    let mut out = BufWriter::new(std::fs::File::create(path)?);
    let frame = 2 * CHANNELS;
    let size = frames * u32::from(frame);
    out.write_all(b"RIFF")?;
    out.write_all(&(size + 36).to_le_bytes())?;
    out.write_all(b"WAVEfmt \x10\0\0\0\x01\0")?;
    out.write_all(&CHANNELS.to_le_bytes())?;
    out.write_all(&RATE.to_le_bytes())?;
    out.write_all(&(RATE * u32::from(frame)).to_le_bytes())?;
    out.write_all(&frame.to_le_bytes())?;
    out.write_all(b"\x10\0data")?;
    out.write_all(&size.to_le_bytes())?;
    let mut rng = fastrand::Rng::with_seed(1);
    for _ in 0..frames {
        for _ in 0..CHANNELS {
            out.write_all(&(rng.i16(-16_000..16_000)).to_le_bytes())?;
        }
    }
    out.flush()
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
    let seconds: u32 = std::env::var("STILLFLAME_SECONDS").map_or(Ok(360), |s| s.parse())?;
    let folder = tempfile::tempdir()?;
    let path = folder.path().join("record.wav");
    write(&path, seconds * RATE)?;
    let names: Vec<String> = (1..=CHANNELS).map(|i| format!("p{i}")).collect();
    let calibrations: Result<_, _> = names
        .iter()
        .map(|n| calibration(&format!("{n} = 1 Pa")))
        .collect();
    let asked = Asked {
        names: Some(names.join(",")),
        calibrations: calibrations?,
        ..Asked::default()
    };

    let began = Instant::now();
    let Opened::Record(mut record) = open(&path, &asked)? else {
        return Err("no record".into());
    };
    let plan = Plan::hann(record.rate_hz, SEGMENT);
    let mut welch = Welch::new(plan, usize::from(CHANNELS), &[]).map_err(Problems::from)?;
    while let Some(blocks) = record.block() {
        welch.feed(&blocks).map_err(Problems::from)?;
    }
    record.finish()?;
    let spectra = welch.finish().map_err(Problems::from)?;
    let here = began.elapsed().as_secs_f64();

    let output = Command::new(&python)
        .args(["-c", SCRIPT])
        .arg(&path)
        .arg(SEGMENT.to_string())
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
    if off > 1e-10 || scipy.density.len() != plan.bins() {
        return Err(format!("spectra differ by {off:.1e}").into());
    }
    println!("| record | here | scipy | scipy / here |");
    println!("| --- | --- | --- | --- |");
    println!(
        "| {CHANNELS} channels, {seconds} s at {RATE} Hz | {here:.2} s | {:.2} s | {:.1} |",
        scipy.seconds,
        scipy.seconds / here
    );
    Ok(())
}
