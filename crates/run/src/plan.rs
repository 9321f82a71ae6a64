//! From settings to work: which tracks, which blocks, which chunks.
//!
//! Analyses that need the same samples share a track and are resampled once.

use crate::Error;
use crate::chunk::{Chunk, Consumer, Feed, Slot, TrackWork};
use crate::results::{BlockFacts, ChannelFacts};
use crate::settings::{
    Analysis, Averaging, AxisChoice, ChannelPick, CompareSettings, Detector, ShownAs,
    SpectrumSettings, SynchronousSettings, WindowChoice,
};
use crate::spinning::Spinning;
use shaftwise_machine::Ratio;
use shaftwise_orders::{Average, Limits, SpectrumConfig, SpectrumPlan, Track, samples_per_rev};
use shaftwise_recording::{Quantity, Recording};
use shaftwise_rotation::Rotation;
use shaftwise_signal::{Conversion, ConversionPlan, SamplePosition, Window};
use std::sync::Arc;

/// Highest order looked at when nothing else is asked for.
const DEFAULT_MAX_ORDER: f64 = 50.0;
/// Samples per highest order (common practice); also what the interpolator passes unchanged.
const RATE_RULE: f64 = 2.56;

/// Where an analysis' sums are.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Place {
    pub(crate) track: usize,
    pub(crate) consumer: usize,
}

/// What an analysis of averages rests on, for its result.
#[derive(Debug, Clone)]
pub(crate) struct AveragesPlan {
    pub(crate) channels: Vec<ChannelFacts>,
    pub(crate) detectors: Vec<Detector>,
    /// Conversion in time of each channel, as a power of j2πf; 0 for none.
    pub(crate) powers: Vec<i32>,
    pub(crate) facts: BlockFacts,
    /// Highest order asked for, or the default.
    pub(crate) max_order: f64,
    /// The transform of spectra; none for synchronous averages.
    pub(crate) spectrum: Option<Arc<SpectrumPlan>>,
    /// 1-sigma of the analysed shaft's angle, rev.
    pub(crate) angle_sigma_rev: f64,
    pub(crate) warnings: Vec<String>,
}

/// One analysis, ready.
#[derive(Debug, Clone)]
pub(crate) enum AnalysisPlan {
    Speed,
    Averages {
        place: Place,
        plan: AveragesPlan,
    },
    Compare {
        tracked: Place,
        smeared: Place,
        plan: AveragesPlan,
    },
}

/// Everything pass 2 has to do.
#[derive(Debug)]
pub(crate) struct Plan {
    pub(crate) tracks: Vec<TrackWork>,
    pub(crate) chunks: Vec<Chunk>,
    pub(crate) analyses: Vec<AnalysisPlan>,
}

/// What every average asks for.
struct Request<'a> {
    channel: &'a Option<Vec<ChannelPick>>,
    max_order: Option<f64>,
    ratio: &'a Option<String>,
    shown_as: Option<ShownAs>,
    detector: Option<Detector>,
}

/// What it comes to on this recording.
struct Setup {
    ratio: Ratio,
    slots: Vec<Slot>,
    channels: Vec<ChannelFacts>,
    detectors: Vec<Detector>,
    max_order: f64,
    reachable_order: f64,
    samples_per_rev: u32,
    corner_order: f64,
    filter_reach: u64,
    warnings: Vec<String>,
}

struct Planner<'a> {
    recording: &'a Recording,
    tach: Option<usize>,
    spinning: &'a Spinning,
    tracks: Vec<TrackWork>,
    /// Steady, ratio, samples per revolution and filter reach of each track: what sharing needs.
    keys: Vec<(bool, Ratio, u32, u64)>,
}

/// Lays the work out.
pub(crate) fn plan(
    recording: &Recording,
    tach: Option<usize>,
    spinning: &Spinning,
    analyses: &[Analysis],
) -> Result<Plan, Error> {
    let mut planner = Planner {
        recording,
        tach,
        spinning,
        tracks: Vec::new(),
        keys: Vec::new(),
    };
    let analyses = analyses
        .iter()
        .map(|analysis| match analysis {
            Analysis::Speed(_) => Ok(AnalysisPlan::Speed),
            Analysis::Spectrum(settings) => planner.spectrum(settings),
            Analysis::Synchronous(settings) => planner.synchronous(settings),
            Analysis::Compare(settings) => planner.compare(settings),
        })
        .collect::<Result<Vec<_>, Error>>()?;
    let tracks = planner.tracks;
    let chunk_revs = chunk_revs(&tracks);
    let chunks = if tracks.is_empty() {
        Vec::new()
    } else {
        chunks(spinning, chunk_revs)
    };
    Ok(Plan {
        tracks,
        chunks,
        analyses,
    })
}

/// Revolutions of the tach's shaft in a chunk: sixteen of the longest block, so that what is computed
/// twice stays small; two of it where blocks are so long that memory counts.
fn chunk_revs(tracks: &[TrackWork]) -> u64 {
    let longest = tracks
        .iter()
        .flat_map(|work| {
            let per_rev = f64::from(work.track.samples_per_rev()) * work.track.ratio();
            work.consumers.iter().map(move |c| c.block as f64 / per_rev)
        })
        .fold(0.0, f64::max);
    let many = (16.0 * longest).ceil().max(64.0);
    let revs = if many <= 1024.0 {
        many
    } else {
        (2.0 * longest).ceil().max(1024.0)
    };
    (revs as u64).next_power_of_two()
}

fn chunks(spinning: &Spinning, chunk_revs: u64) -> Vec<Chunk> {
    let end = SamplePosition {
        index: u64::MAX,
        fraction: 0.0,
    };
    let step = i64::try_from(chunk_revs).unwrap_or(i64::MAX);
    let mut chunks = Vec::new();
    for (number, window) in spinning.windows.iter().enumerate() {
        let section = &spinning.rotation.sections[window.section];
        let (first, last) = (
            section.angle_at(window.from).0,
            section.angle_at(window.to).0,
        );
        let mut from = SamplePosition::default();
        let mut rev = first.saturating_add(step);
        while rev < last {
            let to = section.at(rev, 0.0).position;
            chunks.push(Chunk {
                window: number,
                from,
                to,
            });
            from = to;
            rev += step;
        }
        chunks.push(Chunk {
            window: number,
            from,
            to: end,
        });
    }
    chunks
}

impl Planner<'_> {
    fn spectrum(&mut self, settings: &SpectrumSettings) -> Result<AnalysisPlan, Error> {
        let mut setup = self.setup(&Request {
            channel: &settings.channel,
            max_order: settings.max_order,
            ratio: &settings.ratio,
            shown_as: settings.shown_as,
            detector: settings.detector,
        })?;
        let averages = match settings.averaging {
            // There N is the memory of the average, not a limit.
            Averaging::Exponential => None,
            _ => settings.averages,
        };
        let average = match settings.averaging {
            Averaging::Power => Average::Power,
            Averaging::Amplitude => Average::Amplitude,
            Averaging::PeakHold => Average::PeakHold,
            Averaging::Exponential => Average::Exponential {
                alpha: 2.0 / (settings.averages.unwrap_or(16) as f64 + 1.0),
            },
        };
        let spectrum = spectrum_plan(
            &setup,
            settings.order_step,
            settings.window,
            settings.overlap,
            average,
        )?;
        let steady = settings.axis == AxisChoice::Hz;
        let track = self.track(steady, &setup)?;
        let there = self.blocks(track, spectrum.config().block, spectrum.config().hop);
        let blocks = cap(&there, averages, &mut setup.warnings);
        let place = self.consume(track, &setup, Feed::Spectrum(spectrum.clone()), blocks)?;
        let plan = self.averages_plan(place, &mut setup, Some(spectrum), steady);
        Ok(AnalysisPlan::Averages { place, plan })
    }

    fn synchronous(&mut self, settings: &SynchronousSettings) -> Result<AnalysisPlan, Error> {
        let mut setup = self.setup(&Request {
            channel: &settings.channel,
            max_order: settings.max_order,
            ratio: &settings.ratio,
            shown_as: settings.shown_as,
            detector: None,
        })?;
        let track = self.track(false, &setup)?;
        let block = setup.samples_per_rev as usize;
        let blocks = cap(
            &self.blocks(track, block, block),
            settings.averages,
            &mut setup.warnings,
        );
        if blocks.iter().sum::<u64>() < 2 {
            return Err(Error::Setting {
                what: format!(
                    "{} whole revolutions in the stretch that counts, expected at least 2",
                    blocks.iter().sum::<u64>()
                ),
                hint: "record longer, or widen --from and --to".to_owned(),
            });
        }
        let place = self.consume(track, &setup, Feed::Synchronous, blocks)?;
        let plan = self.averages_plan(place, &mut setup, None, false);
        Ok(AnalysisPlan::Averages { place, plan })
    }

    fn compare(&mut self, settings: &CompareSettings) -> Result<AnalysisPlan, Error> {
        let mut setup = self.setup(&Request {
            channel: &settings.channel,
            max_order: settings.max_order,
            ratio: &settings.ratio,
            shown_as: settings.shown_as,
            detector: settings.detector,
        })?;
        let spectrum = spectrum_plan(
            &setup,
            settings.order_step,
            settings.window,
            settings.overlap,
            Average::Power,
        )?;
        let (block, hop) = (spectrum.config().block, spectrum.config().hop);
        let tracked = self.track(false, &setup)?;
        let smeared = self.track(true, &setup)?;
        // The same number of blocks of the same stretch in both.
        let both: Vec<u64> = self
            .blocks(tracked, block, hop)
            .into_iter()
            .zip(self.blocks(smeared, block, hop))
            .map(|(a, b)| a.min(b))
            .collect();
        let blocks = cap(&both, settings.averages, &mut setup.warnings);
        let tracked = self.consume(
            tracked,
            &setup,
            Feed::Spectrum(spectrum.clone()),
            blocks.clone(),
        )?;
        let smeared = self.consume(smeared, &setup, Feed::Spectrum(spectrum.clone()), blocks)?;
        let plan = self.averages_plan(tracked, &mut setup, Some(spectrum), false);
        Ok(AnalysisPlan::Compare {
            tracked,
            smeared,
            plan,
        })
    }

    /// Channels, ratio, highest order and conversions.
    fn setup(&self, request: &Request<'_>) -> Result<Setup, Error> {
        let rate = self.recording.sample_rate_hz();
        let ratio = match request.ratio {
            None => Ratio::ONE,
            Some(text) => Ratio::parse(text).map_err(|e| Error::Setting {
                what: e.to_string(),
                hint: "--ratio A/B".to_owned(),
            })?,
        };
        let picked = self.pick(request.channel)?;
        let mean_rpm = 60.0 * self.spinning.mean;
        // Common practice: velocity from 10 Hz, from 2 Hz for machines below 600 rpm.
        let corner_hz = if mean_rpm < 600.0 { 2.0 } else { 10.0 };
        let (mut slots, mut channels, mut detectors) = (Vec::new(), Vec::new(), Vec::new());
        for index in picked {
            let channel = &self.recording.channels()[index];
            let (quantity, power) =
                shown_quantity(channel.quantity, request.shown_as, &channel.name)?;
            let conversion = (power != 0).then_some(Conversion { power, corner_hz });
            slots.push(Slot {
                channel: index,
                conversion,
            });
            channels.push(ChannelFacts {
                number: channel.number,
                name: channel.name.clone(),
                unit: if power == 0 {
                    channel.unit.clone()
                } else {
                    quantity.shown_unit().unwrap_or_default().to_owned()
                },
                quantity: quantity.name().to_owned(),
            });
            let usual = if quantity == Quantity::Displacement {
                Detector::PeakToPeak
            } else {
                Detector::Rms
            };
            detectors.push(request.detector.unwrap_or(usual));
        }
        let converted = slots.iter().any(|slot: &Slot| slot.conversion.is_some());
        let filter_reach = if converted {
            // A level's own rounding of the reach is at most a sixtieth of it.
            let reach = ConversionPlan::reach(
                Conversion {
                    power: -1,
                    corner_hz,
                },
                rate,
            ) as u64;
            reach + reach / 60 + 1
        } else {
            0
        };
        let turning = ratio.value();
        let mut warnings = Vec::new();
        let reach_at = |speed: f64| rate / (RATE_RULE * speed * turning);
        let reachable_order = reach_at(self.spinning.max);
        let max_order = match request.max_order {
            None => DEFAULT_MAX_ORDER.min(reachable_order.floor()),
            Some(order) => order,
        };
        if !(max_order > 0.0) {
            return Err(Error::Setting {
                what: format!(
                    "the sample rate of {rate} Hz carries orders up to {reachable_order:.2} at {:.0} rpm, expected at least 1",
                    60.0 * self.spinning.max * turning
                ),
                hint: "give --max-order below that, or record at a higher rate".to_owned(),
            });
        }
        let widest = reach_at(self.spinning.min);
        if max_order > widest {
            return Err(Error::Setting {
                what: format!(
                    "order {max_order} asked for; at {rate} Hz orders up to {widest:.1} can be reached at the lowest speed ({:.0} rpm) and {reachable_order:.1} at the highest ({:.0} rpm)",
                    60.0 * self.spinning.min * turning,
                    60.0 * self.spinning.max * turning
                ),
                hint: format!("--max-order {:.0}", reachable_order.floor()),
            });
        }
        let trusted = self.spinning.rotation.highest_trusted_order() / turning;
        if max_order > trusted {
            warnings.push(format!(
                "orders above {trusted:.1} are not to be trusted: there the angle's own scatter passes 10 degrees (common practice)"
            ));
        }
        if max_order > reachable_order {
            warnings.push(format!(
                "orders above {reachable_order:.1} are out of the sample rate's reach at {:.0} rpm and left blank",
                60.0 * self.spinning.max * turning
            ));
        }
        Ok(Setup {
            ratio,
            slots,
            channels,
            detectors,
            max_order,
            reachable_order,
            samples_per_rev: samples_per_rev(max_order),
            corner_order: if converted {
                2.0 * corner_hz / (self.spinning.min * turning)
            } else {
                0.0
            },
            filter_reach,
            warnings,
        })
    }

    fn pick(&self, picks: &Option<Vec<ChannelPick>>) -> Result<Vec<usize>, Error> {
        match picks {
            None => {
                let all: Vec<usize> = (0..self.recording.channels().len())
                    .filter(|i| Some(*i) != self.tach)
                    .collect();
                if all.is_empty() {
                    return Err(Error::Setting {
                        what: "the recording holds no channel beside the tach, expected at least one sensor".to_owned(),
                        hint: "`speed` needs no other channel".to_owned(),
                    });
                }
                Ok(all)
            }
            Some(picks) => picks
                .iter()
                .map(|pick| channel(self.recording, pick))
                .collect(),
        }
    }

    /// Finds or makes the track.
    fn track(&mut self, steady: bool, setup: &Setup) -> Result<usize, Error> {
        let key = (
            steady,
            setup.ratio,
            setup.samples_per_rev,
            setup.filter_reach,
        );
        if let Some(place) = self.keys.iter().position(|k| *k == key) {
            return Ok(place);
        }
        let limits = Limits {
            total_samples: self.recording.frames(),
            filter_reach: setup.filter_reach,
        };
        let turning = Track::new(
            self.spinning.rotation.clone(),
            setup.ratio.turns(),
            setup.ratio.per(),
            setup.samples_per_rev,
        );
        let stretches: Vec<_> = self
            .spinning
            .windows
            .iter()
            .map(|w| turning.stretch(w.section, w.from, w.to, limits))
            .collect();
        if stretches.iter().all(Option::is_none) {
            return Err(Error::Setting {
                what: "less than one revolution is left between the pulses and the ends of the recording".to_owned(),
                hint: "record longer, or widen --from and --to".to_owned(),
            });
        }
        let (track, stretches) = if steady {
            let speed = self.spinning.mean * setup.ratio.value();
            let mut sections = Vec::new();
            let mut all = Vec::new();
            for stretch in &stretches {
                let Some(stretch) = stretch else {
                    all.push(None);
                    continue;
                };
                let last = turning.instant(stretch.section, stretch.first + stretch.count - 1);
                let first = turning.instant(stretch.section, stretch.first);
                let from = SamplePosition {
                    index: first.index,
                    fraction: first.fraction,
                };
                let to = SamplePosition {
                    index: last.index,
                    fraction: last.fraction,
                };
                let rate = self.recording.sample_rate_hz();
                let revs = (to.since(from) / rate * speed).ceil() as u64 + 1;
                let steady = Rotation::steady(rate, from, revs, speed);
                all.push(Some((sections.len(), from, to)));
                sections.extend(steady.sections);
            }
            let mut rotation = Rotation::steady(
                self.recording.sample_rate_hz(),
                SamplePosition::default(),
                1,
                speed,
            );
            rotation.sections = sections;
            let track = Track::new(Arc::new(rotation), 1, 1, setup.samples_per_rev);
            let stretches = all
                .into_iter()
                .map(|part| {
                    part.and_then(|(section, from, to)| track.stretch(section, from, to, limits))
                })
                .collect();
            (track, stretches)
        } else {
            (turning, stretches)
        };
        self.keys.push(key);
        self.tracks.push(TrackWork {
            track,
            stretches,
            slots: Vec::new(),
            filter_reach: setup.filter_reach,
            consumers: Vec::new(),
        });
        Ok(self.tracks.len() - 1)
    }

    /// Blocks that fit each stretch.
    fn blocks(&self, track: usize, block: usize, hop: usize) -> Vec<u64> {
        self.tracks[track]
            .stretches
            .iter()
            .map(|stretch| match stretch {
                Some(stretch) if stretch.count >= block as i64 => {
                    ((stretch.count - block as i64) / hop as i64 + 1) as u64
                }
                _ => 0,
            })
            .collect()
    }

    fn consume(
        &mut self,
        track: usize,
        setup: &Setup,
        feed: Feed,
        blocks: Vec<u64>,
    ) -> Result<Place, Error> {
        let (block, hop) = match &feed {
            Feed::Spectrum(plan) => (plan.config().block, plan.config().hop),
            Feed::Synchronous => (
                setup.samples_per_rev as usize,
                setup.samples_per_rev as usize,
            ),
        };
        if blocks.iter().sum::<u64>() == 0 {
            let revs = block as f64 / f64::from(setup.samples_per_rev);
            let longest = self.tracks[track]
                .stretches
                .iter()
                .flatten()
                .map(|s| s.count as f64 / f64::from(setup.samples_per_rev))
                .fold(0.0, f64::max);
            return Err(Error::Setting {
                what: format!(
                    "a block needs {revs:.1} revolutions; the longest stretch that counts has {longest:.1}"
                ),
                hint: "a larger --order-step makes shorter blocks".to_owned(),
            });
        }
        let work = &mut self.tracks[track];
        let slots = setup
            .slots
            .iter()
            .map(|slot| {
                work.slots
                    .iter()
                    .position(|s| s == slot)
                    .unwrap_or_else(|| {
                        work.slots.push(*slot);
                        work.slots.len() - 1
                    })
            })
            .collect();
        work.consumers.push(Consumer {
            feed,
            slots,
            block,
            hop,
            blocks,
        });
        Ok(Place {
            track,
            consumer: work.consumers.len() - 1,
        })
    }

    fn averages_plan(
        &self,
        place: Place,
        setup: &mut Setup,
        spectrum: Option<Arc<SpectrumPlan>>,
        steady: bool,
    ) -> AveragesPlan {
        let consumer = &self.tracks[place.track].consumers[place.consumer];
        let ratio = setup.ratio.value();
        let averages = consumer.total_blocks();
        let (window, bandwidth, equivalent) = match &spectrum {
            None => ("rectangular".to_owned(), 1.0, averages as f64),
            Some(plan) => (
                window_name(plan.config().window).to_owned(),
                plan.window().noise_bandwidth_lines(),
                shaftwise_signal::equivalent_averages(averages, |m| plan.correlation(m)),
            ),
        };
        let facts = BlockFacts {
            block_revs: consumer.block as f64 / f64::from(setup.samples_per_rev),
            samples_per_rev: setup.samples_per_rev,
            order_step: f64::from(setup.samples_per_rev) / consumer.block as f64,
            mean_speed_rev_s: self.spinning.mean * ratio,
            speed_rpm: self.spinning.range_rpm(ratio),
            window,
            noise_bandwidth_lines: bandwidth,
            overlap_pct: 100.0 * (1.0 - consumer.hop as f64 / consumer.block as f64),
            averages,
            equivalent_averages: equivalent,
            reachable_order: setup.reachable_order,
            corner_order: setup.corner_order,
        };
        let angle_sigma_rev = if steady {
            0.0
        } else {
            self.spinning.rotation.angle_sigma_deg() / 360.0 * ratio
        };
        AveragesPlan {
            channels: std::mem::take(&mut setup.channels),
            detectors: std::mem::take(&mut setup.detectors),
            powers: setup
                .slots
                .iter()
                .map(|slot| slot.conversion.map_or(0, |c| c.power))
                .collect(),
            facts,
            max_order: setup.max_order,
            spectrum,
            angle_sigma_rev,
            warnings: std::mem::take(&mut setup.warnings),
        }
    }
}

/// The first `averages` blocks; says so when there are fewer.
fn cap(blocks: &[u64], averages: Option<u64>, warnings: &mut Vec<String>) -> Vec<u64> {
    let there: u64 = blocks.iter().sum();
    if let Some(asked) = averages
        && asked > there
    {
        warnings.push(format!(
            "{asked} averages asked for, the recording holds {there}: all of them are taken"
        ));
    }
    let mut left = averages.unwrap_or(u64::MAX);
    blocks
        .iter()
        .map(|count| {
            let taken = (*count).min(left);
            left -= taken;
            taken
        })
        .collect()
}

fn spectrum_plan(
    setup: &Setup,
    order_step: f64,
    window: WindowChoice,
    overlap: f64,
    average: Average,
) -> Result<Arc<SpectrumPlan>, Error> {
    let per_rev = f64::from(setup.samples_per_rev);
    let block = (per_rev / order_step).round();
    // 2^26 samples to a block are 8 GiB of work space for 16 channels: no analysis.
    if !(2.0..=67_108_864.0).contains(&block) {
        return Err(Error::Setting {
            what: format!(
                "blocks of {block} samples (order step {order_step}, {per_rev} samples per revolution), expected 2 to 67108864"
            ),
            hint: "choose another --order-step or --max-order".to_owned(),
        });
    }
    let hop = (block * (1.0 - overlap / 100.0)).round().max(1.0);
    let step = per_rev / block;
    // The last line at or below the highest order; a hair of rounding must not drop it.
    let lines = (setup.max_order / step + 1e-9).floor() as usize + 1;
    let config = SpectrumConfig {
        window: window_shape(window),
        block: block as usize,
        hop: hop as usize,
        lines: lines.min(block as usize / 2 + 1),
        average,
    };
    let plan = SpectrumPlan::new(config).map_err(|e| Error::Setting {
        what: e.to_string(),
        hint: "choose another --order-step".to_owned(),
    })?;
    Ok(Arc::new(plan))
}

fn window_shape(choice: WindowChoice) -> Window {
    match choice {
        WindowChoice::Rectangular => Window::Rectangular,
        WindowChoice::Hann => Window::Hann,
        WindowChoice::Hamming => Window::Hamming,
        WindowChoice::BlackmanHarris => Window::BlackmanHarris,
        WindowChoice::FlatTop => Window::FlatTop,
        WindowChoice::Kaiser => Window::Kaiser { beta: 18.0 },
    }
}

fn window_name(window: Window) -> &'static str {
    match window {
        Window::Rectangular => "rectangular",
        Window::Hann => "hann",
        Window::Hamming => "hamming",
        Window::BlackmanHarris => "blackman-harris",
        Window::FlatTop => "flat-top",
        _ => "kaiser",
    }
}

/// The quantity shown and the power of j2πf that leads there.
fn shown_quantity(
    recorded: Quantity,
    shown: Option<ShownAs>,
    name: &str,
) -> Result<(Quantity, i32), Error> {
    let Some(shown) = shown else {
        return Ok((recorded, 0));
    };
    let target = match shown {
        ShownAs::Acceleration => Quantity::Acceleration,
        ShownAs::Velocity => Quantity::Velocity,
        ShownAs::Displacement => Quantity::Displacement,
    };
    let derivatives = |q: Quantity| match q {
        Quantity::Displacement => Some(0),
        Quantity::Velocity => Some(1),
        Quantity::Acceleration => Some(2),
        _ => None,
    };
    match (derivatives(target), derivatives(recorded)) {
        (Some(to), Some(from)) => Ok((target, to - from)),
        _ => Err(Error::Setting {
            what: format!(
                "channel '{name}' measures {} and cannot be shown as {}",
                recorded.name(),
                target.name()
            ),
            hint: "give the channel's quantity and unit in the run file or as --calibration \"1=98.1 m/s2\", or leave --as out"
                .to_owned(),
        }),
    }
}

/// The channel meant, from 0.
pub(crate) fn channel(recording: &Recording, pick: &ChannelPick) -> Result<usize, Error> {
    let channels = recording.channels();
    let found: Vec<usize> = match pick {
        ChannelPick::Number(number) => (0..channels.len())
            .filter(|i| channels[*i].number == *number as usize)
            .collect(),
        ChannelPick::Name(name) => (0..channels.len())
            .filter(|i| channels[*i].name == *name)
            .collect(),
    };
    let names = || {
        let list: Vec<String> = channels
            .iter()
            .take(20)
            .map(|c| format!("{} {}", c.number, c.name))
            .collect();
        list.join(", ")
    };
    match found.as_slice() {
        [one] => Ok(*one),
        [] => Err(Error::Setting {
            what: format!(
                "no channel '{pick}' in {}; it holds: {}",
                recording.name(),
                names()
            ),
            hint: "pick a channel by its number or its exact name".to_owned(),
        }),
        _ => Err(Error::Setting {
            what: format!(
                "{} channels are called '{pick}' in {}",
                found.len(),
                recording.name()
            ),
            hint: "pick it by its number".to_owned(),
        }),
    }
}
