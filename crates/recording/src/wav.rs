//! The WAV family: RIFF, RF64 and BW64 (64-bit sizes in a `ds64` chunk), and
//! W64 (chunks named by GUIDs, sizes that count their header, 8-byte alignment).
//!
//! Only the header is read here. Sizes in it are never believed without a look
//! at the length of the file, and never drive an allocation.

use std::fs::File;

use crate::Error;
use crate::channel::Origin;
use crate::error::printable;
use crate::recording::{Layout, Parsed};
use crate::sample::{Encoding, SampleFormat};
use crate::source::read_at;

/// More channels than any recorder has.
const MAX_CHANNELS: u16 = 1024;

/// Chunks walked before the samples; a file of nothing but empty chunks must
/// not take for ever.
const MAX_CHUNKS: usize = 10_000;

/// Entries of a `ds64` table that are looked at.
const MAX_TABLE: u32 = 1024;

const TAG_PCM: u16 = 1;
const TAG_FLOAT: u16 = 3;
const TAG_EXTENSIBLE: u16 = 0xFFFE;

/// Tail of the GUIDs that stand for a format tag:
/// `xxxxxxxx-0000-0010-8000-00AA00389B71`, as stored.
pub(crate) const TAG_GUID_TAIL: [u8; 14] = [
    0x00, 0x00, 0x00, 0x00, 0x10, 0x00, 0x80, 0x00, 0x00, 0xAA, 0x00, 0x38, 0x9B, 0x71,
];

/// W64: GUID of the outermost chunk.
const W64_RIFF: [u8; 16] = *b"riff\x2E\x91\xCF\x11\xA5\xD6\x28\xDB\x04\xC1\x00\x00";

/// W64: tail of the GUIDs of all inner chunks, after their four letters.
const W64_TAIL: [u8; 12] = *b"\xF3\xAC\xD3\x11\x8C\xD1\x00\xC0\x4F\x8E\xDB\x8A";

/// Whether these first bytes of a file claim to be one of the family.
pub(crate) fn is_wav(head: &[u8]) -> bool {
    [b"RIFF", b"RF64", b"BW64", b"RIFX", b"riff"]
        .iter()
        .any(|magic| head.starts_with(*magic))
}

/// A file with its length, read in small fixed pieces.
struct Header<'a> {
    file: &'a File,
    bytes: u64,
}

impl Header<'_> {
    fn take<const N: usize>(&self, offset: u64, expected: &'static str) -> Result<[u8; N], Error> {
        let mut bytes = [0u8; N];
        let n = read_at(self.file, &mut bytes, offset).map_err(Error::reading)?;
        if n < N {
            return Err(Error::CutHeader {
                offset,
                expected,
                found: n as u64,
            });
        }
        Ok(bytes)
    }
}

#[derive(Clone, Copy, PartialEq)]
enum Family {
    Riff,
    /// RF64 and BW64.
    Rf64,
    W64,
}

impl Family {
    /// Bytes of the name and the size before the body of a chunk.
    fn head_bytes(self) -> u64 {
        match self {
            Self::W64 => 24,
            Self::Riff | Self::Rf64 => 8,
        }
    }

    /// Chunks begin at multiples of this.
    fn alignment(self) -> u64 {
        match self {
            Self::W64 => 8,
            Self::Riff | Self::Rf64 => 2,
        }
    }
}

struct Chunk {
    id: [u8; 4],
    body: u64,
    /// Length of the body as stated, `None` where the header leaves it open.
    stated: Option<u64>,
}

/// The 64-bit sizes of an RF64.
#[derive(Default)]
struct Sizes64 {
    data: Option<u64>,
    table: Vec<([u8; 4], u64)>,
}

/// Reads the header of a file of `file_bytes` bytes. A given rate stands in
/// place of the file's.
pub(crate) fn parse(
    file: &File,
    file_bytes: u64,
    sample_rate_hz: Option<f64>,
) -> Result<Parsed, Error> {
    let header = Header {
        file,
        bytes: file_bytes,
    };
    let (family, mut at) = family(&header)?;
    let mut sizes64 = Sizes64::default();
    let mut format = None;
    for _ in 0..MAX_CHUNKS {
        if at >= header.bytes {
            break;
        }
        let chunk = chunk(&header, family, at, &sizes64)?;
        match &chunk.id {
            b"ds64" if family == Family::Rf64 => sizes64 = read_sizes64(&header, &chunk)?,
            b"fmt " => format = Some(read_format(&header, &chunk)?),
            b"data" => {
                let format = format.ok_or(Error::Header {
                    field: "chunk",
                    offset: at,
                    found: "data".into(),
                    expected: "a fmt chunk before it".into(),
                })?;
                let mut warnings = Vec::new();
                let bytes = data_length(&header, family, &chunk, &sizes64, &mut warnings)?;
                return finish(&format, chunk.body, bytes, sample_rate_hz, warnings);
            }
            _ => {}
        }
        at = next_chunk(family, &chunk, at)?;
    }
    Err(Error::MissingChunk {
        chunk: if format.is_some() { "data" } else { "fmt" },
        searched_bytes: at.min(header.bytes),
    })
}

fn family(header: &Header<'_>) -> Result<(Family, u64), Error> {
    let magic: [u8; 4] = header.take(0, "the 4 letters RIFF")?;
    let wrong = |field, offset, found: &[u8], expected: &str| {
        Err(Error::Header {
            field,
            offset,
            found: printable(found),
            expected: expected.into(),
        })
    };
    match &magic {
        b"riff" => {
            let head: [u8; 40] = header.take(0, "the 40-byte W64 header")?;
            if head[..16] != W64_RIFF {
                return wrong("file identifier", 0, &head[..16], "the GUID of a W64 file");
            }
            if head[24..28] != *b"wave" || head[28..] != W64_TAIL {
                return wrong("form type", 24, &head[24..], "the GUID of wave");
            }
            Ok((Family::W64, 40))
        }
        b"RIFX" => wrong("file identifier", 0, &magic, "RIFF (little-endian)"),
        _ => {
            let form: [u8; 4] = header.take(8, "the 4 letters WAVE")?;
            if form != *b"WAVE" {
                return wrong("form type", 8, &form, "WAVE");
            }
            let family = if magic == *b"RIFF" {
                Family::Riff
            } else {
                Family::Rf64
            };
            Ok((family, 12))
        }
    }
}

fn chunk(header: &Header<'_>, family: Family, at: u64, sizes64: &Sizes64) -> Result<Chunk, Error> {
    if family == Family::W64 {
        let head: [u8; 24] = header.take(at, "a 24-byte chunk header")?;
        let size = le_u64(&head[16..]);
        let mut id = [0u8; 4];
        // A GUID of another maker may begin with the same letters.
        if head[4..16] == W64_TAIL {
            id.copy_from_slice(&head[..4]);
        }
        let open = id == *b"data" && matches!(size, 0 | u64::MAX);
        if size < 24 && !open {
            return Err(Error::Header {
                field: "chunk size",
                offset: at + 16,
                found: size.to_string(),
                expected: "at least 24, the length of the chunk header".into(),
            });
        }
        return Ok(Chunk {
            id,
            body: at + 24,
            stated: (!open).then(|| size - 24),
        });
    }
    let head: [u8; 8] = header.take(at, "an 8-byte chunk header")?;
    let id = [head[0], head[1], head[2], head[3]];
    let size = le_u32(&head[4..]);
    let stated = if size == u32::MAX {
        let in_table = sizes64.table.iter().find(|(name, _)| *name == id);
        match &id {
            b"data" => sizes64.data,
            _ => in_table.map(|&(_, size)| size),
        }
    } else {
        Some(u64::from(size))
    };
    Ok(Chunk {
        id,
        body: at + 8,
        stated,
    })
}

fn next_chunk(family: Family, chunk: &Chunk, at: u64) -> Result<u64, Error> {
    let size_at = if family == Family::W64 { 16 } else { 4 };
    chunk
        .stated
        .and_then(|stated| chunk.body.checked_add(stated))
        .and_then(|end| end.checked_next_multiple_of(family.alignment()))
        .ok_or_else(|| Error::Header {
            field: "chunk size",
            offset: at + size_at,
            found: chunk
                .stated
                .map_or("open".into(), |stated| stated.to_string()),
            expected: format!("the length of the {} chunk", printable(&chunk.id)),
        })
}

fn read_sizes64(header: &Header<'_>, chunk: &Chunk) -> Result<Sizes64, Error> {
    let body: [u8; 28] = header.take(chunk.body, "the 28-byte ds64 chunk")?;
    let room = (chunk.stated.unwrap_or(0).saturating_sub(28) / 12).min(u64::from(MAX_TABLE)) as u32;
    let entries = le_u32(&body[24..]).min(room);
    let mut table = Vec::new();
    for i in 0..u64::from(entries) {
        let entry: [u8; 12] =
            header.take(chunk.body + 28 + 12 * i, "an entry of the ds64 table")?;
        table.push((
            [entry[0], entry[1], entry[2], entry[3]],
            le_u64(&entry[4..]),
        ));
    }
    Ok(Sizes64 {
        data: Some(le_u64(&body[8..])),
        table,
    })
}

struct Format {
    sample_rate: u32,
    rate_offset: u64,
    channels: u16,
    frame_bytes: usize,
    sample: SampleFormat,
}

fn read_format(header: &Header<'_>, chunk: &Chunk) -> Result<Format, Error> {
    let body = chunk.body;
    let stated = chunk.stated.unwrap_or(0);
    let wrong = |field, at: u64, found: String, expected: String| Error::Header {
        field,
        offset: body + at,
        found,
        expected,
    };
    if stated < 16 {
        return Err(Error::Header {
            field: "size of the fmt chunk",
            offset: body,
            found: format!("{stated} bytes"),
            expected: "at least 16 bytes".into(),
        });
    }
    let head: [u8; 16] = header.take(body, "the 16-byte fmt chunk")?;
    let mut tag = le_u16(&head);
    let channels = le_u16(&head[2..]);
    let sample_rate = le_u32(&head[4..]);
    let block_align = le_u16(&head[12..]);
    let bits = le_u16(&head[14..]);
    if !(1..=MAX_CHANNELS).contains(&channels) {
        let expected = format!("1 to {MAX_CHANNELS}");
        return Err(wrong(
            "number of channels",
            2,
            channels.to_string(),
            expected,
        ));
    }
    let mut valid_bits = bits;
    let mut tag_at = 0;
    if tag == TAG_EXTENSIBLE {
        if stated < 40 {
            let expected = "at least 40 bytes for the extensible format";
            return Err(Error::Header {
                field: "size of the fmt chunk",
                offset: body,
                found: format!("{stated} bytes"),
                expected: expected.into(),
            });
        }
        let extension: [u8; 24] = header.take(body + 16, "the 24-byte format extension")?;
        // 0 is written by recorders that do not care
        match le_u16(&extension[2..]) {
            0 => {}
            valid => valid_bits = valid,
        }
        tag = le_u16(&extension[8..]);
        tag_at = 24;
        if extension[10..] != TAG_GUID_TAIL {
            let found = extension[8..].iter().map(|b| format!("{b:02x}")).collect();
            let expected = "the GUID of PCM or IEEE float".into();
            return Err(wrong("sub-format", tag_at, found, expected));
        }
    }
    let (encoding, allowed): (_, &[u16]) = match tag {
        TAG_PCM if bits <= 8 => (Encoding::Unsigned, &[1]),
        TAG_PCM => (Encoding::Signed, &[2, 3, 4]),
        TAG_FLOAT => (Encoding::Float, &[4, 8]),
        _ => {
            let expected = "1 (PCM) or 3 (IEEE float)".into();
            return Err(wrong("codec", tag_at, codec(tag), expected));
        }
    };
    let bytes = bits.div_ceil(8);
    if !allowed.contains(&bytes) || (encoding == Encoding::Float && !bits.is_multiple_of(8)) {
        let expected = match encoding {
            Encoding::Float => "32 or 64 for floats",
            _ => "1 to 32 for integers",
        };
        return Err(wrong(
            "bits per sample",
            14,
            bits.to_string(),
            expected.into(),
        ));
    }
    if u32::from(block_align) != u32::from(channels) * u32::from(bytes) {
        let expected = format!(
            "{} for {channels} channels of {bits} bits",
            u32::from(channels) * u32::from(bytes)
        );
        return Err(wrong(
            "bytes per frame",
            12,
            block_align.to_string(),
            expected,
        ));
    }
    if valid_bits > bytes * 8 || (encoding == Encoding::Float && valid_bits != bits) {
        let expected = format!("at most the {bits} bits per sample");
        return Err(wrong(
            "valid bits per sample",
            18,
            valid_bits.to_string(),
            expected,
        ));
    }
    Ok(Format {
        sample_rate,
        rate_offset: body + 4,
        channels,
        frame_bytes: usize::from(block_align),
        sample: SampleFormat {
            encoding,
            bytes: usize::from(bytes),
            valid_bits: u32::from(valid_bits),
        },
    })
}

/// Format tags of compressed codecs that turn up in WAV files; numbers from
/// memory of the public registry, only used in the message.
fn codec(tag: u16) -> String {
    let name = match tag {
        2 => "ADPCM",
        6 => "A-law",
        7 => "µ-law",
        0x11 => "IMA ADPCM",
        0x55 => "MPEG layer 3",
        _ => "unknown",
    };
    format!("{tag} ({name})")
}

fn finish(
    format: &Format,
    data_offset: u64,
    data_bytes: u64,
    sample_rate_hz: Option<f64>,
    mut warnings: Vec<String>,
) -> Result<Parsed, Error> {
    let sample_rate_hz = match sample_rate_hz {
        Some(rate) => {
            if rate != f64::from(format.sample_rate) {
                warnings.push(format!(
                    "sample rate {rate} Hz taken as given; the file says {} Hz",
                    format.sample_rate
                ));
            }
            rate
        }
        None if format.sample_rate == 0 => {
            return Err(Error::Header {
                field: "sample rate",
                offset: format.rate_offset,
                found: "0 Hz".into(),
                expected: "at least 1 Hz".into(),
            });
        }
        None => f64::from(format.sample_rate),
    };
    let frame_bytes = format.frame_bytes;
    let frames = data_bytes / frame_bytes as u64;
    let rest = data_bytes % frame_bytes as u64;
    if frames == 0 {
        return Err(Error::NoSamples {
            found_bytes: data_bytes,
            frame_bytes,
        });
    }
    if rest != 0 {
        warnings.push(format!(
            "the data end in the middle of a frame; its {rest} of {frame_bytes} bytes were dropped"
        ));
    }
    Ok(Parsed {
        layout: Layout {
            data_offset,
            frames,
            frame_bytes,
            format: format.sample,
            skipped_columns: 0,
        },
        sample_rate_hz,
        origins: vec![Origin::default(); usize::from(format.channels)],
        warnings,
    })
}

/// The length of the samples: what the header says where that can be true,
/// else what is there.
fn data_length(
    header: &Header<'_>,
    family: Family,
    chunk: &Chunk,
    sizes64: &Sizes64,
    warnings: &mut Vec<String>,
) -> Result<u64, Error> {
    let there = header.bytes.saturating_sub(chunk.body);
    let Some(stated) = chunk.stated else {
        warnings.push(format!(
            "the header leaves the length of the data open; read to the end of the file ({there} bytes)"
        ));
        return Ok(there);
    };
    if stated > there {
        warnings.push(format!(
            "the header states {stated} bytes of data but the file ends after {there}; read what is there"
        ));
        return Ok(there);
    }
    let behind = || chunks_follow(header, family, chunk.body, stated, sizes64);
    if stated == 0 && there > 0 && (!complete(header, family)? || !behind()) {
        warnings.push(format!(
            "the header states no data but {there} bytes follow (the recorder was not stopped properly); read them all"
        ));
        return Ok(there);
    }
    // A recorder that runs on past 4 GiB with a 32-bit counter.
    let wrap = 1u64 << 32;
    if family == Family::Riff && there >= wrap && (there - stated).is_multiple_of(wrap) {
        warnings.push(format!(
            "the header states {stated} bytes of data, {there} follow (its 32-bit length has wrapped round); read them all"
        ));
        return Ok(there);
    }
    // Less than a chunk's header behind the data is padding, not worth a doubt.
    if there - stated >= family.head_bytes() && !behind() {
        warnings.push(format!(
            "the header states {stated} bytes of data but {there} follow, with no chunk behind the stated ones; read them all"
        ));
        return Ok(there);
    }
    Ok(stated)
}

/// Whether the file goes on from the end of the data with chunks that fit into it, up to its end.
/// Samples that look like that are too rare to reckon with.
fn chunks_follow(
    header: &Header<'_>,
    family: Family,
    mut body: u64,
    mut stated: u64,
    sizes64: &Sizes64,
) -> bool {
    let head = family.head_bytes();
    let fits = |at: u64| {
        let chunk = chunk(header, family, at, sizes64).ok()?;
        let size = chunk.stated?;
        // The GUIDs of a W64 need not be letters; its sizes of 64 bits are telling enough.
        let named = family == Family::W64 || chunk.id.iter().all(|c| matches!(c, b' '..=b'~'));
        (named && size <= header.bytes.saturating_sub(chunk.body)).then_some((chunk.body, size))
    };
    for n in 0..MAX_CHUNKS {
        // both fit into the file
        let end = body + stated;
        let padded = end.next_multiple_of(family.alignment());
        if n > 0 && end + head > header.bytes {
            return true;
        }
        // Some recorders forget to pad.
        match fits(padded).or_else(|| fits(end)) {
            Some(next) => (body, stated) = next,
            None => return false,
        }
    }
    true
}

/// Whether the outermost length agrees with the file, that is, the recorder
/// came to finish the header.
fn complete(header: &Header<'_>, family: Family) -> Result<bool, Error> {
    let stated = match family {
        Family::Riff => {
            let size: [u8; 4] = header.take(4, "the RIFF size")?;
            u64::from(le_u32(&size)) + 8
        }
        // ds64 must come first; where it does not the answer is "no" by chance
        Family::Rf64 => {
            let size: [u8; 8] = header.take(20, "the RF64 size")?;
            le_u64(&size).saturating_add(8)
        }
        Family::W64 => {
            let size: [u8; 8] = header.take(16, "the W64 size")?;
            le_u64(&size)
        }
    };
    Ok(stated == header.bytes)
}

fn le_u16(bytes: &[u8]) -> u16 {
    u16::from_le_bytes([bytes[0], bytes[1]])
}

fn le_u32(bytes: &[u8]) -> u32 {
    u32::from_le_bytes([bytes[0], bytes[1], bytes[2], bytes[3]])
}

fn le_u64(bytes: &[u8]) -> u64 {
    let mut value = [0u8; 8];
    value.copy_from_slice(&bytes[..8]);
    u64::from_le_bytes(value)
}
