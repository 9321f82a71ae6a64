//! The recipe: what the machine does and what its sensors see, as plain data.
//!
//! In JSON every key is spelt as the field here; unknown keys are refused. Alternatives are
//! written as an object with one key, such as `{"constant": {"rev_per_s": 24.6}}`.

use serde::{Deserialize, Serialize};

/// A whole recording with known content.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Recipe {
    /// Words for people; not used.
    #[serde(default, skip_serializing_if = "String::is_empty")]
    pub description: String,
    /// Samples per second, > 0, at most 1e7 Hz; need not be whole.
    pub sample_rate_hz: f64,
    /// Length; the recording has round(rate · seconds) samples, at least 1.
    pub seconds: f64,
    /// Seed of all that is random.
    pub seed: u64,
    /// How the shaft turns.
    pub speed: Speed,
    /// The channels, in file order; tachs are channels with `pulses`.
    pub channels: Vec<Channel>,
}

/// How the shaft turns: a profile, plus wobbles, plus hunting. All have closed integrals, so the
/// angle is exact. The speed must stay above zero: profile minimum − Σ amplitudes > 0.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Speed {
    /// The slow course of the speed.
    pub profile: Profile,
    /// Sines added to the speed.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub wobbles: Vec<Wobble>,
    /// Random slow hunting added to the speed.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub hunting: Option<Hunting>,
    /// Angle at the first sample, rev. Default: 0.
    #[serde(default, skip_serializing_if = "is_zero")]
    pub start_angle_rev: f64,
}

/// The slow course of the speed, rev/s.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case", deny_unknown_fields)]
pub enum Profile {
    /// v(t) = `rev_per_s`.
    Constant {
        /// Speed, rev/s, > 0.
        rev_per_s: f64,
    },
    /// v(t) = start + slope·t within the recording, held at its end values outside.
    Ramp {
        /// Speed at the first sample, rev/s, > 0.
        start_rev_per_s: f64,
        /// Slope, rev/s², either sign.
        slope_rev_per_s2: f64,
    },
    /// From knot to knot by half a cosine, v = vᵢ + (vᵢ₊₁ − vᵢ)·(1 − cos πs)/2 with s from 0 to 1;
    /// constant before the first and after the last knot. Speed and acceleration are continuous.
    Glide {
        /// Two or more knots with rising times.
        knots: Vec<Knot>,
    },
    /// An s-shaped run-up or coast-down, v = (a+b)/2 + (b−a)/2·tanh((t − mid)/width).
    Tanh {
        /// Speed long before, rev/s, > 0.
        from_rev_per_s: f64,
        /// Speed long after, rev/s, > 0.
        to_rev_per_s: f64,
        /// Time of the steepest point, s.
        mid_s: f64,
        /// Time constant, s, > 0.
        width_s: f64,
    },
}

/// A point of [`Profile::Glide`].
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Knot {
    /// Time, s.
    pub at_s: f64,
    /// Speed there, rev/s, > 0.
    pub rev_per_s: f64,
}

/// A sine in the speed: a·cos(2πft + φ).
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Wobble {
    /// Peak amplitude a, rev/s.
    pub amplitude_rev_per_s: f64,
    /// Frequency f, Hz, > 0.
    pub frequency_hz: f64,
    /// Phase lead φ, degrees.
    #[serde(default)]
    pub phase_deg: f64,
}

/// Random slow hunting: a sum of sines of equal amplitude whose frequencies lie log-spaced (each
/// shifted at random within its share, so that no two are commensurate) and whose phases are
/// random. Repeatable from the recipe's seed.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Hunting {
    /// Rms of the speed's deviation, rev/s, >= 0.
    pub rms_rev_per_s: f64,
    /// Lowest frequency, Hz, > 0.
    pub slowest_hz: f64,
    /// Highest frequency, Hz, above the lowest.
    pub fastest_hz: f64,
    /// Number of sines, 1 to 200. Default: 24.
    #[serde(default = "twenty_four")]
    pub sines: usize,
}

/// One channel: the sum of its components, then spikes, clipping and the converter.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Channel {
    /// Name, not empty.
    pub name: String,
    /// Quantity, such as `acceleration` or `voltage`.
    pub quantity: String,
    /// Unit of the samples, such as `m/s²`.
    pub unit: String,
    /// Components that follow the shaft.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub orders: Vec<Order>,
    /// Components fixed in frequency; mains hum is one of these.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub tones: Vec<Tone>,
    /// Random components, independent of each other and between channels.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub noise: Vec<Noise>,
    /// Pulses of a tach.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub pulses: Option<PulseTrain>,
    /// Constant offset, unit. Default: 0.
    #[serde(default, skip_serializing_if = "is_zero")]
    pub bias: f64,
    /// Linear drift, unit per second, from 0 at the first sample. Default: 0.
    #[serde(default, skip_serializing_if = "is_zero")]
    pub drift_per_s: f64,
    /// Single disturbances.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub spikes: Vec<Spike>,
    /// Limit ± of the amplifier, unit, > 0. Default: none.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub clip_at: Option<f64>,
    /// Converter at the end of the chain. Default: none.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub converter: Option<Converter>,
}

/// A component that follows the shaft: A·cos(2π·k·θ + φ).
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Order {
    /// Order k of its shaft, any real number > 0.
    pub order: f64,
    /// Peak amplitude A, unit, >= 0.
    pub amplitude: f64,
    /// Phase lead φ, degrees. Default: 0.
    #[serde(default, skip_serializing_if = "is_zero")]
    pub phase_lead_deg: f64,
    /// The shaft it follows, if not the main shaft.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub shaft: Option<ShaftRatio>,
    /// Slow amplitude modulation.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub modulation: Option<Modulation>,
    /// A resonance that scales and turns it with speed.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub resonance: Option<Resonance>,
}

/// Another shaft: it turns `turns` times while the main shaft turns `per` times, exactly.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ShaftRatio {
    /// Revolutions of this shaft, 1 to 1e6.
    pub turns: i64,
    /// Revolutions of the main shaft, 1 to 1e6.
    pub per: i64,
}

/// Amplitude modulation: A becomes A·(1 + depth·cos(2πft + φ)).
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Modulation {
    /// Depth, 0 to 1.
    pub depth: f64,
    /// Frequency f, Hz, > 0.
    pub frequency_hz: f64,
    /// Phase lead φ, degrees. Default: 0.
    #[serde(default, skip_serializing_if = "is_zero")]
    pub phase_deg: f64,
}

/// One degree of freedom, passed quasi-statically: at each instant the component is multiplied by
/// H = rᵖ / (1 − r² + 2jζr), r = k·v(t)/f_n. p = 0: a force of constant size seen as displacement;
/// p = 2: unbalance seen as displacement; p = 4: unbalance seen as acceleration (then A is the
/// amplitude at r → ∞ over r²).
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Resonance {
    /// Natural frequency f_n, Hz, > 0.
    pub natural_hz: f64,
    /// Damping ratio ζ, above 0 to 10.
    pub damping_ratio: f64,
    /// Power p of r, 0 to 4. Default: 2.
    #[serde(default = "two")]
    pub speed_power: u32,
}

/// A component fixed in frequency: A·cos(2πft + φ).
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Tone {
    /// Frequency f, Hz, > 0.
    pub frequency_hz: f64,
    /// Peak amplitude A, unit, >= 0.
    pub amplitude: f64,
    /// Phase lead φ, degrees. Default: 0.
    #[serde(default, skip_serializing_if = "is_zero")]
    pub phase_lead_deg: f64,
}

/// Gaussian noise of a given rms over the whole band up to half the rate. The coloured kinds pass
/// white noise through the named recursive filter; [`Noise::density`] is their exact spectrum.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case", deny_unknown_fields)]
pub enum Noise {
    /// Flat.
    White {
        /// Rms, unit, >= 0.
        rms: f64,
    },
    /// y(n) = a·y(n−1) + w(n), a = e^(−2π·corner/rate).
    OnePole {
        /// Rms, unit, >= 0.
        rms: f64,
        /// Corner, Hz.
        corner_hz: f64,
    },
    /// Two-pole Butterworth low-pass by the bilinear transform.
    LowPass {
        /// Rms, unit, >= 0.
        rms: f64,
        /// Corner (−3 dB), Hz.
        corner_hz: f64,
    },
    /// Two-pole band-pass with zeros at 0 and half the rate; the peak lies at the centre, the
    /// −3 dB points the bandwidth apart.
    BandPass {
        /// Rms, unit, >= 0.
        rms: f64,
        /// Centre, Hz.
        center_hz: f64,
        /// Bandwidth (−3 dB), Hz.
        bandwidth_hz: f64,
    },
}

/// A disturbance: `value` is added to `samples` samples from the one nearest to `at_s`.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Spike {
    /// Time, s, >= 0.
    pub at_s: f64,
    /// Height, unit, either sign.
    pub value: f64,
    /// Length, samples, at least 1. Default: 1.
    #[serde(default = "one")]
    pub samples: u64,
}

/// Rounds to the nearest of 2^bits steps from −full scale to +full scale − one step.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Converter {
    /// Bits, 1 to 32.
    pub bits: u32,
    /// Full scale, unit, > 0; a step is 2·full scale / 2^bits.
    pub full_scale: f64,
}

/// Pulses of a tach, sampled from their exact waveform at the sample instants (no filter).
///
/// Pulse n = revolution·P + tooth; its leading edge crosses 50 % exactly at the angle
/// n/P + phase/360 (+ the tooth's error) of its shaft. Overlapping pulses join by their maximum.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct PulseTrain {
    /// Tooth positions in a revolution P, 1 to 10 000, absent teeth counted.
    pub pulses_per_rev: u32,
    /// Teeth absent by design at the end of each revolution, fewer than P. Default: 0.
    #[serde(default, skip_serializing_if = "is_none_missing")]
    pub missing_teeth: u32,
    /// Placing error of each tooth, degrees; empty or P values. Default: none.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub tooth_errors_deg: Vec<f64>,
    /// Angle of tooth 0, degrees. Default: 0.
    #[serde(default, skip_serializing_if = "is_zero")]
    pub phase_deg: f64,
    /// The shaft it sits on, if not the main shaft.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub shaft: Option<ShaftRatio>,
    /// Width between the 50 % crossings.
    pub width: Width,
    /// Rise and fall.
    pub edge: Edge,
    /// Shape of rise and fall. Default: raised cosine.
    #[serde(default)]
    pub shape: EdgeShape,
    /// Level between pulses, unit. Default: 0.
    #[serde(default, skip_serializing_if = "is_zero")]
    pub low: f64,
    /// Level of a pulse, unit; below `low` for pulses that go down. Default: 5.
    #[serde(default = "five")]
    pub high: f64,
    /// What is wrong with the pulses. Default: nothing.
    #[serde(default, skip_serializing_if = "Faults::is_none")]
    pub faults: Faults,
}

/// Width of a pulse between its 50 % crossings.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case", deny_unknown_fields)]
pub enum Width {
    /// Constant in angle of its shaft, degrees, > 0.
    Degrees(f64),
    /// Constant in time, s, > 0.
    Seconds(f64),
}

/// From 0 to 100 % of an edge, centred on the crossing.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case", deny_unknown_fields)]
pub enum Edge {
    /// Constant in angle of its shaft, degrees, >= 0.
    Degrees(f64),
    /// Constant in time, s, >= 0; 0 is a plain step.
    Seconds(f64),
}

/// Course of an edge from 0 to 1.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum EdgeShape {
    /// A straight line.
    Linear,
    /// (1 + sin πx)/2 with x from −½ to ½.
    #[default]
    RaisedCosine,
}

/// What is wrong with the pulses of a tach.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Faults {
    /// Share of pulses lost at random, 0 to 1.
    pub missing_fraction: f64,
    /// Pulses lost, by pulse number.
    pub missing_pulses: Vec<i64>,
    /// Pulses that come twice.
    pub doubled: Option<Doubled>,
    /// Stray pulses at random, mean number per second, >= 0.
    pub strays_per_s: f64,
    /// Stray pulses, times of their 50 % crossing, s.
    pub stray_times_s: Vec<f64>,
    /// Bursts of stray pulses.
    pub bursts: Vec<Burst>,
    /// Width of a stray pulse, s, > 0. Default: 0.5 ms.
    pub stray_width_s: f64,
    /// Height of a stray pulse as a share of a true one, above 0 to 1. Default: 1.
    pub stray_height: f64,
}

/// Pulses that come twice, as from a creased tape.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Doubled {
    /// Share of pulses doubled at random, 0 to 1.
    pub fraction: f64,
    /// The second edge comes this much later, degrees of its shaft, above 0, below 360.
    pub lag_deg: f64,
}

/// Stray pulses at equal spacing.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Burst {
    /// Time of the first, s.
    pub at_s: f64,
    /// Number, at most 10 000.
    pub count: u32,
    /// Spacing, s, > 0.
    pub spacing_s: f64,
}

impl Recipe {
    /// A recipe with seed 1 and no channels yet.
    #[must_use]
    pub fn new(sample_rate_hz: f64, seconds: f64, speed: Speed) -> Self {
        Self {
            description: String::new(),
            sample_rate_hz,
            seconds,
            seed: 1,
            speed,
            channels: Vec::new(),
        }
    }
}

impl Speed {
    /// A profile with nothing added.
    #[must_use]
    pub fn new(profile: Profile) -> Self {
        Self {
            profile,
            wobbles: Vec::new(),
            hunting: None,
            start_angle_rev: 0.0,
        }
    }

    /// A speed that holds still, rev/s.
    #[must_use]
    pub fn constant(rev_per_s: f64) -> Self {
        Self::new(Profile::Constant { rev_per_s })
    }

    /// Adds a sine to the speed (peak amplitude in rev/s, Hz, phase lead in degrees).
    #[must_use]
    pub fn with_wobble(
        mut self,
        amplitude_rev_per_s: f64,
        frequency_hz: f64,
        phase_deg: f64,
    ) -> Self {
        self.wobbles.push(Wobble {
            amplitude_rev_per_s,
            frequency_hz,
            phase_deg,
        });
        self
    }
}

impl Channel {
    /// A silent channel.
    #[must_use]
    pub fn new(name: &str, quantity: &str, unit: &str) -> Self {
        Self {
            name: name.to_owned(),
            quantity: quantity.to_owned(),
            unit: unit.to_owned(),
            orders: Vec::new(),
            tones: Vec::new(),
            noise: Vec::new(),
            pulses: None,
            bias: 0.0,
            drift_per_s: 0.0,
            spikes: Vec::new(),
            clip_at: None,
            converter: None,
        }
    }

    /// A tach channel named `tach`, in volts.
    #[must_use]
    pub fn tach(pulses: PulseTrain) -> Self {
        Self {
            pulses: Some(pulses),
            ..Self::new("tach", "voltage", "V")
        }
    }
}

impl Order {
    /// Order k with peak amplitude and phase lead in degrees.
    #[must_use]
    pub fn new(order: f64, amplitude: f64, phase_lead_deg: f64) -> Self {
        Self {
            order,
            amplitude,
            phase_lead_deg,
            shaft: None,
            modulation: None,
            resonance: None,
        }
    }

    /// Order of the main shaft: k times the ratio of its own shaft.
    #[must_use]
    pub fn main_shaft_order(&self) -> f64 {
        self.shaft.map_or(self.order, |ratio| {
            self.order * ratio.turns as f64 / ratio.per as f64
        })
    }

    /// Peak amplitude and phase lead (degrees, −180 to 180) at a speed of the main shaft in rev/s,
    /// without the modulation.
    #[must_use]
    pub fn at_speed(&self, rev_per_s: f64) -> (f64, f64) {
        let (re, im) = self.resonance.map_or((1.0, 0.0), |resonance| {
            resonance.gain(self.main_shaft_order() * rev_per_s)
        });
        let lead = self.phase_lead_deg + im.atan2(re).to_degrees();
        (
            self.amplitude * re.hypot(im),
            lead - 360.0 * (lead / 360.0).round(),
        )
    }
}

impl Resonance {
    /// H at a frequency in Hz, as real and imaginary part.
    #[must_use]
    pub fn gain(&self, frequency_hz: f64) -> (f64, f64) {
        let r = frequency_hz / self.natural_hz;
        let (re, im) = (1.0 - r * r, 2.0 * self.damping_ratio * r);
        let scale = (0..self.speed_power).fold(1.0, |power, _| power * r) / (re * re + im * im);
        (scale * re, -scale * im)
    }
}

impl Tone {
    /// A tone with peak amplitude and phase lead in degrees.
    #[must_use]
    pub fn new(frequency_hz: f64, amplitude: f64, phase_lead_deg: f64) -> Self {
        Self {
            frequency_hz,
            amplitude,
            phase_lead_deg,
        }
    }
}

impl PulseTrain {
    /// A tape: one pulse per revolution, 10° wide, 5 V, edges of 0.2 ms.
    #[must_use]
    pub fn once_per_rev() -> Self {
        Self {
            pulses_per_rev: 1,
            missing_teeth: 0,
            tooth_errors_deg: Vec::new(),
            phase_deg: 0.0,
            shaft: None,
            width: Width::Degrees(10.0),
            edge: Edge::Seconds(2e-4),
            shape: EdgeShape::RaisedCosine,
            low: 0.0,
            high: 5.0,
            faults: Faults::default(),
        }
    }

    /// A wheel: P pulses per revolution, each half a pitch wide, edges of a tenth of a pitch.
    #[must_use]
    pub fn wheel(pulses_per_rev: u32) -> Self {
        let pitch = 360.0 / f64::from(pulses_per_rev.max(1));
        Self {
            pulses_per_rev,
            width: Width::Degrees(0.5 * pitch),
            edge: Edge::Degrees(0.1 * pitch),
            ..Self::once_per_rev()
        }
    }
}

impl Default for Faults {
    fn default() -> Self {
        Self {
            missing_fraction: 0.0,
            missing_pulses: Vec::new(),
            doubled: None,
            strays_per_s: 0.0,
            stray_times_s: Vec::new(),
            bursts: Vec::new(),
            stray_width_s: 5e-4,
            stray_height: 1.0,
        }
    }
}

impl Faults {
    fn is_none(&self) -> bool {
        *self == Self::default()
    }
}

// serde asks for a path to a function for every default and every skipped value
#[allow(clippy::trivially_copy_pass_by_ref)]
fn is_zero(value: &f64) -> bool {
    *value == 0.0
}

#[allow(clippy::trivially_copy_pass_by_ref)]
fn is_none_missing(teeth: &u32) -> bool {
    *teeth == 0
}

fn one() -> u64 {
    1
}

fn two() -> u32 {
    2
}

fn five() -> f64 {
    5.0
}

fn twenty_four() -> usize {
    24
}
