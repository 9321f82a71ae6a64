//! Recordings with exactly known content, for tests and demonstrations.
//!
//! A [`Recipe`] (plain data, JSON) says how a machine turns and what its sensors see; a [`Synth`]
//! renders it in blocks of any size, in memory that does not grow with length. Every sample is a
//! pure function of the recipe and its index, so the bits do not depend on how the output is cut
//! and any single sample, also days away, can be asked for ([`Synth::sample`], [`Synth::seek`]).
//!
//! This crate is the oracle of the project's tests: it shares no formula with the analysis and
//! knows no files.
//!
//! Conventions:
//! - time t = index / rate, in seconds; angle θ in revolutions (rev); speed in rev/s;
//! - a component of order k is A·cos(2π·k·θ + φ), A its *peak* value, φ its phase lead;
//! - angle 0 is the 50 % crossing of the leading edge of pulse number 0 of the tach.
//!
//! ```
//! use shaftwise_synth::{Channel, Order, PulseTrain, Recipe, Speed, Synth};
//!
//! let mut recipe = Recipe::new(5120.0, 2.0, Speed::constant(25.0));
//! recipe.channels.push(Channel {
//!     orders: vec![Order::new(1.0, 3.0, 40.0)],
//!     ..Channel::new("drive end", "acceleration", "m/s²")
//! });
//! recipe.channels.push(Channel::tach(PulseTrain::once_per_rev()));
//! let rendered = Synth::render(&recipe)?;
//! assert_eq!(rendered.channels[0].len(), 10_240);
//! assert_eq!(rendered.truth.tachs[0].pulses.len(), 50);
//! # Ok::<(), shaftwise_synth::Error>(())
//! ```

mod channel;
mod error;
mod exact;
mod generator;
mod machine;
mod motion;
mod noise;
mod pulses;
mod recipe;
mod sine;
mod synth;
mod truth;
mod validate;

pub use error::Error;
pub use exact::Exact;
pub use generator::Generator;
pub use machine::{Difficulty, random_machine};
pub use motion::Motion;
pub use recipe::{
    Burst, Channel, Converter, Doubled, Edge, EdgeShape, Faults, Hunting, Knot, Modulation, Noise,
    Order, Profile, PulseTrain, Recipe, Resonance, ShaftRatio, Speed, Spike, Tone, Width, Wobble,
};
pub use synth::{ChannelInfo, Rendered, Synth};
pub use truth::{Pulse, TachTruth, Truth};
