//! Windows for spectra.
//!
//! All windows are *DFT-even*: sample n of N is w(2πn/N), so that a window of N samples is one
//! period of its cosine series. Figures of merit follow F. J. Harris, "On the use of windows for
//! harmonic analysis with the discrete Fourier transform", Proc. IEEE 66(1), 1978:
//!
//! * coherent gain CG = (1/N) Σ w
//! * equivalent noise bandwidth ENBW = N Σ w² / (Σ w)², in lines
//! * overlap correlation `OC(h) = Σ w[n] w[n+h] / Σ w²`

use crate::Error;
use std::f64::consts::PI;

/// The shape of a window.
#[derive(Debug, Clone, Copy, PartialEq)]
#[non_exhaustive]
pub enum Window {
    /// No weighting: for blocks of whole revolutions.
    Rectangular,
    /// von Hann's window, ½ − ½cos z.
    Hann,
    /// Hamming's window, 0.54 − 0.46cos z.
    Hamming,
    /// Blackman–Harris, four terms, side lobes at −92 dB (Harris 1978).
    BlackmanHarris,
    /// Flat top HFT90D (Heinzel, Rüdiger, Schilling 2002): level error between lines at most 0.0039 dB.
    FlatTop,
    /// Kaiser–Bessel with shape β (`0..=60`); β 18 puts the side lobes below −130 dB.
    Kaiser {
        /// Shape; half the log of the side-lobe ratio, roughly.
        beta: f64,
    },
}

impl Window {
    /// The window's samples, `length` of them, largest value 1.
    ///
    /// # Errors
    /// [`Error::WindowLength`] for 0 samples, [`Error::KaiserBeta`] for a β outside 0…60.
    pub fn samples(self, length: usize) -> Result<Vec<f64>, Error> {
        if length == 0 {
            return Err(Error::WindowLength { found: 0 });
        }
        let angle = |n: usize| 2.0 * PI * n as f64 / length as f64;
        let cosine_sum = |terms: &[f64]| -> Vec<f64> {
            // Scaled so that the value at the centre, where the signs all agree, is 1.
            let top: f64 = terms.iter().sum();
            (0..length)
                .map(|n| {
                    terms
                        .iter()
                        .enumerate()
                        .map(
                            |(k, a)| if k % 2 == 0 { *a } else { -a } * (k as f64 * angle(n)).cos(),
                        )
                        .sum::<f64>()
                        / top
                })
                .collect()
        };
        Ok(match self {
            Self::Rectangular => vec![1.0; length],
            Self::Hann => cosine_sum(&[0.5, 0.5]),
            Self::Hamming => cosine_sum(&[0.54, 0.46]),
            Self::BlackmanHarris => cosine_sum(&[0.35875, 0.48829, 0.14128, 0.01168]),
            Self::FlatTop => cosine_sum(&[1.0, 1.942_604, 1.340_318, 0.440_811, 0.043_097]),
            Self::Kaiser { beta } => {
                if !(0.0..=60.0).contains(&beta) {
                    return Err(Error::KaiserBeta { found: beta });
                }
                let top = bessel_i0(beta);
                (0..length)
                    .map(|n| {
                        let x = 2.0 * n as f64 / length as f64 - 1.0;
                        bessel_i0(beta * (1.0 - x * x).max(0.0).sqrt()) / top
                    })
                    .collect()
            }
        })
    }
}

/// Modified Bessel function of the first kind, order 0, by its power series Σ (x²/4)^k / k!².
///
/// All terms are positive, so the sum keeps full precision for every argument used here (0…60).
pub(crate) fn bessel_i0(x: f64) -> f64 {
    let quarter = 0.25 * x * x;
    let (mut term, mut sum, mut k) = (1.0, 1.0, 1.0);
    while term > sum * 1e-17 {
        term *= quarter / (k * k);
        sum += term;
        k += 1.0;
    }
    sum
}

/// A window of one length with its figures of merit.
#[derive(Debug, Clone, PartialEq)]
pub struct WindowPlan {
    window: Window,
    samples: Vec<f64>,
    sum: f64,
    sum_of_squares: f64,
}

impl WindowPlan {
    /// Works the window out for blocks of `length` samples.
    ///
    /// # Errors
    /// As [`Window::samples`].
    pub fn new(window: Window, length: usize) -> Result<Self, Error> {
        let samples = window.samples(length)?;
        let sum = samples.iter().sum();
        let sum_of_squares = samples.iter().map(|w| w * w).sum();
        Ok(Self {
            window,
            samples,
            sum,
            sum_of_squares,
        })
    }

    /// The shape.
    #[must_use]
    pub fn window(&self) -> Window {
        self.window
    }

    /// The samples, largest value 1.
    #[must_use]
    pub fn samples(&self) -> &[f64] {
        &self.samples
    }

    /// Coherent gain (1/N) Σ w.
    #[must_use]
    pub fn coherent_gain(&self) -> f64 {
        self.sum / self.samples.len() as f64
    }

    /// Equivalent noise bandwidth in lines.
    #[must_use]
    pub fn noise_bandwidth_lines(&self) -> f64 {
        self.samples.len() as f64 * self.sum_of_squares / (self.sum * self.sum)
    }

    /// Correlation of noise in two blocks whose starts are `hop` samples apart, 0…1.
    #[must_use]
    pub fn overlap_correlation(&self, hop: usize) -> f64 {
        if hop >= self.samples.len() {
            return 0.0;
        }
        let shifted = &self.samples[hop..];
        let product: f64 = shifted.iter().zip(&self.samples).map(|(a, b)| a * b).sum();
        product / self.sum_of_squares
    }

    /// Response to a tone `offset` lines away from the line looked at, relative to a tone on it:
    /// |Σ w e^{−j2π·offset·n/N}| / Σ w.
    #[must_use]
    pub fn response(&self, offset: f64) -> f64 {
        let step = 2.0 * PI * offset / self.samples.len() as f64;
        let (mut re, mut im) = (0.0, 0.0);
        for (n, w) in self.samples.iter().enumerate() {
            let (s, c) = (step * n as f64).sin_cos();
            re += w * c;
            im += w * s;
        }
        re.hypot(im) / self.sum.abs()
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use approx::assert_abs_diff_eq;

    fn decibel(x: f64) -> f64 {
        20.0 * x.log10()
    }

    #[test]
    fn figures_of_merit_are_those_of_harris_1978() {
        // Harris, Proc. IEEE 66(1), Table I, recomputed for 4096 points: ENBW, scallop loss,
        // overlap correlation at 75 % and 50 %. Kaiser: beta = pi alpha, alpha 3.
        let cases = [
            (Window::Rectangular, 1.0, 3.9224, 75.0, 50.0),
            (Window::Hann, 1.5, 1.4236, 65.92, 16.67),
            (Window::Hamming, 1.3628, 1.7514, 70.69, 23.38),
            (Window::BlackmanHarris, 2.0044, 0.8256, 46.00, 3.76),
            (
                Window::Kaiser { beta: 3.0 * PI },
                1.7952,
                1.0226,
                53.92,
                7.35,
            ),
        ];
        for (window, enbw, scallop, at_75, at_50) in cases {
            let plan = WindowPlan::new(window, 4096).unwrap();
            assert_abs_diff_eq!(plan.noise_bandwidth_lines(), enbw, epsilon = 1e-4);
            assert_abs_diff_eq!(-decibel(plan.response(0.5)), scallop, epsilon = 2e-4);
            assert_abs_diff_eq!(
                100.0 * plan.overlap_correlation(1024),
                at_75,
                epsilon = 0.01
            );
            assert_abs_diff_eq!(
                100.0 * plan.overlap_correlation(2048),
                at_50,
                epsilon = 0.01
            );
        }
    }

    #[test]
    fn the_flat_top_is_that_of_heinzel_2002() {
        // Heinzel, Ruediger, Schilling, 15 Feb 2002: HFT90D has NENBW 3.8832 bins,
        // a largest amplitude error of 0.0039 dB, and a coherent gain of 1/4.766830 = .20978.
        let plan = WindowPlan::new(Window::FlatTop, 4096).unwrap();
        assert_abs_diff_eq!(plan.noise_bandwidth_lines(), 3.8832, epsilon = 1e-4);
        assert_abs_diff_eq!(plan.coherent_gain(), 0.20978, epsilon = 1e-5);
        let worst = (0..=50)
            .map(|i| decibel(plan.response(f64::from(i) / 100.0)).abs())
            .fold(0.0, f64::max);
        assert_abs_diff_eq!(worst, 0.0039, epsilon = 2e-4);
    }

    #[test]
    fn hann_is_exact() {
        // Closed form: CG 1/2, ENBW 3/2, OC(50 %) 1/6, scallop 3 pi / 8.
        let plan = WindowPlan::new(Window::Hann, 1000).unwrap();
        assert_abs_diff_eq!(plan.coherent_gain(), 0.5, epsilon = 1e-14);
        assert_abs_diff_eq!(plan.noise_bandwidth_lines(), 1.5, epsilon = 1e-13);
        assert_abs_diff_eq!(plan.overlap_correlation(500), 1.0 / 6.0, epsilon = 1e-13);
        assert_abs_diff_eq!(1.0 / plan.response(0.5), 3.0 * PI / 8.0, epsilon = 1e-5);
    }

    #[test]
    fn nonsense_is_refused() {
        assert_eq!(
            Window::Hann.samples(0),
            Err(Error::WindowLength { found: 0 })
        );
        assert!(Window::Kaiser { beta: f64::NAN }.samples(8).is_err());
        assert!(Window::Kaiser { beta: -1.0 }.samples(8).is_err());
    }
}
