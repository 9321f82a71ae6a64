//! Quantiles and equivalent numbers of averages.

use std::f64::consts::{PI, SQRT_2};

/// Natural log of Γ(x) for x > 0.
///
/// Stirling's series from x ≥ 12, reached by Γ(x+1) = xΓ(x); the first term left out is below
/// 3e-17 there (Abramowitz and Stegun 6.1.41).
fn ln_gamma(x: f64) -> f64 {
    let (mut x, mut shift) = (x, 1.0);
    while x < 12.0 {
        shift *= x;
        x += 1.0;
    }
    const TERMS: [f64; 7] = [
        1.0 / 12.0,
        -1.0 / 360.0,
        1.0 / 1260.0,
        -1.0 / 1680.0,
        1.0 / 1188.0,
        -691.0 / 360_360.0,
        1.0 / 156.0,
    ];
    let inverse_square = 1.0 / (x * x);
    let series = TERMS
        .iter()
        .rev()
        .fold(0.0, |sum, term| sum * inverse_square + term)
        / x;
    (x - 0.5) * x.ln() - x + 0.5 * (2.0 * PI).ln() + series - shift.ln()
}

/// Regularised incomplete gamma functions (P, Q) of shape `a` > 0 at `x` ≥ 0.
///
/// Power series below a + 1, continued fraction (modified Lentz) above, so the smaller of the
/// two is always the one computed (Abramowitz and Stegun 6.5.29 and 6.5.31).
fn incomplete_gamma(a: f64, x: f64) -> (f64, f64) {
    if !(x > 0.0) {
        return (0.0, 1.0);
    }
    let front = (a * x.ln() - x - ln_gamma(a)).exp();
    if x < a + 1.0 {
        let (mut term, mut sum, mut n) = (1.0 / a, 1.0 / a, a);
        while term > sum * 1e-17 {
            n += 1.0;
            term *= x / n;
            sum += term;
        }
        let p = front * sum;
        (p, 1.0 - p)
    } else {
        let mut b = x + 1.0 - a;
        let mut c = 1e300;
        let mut d = 1.0 / b;
        let mut h = d;
        // The fraction needs a few times sqrt(a) terms near x = a; 10 000 covers a to 1e6.
        for i in 1..10_000 {
            let i = f64::from(i);
            let an = -i * (i - a);
            b += 2.0;
            d = 1.0 / (an * d + b);
            c = b + an / c;
            let factor = c * d;
            h *= factor;
            if (factor - 1.0).abs() < 1e-16 {
                break;
            }
        }
        let q = front * h;
        (1.0 - q, q)
    }
}

/// Probability that χ² with `freedom` degrees of freedom exceeds `x`.
///
/// `freedom` > 0 need not be whole.
#[must_use]
pub fn chi_square_tail(x: f64, freedom: f64) -> f64 {
    incomplete_gamma(0.5 * freedom, 0.5 * x).1
}

/// The value that χ² with `freedom` degrees of freedom stays below with probability
/// `probability` (0 < probability < 1), relative error below 1e-10.
///
/// Starts from Wilson and Hilferty's cube (1931), ends with safeguarded Newton steps.
/// Returns NaN for arguments out of range.
#[must_use]
pub fn chi_square_quantile(probability: f64, freedom: f64) -> f64 {
    if !(probability > 0.0 && probability < 1.0 && freedom > 0.0 && freedom.is_finite()) {
        return f64::NAN;
    }
    let a = 0.5 * freedom;
    let spread = 2.0 / (9.0 * freedom);
    let cube = 1.0 - spread + normal_quantile(probability) * spread.sqrt();
    let mut x = 0.5 * freedom * cube.powi(3);
    // Far in the lower tail the cube turns negative: P ≈ x^a / Γ(a+1) there.
    let lower_tail = ((probability.ln() + ln_gamma(a + 1.0)) / a).exp();
    if !(x > 0.0) || cube < 0.3 {
        x = lower_tail;
    }
    let (mut low, mut high) = (0.0, f64::INFINITY);
    for _ in 0..200 {
        let (p, q) = incomplete_gamma(a, x);
        // Work on the smaller tail, where the difference keeps its digits.
        let miss = if probability < 0.5 {
            p - probability
        } else {
            (1.0 - probability) - q
        };
        if miss > 0.0 {
            high = x;
        } else {
            low = x;
        }
        let density = ((a - 1.0) * x.ln() - x - ln_gamma(a)).exp();
        let mut next = x - miss / density;
        if !(next > low && next < high) {
            next = if high.is_finite() {
                0.5 * (low + high)
            } else {
                2.0 * x
            };
        }
        if (next - x).abs() <= 1e-12 * x {
            x = next;
            break;
        }
        x = next;
    }
    2.0 * x
}

/// The value a standard normal variable stays below with probability `probability`,
/// absolute error below 1e-12. NaN outside 0 < probability < 1.
#[must_use]
pub fn normal_quantile(probability: f64) -> f64 {
    if !(probability > 0.0 && probability < 1.0) {
        return f64::NAN;
    }
    let tail = probability.min(1.0 - probability);
    // Abramowitz and Stegun 26.2.22 starts within 3e-3; Newton's method on
    // Q(z) = ½ Q_gamma(½, z²/2) finishes.
    let t = (-2.0 * tail.ln()).sqrt();
    let mut z = (t - (2.30753 + 0.27061 * t) / (1.0 + 0.99229 * t + 0.04481 * t * t)).max(0.0);
    for _ in 0..4 {
        let q = 0.5 * incomplete_gamma(0.5, 0.5 * z * z).1;
        let density = (-0.5 * z * z).exp() / (SQRT_2 * PI.sqrt());
        z += (q - tail) / density;
    }
    if probability < 0.5 { -z } else { z }
}

/// Number of independent blocks that scatter as much as `count` overlapping ones of **noise**:
/// K / (1 + 2 Σ_{m=1}^{K−1} (1 − m/K) c(m)²), with `correlation(m)` = c(m) the overlap
/// correlation of blocks m hops apart.
///
/// Source: P. D. Welch, IEEE Trans. Audio Electroacoust. AU-15 (1967), 70–73.
#[must_use]
pub fn equivalent_averages(count: u64, correlation: impl Fn(u64) -> f64) -> f64 {
    reduced_count(count, |m| correlation(m).powi(2))
}

/// As [`equivalent_averages`] for the product of a tone with noise, which is linear in the
/// noise: the correlation enters unsquared.
#[must_use]
pub fn tone_equivalent_averages(count: u64, correlation: impl Fn(u64) -> f64) -> f64 {
    reduced_count(count, correlation)
}

fn reduced_count(count: u64, correlation: impl Fn(u64) -> f64) -> f64 {
    if count == 0 {
        return 0.0;
    }
    let k = count as f64;
    let mut sum = 0.0;
    for m in 1..count {
        let c = correlation(m);
        // Blocks further apart than one block length share nothing.
        if c <= 0.0 {
            break;
        }
        sum += (1.0 - m as f64 / k) * c;
    }
    k / (1.0 + 2.0 * sum)
}

/// Median of the values, which are reordered; the mean of the middle two for an even count,
/// NaN for none. Values must not be NaN.
pub fn median_in_place(values: &mut [f64]) -> f64 {
    let n = values.len();
    if n == 0 {
        return f64::NAN;
    }
    let (left, middle, _) = values.select_nth_unstable_by(n / 2, f64::total_cmp);
    if n % 2 == 1 {
        *middle
    } else {
        let below = left.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        0.5 * (below + *middle)
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::{Window, WindowPlan};
    use approx::{assert_abs_diff_eq, assert_relative_eq};

    #[test]
    fn chi_square_limits_are_those_of_the_tables() {
        // Bendat and Piersol, Random Data, confidence limits of a spectral density
        // (n = 2 nd degrees of freedom): true/estimate at 90 %. Numbers recomputed with
        // scipy.stats.chi2.ppf.
        for (averages, low, high) in [
            (1.0, 0.3338, 19.496),
            (4.0, 0.5159, 2.9276),
            (8.0, 0.6085, 2.0096),
            (16.0, 0.6927, 1.5943),
            (32.0, 0.7649, 1.3735),
            (64.0, 0.8237, 1.2443),
            (100.0, 0.8547, 1.1885),
        ] {
            let n = 2.0 * averages;
            assert_abs_diff_eq!(n / chi_square_quantile(0.95, n), low, epsilon = 1e-4);
            assert_abs_diff_eq!(n / chi_square_quantile(0.05, n), high, epsilon = 1e-3);
        }
    }

    #[test]
    fn quantiles_invert_the_distribution_everywhere() {
        for freedom in [0.3, 1.0, 2.0, 7.5, 64.0, 1000.0, 2e5] {
            for p in [1e-9, 1e-4, 0.05, 0.3, 0.5, 0.9, 0.999, 1.0 - 1e-9] {
                let x = chi_square_quantile(p, freedom);
                let (below, above) = incomplete_gamma(0.5 * freedom, 0.5 * x);
                let (got, want) = if p < 0.5 {
                    (below, p)
                } else {
                    (above, 1.0 - p)
                };
                assert_relative_eq!(got, want, max_relative = 1e-7);
            }
        }
        // Two degrees of freedom are exponential: quantile -2 ln(1 - p).
        assert_relative_eq!(
            chi_square_quantile(0.9, 2.0),
            -2.0 * 0.1f64.ln(),
            max_relative = 1e-11
        );
        // From memory: the two-sided 95 % point of the normal law.
        assert_abs_diff_eq!(
            normal_quantile(0.975),
            1.959_963_984_540_054,
            epsilon = 1e-12
        );
        assert_abs_diff_eq!(
            normal_quantile(0.025),
            -1.959_963_984_540_054,
            epsilon = 1e-12
        );
    }

    #[test]
    fn overlapped_blocks_count_as_welch_1967_says() {
        // Keff of a record 16 blocks long, and Keff/K for many blocks (Welch 1967, recomputed).
        let plan = |w| WindowPlan::new(w, 4096).unwrap();
        let record = |p: &WindowPlan, hop: usize| {
            let k = ((16 * 4096 - 4096) / hop + 1) as u64;
            equivalent_averages(k, |m| p.overlap_correlation(m as usize * hop))
        };
        let hann = plan(Window::Hann);
        assert_abs_diff_eq!(record(&hann, 4096), 16.0, epsilon = 1e-12);
        assert_abs_diff_eq!(record(&hann, 2048), 29.42, epsilon = 0.005);
        assert_abs_diff_eq!(record(&hann, 1024), 31.96, epsilon = 0.005);
        assert_abs_diff_eq!(
            record(&plan(Window::Rectangular), 2048),
            20.89,
            epsilon = 0.005
        );
        assert_abs_diff_eq!(record(&plan(Window::Hamming), 2048), 28.03, epsilon = 0.005);
        assert_abs_diff_eq!(
            record(&plan(Window::BlackmanHarris), 1024),
            42.99,
            epsilon = 0.005
        );
        let many = 1_000_000;
        let ratio = equivalent_averages(many, |m| hann.overlap_correlation(m as usize * 2048));
        assert_abs_diff_eq!(ratio / many as f64, 0.9474, epsilon = 1e-4);
        let tone = tone_equivalent_averages(many, |m| hann.overlap_correlation(m as usize * 2048));
        assert_abs_diff_eq!(tone / many as f64, 0.75, epsilon = 1e-4);
    }

    #[test]
    fn medians_of_even_odd_and_none() {
        assert_eq!(median_in_place(&mut [3.0, 1.0, 2.0]), 2.0);
        assert_eq!(median_in_place(&mut [4.0, 1.0, 3.0, 2.0]), 2.5);
        assert!(median_in_place(&mut []).is_nan());
    }
}
