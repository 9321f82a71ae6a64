//! Whatever bytes come: an error or a recording that can be read, no panic, no
//! memory beyond what the bytes themselves call for.
#![allow(clippy::unwrap_used, missing_docs)]

use std::fs;
use std::path::Path;

use proptest::collection::vec;
use proptest::prelude::*;
use shaftwise_recording::{HashParts, OpenOptions, Recording};

/// Opens `bytes` as a stream and as a file; both must come to the same, and
/// what opens must be readable to its end.
fn survives(bytes: &[u8], sample_rate_hz: Option<f64>) {
    let options = OpenOptions {
        sample_rate_hz,
        ..OpenOptions::default()
    };
    let stream = Recording::from_reader(bytes, "x", &options);
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("x");
    fs::write(&path, bytes).unwrap();
    let file = Recording::open(&path, &options);
    match (stream, file) {
        (Ok(stream), Ok(file)) => {
            assert_eq!(read(&stream, bytes.len()), read(&file, bytes.len()));
            assert_eq!(hash(&stream), hash(&file));
            assert_eq!(stream.warnings(), file.warnings());
        }
        (Err(stream), Err(file)) => assert_eq!(stream.to_string(), file.to_string()),
        (stream, file) => panic!("stream {stream:?}, file {file:?}"),
    }
}

/// The bits of all values, for NaN must equal NaN here.
fn read(recording: &Recording, file_bytes: usize) -> Vec<Vec<u64>> {
    let channels: Vec<usize> = (0..recording.channels().len()).collect();
    let frames = recording.frames();
    // text takes two bytes at least for what the spool keeps in eight
    assert!(frames as usize * recording.frame_bytes() <= 4 * file_bytes + 8);
    let mut out = vec![Vec::new(); channels.len()];
    let mut raw = Vec::new();
    let read = recording
        .read(0, usize::MAX, &channels, &mut raw, &mut out)
        .unwrap();
    assert_eq!(read as u64, frames);
    for first in [0, 1, frames - 1, frames, frames + 1, u64::MAX] {
        recording.read_raw(first, 3, &mut raw).unwrap();
        assert!(raw.len() <= 3 * recording.frame_bytes());
    }
    let bits = |values: Vec<f64>| values.into_iter().map(f64::to_bits).collect();
    out.into_iter().map(bits).collect()
}

fn hash(recording: &Recording) -> String {
    match recording.hash_parts().unwrap() {
        HashParts::Taken(hash) => hash,
        HashParts::Sequential(hasher) => hasher.finish().unwrap(),
    }
}

fn small_file(name: &str) -> Vec<u8> {
    fs::read(
        Path::new(env!("CARGO_MANIFEST_DIR"))
            .join("tests/data")
            .join(name),
    )
    .unwrap()
}

/// A value that headers are likely to stumble over.
fn hard_byte() -> impl Strategy<Value = u8> {
    prop_oneof![
        Just(0),
        Just(1),
        Just(0x7f),
        Just(0x80),
        Just(0xff),
        any::<u8>()
    ]
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::with_cases(400) })]

    #[test]
    fn any_bytes(bytes in vec(any::<u8>(), 0..300), rate in proptest::option::of(1.0..1e6)) {
        survives(&bytes, rate);
    }

    #[test]
    fn any_bytes_behind_a_magic_word(
        magic in prop_oneof![Just("RIFF"), Just("RF64"), Just("BW64"), Just("riff")],
        chunks in vec((prop_oneof![Just("fmt "), Just("data"), Just("ds64"), Just("LIST")],
                       prop_oneof![Just(u32::MAX), 0u32..64, any::<u32>()],
                       vec(hard_byte(), 0..64)), 0..5),
    ) {
        let mut bytes = magic.as_bytes().to_vec();
        bytes.extend([0xff; 4]);
        bytes.extend(b"WAVE");
        for (id, size, body) in chunks {
            bytes.extend(id.as_bytes());
            bytes.extend(size.to_le_bytes());
            bytes.extend(body);
        }
        survives(&bytes, None);
    }

    #[test]
    fn mutated_wav_files(
        name in prop_oneof![Just("PCM_24_WAV.wav"), Just("PCM_U8_WAVEX.wav"), Just("FLOAT_WAV.wav"),
                            Just("PCM_16_RF64.wav"), Just("DOUBLE_W64.w64"), Just("PCM_32_scipy.wav")],
        changes in vec((0usize..200, hard_byte()), 0..6),
        cut in 0usize..1200,
    ) {
        let mut bytes = small_file(name);
        for (at, byte) in changes {
            bytes[at] = byte;
        }
        if cut > 100 {
            bytes.truncate(cut);
        }
        survives(&bytes, None);
    }

    #[test]
    fn text_of_any_kind(text in "([0-9a-zµ²#%eE+.,;: \"\t\r\n\\[\\]()-]){0,200}",
                        rate in proptest::option::of(1.0..1e6)) {
        survives(text.as_bytes(), rate);
    }

    #[test]
    fn mutated_tables(
        separator in prop_oneof![Just(","), Just(";"), Just("\t"), Just(" ")],
        rows in 1usize..30,
        changes in vec((0usize..400, any::<u8>()), 0..4),
        rate in proptest::option::of(1.0..1e6),
    ) {
        let mut text = ["time", "DE [m/s2]", "tach"].join(separator) + "\n";
        for n in 0..rows {
            text += &[format!("{}", n as f64 * 0.5), "1.5".into(), format!("{n}e-2")].join(separator);
            text += "\n";
        }
        let mut bytes = text.into_bytes();
        for (at, byte) in changes {
            let at = at % bytes.len();
            bytes[at] = byte;
        }
        survives(&bytes, rate);
    }

    #[test]
    fn what_csv_writes_is_read_back_to_the_same_bits(
        rows in vec((-1e30..1e30f64, proptest::num::f64::NORMAL), 1..40),
        rate in 1u32..1_000_000,
    ) {
        let (a, b): (Vec<f64>, Vec<f64>) = rows.into_iter().unzip();
        let time: Vec<f64> = (0..a.len()).map(|n| n as f64 / f64::from(rate)).collect();
        let mut bytes = Vec::new();
        shaftwise_recording::write_csv(&mut bytes, &[("time [s]", &time), ("a [Pa]", &a), ("b, c", &b)]).unwrap();
        let options = OpenOptions { sample_rate_hz: Some(f64::from(rate)), ..OpenOptions::default() };
        let recording = Recording::from_reader(&bytes[..], "x.csv", &options).unwrap();
        let bits = |values: &[f64]| values.iter().map(|v| v.to_bits()).collect::<Vec<_>>();
        prop_assert_eq!(read(&recording, bytes.len() + 100), vec![bits(&a), bits(&b)]);
    }
}
