//! Writes the reference of the network file: `docs/network-file.md`.
//!
//! ```text
//! cargo run --release --example network_file_reference > docs/network-file.md
//! ```
//!
//! Keys, units, ranges, defaults and meanings are read from the knob tables of the elements, so that
//! the page cannot say anything else than the program does. `tests/network_file.rs` holds the committed
//! page against this text and reads every network in it.

mod text;

fn main() {
    print!("{}", text::reference());
}
