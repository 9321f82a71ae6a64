//! How samples are stored, and the loops that turn their bytes into values.

/// Kind of number a sample is stored as.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Encoding {
    /// Unsigned integer with the zero at half scale (8-bit WAV).
    Unsigned,
    /// Two's complement, little-endian, aligned to the high bits of its bytes.
    Signed,
    /// IEEE 754, little-endian.
    Float,
}

/// How one sample is stored.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct SampleFormat {
    /// Kind of number.
    pub encoding: Encoding,
    /// Bytes one sample takes: 1 to 4 for integers, 4 or 8 for floats.
    pub bytes: usize,
    /// Bits that carry information, at most `8 * bytes`.
    pub valid_bits: u32,
}

impl SampleFormat {
    /// One step of an integer converter as a fraction of full scale,
    /// `2^(1 - valid_bits)`; `None` for floats.
    #[must_use]
    pub fn step(self) -> Option<f64> {
        (self.encoding != Encoding::Float).then(|| 2f64.powi(1 - self.valid_bits as i32))
    }

    /// Sample values per unit of the stored integer; 1 for floats.
    pub(crate) fn unit_of_stored(self) -> f64 {
        match self.encoding {
            Encoding::Float => 1.0,
            Encoding::Unsigned | Encoding::Signed => 2f64.powi(1 - 8 * self.bytes as i32),
        }
    }
}

/// Appends `stored * factor + offset` for one column of interleaved frames.
///
/// `at` is the byte offset of the column inside a frame of `frame_bytes`.
pub(crate) fn decode_column(
    format: SampleFormat,
    frames: &[u8],
    frame_bytes: usize,
    at: usize,
    (factor, offset): (f64, f64),
    out: &mut Vec<f64>,
) {
    // Adding 0.0 would cost little but turn −0.0 into 0.0 and hinder nothing
    // else; only temperatures have an offset, so it is its own loop.
    if offset == 0.0 {
        append(format, frames, frame_bytes, at, out, |x| x * factor);
    } else {
        append(format, frames, frame_bytes, at, out, |x| {
            x * factor + offset
        });
    }
}

fn append(
    format: SampleFormat,
    frames: &[u8],
    frame_bytes: usize,
    at: usize,
    out: &mut Vec<f64>,
    calibrate: impl Fn(f64) -> f64,
) {
    use Encoding::{Float, Signed, Unsigned};
    macro_rules! column {
        ($n:literal, $value:expr) => {{
            let value = $value;
            out.extend(frames.chunks_exact(frame_bytes).map(|frame| {
                let mut sample = [0u8; $n];
                sample.copy_from_slice(&frame[at..at + $n]);
                calibrate(value(sample))
            }));
        }};
    }
    match (format.encoding, format.bytes) {
        (Unsigned, _) => column!(1, |b: [u8; 1]| f64::from(i16::from(b[0]) - 128)),
        (Signed, 1) => column!(1, |b| f64::from(i8::from_le_bytes(b))),
        (Signed, 2) => column!(2, |b| f64::from(i16::from_le_bytes(b))),
        (Signed, 3) => column!(3, |b: [u8; 3]| f64::from(
            i32::from_le_bytes([0, b[0], b[1], b[2]]) >> 8
        )),
        (Signed, _) => column!(4, |b| f64::from(i32::from_le_bytes(b))),
        (Float, 4) => column!(4, |b| f64::from(f32::from_le_bytes(b))),
        (Float, _) => column!(8, f64::from_le_bytes),
    }
}

/// Index of the first value that is NaN or infinite.
#[must_use]
pub fn first_non_finite(values: &[f64]) -> Option<usize> {
    values.iter().position(|value| !value.is_finite())
}
