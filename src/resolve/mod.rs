//! To come.

pub mod units;
