//! Records and reference values shared by these tests.

use std::path::{Path, PathBuf};

use serde_json::Value;

/// Reference values with their sources.
pub fn checks() -> Value {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/signal_checks.json");
    serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap()
}

/// The deterministic record of `signal_checks.json`, by its recipe there.
pub fn recipe(n: usize) -> Vec<f64> {
    use std::f64::consts::TAU;
    let mut r: u64 = 1;
    (0..n)
        .map(|k| {
            r = (1_103_515_245 * r + 12_345) % (1 << 31);
            let noise = r as f64 / (1_u64 << 31) as f64 - 0.5;
            let t = k as f64 / 2048.0;
            (TAU * 200.0 * t).sin() + 0.5 * (TAU * 417.3 * t).cos() + 0.1 * noise + 0.3
        })
        .collect()
}

/// A second channel: the first, late by three samples, louder, with noise of its own.
pub fn second(first: &[f64]) -> Vec<f64> {
    let mut r: u64 = 7;
    (0..first.len())
        .map(|k| {
            r = (1_103_515_245 * r + 12_345) % (1 << 31);
            let noise = r as f64 / (1_u64 << 31) as f64 - 0.5;
            let late = k.checked_sub(3).map_or(0.0, |k| first[k]);
            2.0 * late + 0.2 * noise
        })
        .collect()
}

/// Where files for the Python checks are written.
pub fn written(name: &str) -> PathBuf {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("signals");
    std::fs::create_dir_all(&folder).unwrap();
    folder.join(name)
}
