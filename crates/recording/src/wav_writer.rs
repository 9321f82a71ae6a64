use std::io::Write;

use crate::Error;
use crate::wav::TAG_GUID_TAIL;

/// Width of the floats in a written WAV.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum FloatWidth {
    /// 32 bits: 24 bits of resolution at any level.
    #[default]
    F32,
    /// 64 bits: values come back as they were.
    F64,
}

impl FloatWidth {
    fn bytes(self) -> u16 {
        match self {
            Self::F32 => 4,
            Self::F64 => 8,
        }
    }
}

/// What a WAV file is to hold.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WavConfig {
    /// 1 to 1024.
    pub channels: usize,
    /// A whole number of Hz, at least 1: the format holds no other.
    pub sample_rate_hz: f64,
    /// Number of frames that will be written.
    pub frames: u64,
    /// Width of the floats.
    pub width: FloatWidth,
}

/// Writes a WAV of floats: the header first, then frames as they come.
///
/// Up to two channels are written as plain WAV, more with the extensible header
/// (no loudspeaker positions); from 4 GiB on the file is an RF64. Values are
/// not clipped: ±1 has no meaning for floats.
#[derive(Debug)]
pub struct WavWriter<W> {
    sink: W,
    config: WavConfig,
    written: u64,
    bytes: Vec<u8>,
}

/// Frames encoded before they are handed to the sink.
const BLOCK_FRAMES: usize = 4096;

impl<W: Write> WavWriter<W> {
    /// Writes the header.
    ///
    /// # Errors
    ///
    /// [`Error::Encode`] if the configuration cannot be written;
    /// [`Error::Io`] if the sink fails.
    pub fn new(mut sink: W, config: &WavConfig) -> Result<Self, Error> {
        let header = header(config)?;
        sink.write_all(&header).map_err(Error::writing)?;
        Ok(Self {
            sink,
            config: *config,
            written: 0,
            bytes: Vec::new(),
        })
    }

    /// Writes the next frames, one slice per channel.
    ///
    /// # Errors
    ///
    /// [`Error::Encode`] if the number of slices is not that of the channels,
    /// the slices differ in length or the frames are more than announced;
    /// [`Error::Io`] if the sink fails.
    pub fn write_planar(&mut self, channels: &[impl AsRef<[f64]>]) -> Result<(), Error> {
        let refuse = |found: String, expected: String| {
            Err(Error::Encode {
                what: "WAV frames",
                found,
                expected,
            })
        };
        if channels.len() != self.config.channels {
            let found = format!("{} channels", channels.len());
            return refuse(found, self.config.channels.to_string());
        }
        let frames = channels[0].as_ref().len();
        if let Some(other) = channels.iter().find(|other| other.as_ref().len() != frames) {
            let found = format!("channels of {frames} and {} frames", other.as_ref().len());
            return refuse(found, "equal lengths".into());
        }
        let left = self.config.frames - self.written;
        if frames as u64 > left {
            return refuse(format!("{frames} more frames"), format!("at most {left}"));
        }
        for start in (0..frames).step_by(BLOCK_FRAMES) {
            let block = start..(start + BLOCK_FRAMES).min(frames);
            self.bytes.clear();
            for frame in block {
                for channel in channels {
                    let value = channel.as_ref()[frame];
                    match self.config.width {
                        FloatWidth::F32 => {
                            self.bytes.extend_from_slice(&(value as f32).to_le_bytes());
                        }
                        FloatWidth::F64 => self.bytes.extend_from_slice(&value.to_le_bytes()),
                    }
                }
            }
            self.sink.write_all(&self.bytes).map_err(Error::writing)?;
        }
        self.written += frames as u64;
        Ok(())
    }

    /// Flushes and hands the sink back. A writer that is dropped instead leaves
    /// an unflushed sink behind.
    ///
    /// # Errors
    ///
    /// [`Error::Encode`] if fewer frames were written than announced;
    /// [`Error::Io`] if the sink fails.
    pub fn finish(mut self) -> Result<W, Error> {
        if self.written != self.config.frames {
            return Err(Error::Encode {
                what: "WAV file",
                found: format!("{} frames", self.written),
                expected: format!("the {} announced", self.config.frames),
            });
        }
        self.sink.flush().map_err(Error::writing)?;
        Ok(self.sink)
    }
}

fn header(config: &WavConfig) -> Result<Vec<u8>, Error> {
    let refuse = |what, found: String, expected: &str| {
        Err(Error::Encode {
            what,
            found,
            expected: expected.into(),
        })
    };
    let rate = config.sample_rate_hz;
    if !(rate >= 1.0 && rate <= f64::from(u32::MAX) && rate.fract() == 0.0) {
        let expected = "a whole number of Hz from 1 to 4294967295";
        return refuse("WAV sample rate", format!("{rate} Hz"), expected);
    }
    if !(1..=1024).contains(&config.channels) {
        let found = config.channels.to_string();
        return refuse("number of WAV channels", found, "1 to 1024");
    }
    let rate = rate as u32;
    let channels = config.channels as u16;
    let sample_bytes = config.width.bytes();
    let frame_bytes = channels * sample_bytes;
    let Some(data_bytes) = config.frames.checked_mul(u64::from(frame_bytes)) else {
        return refuse(
            "number of WAV frames",
            config.frames.to_string(),
            "fewer than 2^64 bytes",
        );
    };
    let extensible = channels > 2;

    let mut format = Vec::with_capacity(40);
    let tag: u16 = if extensible { 0xFFFE } else { 3 };
    format.extend_from_slice(&tag.to_le_bytes());
    format.extend_from_slice(&channels.to_le_bytes());
    format.extend_from_slice(&rate.to_le_bytes());
    format.extend_from_slice(&rate.wrapping_mul(u32::from(frame_bytes)).to_le_bytes());
    format.extend_from_slice(&frame_bytes.to_le_bytes());
    format.extend_from_slice(&(sample_bytes * 8).to_le_bytes());
    if extensible {
        format.extend_from_slice(&22u16.to_le_bytes());
        format.extend_from_slice(&(sample_bytes * 8).to_le_bytes());
        format.extend_from_slice(&0u32.to_le_bytes());
        format.extend_from_slice(&3u16.to_le_bytes());
        format.extend_from_slice(&TAG_GUID_TAIL);
    } else {
        format.extend_from_slice(&0u16.to_le_bytes());
    }

    // Outermost size: "WAVE", ds64, fmt, fact and the header of data.
    let small = 4 + (8 + format.len() as u64) + 12 + 8 + data_bytes;
    let rf64 = small > u64::from(u32::MAX);
    let mut header = Vec::with_capacity(128);
    // Both only used where they fit.
    let size32 = |size: u64| if rf64 { u32::MAX } else { size as u32 }.to_le_bytes();
    header.extend_from_slice(if rf64 { b"RF64" } else { b"RIFF" });
    header.extend_from_slice(&size32(small));
    header.extend_from_slice(b"WAVE");
    if rf64 {
        header.extend_from_slice(b"ds64");
        header.extend_from_slice(&28u32.to_le_bytes());
        header.extend_from_slice(&(small + 36).to_le_bytes());
        header.extend_from_slice(&data_bytes.to_le_bytes());
        header.extend_from_slice(&config.frames.to_le_bytes());
        header.extend_from_slice(&0u32.to_le_bytes());
    }
    header.extend_from_slice(b"fmt ");
    header.extend_from_slice(&(format.len() as u32).to_le_bytes());
    header.extend_from_slice(&format);
    header.extend_from_slice(b"fact");
    header.extend_from_slice(&4u32.to_le_bytes());
    header.extend_from_slice(&size32(config.frames));
    header.extend_from_slice(b"data");
    header.extend_from_slice(&size32(data_bytes));
    Ok(header)
}
