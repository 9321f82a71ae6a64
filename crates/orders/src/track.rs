//! A shaft's angle grid laid over a recording.
//!
//! Grid sample i stands at angle i/M of the analysed shaft, M samples per revolution, counted from
//! the rotation's reference pulse. With the analysed shaft turning A times per B turns of the tach's
//! shaft that is tach angle i·B/(M·A): split into whole revolutions and a remainder in whole numbers,
//! so no ratio and no length of recording wears the angle out.

use shaftwise_rotation::{Piece, Rotation};
use shaftwise_signal::{InterpolationPlan, PyramidPlan, SamplePosition};
use std::sync::Arc;

/// Where a grid sample lies in the recording.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Instant {
    /// Whole sample of the recording.
    pub index: u64,
    /// The rest, 0…1.
    pub fraction: f64,
    /// Distance to the next grid sample, in samples of the recording, from the speed right there.
    pub step: f64,
}

/// A stretch of a section that counts, as grid samples.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Stretch {
    /// Section of the rotation.
    pub section: usize,
    /// First grid sample: the start of a whole revolution.
    pub first: i64,
    /// Number of grid samples.
    pub count: i64,
}

/// Reach of an analysis around an instant.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Limits {
    /// Length of the recording in samples.
    pub total_samples: u64,
    /// Further samples needed on either side, for filters in time.
    pub filter_reach: u64,
}

/// A rotation, a ratio and an angle grid.
#[derive(Debug, Clone)]
pub struct Track {
    rotation: Arc<Rotation>,
    turns: i128,
    per: i128,
    samples_per_rev: u32,
}

impl Track {
    /// Lays a grid of `samples_per_rev` over the shaft that turns `turns` times per `per` turns of
    /// the rotation's shaft; all three are at least 1.
    ///
    /// # Panics
    /// If one of them is 0.
    #[must_use]
    pub fn new(rotation: Arc<Rotation>, turns: u64, per: u64, samples_per_rev: u32) -> Self {
        assert!(
            turns > 0 && per > 0 && samples_per_rev > 0,
            "a grid of {samples_per_rev} samples at {turns}/{per}"
        );
        Self {
            rotation,
            turns: i128::from(turns),
            per: i128::from(per),
            samples_per_rev,
        }
    }

    /// The rotation.
    #[must_use]
    pub fn rotation(&self) -> &Rotation {
        &self.rotation
    }

    /// Samples per revolution of the analysed shaft.
    #[must_use]
    pub fn samples_per_rev(&self) -> u32 {
        self.samples_per_rev
    }

    /// Turns of the analysed shaft per turn of the rotation's shaft.
    #[must_use]
    pub fn ratio(&self) -> f64 {
        self.turns as f64 / self.per as f64
    }

    /// The angle of the rotation's shaft at a grid sample: whole revolutions and the rest.
    fn tach_angle(&self, index: i64) -> (i64, f64) {
        let whole = i128::from(self.samples_per_rev) * self.turns;
        // 64 bits hold all but the longest chains of gears, and divide several times as fast.
        if let (Ok(per), Ok(whole)) = (i64::try_from(self.per), i64::try_from(whole))
            && let Some(parts) = index.checked_mul(per)
        {
            let rest = parts.rem_euclid(whole);
            return (parts.div_euclid(whole), rest as f64 / whole as f64);
        }
        let parts = i128::from(index) * self.per;
        let rest = parts.rem_euclid(whole);
        (parts.div_euclid(whole) as i64, rest as f64 / whole as f64)
    }

    /// Grid place (not rounded) of an angle of the rotation's shaft.
    fn grid_place(&self, rev: i64, fraction: f64) -> f64 {
        (rev as f64 + fraction) * self.ratio() * f64::from(self.samples_per_rev)
    }

    /// Where grid sample `index` of a section lies.
    ///
    /// # Panics
    /// If there is no such section.
    #[must_use]
    pub fn instant(&self, section: usize, index: i64) -> Instant {
        let section = &self.rotation.sections[section];
        let (rev, fraction) = self.tach_angle(index);
        self.evaluate(&section.piece_at(rev, fraction), rev, fraction)
    }

    fn evaluate(&self, piece: &Piece, rev: i64, fraction: f64) -> Instant {
        let u =
            ((rev - piece.first_rev) as f64 + (fraction - piece.first_fraction)) / piece.width_rev;
        let c = &piece.coefficients;
        let offset = c.iter().rev().fold(0.0, |sum, c| sum * u + c);
        let slope = (1..c.len())
            .rev()
            .fold(0.0, |sum, k| sum * u + k as f64 * c[k])
            / piece.width_rev;
        let position = SamplePosition::new(piece.origin, offset);
        let per_grid_sample =
            self.per as f64 / (self.turns as f64 * f64::from(self.samples_per_rev));
        Instant {
            index: position.index,
            fraction: position.fraction,
            step: slope * per_grid_sample,
        }
    }

    /// Appends the instants of `count` grid samples of a section from `first` on.
    ///
    /// # Panics
    /// If there is no such section.
    pub fn instants(&self, section: usize, first: i64, count: usize, out: &mut Vec<Instant>) {
        let section = &self.rotation.sections[section];
        out.reserve(count);
        let mut piece: Option<Piece> = None;
        for index in first..first + count as i64 {
            let (rev, fraction) = self.tach_angle(index);
            let inside = |p: &Piece| {
                let place = (rev - p.first_rev) as f64 + (fraction - p.first_fraction);
                (0.0..p.width_rev).contains(&place)
            };
            let current = match piece {
                Some(current) if inside(&current) => current,
                _ => *piece.insert(section.piece_at(rev, fraction)),
            };
            out.push(self.evaluate(&current, rev, fraction));
        }
    }

    /// Samples of the recording touched on either side of an instant.
    #[must_use]
    pub fn reach(step: f64, levels: u32, filter_reach: u64) -> u64 {
        let scale = f64::from(2u32).powi(levels as i32);
        // Two more on each side: positions and the first sample of a level are rounded to its grid.
        ((InterpolationPlan::reach(step / scale) + 2) as u64) * (1u64 << levels)
            + PyramidPlan::reach(levels)
            + filter_reach
    }

    /// The part of a section between `from` and `to` that has all its neighbours in the recording,
    /// starting at a whole revolution of the analysed shaft; none if nothing is left.
    ///
    /// # Panics
    /// If there is no such section.
    #[must_use]
    pub fn stretch(
        &self,
        number: usize,
        from: SamplePosition,
        to: SamplePosition,
        limits: Limits,
    ) -> Option<Stretch> {
        let section = &self.rotation.sections[number];
        let (from, to) = (max(from, section.start()), min(to, section.end()));
        if !(to > from) {
            return None;
        }
        let per_rev = i64::from(self.samples_per_rev);
        let (rev, fraction) = section.angle_at(from);
        // A pulse is an instant of the grid: do not let rounding push it to the next revolution.
        let slack = 1e-9 * per_rev as f64;
        let start = self.grid_place(rev, fraction) - slack;
        let mut first = (start / per_rev as f64).ceil() as i64 * per_rev;
        let (rev, fraction) = section.angle_at(to);
        let mut last = (self.grid_place(rev, fraction) + slack).floor() as i64;
        let fits = |index: i64| {
            let instant = self.instant(number, index);
            let reach = Self::reach(
                instant.step,
                PyramidPlan::levels(instant.step),
                limits.filter_reach,
            );
            instant.index >= reach && instant.index + reach + 2 <= limits.total_samples
        };
        while first < last && !fits(first) {
            first += per_rev;
        }
        while last > first && !fits(last) {
            last -= 1;
        }
        (last > first).then_some(Stretch {
            section: number,
            first,
            count: last - first + 1,
        })
    }
}

fn max(a: SamplePosition, b: SamplePosition) -> SamplePosition {
    if a > b { a } else { b }
}

fn min(a: SamplePosition, b: SamplePosition) -> SamplePosition {
    if a < b { a } else { b }
}

/// Samples per revolution that carry orders up to `highest_order`: the next even number with no
/// prime factor above 5 at or over 2.56 times it (common practice, as for lines of a spectrum).
///
/// `highest_order` is above 0 and at most 1e6.
#[must_use]
pub fn samples_per_rev(highest_order: f64) -> u32 {
    let least = (2.56 * highest_order).ceil().max(2.0) as u32;
    (least..)
        .find(|n| {
            let mut rest = *n;
            for factor in [2, 3, 5] {
                while rest.is_multiple_of(factor) {
                    rest /= factor;
                }
            }
            rest == 1 && n.is_multiple_of(2)
        })
        .unwrap_or(u32::MAX)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn samples_per_revolution_follow_the_256_rule() {
        // Common practice: usable lines = N/2.56, so order 100 needs 256 samples a revolution.
        for (order, samples) in [
            (100.0, 256),
            (50.0, 128),
            (400.0, 1024),
            (10.0, 30),
            (0.5, 2),
            (51.0, 144),
        ] {
            assert_eq!(samples_per_rev(order), samples, "order {order}");
        }
    }
}
