//! Recordings read by position, and encoders for WAV, CSV and NPY.
//!
//! A [`Recording`] is opened from a file or from a stream and then read by
//! position, through a shared reference, in memory that does not depend on its
//! length. Two formats are told apart by content:
//!
//! - the WAV family: RIFF, RF64, BW64 and W64 with integers of 8 (unsigned) to
//!   32 bits or floats of 32 and 64 bits, plain or with the extensible header;
//! - delimited text: comma, semicolon, tab or blanks; decimal point or, except
//!   between commas, decimal comma; comments after `#` or `%`; a header row of
//!   names with units in brackets or in a row of their own; a time column
//!   (by name, or a first column that increases evenly) or a given rate.
//!
//! Samples are calibrated once, to the SI-based unit of their quantity; see
//! [`ChannelSetup`] for the ways to say how. What is wrong with a file is an
//! [`Error`] that says where; what is doubtful is read and stands in
//! [`Recording::warnings`].
//!
//! ```
//! use shaftwise_recording::{ChannelSetup, OpenOptions, Recording};
//!
//! let text = "time;DE [g];tach [V]\n0,000;0,5;0,1\n0,001;-0,5;4,9\n0,002;0,25;0,1\n";
//! let mut scratch = Vec::new();
//! let mut values = vec![Vec::new()];
//! let recording = Recording::from_reader(text.as_bytes(), "-", &OpenOptions::default())?;
//! recording.read(0, 3, &[0], &mut scratch, &mut values)?;
//!
//! assert_eq!(recording.sample_rate_hz(), 1000.0);
//! assert_eq!(recording.channels()[0].unit, "m/s²");
//! assert_eq!(values[0], [4.903325, -4.903325, 2.4516625]);
//! # Ok::<(), shaftwise_recording::Error>(())
//! ```

mod channel;
mod csv_writer;
mod error;
mod hash;
mod npy_writer;
mod rate;
mod recording;
mod sample;
mod source;
mod text;
mod time_column;
mod unit;
mod wav;
mod wav_writer;

pub use channel::{Channel, ChannelSetup, Scale};
pub use csv_writer::write_csv;
pub use error::Error;
pub use hash::{FileHasher, HashParts};
pub use npy_writer::write_npy;
pub use rate::convert_rate;
pub use recording::{OpenOptions, Recording};
pub use sample::{Encoding, SampleFormat, first_non_finite};
pub use unit::{Quantity, STANDARD_GRAVITY, Unit, convert, convert_at_frequency};
pub use wav_writer::{FloatWidth, WavConfig, WavWriter};
