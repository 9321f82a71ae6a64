//! Bounds of an averaged level that is part tone, part noise.
//!
//! The averaged power P of a line that holds a tone of power Ŝ in noise of power ŝ² scatters as
//!
//! Var P = 2 Ŝ ŝ² / K₁ + ŝ⁴ / K₂
//!
//! with K₂ the equivalent averages of noise and K₁ those of the tone–noise product. The
//! law is taken as χ² with the same mean and variance, ν = 2P²/Var (2K₂ when no tone is left),
//! which gives the bounds νP/χ²(1−q; ν) … νP/χ²(q; ν). Plain χ² with 2K degrees of freedom would
//! cover tones far too widely.

use crate::chi_square_quantile;

/// What the scatter of a line rests on.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LineScatter {
    /// Noise power in the line, in the square of the unit; not negative.
    pub noise_power: f64,
    /// Equivalent averages of the tone–noise product, K₁ > 0.
    pub tone_averages: f64,
    /// Equivalent averages of noise, K₂ > 0.
    pub noise_averages: f64,
    /// Relative variance of the tone's power that no average removes (scallop, angle scatter); not negative.
    pub systematic_variance: f64,
}

/// A level's bounds, as power.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bounds {
    /// Lower bound of the expected power.
    pub lower: f64,
    /// Upper bound of the expected power.
    pub upper: f64,
    /// Degrees of freedom the bounds rest on.
    pub freedom: f64,
}

/// Bounds that hold the expected power of a line with probability `confidence` (0…1, two-sided)
/// when the average came out at `power` ≥ 0.
#[must_use]
pub fn level_bounds(power: f64, scatter: &LineScatter, confidence: f64) -> Bounds {
    let noise = scatter.noise_power.min(power);
    let tone = (power - noise).max(0.0);
    let freedom = if tone > 0.0 {
        let variance = 2.0 * tone * noise / scatter.tone_averages
            + noise * noise / scatter.noise_averages
            + tone * tone * scatter.systematic_variance;
        2.0 * power * power / variance
    } else {
        2.0 * scatter.noise_averages
    };
    if !(freedom < 1e12) {
        return Bounds {
            lower: power,
            upper: power,
            freedom,
        };
    }
    let tail = 0.5 * (1.0 - confidence);
    Bounds {
        lower: freedom * power / chi_square_quantile(1.0 - tail, freedom),
        upper: freedom * power / chi_square_quantile(tail, freedom),
        freedom,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_abs_diff_eq;

    #[test]
    fn pure_noise_has_the_chi_square_bounds() {
        // 16 averages at 90 %: 0.6927 … 1.5943 (Bendat and Piersol; recomputed).
        let scatter = LineScatter {
            noise_power: 1.0,
            tone_averages: 12.0,
            noise_averages: 16.0,
            systematic_variance: 0.0,
        };
        let bounds = level_bounds(1.0, &scatter, 0.9);
        assert_abs_diff_eq!(bounds.lower, 0.6927, epsilon = 1e-4);
        assert_abs_diff_eq!(bounds.upper, 1.5943, epsilon = 1e-4);
    }

    #[test]
    fn a_strong_tone_is_bounded_by_its_product_with_the_noise() {
        // 60 dB over noise, K1 = 12: relative s.d. sqrt(2e-6/12) = 4.08e-4 of power; 1.645 of it
        // either way, 0.0029 dB.
        let scatter = LineScatter {
            noise_power: 1e-6,
            tone_averages: 12.0,
            noise_averages: 16.0,
            systematic_variance: 0.0,
        };
        let bounds = level_bounds(1.0, &scatter, 0.9);
        assert_abs_diff_eq!(bounds.upper - 1.0, 1.645 * 4.08e-4, epsilon = 2e-6);
        assert_abs_diff_eq!(1.0 - bounds.lower, 1.645 * 4.08e-4, epsilon = 2e-6);
    }

    #[test]
    fn silence_is_bounded_by_silence() {
        let scatter = LineScatter {
            noise_power: 0.0,
            tone_averages: 12.0,
            noise_averages: 16.0,
            systematic_variance: 0.0,
        };
        let bounds = level_bounds(0.0, &scatter, 0.9);
        assert_eq!((bounds.lower, bounds.upper), (0.0, 0.0));
    }
}
