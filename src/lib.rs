//! Thermoacoustic modes of combustor rigs, certified complete.
pub mod acoustics;
pub mod cli;
pub mod draw;
pub mod elements;
pub mod flame;
pub mod gas;
pub mod input;
pub mod meanflow;
pub mod modes;
pub mod network;
pub mod numerics;
pub mod problems;
pub mod report;
pub mod studies;
pub mod units;
pub mod waves;
