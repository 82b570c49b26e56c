//! Thermoacoustic modes of gas-turbine combustor rigs, each list with a proof that nothing is missing.
//!
//! A network file states ducts, area changes, plenums, flames with their responses, and ends; [`input`]
//! reads it into a [`network`], a graph over a generic number, and tells every problem at once.
//! [`meanflow`] solves the steady balances of its [`elements`] for the [state](gas::State) at every station.
//! [`acoustics`] differentiates the same balances about that flow, lowers each element to [`waves`]
//! primitives and eliminates them into one characteristic function `D(s)` whose zeros are the modes.
//! [`modes`] counts the zeros in a window by the argument principle, finds them, encloses each in a disc
//! that holds no other, and says whether both agree ([`numerics`], which knows no acoustics).
//! [`studies`] ask this at every point of a plane, [`report`] and [`draw`] tell the answers, and [`cli`]
//! is the command line. [`measured`] takes records of a rig and tells what is in them, without a network.
//!
//! # Conventions
//!
//! - Time dependence `q'(x, t) = Re[q(x) exp(s t)]`, `s = sigma + 2 pi i f`: a positive growth rate
//!   `sigma` (1/s) grows. A delay is `exp(-s tau)`.
//! - `x` runs with the mean flow; `p' = p+ + p-` and `rho c u' = p+ - p-` with `p+` running downstream.
//! - A reflection coefficient is the reflected over the incident pressure wave at its plane.
//! - SI inside; units are read and written at the border ([`units`]).
//! - Errors of an eigenvalue are relative to `|s|`; each mode carries a proven bound of its own.
//! - What failed is a [`Problem`](problems::Problem) or a [`Doubt`](numerics::zeros::Doubt), never "no mode".
//!
//! # Example
//!
//! A tube of still gas, closed at one end and open at the other, sounds where its length is an odd
//! multiple of a quarter wavelength:
//!
//! ```
//! use stillflame::{input, modes};
//!
//! let tube = r#"
//!     title = "Quarter-wave tube (invented)"
//!     search = { frequency = "20 to 600 Hz", growth = "-100 to 100 1/s" }
//!
//!     [feed]
//!     gas         = { gamma = 1.4, gas_constant = "287 J/(kg K)" }
//!     mass_flow   = "0 kg/s"
//!     temperature = "300 K"
//!     pressure    = "101325 Pa"
//!     end         = "closed"
//!
//!     [[element]]
//!     name     = "tube"
//!     kind     = "duct"
//!     length   = "0.5 m"
//!     diameter = "40 mm"
//!
//!     [exit]
//!     end = "open"
//! "#;
//!
//! let network = input::parse("tube.toml", tube, &[])?.network;
//! let solved = modes::solve(&network)?;
//! let window = modes::Window::of(&network, &solved.mean)?;
//! let list = modes::find(&solved, window, modes::Scan::Whole);
//!
//! assert!(list.complete());
//! assert_eq!(list.modes.len(), 2);
//! let quarter_wave = (1.4 * 287.0 * 300.0_f64).sqrt() / (4.0 * 0.5);
//! for (mode, odd) in list.modes.iter().zip([1.0, 3.0]) {
//!     assert!((mode.frequency() - odd * quarter_wave).abs() < 1e-9);
//!     assert!(mode.growth().abs() <= mode.error_bound);
//! }
//! # Ok::<(), stillflame::problems::Problems>(())
//! ```

#![warn(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

pub mod acoustics;
pub mod cli;
pub mod draw;
pub mod elements;
pub mod flame;
pub mod gas;
pub mod input;
pub mod knobs;
pub mod meanflow;
pub mod measured;
pub mod modes;
pub mod network;
pub mod numerics;
pub mod problems;
pub mod report;
pub mod studies;
pub mod units;
pub mod waves;
