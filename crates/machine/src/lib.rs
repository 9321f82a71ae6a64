//! Exact ratios of shafts. This crate knows no signals.

mod ratio;

pub use ratio::{Ratio, RatioError};
