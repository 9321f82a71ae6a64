//! Interpolation at given instants, with a cut-off that follows the step between them.
//!
//! The value at position t (in samples) is `Σ_j x[j] h(j − t)`, with the windowed sinc
//!
//! h(d) ∝ sin(π s d)/d · W((s d / H)²),  s = min(1, 1/step)
//!
//! so the cut-off is half the *output* rate wherever the output is the coarser side, and follows a
//! changing step without a jump. W is Kaiser's window, written as a polynomial, and H = 22 the
//! half width in samples of the coarser side. The weights of each instant are scaled to sum to
//! one: a bias, however large, comes through exactly.
//!
//! * Pass band: up to 0.39 of the coarser rate (0.78 of its Nyquist frequency).
//! * Stop band: from 0.61 of it, so whatever folds lands above the pass band.
//! * Design: Kaiser's formulas for a transition of 0.22 with 44 taps give β = 15.2 at 147 dB
//!   (J. F. Kaiser, 1974; formulas as in Oppenheim and Schafer, from memory).

use crate::kernel::{CpuLevel, LANES, WeightShape, dot, fill_weights};
use crate::window::bessel_i0;

/// Half width of the kernel in samples of the coarser side.
const HALF_WIDTH: f64 = 22.0;
/// Kaiser's β for 44 taps over a transition of 0.22: A = 7.95 + 14.36 · 44 · 0.22 = 147 dB,
/// β = 0.1102 (A − 8.7).
const BETA: f64 = 15.24;
/// Largest error of the window's polynomial, relative to the window's top.
const WINDOW_ERROR: f64 = 1e-10;

/// Pass band edge as a fraction of the coarser of the two rates.
pub(crate) const PASS_EDGE: f64 = 0.39;
/// Stop band edge as a fraction of the coarser of the two rates.
pub(crate) const STOP_EDGE: f64 = 1.0 - PASS_EDGE;

/// The weights of one instant, made by [`InterpolationPlan::taps`], good for every channel.
#[derive(Debug, Clone, Default)]
pub struct Taps {
    first: i64,
    weights: Vec<f64>,
    scale: f64,
}

impl Taps {
    /// Index of the first sample used.
    #[must_use]
    pub fn first(&self) -> i64 {
        self.first
    }

    /// One past the last sample touched (the last few may have weight 0).
    #[must_use]
    pub fn end(&self) -> i64 {
        self.first + self.weights.len() as i64
    }

    /// Σ over the taps of `samples`, whose first element is sample `start`.
    ///
    /// # Panics
    /// If the taps reach outside `samples`.
    #[must_use]
    pub fn apply(&self, plan: &InterpolationPlan, samples: &[f64], start: i64) -> f64 {
        let offset = usize::try_from(self.first - start).expect("taps start before the samples");
        self.scale * dot(plan.level, &self.weights, &samples[offset..])
    }
}

/// Kernel tables, shared by all threads.
#[derive(Debug, Clone)]
pub struct InterpolationPlan {
    polynomial: Vec<f64>,
    level: CpuLevel,
}

impl Default for InterpolationPlan {
    fn default() -> Self {
        Self::new()
    }
}

impl InterpolationPlan {
    /// Makes the tables.
    #[must_use]
    pub fn new() -> Self {
        Self {
            polynomial: window_polynomial(),
            level: CpuLevel::detect(),
        }
    }

    /// The same plan on plain instructions: the twin the fast one is checked against.
    #[must_use]
    pub fn portable() -> Self {
        Self {
            level: CpuLevel::Portable,
            ..Self::new()
        }
    }

    /// Name of the instruction set in use: results agree to 1e-12 between sets, to the byte within one.
    #[must_use]
    pub fn cpu_level(&self) -> &'static str {
        match self.level {
            CpuLevel::Portable => "portable",
            // One level: the wider registers give the same bits.
            CpuLevel::Avx2Fma | CpuLevel::Avx512 => "avx2+fma",
        }
    }

    /// Samples that may be touched on either side of an instant with this output step
    /// (in samples, above 0).
    #[must_use]
    pub fn reach(step: f64) -> usize {
        (HALF_WIDTH * step.max(1.0)) as usize + LANES
    }

    /// Highest frequency passed unchanged, as a fraction of the lower of input and output rate.
    #[must_use]
    pub fn pass_edge() -> f64 {
        PASS_EDGE
    }

    /// Weights at `index + fraction` samples (`fraction` in 0…1) for an output step of `step`
    /// samples (above 0).
    pub fn taps(&self, index: i64, fraction: f64, step: f64, taps: &mut Taps) {
        let scale = 1.0 / step.max(1.0);
        let nearest = i64::from(fraction > 0.5);
        let reach = (HALF_WIDTH / scale) as usize;
        let length = (2 * reach + 1).next_multiple_of(LANES);
        taps.first = index + nearest - reach as i64;
        // Every weight is written below.
        taps.weights.resize(length, 0.0);
        let shape = WeightShape {
            scale,
            fraction: fraction - nearest as f64,
            reach,
            inverse_square_half_width: 1.0 / (HALF_WIDTH * HALF_WIDTH),
            polynomial: &self.polynomial,
        };
        taps.scale = 1.0 / fill_weights(self.level, &shape, &mut taps.weights);
    }
}

/// W as a polynomial in y = 1 − 2u, u = (x/H)², on −1…1: Chebyshev's expansion of
/// I₀(β √(1−u)) / I₀(β), cut where the rest is below [`WINDOW_ERROR`], in powers of y.
fn window_polynomial() -> Vec<f64> {
    const NODES: usize = 40;
    let node = |j: usize| (std::f64::consts::PI * (j as f64 + 0.5) / NODES as f64).cos();
    let window = |y: f64| bessel_i0(BETA * (0.5 * (1.0 + y)).sqrt()) / bessel_i0(BETA);
    let chebyshev: Vec<f64> = (0..NODES)
        .map(|k| {
            let sum: f64 = (0..NODES)
                .map(|j| {
                    let angle = std::f64::consts::PI * k as f64 * (j as f64 + 0.5) / NODES as f64;
                    window(node(j)) * angle.cos()
                })
                .sum();
            sum * if k == 0 { 1.0 } else { 2.0 } / NODES as f64
        })
        .collect();
    let mut kept = NODES;
    let mut rest = 0.0;
    while kept > 1 && rest + chebyshev[kept - 1].abs() < WINDOW_ERROR {
        kept -= 1;
        rest += chebyshev[kept].abs();
    }
    // T_k in powers of y by T_{k+1} = 2y T_k − T_{k−1}.
    let mut powers = vec![0.0; kept];
    let (mut previous, mut current) = (vec![0.0; kept], vec![0.0; kept]);
    current[0] = 1.0;
    for (k, c) in chebyshev[..kept].iter().enumerate() {
        for (power, t) in powers.iter_mut().zip(&current) {
            *power += c * t;
        }
        let factor = if k == 0 { 1.0 } else { 2.0 };
        let mut next = vec![0.0; kept];
        for i in 0..kept {
            let shifted = if i > 0 { factor * current[i - 1] } else { 0.0 };
            next[i] = shifted - previous[i];
        }
        previous = std::mem::replace(&mut current, next);
        if k == 0 {
            previous = vec![0.0; kept];
            previous[0] = 1.0;
        }
    }
    powers
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use std::f64::consts::PI;

    fn decibel(x: f64) -> f64 {
        20.0 * x.log10()
    }

    #[test]
    fn the_polynomial_is_the_window() {
        let polynomial = window_polynomial();
        assert!(polynomial.len() < 20, "{}", polynomial.len());
        for i in 0..=1000 {
            let u = f64::from(i) / 1000.0;
            let exact = bessel_i0(BETA * (1.0 - u).sqrt()) / bessel_i0(BETA);
            let y = 1.0 - 2.0 * u;
            let value = polynomial.iter().rev().fold(0.0, |v, c| v * y + c);
            assert!(
                (value - exact).abs() < 2.0 * WINDOW_ERROR,
                "{u}: {value} {exact}"
            );
        }
    }

    /// Largest error over instants with a slowly varying step, relative to the tone.
    fn worst_error(frequency: f64, step_at: impl Fn(f64) -> f64) -> f64 {
        let plan = InterpolationPlan::new();
        let samples: Vec<f64> = (0..6000)
            .map(|n| (2.0 * PI * frequency * n as f64 + 0.4).cos())
            .collect();
        let (mut position, mut worst, mut taps) = (2000.0, 0.0f64, Taps::default());
        while position < 4000.0 {
            let step = step_at(position);
            plan.taps(position as i64, position.fract(), step, &mut taps);
            let value = taps.apply(&plan, &samples, 0);
            worst = worst.max((value - (2.0 * PI * frequency * position + 0.4).cos()).abs());
            position += step;
        }
        worst
    }

    #[test]
    fn tones_pass_up_to_078_of_the_limiting_nyquist() {
        for step in [0.3, 0.77, 1.0, 1.31, 2.9, 7.3] {
            let limit = 0.5 / f64::max(1.0, step);
            for share in [0.001, 0.05, 0.2, 0.43, 0.61, 0.7, 0.78] {
                let error = worst_error(share * limit, |p| {
                    step * (1.0 + 0.1 * (p * 0.003).sin()) / 1.1
                });
                // 147 dB by design in each image; the images add up.
                assert!(
                    decibel(error) < -128.0,
                    "step {step}, share {share}: {:.1} dB",
                    decibel(error)
                );
            }
        }
    }

    #[test]
    fn tones_beyond_the_stop_edge_vanish() {
        let plan = InterpolationPlan::new();
        let mut taps = Taps::default();
        for step in [1.7, 3.3, 6.1] {
            for share in [1.22, 1.3, 1.5, 2.2, 4.0] {
                let frequency = share * 0.5 / step;
                if frequency > 0.5 {
                    continue;
                }
                let samples: Vec<f64> = (0..3000)
                    .map(|n| (2.0 * PI * frequency * n as f64).cos())
                    .collect();
                for i in 0..200 {
                    let position = 1500.0 + f64::from(i) * 0.237;
                    plan.taps(position as i64, position.fract(), step, &mut taps);
                    let value = taps.apply(&plan, &samples, 0).abs();
                    assert!(
                        decibel(value) < -130.0,
                        "{step} {share} {:.1}",
                        decibel(value)
                    );
                }
            }
        }
    }

    #[test]
    fn a_bias_comes_through_exactly() {
        let plan = InterpolationPlan::new();
        let samples = vec![12345.678; 400];
        let mut taps = Taps::default();
        for i in 0..500 {
            let fraction = f64::from(i) / 499.0 * 0.999_999;
            plan.taps(200, fraction, 1.0 + 0.01 * f64::from(i), &mut taps);
            let value = taps.apply(&plan, &samples, 0);
            assert!((value / 12345.678 - 1.0).abs() < 1e-14, "{i} {value}");
        }
    }

    #[test]
    fn positions_next_to_a_sample_keep_their_digits() {
        let samples: Vec<f64> = (0..200).map(|n| (0.3 * n as f64).cos()).collect();
        let plan = InterpolationPlan::new();
        let mut taps = Taps::default();
        for fraction in [
            0.0,
            1e-300,
            1e-17,
            1e-12,
            1e-9,
            0.5,
            0.5 + 1e-16,
            1.0 - 1e-16,
        ] {
            plan.taps(100, fraction, 0.9, &mut taps);
            let value = taps.apply(&plan, &samples, 0);
            assert!(
                (value - (0.3 * (100.0 + fraction)).cos()).abs() < 1e-6,
                "{fraction}"
            );
        }
    }

    #[test]
    fn a_fixed_ratio_agrees_with_rubato() {
        // rubato (crates.io) as an independent check at constant speed: its FFT resampler and our
        // kernel must give the same signal where both are flat.
        use rubato::audioadapter_buffers::direct::InterleavedSlice;
        use rubato::{Fft, FixedSync, Resampler};
        const COUNT: usize = 16384;
        let signal =
            |t: f64| (2.0 * PI * 0.031 * t).cos() + 0.5 * (2.0 * PI * 0.13 * t + 1.0).sin();
        let input: Vec<f64> = (0..COUNT).map(|n| signal(n as f64)).collect();
        let mut theirs = Fft::<f64>::new(4, 3, 1024, 1, FixedSync::Input).unwrap();
        let mut output = Vec::new();
        for part in input.chunks_exact(1024) {
            let part = InterleavedSlice::new(part, 1, 1024).unwrap();
            output.extend(theirs.process(&part, None).unwrap().take_data());
        }
        let delay = theirs.output_delay();
        let plan = InterpolationPlan::new();
        let mut taps = Taps::default();
        let worst = (2000..9000)
            .map(|m| {
                let position = f64::from(m) / 0.75;
                plan.taps(position as i64, position.fract(), 1.0 / 0.75, &mut taps);
                (taps.apply(&plan, &input, 0) - output[m as usize + delay]).abs()
            })
            .fold(0.0, f64::max);
        // Both are flat there; rubato's cut-off is worked out in f32.
        assert!(worst < 2e-6, "{worst:e}");
    }
}
