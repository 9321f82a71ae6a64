//! Windows, FFT plans, interpolation at given instants, FIR design, statistics
//! and banded solves. This crate knows samples and numbers, no shafts.

mod banded;
mod bspline;
mod position;

pub use banded::*;
pub use bspline::*;
pub use position::SamplePosition;
