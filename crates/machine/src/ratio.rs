//! Exact ratio of two shafts.

use std::fmt;

/// How many times one shaft turns for a number of turns of another, as an exact fraction.
///
/// `Ratio::new(23, 57)` is a shaft that turns 23 times while the reference shaft turns 57
/// times. Kept in lowest terms, so that equal ratios compare equal and a long chain of gears
/// never drifts, as a product of `f64` ratios would.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub struct Ratio {
    turns: u64,
    per: u64,
}

/// Why a ratio was refused.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum RatioError {
    /// One side is zero.
    #[error("a ratio needs two whole numbers of at least 1, found {turns}/{per}")]
    Zero {
        /// Turns of the shaft.
        turns: u64,
        /// Turns of the reference shaft.
        per: u64,
    },
    /// A chain of ratios leaves the range of 64-bit whole numbers.
    #[error("the chain of ratios {left} x {right} does not fit whole numbers of 64 bits")]
    TooLarge {
        /// First factor.
        left: Ratio,
        /// Second factor.
        right: Ratio,
    },
    /// The text is not `A/B` or `A`.
    #[error("a ratio is written A/B with whole numbers, such as 23/57; found '{found}'")]
    Text {
        /// What was written.
        found: String,
    },
}

impl Ratio {
    /// The shaft that turns with the reference shaft.
    pub const ONE: Self = Self { turns: 1, per: 1 };

    /// `turns` of the shaft per `per` turns of the reference shaft, in lowest terms.
    ///
    /// # Errors
    /// [`RatioError::Zero`] when either number is 0.
    pub fn new(turns: u64, per: u64) -> Result<Self, RatioError> {
        if turns == 0 || per == 0 {
            return Err(RatioError::Zero { turns, per });
        }
        let common = gcd(turns, per);
        Ok(Self {
            turns: turns / common,
            per: per / common,
        })
    }

    /// Reads `A/B` or `A`.
    ///
    /// # Errors
    /// [`RatioError::Text`] when the text is something else, [`RatioError::Zero`] for a zero.
    pub fn parse(text: &str) -> Result<Self, RatioError> {
        let wrong = || RatioError::Text {
            found: text.to_owned(),
        };
        let (turns, per) = text.split_once('/').unwrap_or((text, "1"));
        let turns = turns.trim().parse().map_err(|_| wrong())?;
        let per = per.trim().parse().map_err(|_| wrong())?;
        Self::new(turns, per)
    }

    /// Turns of the shaft, in lowest terms.
    #[must_use]
    pub fn turns(self) -> u64 {
        self.turns
    }

    /// Turns of the reference shaft, in lowest terms.
    #[must_use]
    pub fn per(self) -> u64 {
        self.per
    }

    /// The ratio as a number, rounded once.
    #[must_use]
    pub fn value(self) -> f64 {
        self.turns as f64 / self.per as f64
    }

    /// This ratio followed by another: exact.
    ///
    /// # Errors
    /// [`RatioError::TooLarge`] when the result does not fit.
    pub fn then(self, next: Self) -> Result<Self, RatioError> {
        // Cross-cancel first: the product of reduced fractions is then already reduced.
        let a = gcd(self.turns, next.per);
        let b = gcd(next.turns, self.per);
        let too_large = || RatioError::TooLarge {
            left: self,
            right: next,
        };
        Ok(Self {
            turns: (self.turns / a)
                .checked_mul(next.turns / b)
                .ok_or_else(too_large)?,
            per: (self.per / b)
                .checked_mul(next.per / a)
                .ok_or_else(too_large)?,
        })
    }
}

impl fmt::Display for Ratio {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}/{}", self.turns, self.per)
    }
}

fn gcd(a: u64, b: u64) -> u64 {
    if b == 0 { a } else { gcd(b, a % b) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_gear_train_of_prime_tooth_numbers_stays_exact() {
        let first = Ratio::new(23, 57).unwrap();
        let second = Ratio::new(57, 23).unwrap();
        assert_eq!(first.then(second).unwrap(), Ratio::ONE);
        // 23 teeth drive 57: the wheel turns 0.403509 times (arithmetic).
        assert!((first.value() - 0.403_508_771_929_824_56).abs() < 1e-16);
    }

    #[test]
    fn text_round_trips_in_lowest_terms() {
        assert_eq!(Ratio::parse(" 46 / 114 ").unwrap().to_string(), "23/57");
        assert_eq!(Ratio::parse("3").unwrap(), Ratio::new(3, 1).unwrap());
        assert!(Ratio::parse("0/3").is_err());
        assert!(Ratio::parse("2.5/3").is_err());
        assert!(Ratio::parse("").is_err());
    }

    #[test]
    fn a_chain_that_overflows_says_so() {
        let huge = Ratio::new(u64::MAX, 2).unwrap();
        assert!(matches!(huge.then(huge), Err(RatioError::TooLarge { .. })));
    }
}
