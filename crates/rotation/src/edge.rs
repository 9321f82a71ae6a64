//! The instant of one edge.

use crate::swing::{Swing, View};
use shaftwise_signal::median_in_place;
use std::ops::Range;

/// Samples kept on each side of an edge's middle.
const SNIPPET: usize = 64;
/// Samples of the channel taken for a level, at most.
const LEVEL: usize = 64;
/// A Gaussian is cut here, in standard deviations: 6.5 leave 1e-10 of a step.
const REACH: f64 = 6.5;

/// Samples around an edge.
#[derive(Debug, Clone)]
pub(crate) struct Snippet {
    /// Index of the first in the channel.
    pub(crate) first: u64,
    samples: Vec<f64>,
}

/// An edge with what is needed to time it once its neighbours are known.
#[derive(Debug, Clone)]
pub(crate) struct Crossing {
    pub(crate) snippet: Snippet,
    /// Its middle, roughly, in samples of the channel.
    pub(crate) coarse: f64,
    pub(crate) low: f64,
    pub(crate) high: f64,
    /// Samples from 10 to 90 %.
    pub(crate) width_10_90: f64,
    /// Samples since the last edge of the other direction, and to the next.
    pub(crate) gap_before: Option<f64>,
    pub(crate) gap_after: Option<f64>,
    noise: f64,
    up: bool,
}

/// A timed crossing: samples from the snippet's first, variance in samples².
pub(crate) struct Timed {
    pub(crate) offset: f64,
    /// What the straight line through the samples on both sides of the level adds to it.
    pub(crate) straight: f64,
    pub(crate) variance: f64,
}

impl Crossing {
    /// Finds the middle of a swing within `range` of the buffer, its width and its levels.
    pub(crate) fn measure(
        buffer: &[f64],
        buffer_start: u64,
        confirmed: usize,
        range: Range<usize>,
        swing: &Swing,
        threshold: Option<f64>,
    ) -> Option<Self> {
        let view = View::new(buffer, swing.noisy);
        let sign = if swing.up { 1.0 } else { -1.0 };
        let middle = threshold.unwrap_or(0.5 * (swing.from + swing.to));
        let (from, to) = (sign * swing.from, sign * swing.to);
        if !(from < sign * middle && sign * middle < to) {
            return None;
        }
        let above = |at: usize, level: f64| sign * view.at(at) >= sign * level;
        let level = |share: f64| swing.from + share * (swing.to - swing.from);
        // Forward to the first sample past the middle, from wherever the swing was confirmed.
        let mut past = confirmed.clamp(range.start, range.end.checked_sub(1)?);
        if above(past, middle) {
            while past > range.start && above(past - 1, middle) {
                past -= 1;
            }
        } else {
            past = (past..range.end).find(|&at| above(at, middle))?;
        }
        if past == 0 {
            return None;
        }
        let between = |at: usize, level: f64| {
            let (a, b) = (view.at(at - 1), view.at(at));
            at as f64 - 1.0
                + if b == a {
                    0.5
                } else {
                    ((level - a) / (b - a)).clamp(0.0, 1.0)
                }
        };
        let coarse = between(past, middle);
        let ten = (range.start + 1..=past)
            .rev()
            .find(|&at| !above(at - 1, level(0.1)));
        let ninety = (past..range.end).find(|&at| above(at, level(0.9)));
        let ten_at = ten.map_or(range.start as f64, |at| between(at, level(0.1)));
        let ninety_at = ninety.map_or(range.end as f64, |at| between(at, level(0.9)));
        let width = (ninety_at - ten_at).max(0.0);
        // Levels are read outside the edge and its blur.
        let away = (0.75 * width).ceil() as usize + 8;
        let mean = |range: Range<usize>| {
            let n = range.len();
            (n >= 3).then(|| buffer[range].iter().sum::<f64>() / n as f64)
        };
        let first_end = past.saturating_sub(away);
        let first = mean(
            first_end
                .saturating_sub(LEVEL)
                .max(range.start + away)
                .min(first_end)..first_end,
        )
        .unwrap_or(swing.from);
        let second_start = (past + away).min(buffer.len());
        let second_end = (second_start + LEVEL)
            .min(range.end.saturating_sub(away))
            .max(second_start);
        let second = mean(second_start..second_end).unwrap_or(swing.to);
        let (low, high) = if swing.up {
            (first, second)
        } else {
            (second, first)
        };
        let start = past.saturating_sub(SNIPPET);
        let end = (past + SNIPPET).min(buffer.len());
        Some(Self {
            snippet: Snippet {
                first: buffer_start + start as u64,
                samples: buffer[start..end].to_vec(),
            },
            coarse: buffer_start as f64 + coarse,
            low,
            high,
            width_10_90: width,
            gap_before: None,
            gap_after: None,
            noise: swing.noise,
            up: swing.up,
        })
    }

    /// Where the smoothed channel crosses half-way between the levels, or the threshold.
    pub(crate) fn time(
        &self,
        smoothing: f64,
        (low, high): (f64, f64),
        threshold: Option<f64>,
    ) -> Option<Timed> {
        let gap = [self.gap_before, self.gap_after]
            .into_iter()
            .flatten()
            .fold(f64::INFINITY, f64::min);
        let sigma = smoothing.min((gap / 6.0).max(0.8));
        let level = threshold.unwrap_or(0.5 * (low + high));
        let start = self.coarse - self.snippet.first as f64;
        let mut offset = start;
        let mut slope = 0.0;
        for _ in 0..30 {
            let (value, derivative) = self.snippet.smoothed(offset, sigma);
            slope = derivative;
            if !(slope.is_finite() && (slope > 0.0) == self.up && slope != 0.0) {
                return None;
            }
            let step = ((level - value) / slope).clamp(-2.0 * sigma, 2.0 * sigma);
            offset += step;
            if (offset - start).abs() > SNIPPET as f64 - REACH * sigma {
                return None;
            }
            if step.abs() < 1e-10 {
                break;
            }
        }
        let kept = 1.0 / (2.0 * std::f64::consts::PI.sqrt() * sigma);
        let variance = self.noise * self.noise * kept / (slope * slope);
        let straight = self
            .snippet
            .straight(offset, level, self.up)
            .map_or(0.0, |at| at - offset);
        Some(Timed {
            offset,
            straight,
            variance,
        })
    }
}

impl Snippet {
    /// Where the line through two neighbouring samples crosses the level, nearest to `tau`.
    fn straight(&self, tau: f64, level: f64, up: bool) -> Option<f64> {
        let first = (tau - 2.0).ceil().max(0.0) as usize;
        let last = ((tau + 2.0).floor() as usize).min(self.samples.len().checked_sub(2)?);
        (first..=last)
            .filter_map(|at| {
                let (a, b) = (self.samples[at], self.samples[at + 1]);
                let crosses = if up {
                    a < level && level <= b
                } else {
                    a > level && level >= b
                };
                crosses.then(|| at as f64 + (level - a) / (b - a))
            })
            .min_by(|a, b| (a - tau).abs().total_cmp(&(b - tau).abs()))
    }

    /// s(τ) and s'(τ); beyond its ends the snippet repeats its last sample.
    fn smoothed(&self, tau: f64, sigma: f64) -> (f64, f64) {
        let first = (tau - REACH * sigma).ceil() as i64;
        let last = (tau + REACH * sigma).floor() as i64;
        let end = self.samples.len() as i64 - 1;
        let (mut weights, mut value, mut derivative) = (0.0, 0.0, 0.0);
        for n in first..=last {
            let x = self.samples[n.clamp(0, end) as usize];
            let z = (n as f64 - tau) / sigma;
            let g = (-0.5 * z * z).exp();
            weights += g;
            value += g * x;
            derivative += g * z * x;
        }
        // Σ G(n − τ) is one to e^{−2π²σ²} but for the cut tails.
        (value / weights, derivative / (weights * sigma))
    }
}

/// Gaussian for a channel: the edge's own rms width, 1.5 to 3 samples, and a sixth of the pulse
/// at most.
pub(crate) fn smoothing(crossings: &[Crossing]) -> f64 {
    let mut widths: Vec<f64> = crossings.iter().map(|c| c.width_10_90).collect();
    // A straight edge of length L: 10 to 90 % are 0.8 L, the rms width is L/√12.
    let own = median_in_place(&mut widths) / 0.8 / 12f64.sqrt();
    let mut gaps: Vec<f64> = crossings
        .iter()
        .filter_map(|c| {
            [c.gap_before, c.gap_after]
                .into_iter()
                .flatten()
                .reduce(f64::min)
        })
        .collect();
    let widest = if gaps.is_empty() {
        f64::INFINITY
    } else {
        median_in_place(&mut gaps) / 6.0
    };
    own.clamp(1.5, 3.0).min(widest).max(0.8)
}
