//! What a user may ask for: the settings of every command, as the run file and the flags give them.
//!
//! Field names are the flags' names in snake_case. Every type here is what serde reads from the run
//! file and what the schema is made from, so the two cannot differ.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// How a ratio of shafts is written: two whole numbers above 0, or one.
pub(crate) const RATIO_PATTERN: &str = r"^ *[0-9]*[1-9][0-9]* *(/ *[0-9]*[1-9][0-9]* *)?$";

/// What a channel may measure; `null` as when left out.
fn quantity_names() -> Vec<Option<&'static str>> {
    let names = shaftwise_recording::Quantity::ALL.map(|quantity| Some(quantity.name()));
    names.into_iter().chain([None]).collect()
}

/// A channel, by number from 1 in file order or by name.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(untagged)]
pub enum ChannelPick {
    /// Number from 1, in file order.
    Number(#[schemars(range(min = 1))] u32),
    /// Name as in the run file or the recording's header.
    Name(#[schemars(length(min = 1))] String),
}

impl std::fmt::Display for ChannelPick {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Number(number) => write!(f, "{number}"),
            Self::Name(name) => f.write_str(name),
        }
    }
}

/// Which edge of the pulse sets angle zero.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum EdgeChoice {
    /// From low to high.
    #[default]
    Rising,
    /// From high to low.
    Falling,
}

/// Where the rotation comes from.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(default, deny_unknown_fields)]
pub struct TachSettings {
    /// The tach's channel.
    pub channel: Option<ChannelPick>,
    /// File of pulse times: seconds from the first sample, one a line. Relative to the run file.
    #[schemars(length(min = 1))]
    pub times: Option<String>,
    /// Pulses per revolution. Range: 1 to 4096. Default: 1.
    #[schemars(range(min = 1, max = 4096))]
    pub pulses_per_rev: u32,
    /// Edge timed. Default: rising.
    pub edge: EdgeChoice,
    /// Level the edge must cross, in the channel's unit. Default: automatic, half-way of each pulse.
    pub threshold: Option<f64>,
    /// Delay of the tach's own filters in seconds, taken off every pulse time. Default: 0.
    pub tach_delay_s: f64,
}

impl Default for TachSettings {
    fn default() -> Self {
        Self {
            channel: None,
            times: None,
            pulses_per_rev: 1,
            edge: EdgeChoice::Rising,
            threshold: None,
            tach_delay_s: 0.0,
        }
    }
}

/// A stretch of time left out.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Exclusion {
    /// Start in seconds from the first sample. Range: 0 and more, below to_s.
    #[schemars(range(min = 0))]
    pub from_s: f64,
    /// End in seconds from the first sample. Range: 0 and more.
    #[schemars(range(min = 0))]
    pub to_s: f64,
    /// Why it is left out, for the report.
    #[serde(default)]
    pub reason: Option<String>,
}

/// Which part of the recording counts.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize, JsonSchema)]
#[serde(default, deny_unknown_fields)]
pub struct Selection {
    /// Start in seconds from the first sample. Range: 0 and more, below to_s. Default: the first pulse.
    #[schemars(range(min = 0))]
    pub from_s: Option<f64>,
    /// End in seconds from the first sample. Range: 0 and more. Default: the last pulse.
    #[schemars(range(min = 0))]
    pub to_s: Option<f64>,
    /// Stretches left out.
    pub exclude: Vec<Exclusion>,
}

/// Shape of the weighting of each block.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum WindowChoice {
    /// No weighting.
    Rectangular,
    /// von Hann.
    #[default]
    Hann,
    /// Hamming.
    Hamming,
    /// Blackman–Harris, four terms.
    BlackmanHarris,
    /// Flat top HFT90D.
    FlatTop,
    /// Kaiser–Bessel, β 18.
    Kaiser,
}

/// How blocks become one curve.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum Averaging {
    /// Mean of power: the unbiased one.
    #[default]
    Power,
    /// Mean of magnitudes (called linear averaging in the trade).
    Amplitude,
    /// Power with weights that fade: α = 2/(N+1).
    Exponential,
    /// Largest magnitude.
    PeakHold,
}

/// How a level is shown. Results in JSON are always rms.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum Detector {
    /// Root mean square.
    Rms,
    /// Amplitude of the sinusoid, √2 × rms.
    Peak,
    /// Twice the amplitude, 2√2 × rms.
    PeakToPeak,
}

/// What lies along the axis of a spectrum.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum AxisChoice {
    /// Orders: blocks of equal angle, sharp while the speed drifts.
    #[default]
    Orders,
    /// Hertz: blocks of equal time, the plain spectrum.
    Hz,
}

/// The quantity shown, by integration or differentiation in time.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum ShownAs {
    /// m/s².
    Acceleration,
    /// mm/s.
    Velocity,
    /// µm.
    Displacement,
}

/// Settings of `speed`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(default, deny_unknown_fields)]
pub struct SpeedSettings {
    /// Step of the curve in seconds. Range: 0.0001 and more. Default: 0.02.
    #[schemars(range(min = 0.0001))]
    pub step: f64,
}

impl Default for SpeedSettings {
    fn default() -> Self {
        Self { step: 0.02 }
    }
}

/// Settings of `spectrum`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(default, deny_unknown_fields)]
pub struct SpectrumSettings {
    /// Channels analysed. Default: all but the tach and the time.
    #[schemars(length(min = 1))]
    pub channel: Option<Vec<ChannelPick>>,
    /// Highest order. Range: above 0 to 100 000. Default: 50, less where the sample rate forbids.
    #[schemars(range(max = 100_000), extend("exclusiveMinimum" = 0))]
    pub max_order: Option<f64>,
    /// Spacing of the lines in orders; a block is 1/order_step revolutions. Range: 1/65536 to 1. Default: 1/16.
    #[schemars(range(min = 1.0 / 65536.0, max = 1))]
    pub order_step: f64,
    /// Weighting of each block. Default: hann.
    pub window: WindowChoice,
    /// Overlap of the blocks in per cent. Range: 0 to 95. Default: 50.
    #[schemars(range(min = 0, max = 95))]
    pub overlap: f64,
    /// Blocks averaged. Range: 1 and more. Default: all.
    #[schemars(range(min = 1))]
    pub averages: Option<u64>,
    /// How blocks become one curve. Default: power.
    pub averaging: Averaging,
    /// How levels are shown. Default: rms for acceleration and velocity, peak-to-peak for displacement.
    pub detector: Option<Detector>,
    /// Orders or hertz. Default: orders.
    pub axis: AxisChoice,
    /// Show a density (per order or per Hz) instead of the level in each line. Default: no.
    pub density: bool,
    /// Show another quantity. Default: as recorded.
    #[serde(rename = "as")]
    pub shown_as: Option<ShownAs>,
    /// Repeatability wished, ± dB at 90 %. Range: above 0. Default: 1.
    #[schemars(extend("exclusiveMinimum" = 0))]
    pub repeatability: f64,
    /// The shaft analysed turns A per B revolutions of the tach's shaft, written "A/B". Default: the tach's shaft.
    #[schemars(extend("pattern" = RATIO_PATTERN))]
    pub ratio: Option<String>,
}

impl Default for SpectrumSettings {
    fn default() -> Self {
        Self {
            channel: None,
            max_order: None,
            order_step: 1.0 / 16.0,
            window: WindowChoice::Hann,
            overlap: 50.0,
            averages: None,
            averaging: Averaging::Power,
            detector: None,
            axis: AxisChoice::Orders,
            density: false,
            shown_as: None,
            repeatability: 1.0,
            ratio: None,
        }
    }
}

/// Settings of `synchronous`.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize, JsonSchema)]
#[serde(default, deny_unknown_fields)]
pub struct SynchronousSettings {
    /// Channels analysed. Default: all but the tach and the time.
    #[schemars(length(min = 1))]
    pub channel: Option<Vec<ChannelPick>>,
    /// Highest order kept. Range: above 0 to 100 000. Default: 50, less where the sample rate forbids.
    #[schemars(range(max = 100_000), extend("exclusiveMinimum" = 0))]
    pub max_order: Option<f64>,
    /// Revolutions averaged. Range: 2 and more. Default: all.
    #[schemars(range(min = 2))]
    pub averages: Option<u64>,
    /// Show another quantity. Default: as recorded.
    #[serde(rename = "as")]
    pub shown_as: Option<ShownAs>,
    /// The shaft analysed turns A per B revolutions of the tach's shaft, written "A/B". Default: the tach's shaft.
    #[schemars(extend("pattern" = RATIO_PATTERN))]
    pub ratio: Option<String>,
}

/// Settings of `compare`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(default, deny_unknown_fields)]
pub struct CompareSettings {
    /// Channels analysed. Default: all but the tach and the time.
    #[schemars(length(min = 1))]
    pub channel: Option<Vec<ChannelPick>>,
    /// Highest order. Range: above 0 to 100 000. Default: 50, less where the sample rate forbids.
    #[schemars(range(max = 100_000), extend("exclusiveMinimum" = 0))]
    pub max_order: Option<f64>,
    /// Spacing of the lines in orders, in both spectra. Range: 1/65536 to 1. Default: 1/16.
    #[schemars(range(min = 1.0 / 65536.0, max = 1))]
    pub order_step: f64,
    /// Weighting of each block. Default: hann.
    pub window: WindowChoice,
    /// Overlap of the blocks in per cent. Range: 0 to 95. Default: 50.
    #[schemars(range(min = 0, max = 95))]
    pub overlap: f64,
    /// Blocks averaged. Range: 1 and more. Default: all.
    #[schemars(range(min = 1))]
    pub averages: Option<u64>,
    /// How levels are shown. Default: rms for acceleration and velocity, peak-to-peak for displacement.
    pub detector: Option<Detector>,
    /// Show another quantity. Default: as recorded.
    #[serde(rename = "as")]
    pub shown_as: Option<ShownAs>,
    /// The shaft analysed turns A per B revolutions of the tach's shaft, written "A/B". Default: the tach's shaft.
    #[schemars(extend("pattern" = RATIO_PATTERN))]
    pub ratio: Option<String>,
}

impl Default for CompareSettings {
    fn default() -> Self {
        let spectrum = SpectrumSettings::default();
        Self {
            channel: None,
            max_order: None,
            order_step: spectrum.order_step,
            window: spectrum.window,
            overlap: spectrum.overlap,
            averages: None,
            detector: None,
            shown_as: None,
            ratio: None,
        }
    }
}

/// One thing asked for, with its settings.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(tag = "command", rename_all = "kebab-case")]
pub enum Analysis {
    /// How fast the shaft turned.
    Speed(SpeedSettings),
    /// Which orders there are.
    Spectrum(SpectrumSettings),
    /// One revolution, everything else averaged away.
    Synchronous(SynchronousSettings),
    /// Smeared against tracked.
    Compare(CompareSettings),
}

impl Analysis {
    /// The command's name.
    #[must_use]
    pub fn command(&self) -> &'static str {
        match self {
            Self::Speed(_) => "speed",
            Self::Spectrum(_) => "spectrum",
            Self::Synchronous(_) => "synchronous",
            Self::Compare(_) => "compare",
        }
    }
}

/// One channel's description.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize, JsonSchema)]
#[serde(default, deny_unknown_fields)]
pub struct ChannelSettings {
    /// Number from 1, in file order. Default: the place in the list.
    #[schemars(range(min = 1))]
    pub number: Option<u32>,
    /// Name for tables and figures.
    #[schemars(length(min = 1))]
    pub name: Option<String>,
    /// What it measures. Default: what the unit measures.
    #[schemars(extend("enum" = quantity_names()))]
    pub quantity: Option<String>,
    /// Unit of the calibrated values, such as m/s2, g, mm/s, um, Pa, V.
    #[schemars(length(min = 1))]
    pub unit: Option<String>,
    /// Units per sample value (integer samples count as −1…1 of full scale). Negative turns the sign.
    #[schemars(extend("not" = {"const": 0}))]
    pub factor: Option<f64>,
    /// Sensitivity in mV per unit; needs range_v for integer samples.
    #[schemars(extend("not" = {"const": 0}))]
    pub mv_per_unit: Option<f64>,
    /// Input range: volts at full scale.
    #[schemars(extend("exclusiveMinimum" = 0))]
    pub range_v: Option<f64>,
}

/// One recording and its channels.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize, JsonSchema)]
#[serde(default, deny_unknown_fields)]
#[schemars(extend("required" = ["file"]))]
pub struct RecordingSettings {
    /// The file, relative to the run file; "-" for standard input.
    #[schemars(length(min = 1))]
    pub file: String,
    /// Sample rate for text without a time column, in Hz.
    #[schemars(extend("exclusiveMinimum" = 0))]
    pub sample_rate_hz: Option<f64>,
    /// Channels; those left out keep what the file says.
    pub channels: Vec<ChannelSettings>,
}

/// A whole run file.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize, JsonSchema)]
#[serde(default, deny_unknown_fields)]
#[schemars(title = "Shaftwise run file", extend("required" = ["recordings"]))]
pub struct RunFile {
    /// Recordings; the first one is analysed by `report`.
    #[schemars(length(min = 1))]
    pub recordings: Vec<RecordingSettings>,
    /// The tach.
    pub tach: TachSettings,
    /// The part that counts.
    pub select: Selection,
    /// What to work out, in this order.
    pub analyses: Vec<Analysis>,
    /// The machine, as texts and numbers for the report.
    pub machine: serde_json::Map<String, serde_json::Value>,
    /// Load, flow, temperature and the like, as texts and numbers for the report.
    pub conditions: serde_json::Map<String, serde_json::Value>,
}
