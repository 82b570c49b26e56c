//! Writes the page of outside values beside ours: `docs/outside-checks.md`.
//!
//! ```text
//! cargo run --release --example outside_checks > docs/outside-checks.md
//! ```
//!
//! Every eigenvalue is computed anew; `tests/outside_checks.rs` holds the committed page against this
//! text.

mod text;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    print!("{}", text::page()?);
    Ok(())
}
