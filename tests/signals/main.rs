//! Records of rigs: spectra, peaks, waves and flame responses against outside values and over many seeds.

#[path = "../../examples/synthetic_record/play.rs"]
mod play;

mod ground;
mod heard;
mod nature;
mod peaks;
mod response;
mod rigs;
mod spectra;
mod waves;
