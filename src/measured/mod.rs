//! What was measured: records of pressure, velocity and light, and what their spectra tell.
//!
//! ```text
//! records -> segments -> spectra -> peaks, waves, flame response
//! ```
//!
//! Everything that reads samples takes them in blocks, in one pass, with memory that does not grow with
//! the record: [`Welch`] accumulates power densities and cross-spectra, [`Spectrogram`] one row per stretch of
//! time, [`Envelopes`] the amplitude statistics of every narrow band, [`Level`] mean, rms and extremes. What is
//! asked of a record is then answered from these: [`peaks`] fits resonances, [`nature`] weighs noise
//! against a cycle, [`microphones`] parts the waves that run with the flow from those that run against
//! it, [`response`] gives the flame's gain and phase.
//!
//! Conventions of spectra are those of the trade's numerical libraries: one-sided, per hertz for a
//! density; a cross-spectrum of `x` and `y` is the mean of `conj(X) Y`.

mod average;
mod engine;
mod envelope;
mod level;
pub mod microphones;
pub mod nature;
pub mod peaks;
pub mod reading;
pub mod recess;
pub mod response;

mod record;

mod spectra;
mod spectrogram;
mod welch;
mod window;

pub use average::Interval;
pub use engine::{Detrend, Plan};
pub use envelope::{Envelope, Envelopes};
pub use level::Level;
pub use record::{Channel, Quantity, Record};
pub use spectra::{Relation, Scaling, Spectra};
pub use spectrogram::{Row, Spectrogram};
pub use welch::Welch;
pub use window::Window;
