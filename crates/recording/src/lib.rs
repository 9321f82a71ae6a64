//! Recordings read by position, and encoders for WAV, CSV and NPY.

mod channel;
mod error;
mod hash;
mod recording;
mod sample;
mod source;
mod text;
mod unit;
mod wav;
mod wav_writer;

pub use channel::{Channel, ChannelSetup, Scale};
pub use error::Error;
pub use hash::{FileHasher, HashParts};
pub use recording::{OpenOptions, Recording};
pub use sample::{Encoding, SampleFormat, first_non_finite};
pub use unit::{Quantity, STANDARD_GRAVITY, Unit, convert, convert_at_frequency};
pub use wav_writer::{FloatWidth, WavConfig, WavWriter};
