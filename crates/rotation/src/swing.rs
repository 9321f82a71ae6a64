//! Swings of a channel: monotone but for less than a hysteresis.

use crate::tach::Measured;
use std::collections::VecDeque;

/// A swing from one extreme to the other.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Swing {
    pub(crate) up: bool,
    /// Sample at which it had left its first extreme by the hysteresis.
    pub(crate) confirmed: u64,
    /// First extreme.
    pub(crate) from: f64,
    /// Second extreme.
    pub(crate) to: f64,
    /// Standard deviation of the channel's noise around it.
    pub(crate) noise: f64,
    /// Whether it takes smoothing to see it.
    pub(crate) noisy: bool,
    /// Whether it was handed out before its end was known.
    pub(crate) early: bool,
}

impl Swing {
    pub(crate) fn height(&self) -> f64 {
        (self.to - self.from).abs()
    }
}

/// How far the channel must come back to have turned, in a slab.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Hysteresis {
    step: f64,
    noise: f64,
    smooth: bool,
}

/// Half of the Gaussian of 2 samples, for slabs whose noise hides the swings.
const HALF: usize = 6;

fn taps() -> [f64; HALF + 1] {
    let mut taps: [f64; HALF + 1] =
        std::array::from_fn(|k| (-0.5 * (k as f64 / 2.0).powi(2)).exp());
    let sum = taps[0] + 2.0 * taps[1..].iter().sum::<f64>();
    for tap in &mut taps {
        *tap /= sum;
    }
    taps
}

/// The channel smoothed at one sample; near its ends the sample itself is repeated.
pub(crate) fn smoothed(samples: &[f64], at: usize, taps: &[f64; HALF + 1]) -> f64 {
    let last = samples.len() - 1;
    let mut sum = taps[0] * samples[at];
    for (k, tap) in taps.iter().enumerate().skip(1) {
        sum += tap * (samples[at.saturating_sub(k)] + samples[(at + k).min(last)]);
    }
    sum
}

/// The channel smoothed from `first` to before `end`, into `out`.
fn smooth_run(samples: &[f64], first: usize, end: usize, out: &mut Vec<f64>) {
    let taps = taps();
    out.clear();
    let inner = first.max(HALF)..end.min(samples.len().saturating_sub(HALF));
    if inner.len() < HALF {
        out.extend((first..end).map(|at| smoothed(samples, at, &taps)));
        return;
    }
    out.extend((first..inner.start).map(|at| smoothed(samples, at, &taps)));
    let start = out.len();
    out.extend(samples[inner.clone()].iter().map(|x| taps[0] * x));
    for (k, tap) in taps.iter().enumerate().skip(1) {
        let before = &samples[inner.start - k..inner.end - k];
        let after = &samples[inner.start + k..inner.end + k];
        for ((sum, a), b) in out[start..].iter_mut().zip(before).zip(after) {
            *sum += tap * (a + b);
        }
    }
    out.extend((inner.end..end).map(|at| smoothed(samples, at, &taps)));
}

/// The view of a channel in which a swing was found.
pub(crate) struct View<'a> {
    samples: &'a [f64],
    taps: Option<[f64; HALF + 1]>,
}

impl<'a> View<'a> {
    pub(crate) fn new(samples: &'a [f64], noisy: bool) -> Self {
        Self {
            samples,
            taps: noisy.then(taps),
        }
    }

    pub(crate) fn at(&self, at: usize) -> f64 {
        match &self.taps {
            None => self.samples[at],
            Some(taps) => smoothed(self.samples, at, taps),
        }
    }
}

impl Hysteresis {
    /// From the slab's own samples and the height of the pulses before it.
    pub(crate) fn of(samples: &[f64], typical: f64) -> Self {
        const LONG: usize = 256;
        const SHORT: usize = 4;
        let range = |block: &[f64]| {
            let (low, high) = extremes(block);
            high - low
        };
        let mut short: Vec<f64> = samples.chunks(SHORT).map(range).collect();
        let mut long: Vec<f64> = samples.chunks(LONG).map(range).collect();
        if short.is_empty() {
            return Self {
                step: 0.0,
                noise: 0.0,
                smooth: false,
            };
        }
        let (low, high) = extremes(samples);
        // A pulse touches two to four blocks: one stray alone does not set the scale.
        let fourth = 3.min(long.len() - 1);
        let (_, pulse, _) = long.select_nth_unstable_by(fourth, |a, b| b.total_cmp(a));
        let pulse = pulse.max(typical);
        // One in ten groups of 4 normal deviates has a range below 0.98 standard deviations; one
        // block in ten has no edge even where pulses follow each other closely.
        let tenth = short.len() / 10;
        let (_, noise, _) = short.select_nth_unstable_by(tenth, f64::total_cmp);
        let noise = (*noise / 0.98).min(0.1 * pulse);
        let converter = converter_step(samples, high - low);
        let smooth = pulse < 25.0 * noise;
        // White noise keeps 1/√(2√π·2) of itself.
        let seen = if smooth { 0.376 * noise } else { noise };
        // A channel of two values is all step.
        let converter = converter.min(0.16 * (high - low));
        Self {
            step: (10.0 * seen)
                .max(0.1 * pulse)
                .max(2.5 * converter)
                .max(0.1 * typical),
            noise: noise.max(converter / 12f64.sqrt()),
            smooth,
        }
    }
}

/// Step of the converter, where every change is a whole number of them; else zero.
fn converter_step(samples: &[f64], range: f64) -> f64 {
    let changes = || samples.windows(2).map(|pair| (pair[1] - pair[0]).abs());
    let finest = changes().fold(f64::INFINITY, |m, d| if d > 0.0 && d < m { d } else { m });
    // 24 bits, with the rounding of the calibration factor.
    if !(finest < f64::INFINITY && range < finest * 2f64.powi(25)) {
        return 0.0;
    }
    let whole = changes().filter(|&d| d > 0.0).take(4096).all(|d| {
        let steps = d / finest;
        (steps - steps.round()).abs() < 1e-3
    });
    if whole { finest } else { 0.0 }
}

fn extremes(block: &[f64]) -> (f64, f64) {
    let mut low = [f64::INFINITY; 8];
    let mut high = [f64::NEG_INFINITY; 8];
    let mut eights = block.chunks_exact(8);
    for eight in eights.by_ref() {
        for k in 0..8 {
            low[k] = if eight[k] < low[k] { eight[k] } else { low[k] };
            high[k] = if eight[k] > high[k] {
                eight[k]
            } else {
                high[k]
            };
        }
    }
    for &x in eights.remainder() {
        low[0] = low[0].min(x);
        high[0] = high[0].max(x);
    }
    (
        low.into_iter().fold(f64::INFINITY, f64::min),
        high.into_iter().fold(f64::NEG_INFINITY, f64::max),
    )
}

/// Follows the channel from extreme to extreme.
#[derive(Debug, Default)]
pub(crate) struct Zigzag {
    started: bool,
    /// Whether the present swing goes up; unknown before the first.
    up: Option<bool>,
    low: f64,
    high: f64,
    open: Option<Swing>,
    smooth: Vec<f64>,
}

impl Zigzag {
    /// Goes through `samples[start..]`, `samples[0]` being sample `origin` of the channel.
    pub(crate) fn run(
        &mut self,
        samples: &[f64],
        start: usize,
        origin: u64,
        hysteresis: Hysteresis,
        out: &mut VecDeque<Swing>,
    ) {
        let mut smooth = std::mem::take(&mut self.smooth);
        let view = if hysteresis.smooth {
            smooth_run(samples, start, samples.len(), &mut smooth);
            &smooth[..]
        } else {
            &samples[start..]
        };
        if let (false, Some(&first)) = (self.started, view.first()) {
            self.started = true;
            (self.low, self.high) = (first, first);
        }
        let step = hysteresis.step;
        for (number, block) in view.chunks(32).enumerate() {
            let (low, high) = extremes(block);
            let quiet = match self.up {
                Some(true) => self.high.max(high) - low <= step,
                Some(false) => high - self.low.min(low) <= step,
                None => self.high.max(high) - self.low.min(low) <= step,
            };
            if quiet {
                match self.up {
                    Some(true) => self.high = self.high.max(high),
                    Some(false) => self.low = self.low.min(low),
                    None => {
                        self.low = self.low.min(low);
                        self.high = self.high.max(high);
                    }
                }
                continue;
            }
            for (k, &x) in block.iter().enumerate() {
                let at = origin + (start + 32 * number + k) as u64;
                if self.up != Some(true) && x - self.low > step {
                    self.turn(true, at, hysteresis, out);
                    self.high = x;
                } else if self.up != Some(false) && self.high - x > step {
                    self.turn(false, at, hysteresis, out);
                    self.low = x;
                }
                if self.up != Some(true) {
                    self.low = self.low.min(x);
                }
                if self.up != Some(false) {
                    self.high = self.high.max(x);
                }
            }
        }
        self.smooth = smooth;
    }

    fn turn(&mut self, up: bool, at: u64, hysteresis: Hysteresis, out: &mut VecDeque<Swing>) {
        let from = if up { self.low } else { self.high };
        if let Some(mut done) = self.open.take() {
            done.to = from;
            out.push_back(done);
        }
        self.up = Some(up);
        self.open = Some(Swing {
            up,
            confirmed: at,
            from,
            to: from,
            noise: hysteresis.noise,
            noisy: hysteresis.smooth,
            early: false,
        });
    }

    /// The swing under way, if it was confirmed before `known` and not handed out before: its
    /// surroundings are complete, however long it may still go on.
    pub(crate) fn early(&mut self, known: u64) -> Option<Swing> {
        let (low, high) = (self.low, self.high);
        let open = self.open.as_mut()?;
        if open.early || open.confirmed >= known {
            return None;
        }
        open.early = true;
        Some(Swing {
            to: if open.up { high } else { low },
            ..*open
        })
    }

    /// Ends the swing under way.
    pub(crate) fn finish(&mut self, out: &mut VecDeque<Swing>) {
        if let Some(mut done) = self.open.take() {
            done.to = if done.up { self.high } else { self.low };
            out.push_back(done);
        }
    }
}

/// Height at which half the summed height lies below.
pub(crate) fn typical(held: &VecDeque<Measured>) -> f64 {
    let mut heights: Vec<f64> = held.iter().map(|m| m.swing.height()).collect();
    heights.sort_unstable_by(f64::total_cmp);
    let half = 0.5 * heights.iter().sum::<f64>();
    let mut sum = 0.0;
    for height in heights {
        sum += height;
        if sum >= half {
            return height;
        }
    }
    0.0
}

/// Takes out swings below half the typical one, each with the smaller of its neighbours' turning
/// points, smallest first; the neighbours become one swing. Returns the typical height.
pub(crate) fn merge_ripple(held: &mut VecDeque<Measured>) -> f64 {
    let typical = typical(held);
    // The last swing may still grow with what follows, so it is left alone.
    while held.len() >= 3 {
        let smallest = (1..held.len() - 1)
            .min_by(|&a, &b| held[a].swing.height().total_cmp(&held[b].swing.height()));
        let Some(i) = smallest else { break };
        if held[i].swing.height() >= 0.5 * typical {
            break;
        }
        let joined = join(&held[i - 1], &held[i + 1]);
        held.drain(i..=i + 1);
        held[i - 1] = joined;
    }
    typical
}

/// One swing out of two of the same direction: the crossing half-way of the whole is the one
/// that counts.
fn join(a: &Measured, b: &Measured) -> Measured {
    let swing = Swing {
        to: b.swing.to,
        ..a.swing
    };
    let middle = 0.5 * (swing.from + swing.to);
    let holds = |m: &Measured| (m.swing.from - middle) * (m.swing.to - middle) <= 0.0;
    let chosen = match (holds(a), holds(b)) {
        (true, false) => a,
        (false, true) => b,
        _ if a.swing.height() >= b.swing.height() => a,
        _ => b,
    };
    let crossing = chosen.crossing.clone().map(|mut crossing| {
        if let (Some(first), Some(second)) = (&a.crossing, &b.crossing) {
            (crossing.low, crossing.high) = if swing.up {
                (first.low, second.high)
            } else {
                (second.low, first.high)
            };
        }
        crossing
    });
    Measured {
        swing: Swing {
            confirmed: chosen.swing.confirmed,
            ..swing
        },
        crossing,
    }
}
