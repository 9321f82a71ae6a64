//! Halving the sample rate, again and again, before a coarse resampling.
//!
//! `y[n] = ½ x[2n] + Σ_k c_k (x[2n+2k+1] + x[2n−2k−1])`: a half-band low-pass with linear phase and no
//! delay, so sample n of level l sits exactly at sample n·2^l of the recording. Passes up to
//! 0.2033 of its input rate and stops from 0.2967, both within 147 dB; a kernel whose stop band
//! starts below the former cannot tell which level it reads, so the level may change without a trace.

use crate::interpolate::STOP_EDGE;
use crate::kernel::{CpuLevel, half_band};
use crate::window::bessel_i0;

/// Pairs of taps around the centre: 4·26 − 1 taps over a transition of 0.0934 give 147 dB
/// (Kaiser's formula, as in the interpolation kernel).
const PAIRS: usize = 26;
const BETA: f64 = 15.24;
/// Level rate that leaves the kernel's stop edge inside the pass band: 0.61·rate/0.2033/2.
const LEAST_RATIO: f64 = STOP_EDGE / (2.0 * 0.2033);

/// Tap values, shared by all stages.
#[derive(Debug, Clone)]
pub struct PyramidPlan {
    pairs: Vec<f64>,
    level: CpuLevel,
}

impl Default for PyramidPlan {
    fn default() -> Self {
        Self::new()
    }
}

impl PyramidPlan {
    /// Works the taps out.
    #[must_use]
    pub fn new() -> Self {
        let mut pairs: Vec<f64> = (0..PAIRS)
            .map(|k| {
                let d = (2 * k + 1) as f64;
                let sign = if k % 2 == 0 { 1.0 } else { -1.0 };
                let u = d / (2 * PAIRS) as f64;
                sign / (std::f64::consts::PI * d) * bessel_i0(BETA * (1.0 - u * u).sqrt())
            })
            .collect();
        // The pairs carry half of the gain at zero frequency: then a bias passes exactly, and so
        // does the zero at half the input rate.
        let sum: f64 = pairs.iter().sum();
        for pair in &mut pairs {
            *pair *= 0.25 / sum;
        }
        Self {
            pairs,
            level: CpuLevel::detect(),
        }
    }

    /// How often the rate may be halved before sampling with steps of at least `least_step`
    /// samples of the recording.
    #[must_use]
    pub fn levels(least_step: f64) -> u32 {
        let mut level = 0;
        while least_step >= LEAST_RATIO * f64::from(2u32 << level) && level < 30 {
            level += 1;
        }
        level
    }

    /// Samples of the recording needed on either side of a sample of level `levels`.
    #[must_use]
    pub fn reach(levels: u32) -> u64 {
        2 * PAIRS as u64 * ((1u64 << levels) - 1)
    }
}

/// One halving of one channel; a stateful stage.
#[derive(Debug, Clone)]
pub struct HalfBand {
    even: Vec<f64>,
    odd: Vec<f64>,
    /// Index, in pairs of input samples, of the first element of both buffers.
    first: u64,
    /// The first sample pushed has an odd index and no even one before it: no output needs it.
    skip: bool,
}

impl HalfBand {
    /// A stage whose first input sample will be sample `first_input` of its signal.
    #[must_use]
    pub fn new(first_input: u64) -> Self {
        Self {
            even: Vec::new(),
            odd: Vec::new(),
            first: first_input.div_ceil(2),
            skip: !first_input.is_multiple_of(2),
        }
    }

    /// Index of the next output sample [`HalfBand::push`] will append.
    #[must_use]
    pub fn next_output(&self) -> u64 {
        self.first + PAIRS as u64
    }

    /// Takes the next samples and appends every output whose neighbours are all there.
    ///
    /// The first output is that of the first place with all its neighbours. Any split of the input
    /// gives the same bits.
    pub fn push(&mut self, plan: &PyramidPlan, input: &[f64], out: &mut Vec<f64>) {
        let mut input = input;
        if self.skip
            && let Some((_, rest)) = input.split_first()
        {
            self.skip = false;
            input = rest;
        }
        if self.even.len() > self.odd.len()
            && let Some((first, rest)) = input.split_first()
        {
            self.odd.push(*first);
            input = rest;
        }
        let pairs = input.chunks_exact(2);
        let last = pairs.remainder().first();
        self.even.reserve(pairs.len() + 1);
        self.odd.reserve(pairs.len());
        for pair in pairs {
            self.even.push(pair[0]);
            self.odd.push(pair[1]);
        }
        self.even.extend(last);
        // Output n needs odd samples n−K … n+K−1 and the even sample n.
        let count = (self.odd.len() + 1).saturating_sub(2 * PAIRS);
        if count == 0 {
            return;
        }
        let start = out.len();
        out.resize(start + count, 0.0);
        half_band(
            plan.level,
            &plan.pairs,
            &self.even,
            &self.odd,
            &mut out[start..],
        );
        self.even.drain(..count);
        self.odd.drain(..count);
        self.first += count as u64;
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    #[test]
    fn bands_are_as_stated() {
        let plan = PyramidPlan::new();
        let response = |f: f64| -> f64 {
            0.5 + 2.0
                * plan
                    .pairs
                    .iter()
                    .enumerate()
                    .map(|(k, c)| c * (2.0 * PI * f * (2 * k + 1) as f64).cos())
                    .sum::<f64>()
        };
        for i in 0..=200 {
            let pass = 0.2033 * f64::from(i) / 200.0;
            let stop = 0.2967 + 0.2033 * f64::from(i) / 200.0;
            assert!(
                (response(pass) - 1.0).abs() < 4e-7,
                "{pass}: {:e}",
                response(pass) - 1.0
            );
            assert!(response(stop).abs() < 4e-7, "{stop}: {:e}", response(stop));
        }
    }

    #[test]
    fn any_split_gives_the_same_bits_at_the_right_place() {
        let plan = PyramidPlan::new();
        let input: Vec<f64> = (0..1001).map(|n| (0.2 * (100 + n) as f64).cos()).collect();
        let mut whole = Vec::new();
        let mut stage = HalfBand::new(100);
        assert_eq!(stage.next_output(), 76);
        stage.push(&plan, &input, &mut whole);
        for (n, y) in whole.iter().enumerate() {
            assert!((y - (0.4 * (76 + n) as f64).cos()).abs() < 4e-7);
        }
        let mut from_odd = Vec::new();
        let mut stage = HalfBand::new(101);
        assert_eq!(stage.next_output(), 77);
        stage.push(&plan, &input[1..], &mut from_odd);
        assert_eq!(from_odd, whole[1..]);
        for split in [1, 2, 3, 7, 64, 1000] {
            let mut stage = HalfBand::new(100);
            let mut parts = Vec::new();
            for part in input.chunks(split) {
                stage.push(&plan, part, &mut parts);
            }
            assert_eq!(whole, parts, "split {split}");
        }
    }

    #[test]
    fn levels_follow_the_step() {
        for (step, level) in [
            (0.5, 0),
            (2.9, 0),
            (3.1, 1),
            (5.9, 1),
            (6.1, 2),
            (1000.0, 9),
        ] {
            assert_eq!(PyramidPlan::levels(step), level, "{step}");
        }
    }
}
