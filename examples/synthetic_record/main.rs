//! Plays a network's response to noise and writes it as CSV, marked as synthetic.
//!
//! ```text
//! cargo run --release --example synthetic_record -- networks/swirl_rig.toml --seconds 10 --at "0.2 m" --at "0.9 m" > record.csv
//! ```
//!
//! `--wav FILE` writes a WAV file of 16 bits instead. `--at` is a distance from the feed along the ducts, repeatable; without it there is one sensor at the middle. The model is
//! told in `play.rs`.

mod play;
mod wav;

use std::error::Error;
use std::io::Write;
use std::path::Path;
use std::process::ExitCode;
use std::str::FromStr;

use stillflame::modes::{self, Scan, shapes};
use stillflame::units::{self, Dimension};
use stillflame::{input, measured::Record};

struct Wanted {
    network: String,
    positions: Vec<f64>,
    sound: play::Sound,
    wav: Option<String>,
}

fn number<T: FromStr>(key: &str, value: &str) -> Result<T, String> {
    value
        .parse()
        .map_err(|_| format!("{key} wants a number, not `{value}`"))
}

fn wanted() -> Result<Wanted, Box<dyn Error>> {
    let mut arguments = std::env::args().skip(1);
    let network = arguments
        .next()
        .ok_or("name a network file, networks/swirl_rig.toml for instance")?;
    let mut all = Wanted {
        network,
        positions: Vec::new(),
        wav: None,
        sound: play::Sound {
            rate_hz: 8192.0,
            duration: 10.0,
            level: 50.0,
            cycle: 1000.0,
            sensor_noise: 1.0,
            seed: 1,
        },
    };
    while let Some(key) = arguments.next() {
        let value = arguments.next().ok_or(format!("{key} wants a value"))?;
        match key.as_str() {
            "--seconds" => all.sound.duration = number(&key, &value)?,
            "--rate" => all.sound.rate_hz = number(&key, &value)?,
            "--seed" => all.sound.seed = number(&key, &value)?,
            "--wav" => all.wav = Some(value),
            "--at" => {
                let place = units::parse(&value, Dimension::Length).map_err(|e| e.to_string())?;
                all.positions.push(place);
            }
            _ => {
                return Err(
                    format!("{key} is none of --seconds, --rate, --seed, --at, --wav").into(),
                );
            }
        }
    }
    let counts = [all.sound.rate_hz, all.sound.duration];
    if counts.iter().any(|x| !(x.is_finite() && *x > 0.0)) {
        return Err("--rate and --seconds are positive numbers".into());
    }
    Ok(all)
}

fn main() -> ExitCode {
    match run() {
        Ok(()) => ExitCode::SUCCESS,
        Err(e) => {
            eprintln!("{e}");
            ExitCode::FAILURE
        }
    }
}

fn run() -> Result<(), Box<dyn Error>> {
    let mut wanted = wanted()?;
    let network = input::read(Path::new(&wanted.network), &[])?.network;
    let solved = modes::solve(&network)?;
    let window = modes::Window::of(&network, &solved.mean)?;
    let list = modes::find(&solved, window, Scan::Whole);
    let shaped: Vec<_> = list
        .modes
        .iter()
        .map(|m| (*m, shapes::along(&network, &solved, m)))
        .collect();
    let end = shaped
        .iter()
        .find_map(|(_, s)| s.as_ref()?.along.last().map(|a| a.position))
        .ok_or("no mode of the network has a shape")?;
    if wanted.positions.is_empty() {
        wanted.positions.push(end / 2.0);
    }
    if let Some(x) = wanted.positions.iter().find(|x| !(0.0..=end).contains(*x)) {
        return Err(format!("a sensor at {x} m lies outside the ducts, 0 to {end:.3} m").into());
    }
    let highest = list.modes.iter().map(|m| m.frequency()).fold(0.0, f64::max);
    if wanted.sound.rate_hz <= 2.0 * highest {
        return Err(
            format!("a mode at {highest:.0} Hz wants more than two samples a period").into(),
        );
    }
    let names: Vec<String> = (1..=wanted.positions.len())
        .map(|i| format!("p{i}"))
        .collect();
    let parts = play::parts(&shaped, &wanted.positions);
    let record = play::play(&parts, &names, &wanted.sound);
    let title = &network.layout.title;
    let Some(path) = &wanted.wav else {
        return Ok(write(&wanted, title, &parts, &record)?);
    };
    let comment = format!(
        "SYNTHETIC record, computed and not measured: {title}; full scale is {} Pa",
        wav::full_scale(&record)
    );
    let mut file = std::io::BufWriter::new(std::fs::File::create(path)?);
    wav::write(&mut file, &record, &comment)?;
    file.flush()?;
    Ok(())
}

fn write(
    wanted: &Wanted,
    title: &str,
    parts: &[play::Part],
    record: &Record,
) -> std::io::Result<()> {
    let mut out = std::io::BufWriter::new(std::io::stdout().lock());
    let sound = &wanted.sound;
    writeln!(
        out,
        "# SYNTHETIC record, computed and not measured: {title}"
    )?;
    writeln!(
        out,
        "# {} Hz, seed {}, sensors at {:?} m from the feed",
        sound.rate_hz, sound.seed, wanted.positions
    )?;
    for part in parts {
        let kind = if part.s.re < 0.0 {
            "noise-driven"
        } else {
            "cycle"
        };
        let frequency = part.s.im / std::f64::consts::TAU;
        writeln!(
            out,
            "# {kind}: {frequency:.3} Hz, growth rate {:+.3} 1/s",
            part.s.re
        )?;
    }
    write!(out, "time [s]")?;
    for channel in &record.channels {
        write!(out, ",{} [{}]", channel.name, channel.quantity.unit())?;
    }
    writeln!(out)?;
    for i in 0..record.len() {
        write!(out, "{}", record.start + i as f64 / record.rate_hz)?;
        for channel in &record.channels {
            write!(out, ",{}", channel.samples[i])?;
        }
        writeln!(out)?;
    }
    out.flush()
}
