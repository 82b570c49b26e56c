//! RIFF WAVE: whole numbers of 8 to 32 bits and floats of 32 and 64, with 64-bit lengths (RF64) and in big-endian order
//! (RIFX). Layout as published by the makers of the format (Multimedia Programming Interface and Data
//! Specifications 1.0, 1991) and, for RF64, EBU Tech 3306; from memory.
//!
//! Samples come out as parts of full scale: whole numbers over `2^(bits-1)`, floats as they stand.

use std::fs::File;
use std::io::{BufReader, ErrorKind, Read, Seek, SeekFrom};
use std::path::Path;

use super::BLOCK;
use super::columns::{Raw, Stated, renamed};
use super::open::{Asked, Format, Head};
use super::samples::{Samples, is_other_order};
use super::unit::Label;
use crate::problems::{Problem, Problems};

#[derive(Clone, Copy, Debug, PartialEq)]
enum Coding {
    Whole,
    Float,
}

/// How a sample is stored.
#[derive(Clone, Copy, Debug)]
struct Layout {
    coding: Coding,
    /// Bytes of one sample.
    bytes: usize,
    channels: usize,
    rate_hz: f64,
    big: bool,
}

const MOST_CHANNELS: usize = 1024;

impl Layout {
    fn frame(&self) -> usize {
        self.bytes * self.channels
    }

    /// The sample at the beginning of the bytes.
    fn sample(&self, bytes: &[u8]) -> f64 {
        let mut word = [0_u8; 8];
        let n = self.bytes.min(8);
        let Some(bytes) = bytes.get(..n) else {
            return f64::NAN;
        };
        // Little-endian, at the upper end of the word, so that the sign falls out of a shift.
        let upper = word.get_mut(8 - n..).unwrap_or_default();
        upper.copy_from_slice(bytes);
        if self.big {
            upper.reverse();
        }
        let shift = 8 * (8 - n) as u32;
        match (self.coding, n) {
            // Eight bits are unsigned about their middle.
            (Coding::Whole, 1) => (f64::from(word[7]) - 128.0) / 128.0,
            (Coding::Whole, _) => {
                let whole = i64::from_le_bytes(word) >> shift;
                whole as f64 / 2f64.powi(8 * n as i32 - 1)
            }
            (Coding::Float, 4) => {
                f64::from(f32::from_bits((u64::from_le_bytes(word) >> shift) as u32))
            }
            (Coding::Float, _) => f64::from_le_bytes(word),
        }
    }
}

/// Opens a file and reads its chunks up to the samples.
pub(super) fn head(path: &Path, name: &str, asked: &Asked) -> Result<Head, Problems> {
    let fail = |what: String| Problem::error(name, what);
    let cut = |e: &std::io::Error| match e.kind() {
        ErrorKind::UnexpectedEof => fail("the file ends before its samples begin".to_owned())
            .hint("it was cut while it was copied or recorded"),
        _ => fail(format!("cannot be read: {e}")),
    };
    let mut warnings = Vec::new();
    let found = chunks(path).map_err(|e| cut(&e))?;
    let layout = found.layout(name)?;
    let (frame, frames) = (layout.frame() as u64, found.there / layout.frame() as u64);
    if let Some(told) = found.told.filter(|t| *t > found.there) {
        let what = format!(
            "the file is cut: its head tells of {} samples in each channel, and {frames} are there",
            told / frame
        );
        warnings.push(Problem::warning(name, what).hint("what is there is read"));
    } else if found.there % frame != 0 {
        let what = format!(
            "the last {} bytes are no whole sample of every channel and are left out",
            found.there % frame
        );
        warnings.push(Problem::warning(name, what));
    }
    let mut file = File::open(path).map_err(|e| cut(&e))?;
    file.seek(SeekFrom::Start(found.at)).map_err(|e| cut(&e))?;
    order(&mut file, &layout, name, &mut warnings)?;
    file.seek(SeekFrom::Start(found.at)).map_err(|e| cut(&e))?;
    let labels = match &asked.names {
        Some(names) => renamed(names, layout.channels)?,
        None => (1..=layout.channels)
            .map(|i| Label {
                name: format!("ch{i}"),
                unit: None,
            })
            .collect(),
    };
    let channels = labels
        .into_iter()
        .map(|label| {
            let raw = Raw::new(label, None);
            // A unit named for full scale would say nothing of its size.
            let stated = match raw.stated {
                Stated::Unit(u) if u != "1" && u != "-" => Stated::Unit(u),
                _ => Stated::FullScale,
            };
            Raw { stated, ..raw }
        })
        .collect();
    Ok(Head {
        format: Format::Wav,
        rate_hz: layout.rate_hz,
        start: 0.0,
        channels,
        expected: frames,
        notes: found.notes,
        samples: Box::new(Frames {
            file: BufReader::with_capacity(1 << 18, file),
            name: name.to_owned(),
            layout,
            left: frames,
            wanted: Vec::new(),
            bytes: Vec::new(),
        }),
        cuts_itself: false,
        warnings,
    })
}

/// What the chunks of a file tell.
#[derive(Default)]
struct Chunks {
    big: bool,
    format: Vec<u8>,
    notes: Vec<String>,
    /// Offset of the samples.
    at: u64,
    /// Bytes of samples the head tells of, where it does.
    told: Option<u64>,
    /// Bytes of samples that are there.
    there: u64,
}

fn chunks(path: &Path) -> std::io::Result<Chunks> {
    let length = std::fs::metadata(path)?.len();
    let mut file = BufReader::new(File::open(path)?);
    let mut head = [0_u8; 12];
    file.read_exact(&mut head)?;
    let mut found = Chunks {
        big: head.starts_with(b"RIFX"),
        ..Chunks::default()
    };
    let mut long = None;
    let mut at = 12_u64;
    loop {
        let mut head = [0_u8; 8];
        file.read_exact(&mut head)?;
        at += 8;
        let [id @ .., a, b, c, d] = head;
        let size = match found.big {
            true => u32::from_be_bytes([a, b, c, d]),
            false => u32::from_le_bytes([a, b, c, d]),
        };
        if &id == b"data" {
            found.at = at;
            let rest = length.saturating_sub(at);
            // A recorder that never came back to its head leaves nothing or the largest number there.
            found.told = match (size, long) {
                (u32::MAX, Some(long)) => Some(long),
                (0 | u32::MAX, _) => None,
                (size, _) => Some(u64::from(size)),
            };
            found.there = found.told.map_or(rest, |t| t.min(rest));
            return Ok(found);
        }
        let keep = matches!(&id, b"fmt " | b"ds64" | b"LIST") && size <= 1 << 16;
        // Chunks begin at even offsets.
        let padded = u64::from(size) + u64::from(size % 2);
        if keep {
            let mut body = vec![0_u8; size as usize];
            file.read_exact(&mut body)?;
            match &id {
                b"fmt " => found.format = body,
                b"ds64" => {
                    long = body
                        .get(8..16)
                        .and_then(|b| Some(u64::from_le_bytes(b.try_into().ok()?)))
                }
                _ => found.notes.extend(comments(&body, found.big)),
            }
            file.seek_relative((padded - u64::from(size)) as i64)?;
        } else if at + padded > length {
            return Err(ErrorKind::UnexpectedEof.into());
        } else {
            file.seek_relative(i64::try_from(padded).unwrap_or(i64::MAX))?;
        }
        at += padded;
    }
}

/// Titles and comments of a list of texts.
fn comments(body: &[u8], big: bool) -> Vec<String> {
    let mut found = Vec::new();
    let mut rest = body.strip_prefix(b"INFO").unwrap_or_default();
    while let Some((head, after)) = rest.split_at_checked(8) {
        let size = head
            .get(4..8)
            .and_then(|b| b.try_into().ok())
            .unwrap_or_default();
        let size = if big {
            u32::from_be_bytes(size)
        } else {
            u32::from_le_bytes(size)
        } as usize;
        let text = after.get(..size.min(after.len())).unwrap_or_default();
        if head.starts_with(b"ICMT") || head.starts_with(b"INAM") {
            let text = String::from_utf8_lossy(text);
            let text: String = text.chars().filter(|c| !c.is_control()).take(200).collect();
            found.extend(Some(text.trim().to_owned()).filter(|t| !t.is_empty()));
        }
        rest = after.get(size + size % 2..).unwrap_or_default();
    }
    found
}

impl Chunks {
    fn layout(&self, name: &str) -> Result<Layout, Problem> {
        let fail = |what: String| Problem::error(name, what);
        let short = |at: usize| -> Option<u16> {
            let bytes = self.format.get(at..at + 2)?.try_into().ok()?;
            Some(if self.big {
                u16::from_be_bytes(bytes)
            } else {
                u16::from_le_bytes(bytes)
            })
        };
        let rate = || -> Option<u32> {
            let bytes = self.format.get(4..8)?.try_into().ok()?;
            Some(if self.big {
                u32::from_be_bytes(bytes)
            } else {
                u32::from_le_bytes(bytes)
            })
        };
        let (Some(mut tag), Some(channels), Some(rate), Some(bits)) =
            (short(0), short(2), rate(), short(14))
        else {
            return Err(fail("no format chunk stands before the samples".to_owned()));
        };
        if tag == 0xfffe {
            tag = short(24).unwrap_or(tag);
        }
        let coding = match tag {
            1 => Coding::Whole,
            3 => Coding::Float,
            other => {
                return Err(fail(format!(
                    "its samples are coded in a way (format {other:#06x}) that is not read"
                ))
                .hint("store it as PCM or float, without compression"));
            }
        };
        let fits = match coding {
            Coding::Whole => matches!(bits, 8 | 16 | 24 | 32),
            Coding::Float => matches!(bits, 32 | 64),
        };
        let layout = Layout {
            coding,
            bytes: usize::from(bits / 8),
            channels: usize::from(channels),
            rate_hz: f64::from(rate),
            big: self.big,
        };
        if !fits {
            return Err(fail(format!("samples of {bits} bits are not read"))
                .hint("whole numbers have 8, 16, 24 or 32 bits, floats 32 or 64"));
        }
        if !(1..=MOST_CHANNELS).contains(&layout.channels) || rate == 0 {
            return Err(fail(format!(
                "its head tells of {channels} channels at {rate} Hz"
            )));
        }
        if short(12).is_some_and(|align| usize::from(align) != layout.frame()) {
            let what = format!(
                "its head contradicts itself: {channels} channels of {bits} bits are no {} bytes",
                short(12).unwrap_or_default()
            );
            return Err(fail(what));
        }
        Ok(layout)
    }
}

/// Times smoother that whole numbers must be in the other byte order for the order to be doubted.
const SMOOTHER: f64 = 100.0;

/// Looks at the first samples in both byte orders.
fn order(
    file: &mut File,
    layout: &Layout,
    name: &str,
    warnings: &mut Vec<Problem>,
) -> Result<(), Problem> {
    let mut bytes = Vec::new();
    let most = (layout.frame() * BLOCK) as u64;
    let read = file.by_ref().take(most).read_to_end(&mut bytes);
    read.map_err(|e| Problem::error(name, format!("cannot be read: {e}")))?;
    let other = Layout {
        big: !layout.big,
        ..*layout
    };
    let of = |layout: &Layout| -> Vec<f64> {
        bytes
            .chunks_exact(layout.frame())
            .map(|f| layout.sample(f))
            .collect()
    };
    let (told, swapped) = (of(layout), of(&other));
    let word = if layout.big {
        "big-endian"
    } else {
        "little-endian"
    };
    match layout.coding {
        Coding::Float if is_other_order(&told, &swapped) => {
            let what = format!(
                "its head says {word}, and the samples make sense in the other byte order only"
            );
            Err(Problem::error(name, what)
                .hint("write the head in the order of the samples: RIFF little-endian, RIFX big"))
        }
        Coding::Whole if layout.bytes > 1 => {
            let rough = |x: &[f64]| x.windows(2).map(|w| (w[1] - w[0]).powi(2)).sum::<f64>();
            if rough(&told) > SMOOTHER * rough(&swapped) && rough(&swapped) > 0.0 {
                let what = format!(
                    "the byte order is doubtful: its head says {word}, and in the other order the samples run {:.0} times smoother",
                    (rough(&told) / rough(&swapped)).sqrt()
                );
                warnings.push(
                    Problem::warning(name, what)
                        .hint("look at the wave before trusting a spectrum of it"),
                );
            }
            Ok(())
        }
        _ => Ok(()),
    }
}

struct Frames {
    file: BufReader<File>,
    name: String,
    layout: Layout,
    left: u64,
    wanted: Vec<usize>,
    bytes: Vec<u8>,
}

impl Samples for Frames {
    fn select(&mut self, wanted: &[usize]) {
        self.wanted = wanted.to_vec();
    }

    fn next(&mut self, blocks: &mut [Vec<f64>], problems: &mut Vec<Problem>) {
        let frames = self.left.min(BLOCK as u64) as usize;
        let frame = self.layout.frame();
        self.bytes.resize(frames * frame, 0);
        if let Err(e) = self.file.read_exact(&mut self.bytes) {
            problems.push(Problem::error(
                self.name.as_str(),
                format!("cannot be read on: {e}"),
            ));
            self.left = 0;
            return;
        }
        self.left -= frames as u64;
        for (channel, block) in self.wanted.iter().zip(blocks) {
            let at = channel * self.layout.bytes;
            let first = block.len();
            let frames = self.bytes.chunks_exact(frame);
            block.extend(frames.map(|f| self.layout.sample(f.get(at..).unwrap_or_default())));
            let fresh = block.get(first..).unwrap_or_default();
            if let Some(i) = fresh.iter().position(|x| !x.is_finite()) {
                let what = format!(
                    "channel {} holds {} among its samples",
                    channel + 1,
                    fresh[i]
                );
                problems.push(Problem::error(self.name.as_str(), what).hint(
                    "a missing sample cannot be made up; take a stretch without it with --span",
                ));
                self.left = 0;
            }
        }
    }
}
