//! Mathematics without acoustics: numbers with derivatives, counting and finding zeros.

pub mod dual;
