//! Parse, call, exit code.

use std::process::ExitCode;

use clap::Parser;
use stillflame::cli::{Cli, run};

fn main() -> ExitCode {
    run(&Cli::parse()).into()
}
