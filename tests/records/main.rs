//! Records read from files of every format: what they hold, what is wrong with them, and that nothing makes a reader
//! fall over.

mod bad;
mod csv;
mod fuzz;
mod universal;
mod wav;

use std::io::Write;

use stillflame::measured::reading::{Asked, Opened, Recording, open};
use stillflame::problems::{Problem, Problems};
use tempfile::NamedTempFile;

/// A file with these bytes.
fn file(bytes: &[u8]) -> NamedTempFile {
    let mut file = NamedTempFile::new().unwrap();
    file.write_all(bytes).unwrap();
    file.flush().unwrap();
    file
}

/// A record read to its end.
#[derive(Debug)]
struct Whole {
    rate_hz: f64,
    start: f64,
    names: Vec<String>,
    samples: Vec<Vec<f64>>,
    notes: Vec<String>,
    warnings: Vec<Problem>,
}

fn whole(mut record: Recording) -> Result<Whole, Problems> {
    let mut samples = vec![Vec::new(); record.signals.len()];
    while let Some(blocks) = record.block() {
        for (all, block) in samples.iter_mut().zip(blocks) {
            all.extend_from_slice(block);
        }
    }
    let names = record.signals.iter().map(|s| s.name.clone()).collect();
    let (rate_hz, start, notes) = (record.rate_hz, record.start, record.notes.clone());
    let warnings = record.finish()?;
    Ok(Whole {
        rate_hz,
        start,
        names,
        samples,
        notes,
        warnings,
    })
}

fn read_as(bytes: &[u8], asked: &Asked) -> Result<Whole, Problems> {
    let file = file(bytes);
    match open(file.path(), asked)? {
        Opened::Record(record) => whole(*record),
        Opened::Spectrum(_) => panic!("a spectrum"),
    }
}

fn read(bytes: &[u8]) -> Result<Whole, Problems> {
    read_as(bytes, &Asked::default())
}

/// Numbers without pattern.
fn noise(n: usize, seed: u64) -> Vec<f64> {
    let mut rng = fastrand::Rng::with_seed(seed);
    (0..n).map(|_| 20.0 * rng.f64() - 10.0).collect()
}
