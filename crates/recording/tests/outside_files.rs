//! Files of other people's writers (soundfile 0.14.0 on libsndfile 1.2.2, scipy
//! 1.17.1), made by tests/outside/make_wav_files.py, against the values
//! soundfile reads.
#![allow(clippy::unwrap_used, missing_docs)]

use std::fs::{self, File};
use std::path::{Path, PathBuf};

use shaftwise_recording::{Encoding, OpenOptions, Recording};

const KINDS: [(&str, Encoding, usize); 6] = [
    ("PCM_U8", Encoding::Unsigned, 1),
    ("PCM_16", Encoding::Signed, 2),
    ("PCM_24", Encoding::Signed, 3),
    ("PCM_32", Encoding::Signed, 4),
    ("FLOAT", Encoding::Float, 4),
    ("DOUBLE", Encoding::Float, 8),
];

fn data(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("tests/data")
        .join(name)
}

/// The expected values, one vector per channel.
fn expected(kind: &str) -> Vec<Vec<f64>> {
    let text = fs::read_to_string(data(&format!("{kind}.csv"))).unwrap();
    let mut columns = vec![Vec::new(); 3];
    for line in text.lines() {
        for (column, field) in columns.iter_mut().zip(line.split(',')) {
            column.push(field.parse().unwrap());
        }
    }
    columns
}

fn all(recording: &Recording) -> Vec<Vec<f64>> {
    let channels: Vec<usize> = (0..recording.channels().len()).collect();
    let mut out = vec![Vec::new(); channels.len()];
    let frames = recording.frames();
    let read = recording
        .read(0, usize::MAX, &channels, &mut Vec::new(), &mut out)
        .unwrap();
    assert_eq!(read as u64, frames);
    out
}

#[test]
fn every_kind_of_file_reads_as_soundfile_reads_it() {
    let mut files = 0;
    for (kind, encoding, bytes) in KINDS {
        let expected = expected(kind);
        for writer in ["WAV.wav", "WAVEX.wav", "RF64.wav", "W64.w64", "scipy.wav"] {
            let path = data(&format!("{kind}_{writer}"));
            if !path.exists() {
                assert_eq!(
                    (kind, writer),
                    ("PCM_24", "scipy.wav"),
                    "scipy writes no 24 bits"
                );
                continue;
            }
            let recording = Recording::open(&path, &OpenOptions::default()).unwrap();
            let format = recording.sample_format();
            assert_eq!(
                (format.encoding, format.bytes),
                (encoding, bytes),
                "{path:?}"
            );
            assert_eq!(recording.sample_rate_hz(), 51_200.0);
            assert_eq!(recording.warnings(), &[] as &[String], "{path:?}");
            assert_eq!(all(&recording), expected, "{path:?}");

            let name = recording.name().to_owned();
            let spooled =
                Recording::from_reader(File::open(&path).unwrap(), &name, &OpenOptions::default())
                    .unwrap();
            assert_eq!(all(&spooled), expected, "{path:?} from a stream");
            files += 1;
        }
    }
    assert_eq!(files, 29);
}

#[test]
fn any_position_size_and_choice_of_channels_gives_the_same_bits() {
    for (kind, ..) in KINDS {
        let expected = expected(kind);
        let path = data(&format!("{kind}_WAV.wav"));
        let recording = Recording::open(&path, &OpenOptions::default()).unwrap();
        let mut scratch = vec![0xAA; 5]; // dirty
        for step in [1, 2, 3, 7, 64, 100, 101, 1000] {
            let mut out = vec![vec![7.0], vec![7.0], vec![7.0]];
            for first in (0..101).step_by(step) {
                recording
                    .read(first, step, &[2, 0, 2], &mut scratch, &mut out)
                    .unwrap();
            }
            for (values, channel) in out.iter().zip([2, 0, 2]) {
                assert_eq!(values[0], 7.0, "decoding appends");
                assert_eq!(values[1..], expected[channel], "{kind} by {step}");
            }
        }
        assert_eq!(recording.read_raw(101, 1, &mut scratch).unwrap(), 0);
        assert_eq!(
            recording
                .read_raw(u64::MAX, usize::MAX, &mut scratch)
                .unwrap(),
            0
        );
        assert!(scratch.is_empty());
    }
}
