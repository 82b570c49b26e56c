//! Many questions of one network.

pub mod beyond;
pub mod branch;
pub mod cautions;
pub mod map;
pub mod path;
pub mod record;
pub mod regions;
pub mod sweep;
