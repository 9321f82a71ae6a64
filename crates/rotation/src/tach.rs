//! Timed edges of a tach channel, found as the samples stream by.
//!
//! - **Finding.** The channel is cut into swings: it turns when it has come back from its last
//!   extreme by more than a hysteresis, which stands above the noise, above a tenth of the
//!   pulses seen so far, and below the pulses of this slab. Swings, not levels, so offset and
//!   drift do no harm. Swings below half the typical swing of their neighbourhood (weighted
//!   median over some fifty) are ripple and are merged into what they ride on.
//! - **Timing.** The instant at which the Gaussian-smoothed channel
//!   s(τ) = Σ x(n)·G(n − τ), G of standard deviation 0.8 … 3 samples, crosses half-way
//!   between base and top. s and s' are summed at any τ, nothing is interpolated; what sampling
//!   adds is below e^{−2π²σ²}, 1e-8 at σ = 1. The smoothing that serves noise best is the
//!   edge's own rms width. Base and top are means of the channel before and after the edge,
//!   medians over 15 edges.
//! - Noise of an edge: σ_v/√(2√π·σ)/|s'|.
//!
//! Slabs have fixed borders in the channel, so results do not depend on how it was pushed.

use crate::Error;
use crate::edge::Crossing;
use crate::swing::{Hysteresis, Swing, Zigzag, merge_ripple};
use shaftwise_signal::{SamplePosition, median_in_place};
use std::collections::VecDeque;

/// Samples per slab, and looked at beyond it on either side.
const SLAB: u64 = 1 << 16;
const MARGIN: u64 = 1 << 13;
/// Swings held back so that each is judged among its neighbours.
const HELD: usize = 64;
/// Edges on either side whose levels are taken together.
const LEVEL_NEIGHBOURS: usize = 7;

/// Which edge of a pulse is timed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Edge {
    /// From low to high.
    #[default]
    Rising,
    /// From high to low.
    Falling,
}

/// How a tach channel is read.
#[derive(Debug, Clone, PartialEq)]
pub struct TachConfig {
    /// Sample rate in Hz.
    pub sample_rate_hz: f64,
    /// Pulses per revolution. Range: 1 to 4096.
    pub pulses_per_rev: u32,
    /// Edge timed. Default: rising.
    pub edge: Edge,
    /// Level the edge must cross, in the channel's unit. Default: half-way of each pulse.
    pub threshold: Option<f64>,
    /// Taken off every edge's time, in seconds. Default: 0.
    pub delay_s: f64,
}

/// An edge: 24 bytes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TimedEdge {
    /// When, the tach's delay taken off.
    pub position: SamplePosition,
    /// From base to top, in the channel's unit.
    pub height: f32,
    /// What the straight-line crossing adds to the position, in samples.
    straight: f32,
}

/// The edges of a tach channel.
#[derive(Debug, Clone, PartialEq)]
pub struct TachScan {
    /// In time order.
    pub edges: Vec<TimedEdge>,
    /// Standard deviation of an edge's time that the channel's noise and the edges' slope
    /// explain, in seconds.
    pub edge_sigma_s: f64,
    /// Median time from 10 to 90 % of the edge, in seconds.
    pub edge_width_s: f64,
    /// Median width of the pulse, in seconds: the shorter of the two states between edges.
    pub pulse_width_s: f64,
    /// Median level below the edge, in the channel's unit.
    pub low: f64,
    /// Median level above the edge, in the channel's unit.
    pub high: f64,
    /// Whether the channel knows two values only: an edge is then known to one sample.
    pub two_level: bool,
    /// Standard deviation of the Gaussian the edges were timed with, in samples.
    pub smoothing: f64,
    /// What is doubtful, in words.
    pub warnings: Vec<String>,
}

/// Reads a tach channel piece by piece.
#[derive(Debug)]
pub struct TachScanner {
    config: TachConfig,
    /// Samples from `buffer_start` on.
    buffer: Vec<f64>,
    buffer_start: u64,
    /// Samples gone through for swings.
    seen: u64,
    bad: Option<(u64, f64)>,
    values: FewValues,
    zigzag: Zigzag,
    /// Swings found whose surroundings are not yet looked at.
    raw: VecDeque<Swing>,
    /// Swings measured, held until their neighbours are known.
    held: VecDeque<Measured>,
    /// Typical height of the swings judged last.
    typical: f64,
    /// Crossings whose levels wait for later neighbours; the first `done` of them are timed.
    waiting: VecDeque<Crossing>,
    done: usize,
    smoothing: Option<f64>,
    last_opposite: Option<f64>,
    last_timed: Option<f64>,
    edges: Vec<TimedEdge>,
    tally: Tally,
}

/// A swing with the samples around its middle.
#[derive(Debug, Clone)]
pub(crate) struct Measured {
    pub(crate) swing: Swing,
    pub(crate) crossing: Option<Crossing>,
}

/// Medians of what the edges were like, over at most a few thousand of them.
#[derive(Debug, Default)]
struct Tally {
    widths: Vec<f64>,
    pulses: Vec<f64>,
    lows: Vec<f64>,
    highs: Vec<f64>,
    variance: f64,
    count: u64,
}

/// Up to three different values.
#[derive(Debug, Default)]
struct FewValues {
    values: Vec<f64>,
}

impl FewValues {
    fn look(&mut self, samples: &[f64]) {
        for &x in samples {
            if self.values.len() > 2 {
                return;
            }
            if !self.values.contains(&x) {
                self.values.push(x);
            }
        }
    }
}

impl TachScanner {
    /// A scanner at the first sample of the recording.
    ///
    /// # Errors
    ///
    /// [`Error::SampleRate`], [`Error::PulsesPerRev`], or [`Error::Setting`] for a threshold or
    /// a delay that is not finite.
    pub fn new(config: &TachConfig) -> Result<Self, Error> {
        if !(config.sample_rate_hz > 0.0 && config.sample_rate_hz.is_finite()) {
            return Err(Error::SampleRate {
                found: config.sample_rate_hz,
            });
        }
        if !(1..=4096).contains(&config.pulses_per_rev) {
            return Err(Error::PulsesPerRev {
                found: config.pulses_per_rev,
                most: 4096,
            });
        }
        for (what, found) in [
            ("tach threshold", config.threshold.unwrap_or(0.0)),
            ("tach delay in seconds", config.delay_s),
        ] {
            if !found.is_finite() {
                return Err(Error::Setting { what, found });
            }
        }
        Ok(Self {
            config: config.clone(),
            buffer: Vec::new(),
            buffer_start: 0,
            seen: 0,
            bad: None,
            values: FewValues::default(),
            zigzag: Zigzag::default(),
            raw: VecDeque::new(),
            held: VecDeque::new(),
            typical: 0.0,
            waiting: VecDeque::new(),
            done: 0,
            smoothing: None,
            last_opposite: None,
            last_timed: None,
            edges: Vec::new(),
            tally: Tally::default(),
        })
    }

    /// Takes the next samples, any number of them.
    pub fn push(&mut self, mut samples: &[f64]) {
        while !samples.is_empty() {
            let end = self.buffer_start + self.buffer.len() as u64;
            let wanted = self.seen + SLAB;
            let take = samples.len().min((wanted - end) as usize);
            let (now, later) = samples.split_at(take);
            if self.bad.is_none() && !now.iter().map(|x| x * 0.0).sum::<f64>().eq(&0.0) {
                let at = now.iter().position(|x| !x.is_finite()).unwrap_or(0);
                self.bad = Some((end + at as u64, now[at]));
            }
            self.values.look(now);
            self.buffer.extend_from_slice(now);
            samples = later;
            if end + take as u64 == wanted {
                self.slab(wanted, false);
            }
        }
    }

    /// The edges, after the last sample.
    ///
    /// # Errors
    ///
    /// [`Error::NotFinite`], [`Error::Constant`], or [`Error::TooFewPulses`] when no edge was
    /// found.
    pub fn finish(mut self) -> Result<TachScan, Error> {
        if let Some((index, found)) = self.bad {
            return Err(Error::NotFinite { index, found });
        }
        let end = self.buffer_start + self.buffer.len() as u64;
        if self.values.values.len() == 1 {
            return Err(Error::Constant {
                level: self.values.values[0],
                samples: end,
            });
        }
        self.slab(end, true);
        // Ripple before the first pulse passes for pulses until there are some to compare with.
        let mut heights: Vec<f64> = self.edges.iter().map(|e| f64::from(e.height)).collect();
        let typical = median_in_place(&mut heights);
        self.edges.retain(|e| f64::from(e.height) > 0.05 * typical);
        if self.edges.is_empty() {
            return Err(Error::TooFewPulses {
                found: 0,
                least: crate::LEAST_PULSES,
            });
        }
        choose_crossing(&mut self.edges);
        let rate = self.config.sample_rate_hz;
        let two_level = self.values.values.len() == 2;
        let tally = &mut self.tally;
        let mut edge_sigma_s = (tally.variance / tally.count.max(1) as f64).sqrt() / rate;
        let mut warnings = Vec::new();
        if two_level {
            edge_sigma_s = 1.0 / (rate * 12f64.sqrt());
            warnings.push(format!(
                "the tach channel knows two values only: each edge is known to one sample, {:.2} us \
                 standard deviation",
                edge_sigma_s * 1e6
            ));
        }
        Ok(TachScan {
            edge_sigma_s,
            edge_width_s: median_in_place(&mut tally.widths) / rate,
            pulse_width_s: median_in_place(&mut tally.pulses) / rate,
            low: median_in_place(&mut tally.lows),
            high: median_in_place(&mut tally.highs),
            two_level,
            smoothing: self.smoothing.unwrap_or(0.0),
            warnings,
            edges: self.edges,
        })
    }

    /// Goes through the samples up to `end`; what it needs beyond them waits for the next slab.
    fn slab(&mut self, end: u64, last: bool) {
        if self.bad.is_some() {
            self.seen = end;
            self.buffer_start = end;
            self.buffer.clear();
            return;
        }
        let start = (self.seen - self.buffer_start) as usize;
        // The swings held tell it too: a slow shaft takes long to have some judged.
        let typical = self.typical.max(crate::swing::typical(&self.held));
        let hysteresis = Hysteresis::of(&self.buffer[start..], typical);
        self.zigzag.run(
            &self.buffer,
            start,
            self.buffer_start,
            hysteresis,
            &mut self.raw,
        );
        if last {
            self.zigzag.finish(&mut self.raw);
        }
        self.seen = end;
        let known = if last {
            u64::MAX
        } else {
            end - MARGIN.min(end)
        };
        while let Some(swing) = self.raw.front().copied() {
            if swing.confirmed >= known {
                break;
            }
            let next = self.raw.get(1).map_or(end, |next| next.confirmed);
            self.raw.pop_front();
            match self.held.back_mut() {
                Some(measured) if swing.early => measured.swing.to = swing.to,
                _ => self.hold(swing, next),
            }
        }
        if self.raw.is_empty()
            && let Some(swing) = self.zigzag.early(known)
        {
            self.hold(swing, end);
        }
        if last {
            self.judge(usize::MAX);
            self.time(true);
        } else {
            let keep = end.saturating_sub(2 * MARGIN);
            let surplus = keep.saturating_sub(self.buffer_start) as usize;
            self.buffer.drain(..surplus);
            self.buffer_start += surplus as u64;
        }
    }

    /// Measures a swing and holds it back until its neighbours are known.
    fn hold(&mut self, swing: Swing, next: u64) {
        let before = self.held.back().map_or(0, |m| m.swing.confirmed);
        let crossing = self.measure(&swing, before, next);
        self.held.push_back(Measured { swing, crossing });
        if self.held.len() >= 2 * HELD {
            self.judge(HELD);
        }
    }

    /// Looks at the samples around a swing.
    fn measure(&self, swing: &Swing, before: u64, next: u64) -> Option<Crossing> {
        let local = |at: u64| (at.max(self.buffer_start) - self.buffer_start) as usize;
        let first = local(before.max(swing.confirmed.saturating_sub(MARGIN)));
        let last = local(next.min(swing.confirmed + MARGIN)).min(self.buffer.len());
        Crossing::measure(
            &self.buffer,
            self.buffer_start,
            local(swing.confirmed),
            first..last,
            swing,
            self.config.threshold,
        )
    }

    /// Merges ripple and passes on the first swings; `keep` stay for the next turn.
    fn judge(&mut self, keep: usize) {
        let all = keep == usize::MAX;
        if self.config.threshold.is_none() {
            self.typical = merge_ripple(&mut self.held);
        } else {
            self.typical = crate::swing::typical(&self.held);
        }
        let pass = if all {
            self.held.len()
        } else {
            self.held.len().saturating_sub(keep)
        };
        let wanted = self.config.edge == Edge::Rising;
        for measured in self.held.drain(..pass) {
            let Some(crossing) = measured.crossing else {
                continue;
            };
            let height = measured.swing.height();
            if self.config.threshold.is_none() && height < 0.5 * self.typical {
                continue;
            }
            let at = crossing.coarse;
            if measured.swing.up == wanted {
                let gap = self.last_opposite.map(|previous| at - previous);
                self.last_timed = Some(at);
                let mut crossing = crossing;
                crossing.gap_before = gap;
                self.waiting.push_back(crossing);
            } else {
                let gap = self.last_timed.map(|previous| at - previous);
                self.last_opposite = Some(at);
                if let Some(waiting) = self.waiting.back_mut() {
                    waiting.gap_after = gap;
                }
            }
        }
        self.time(all);
    }

    /// Times the waiting edges whose neighbours are all there.
    fn time(&mut self, last: bool) {
        let n = self.waiting.len();
        if self.smoothing.is_none() && n > 0 && (last || n >= 2 * LEVEL_NEIGHBOURS + 2) {
            self.smoothing = Some(crate::edge::smoothing(self.waiting.make_contiguous()));
        }
        let Some(smoothing) = self.smoothing else {
            return;
        };
        // One more than the neighbours, so that the gap after an edge is known as well.
        while self.done < n && (last || self.done + LEVEL_NEIGHBOURS + 1 < n) {
            let i = self.done;
            let reach = LEVEL_NEIGHBOURS.min(i).min(n - 1 - i);
            let near = || self.waiting.range(i - reach..=i + reach);
            let (mut lows, mut highs): (Vec<f64>, Vec<f64>) =
                near().map(|c| (c.low, c.high)).unzip();
            let levels = (median_in_place(&mut lows), median_in_place(&mut highs));
            let crossing = &self.waiting[i];
            if let Some(timed) = crossing.time(smoothing, levels, self.config.threshold) {
                self.tally.add(crossing, timed.variance);
                let offset = timed.offset - self.config.delay_s * self.config.sample_rate_hz;
                // With the delay taken off, an edge may lie before the first sample.
                if crossing.snippet.first as f64 + offset >= 0.0 {
                    self.edges.push(TimedEdge {
                        position: SamplePosition::new(crossing.snippet.first, offset),
                        height: (crossing.high - crossing.low).abs() as f32,
                        straight: timed.straight as f32,
                    });
                }
            }
            self.done += 1;
        }
        let surplus = self.done.saturating_sub(LEVEL_NEIGHBOURS);
        self.waiting.drain(..surplus);
        self.done -= surplus;
    }
}

/// Takes the straight-line crossings where they scatter less than the smoothed ones.
///
/// Straight edges of a few samples with sharp corners are not band-limited: smoothing folds
/// the corners into the middle, while the line between two samples on the edge is exact. The
/// edges tell themselves: fifth differences of their times hold the motion no more and the
/// timing error 16-fold; their median ignores lost and stray pulses.
fn choose_crossing(edges: &mut [TimedEdge]) {
    let scatter = |straight: f64| {
        let mut sizes: Vec<f64> = edges
            .windows(6)
            .map(|six| {
                let origin = six[0].position;
                let at = |k: usize| {
                    six[k].position.since(origin) + straight * f64::from(six[k].straight)
                };
                let sum = at(5) - 5.0 * at(4) + 10.0 * at(3) - 10.0 * at(2) + 5.0 * at(1) - at(0);
                sum.abs()
            })
            .collect();
        median_in_place(&mut sizes)
    };
    // By a third: not for a difference that the motion or chance may make.
    if scatter(1.0) < 0.67 * scatter(0.0) {
        for edge in edges {
            let offset = edge.position.fraction + f64::from(edge.straight);
            edge.position = SamplePosition::new(edge.position.index, offset);
        }
    }
}

impl Tally {
    fn add(&mut self, crossing: &Crossing, variance: f64) {
        self.variance += variance;
        self.count += 1;
        // Plenty for a median.
        if self.widths.len() < 4096 {
            self.widths.push(crossing.width_10_90);
            self.lows.push(crossing.low);
            self.highs.push(crossing.high);
            let gaps = [crossing.gap_before, crossing.gap_after];
            if let Some(gap) = gaps.into_iter().flatten().reduce(f64::min) {
                self.pulses.push(gap);
            }
        }
    }
}
