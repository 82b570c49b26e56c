//! The machine a figure was measured on.

use std::path::PathBuf;

/// What may end a measurement.
pub type Outcome<T> = Result<T, Box<dyn std::error::Error>>;

/// A file of the repository.
pub fn file(path: &str) -> PathBuf {
    std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join(path)
}

/// What the machine calls its processor.
pub fn processor() -> String {
    let told = std::fs::read_to_string("/proc/cpuinfo").unwrap_or_default();
    let field = |key: &str| {
        let line = told.lines().find(|l| l.starts_with(key))?;
        Some(line.split_once(':')?.1.trim().to_owned())
    };
    let flags = field("flags").unwrap_or_default();
    let has = |wanted: &&str| flags.split(' ').any(|f| f == *wanted);
    let vectors: Vec<&str> = ["sse2", "avx2", "fma", "avx512f"]
        .into_iter()
        .filter(has)
        .collect();
    let name = field("model name").unwrap_or_else(|| std::env::consts::ARCH.to_owned());
    format!("{name} ({})", vectors.join(", "))
}

/// How many processes wanted a core in the last minute: above the number of cores times are too long.
pub fn load() -> String {
    let told = std::fs::read_to_string("/proc/loadavg").unwrap_or_default();
    let last_minute = told.split(' ').next().unwrap_or_default();
    format!("load {last_minute}")
}
