//! A record as a WAV file of 16 bits, its comment saying that it is synthetic and what full scale means.

use std::io::{self, Write};

use stillflame::measured::Record;

/// The least 1, 2 or 5 times a power of ten that no sample exceeds.
pub fn full_scale(record: &Record) -> f64 {
    let samples = record.channels.iter().flat_map(|c| &c.samples);
    let largest = samples.fold(f64::MIN_POSITIVE, |m, x| m.max(x.abs()));
    let power = 10f64.powf(largest.log10().floor());
    let round = [1.0, 2.0, 5.0, 10.0].map(|m| m * power);
    round
        .into_iter()
        .find(|r| *r >= largest)
        .unwrap_or(10.0 * power)
}

/// Writes the file.
pub fn write(out: &mut impl Write, record: &Record, comment: &str) -> io::Result<()> {
    let small = |n: usize| u32::try_from(n).map_err(io::Error::other);
    let channels = u16::try_from(record.channels.len()).map_err(io::Error::other)?;
    let frame = 2 * channels;
    let mut comment = comment.as_bytes().to_vec();
    comment.resize(comment.len() / 2 * 2 + 2, 0);
    let (list, data) = (
        small(12 + comment.len())?,
        small(record.len())? * u32::from(frame),
    );
    let rate = record.rate_hz.round() as u32;
    out.write_all(b"RIFF")?;
    out.write_all(&(4 + 24 + 8 + list + 8 + data).to_le_bytes())?;
    out.write_all(b"WAVEfmt \x10\0\0\0\x01\0")?;
    out.write_all(&channels.to_le_bytes())?;
    out.write_all(&rate.to_le_bytes())?;
    out.write_all(&(rate * u32::from(frame)).to_le_bytes())?;
    out.write_all(&frame.to_le_bytes())?;
    out.write_all(&16_u16.to_le_bytes())?;
    out.write_all(b"LIST")?;
    out.write_all(&list.to_le_bytes())?;
    out.write_all(b"INFOICMT")?;
    out.write_all(&small(comment.len())?.to_le_bytes())?;
    out.write_all(&comment)?;
    out.write_all(b"data")?;
    out.write_all(&data.to_le_bytes())?;
    let scale = 32_767.0 / full_scale(record);
    for i in 0..record.len() {
        for channel in &record.channels {
            out.write_all(&((channel.samples[i] * scale).round() as i16).to_le_bytes())?;
        }
    }
    Ok(())
}
