//!

pub mod problems;
