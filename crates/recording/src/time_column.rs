//! The sample rate out of a column of times.

use std::fs::File;

use crate::Error;
use crate::source::read_at;

/// Deviation from even spacing, in steps, that is put down to the writer of the
/// file beyond the rounding of its numbers.
const JITTER_STEPS: f64 = 0.1;

/// Rows whose steps the median is taken of.
const MEDIAN_ROWS: u64 = 1 << 16;

/// Collects what is needed of a time column while its rows pass; the times
/// themselves are read again from the first column of the spool.
pub(crate) struct TimeColumn {
    seconds_per_unit: f64,
    rows: u64,
    first: f64,
    last: f64,
    largest: f64,
    digits: u32,
}

/// A rate out of a time column.
#[derive(Debug, Clone, Copy)]
pub(crate) struct MeasuredRate {
    pub(crate) rate_hz: f64,
    /// Relative, from the rounding of the times.
    pub(crate) uncertainty: f64,
}

impl MeasuredRate {
    /// Said where the rounding of the times limits orders and levels.
    pub(crate) fn warning(&self) -> Option<String> {
        (self.uncertainty > 1e-5).then(|| {
            format!(
                "the digits of the time column settle the sample rate only within {:.1e} of {} Hz",
                self.uncertainty * self.rate_hz,
                self.rate_hz
            )
        })
    }
}

impl TimeColumn {
    pub(crate) fn new(seconds_per_unit: f64) -> Self {
        Self {
            seconds_per_unit,
            rows: 0,
            first: 0.0,
            last: 0.0,
            largest: 0.0,
            digits: 0,
        }
    }

    pub(crate) fn push(&mut self, time: f64, field: &[u8]) {
        if self.rows == 0 {
            self.first = time;
        }
        self.last = time;
        self.largest = self.largest.max(time.abs());
        self.rows += 1;
        self.digits = self.digits.max(significant_digits(field));
    }

    /// Spacing of the numbers as printed, in units of the column. Holds for
    /// fixed decimals, a fixed number of digits and shortest round-trip alike,
    /// since the digits are the most of any row and the size is the largest.
    fn resolution(&self) -> f64 {
        if self.largest == 0.0 {
            return 0.0;
        }
        let exponent = self.largest.log10().floor() as i32 + 1 - self.digits as i32;
        10f64.powi(exponent).max(self.largest * f64::EPSILON)
    }

    /// The rate, if the times kept in the first column of the spool are evenly
    /// spaced.
    pub(crate) fn rate(&self, spool: &File, frame_bytes: usize) -> Result<MeasuredRate, Error> {
        let useless = |reason: String| Err(Error::UselessTime { reason });
        if self.rows < 3 {
            return useless(format!("it has {} rows, expected at least 3", self.rows));
        }
        let span = self.last - self.first;
        let step = span / (self.rows - 1) as f64;
        if !(step > 0.0 && step.is_finite()) {
            return useless(format!(
                "it does not increase from {} to {}",
                self.first, self.last
            ));
        }
        let resolution = self.resolution();
        let mut worst = (0.0, 0);
        let mut steps = Vec::new();
        let mut previous = None;
        let mut buffer = vec![0u8; (1 << 18) / frame_bytes.min(1 << 18) * frame_bytes];
        let mut row = 0u64;
        while row < self.rows {
            let n =
                read_at(spool, &mut buffer, row * frame_bytes as u64).map_err(Error::reading)?;
            if n < frame_bytes {
                break;
            }
            for frame in buffer[..n].chunks_exact(frame_bytes) {
                let mut time = [0u8; 8];
                time.copy_from_slice(&frame[..8]);
                let time = f64::from_le_bytes(time);
                let off = (time - (self.first + row as f64 * step)).abs();
                if off > worst.0 {
                    worst = (off, row);
                }
                if let Some(previous) = previous.replace(time)
                    && row < MEDIAN_ROWS
                {
                    steps.push(time - previous);
                }
                row += 1;
            }
        }
        // Both ends of the line and the row itself are rounded by half a digit.
        let allowed = JITTER_STEPS * step + resolution;
        if worst.0 > allowed {
            let middle = steps.len() / 2;
            let (_, median, _) = steps.select_nth_unstable_by(middle, f64::total_cmp);
            let in_steps = if *median > 0.0 { *median } else { step };
            return Err(Error::UnevenTime {
                row: worst.1 + 1,
                off_steps: worst.0 / in_steps,
                step_s: in_steps * self.seconds_per_unit,
                allowed_steps: allowed / in_steps,
            });
        }
        // Times without a trace of rounding have a step of few digits, printed
        // in full.
        let exact = worst.0 <= 1e-6 * step;
        let uncertainty = if exact { worst.0 } else { resolution } / span;
        if uncertainty > 0.01 {
            return useless(format!(
                "its numbers are rounded to {resolution:e} over a span of {span:e}"
            ));
        }
        let rate = 1.0 / (step * self.seconds_per_unit);
        Ok(MeasuredRate {
            rate_hz: snap(rate, uncertainty + 8.0 * f64::EPSILON),
            uncertainty,
        })
    }
}

/// Digits from the first that is not 0 to the last.
fn significant_digits(field: &[u8]) -> u32 {
    let mantissa = field
        .iter()
        .take_while(|b| !b.eq_ignore_ascii_case(&b'e'))
        .filter(|b| b.is_ascii_digit());
    mantissa.skip_while(|&&b| b == b'0').count() as u32
}

/// The plainest rate within a relative tolerance: recorders run at round
/// numbers of Hz, and times are rounded when printed.
fn snap(rate: f64, tolerance: f64) -> f64 {
    let near = |candidate: f64| (candidate / rate - 1.0).abs() <= tolerance;
    // Multiples of a power of two times 100, of 44 100 Hz, and powers of two
    // come before other whole numbers.
    for grid in [
        25_600.0, 44_100.0, 8192.0, 1000.0, 100.0, 10.0, 1.0, 0.1, 0.01, 0.001,
    ] {
        let candidate = (rate / grid).round() * grid;
        // 1/1000 and the like are not exact; division of whole numbers is
        let candidate = if grid < 1.0 {
            (rate / grid).round() / (1.0 / grid).round()
        } else {
            candidate
        };
        if candidate > 0.0 && near(candidate) {
            return candidate;
        }
    }
    rate
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn digits_are_counted_from_the_first_that_says_something() {
        for (field, digits) in [
            ("0.000020", 2),
            ("-12.3450", 6),
            ("1.953E-05", 4),
            ("0", 0),
            ("0,5", 1),
        ] {
            assert_eq!(significant_digits(field.as_bytes()), digits, "{field}");
        }
    }

    #[test]
    fn a_rate_is_snapped_to_the_plainest_within_reach_only() {
        assert_eq!(snap(51_199.9, 1e-5), 51_200.0);
        assert_eq!(snap(51_199.9, 1e-7), 51_199.9);
        assert_eq!(snap(44_099.99, 1e-6), 44_100.0);
        assert_eq!(snap(1_234.000_1, 1e-6), 1234.0);
        assert_eq!(snap(0.1 + 1e-12, 1e-10), 0.1);
    }
}
