use std::ops::Range;

use plotters::coord::ranged1d::{KeyPointHint, NoDefaultFormatting, Ranged};

use crate::Error;
use crate::axis::{Axis, Scale};
use crate::figure::{MarkHeight, Panel, RuleWay};
use crate::ticks::Division;

/// Largest magnitude an open range reaches, so that differences stay finite.
const HUGE: f64 = 1e300;

/// Lowest and highest of what was seen; empty at first.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Extent(f64, f64);

impl Extent {
    pub(crate) const NONE: Self = Self(f64::INFINITY, f64::NEG_INFINITY);

    fn add(&mut self, value: f64, scale: Scale) {
        if value.is_finite() && (scale == Scale::Linear || value > 0.0) {
            let least = if scale == Scale::Log {
                1.0 / HUGE
            } else {
                -HUGE
            };
            self.0 = self.0.min(value.clamp(least, HUGE));
            self.1 = self.1.max(value.clamp(least, HUGE));
        }
    }

    pub(crate) fn with(self, other: Self) -> Self {
        Self(self.0.min(other.0), self.1.max(other.1))
    }

    pub(crate) fn is_empty(self) -> bool {
        self.0 > self.1
    }

    /// The abscissae of a panel's data.
    pub(crate) fn of_x(panel: &Panel) -> Self {
        let mut extent = Self::NONE;
        let scale = panel.x.scale;
        let columns = panel
            .series
            .iter()
            .map(|s| &s.x)
            .chain(panel.bands.iter().map(|b| &b.x));
        for &x in columns.chain(panel.marks.iter().map(|m| &m.x)).flatten() {
            extent.add(x, scale);
        }
        extent
    }

    /// The ordinates of a panel's data between two abscissae. A level nearby
    /// is included, one far off is not: it would press the data flat.
    pub(crate) fn of_y(panel: &Panel, (from, to): (f64, f64)) -> Self {
        let mut extent = Self::NONE;
        let scale = panel.y.scale;
        let mut column = |xs: &[f64], ys: &[f64]| {
            for (&x, &y) in xs.iter().zip(ys) {
                if x >= from && x <= to {
                    extent.add(y, scale);
                }
            }
        };
        for series in &panel.series {
            column(&series.x, &series.y);
        }
        for band in &panel.bands {
            column(&band.x, &band.lower);
            column(&band.x, &band.upper);
        }
        for marks in &panel.marks {
            if let MarkHeight::At(y) = &marks.height {
                column(&marks.x, y);
            }
        }
        for rule in panel.rules.iter().filter(|r| r.way == RuleWay::Across) {
            let span = extent.1 - extent.0;
            if scale == Scale::Log || (rule.at <= extent.1 + span && rule.at >= extent.0 - span) {
                extent.add(rule.at, scale);
            }
        }
        extent
    }

    /// A range that can be drawn: given if the axis says so, else what was
    /// seen, widened where that is a single value. `pad`: shares of the axis
    /// to leave free below and above.
    pub(crate) fn range(self, axis: &Axis, pad: (f64, f64)) -> Result<(f64, f64), Error> {
        let log = axis.scale == Scale::Log;
        if let Some((lower, upper)) = axis.range {
            let sound = lower.is_finite() && upper.is_finite() && upper - lower > 0.0;
            if !sound || (upper - lower).is_infinite() || (log && lower <= 0.0) {
                return Err(Error::Range {
                    axis: axis.label.clone(),
                    lower,
                    upper,
                });
            }
            return Ok((lower, upper));
        }
        let Self(mut lower, mut upper) = self;
        if self.is_empty() {
            (lower, upper) = if log { (0.1, 10.0) } else { (0.0, 1.0) };
        }
        if log {
            let (mut low, mut high) = (lower.log10(), upper.log10());
            if high - low < 0.01 {
                (low, high) = (low - 0.5, high + 0.5);
            }
            let span = (high - low) / (1.0 - pad.0 - pad.1).max(0.2);
            return Ok((
                10f64.powf(low - pad.0 * span),
                10f64.powf(high + pad.1 * span),
            ));
        }
        let (zero_below, zero_above) = (
            axis.from_zero && lower >= 0.0,
            axis.from_zero && upper <= 0.0,
        );
        if zero_below {
            lower = 0.0;
        }
        if zero_above {
            upper = 0.0;
        }
        // Below this a plot would show the last bits of the numbers.
        let least = 1e-9 * lower.abs().max(upper.abs());
        if upper - lower <= least {
            let half = if upper == 0.0 {
                1.0
            } else {
                0.05 * upper.abs()
            };
            lower -= half;
            upper += half;
        }
        let below = if zero_below { 0.0 } else { pad.0 };
        let above = if zero_above { 0.0 } else { pad.1 };
        let span = (upper - lower) / (1.0 - below - above).max(0.2);
        Ok((lower - below * span, upper + above * span))
    }
}

/// A value's place along an axis; the coordinate that plotters' meshes run on.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct AxisMap {
    pub(crate) lower: f64,
    pub(crate) upper: f64,
    pub(crate) scale: Scale,
    /// Where the lower and upper ends are, design pixels.
    pub(crate) from: f64,
    pub(crate) to: f64,
    pub(crate) division: Division,
}

impl AxisMap {
    /// 0 at the lower end, 1 at the upper; NaN where the scale has no place.
    fn fraction(&self, value: f64) -> f64 {
        match self.scale {
            Scale::Linear => (value - self.lower) / (self.upper - self.lower),
            Scale::Log if value > 0.0 => {
                (value.log10() - self.lower.log10()) / (self.upper.log10() - self.lower.log10())
            }
            Scale::Log => f64::NAN,
        }
    }

    /// Place on the page, design pixels.
    pub(crate) fn place(&self, value: f64) -> f64 {
        self.from + self.fraction(value) * (self.to - self.from)
    }

    pub(crate) fn holds(&self, value: f64) -> bool {
        value >= self.lower && value <= self.upper
    }
}

impl Ranged for AxisMap {
    type FormatOption = NoDefaultFormatting;
    type ValueType = f64;

    fn map(&self, value: &f64, limit: (i32, i32)) -> i32 {
        let (a, b) = (f64::from(limit.0), f64::from(limit.1));
        (a + self.fraction(*value) * (b - a)).round() as i32
    }

    fn key_points<Hint: KeyPointHint>(&self, hint: Hint) -> Vec<f64> {
        if hint.weight().allow_light_points() {
            // Between evenly spread numbers the ticks are enough.
            let fine = if self.scale == Scale::Log {
                &self.division.minor[..]
            } else {
                &[]
            };
            fine.to_vec()
        } else {
            self.division.major.iter().map(|t| t.value).collect()
        }
    }

    fn range(&self) -> Range<f64> {
        self.lower..self.upper
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn seen(values: &[f64], scale: Scale) -> Extent {
        let mut extent = Extent::NONE;
        for &v in values {
            extent.add(v, scale);
        }
        extent
    }

    #[test]
    fn an_open_range_is_never_empty() {
        let axis = Axis::linear("x");
        for values in [
            &[][..],
            &[f64::NAN],
            &[0.0],
            &[-7.5],
            &[1e308, -1e308],
            &[1.0, 1.0 + 1e-15],
            &[1e-320],
        ] {
            for axis in [axis.clone(), axis.clone().from_zero(), Axis::log("x")] {
                let (lower, upper) = seen(values, axis.scale).range(&axis, (0.05, 0.05)).unwrap();
                assert!(
                    upper > lower && (upper - lower).is_finite(),
                    "{values:?} {lower} {upper}"
                );
            }
        }
    }

    #[test]
    fn a_given_range_is_checked() {
        for bad in [
            (1.0, 1.0),
            (2.0, 1.0),
            (f64::NAN, 1.0),
            (0.0, f64::INFINITY),
        ] {
            assert!(
                Extent::NONE
                    .range(&Axis::linear("x").over(bad.0, bad.1), (0.0, 0.0))
                    .is_err()
            );
        }
        assert!(
            Extent::NONE
                .range(&Axis::log("x").over(0.0, 1.0), (0.0, 0.0))
                .is_err()
        );
    }

    #[test]
    fn zero_stays_at_the_foot_and_padding_is_a_share_of_the_axis() {
        let range = seen(&[2.0, 8.0], Scale::Linear)
            .range(&Axis::linear("x").from_zero(), (0.1, 0.2))
            .unwrap();
        assert_eq!(range, (0.0, 10.0));
    }
}
