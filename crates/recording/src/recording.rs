use std::fs::File;
use std::io::{self, Cursor, Read};
use std::path::Path;
use std::sync::Arc;

use crate::channel::{Channel, ChannelSetup, Origin, set_up};
use crate::error::printable;
use crate::hash::{FileHasher, HashParts};
use crate::sample::{SampleFormat, decode_column};
use crate::source::{Hashed, read_at};
use crate::{Error, text, wav};

/// What is known about a recording besides its file.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct OpenOptions {
    /// Sample rate in Hz, for text without a time column or in place of what
    /// the file says. Default: the file's.
    pub sample_rate_hz: Option<f64>,
    /// Channels of which more is known than the file says, in any order.
    pub channels: Vec<ChannelSetup>,
}

/// A recording open for reading by position.
///
/// All reads go through `&self`; any number of threads may share one.
/// Memory does not depend on its length.
#[derive(Debug)]
pub struct Recording {
    name: String,
    file: Arc<File>,
    layout: Layout,
    sample_rate_hz: f64,
    channels: Vec<Channel>,
    warnings: Vec<String>,
    /// Taken while spooling; `None` when the file itself is read by position.
    sha256: Option<String>,
}

/// Where the frames lie in the file.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Layout {
    pub(crate) data_offset: u64,
    pub(crate) frames: u64,
    pub(crate) frame_bytes: usize,
    pub(crate) format: SampleFormat,
    /// Columns before the first channel, of the same format.
    pub(crate) skipped_columns: usize,
}

/// What a reader found out; the rest is the same for all formats.
pub(crate) struct Parsed {
    pub(crate) layout: Layout,
    pub(crate) sample_rate_hz: f64,
    pub(crate) origins: Vec<Origin>,
    pub(crate) warnings: Vec<String>,
}

/// Enough for any header row and a few rows of numbers.
pub(crate) const HEAD_BYTES: u64 = 256 * 1024;

/// Raw frames that one column after the other is picked from: few enough to stay
/// in the first-level cache meanwhile.
const TILE_BYTES: usize = 16 * 1024;

impl Recording {
    /// Opens a recording. The format is told from the content: the WAV family
    /// (RIFF, RF64, BW64, W64), else delimited text. What is not a regular file
    /// (a pipe) is spooled as by [`Recording::from_reader`].
    ///
    /// # Errors
    ///
    /// What the file cannot be read for: [`Error::Io`], [`Error::Empty`],
    /// faults of the header or of a line of text with their position, settings
    /// that do not fit.
    pub fn open(path: &Path, options: &OpenOptions) -> Result<Self, Error> {
        check_rate(options.sample_rate_hz)?;
        let name = path
            .file_name()
            .unwrap_or(path.as_os_str())
            .to_string_lossy();
        let open = |source| Error::Io {
            action: "open the recording",
            source,
        };
        let file = File::open(path).map_err(open)?;
        let metadata = file.metadata().map_err(open)?;
        if metadata.is_dir() {
            return Err(Error::Directory);
        }
        if !metadata.is_file() {
            return Self::from_reader(file, &name, options);
        }
        let mut head = [0u8; 16];
        let n = read_at(&file, &mut head, 0).map_err(Error::reading)?;
        if wav::is_wav(&head[..n]) {
            let parsed = wav::parse(&file, metadata.len(), options.sample_rate_hz)?;
            return Self::assemble(name.into_owned(), file, parsed, None, options);
        }
        Self::from_reader(file, &name, options)
    }

    /// Reads a recording that cannot be read by position (standard input) to
    /// its end into an unnamed temporary file, and takes its hash on the way.
    /// `name` stands for the file name.
    ///
    /// # Errors
    ///
    /// As [`Recording::open`]; [`Error::Io`] also when the folder for temporary
    /// files is full.
    pub fn from_reader(
        reader: impl Read,
        name: &str,
        options: &OpenOptions,
    ) -> Result<Self, Error> {
        check_rate(options.sample_rate_hz)?;
        let mut reader = Hashed::new(reader);
        let mut head = Vec::new();
        (&mut reader)
            .take(HEAD_BYTES)
            .read_to_end(&mut head)
            .map_err(Error::reading)?;
        if head.is_empty() {
            return Err(Error::Empty);
        }
        let mut spool = tempfile::tempfile().map_err(Error::spooling)?;
        let parsed = if wav::is_wav(&head) {
            let mut all = Cursor::new(&head).chain(&mut reader);
            let file_bytes = copy(&mut all, &mut spool)?;
            wav::parse(&spool, file_bytes, options.sample_rate_hz)?
        } else {
            parse_text(&head, &mut reader, &spool, name, options)?
        };
        let sha256 = Some(reader.finish());
        Self::assemble(name.to_owned(), spool, parsed, sha256, options)
    }

    fn assemble(
        name: String,
        file: File,
        parsed: Parsed,
        sha256: Option<String>,
        options: &OpenOptions,
    ) -> Result<Self, Error> {
        let Parsed {
            layout,
            sample_rate_hz,
            origins,
            mut warnings,
        } = parsed;
        let channels = set_up(&origins, layout.format, &options.channels, &mut warnings)?;
        Ok(Self {
            name,
            file: Arc::new(file),
            layout,
            sample_rate_hz,
            channels,
            warnings,
            sha256,
        })
    }

    /// The bare file name.
    #[must_use]
    pub fn name(&self) -> &str {
        &self.name
    }

    /// Frames per second.
    #[must_use]
    pub fn sample_rate_hz(&self) -> f64 {
        self.sample_rate_hz
    }

    /// Number of frames: samples per channel, at least 1.
    #[must_use]
    pub fn frames(&self) -> u64 {
        self.layout.frames
    }

    /// Its channels in file order, at least one. A time column is none of them.
    #[must_use]
    pub fn channels(&self) -> &[Channel] {
        &self.channels
    }

    /// What is doubtful about the file, in sentences for the user.
    #[must_use]
    pub fn warnings(&self) -> &[String] {
        &self.warnings
    }

    /// How samples are stored. Text is stored as 64-bit floats.
    #[must_use]
    pub fn sample_format(&self) -> SampleFormat {
        self.layout.format
    }

    /// Bytes of one frame in [`Recording::read_raw`].
    #[must_use]
    pub fn frame_bytes(&self) -> usize {
        self.layout.frame_bytes
    }

    /// Reads up to `frames` whole frames from `first_frame` on, as they are
    /// stored, in place of what `bytes` held. Returns how many were read: fewer
    /// than asked at the end of the recording, or where the file has shrunk
    /// since it was opened (`first_frame` plus the count stays below
    /// [`Recording::frames`]; the caller reports that).
    ///
    /// # Errors
    ///
    /// [`Error::Io`].
    pub fn read_raw(
        &self,
        first_frame: u64,
        frames: usize,
        bytes: &mut Vec<u8>,
    ) -> Result<usize, Error> {
        let left = self.layout.frames.saturating_sub(first_frame);
        let frames = usize::try_from(left).map_or(frames, |left| left.min(frames));
        if frames == 0 {
            bytes.clear();
            return Ok(0);
        }
        let frame_bytes = self.layout.frame_bytes;
        bytes.resize(frames * frame_bytes, 0);
        // first_frame < layout.frames, whose bytes fit the file
        let offset = self.layout.data_offset + first_frame * frame_bytes as u64;
        let n = read_at(&self.file, bytes, offset).map_err(Error::reading)?;
        let whole = n / frame_bytes;
        bytes.truncate(whole * frame_bytes);
        Ok(whole)
    }

    /// Appends the calibrated values of the raw frames in `bytes` to `out`, one
    /// vector per channel asked for. `channels` counts from 0 and may hold any
    /// channel, in any order. Bytes after the last whole frame are ignored. NaN
    /// and infinities of float files come through
    /// (see [`first_non_finite`](crate::first_non_finite)).
    ///
    /// # Panics
    ///
    /// If `channels` and `out` differ in length or a channel does not exist.
    pub fn decode(&self, bytes: &[u8], channels: &[usize], out: &mut [Vec<f64>]) {
        assert_eq!(
            channels.len(),
            out.len(),
            "one output vector per channel asked for"
        );
        let Layout {
            frame_bytes,
            format,
            skipped_columns,
            ..
        } = self.layout;
        let stored = format.unit_of_stored();
        for values in out.iter_mut() {
            values.reserve(bytes.len() / frame_bytes);
        }
        let tile_bytes = (TILE_BYTES / frame_bytes).max(1) * frame_bytes;
        for tile in bytes.chunks(tile_bytes) {
            for (&channel, values) in channels.iter().zip(out.iter_mut()) {
                let scale = self.channels[channel].scale;
                let at = (skipped_columns + channel) * format.bytes;
                let scale = (scale.factor * stored, scale.offset);
                decode_column(format, tile, frame_bytes, at, scale, values);
            }
        }
    }

    /// [`Recording::read_raw`] into `scratch`, then [`Recording::decode`], which
    /// appends. Returns how many frames were read.
    ///
    /// # Errors
    ///
    /// [`Error::Io`].
    ///
    /// # Panics
    ///
    /// As [`Recording::decode`].
    pub fn read(
        &self,
        first_frame: u64,
        frames: usize,
        channels: &[usize],
        scratch: &mut Vec<u8>,
        out: &mut [Vec<f64>],
    ) -> Result<usize, Error> {
        let read = self.read_raw(first_frame, frames, scratch)?;
        self.decode(scratch, channels, out);
        Ok(read)
    }

    /// What it takes to hash the original file: nothing more where it was
    /// spooled, else a hasher to be fed with the raw buffers of the first pass.
    ///
    /// # Errors
    ///
    /// [`Error::Io`]: what lies before the samples is read here.
    pub fn hash_parts(&self) -> Result<HashParts, Error> {
        Ok(match &self.sha256 {
            Some(sha256) => HashParts::Taken(sha256.clone()),
            None => HashParts::Sequential(FileHasher::new(
                Arc::clone(&self.file),
                self.layout.data_offset,
            )?),
        })
    }
}

fn check_rate(sample_rate_hz: Option<f64>) -> Result<(), Error> {
    match sample_rate_hz {
        Some(rate) if !(rate > 0.0 && rate.is_finite()) => Err(Error::Setting {
            what: "sample rate".into(),
            found: format!("{rate} Hz"),
            expected: "a positive number of Hz".into(),
        }),
        _ => Ok(()),
    }
}

/// Reads and writes of a copy fail for different reasons; `io::copy` would not
/// say which.
fn copy(reader: &mut impl Read, spool: &mut File) -> Result<u64, Error> {
    use std::io::Write;
    let mut buffer = vec![0u8; 1 << 20];
    let mut total = 0;
    loop {
        match reader.read(&mut buffer) {
            Ok(0) => return Ok(total),
            Ok(n) => {
                spool.write_all(&buffer[..n]).map_err(Error::spooling)?;
                total += n as u64;
            }
            Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
            Err(error) => return Err(Error::reading(error)),
        }
    }
}

fn parse_text(
    head: &[u8],
    rest: impl Read,
    spool: &File,
    name: &str,
    options: &OpenOptions,
) -> Result<Parsed, Error> {
    // Control characters that no text holds: a binary format we do not know.
    if head
        .iter()
        .any(|&b| b < 0x20 && !matches!(b, b'\t' | b'\n' | b'\r' | 0x0c))
    {
        return Err(Error::UnknownFormat {
            found: printable(head),
        });
    }
    let extension = Path::new(name).extension().map(|e| e.to_ascii_lowercase());
    let named_wav =
        extension.is_some_and(|e| e == "wav" || e == "w64" || e == "rf64" || e == "bwf");
    match text::parse(head, rest, spool, options.sample_rate_hz) {
        Ok(mut parsed) => {
            if named_wav {
                parsed.warnings.push(format!(
                    "{name} is named like a WAV file but holds text; read as text"
                ));
            }
            Ok(parsed)
        }
        Err(source @ Error::Io { .. }) => Err(source),
        Err(source) if named_wav => Err(Error::TextNamedWav {
            found: printable(head),
            source: Box::new(source),
        }),
        Err(error) => Err(error),
    }
}
