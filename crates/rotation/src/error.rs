//! Why no rotation could be made.

/// Fault of the tach, its settings or its pulses.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum Error {
    /// A sample rate that is no rate.
    #[error("sample rate {found} Hz, expected a positive number")]
    SampleRate {
        /// The value given.
        found: f64,
    },
    /// A number of pulses per revolution out of range.
    #[error("{found} pulses per revolution, expected 1 to {most}")]
    PulsesPerRev {
        /// The value given.
        found: u32,
        /// The largest allowed.
        most: u32,
    },
    /// A setting that is not a finite number.
    #[error("{what} of {found}, expected a finite number")]
    Setting {
        /// Which setting.
        what: &'static str,
        /// The value given.
        found: f64,
    },
    /// The tach channel holds something that is not a number.
    #[error("tach sample {index} is {found}, expected finite numbers")]
    NotFinite {
        /// Index of the first such sample.
        index: u64,
        /// Its value.
        found: f64,
    },
    /// The tach channel never changes.
    #[error("tach channel is constant at {level} over {samples} samples, expected pulses")]
    Constant {
        /// Its level, in the channel's unit.
        level: f64,
        /// Samples seen.
        samples: u64,
    },
    /// Too few pulses.
    #[error("{found} usable pulses, expected at least {least}")]
    TooFewPulses {
        /// Pulses found.
        found: usize,
        /// The least number of them.
        least: usize,
    },
    /// Pulse times out of order or not numbers.
    #[error("pulse time {number} is {found} s after {previous} s, expected rising finite times")]
    TimeOrder {
        /// Which one, counted from 1.
        number: usize,
        /// The time.
        found: f64,
        /// The time before it.
        previous: f64,
    },
    /// The smoother's equations could not be solved.
    #[error("motion between the pulses could not be worked out near sample {near}")]
    Unsolvable {
        /// Index of the sample.
        near: u64,
    },
}

impl Error {
    /// What to try, as a sentence without a full stop.
    #[must_use]
    pub fn hint(&self) -> &'static str {
        match self {
            Self::SampleRate { .. } => "state the sample rate of the recording",
            Self::PulsesPerRev { .. } => {
                "count the marks or teeth that pass the sensor in one turn"
            }
            Self::Setting { .. } => "give a plain number in the unit the setting names",
            Self::NotFinite { .. } => {
                "export the recording again; it holds gaps or overflows on the tach channel"
            }
            Self::Constant { .. } => "is this the tach's channel, and was the sensor powered?",
            Self::TooFewPulses { .. } => {
                "look at the tach channel: is it the right one, does the shaft turn, is the \
                 threshold within the pulse?"
            }
            Self::TimeOrder { .. } => "give seconds from the first sample, one a line, in order",
            Self::Unsolvable { .. } => "leave that stretch out",
        }
    }
}
