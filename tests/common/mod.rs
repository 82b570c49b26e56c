//! Shared by the tests and benches.
#![allow(dead_code, reason = "each test binary uses its own part")]

pub mod exact;
