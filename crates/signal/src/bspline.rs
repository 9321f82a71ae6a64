//! The uniform quintic B-spline.
//!
//! s(x) = Σ_i c_i·B(x − i) over knots at whole x. On the interval [j, j + 1), with
//! u = x − j, the six coefficients c_j … c_{j+5} count, c_{j+k} with weight w_k(u); the
//! coefficient c_i is centred on the knot x = i − 2. The weights add up to 1, and
//! polynomials up to degree 5 are reproduced (C. de Boor, A Practical Guide to Splines, 1978).

/// Weights (1, 26, 66, 26, 1, 0)/120 at a knot.
const AT_KNOT: [f64; 6] = [
    1.0 / 120.0,
    26.0 / 120.0,
    66.0 / 120.0,
    26.0 / 120.0,
    1.0 / 120.0,
    0.0,
];

/// Row p: what u^p gets from each of the six coefficients, times 120.
const TO_POLYNOMIAL: [[f64; 6]; 6] = [
    [1.0, 26.0, 66.0, 26.0, 1.0, 0.0],
    [-5.0, -50.0, 0.0, 50.0, 5.0, 0.0],
    [10.0, 20.0, -60.0, 20.0, 10.0, 0.0],
    [-10.0, 20.0, 0.0, -20.0, 10.0, 0.0],
    [5.0, -20.0, 30.0, -20.0, 5.0, 0.0],
    [-1.0, 5.0, -10.0, 10.0, -5.0, 1.0],
];

/// Weights w_0 … w_5 of the six coefficients at u in [0, 1].
#[must_use]
pub fn quintic_weights(u: f64) -> [f64; 6] {
    if u == 0.0 {
        return AT_KNOT;
    }
    std::array::from_fn(|k| {
        TO_POLYNOMIAL
            .iter()
            .rev()
            .fold(0.0, |sum, row| sum * u + row[k])
            / 120.0
    })
}

/// dw_k/du at u in [0, 1].
#[must_use]
pub fn quintic_slopes(u: f64) -> [f64; 6] {
    std::array::from_fn(|k| {
        (1..6)
            .rev()
            .fold(0.0, |sum, p| sum * u + p as f64 * TO_POLYNOMIAL[p][k])
            / 120.0
    })
}

/// The polynomial Σ a_p·u^p, u in [0, 1), that six coefficients make of their interval.
#[must_use]
pub fn quintic_polynomial(coefficients: [f64; 6]) -> [f64; 6] {
    TO_POLYNOMIAL.map(|row| {
        row.iter()
            .zip(&coefficients)
            .map(|(m, c)| m * c)
            .sum::<f64>()
            / 120.0
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Cox–de Boor recursion on whole knots 0 … 6, the textbook way.
    fn textbook(degree: usize, x: f64) -> f64 {
        if degree == 0 {
            return f64::from(u8::from((0.0..1.0).contains(&x)));
        }
        let p = degree as f64;
        x / p * textbook(degree - 1, x) + (p + 1.0 - x) / p * textbook(degree - 1, x - 1.0)
    }

    #[test]
    fn weights_equal_the_recursion() {
        for i in 0..64 {
            let u = f64::from(i) / 64.0;
            for (k, w) in quintic_weights(u).iter().enumerate() {
                let truth = textbook(5, u + 5.0 - k as f64);
                // A dozen operations on numbers below 66/120.
                assert!((w - truth).abs() < 12.0 * f64::EPSILON, "{u} {k}");
            }
        }
    }

    #[test]
    fn weights_sum_to_one_and_their_slopes_to_zero() {
        for i in 0..=100 {
            let u = f64::from(i) / 100.0;
            assert!((quintic_weights(u).iter().sum::<f64>() - 1.0).abs() < 4.0 * f64::EPSILON);
            assert!(quintic_slopes(u).iter().sum::<f64>().abs() < 8.0 * f64::EPSILON);
            let step = 1e-5;
            let (a, b) = (quintic_weights(u - step), quintic_weights(u + step));
            for (k, slope) in quintic_slopes(u).iter().enumerate() {
                // Central difference: step²/6 of a third derivative below 10.
                assert!(
                    (slope - (b[k] - a[k]) / (2.0 * step)).abs() < 1e-9,
                    "{u} {k}"
                );
            }
        }
    }

    #[test]
    fn a_line_has_its_coefficients_on_the_knots_less_two() {
        let line = |x: f64| 3.0 + 7.0 * x;
        let c: [f64; 6] = std::array::from_fn(|k| line(k as f64 - 2.0));
        let a = quintic_polynomial(c);
        assert!((a[0] - 3.0).abs() < 1e-14 && (a[1] - 7.0).abs() < 1e-14);
        assert!(a[2..].iter().all(|v| v.abs() < 1e-14));
    }

    #[test]
    fn the_fifth_difference_is_the_fifth_derivative() {
        // Coefficients i^5: fifth difference 5! = 120, so a_5 = 120/5! = 1 on every interval.
        let c: [f64; 6] = std::array::from_fn(|k| (k as f64 - 2.0).powi(5));
        let a = quintic_polynomial(c);
        assert!((a[5] - 1.0).abs() < 1e-13);
        for i in 0..=10 {
            let u = f64::from(i) / 10.0;
            let by_weights: f64 = quintic_weights(u).iter().zip(&c).map(|(w, c)| w * c).sum();
            let by_polynomial = a.iter().rev().fold(0.0, |sum, v| sum * u + v);
            assert!((by_weights - by_polynomial).abs() < 1e-12);
        }
    }
}
