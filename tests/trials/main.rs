//! Trials where a list is most easily wrong: beside exceptional points, with a root at the window's
//! edge, and in windows of all sizes.

#[path = "../common/mod.rs"]
mod common;

mod edges;
mod exceptional;
mod windows;
