//! What happens on bad input: every mistake gives one problem of its own, with file, line, column and
//! key, what is wrong and what would be right; all mistakes of a file are told in one run; nothing
//! panics, and nothing that looks like a result is printed.

mod areas;
mod case;
#[path = "../common/cli.rs"]
mod cli;
mod flows;
mod mutations;
mod overrides;
mod sensors;
mod syntax;
mod values;
mod whole;

/// A network shipped with the program.
fn shipped(name: &str) -> String {
    std::fs::read_to_string(cli::network(name)).unwrap()
}
