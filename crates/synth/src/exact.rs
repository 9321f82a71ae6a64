//! A number as whole part plus fraction, so that days of seconds or revolutions keep their last
//! digits: the fraction is good to about 2e-16 whatever the whole part (below 2^53).

use serde::Serialize;
use std::ops::{Add, Sub};

/// whole + fraction, fraction in [0, 1). Used for seconds and for revolutions.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd, Serialize)]
pub struct Exact {
    /// Whole part (floor), |whole| < 2^53.
    pub whole: i64,
    /// Fraction, 0 <= fraction < 1.
    pub fraction: f64,
}

impl Exact {
    /// whole + offset; the offset may have any sign and size.
    #[must_use]
    pub fn new(whole: i64, offset: f64) -> Self {
        let floor = offset.floor();
        let fraction = offset - floor;
        let whole = whole.saturating_add(floor as i64);
        // a tiny negative offset rounds to a fraction of 1
        if fraction < 1.0 {
            Self { whole, fraction }
        } else {
            Self {
                whole: whole.saturating_add(1),
                fraction: 0.0,
            }
        }
    }

    /// The time of a sample, index / rate in seconds; index < 2^53.
    #[must_use]
    pub fn index_time(index: i64, rate_hz: f64) -> Self {
        let index = index as f64;
        let whole = (index / rate_hz).floor();
        let (product, error) = two_product(whole, rate_hz);
        Self::new(whole as i64, ((index - product) - error) / rate_hz)
    }

    /// Rounded to one f64.
    #[must_use]
    pub fn value(self) -> f64 {
        self.whole as f64 + self.fraction
    }

    /// self − origin, rounded once.
    #[must_use]
    pub fn since(self, origin: Self) -> f64 {
        self.whole.saturating_sub(origin.whole) as f64 + (self.fraction - origin.fraction)
    }

    /// self + offset.
    #[must_use]
    pub fn plus(self, offset: f64) -> Self {
        let floor = offset.floor();
        Self::new(
            self.whole.saturating_add(floor as i64),
            self.fraction + (offset - floor),
        )
    }

    /// self · factor; the product must stay below 2^53.
    #[must_use]
    pub fn scaled(self, factor: f64) -> Self {
        let (p, p_error) = two_product(self.whole as f64, factor);
        let (q, q_error) = two_product(self.fraction, factor);
        let (p_floor, q_floor) = (p.floor(), q.floor());
        Self::new(
            (p_floor as i64).saturating_add(q_floor as i64),
            (p - p_floor) + (q - q_floor) + (p_error + q_error),
        )
    }

    /// self · turns / per, exactly for the whole part.
    #[must_use]
    pub fn ratio(self, turns: i64, per: i64) -> Self {
        let product = i128::from(self.whole) * i128::from(turns);
        let per_wide = i128::from(per);
        let whole = product.div_euclid(per_wide) as i64;
        let rest = product.rem_euclid(per_wide) as f64;
        let (p, p_error) = two_product(self.fraction, turns as f64);
        Self::new(whole, ((rest + p) + p_error) / per as f64)
    }

    /// The part of a turn, −½ to ½, of self · factor: what a sine needs to know.
    pub(crate) fn turn(self, factor: f64) -> f64 {
        let (p, p_error) = two_product(self.whole as f64, factor);
        let turn = (p - p.round()) + p_error + self.fraction * factor;
        turn - turn.round()
    }
}

impl Add for Exact {
    type Output = Self;

    fn add(self, other: Self) -> Self {
        Self::new(
            self.whole.saturating_add(other.whole),
            self.fraction + other.fraction,
        )
    }
}

impl Sub for Exact {
    type Output = Self;

    fn sub(self, other: Self) -> Self {
        Self::new(
            self.whole.saturating_sub(other.whole),
            self.fraction - other.fraction,
        )
    }
}

impl From<f64> for Exact {
    fn from(value: f64) -> Self {
        Self::new(0, value)
    }
}

/// a·b = product + error without rounding (Dekker 1971, with a fused multiply-add).
fn two_product(a: f64, b: f64) -> (f64, f64) {
    let product = a * b;
    (product, a.mul_add(b, -product))
}
