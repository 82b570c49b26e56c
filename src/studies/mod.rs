//! Many questions of one network.

pub mod cautions;
pub mod map;
pub mod regions;
