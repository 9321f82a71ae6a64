//! Rendering a recipe in blocks.

use crate::channel::ChannelSource;
use crate::motion::Turning;
use crate::noise::Page;
use crate::sine::{CELL, Cell};
use crate::{Error, Exact, Generator, Motion, Recipe, TachTruth, Truth};

/// Renders a recipe. Memory does not depend on the length (but for the list of stray pulses).
///
/// Samples come in cells of fixed place; a block is cut from them. So any split gives the same
/// bits, and [`Synth::seek`] goes anywhere without rendering what lies between.
#[derive(Debug, Clone)]
pub struct Synth {
    recipe: Recipe,
    motion: Motion,
    sources: Vec<ChannelSource>,
    infos: Vec<ChannelInfo>,
    position: u64,
    /// Number of the cell held in `cells`.
    held: Option<i64>,
    cells: Vec<Cell>,
    pages: Vec<Vec<Page>>,
}

/// What a channel measures.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ChannelInfo {
    /// Name.
    pub name: String,
    /// Quantity.
    pub quantity: String,
    /// Unit of the samples.
    pub unit: String,
    /// It carries pulses.
    pub is_tach: bool,
}

/// A whole recording in memory.
#[derive(Debug, Clone, PartialEq)]
pub struct Rendered {
    /// Samples per second.
    pub sample_rate_hz: f64,
    /// Samples of each channel, in its unit.
    pub channels: Vec<Vec<f64>>,
    /// What was planted in the tach channels.
    pub truth: Truth,
}

impl Synth {
    /// Prepares a recipe, positioned at the first sample.
    ///
    /// # Errors
    /// If a value of the recipe is out of range, see [`Recipe::validate`].
    pub fn new(recipe: &Recipe) -> Result<Self, Error> {
        let motion = Motion::new(recipe)?;
        let generator = Generator::new(recipe.seed).fork(0x7368_6166);
        let sources: Vec<ChannelSource> = recipe
            .channels
            .iter()
            .enumerate()
            .map(|(index, channel)| {
                ChannelSource::new(channel, recipe, &motion, generator.fork(index as u64))
            })
            .collect();
        let infos = recipe.channels.iter().map(|channel| ChannelInfo {
            name: channel.name.clone(),
            quantity: channel.quantity.clone(),
            unit: channel.unit.clone(),
            is_tach: channel.pulses.is_some(),
        });
        Ok(Self {
            recipe: recipe.clone(),
            infos: infos.collect(),
            position: 0,
            held: None,
            cells: vec![[0.0; CELL]; sources.len()],
            pages: sources.iter().map(empty_pages).collect(),
            motion,
            sources,
        })
    }

    /// Renders the whole recording at once.
    ///
    /// # Errors
    /// If a value of the recipe is out of range, see [`Recipe::validate`].
    pub fn render(recipe: &Recipe) -> Result<Rendered, Error> {
        let mut synth = Self::new(recipe)?;
        let mut channels = vec![Vec::new(); recipe.channels.len()];
        synth.next_block(synth.frames() as usize, &mut channels);
        Ok(Rendered {
            sample_rate_hz: recipe.sample_rate_hz,
            channels,
            truth: synth.truth(),
        })
    }

    /// What the channels measure, in order.
    #[must_use]
    pub fn channels(&self) -> &[ChannelInfo] {
        &self.infos
    }

    /// The recipe.
    #[must_use]
    pub fn recipe(&self) -> &Recipe {
        &self.recipe
    }

    /// The motion of the main shaft.
    #[must_use]
    pub fn motion(&self) -> &Motion {
        &self.motion
    }

    /// Samples per channel in the recording.
    #[must_use]
    pub fn frames(&self) -> u64 {
        self.recipe.frames()
    }

    /// Index of the sample that comes next.
    #[must_use]
    pub fn position(&self) -> u64 {
        self.position
    }

    /// Goes to a sample (index < 2^52). Past the end, [`Synth::next_block`] gives nothing.
    pub fn seek(&mut self, index: u64) {
        self.position = index;
    }

    /// Writes the next `frames` samples, or what is left, into `out`, whose vectors are cleared
    /// first. Returns how many there are; 0 at the end.
    ///
    /// # Panics
    /// If `out` has not one vector per channel.
    pub fn next_block(&mut self, frames: usize, out: &mut [Vec<f64>]) -> usize {
        assert_eq!(out.len(), self.sources.len(), "one vector per channel");
        let left = self.frames().saturating_sub(self.position);
        let count = left.min(frames as u64) as usize;
        for out in out.iter_mut() {
            out.clear();
            out.reserve(count);
        }
        let mut done = 0;
        while done < count {
            let (number, offset) = cell_of(self.position);
            self.hold(number);
            let take = (CELL - offset).min(count - done);
            for (out, cell) in out.iter_mut().zip(&self.cells) {
                out.extend_from_slice(&cell[offset..offset + take]);
            }
            done += take;
            self.position += take as u64;
        }
        count
    }

    /// One sample at any index < 2^52, also past the recording's end; the same bits as in a block.
    /// Costs a cell of 64, with coloured noise a page of 16 384 and its warm-up.
    ///
    /// # Panics
    /// If there is no such channel.
    #[must_use]
    pub fn sample(&self, channel: usize, index: u64) -> f64 {
        let (number, offset) = cell_of(index);
        let source = &self.sources[channel];
        let turning = self.motion.turning(number);
        let speeds = self.speeds(&turning, source.needs_speed());
        let mut pages = empty_pages(source);
        source.cell(number, &self.motion, &turning, &speeds, &mut pages)[offset]
    }

    /// The planted truth over the whole recording. Its size grows with the pulses.
    #[must_use]
    pub fn truth(&self) -> Truth {
        self.truth_between(0, self.frames() - 1)
    }

    /// The planted truth from one sample to another, both included.
    #[must_use]
    pub fn truth_between(&self, first: u64, last: u64) -> Truth {
        let [start, end] =
            [first, last].map(|index| Exact::index_time(index as i64, self.recipe.sample_rate_hz));
        let tachs = self
            .sources
            .iter()
            .enumerate()
            .filter_map(|(channel, source)| {
                source.pulses.as_ref().map(|pulses| TachTruth {
                    channel,
                    pulses: pulses.truth(&self.motion, start, end),
                    strays_s: pulses.strays_between(start, end),
                })
            });
        Truth {
            tachs: tachs.collect(),
        }
    }

    fn hold(&mut self, number: i64) {
        if self.held == Some(number) {
            return;
        }
        let turning = self.motion.turning(number);
        let needed = self.sources.iter().any(ChannelSource::needs_speed);
        let speeds = self.speeds(&turning, needed);
        for ((source, cell), pages) in self
            .sources
            .iter()
            .zip(&mut self.cells)
            .zip(&mut self.pages)
        {
            *cell = source.cell(number, &self.motion, &turning, &speeds, pages);
        }
        self.held = Some(number);
    }

    fn speeds(&self, turning: &Turning, needed: bool) -> Cell {
        if needed {
            self.motion.speeds(&turning.times)
        } else {
            [0.0; CELL]
        }
    }
}

fn empty_pages(source: &ChannelSource) -> Vec<Page> {
    vec![Page::default(); source.noise.len()]
}

fn cell_of(index: u64) -> (i64, usize) {
    let cell = CELL as u64;
    ((index / cell) as i64, (index % cell) as usize)
}
