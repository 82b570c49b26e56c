//! Running the real binary.

use std::path::{Path, PathBuf};
use std::process::Output;

use assert_cmd::Command;
use serde_json::Value;

/// The networks that come with the program.
pub const NETWORKS: [&str; 5] = [
    "flame_in_tube",
    "pressurised_rig",
    "staged_flame",
    "swirl_rig",
    "twenty_elements",
];

pub fn network(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("networks")
        .join(name)
        .with_extension("toml")
}

/// The verb on a network, with further arguments.
pub fn command(verb: &str, file: &Path, more: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_stillflame"));
    command.arg(verb).arg(file).args(more);
    command
}

pub struct Ran {
    pub code: Option<i32>,
    pub stdout: String,
    pub stderr: String,
}

impl From<Output> for Ran {
    fn from(output: Output) -> Ran {
        Ran {
            code: output.status.code(),
            stdout: String::from_utf8(output.stdout).unwrap(),
            stderr: String::from_utf8(output.stderr).unwrap(),
        }
    }
}

pub fn run(verb: &str, file: &Path, more: &[&str]) -> Ran {
    command(verb, file, more).output().unwrap().into()
}

/// The JSON object on standard output, which holds nothing else, and the exit code.
pub fn json(verb: &str, file: &Path, more: &[&str]) -> (Value, Option<i32>) {
    let ran = run(verb, file, &[&["--json"], more].concat());
    let value: Value = serde_json::from_str(&ran.stdout)
        .unwrap_or_else(|e| panic!("{e}: {}\n{}", ran.stdout, ran.stderr));
    assert!(value.is_object());
    for field in ["schema", "program", "network", "caution"] {
        assert!(value[field].is_string(), "{field}: {value}");
    }
    assert!(value["version"].is_u64() && value["warnings"].is_array());
    (value, ran.code)
}
