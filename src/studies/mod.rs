//! Many questions of one network.

pub mod branch;
pub mod cautions;
pub mod map;
pub mod regions;
