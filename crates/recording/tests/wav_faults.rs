//! WAV headers that lie, end early or make no sense, long files, hashes.
#![allow(clippy::unwrap_used, missing_docs)]

use std::fs::{self, File};
use std::io::{Seek, SeekFrom, Write};

use sha2::{Digest, Sha256};
use shaftwise_recording::{
    ChannelSetup, Error, FloatWidth, HashParts, OpenOptions, Quantity, Recording, WavConfig,
    WavWriter,
};

/// A RIFF file of 16-bit integers with a LIST chunk of odd length before the
/// samples.
struct Wav {
    channels: u16,
    rate: u32,
    block_align: Option<u16>,
    bits: u16,
    tag: u16,
    riff_size: Option<u32>,
    data_size: Option<u32>,
    data: Vec<u8>,
    after: Vec<u8>,
}

fn wav(channels: u16, frames: u16) -> Wav {
    let samples = (0..frames).flat_map(|n| {
        (0..channels).map(move |c| n.wrapping_mul(100).wrapping_add(c).cast_signed())
    });
    Wav {
        channels,
        rate: 1000,
        block_align: None,
        bits: 16,
        tag: 1,
        riff_size: None,
        data_size: None,
        data: samples.flat_map(i16::to_le_bytes).collect(),
        after: Vec::new(),
    }
}

impl Wav {
    fn bytes(&self) -> Vec<u8> {
        let mut b = b"RIFF....WAVELIST\x05\0\0\0INFOx\0fmt \x10\0\0\0".to_vec();
        b.extend(self.tag.to_le_bytes());
        b.extend(self.channels.to_le_bytes());
        b.extend(self.rate.to_le_bytes());
        b.extend(0u32.to_le_bytes()); // bytes per second: often wrong, never used
        let align = self.channels.wrapping_mul(self.bits.div_ceil(8));
        b.extend(self.block_align.unwrap_or(align).to_le_bytes());
        b.extend(self.bits.to_le_bytes());
        b.extend(b"data");
        b.extend(
            self.data_size
                .unwrap_or(self.data.len() as u32)
                .to_le_bytes(),
        );
        b.extend(&self.data);
        b.extend(&self.after);
        let size = self.riff_size.unwrap_or(b.len() as u32 - 8);
        b[4..8].copy_from_slice(&size.to_le_bytes());
        b
    }
}

fn open(bytes: &[u8]) -> Result<Recording, Error> {
    Recording::from_reader(bytes, "test.wav", &OpenOptions::default())
}

fn values(recording: &Recording, channel: usize) -> Vec<f64> {
    let mut out = [Vec::new()];
    recording
        .read(0, usize::MAX, &[channel], &mut Vec::new(), &mut out)
        .unwrap();
    let [values] = out;
    values
}

/// The error of `bytes`, which must mention all of `words`.
fn refused(bytes: &[u8], words: &[&str]) {
    let error = open(bytes).unwrap_err().to_string();
    for word in words {
        assert!(error.contains(word), "{word:?} is missing in: {error}");
    }
}

fn warned(bytes: &[u8], frames: u64, word: &str) {
    let recording = open(bytes).unwrap();
    assert_eq!(recording.frames(), frames);
    let warnings = recording.warnings().join("\n");
    assert!(
        warnings.contains(word),
        "{word:?} is missing in: {warnings}"
    );
    assert_eq!(values(&recording, 0).len() as u64, frames);
}

#[test]
fn a_sound_file_raises_no_warning() {
    let recording = open(&wav(2, 5).bytes()).unwrap();
    assert_eq!(recording.warnings(), &[] as &[String]);
    assert_eq!(values(&recording, 1)[4], 401.0 / 32768.0);
    assert_eq!(recording.channels()[1].unit, "FS");
    assert_eq!(recording.channels()[1].full_scale, Some(1.0));
}

#[test]
fn two_hundred_channels_are_no_trouble() {
    let recording = open(&wav(200, 9).bytes()).unwrap();
    assert_eq!(recording.channels().len(), 200);
    assert_eq!(values(&recording, 199)[8], 999.0 / 32768.0);
}

#[test]
fn nothing_and_next_to_nothing_are_refused() {
    assert!(matches!(open(b""), Err(Error::Empty)));
    let whole = wav(2, 5).bytes();
    let data = whole.len() - 20;
    for length in 4..data - 8 {
        assert!(open(&whole[..length]).is_err(), "{length} bytes");
    }
    refused(&whole[..10], &["byte 8", "WAVE", "2 bytes"]);
    refused(&whole[..46], &["byte 34", "fmt", "12 bytes"]);
    refused(&whole[..data], &["no samples", "4 bytes"]);
    refused(&whole[..data - 8], &["no data chunk"]);
}

#[test]
fn headers_that_make_no_sense_say_where_and_what() {
    refused(
        &Wav {
            rate: 0,
            ..wav(1, 5)
        }
        .bytes(),
        &["sample rate at byte 38 is 0 Hz"],
    );
    refused(
        &Wav {
            channels: 0,
            ..wav(1, 5)
        }
        .bytes(),
        &["channels at byte 36 is 0", "1 to 1024"],
    );
    refused(
        &Wav {
            channels: 1025,
            ..wav(1, 5)
        }
        .bytes(),
        &["1025", "1 to 1024"],
    );
    refused(
        &Wav {
            block_align: Some(6),
            ..wav(2, 5)
        }
        .bytes(),
        &[
            "bytes per frame at byte 46 is 6",
            "4 for 2 channels of 16 bits",
        ],
    );
    refused(
        &Wav {
            tag: 2,
            ..wav(1, 5)
        }
        .bytes(),
        &["byte 34", "2 (ADPCM)"],
    );
    refused(
        &Wav {
            tag: 999,
            ..wav(1, 5)
        }
        .bytes(),
        &["999 (unknown)"],
    );
    refused(
        &Wav {
            bits: 40,
            ..wav(1, 5)
        }
        .bytes(),
        &["bits per sample", "40"],
    );
    refused(
        &Wav {
            bits: 0,
            ..wav(1, 5)
        }
        .bytes(),
        &["bits per sample", "0"],
    );
    refused(
        &Wav {
            tag: 3,
            ..wav(1, 5)
        }
        .bytes(),
        &["bits per sample", "16", "32 or 64"],
    );
    refused(b"RIFX\0\0\0\0WAVE", &["RIFX", "little-endian"]);
    refused(b"RIFF\x10\0\0\0AVI LIST", &["byte 8", "AVI", "WAVE"]);
}

#[test]
fn text_in_the_clothes_of_a_wav_is_seen_through() {
    refused(
        b"<html>404 not found</html>\n",
        &["named like a WAV", "<html>404"],
    );
    refused(
        b"RIFF is not a good start for a letter",
        &["form type at byte 8"],
    );
    let numbers = b"time,a\n0.0,1\n0.1,2\n0.2,3\n";
    let recording = open(numbers).unwrap();
    assert!(recording.warnings()[0].contains("holds text"));
    assert!(matches!(
        open(b"\x7fELF\x02\x01\0\0"),
        Err(Error::UnknownFormat { .. })
    ));
}

#[test]
fn a_data_length_that_lies_is_read_as_far_as_it_goes() {
    let sound = wav(2, 5);
    warned(
        &Wav {
            data_size: Some(4000),
            ..wav(2, 5)
        }
        .bytes(),
        5,
        "states 4000 bytes",
    );
    warned(
        &Wav {
            data_size: Some(u32::MAX),
            ..wav(2, 5)
        }
        .bytes(),
        5,
        "open",
    );
    let crashed = Wav {
        data_size: Some(0),
        riff_size: Some(0),
        ..wav(2, 5)
    };
    warned(&crashed.bytes(), 5, "not stopped properly");
    let bytes = sound.bytes();
    warned(&bytes[..bytes.len() - 1], 4, "3 of 4 bytes");
    // an empty recording properly closed, with a chunk behind, has no samples
    let empty = Wav {
        after: b"LIST\x04\0\0\0INFO".to_vec(),
        ..wav(2, 0)
    };
    refused(&empty.bytes(), &["no samples"]);
}

#[test]
fn a_data_length_that_is_short_is_believed_only_with_chunks_behind() {
    let lying = |data_size, after: &[u8]| Wav {
        data_size: Some(data_size),
        after: after.to_vec(),
        ..wav(2, 5)
    };
    warned(&lying(8, b"").bytes(), 5, "states 8 bytes of data but 20");
    // the outermost length may be right, the data are there all the same
    warned(&lying(0, b"").bytes(), 5, "not stopped properly");
    // letters, but a size beyond the end of the file
    warned(
        &lying(20, b"LIST\xff\0\0\0INFO").bytes(),
        8,
        "20 bytes of data but 32",
    );
    for behind in [
        &b"LIST\x04\0\0\0INFO"[..],
        b"LIST\x05\0\0\0INFOx\0id3 \0\0\0\0",
        b"LIST\x05\0\0\0INFOxid3 \0\0\0\0",
        b"LIST\x04\0\0\0INFO\0\0",
        b"\0\0\0",
    ] {
        let recording = open(&lying(20, behind).bytes()).unwrap();
        assert_eq!(recording.frames(), 5, "{behind:?}");
        assert_eq!(recording.warnings(), &[] as &[String], "{behind:?}");
    }
}

#[test]
fn chunks_without_end_do_not_take_for_ever() {
    let mut bytes = b"RIFF\xff\xff\xff\xffWAVE".to_vec();
    bytes.extend(b"junk\0\0\0\0".repeat(20_000));
    refused(&bytes, &["no fmt chunk"]);
    refused(
        b"RIFF\xff\xff\xff\xffWAVEjunk\xff\xff\xff\xff",
        &["chunk size", "open"],
    );
}

#[test]
fn twenty_four_bits_in_thirty_two_keep_their_scale() {
    let mut bytes = b"RIFF\0\0\0\0WAVEfmt \x28\0\0\0\xfe\xff\x01\0\xe8\x03\0\0\0\0\0\0\x04\0\x20\0\x16\0\x18\0\0\0\0\0\x01\0\0\0\0\0\x10\0\x80\0\0\xaa\0\x38\x9b\x71data\x08\0\0\0".to_vec();
    bytes.extend([0, 0, 0, 0x80, 0, 0, 0, 0x40]);
    let recording = open(&bytes).unwrap();
    assert_eq!(values(&recording, 0), [-1.0, 0.5]);
    assert_eq!(recording.sample_format().step(), Some(2f64.powi(-23)));
    // another GUID is another codec
    bytes[50] = 9;
    refused(&bytes, &["sub-format at byte 44"]);
}

#[test]
fn sizes_in_the_table_of_a_ds64_are_used() {
    let mut bytes = b"BW64\xff\xff\xff\xffWAVEds64\x28\0\0\0".to_vec();
    bytes.extend(0u64.to_le_bytes());
    bytes.extend(4u64.to_le_bytes());
    bytes.extend(2u64.to_le_bytes());
    bytes.extend(1u32.to_le_bytes());
    bytes.extend(b"big \x03\0\0\0\0\0\0\0");
    bytes.extend(b"big \xff\xff\xff\xffabc\0");
    bytes.extend(b"fmt \x10\0\0\0\x01\0\x01\0\xe8\x03\0\0\0\0\0\0\x02\0\x10\0");
    bytes.extend(b"data\xff\xff\xff\xff\0\x40\0\xc0\0\0");
    let recording = open(&bytes).unwrap();
    assert_eq!(values(&recording, 0), [0.5, -0.5]);
}

#[test]
fn positions_beyond_four_gib_are_read() {
    let frames = 1_500_000_000u64;
    let folder = tempfile::tempdir().unwrap();
    let samples = [[0.25, -0.5, 0.125], [1.0, 2.0, 3.0]];

    // Our own RF64 header, then a hole.
    let path = folder.path().join("long.wav");
    let mut file = File::create(&path).unwrap();
    let config = WavConfig {
        channels: 2,
        sample_rate_hz: 51_200.0,
        frames,
        width: FloatWidth::F32,
    };
    let error = WavWriter::new(&mut file, &config)
        .unwrap()
        .finish()
        .unwrap_err();
    assert!(
        error.to_string().contains("1500000000 announced"),
        "{error}"
    );
    sparse_tail(&mut file, frames, 8, &samples);
    check_tail(
        &Recording::open(&path, &OpenOptions::default()).unwrap(),
        frames,
        &samples,
    );

    // A W64 with the header of the small one and its sizes changed.
    let small = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/data/FLOAT_W64.w64");
    let mut header = fs::read(small).unwrap();
    let data = header.windows(4).position(|w| w == b"data").unwrap();
    header.truncate(data + 24);
    let length = frames * 12;
    header[16..24].copy_from_slice(&(data as u64 + 24 + length).to_le_bytes());
    header[data + 16..].copy_from_slice(&(24 + length).to_le_bytes());
    let path = folder.path().join("long.w64");
    let mut file = File::create(&path).unwrap();
    file.write_all(&header).unwrap();
    let samples = [[0.25, -0.5, 0.125], [1.0, 2.0, 3.0], [-1.0, -2.0, -3.0]];
    sparse_tail(&mut file, frames, 12, &samples);
    check_tail(
        &Recording::open(&path, &OpenOptions::default()).unwrap(),
        frames,
        &samples,
    );

    // A recorder whose 32-bit length has wrapped round.
    let path = folder.path().join("wrapped.wav");
    let mut file = File::create(&path).unwrap();
    let wrapped = Wav {
        data_size: Some(88),
        data: vec![0; 88],
        ..wav(1, 0)
    };
    file.write_all(&wrapped.bytes()).unwrap();
    let end = file.stream_position().unwrap();
    file.set_len(end + (1 << 32)).unwrap();
    let recording = Recording::open(&path, &OpenOptions::default()).unwrap();
    assert_eq!(recording.frames(), (88 + (1 << 32)) / 2);
    assert!(recording.warnings()[0].contains("wrapped"));
}

/// Leaves a hole up to the last three frames and writes those.
fn sparse_tail(file: &mut File, frames: u64, frame_bytes: u64, channels: &[[f64; 3]]) {
    let start = file.stream_position().unwrap();
    file.seek(SeekFrom::Start(start + (frames - 3) * frame_bytes))
        .unwrap();
    for frame in 0..3 {
        for channel in channels {
            file.write_all(&(channel[frame] as f32).to_le_bytes())
                .unwrap();
        }
    }
}

fn check_tail(recording: &Recording, frames: u64, samples: &[[f64; 3]]) {
    assert_eq!(recording.warnings(), &[] as &[String]);
    assert_eq!(recording.frames(), frames);
    let channels: Vec<usize> = (0..samples.len()).collect();
    let mut out = vec![Vec::new(); samples.len()];
    let read = recording
        .read(frames - 4, 10, &channels, &mut Vec::new(), &mut out)
        .unwrap();
    assert_eq!(read, 4);
    for (values, expected) in out.iter().zip(samples) {
        assert_eq!(values[0], 0.0, "the hole");
        assert_eq!(values[1..], *expected);
    }
}

#[test]
fn written_files_read_back() {
    for (channels, width) in [
        (1, FloatWidth::F64),
        (2, FloatWidth::F32),
        (7, FloatWidth::F64),
    ] {
        // not a multiple of the block of the encoder
        let planar: Vec<Vec<f64>> = (0..channels)
            .map(|c| {
                (0..10_000)
                    .map(|n| f64::from(n * 7 + c) / 8192.0 - 3.0)
                    .collect()
            })
            .collect();
        let config = WavConfig {
            channels: channels as usize,
            sample_rate_hz: 25_600.0,
            frames: 10_000,
            width,
        };
        let mut writer = WavWriter::new(Vec::new(), &config).unwrap();
        for split in [0..1, 1..1, 1..5000, 5000..10_000] {
            let part: Vec<&[f64]> = planar.iter().map(|values| &values[split.clone()]).collect();
            writer.write_planar(&part).unwrap();
        }
        let bytes = writer.finish().unwrap();
        let recording = open(&bytes).unwrap();
        assert_eq!(recording.warnings(), &[] as &[String]);
        assert_eq!(recording.sample_rate_hz(), 25_600.0);
        for (c, expected) in planar.iter().enumerate() {
            assert_eq!(values(&recording, c), *expected);
        }
    }
}

#[test]
fn the_writer_refuses_what_it_cannot_keep() {
    let config = WavConfig {
        channels: 2,
        sample_rate_hz: 1000.0,
        frames: 3,
        width: FloatWidth::F32,
    };
    let mut writer = WavWriter::new(Vec::new(), &config).unwrap();
    assert!(writer.write_planar(&[&[0.0][..]]).is_err());
    assert!(writer.write_planar(&[&[0.0][..], &[]]).is_err());
    assert!(writer.write_planar(&[&[0.0; 4][..], &[0.0; 4]]).is_err());
    for sample_rate_hz in [0.0, 0.5, f64::NAN, 1e10, -1.0] {
        assert!(
            WavWriter::new(
                Vec::new(),
                &WavConfig {
                    sample_rate_hz,
                    ..config
                }
            )
            .is_err()
        );
    }
    assert!(
        WavWriter::new(
            Vec::new(),
            &WavConfig {
                channels: 0,
                ..config
            }
        )
        .is_err()
    );
    assert!(
        WavWriter::new(
            Vec::new(),
            &WavConfig {
                frames: u64::MAX,
                ..config
            }
        )
        .is_err()
    );
}

#[test]
fn the_hash_is_that_of_the_file_however_it_is_fed() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("a.wav");
    // a partial frame and a chunk behind the samples belong to the file, too
    let bytes = Wav {
        after: b"LIST\x04\0\0\0INFO".to_vec(),
        data_size: Some(29_999),
        ..wav(3, 5000)
    }
    .bytes();
    fs::write(&path, &bytes).unwrap();
    let expected: String = Sha256::digest(&bytes)
        .iter()
        .map(|b| format!("{b:02x}"))
        .collect();
    let recording = Recording::open(&path, &OpenOptions::default()).unwrap();
    assert_eq!(recording.frames(), 4999);
    for (step, up_to) in [(1, 50), (1000, 5000), (4999, 4999), (777, 3000)] {
        let HashParts::Sequential(mut hasher) = recording.hash_parts().unwrap() else {
            panic!("a file is hashed while it is read");
        };
        let mut raw = Vec::new();
        for first in (0..up_to).step_by(step) {
            recording.read_raw(first, step, &mut raw).unwrap();
            hasher.update(&raw);
        }
        assert_eq!(hasher.finish().unwrap(), expected);
    }
    for bytes in [&bytes[..], b"time a\n0 1\n1e-3 2\n2e-3 3\n"] {
        let expected: String = Sha256::digest(bytes)
            .iter()
            .map(|b| format!("{b:02x}"))
            .collect();
        let HashParts::Taken(hash) = open(bytes).unwrap().hash_parts().unwrap() else {
            panic!("a stream is hashed while it is spooled");
        };
        assert_eq!(hash, expected);
    }
}

#[test]
fn a_file_that_shrinks_gives_a_short_count() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("a.wav");
    fs::write(&path, wav(1, 1000).bytes()).unwrap();
    let recording = Recording::open(&path, &OpenOptions::default()).unwrap();
    let length = fs::metadata(&path).unwrap().len();
    File::options()
        .write(true)
        .open(&path)
        .unwrap()
        .set_len(length - 501)
        .unwrap();
    let mut raw = Vec::new();
    assert_eq!(recording.frames(), 1000);
    assert_eq!(recording.read_raw(700, 200, &mut raw).unwrap(), 49);
    assert_eq!(raw.len(), 98);
    assert_eq!(recording.read_raw(900, 200, &mut raw).unwrap(), 0);
}

#[test]
fn a_folder_and_a_missing_file_are_named_as_such() {
    let folder = tempfile::tempdir().unwrap();
    let options = OpenOptions::default();
    assert!(matches!(
        Recording::open(folder.path(), &options),
        Err(Error::Directory)
    ));
    let missing = Recording::open(&folder.path().join("none.wav"), &options).unwrap_err();
    assert!(matches!(missing, Error::Io { .. }));
    assert!(missing.to_string().contains("open the recording"));
}

fn set_up(setup: ChannelSetup) -> Result<Recording, Error> {
    let options = OpenOptions {
        channels: vec![setup],
        ..OpenOptions::default()
    };
    Recording::from_reader(&wav(2, 5).bytes()[..], "a.wav", &options)
}

fn text(text: &str) -> String {
    text.to_owned()
}

#[test]
fn calibration_reaches_the_shown_unit() {
    let stored = 401.0 / 32768.0;
    let calibrated = |setup: ChannelSetup| {
        let recording = set_up(ChannelSetup { number: 2, ..setup }).unwrap();
        let channel = recording.channels()[1].clone();
        (values(&recording, 1)[4], channel)
    };

    // 100 mV/g on a ±5 V input: full scale is 50 g.
    let (value, channel) = calibrated(ChannelSetup {
        quantity: Some(Quantity::Acceleration),
        unit: Some(text("g")),
        mv_per_unit: Some(100.0),
        range_v: Some(5.0),
        name: Some(text("P-3 DE")),
        ..ChannelSetup::default()
    });
    // product of three rounded factors: 4 eps
    approx::assert_relative_eq!(value, stored * 50.0 * 9.80665, max_relative = 1e-15);
    approx::assert_relative_eq!(channel.full_scale.unwrap(), 490.3325, max_relative = 1e-15);
    assert_eq!(
        (channel.unit.as_str(), channel.name.as_str()),
        ("m/s²", "P-3 DE")
    );

    let (value, channel) = calibrated(ChannelSetup {
        unit: Some(text("in/s")),
        factor: Some(-2.0),
        ..ChannelSetup::default()
    });
    approx::assert_relative_eq!(value, -stored * 50.8, max_relative = 1e-15);
    assert_eq!(
        (channel.quantity, channel.unit.as_str()),
        (Quantity::Velocity, "mm/s")
    );
    approx::assert_relative_eq!(channel.full_scale.unwrap(), 50.8, max_relative = 1e-15);

    let (value, channel) = calibrated(ChannelSetup {
        range_v: Some(10.0),
        ..ChannelSetup::default()
    });
    assert_eq!((value, channel.unit.as_str()), (stored * 10.0, "V"));

    let (value, channel) = calibrated(ChannelSetup {
        factor: Some(3.0),
        ..ChannelSetup::default()
    });
    assert_eq!((value, channel.unit.as_str()), (stored * 3.0, "unit"));

    let (_, channel) = calibrated(ChannelSetup {
        unit: Some(text("furlong")),
        factor: Some(1.0),
        ..ChannelSetup::default()
    });
    assert_eq!(
        (channel.quantity, channel.unit.as_str()),
        (Quantity::Other, "furlong")
    );

    let (value, channel) = calibrated(ChannelSetup {
        unit: Some(text("K")),
        factor: Some(1000.0),
        ..ChannelSetup::default()
    });
    approx::assert_relative_eq!(value, stored * 1000.0 - 273.15, max_relative = 1e-14);
    assert_eq!(channel.unit, "°C");
}

#[test]
fn settings_that_cannot_be_are_refused() {
    let refused = |setup: ChannelSetup, words: &[&str]| {
        let error = set_up(setup).unwrap_err().to_string();
        for word in words {
            assert!(error.contains(word), "{word:?} is missing in: {error}");
        }
    };
    let two = || ChannelSetup {
        number: 2,
        ..ChannelSetup::default()
    };
    refused(ChannelSetup::default(), &["channel number is 0", "1 to 2"]);
    refused(
        ChannelSetup { number: 3, ..two() },
        &["channel number is 3", "1 to 2"],
    );
    refused(
        ChannelSetup {
            factor: Some(0.0),
            ..two()
        },
        &["factor of channel 2", "other than 0"],
    );
    refused(
        ChannelSetup {
            factor: Some(f64::NAN),
            ..two()
        },
        &["factor of channel 2", "NaN"],
    );
    refused(
        ChannelSetup {
            mv_per_unit: Some(f64::INFINITY),
            ..two()
        },
        &["mv_per_unit"],
    );
    refused(
        ChannelSetup {
            mv_per_unit: Some(100.0),
            ..two()
        },
        &["range_v of channel 2", "missing"],
    );
    refused(
        ChannelSetup {
            range_v: Some(-1.0),
            ..two()
        },
        &["range_v", "positive"],
    );
    refused(
        ChannelSetup {
            factor: Some(1.0),
            range_v: Some(1.0),
            ..two()
        },
        &["either factor, or mv_per_unit"],
    );
    refused(
        ChannelSetup {
            quantity: Some(Quantity::Velocity),
            unit: Some(text("g")),
            ..two()
        },
        &["unit g", "velocity", "mm/s"],
    );
    refused(
        ChannelSetup {
            quantity: Some(Quantity::Velocity),
            range_v: Some(1.0),
            ..two()
        },
        &["mv_per_unit of channel 2", "missing"],
    );
    let twice = OpenOptions {
        channels: vec![two(), two()],
        ..OpenOptions::default()
    };
    assert!(Recording::from_reader(&wav(2, 5).bytes()[..], "a", &twice).is_err());
    for rate in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        let options = OpenOptions {
            sample_rate_hz: Some(rate),
            ..OpenOptions::default()
        };
        assert!(Recording::from_reader(&wav(2, 5).bytes()[..], "a", &options).is_err());
    }
}

#[test]
fn a_given_rate_stands_in_place_of_the_header() {
    let options = OpenOptions {
        sample_rate_hz: Some(51_200.0),
        ..OpenOptions::default()
    };
    let bytes = Wav {
        rate: 0,
        ..wav(1, 5)
    }
    .bytes();
    let recording = Recording::from_reader(&bytes[..], "a.wav", &options).unwrap();
    assert_eq!(recording.sample_rate_hz(), 51_200.0);
    assert!(recording.warnings()[0].contains("the file says 0 Hz"));
}
