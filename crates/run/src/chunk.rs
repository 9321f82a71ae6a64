//! Pass 2, one chunk: samples of the recording in, sums of blocks out.
//!
//! A chunk is a stretch of time. It owns the blocks that start in it, reads on as far as their
//! last one reaches, and recomputes what it shares with its neighbours, so chunks know nothing of each
//! other. Within it: decode, halve the rate as far as the grid's step allows, convert in time,
//! interpolate at the grid's instants (weights once, for all channels), and feed the blocks.

use crate::Error;
use crate::pass_one::{shrunk, slab_frames};
use shaftwise_orders::{
    EPOCHS, Instant, SpectrumAccumulator, SpectrumPlan, SpectrumScratch, Stretch,
    SynchronousAccumulator, Track,
};
use shaftwise_recording::{Recording, first_non_finite};
use shaftwise_signal::{
    Conversion, ConversionPlan, HalfBand, InterpolationPlan, PyramidPlan, SamplePosition, Taps,
};
use std::collections::BTreeMap;
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, OnceLock};

/// A channel as a track needs it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Slot {
    /// Channel of the recording, from 0.
    pub(crate) channel: usize,
    /// Conversion in time.
    pub(crate) conversion: Option<Conversion>,
}

/// What is fed from a track.
#[derive(Debug, Clone)]
pub(crate) enum Feed {
    /// Spectra of overlapping blocks.
    Spectrum(Arc<SpectrumPlan>),
    /// Whole revolutions.
    Synchronous,
}

/// One analysis' share of a track.
#[derive(Debug, Clone)]
pub(crate) struct Consumer {
    pub(crate) feed: Feed,
    /// Slots of the track it takes, in its own order of channels.
    pub(crate) slots: Vec<usize>,
    /// Grid samples in a block.
    pub(crate) block: usize,
    /// Grid samples from block to block.
    pub(crate) hop: usize,
    /// Blocks taken from each stretch.
    pub(crate) blocks: Vec<u64>,
}

impl Consumer {
    pub(crate) fn total_blocks(&self) -> u64 {
        self.blocks.iter().sum()
    }
}

/// A track with its stretches and everything fed from it.
#[derive(Debug)]
pub(crate) struct TrackWork {
    pub(crate) track: Track,
    /// One for each window of the selection.
    pub(crate) stretches: Vec<Option<Stretch>>,
    pub(crate) slots: Vec<Slot>,
    pub(crate) filter_reach: u64,
    pub(crate) consumers: Vec<Consumer>,
}

/// A chunk: a window of the selection and a part of its time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Chunk {
    pub(crate) window: usize,
    pub(crate) from: SamplePosition,
    pub(crate) to: SamplePosition,
}

/// Sums of one consumer.
#[derive(Debug)]
pub(crate) enum Sums {
    Spectrum(SpectrumAccumulator),
    Synchronous(SynchronousAccumulator),
}

impl Sums {
    pub(crate) fn new(consumer: &Consumer) -> Self {
        let channels = consumer.slots.len();
        match &consumer.feed {
            Feed::Spectrum(plan) => {
                Self::Spectrum(SpectrumAccumulator::new(plan.clone(), channels))
            }
            Feed::Synchronous => {
                Self::Synchronous(SynchronousAccumulator::new(consumer.block, channels))
            }
        }
    }

    pub(crate) fn merge(&mut self, later: Self) {
        match (self, later) {
            (Self::Spectrum(a), Self::Spectrum(b)) => a.merge(b),
            (Self::Synchronous(a), Self::Synchronous(b)) => a.merge(b),
            _ => unreachable!("sums of one consumer are of one kind"),
        }
    }
}

/// What all threads share.
pub(crate) struct PassTwo<'a> {
    pub(crate) recording: &'a Recording,
    pub(crate) tracks: &'a [TrackWork],
    pub(crate) interpolation: InterpolationPlan,
    pub(crate) pyramid: PyramidPlan,
    /// By track, slot and level.
    pub(crate) conversions: Vec<Vec<Vec<OnceLock<ConversionPlan>>>>,
}

/// Halvings looked after: 2^20 samples to a step is beyond any use.
const LEVELS: usize = 21;

impl<'a> PassTwo<'a> {
    pub(crate) fn new(recording: &'a Recording, tracks: &'a [TrackWork]) -> Self {
        let conversions = tracks
            .iter()
            .map(|work| {
                work.slots
                    .iter()
                    .map(|_| (0..LEVELS).map(|_| OnceLock::new()).collect())
                    .collect()
            })
            .collect();
        Self {
            recording,
            tracks,
            interpolation: InterpolationPlan::new(),
            pyramid: PyramidPlan::new(),
            conversions,
        }
    }
}

/// Work space of one thread.
#[derive(Default)]
pub(crate) struct Space {
    bytes: Vec<u8>,
    decoded: Vec<Vec<f64>>,
    halved: [Vec<f64>; 2],
    signals: Vec<Signal>,
    grid: Vec<Vec<f64>>,
    /// Bias of each slot's grid, and the weights it is found with.
    bias: Vec<f64>,
    hann: Vec<f64>,
    converted: Vec<Vec<f64>>,
    taps: Taps,
    spectra: BTreeMap<(usize, usize), SpectrumScratch>,
}

/// All channels of a chunk at one level.
#[derive(Default)]
struct Signal {
    level: u32,
    /// Index of the first sample, at the level's rate.
    start: u64,
    channels: Vec<Vec<f64>>,
}

/// One track's part of a chunk.
struct Part {
    /// Blocks of each consumer: first and one past the last, within the stretch.
    blocks: Vec<std::ops::Range<u64>>,
    /// First grid sample.
    first: i64,
    instants: Vec<Instant>,
    level: u32,
    /// Samples of the recording needed.
    from: u64,
    to: u64,
}

/// Levels an instant's step allows, as far as the conversions leave room for their corner.
pub(crate) fn levels(step: f64, slots: &[Slot], sample_rate_hz: f64) -> u32 {
    let mut level = PyramidPlan::levels(step).min(LEVELS as u32 - 1);
    for conversion in slots.iter().filter_map(|slot| slot.conversion) {
        // The design needs ten times its corner; twenty leave its flanks alone.
        while level > 0 && sample_rate_hz / f64::from(1u32 << level) < 20.0 * conversion.corner_hz {
            level -= 1;
        }
    }
    level
}

impl PassTwo<'_> {
    /// Works one chunk out: sums by track and consumer.
    pub(crate) fn work(
        &self,
        chunk: &Chunk,
        space: &mut Space,
        cancel: &AtomicBool,
    ) -> Result<Vec<Vec<Sums>>, Error> {
        if cancel.load(Ordering::Relaxed) {
            return Err(Error::Cancelled);
        }
        let parts: Vec<Option<Part>> = self
            .tracks
            .iter()
            .map(|work| self.part(work, chunk))
            .collect();
        let mut sums: Vec<Vec<Sums>> = self
            .tracks
            .iter()
            .map(|work| work.consumers.iter().map(Sums::new).collect())
            .collect();
        let active = || {
            parts
                .iter()
                .enumerate()
                .filter_map(|(i, part)| Some((i, part.as_ref()?)))
        };
        let Some(from) = active().map(|(_, part)| part.from).min() else {
            return Ok(sums);
        };
        let to = active().map(|(_, part)| part.to).max().unwrap_or(from);

        let mut channels: Vec<usize> = active()
            .flat_map(|(i, _)| self.tracks[i].slots.iter().map(|slot| slot.channel))
            .collect();
        channels.sort_unstable();
        channels.dedup();
        let mut wanted: Vec<u32> = active().map(|(_, part)| part.level).collect();
        wanted.sort_unstable();
        wanted.dedup();
        self.fill_signals(from, to, &channels, &wanted, space)?;

        for (number, part) in active() {
            let work = &self.tracks[number];
            self.resample(number, part, &channels, space)?;
            for (index, (consumer, sums)) in
                work.consumers.iter().zip(&mut sums[number]).enumerate()
            {
                let before: u64 = consumer.blocks[..chunk.window].iter().sum();
                let total = consumer.total_blocks();
                let stretch = work.stretches[chunk.window].map_or(0, |s| s.first);
                for block in part.blocks[index].clone() {
                    let epoch = (EPOCHS as u64 * (before + block) / total) as usize;
                    let start =
                        (stretch + block as i64 * consumer.hop as i64 - part.first) as usize;
                    let grid = &space.grid;
                    let blocks = consumer
                        .slots
                        .iter()
                        .map(|slot| &grid[*slot][start..start + consumer.block]);
                    match (&mut *sums, &consumer.feed) {
                        (Sums::Spectrum(sums), Feed::Spectrum(plan)) => {
                            let bias = consumer.slots.iter().map(|slot| space.bias[*slot]);
                            let scratch = space
                                .spectra
                                .entry((number, index))
                                .or_insert_with(|| plan.scratch());
                            sums.push(epoch, blocks.zip(bias), scratch);
                        }
                        (Sums::Synchronous(sums), _) => sums.push(epoch, before + block, blocks),
                        (Sums::Spectrum(_), Feed::Synchronous) => {
                            unreachable!("sums are made for their feed")
                        }
                    }
                }
            }
        }
        Ok(sums)
    }

    /// What a track has to do in a chunk; nothing when no block starts in it.
    fn part(&self, work: &TrackWork, chunk: &Chunk) -> Option<Part> {
        let stretch = work.stretches[chunk.window]?;
        let starts_before = |index: i64, limit: SamplePosition| {
            let instant = work.track.instant(stretch.section, index);
            SamplePosition {
                index: instant.index,
                fraction: instant.fraction,
            } < limit
        };
        let mut blocks = Vec::new();
        let (mut first, mut end) = (i64::MAX, i64::MIN);
        for consumer in &work.consumers {
            let count = consumer.blocks[chunk.window];
            let place = |block: u64| stretch.first + block as i64 * consumer.hop as i64;
            let below = |limit| partition(count, |block| starts_before(place(block), limit));
            let range = below(chunk.from)..below(chunk.to);
            if !range.is_empty() {
                first = first.min(place(range.start));
                end = end.max(place(range.end - 1) + consumer.block as i64);
            }
            blocks.push(range);
        }
        if first > end {
            return None;
        }
        let mut instants = Vec::new();
        work.track.instants(
            stretch.section,
            first,
            (end - first) as usize,
            &mut instants,
        );
        let least = instants
            .iter()
            .map(|i| i.step)
            .fold(f64::INFINITY, f64::min);
        let level = levels(least, &work.slots, self.recording.sample_rate_hz());
        let (mut from, mut to) = (u64::MAX, 0);
        for instant in &instants {
            let reach = Track::reach(instant.step, level, work.filter_reach);
            from = from.min(instant.index.saturating_sub(reach));
            to = to.max(instant.index + reach + 2);
        }
        Some(Part {
            blocks,
            first,
            instants,
            level,
            from,
            to: to.min(self.recording.frames()),
        })
    }

    /// Decodes the channels and halves their rate down to every wanted level, into `space.signals`.
    fn fill_signals(
        &self,
        from: u64,
        to: u64,
        channels: &[usize],
        wanted: &[u32],
        space: &mut Space,
    ) -> Result<(), Error> {
        let top = wanted.last().copied().unwrap_or(0);
        let mut stages: Vec<Vec<HalfBand>> = Vec::new();
        let mut starts = vec![from];
        for level in 0..top as usize {
            let stage = HalfBand::new(starts[level]);
            starts.push(stage.next_output());
            stages.push(vec![stage; channels.len()]);
        }
        space.signals.resize_with(wanted.len(), Signal::default);
        for (signal, level) in space.signals.iter_mut().zip(wanted) {
            signal.level = *level;
            signal.start = starts[*level as usize];
            signal.channels.resize_with(channels.len(), Vec::new);
            signal.channels.iter_mut().for_each(Vec::clear);
        }
        space.decoded.resize_with(channels.len(), Vec::new);
        let slab = slab_frames(self.recording);
        let [input, output] = &mut space.halved;
        let mut first = from;
        while first < to {
            let frames = slab.min((to - first) as usize);
            space.decoded.iter_mut().for_each(Vec::clear);
            let read = self
                .recording
                .read(
                    first,
                    frames,
                    channels,
                    &mut space.bytes,
                    &mut space.decoded,
                )
                .map_err(Error::in_recording(self.recording.name()))?;
            if read < frames {
                return Err(shrunk(self.recording, first + read as u64));
            }
            for (number, samples) in space.decoded.iter().enumerate() {
                if let Some(place) = first_non_finite(samples) {
                    return Err(self.no_number(channels[number], first + place as u64));
                }
                for level in 0..=top {
                    let here: &[f64] = if level == 0 {
                        samples
                    } else {
                        output.clear();
                        let below: &[f64] = if level == 1 { samples } else { input };
                        stages[level as usize - 1][number].push(&self.pyramid, below, output);
                        std::mem::swap(input, output);
                        input
                    };
                    if let Some(signal) = space.signals.iter_mut().find(|s| s.level == level) {
                        signal.channels[number].extend_from_slice(here);
                    }
                }
            }
            first += frames as u64;
        }
        Ok(())
    }

    fn no_number(&self, channel: usize, sample: u64) -> Error {
        let name = match self.recording.channels()[channel].name.as_str() {
            own if own == format!("channel {}", channel + 1) => String::new(),
            own => format!(" ({own})"),
        };
        let time = sample as f64 / self.recording.sample_rate_hz();
        Error::Setting {
            what: format!(
                "channel {}{name} holds a value that is no finite number at {time:.4} s (sample {sample})",
                channel + 1
            ),
            hint: format!(
                "leave that stretch out, such as --exclude {:.2}:{:.2}=gap",
                (time - 0.5).max(0.0),
                time + 0.5
            ),
        }
    }

    /// Grid samples of every slot of a track, into `space.grid`.
    fn resample(
        &self,
        number: usize,
        part: &Part,
        channels: &[usize],
        space: &mut Space,
    ) -> Result<(), Error> {
        let signal = space
            .signals
            .iter()
            .find(|s| s.level == part.level)
            .expect("every track's level was filled");
        let rate = self.recording.sample_rate_hz() / f64::from(1u32 << part.level);
        let slots = &self.tracks[number].slots;
        let samples_of = |slot: &Slot| {
            let place = channels
                .binary_search(&slot.channel)
                .expect("every slot's channel was read");
            signal.channels[place].as_slice()
        };
        space.converted.resize_with(slots.len(), Vec::new);
        for (index, slot) in slots.iter().enumerate() {
            let Some(conversion) = slot.conversion else {
                continue;
            };
            let cell = &self.conversions[number][index][part.level as usize];
            let plan = match cell.get() {
                Some(plan) => plan,
                None => {
                    let plan =
                        ConversionPlan::new(conversion, rate).map_err(|e| Error::Setting {
                            what: e.to_string(),
                            hint: "the sample rate is too low for this conversion".to_owned(),
                        })?;
                    cell.get_or_init(|| plan)
                }
            };
            let out = &mut space.converted[index];
            plan.process(samples_of(slot), out);
            // m/s², mm/s and µm are a thousand apart for each integration.
            let unit = 1000f64.powi(-conversion.power);
            out.iter_mut().for_each(|x| *x *= unit);
        }
        let sources: Vec<(i64, &[f64])> = slots
            .iter()
            .zip(&space.converted)
            .map(|(slot, converted)| match slot.conversion {
                Some(conversion) => {
                    let lost = ConversionPlan::reach(conversion, rate) as u64;
                    ((signal.start + lost) as i64, converted.as_slice())
                }
                None => (signal.start as i64, samples_of(slot)),
            })
            .collect();
        space.grid.resize_with(slots.len(), Vec::new);
        space.grid.iter_mut().for_each(Vec::clear);
        let scale = f64::from(1u32 << part.level);
        let mask = (1u64 << part.level) - 1;
        for instant in &part.instants {
            let index = (instant.index >> part.level) as i64;
            let fraction = ((instant.index & mask) as f64 + instant.fraction) / scale;
            self.interpolation
                .taps(index, fraction, instant.step / scale, &mut space.taps);
            for ((start, samples), out) in sources.iter().zip(&mut space.grid) {
                out.push(space.taps.apply(&self.interpolation, samples, *start));
            }
        }
        fill_hann(&mut space.hann, part.instants.len());
        space.bias.clear();
        space.bias.extend(
            space
                .grid
                .iter()
                .map(|grid| weighted_mean(grid, &space.hann)),
        );
        Ok(())
    }
}

/// Hann's window over a chunk, from a running rotation.
fn fill_hann(weights: &mut Vec<f64>, length: usize) {
    let (step_sin, step_cos) = (std::f64::consts::TAU / length.max(1) as f64).sin_cos();
    let (mut sin, mut cos) = (0.0f64, 1.0f64);
    weights.clear();
    weights.extend((0..length).map(|_| {
        let weight = 1.0 - cos;
        (sin, cos) = (
            sin * step_cos + cos * step_sin,
            cos * step_cos - sin * step_sin,
        );
        weight
    }));
}

/// Mean of a chunk's samples under Hann's window. A component gives nothing to it from two turns of
/// the whole chunk on, a fraction of a line: taking it off removes a bias and leaves every line alone.
fn weighted_mean(samples: &[f64], weights: &[f64]) -> f64 {
    // Eight sums side by side, so that none waits for itself.
    let mut sums = [[0.0; 8]; 2];
    for (samples, weights) in samples.chunks(8).zip(weights.chunks(8)) {
        for (lane, (x, w)) in samples.iter().zip(weights).enumerate() {
            sums[0][lane] += w * x;
            sums[1][lane] += w;
        }
    }
    let [sum, weight] = sums.map(|lanes| lanes.iter().sum::<f64>());
    if weight > 0.0 { sum / weight } else { 0.0 }
}

/// How many of 0…`count` − 1 come before the first for which `before` is false.
fn partition(count: u64, before: impl Fn(u64) -> bool) -> u64 {
    let (mut low, mut high) = (0, count);
    while low < high {
        let middle = low + (high - low) / 2;
        if before(middle) {
            low = middle + 1
        } else {
            high = middle
        }
    }
    low
}
