//! Parse, call, exit code.

#![warn(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::process::ExitCode;

fn main() -> ExitCode {
    stillflame::cli::main(std::env::args_os())
}
