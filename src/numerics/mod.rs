//! Mathematics without acoustics: numbers with derivatives, counting and finding zeros.

pub mod analytic;
pub mod count;
pub mod dual;
pub mod fine;
mod hunt;
pub mod isolate;
pub mod lanes;
pub mod ledger;
pub mod number;
mod starts;
pub mod zeros;
