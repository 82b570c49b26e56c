//! Lines of a text file with their numbers, whatever ends them.

use std::io::{BufRead, ErrorKind};

/// Longest line taken for text (bytes).
const LONGEST: usize = 1 << 20;

/// Reads lines into one buffer.
pub(super) struct Lines<R> {
    inner: R,
    buffer: Vec<u8>,
    number: u64,
    /// Whether the last line read had an end.
    ended: bool,
    /// Bytes read so far.
    bytes: u64,
}

/// What a call of [`Lines::next`] found.
pub(super) enum Found {
    /// A line, now in the buffer.
    Line,
    /// The end of the file.
    End,
    /// The file cannot be read on, or is no text.
    Fault(String),
}

impl<R: BufRead> Lines<R> {
    pub fn new(inner: R) -> Self {
        Lines {
            inner,
            buffer: Vec::with_capacity(256),
            number: 0,
            ended: true,
            bytes: 0,
        }
    }

    /// Reads the next line.
    pub fn next(&mut self) -> Found {
        self.buffer.clear();
        loop {
            let available = match self.inner.fill_buf() {
                Ok(available) => available,
                Err(e) if e.kind() == ErrorKind::Interrupted => continue,
                Err(e) => return Found::Fault(format!("cannot be read on: {e}")),
            };
            if available.is_empty() {
                self.ended = false;
                break;
            }
            let end = available.iter().position(|b| *b == b'\n');
            let used = end.map_or(available.len(), |i| i + 1);
            self.buffer
                .extend_from_slice(available.get(..used).unwrap_or_default());
            self.inner.consume(used);
            self.bytes += used as u64;
            if end.is_some() {
                self.ended = true;
                break;
            }
            if self.buffer.len() > LONGEST {
                return Found::Fault(format!(
                    "line {} is longer than {LONGEST} bytes: this is no table of numbers",
                    self.number + 1
                ));
            }
        }
        if self.buffer.is_empty() {
            return Found::End;
        }
        self.number += 1;
        if self.number == 1 && self.buffer.starts_with(b"\xef\xbb\xbf") {
            self.buffer.drain(..3);
        }
        while matches!(self.buffer.last(), Some(b'\n' | b'\r')) {
            self.buffer.pop();
        }
        Found::Line
    }

    /// The line read last, without its end. What is not UTF-8 stays out of sight.
    pub fn text(&self) -> &str {
        match std::str::from_utf8(&self.buffer) {
            Ok(text) => text,
            Err(e) => std::str::from_utf8(self.buffer.get(..e.valid_up_to()).unwrap_or_default())
                .unwrap_or_default(),
        }
    }

    /// Whether it is UTF-8 without zero bytes.
    pub fn is_text(&self) -> bool {
        std::str::from_utf8(&self.buffer).is_ok() && !self.buffer.contains(&0)
    }

    /// Its number, counted from one.
    pub fn number(&self) -> u64 {
        self.number
    }

    /// Whether the last line read had a line end.
    pub fn ended(&self) -> bool {
        self.ended
    }

    /// Bytes read so far.
    pub fn bytes(&self) -> u64 {
        self.bytes
    }
}
