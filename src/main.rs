//! Parse, call, exit code.

fn main() {}
