//! Parse, call, exit code.

#![warn(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::process::ExitCode;

use clap::Parser;
use stillflame::cli::{Cli, run};

fn main() -> ExitCode {
    run(&Cli::parse()).into()
}
