//! What was planted in the tach channels.

use crate::Exact;
use serde::Serialize;

/// The planted truth of all tach channels.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Truth {
    /// One entry per channel with pulses, in channel order.
    pub tachs: Vec<TachTruth>,
}

/// The planted truth of one tach channel.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct TachTruth {
    /// Index of the channel, from 0.
    pub channel: usize,
    /// All true pulses whose leading 50 % crossing lies within the recording, in time order, lost
    /// ones included.
    pub pulses: Vec<Pulse>,
    /// Stray pulses within the recording, rising times, s. Second pulses of doubled ones are not
    /// among them.
    pub strays_s: Vec<f64>,
}

/// A true pulse.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Pulse {
    /// Number: revolution · pulses per revolution + tooth.
    pub number: i64,
    /// Exact time of the leading edge's 50 % crossing, s from the first sample.
    pub time: Exact,
    /// It does not show in the channel.
    pub missing: bool,
    /// Exact time of the second, false, pulse that follows it.
    pub doubled: Option<Exact>,
}

impl TachTruth {
    /// Times of all true pulses, s, lost ones included.
    #[must_use]
    pub fn times_s(&self) -> Vec<f64> {
        self.pulses.iter().map(|pulse| pulse.time.value()).collect()
    }

    /// Numbers of the lost pulses.
    #[must_use]
    pub fn missing(&self) -> Vec<i64> {
        let lost = self.pulses.iter().filter(|pulse| pulse.missing);
        lost.map(|pulse| pulse.number).collect()
    }
}
