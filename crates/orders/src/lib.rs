//! Angle grids and the averages fed from them. Knows no files, prints nothing and keeps the unit
//! it is given.

mod epoch;
mod error;
mod spectrum;
mod synchronous;
mod track;

pub use epoch::EPOCHS;
pub use error::Error;
pub use spectrum::{
    Average, AveragedSpectrum, SpectrumAccumulator, SpectrumConfig, SpectrumPlan, SpectrumScratch,
};
pub use synchronous::{
    OrderComponent, SynchronousAccumulator, SynchronousAverage, revolution_orders,
};
pub use track::{Instant, Limits, Stretch, Track, samples_per_rev};
