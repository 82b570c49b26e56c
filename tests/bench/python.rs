//! The Python a figure is held against.

use std::path::PathBuf;
use std::process::Command;

use crate::machine::{Outcome, file};

/// The Python of a virtual environment with what the script needs.
pub fn environment() -> Outcome<PathBuf> {
    let target = std::env::var_os("CARGO_TARGET_DIR").map_or_else(|| file("target"), PathBuf::from);
    let folder = target.join("yardstick-venv");
    run(Command::new("python3").args(["-m", "venv"]).arg(&folder))?;
    let requirements = file("tests/yardstick/requirements.txt");
    run(Command::new(folder.join("bin/pip"))
        .args(["install", "--quiet", "--disable-pip-version-check", "-r"])
        .arg(requirements))?;
    Ok(folder.join("bin/python"))
}

/// What a command prints.
pub fn run(command: &mut Command) -> Outcome<Vec<u8>> {
    let output = command.output().map_err(|e| format!("{command:?}: {e}"))?;
    if !output.status.success() {
        let said = String::from_utf8_lossy(&output.stderr);
        return Err(format!("{command:?} ended with {}:\n{said}", output.status).into());
    }
    Ok(output.stdout)
}
