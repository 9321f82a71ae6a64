//! Integration and differentiation in time: from acceleration to velocity and back.
//!
//! A linear-phase FIR with the response H(f) = (j2πf)^p · G(f), p = −2…2, where G is a high-pass:
//! within 0.02 dB of one from twice the corner up to 0.8 of the Nyquist frequency, exactly zero for a
//! bias. Phase is exact by symmetry (odd p: antisymmetric taps; even p: symmetric).
//!
//! Design: the ideal response is transformed to taps, weighted with Kaiser's window (100 dB), and the
//! ideal corrected by what the window took away; the window smears a 1/f slope by m₂D''/2, and a
//! few rounds of that correction remove it.

use crate::Error;
use crate::window::bessel_i0;
use realfft::num_complex::Complex64;
use realfft::{ComplexToReal, RealFftPlanner, RealToComplex};
use std::f64::consts::PI;
use std::sync::Arc;

/// What to make of a channel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Conversion {
    /// Power p of j2πf: −1 integrates once, −2 twice, 1 and 2 differentiate. Range −2…2.
    pub power: i32,
    /// Corner of the high-pass in Hz: flat from twice this frequency on.
    pub corner_hz: f64,
}

/// Length of the impulse response in periods of the corner frequency.
const CORNER_PERIODS: f64 = 6.0;
/// Kaiser's β for 100 dB.
const BETA: f64 = 10.06;
/// Rounds of correction; each shrinks the window's error by more than half.
const ROUNDS: usize = 24;
/// Flat up to this share of the Nyquist frequency.
const TOP_EDGE: f64 = 0.8;

/// Taps and transforms of one conversion at one sample rate.
#[derive(Clone)]
pub struct ConversionPlan {
    conversion: Conversion,
    reach: usize,
    size: usize,
    response: Vec<Complex64>,
    forward: Arc<dyn RealToComplex<f64>>,
    inverse: Arc<dyn ComplexToReal<f64>>,
}

impl std::fmt::Debug for ConversionPlan {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("ConversionPlan")
            .field("conversion", &self.conversion)
            .field("reach", &self.reach)
            .finish()
    }
}

impl ConversionPlan {
    /// Designs the taps for signals sampled at `sample_rate_hz`.
    ///
    /// # Errors
    /// [`Error::SampleRate`] and [`Error::Corner`] for numbers out of range.
    pub fn new(conversion: Conversion, sample_rate_hz: f64) -> Result<Self, Error> {
        if !(sample_rate_hz > 0.0 && sample_rate_hz.is_finite()) {
            return Err(Error::SampleRate {
                found: sample_rate_hz,
            });
        }
        let corner = conversion.corner_hz;
        if !(corner > 0.0 && corner < 0.1 * sample_rate_hz) {
            return Err(Error::Corner {
                found: corner,
                highest: 0.1 * sample_rate_hz,
            });
        }
        let reach = Self::reach(conversion, sample_rate_hz);
        let taps = design(conversion, sample_rate_hz, reach);
        // Four times the taps: a quarter of each transform is overlap.
        let size = (4 * taps.len()).next_power_of_two();
        let mut planner = RealFftPlanner::new();
        let forward = planner.plan_fft_forward(size);
        let inverse = planner.plan_fft_inverse(size);
        let mut padded = forward.make_input_vec();
        padded[..taps.len()].copy_from_slice(&taps);
        let mut response = forward.make_output_vec();
        transform(&*forward, &mut padded, &mut response);
        for line in &mut response {
            *line /= size as f64;
        }
        Ok(Self {
            conversion,
            reach,
            size,
            response,
            forward,
            inverse,
        })
    }

    /// Samples needed on either side of an output sample, at this rate.
    #[must_use]
    pub fn reach(conversion: Conversion, sample_rate_hz: f64) -> usize {
        (0.5 * CORNER_PERIODS / conversion.corner_hz * sample_rate_hz).ceil() as usize
    }

    /// What this plan does.
    #[must_use]
    pub fn conversion(&self) -> Conversion {
        self.conversion
    }

    /// Converts `input`; output sample i belongs to input sample i + reach, so the output is
    /// 2·reach samples shorter (empty for a shorter input).
    pub fn process(&self, input: &[f64], out: &mut Vec<f64>) {
        out.clear();
        let overlap = 2 * self.reach;
        let total = input.len().saturating_sub(overlap);
        let hop = self.size - overlap;
        let mut time = self.forward.make_input_vec();
        let mut lines = self.forward.make_output_vec();
        let mut start = 0;
        while start < total {
            let part = &input[start..input.len().min(start + self.size)];
            time[..part.len()].copy_from_slice(part);
            time[part.len()..].fill(0.0);
            transform(&*self.forward, &mut time, &mut lines);
            for (line, response) in lines.iter_mut().zip(&self.response) {
                *line *= response;
            }
            back(&*self.inverse, &mut lines, &mut time);
            let count = hop.min(total - start);
            out.extend_from_slice(&time[overlap..overlap + count]);
            start += hop;
        }
    }
}

/// A transform of vectors the plan made itself cannot fail.
fn transform(plan: &dyn RealToComplex<f64>, time: &mut [f64], lines: &mut [Complex64]) {
    plan.process(time, lines)
        .expect("vectors of the plan's own length");
}

fn back(plan: &dyn ComplexToReal<f64>, lines: &mut [Complex64], time: &mut [f64]) {
    // The first and last line of a real signal are real; rounding may say otherwise.
    lines[0].im = 0.0;
    if let Some(last) = lines.last_mut() {
        last.im = 0.0;
    }
    plan.process(lines, time)
        .expect("vectors of the plan's own length");
}

/// Taps h[−reach…reach].
fn design(conversion: Conversion, sample_rate_hz: f64, reach: usize) -> Vec<f64> {
    let odd = conversion.power % 2 != 0;
    let size = (8 * reach).next_power_of_two();
    let mut planner = RealFftPlanner::new();
    let forward = planner.plan_fft_forward(size);
    let inverse = planner.plan_fft_inverse(size);
    let frequency = |k: usize| k as f64 * sample_rate_hz / size as f64;
    let corner = conversion.corner_hz;
    let top = 0.5 * sample_rate_hz;
    let target: Vec<f64> = (0..=size / 2)
        .map(|k| {
            let f = frequency(k);
            // Raised-cosine flanks: 0.2 to 1.8 of the corner, 0.8 to 1 of the Nyquist frequency.
            let low = ((f / corner - 0.2) / 1.6).clamp(0.0, 1.0);
            let high = ((top - f) / (top * (1.0 - TOP_EDGE))).clamp(0.0, 1.0);
            let flank = |x: f64| 0.5 - 0.5 * (PI * x).cos();
            if k == 0 {
                0.0
            } else {
                (2.0 * PI * f).powi(conversion.power) * flank(low) * flank(high)
            }
        })
        .collect();
    let turn = match conversion.power.rem_euclid(4) {
        0 => Complex64::new(1.0, 0.0),
        1 => Complex64::new(0.0, 1.0),
        2 => Complex64::new(-1.0, 0.0),
        _ => Complex64::new(0.0, -1.0),
    };
    let bessel_top = bessel_i0(BETA);
    let window: Vec<f64> = (0..=reach)
        .map(|n| {
            let u = n as f64 / (reach + 1) as f64;
            bessel_i0(BETA * (1.0 - u * u).sqrt()) / bessel_top
        })
        .collect();
    let mut ideal = target.clone();
    let mut time = forward.make_input_vec();
    let mut lines = forward.make_output_vec();
    for round in 0..ROUNDS {
        for (line, d) in lines.iter_mut().zip(&ideal) {
            *line = turn * d;
        }
        back(&*inverse, &mut lines, &mut time);
        for (n, value) in time.iter_mut().enumerate() {
            let distance = n.min(size - n);
            *value *= if distance <= reach {
                window[distance] / size as f64
            } else {
                0.0
            };
        }
        if odd {
            time[0] = 0.0;
        } else {
            // No bias comes through: take the rest out along the window's own shape.
            let sum: f64 = time.iter().sum();
            let area = window[0] + 2.0 * window[1..].iter().sum::<f64>();
            for (n, value) in time.iter_mut().enumerate() {
                let distance = n.min(size - n);
                if distance <= reach {
                    *value -= sum * window[distance] / area;
                }
            }
        }
        if round + 1 == ROUNDS {
            break;
        }
        let mut copy = time.clone();
        transform(&*forward, &mut copy, &mut lines);
        for ((d, line), want) in ideal.iter_mut().zip(&lines).zip(&target) {
            *d += want - (line * turn.conj()).re;
        }
    }
    (0..=2 * reach)
        .map(|i| time[(i + size - reach) % size])
        .collect()
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn tones_above_twice_the_corner_keep_level_and_phase_under_a_large_bias() {
        let rate = 3200.0;
        for power in [-2, -1, 1, 2] {
            let plan = ConversionPlan::new(
                Conversion {
                    power,
                    corner_hz: 10.0,
                },
                rate,
            )
            .unwrap();
            for f in [20.0, 20.7, 25.0, 33.3, 77.7, 200.0, 500.0, 900.0, 1248.0] {
                let input: Vec<f64> = (0..12000)
                    .map(|n| 100.0 + (2.0 * PI * f * n as f64 / rate).cos())
                    .collect();
                let mut out = Vec::new();
                plan.process(&input, &mut out);
                assert_eq!(out.len(), input.len() - 2 * plan.reach);
                let gain = (2.0 * PI * f).powi(power);
                let shift = 0.5 * PI * f64::from(power);
                let worst = out
                    .iter()
                    .enumerate()
                    .map(|(i, y)| {
                        let t = (i + plan.reach) as f64 / rate;
                        (y / gain - (2.0 * PI * f * t + shift).cos()).abs()
                    })
                    .fold(0.0, f64::max);
                // 0.02 dB of level is 0.0023.
                assert!(worst < 0.0023, "power {power}, {f} Hz: {worst:e}");
            }
        }
    }

    #[test]
    fn a_bias_alone_gives_nothing() {
        for power in [-2, -1, 1, 2] {
            let plan = ConversionPlan::new(
                Conversion {
                    power,
                    corner_hz: 2.0,
                },
                800.0,
            )
            .unwrap();
            let mut out = Vec::new();
            plan.process(&vec![100.0; 9000], &mut out);
            let unit = (2.0 * PI * 4.0f64).powi(power);
            assert!(
                out.iter().all(|y| y.abs() < 1e-9 * unit.max(1.0)),
                "power {power}"
            );
        }
    }

    #[test]
    fn numbers_out_of_range_are_refused() {
        let c = |corner_hz| Conversion {
            power: -1,
            corner_hz,
        };
        assert!(ConversionPlan::new(c(0.0), 1000.0).is_err());
        assert!(ConversionPlan::new(c(f64::NAN), 1000.0).is_err());
        assert!(ConversionPlan::new(c(100.0), 1000.0).is_err());
        assert!(ConversionPlan::new(c(10.0), f64::INFINITY).is_err());
    }
}
