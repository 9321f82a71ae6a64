//! Synchronous average: one revolution of the shaft, everything else averaged away.
//!
//! Of N revolutions x_r(m), m = 0…M−1: mean a(m), standard deviation s(m) of single revolutions,
//! s(m)/√N of the mean. What does not repeat shrinks as 1/√N (S. Braun, Acustica 32, 1975); the
//! average acts as a comb that passes whole orders and stops others like |sin πNf / (N sin πf)|
//! (P. D. McFadden, Mech. Syst. Signal Process. 1, 1987).
//!
//! How far the noise really fell is read from the averages themselves: neighbouring groups of 2^k
//! revolutions differ by twice the variance of a group's mean.

use crate::epoch::{EPOCHS, Epochs};
use realfft::RealFftPlanner;
use std::collections::BTreeMap;

/// Differences between neighbouring groups of one size.
#[derive(Debug, Clone, Default)]
struct Level {
    /// Σ over pairs of the mean over m of ½ (difference of the groups' means)².
    variance_sum: f64,
    pairs: u64,
}

/// Groups of 1, 2, 4 … revolutions. Group i of level k holds revolutions i·2^k … (i+1)·2^k − 1 of
/// the whole run, so the groups do not depend on how the run was cut.
#[derive(Debug, Clone, Default)]
struct Cascade {
    levels: Vec<Level>,
    /// Sums over groups that wait for their neighbour, by level and number.
    waiting: BTreeMap<(usize, u64), Vec<f64>>,
}

impl Cascade {
    /// Takes the sum over group `number` of 2^level revolutions.
    fn push(&mut self, level: usize, number: u64, sum: Vec<f64>) {
        let (mut level, mut number, mut sum) = (level, number, sum);
        while let Some(other) = self.waiting.remove(&(level, number ^ 1)) {
            if self.levels.len() <= level {
                self.levels.resize_with(level + 1, Level::default);
            }
            let here = &mut self.levels[level];
            let scale = 1.0 / (1u64 << level) as f64;
            let square: f64 = other
                .iter()
                .zip(&sum)
                .map(|(a, b)| ((a - b) * scale).powi(2))
                .sum();
            here.variance_sum += 0.5 * square / sum.len() as f64;
            here.pairs += 1;
            for (s, o) in sum.iter_mut().zip(&other) {
                *s += o;
            }
            level += 1;
            number /= 2;
        }
        self.waiting.insert((level, number), sum);
    }

    fn merge(&mut self, later: Self) {
        if self.levels.len() < later.levels.len() {
            self.levels.resize_with(later.levels.len(), Level::default);
        }
        for (here, next) in self.levels.iter_mut().zip(later.levels) {
            here.variance_sum += next.variance_sum;
            here.pairs += next.pairs;
        }
        for ((level, number), sum) in later.waiting {
            self.push(level, number, sum);
        }
    }
}

#[derive(Debug, Clone)]
struct Sums {
    by_epoch: Epochs,
    square: Vec<f64>,
    cascade: Cascade,
}

/// Sums over revolutions of many channels, in constant memory.
#[derive(Debug, Clone)]
pub struct SynchronousAccumulator {
    samples_per_rev: usize,
    channels: Vec<Sums>,
    revolutions: u64,
    epoch_revolutions: [u64; EPOCHS],
}

impl SynchronousAccumulator {
    /// An empty one for `channels` channels of `samples_per_rev` samples.
    #[must_use]
    pub fn new(samples_per_rev: usize, channels: usize) -> Self {
        let sums = Sums {
            by_epoch: Epochs::default(),
            square: vec![0.0; samples_per_rev],
            cascade: Cascade::default(),
        };
        Self {
            samples_per_rev,
            channels: vec![sums; channels],
            revolutions: 0,
            epoch_revolutions: [0; EPOCHS],
        }
    }

    /// Takes one revolution of every channel, number `number` of the whole run. `epoch` is below
    /// [`EPOCHS`].
    ///
    /// # Panics
    /// If the number of channels or a revolution's length is not as planned.
    pub fn push<'a>(
        &mut self,
        epoch: usize,
        number: u64,
        revolutions: impl IntoIterator<Item = &'a [f64]>,
    ) {
        let mut seen = 0;
        for (sums, revolution) in self.channels.iter_mut().zip(revolutions) {
            assert_eq!(
                revolution.len(),
                self.samples_per_rev,
                "samples in a revolution"
            );
            sums.by_epoch.add(epoch, revolution);
            for (s, x) in sums.square.iter_mut().zip(revolution) {
                *s += x * x;
            }
            sums.cascade.push(0, number, revolution.to_vec());
            seen += 1;
        }
        assert_eq!(seen, self.channels.len(), "one revolution of every channel");
        self.revolutions += 1;
        self.epoch_revolutions[epoch] += 1;
    }

    /// Adds what a later chunk of revolutions gave.
    pub fn merge(&mut self, later: Self) {
        for (sums, next) in self.channels.iter_mut().zip(later.channels) {
            sums.by_epoch.merge(next.by_epoch);
            for (s, n) in sums.square.iter_mut().zip(&next.square) {
                *s += n;
            }
            sums.cascade.merge(next.cascade);
        }
        self.revolutions += later.revolutions;
        for (s, n) in self
            .epoch_revolutions
            .iter_mut()
            .zip(later.epoch_revolutions)
        {
            *s += n;
        }
    }

    /// Revolutions taken.
    #[must_use]
    pub fn revolutions(&self) -> u64 {
        self.revolutions
    }

    /// The averages, one for each channel.
    #[must_use]
    pub fn finish(self) -> Vec<SynchronousAverage> {
        let count = self.revolutions as f64;
        let length = self.samples_per_rev;
        self.channels
            .into_iter()
            .map(|sums| {
                let mean: Vec<f64> = sums
                    .by_epoch
                    .total(length)
                    .iter()
                    .map(|s| s / count)
                    .collect();
                // Σx² − N·mean² loses digits under a bias; the loss is (bias/noise)² eps, harmless to 1e6.
                let sd: Vec<f64> = sums
                    .square
                    .iter()
                    .zip(&mean)
                    .map(|(s, m)| ((s - count * m * m) / (count - 1.0)).max(0.0).sqrt())
                    .collect();
                let noise_power = sd.iter().map(|s| s * s).sum::<f64>() / length as f64;
                let bias = mean.iter().sum::<f64>() / length as f64;
                let repeated = mean.iter().map(|m| (m - bias).powi(2)).sum::<f64>() / length as f64;
                // The mean still holds 1/N of the noise: take it out before calling it repeated.
                let repeated = (repeated - noise_power / count).max(0.0);
                let epochs = sums.by_epoch.means(&self.epoch_revolutions);
                let between: f64 = epochs
                    .iter()
                    .map(|(n, epoch)| {
                        let square: f64 =
                            epoch.iter().zip(&mean).map(|(e, m)| (e - m).powi(2)).sum();
                        *n as f64 * square / length as f64
                    })
                    .sum::<f64>()
                    / (epochs.len() as f64 - 1.0);
                let single = sums
                    .cascade
                    .levels
                    .first()
                    .map_or(f64::NAN, |l| l.variance_sum / l.pairs as f64);
                let convergence = sums
                    .cascade
                    .levels
                    .iter()
                    .enumerate()
                    .filter(|(_, level)| level.pairs > 0)
                    .map(|(k, level)| {
                        let variance = level.variance_sum / level.pairs as f64;
                        (1u64 << k, 10.0 * (single / variance).log10())
                    })
                    .collect();
                SynchronousAverage {
                    revolutions: self.revolutions,
                    noise_reduction_db: 10.0 * (count * noise_power / between).log10(),
                    synchronous_fraction: repeated / (repeated + noise_power),
                    residual_rms: noise_power.sqrt(),
                    total_rms: (repeated + noise_power).sqrt(),
                    convergence,
                    mean,
                    sd,
                }
            })
            .collect()
    }
}

/// One channel's synchronous average.
#[derive(Debug, Clone, PartialEq)]
pub struct SynchronousAverage {
    /// Revolutions averaged, N.
    pub revolutions: u64,
    /// Mean revolution; sample m at angle m/M rev.
    pub mean: Vec<f64>,
    /// Standard deviation of single revolutions at each angle (N − 1); NaN for N = 1.
    pub sd: Vec<f64>,
    /// Share of the power, bias apart, that repeats: (σ²_mean − s²/N) / (σ²_mean − s²/N + s²).
    pub synchronous_fraction: f64,
    /// How far the mean's noise lies below a single revolution's, from the scatter between
    /// twelfths, dB; 10 log10 N for random noise.
    pub noise_reduction_db: f64,
    /// rms of what does not repeat.
    pub residual_rms: f64,
    /// rms of everything, bias apart.
    pub total_rms: f64,
    /// (2^k revolutions, how far the noise of their mean lies below a single one's, dB).
    pub convergence: Vec<(u64, f64)>,
}

/// A component of a revolution: x(θ) = A·cos(2πkθ + φ).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OrderComponent {
    /// k.
    pub order: u32,
    /// A, peak, not negative.
    pub amplitude: f64,
    /// φ in revolutions of phase, −0.5…0.5 (lead).
    pub phase: f64,
}

/// Orders 0…`highest` of one mean revolution (0 keeps its sign as a phase of 0 or ½).
#[must_use]
pub fn revolution_orders(mean: &[f64], highest: u32) -> Vec<OrderComponent> {
    let length = mean.len();
    if length == 0 {
        return Vec::new();
    }
    let fft = RealFftPlanner::<f64>::new().plan_fft_forward(length);
    let mut time = mean.to_vec();
    let mut lines = fft.make_output_vec();
    fft.process(&mut time, &mut lines)
        .expect("vectors made by the plan");
    lines
        .iter()
        .take(highest as usize + 1)
        .enumerate()
        .map(|(k, line)| {
            let own_image = k == 0 || 2 * k == length;
            OrderComponent {
                order: k as u32,
                amplitude: line.norm() * if own_image { 1.0 } else { 2.0 } / length as f64,
                phase: line.arg() / (2.0 * std::f64::consts::PI),
            }
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_abs_diff_eq;
    use std::f64::consts::PI;

    /// Comb of N averages at `offset` orders from a whole one.
    fn comb(revolutions: u64, order: f64) -> f64 {
        let m = 64;
        let mut sums = SynchronousAccumulator::new(m, 2);
        for r in 0..revolutions {
            let part = |shift: f64| -> Vec<f64> {
                (0..m)
                    .map(|i| (2.0 * PI * (order * (r as f64 + i as f64 / m as f64) + shift)).cos())
                    .collect()
            };
            sums.push(
                (r * 12 / revolutions) as usize,
                r,
                [part(0.0).as_slice(), part(0.25).as_slice()],
            );
        }
        // Two channels a quarter turn apart: their squares add to the envelope at every angle.
        let averages = sums.finish();
        (0..m)
            .map(|i| averages[0].mean[i].hypot(averages[1].mean[i]))
            .fold(0.0, f64::max)
    }

    #[test]
    fn the_comb_is_that_of_braun_and_mcfadden() {
        // S. Braun 1975, P. D. McFadden 1987 (from memory): |sin πNf / (N sin πf)|.
        let db = |x: f64| 20.0 * x.log10();
        assert_abs_diff_eq!(db(comb(8, 3.1)), -12.48, epsilon = 0.01);
        assert_abs_diff_eq!(db(comb(16, 2.1)), -14.32, epsilon = 0.01);
        assert_abs_diff_eq!(db(comb(16, 1.37)), -35.42, epsilon = 0.01);
        assert!(comb(100, 5.1) < 1e-12);
        assert!(comb(4, 1.25) < 1e-12);
        // −3 dB half width .055745 at N = 8.
        assert_abs_diff_eq!(comb(8, 3.055745), 0.5f64.sqrt(), epsilon = 1e-4);
    }

    #[test]
    fn random_noise_falls_as_one_over_root_n() {
        // 10 log10 N (Braun 1975). White noise from a hash; chi-square scatter of the estimate:
        // 128 angles x 11 twelfths leave sqrt(2/1408) = 3.8 % of power, 0.16 dB; four of them.
        let (m, n) = (128, 1024u64);
        let mut state = 0x5eed_u64;
        let mut noise = || {
            let mut sum = -6.0;
            for _ in 0..12 {
                state = state
                    .wrapping_mul(6_364_136_223_846_793_005)
                    .wrapping_add(1_442_695_040_888_963_407);
                sum += (state >> 11) as f64 / (1u64 << 53) as f64;
            }
            sum
        };
        let mut total = SynchronousAccumulator::new(m, 1);
        for chunk in 0..n / 64 {
            let mut part = SynchronousAccumulator::new(m, 1);
            for r in 0..64 {
                let x: Vec<f64> = (0..m)
                    .map(|i| (2.0 * PI * i as f64 / m as f64).cos() + noise())
                    .collect();
                let number = chunk * 64 + r;
                part.push((number * 12 / n) as usize, number, [x.as_slice()]);
            }
            total.merge(part);
        }
        let average = total.finish().remove(0);
        assert_abs_diff_eq!(average.noise_reduction_db, 30.10, epsilon = 0.65);
        // A cosine of amplitude 1 in unit noise: half against one.
        assert_abs_diff_eq!(average.synchronous_fraction, 1.0 / 3.0, epsilon = 0.01);
        assert_abs_diff_eq!(average.residual_rms, 1.0, epsilon = 0.01);
        assert_eq!(average.convergence.len(), 10);
        for (revolutions, seen) in &average.convergence {
            let law = 10.0 * (*revolutions as f64).log10();
            // Pairs: 512 / 2^k of 128 angles; four standard deviations.
            let pairs = 512.0 / *revolutions as f64;
            let tolerance = 4.0 * 4.343 * (2.0 / (128.0 * pairs)).sqrt() + 0.1;
            assert!(
                (seen - law).abs() < tolerance,
                "{revolutions}: {seen} against {law}"
            );
        }
        let orders = revolution_orders(&average.mean, 5);
        // Noise of the mean, 1/√1024, leaves √(4/128) of itself in an order's amplitude; five of them.
        assert_abs_diff_eq!(
            orders[1].amplitude,
            1.0,
            epsilon = 5.0 * (4.0f64 / 128.0).sqrt() / 32.0
        );
    }

    #[test]
    fn jitter_of_the_angle_costs_what_its_characteristic_function_says() {
        // E[e^{jkδ}] = e^{−(kσ)²/2} for Gaussian jitter of σ rad: σ = 1°, k = 40 → 0.78373.
        // The jitter takes the quantiles of the law, so that the mean is no matter of chance.
        let n = 4000u64;
        let m = 128;
        let mut sums = SynchronousAccumulator::new(m, 1);
        for r in 0..n {
            let shift = shaftwise_signal::normal_quantile((r as f64 + 0.5) / n as f64) * PI / 180.0;
            let x: Vec<f64> = (0..m)
                .map(|i| (40.0 * (2.0 * PI * i as f64 / m as f64 + shift)).cos())
                .collect();
            sums.push((r * 12 / n) as usize, r, [x.as_slice()]);
        }
        let orders = revolution_orders(&sums.finish()[0].mean, 50);
        assert_abs_diff_eq!(orders[40].amplitude, 0.78373, epsilon = 2e-4);
    }

    #[test]
    fn components_keep_amplitude_and_lead() {
        let x: Vec<f64> = (0..90)
            .map(|i| -2.0 + 3.0 * (2.0 * PI * (7.0 * f64::from(i) / 90.0 + 0.2)).cos())
            .collect();
        let orders = revolution_orders(&x, 45);
        assert_abs_diff_eq!(orders[0].amplitude, 2.0, epsilon = 1e-14);
        assert_abs_diff_eq!(orders[7].amplitude, 3.0, epsilon = 1e-14);
        assert_abs_diff_eq!(orders[7].phase, 0.2, epsilon = 1e-14);
        assert!(
            orders
                .iter()
                .filter(|o| o.order != 0 && o.order != 7)
                .all(|o| o.amplitude < 1e-14)
        );
        assert!(revolution_orders(&[], 3).is_empty());
    }
}
