//! Peaks, bounds, verdicts and comparisons drawn from averages.

mod compare;
mod lobe;
mod spectrum;

pub use compare::{ComparedPeak, SmearModel, compare_peak, peak_zones};
pub use lobe::WindowLobe;
pub use spectrum::{Peak, SpectrumFindings, SpectrumReading, Verdict, read_spectrum};
