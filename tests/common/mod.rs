//! Shared by the tests and benches.
#![allow(dead_code, reason = "each test binary uses its own part")]

pub mod agreement;
pub mod brute;
pub mod census;
pub mod counting;
pub mod exact;
pub mod figures;
pub mod heater;
pub mod random;
pub mod rig;
pub mod split;
pub mod subdivision;
pub mod witness;
