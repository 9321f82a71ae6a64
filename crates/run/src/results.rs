//! What comes out: plain values, ready to be written as JSON, drawn or put in words.
//!
//! NaN stands for a figure that could not be worked out and becomes `null` in JSON; a warning says
//! why. Levels are rms of the unit named, whatever the detector they are shown with.

use crate::settings::{Averaging, AxisChoice, Detector, Exclusion};
use serde::Serialize;

/// The recording, as it was found.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct RecordingFacts {
    /// Bare file name; "-" for standard input.
    pub file: String,
    /// SHA-256 of the file's bytes, hexadecimal.
    pub sha256: String,
    /// Samples a second.
    pub sample_rate_hz: f64,
    /// Length in seconds.
    pub seconds: f64,
    /// Number of channels in the file.
    #[serde(skip)]
    pub channel_count: usize,
}

/// Which channel a result belongs to.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ChannelFacts {
    /// Number from 1, in file order.
    pub number: usize,
    /// Name.
    pub name: String,
    /// Unit of every level of this channel.
    pub unit: String,
    /// Quantity shown, such as acceleration.
    pub quantity: String,
}

/// Lowest, mean and highest speed, rpm.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct SpeedRange {
    /// Lowest.
    pub min: f64,
    /// Revolutions over time.
    pub mean: f64,
    /// Highest.
    pub max: f64,
}

/// Counts of pulses.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct PulseFacts {
    /// Edges timed.
    pub timed: u64,
    /// Edges used: timed less rejected.
    pub used: u64,
    /// Teeth filled in where no edge was.
    pub inserted: u64,
    /// Edges not believed.
    pub rejected: u64,
}

/// One repair.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct LedgerLine {
    /// Where, seconds from the first sample.
    pub time_s: f64,
    /// `inserted`, `rejected` or `moved`.
    pub action: String,
    /// Why.
    pub reason: String,
}

/// Speed against time.
#[derive(Debug, Clone, PartialEq, Default, Serialize)]
pub struct SpeedCurveResult {
    /// Seconds from the first sample.
    pub time_s: Vec<f64>,
    /// Revolutions from the first pulse.
    pub revs: Vec<f64>,
    /// Speed.
    pub rpm: Vec<f64>,
    /// Its 1-sigma uncertainty.
    pub rpm_sigma: Vec<f64>,
}

/// What `speed` answers; every other command carries it too, for the figures and the words.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SpeedResult {
    /// Counts.
    pub pulses: PulseFacts,
    /// Every repair.
    pub ledger: Vec<LedgerLine>,
    /// Speed over the stretch that counts.
    pub speed_rpm: SpeedRange,
    /// 1-sigma of the angle, rms over the run, degrees.
    pub angle_sigma_deg: f64,
    /// Order at which the angle scatters by 10° (common practice).
    pub highest_trusted_order: f64,
    /// 1-sigma of the pulses' timing found in the data, seconds.
    pub timing_sigma_s: f64,
    /// What sampling had done to the instants of short edges, learned from the pulses and taken off, rms
    /// in seconds; 0 where nothing was.
    pub sampling_error_s: f64,
    /// Width of the timed edge, degrees of the tach's shaft; null for a file of times.
    pub edge_width_deg: f64,
    /// Width of the pulse, degrees of the tach's shaft; null for a file of times.
    pub pulse_width_deg: f64,
    /// Start and end of every stretch without a break, seconds.
    pub sections_s: Vec<(f64, f64)>,
    /// Start and end of what counts after selection, seconds.
    pub selected_s: Vec<(f64, f64)>,
    /// Stretches left out, with the reasons given.
    pub excluded: Vec<Exclusion>,
    /// `pulse`, `arbitrary` or `none`.
    pub phase_reference: String,
    /// Curve.
    pub curve: SpeedCurveResult,
}

/// What a spectrum or synchronous average rests on, for the foot of its figure.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct BlockFacts {
    /// Revolutions of the analysed shaft in a block (seconds × mean speed for the plain spectrum).
    pub block_revs: f64,
    /// Samples per revolution.
    pub samples_per_rev: u32,
    /// Spacing of lines in orders.
    pub order_step: f64,
    /// Mean speed, rev/s, of the analysed shaft.
    pub mean_speed_rev_s: f64,
    /// Speed range of the analysed shaft.
    pub speed_rpm: SpeedRange,
    /// Window's name.
    pub window: String,
    /// Its noise bandwidth in lines.
    pub noise_bandwidth_lines: f64,
    /// Overlap in per cent, as done.
    pub overlap_pct: f64,
    /// Blocks taken.
    pub averages: u64,
    /// Independent blocks that scatter alike.
    pub equivalent_averages: f64,
    /// Highest order the sample rate carries at the highest speed.
    pub reachable_order: f64,
    /// Orders below this are within twice the high-pass corner; 0 without conversion.
    pub corner_order: f64,
}

/// What can be said of a peak.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum PeakVerdict {
    /// Bounds are within the repeatability asked for.
    Repeatable,
    /// More averages would get there.
    MoreAverages,
    /// The peak itself changed during the recording: more averages will not help.
    Wanders,
}

/// A peak that stands out of its neighbourhood.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct PeakResult {
    /// Place, orders; absent on a frequency axis.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub order: Option<f64>,
    /// Place, Hz; absent on an order axis.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub frequency_hz: Option<f64>,
    /// Level, rms, interpolated between lines.
    pub rms: f64,
    /// Lower bound at 90 %.
    pub lower: f64,
    /// Upper bound at 90 %.
    pub upper: f64,
    /// Verdict.
    pub verdict: PeakVerdict,
    /// Averages that would reach the repeatability asked for; null where the peak wanders.
    pub averages_needed: Option<u64>,
    /// Scatter really seen between twelfths of the recording, dB, 1 sigma of the whole average.
    pub seen_scatter_db: f64,
    /// Level over the noise beside it, dB.
    pub over_noise_db: f64,
}

/// Level of everything in the band.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct OverallResult {
    /// Level in the detector named.
    pub value: f64,
    /// Detector.
    pub detector: Detector,
    /// Lower bound at 90 %.
    pub lower: f64,
    /// Upper bound at 90 %.
    pub upper: f64,
    /// Band at the mean speed, Hz.
    pub band_hz: (f64, f64),
}

/// One channel's spectrum.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SpectrumChannel {
    /// Which.
    #[serde(flatten)]
    pub channel: ChannelFacts,
    /// Lines, orders; absent on a frequency axis.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub orders: Option<Vec<f64>>,
    /// Lines, Hz; absent on an order axis.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub frequency_hz: Option<Vec<f64>>,
    /// Level in each line, rms (or rms density).
    pub rms: Vec<f64>,
    /// Lower bound at 90 %.
    pub lower: Vec<f64>,
    /// Upper bound at 90 %.
    pub upper: Vec<f64>,
    /// Blocks taken.
    pub averages: u64,
    /// Independent blocks that scatter alike.
    pub equivalent_averages: f64,
    /// Peaks, highest first.
    pub peaks: Vec<PeakResult>,
    /// Everything together.
    pub overall: OverallResult,
    /// How levels are shown to people.
    pub detector: Detector,
}

/// What `spectrum` answers.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SpectrumResult {
    /// What it rests on.
    pub blocks: BlockFacts,
    /// Axis.
    pub axis: AxisChoice,
    /// Averaging.
    pub averaging: Averaging,
    /// Density instead of level.
    pub density: bool,
    /// Repeatability asked for, ± dB.
    pub repeatability_db: f64,
    /// Channels.
    pub channels: Vec<SpectrumChannel>,
}

/// Noise left as averages grow.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ConvergenceResult {
    /// Revolutions averaged: 1, 2, 4 …
    pub revolutions: Vec<u64>,
    /// How far the noise of the mean lies below that of one revolution, dB, as seen.
    pub seen_db: Vec<f64>,
    /// 10·log10 of the revolutions: the law for random noise.
    pub law_db: Vec<f64>,
}

/// One channel's synchronous average.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SynchronousChannel {
    /// Which.
    #[serde(flatten)]
    pub channel: ChannelFacts,
    /// Revolutions averaged.
    pub revolutions: u64,
    /// Angle, degrees from the timed edge.
    pub angle_deg: Vec<f64>,
    /// Mean revolution.
    pub mean: Vec<f64>,
    /// Standard deviation of single revolutions at each angle.
    pub sd: Vec<f64>,
    /// Standard deviation of the mean at each angle.
    pub sd_of_mean: Vec<f64>,
    /// Orders 0, 1, 2 …
    pub orders: Vec<f64>,
    /// Amplitude of each, peak.
    pub amplitude_peak: Vec<f64>,
    /// Phase lead: x = A·cos(2πkθ + φ).
    pub phase_lead_deg: Vec<f64>,
    /// Phase lag, 0–360°.
    pub phase_lag_deg: Vec<f64>,
    /// Share of the power (without bias) that repeats with the shaft, its 1/N bias removed, 0…1.
    pub synchronous_fraction: f64,
    /// How far the average pushed the noise down, as seen between twelfths, dB.
    pub noise_reduction_db: f64,
    /// rms of what does not repeat.
    pub residual_rms: f64,
    /// rms of everything, without bias.
    pub total_rms: f64,
    /// Noise against averages.
    pub convergence: ConvergenceResult,
}

/// What `synchronous` answers.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SynchronousResult {
    /// What it rests on.
    pub blocks: BlockFacts,
    /// Channels.
    pub channels: Vec<SynchronousChannel>,
}

/// A peak, smeared against tracked.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ComparedPeak {
    /// Order of the tracked peak.
    pub order: f64,
    /// Level of the tracked peak.
    pub tracked_rms: f64,
    /// Highest line of the smeared spectrum within the smeared width.
    pub smeared_rms: f64,
    /// How much the smeared one reads low; positive: it does.
    pub loss_db: f64,
    /// Where the smeared peak sits.
    pub smeared_at_order: f64,
    /// Width at −3 dB, interpolated.
    pub tracked_width_orders: f64,
    /// Width at −3 dB, interpolated.
    pub smeared_width_orders: f64,
    /// Level summed over the band, window's noise bandwidth corrected.
    pub tracked_summed_rms: f64,
    /// The same band of the smeared spectrum: smearing spreads, it does not lose.
    pub smeared_summed_rms: f64,
}

/// From which order on smearing costs 1 dB.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct OnsetResult {
    /// From the speed alone; null when no order within reach loses 1 dB.
    pub predicted_order: Option<f64>,
    /// Lowest listed peak that lost 1 dB; null when none did.
    pub seen_order: Option<f64>,
}

/// One channel's comparison.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CompareChannel {
    /// Which.
    #[serde(flatten)]
    pub channel: ChannelFacts,
    /// Peaks of the tracked spectrum, highest first.
    pub peaks: Vec<ComparedPeak>,
    /// Onset.
    pub onset: OnsetResult,
    /// Lines, orders of the mean speed.
    pub orders: Vec<f64>,
    /// Tracked level in each line.
    pub tracked_rms: Vec<f64>,
    /// Smeared level in each line.
    pub smeared_rms: Vec<f64>,
    /// How levels are shown to people.
    pub detector: Detector,
}

/// What `compare` answers.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CompareResult {
    /// What both rest on.
    pub blocks: BlockFacts,
    /// Full swing of the speed, (max − min)/mean.
    pub speed_spread: f64,
    /// No listed peak lost 1 dB: plain averaging is good enough here. Null without any peak.
    pub plain_is_good_enough: Option<bool>,
    /// Channels.
    pub channels: Vec<CompareChannel>,
}

/// One analysis' outcome.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(untagged)]
pub enum AnalysisResult {
    /// `speed`.
    Speed(SpeedResult),
    /// `spectrum`.
    Spectrum(SpectrumResult),
    /// `synchronous`.
    Synchronous(SynchronousResult),
    /// `compare`.
    Compare(CompareResult),
}

/// Everything one run gave.
#[derive(Debug, Clone, PartialEq)]
pub struct RunResult {
    /// The recording.
    pub recording: RecordingFacts,
    /// The speed, whichever analyses were asked for.
    pub speed: SpeedResult,
    /// One for each analysis asked for, in order, with its settings as done (defaults filled in).
    pub analyses: Vec<Outcome>,
    /// What must be said beside all results; each outcome adds its own.
    pub warnings: Vec<String>,
    /// Instruction set of the inner loops; results agree to 1e-12 between sets.
    pub cpu_level: &'static str,
}

/// An analysis with the settings it was done with.
#[derive(Debug, Clone, PartialEq)]
pub struct Outcome {
    /// Command's name.
    pub command: &'static str,
    /// Settings as done, thread count left out.
    pub settings: serde_json::Value,
    /// Outcome.
    pub result: AnalysisResult,
    /// Warnings of this analysis.
    pub warnings: Vec<String>,
}
