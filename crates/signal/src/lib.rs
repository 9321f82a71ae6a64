//! Windows, interpolation at given instants, FIR design, statistics and banded
//! solves. This crate knows samples and numbers, no shafts.

mod banded;
mod bounds;
mod bspline;
mod conversion;
mod error;
mod half_band;
mod interpolate;
mod kernel;
mod position;
mod statistics;
mod window;

pub use banded::*;
pub use bounds::{Bounds, LineScatter, level_bounds};
pub use bspline::*;
pub use conversion::{Conversion, ConversionPlan};
pub use error::Error;
pub use half_band::{HalfBand, PyramidPlan};
pub use interpolate::{InterpolationPlan, Taps};
pub use position::SamplePosition;
pub use statistics::{
    chi_square_quantile, chi_square_tail, equivalent_averages, median_in_place, normal_quantile,
    tone_equivalent_averages,
};
pub use window::{Window, WindowPlan};
