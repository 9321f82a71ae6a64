//! Averaged spectra of blocks of equal steps: of angle (orders) or of time (hertz), the same code.
//!
//! Block of N samples x, the channel's bias taken off, window w: X_k = Σ w x e^{−j2πkn/N},
//! power of line k as mean square, one-sided: 2|X_k|²/(Σw)², for k = 0 and N/2 half of that. A sinusoid
//! of amplitude A on line k gives A²/2 whatever the window. Lines run from 0 to `lines − 1`, in steps
//! of 1/N of the sample rate.

use crate::Error;
use crate::epoch::{EPOCHS, Epochs};
use realfft::num_complex::Complex64;
use realfft::{RealFftPlanner, RealToComplex};
use shaftwise_signal::WindowPlan;
use std::sync::Arc;

/// How blocks become one curve.
#[derive(Debug, Clone, Copy, PartialEq)]
#[non_exhaustive]
pub enum Average {
    /// Mean of power.
    Power,
    /// Mean of magnitudes.
    Amplitude,
    /// y ← (1 − α) y + α P from the first block's power on.
    Exponential {
        /// α, above 0 to 1.
        alpha: f64,
    },
    /// Largest power.
    PeakHold,
}

/// What a spectrum is made of.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SpectrumConfig {
    /// Window.
    pub window: shaftwise_signal::Window,
    /// Samples in a block, 2 and more.
    pub block: usize,
    /// Samples from block to block, 1 and more.
    pub hop: usize,
    /// Lines kept, from line 0; at most block/2 + 1.
    pub lines: usize,
    /// Averaging.
    pub average: Average,
}

/// Window and transform, shared by all threads.
#[derive(Clone)]
pub struct SpectrumPlan {
    config: SpectrumConfig,
    window: WindowPlan,
    window_sum: f64,
    fft: Arc<dyn RealToComplex<f64>>,
}

impl std::fmt::Debug for SpectrumPlan {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("SpectrumPlan")
            .field("config", &self.config)
            .finish_non_exhaustive()
    }
}

/// Work space of one thread.
#[derive(Debug, Clone)]
pub struct SpectrumScratch {
    time: Vec<f64>,
    lines: Vec<Complex64>,
    fft: Vec<Complex64>,
}

impl SpectrumPlan {
    /// Prepares window and transform.
    ///
    /// # Errors
    /// [`Error::Block`] for a block below 2 samples, a hop of 0 or more lines than the block has;
    /// [`Error::Signal`] for a window that cannot be made.
    pub fn new(config: SpectrumConfig) -> Result<Self, Error> {
        let most = config.block / 2 + 1;
        if config.block < 2 || config.hop == 0 || config.lines == 0 || config.lines > most {
            return Err(Error::Block {
                block: config.block,
                hop: config.hop,
                lines: config.lines,
            });
        }
        let window = WindowPlan::new(config.window, config.block)?;
        let window_sum = window.samples().iter().sum();
        let fft = RealFftPlanner::new().plan_fft_forward(config.block);
        Ok(Self {
            config,
            window,
            window_sum,
            fft,
        })
    }

    /// The settings.
    #[must_use]
    pub fn config(&self) -> &SpectrumConfig {
        &self.config
    }

    /// The window.
    #[must_use]
    pub fn window(&self) -> &WindowPlan {
        &self.window
    }

    /// Work space for one thread.
    #[must_use]
    pub fn scratch(&self) -> SpectrumScratch {
        SpectrumScratch {
            time: self.fft.make_input_vec(),
            lines: self.fft.make_output_vec(),
            fft: self.fft.make_scratch_vec(),
        }
    }

    /// One-sided mean square of every line of one block, `bias` taken off its samples first: a bias
    /// of any size then leaves no skirt.
    ///
    /// # Panics
    /// If the block or `power` has another length than planned.
    pub fn power(
        &self,
        block: &[f64],
        bias: f64,
        scratch: &mut SpectrumScratch,
        power: &mut [f64],
    ) {
        assert_eq!(block.len(), self.config.block, "samples in a block");
        assert_eq!(power.len(), self.config.lines, "lines kept");
        let w = self.window.samples();
        for ((t, x), w) in scratch.time.iter_mut().zip(block).zip(w) {
            *t = (x - bias) * w;
        }
        self.fft
            .process_with_scratch(&mut scratch.time, &mut scratch.lines, &mut scratch.fft)
            .expect("vectors made by the plan");
        let scale = 2.0 / (self.window_sum * self.window_sum);
        for (p, line) in power.iter_mut().zip(&scratch.lines) {
            *p = scale * line.norm_sqr();
        }
        power[0] *= 0.5;
        if self.config.block.is_multiple_of(2) && self.config.lines == self.config.block / 2 + 1 {
            power[self.config.lines - 1] *= 0.5;
        }
    }

    /// Correlation of the noise of blocks `blocks_apart` hops apart.
    #[must_use]
    pub fn correlation(&self, blocks_apart: u64) -> f64 {
        let shift = usize::try_from(blocks_apart)
            .unwrap_or(usize::MAX)
            .saturating_mul(self.config.hop);
        self.window.overlap_correlation(shift)
    }
}

/// Sums of one channel.
#[derive(Debug, Clone)]
struct Sums {
    /// Powers, by epoch.
    power: Epochs,
    /// Squares of powers, for the scatter between blocks.
    square: Vec<f64>,
    /// What the averaging needs beside the powers: magnitudes, faded powers or maxima.
    other: Vec<f64>,
    /// The first block's power, where a fading average starts.
    first: Vec<f64>,
}

/// Spectra of many blocks of many channels, in constant memory.
#[derive(Debug, Clone)]
pub struct SpectrumAccumulator {
    plan: Arc<SpectrumPlan>,
    channels: Vec<Sums>,
    blocks: u64,
    epoch_blocks: [u64; EPOCHS],
    /// Weight left of what came before this accumulator's blocks: (1 − α)^blocks.
    decay: f64,
    power: Vec<f64>,
}

impl SpectrumAccumulator {
    /// An empty one.
    #[must_use]
    pub fn new(plan: Arc<SpectrumPlan>, channels: usize) -> Self {
        let lines = plan.config.lines;
        let other = if plan.config.average == Average::Power {
            0
        } else {
            lines
        };
        let sums = Sums {
            power: Epochs::default(),
            square: vec![0.0; lines],
            other: vec![0.0; other],
            first: Vec::new(),
        };
        Self {
            channels: vec![sums; channels],
            blocks: 0,
            epoch_blocks: [0; EPOCHS],
            decay: 1.0,
            power: vec![0.0; lines],
            plan,
        }
    }

    /// Takes one block of every channel, with the channel's bias there. `epoch` is below [`EPOCHS`].
    ///
    /// # Panics
    /// If the number of channels or a block's length is not as planned.
    pub fn push<'a>(
        &mut self,
        epoch: usize,
        blocks: impl IntoIterator<Item = (&'a [f64], f64)>,
        scratch: &mut SpectrumScratch,
    ) {
        let mut seen = 0;
        let first = self.blocks == 0;
        for (sums, (block, bias)) in self.channels.iter_mut().zip(blocks) {
            self.plan.power(block, bias, scratch, &mut self.power);
            sums.power.add(epoch, &self.power);
            for (s, p) in sums.square.iter_mut().zip(&self.power) {
                *s += p * p;
            }
            let pairs = sums.other.iter_mut().zip(&self.power);
            match self.plan.config.average {
                Average::Power => {}
                Average::Amplitude => pairs.for_each(|(o, p)| *o += p.sqrt()),
                Average::Exponential { alpha } => {
                    pairs.for_each(|(o, p)| *o += alpha * (p - *o));
                    if first {
                        sums.first.clone_from(&self.power);
                    }
                }
                Average::PeakHold => pairs.for_each(|(o, p)| *o = o.max(*p)),
            }
            seen += 1;
        }
        assert_eq!(seen, self.channels.len(), "one block of every channel");
        self.blocks += 1;
        self.epoch_blocks[epoch] += 1;
        if let Average::Exponential { alpha } = self.plan.config.average {
            self.decay *= 1.0 - alpha;
        }
    }

    /// Adds what a later stretch of blocks gave.
    pub fn merge(&mut self, later: Self) {
        if later.blocks == 0 {
            return;
        }
        if self.blocks == 0 {
            *self = later;
            return;
        }
        for (sums, next) in self.channels.iter_mut().zip(later.channels) {
            sums.power.merge(next.power);
            for (s, n) in sums.square.iter_mut().zip(&next.square) {
                *s += n;
            }
            let pairs = sums.other.iter_mut().zip(&next.other);
            match self.plan.config.average {
                Average::Power => {}
                Average::Amplitude => pairs.for_each(|(o, n)| *o += n),
                Average::Exponential { .. } => pairs.for_each(|(o, n)| *o = *o * later.decay + n),
                Average::PeakHold => pairs.for_each(|(o, n)| *o = o.max(*n)),
            }
        }
        self.blocks += later.blocks;
        for (s, n) in self.epoch_blocks.iter_mut().zip(later.epoch_blocks) {
            *s += n;
        }
        self.decay *= later.decay;
    }

    /// Blocks taken.
    #[must_use]
    pub fn blocks(&self) -> u64 {
        self.blocks
    }

    /// The averages, one for each channel; empty sums give NaN.
    #[must_use]
    pub fn finish(self) -> Vec<AveragedSpectrum> {
        let count = self.blocks as f64;
        self.channels
            .into_iter()
            .map(|sums| {
                let mean: Vec<f64> = sums
                    .power
                    .total(self.plan.config.lines)
                    .iter()
                    .map(|p| p / count)
                    .collect();
                let variance = sums
                    .square
                    .iter()
                    .zip(&mean)
                    .map(|(s, m)| ((s - count * m * m) / (count - 1.0)).max(0.0))
                    .collect();
                let shown = match self.plan.config.average {
                    Average::Power => mean.clone(),
                    Average::Amplitude => sums.other.iter().map(|a| (a / count).powi(2)).collect(),
                    Average::Exponential { .. } => sums
                        .other
                        .iter()
                        .zip(&sums.first)
                        .map(|(v, first)| v + self.decay * first)
                        .collect(),
                    Average::PeakHold => sums.other,
                };
                AveragedSpectrum {
                    shown,
                    mean,
                    block_variance: variance,
                    epoch_means: sums.power.means(&self.epoch_blocks),
                    blocks: self.blocks,
                }
            })
            .collect()
    }
}

/// One channel's averages. All powers are mean squares, in the square of the channel's unit.
#[derive(Debug, Clone, PartialEq)]
pub struct AveragedSpectrum {
    /// As the averaging asked for says.
    pub shown: Vec<f64>,
    /// Mean power of each line, whatever the averaging.
    pub mean: Vec<f64>,
    /// Variance of the powers of single blocks; NaN for a single block.
    pub block_variance: Vec<f64>,
    /// Mean power within each twelfth of the revolutions that holds blocks, with their number.
    pub epoch_means: Vec<(u64, Vec<f64>)>,
    /// Blocks taken.
    pub blocks: u64,
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use approx::{assert_abs_diff_eq, assert_relative_eq};
    use shaftwise_signal::Window;
    use std::f64::consts::PI;

    fn plan(average: Average) -> Arc<SpectrumPlan> {
        let config = SpectrumConfig {
            window: Window::Hann,
            block: 64,
            hop: 32,
            lines: 33,
            average,
        };
        Arc::new(SpectrumPlan::new(config).unwrap())
    }

    fn block(seed: usize) -> Vec<f64> {
        // A Weyl sequence: spread evenly, no two blocks alike.
        (0..64)
            .map(|n| ((n + 64 * seed) as f64 * 0.618_033_988_749_895).fract() - 0.5)
            .collect()
    }

    fn fold(average: Average, cuts: &[usize]) -> AveragedSpectrum {
        let plan = plan(average);
        let mut scratch = plan.scratch();
        let mut total = SpectrumAccumulator::new(plan.clone(), 1);
        let mut next = 0;
        for cut in cuts {
            let mut part = SpectrumAccumulator::new(plan.clone(), 1);
            for i in next..*cut {
                part.push(i * EPOCHS / 24, [(block(i).as_slice(), 0.0)], &mut scratch);
            }
            next = *cut;
            total.merge(part);
        }
        total.finish().remove(0)
    }

    #[test]
    fn a_sinusoid_on_a_line_has_its_mean_square_under_a_large_bias() {
        let plan = plan(Average::Power);
        let x: Vec<f64> = (0..64)
            .map(|n| 1e4 + 3.0 * (2.0 * PI * 9.0 * n as f64 / 64.0 + 0.3).cos())
            .collect();
        let mut power = vec![0.0; 33];
        plan.power(&x, 1e4, &mut plan.scratch(), &mut power);
        assert_relative_eq!(power[9], 4.5, max_relative = 1e-9);
        assert!(power[0] < 1e-15);
        // Windowed Parseval: the sum of lines over the noise bandwidth is the mean square.
        let sum: f64 = power[1..].iter().sum::<f64>() / plan.window().noise_bandwidth_lines();
        assert_relative_eq!(sum, 4.5, max_relative = 1e-9);
    }

    #[test]
    fn chunks_fold_to_what_one_run_gives() {
        for average in [
            Average::Power,
            Average::Amplitude,
            Average::PeakHold,
            Average::Exponential { alpha: 0.125 },
        ] {
            let whole = fold(average, &[24]);
            let parts = fold(average, &[0, 5, 6, 17, 24]);
            assert_eq!(whole.blocks, parts.blocks);
            for (a, b) in whole.shown.iter().zip(&parts.shown) {
                assert_abs_diff_eq!(a, b, epsilon = 1e-16);
            }
            assert_eq!(whole.epoch_means.len(), 12);
            for ((n, a), (m, b)) in whole.epoch_means.iter().zip(&parts.epoch_means) {
                assert_eq!(n, m);
                assert_abs_diff_eq!(a[7], b[7], epsilon = 1e-16);
            }
        }
    }

    #[test]
    fn a_fading_average_is_its_recursion() {
        let alpha = 0.2;
        let plan = plan(Average::Exponential { alpha });
        let mut scratch = plan.scratch();
        let mut expected: Option<Vec<f64>> = None;
        for i in 0..24 {
            let mut power = vec![0.0; 33];
            plan.power(&block(i), 0.0, &mut scratch, &mut power);
            expected = Some(match expected {
                None => power,
                Some(y) => y
                    .iter()
                    .zip(&power)
                    .map(|(y, p)| (1.0 - alpha) * y + alpha * p)
                    .collect(),
            });
        }
        for (a, b) in fold(Average::Exponential { alpha }, &[3, 24])
            .shown
            .iter()
            .zip(&expected.unwrap())
        {
            assert_abs_diff_eq!(a, b, epsilon = 1e-16);
        }
    }

    #[test]
    fn impossible_blocks_are_refused() {
        let base = SpectrumConfig {
            window: Window::Hann,
            block: 64,
            hop: 32,
            lines: 33,
            average: Average::Power,
        };
        for wrong in [
            SpectrumConfig { block: 1, ..base },
            SpectrumConfig { hop: 0, ..base },
            SpectrumConfig { lines: 0, ..base },
            SpectrumConfig { lines: 34, ..base },
        ] {
            assert!(matches!(SpectrumPlan::new(wrong), Err(Error::Block { .. })));
        }
    }
}
