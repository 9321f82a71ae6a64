//! What this crate refuses.

/// Why a plan could not be made.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum Error {
    /// A window needs at least one sample.
    #[error("window length {found}, expected at least 1 sample")]
    WindowLength {
        /// The length asked for.
        found: usize,
    },
    /// The Kaiser window's shape is out of range.
    #[error("Kaiser window beta {found}, expected 0 to 60")]
    KaiserBeta {
        /// The value asked for.
        found: f64,
    },
    /// A sample rate that is no rate.
    #[error("sample rate {found} Hz, expected a positive number")]
    SampleRate {
        /// The value asked for.
        found: f64,
    },
    /// A corner frequency outside what the rate can carry.
    #[error(
        "high-pass corner {found} Hz, expected above 0 and below {highest} Hz (a tenth of the sample rate)"
    )]
    Corner {
        /// The value asked for, in Hz.
        found: f64,
        /// The highest allowed, in Hz.
        highest: f64,
    },
}
