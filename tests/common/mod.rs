//! Random networks, shared by the tests.

pub mod random;
pub mod rig;
