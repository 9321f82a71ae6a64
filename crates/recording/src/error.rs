use std::io;

/// Everything that can go wrong with a recording or an encoder.
///
/// The name of the file is not part of the text: who opened it knows it and
/// says it once.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum Error {
    /// The operating system refused.
    #[error("could not {action}: {source}")]
    Io {
        /// What was being done, as an infinitive: `read the recording`.
        action: &'static str,
        /// What the operating system said.
        source: io::Error,
    },

    /// A path that is a directory.
    #[error("expected a file, found a directory")]
    Directory,

    /// Not a single byte.
    #[error("the file is empty, expected a WAV file or delimited text")]
    Empty,

    /// Neither a WAV file nor text.
    #[error("neither a WAV file (RIFF, RF64, BW64, W64) nor delimited text: begins with {found}")]
    UnknownFormat {
        /// The first bytes, printable.
        found: String,
    },

    /// A header that ends before it is complete.
    #[error("header cut off at byte {offset}: expected {expected}, found {found} bytes")]
    CutHeader {
        /// Byte offset from the start of the file.
        offset: u64,
        /// What should be there.
        expected: &'static str,
        /// How many bytes of it are there.
        found: u64,
    },

    /// A header field with a value that cannot be.
    #[error("{field} at byte {offset} is {found}, expected {expected}")]
    Header {
        /// Name of the field.
        field: &'static str,
        /// Byte offset from the start of the file.
        offset: u64,
        /// The value found.
        found: String,
        /// The values allowed.
        expected: String,
    },

    /// A header without a chunk that must be there.
    #[error("no {chunk} chunk found in the first {searched_bytes} bytes")]
    MissingChunk {
        /// Name of the chunk.
        chunk: &'static str,
        /// How far the search went.
        searched_bytes: u64,
    },

    /// A sound header and not one whole frame behind it.
    #[error(
        "the recording holds no samples: {found_bytes} bytes of data, expected at least one frame of {frame_bytes} bytes"
    )]
    NoSamples {
        /// Bytes of data found.
        found_bytes: u64,
        /// Bytes of one frame.
        frame_bytes: usize,
    },

    /// The name says WAV, the content is text that cannot be read either.
    #[error("named like a WAV file but begins with text ({found})")]
    TextNamedWav {
        /// The first bytes, printable.
        found: String,
        /// Why it cannot be read as text.
        source: Box<Error>,
    },

    /// Text without a single row of numbers.
    #[error("no row of numbers in the first {lines} lines, the first line is {found}")]
    NoNumbers {
        /// Lines looked at.
        lines: u64,
        /// The first line.
        found: String,
    },

    /// A line that never ends.
    #[error("line {line} is longer than {limit} bytes")]
    LineTooLong {
        /// Line, from 1.
        line: u64,
        /// The longest line allowed.
        limit: usize,
    },

    /// A row with too many or too few fields.
    #[error("line {line} has {found} fields, expected {expected}")]
    FieldCount {
        /// Line, from 1.
        line: u64,
        /// Fields found.
        found: usize,
        /// Fields expected.
        expected: usize,
    },

    /// A field that is not a finite number.
    #[error("line {line}, column {column}: found {found}, expected {expected}")]
    Field {
        /// Line, from 1.
        line: u64,
        /// Column, from 1.
        column: usize,
        /// What is there.
        found: String,
        /// What should be there.
        expected: &'static str,
    },

    /// Text without a time column and no rate given.
    #[error("the text has no time column and no sample rate was given")]
    NoSampleRate,

    /// A time column whose steps are not even.
    #[error(
        "the time column is not even: row {row} lies {off_steps:.3} steps off (median step {step_s:.4e} s, expected within {allowed_steps:.3} steps)"
    )]
    UnevenTime {
        /// The worst row of numbers, from 1.
        row: u64,
        /// How far it lies from even spacing between the first and the last
        /// row, in steps.
        off_steps: f64,
        /// The median step in seconds.
        step_s: f64,
        /// How far it may lie, in steps.
        allowed_steps: f64,
    },

    /// A time column that does not settle the rate.
    #[error("the time column does not give a sample rate: {reason}")]
    UselessTime {
        /// Why not.
        reason: String,
    },

    /// A value of a setting outside its range.
    #[error("{what} is {found}, expected {expected}")]
    Setting {
        /// The setting, with its channel where it has one.
        what: String,
        /// The value found.
        found: String,
        /// The values allowed.
        expected: String,
    },

    /// A unit that does not measure the quantity.
    #[error("unit {unit} does not fit the quantity {quantity}, expected one of {expected}")]
    UnitMismatch {
        /// The unit as given.
        unit: String,
        /// The quantity.
        quantity: String,
        /// Units that would fit.
        expected: String,
    },

    /// A unit that is not in the table.
    #[error("unknown unit {unit}")]
    UnknownUnit {
        /// The unit as given.
        unit: String,
    },

    /// The caller handed an encoder data it cannot write.
    #[error("{what}: found {found}, expected {expected}")]
    Encode {
        /// What is being written.
        what: &'static str,
        /// What was handed over.
        found: String,
        /// What can be written.
        expected: String,
    },
}

impl Error {
    /// What the user can do about it, where there is something to do.
    #[must_use]
    pub fn hint(&self) -> Option<&'static str> {
        match self {
            Self::NoSampleRate | Self::UselessTime { .. } => {
                Some("give the rate with --sample-rate HZ or sample_rate_hz in the run file")
            }
            Self::UnevenTime { .. } => Some(
                "resample the log evenly first, or give --sample-rate HZ if the time column is wrong",
            ),
            Self::TextNamedWav { .. } => Some(
                "look at the file with a text viewer; a download may have saved a message in its place",
            ),
            Self::Empty | Self::CutHeader { .. } | Self::NoSamples { .. } => {
                Some("copy the recording from the recorder again")
            }
            Self::UnknownFormat { .. } => Some("export the recording as WAV or as delimited text"),
            _ => None,
        }
    }

    pub(crate) fn reading(source: io::Error) -> Self {
        Self::Io {
            action: "read the recording",
            source,
        }
    }

    pub(crate) fn spooling(source: io::Error) -> Self {
        Self::Io {
            action: "write the decoded recording into the folder for temporary files",
            source,
        }
    }

    pub(crate) fn writing(source: io::Error) -> Self {
        Self::Io {
            action: "write the file",
            source,
        }
    }
}

/// The first bytes of a file, fit for a message.
pub(crate) fn printable(bytes: &[u8]) -> String {
    let head = &bytes[..bytes.len().min(24)];
    let text: String = head
        .iter()
        .flat_map(|&b| b.escape_ascii())
        .map(char::from)
        .collect();
    let dots = if bytes.len() > head.len() { "…" } else { "" };
    format!("\"{text}{dots}\"")
}
