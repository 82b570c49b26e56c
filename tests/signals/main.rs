//! Records of rigs: spectra, peaks, waves and flame responses against outside values and over many seeds.

mod ground;
mod spectra;
