//! Writes four small WAV files of floats into a folder, to be read back with
//! other people's readers (tests/outside/make_wav_files.py).
//!
//! Frame `n` of channel `c` holds, with `k = (7919 n + 104729 c) mod 65536`,
//! the value `3 k / 65536 - 1.5` in 32 bits and `(k - 30000) / 3` in 64 bits.

use std::error::Error;
use std::fs::File;
use std::io::BufWriter;
use std::path::PathBuf;

use shaftwise_recording::{FloatWidth, WavConfig, WavWriter};

const FRAMES: u64 = 1000;

fn main() -> Result<(), Box<dyn Error>> {
    let folder = std::env::args_os()
        .nth(1)
        .map(PathBuf::from)
        .ok_or("usage: write_wav FOLDER")?;
    for (channels, bits) in [(1, 32), (2, 64), (5, 32), (3, 64)] {
        let width = if bits == 32 {
            FloatWidth::F32
        } else {
            FloatWidth::F64
        };
        let config = WavConfig {
            channels,
            sample_rate_hz: 48_000.0,
            frames: FRAMES,
            width,
        };
        let planar: Vec<Vec<f64>> = (0..channels as u64)
            .map(|c| (0..FRAMES).map(|n| value(n, c, width)).collect())
            .collect();
        let file = File::create(folder.join(format!("{channels}_{bits}.wav")))?;
        let mut writer = WavWriter::new(BufWriter::new(file), &config)?;
        writer.write_planar(&planar)?;
        writer.finish()?;
    }
    Ok(())
}

fn value(n: u64, c: u64, width: FloatWidth) -> f64 {
    let k = ((n * 7919 + c * 104_729) % 65_536) as f64;
    match width {
        FloatWidth::F32 => k / 65_536.0 * 3.0 - 1.5,
        FloatWidth::F64 => (k - 30_000.0) / 3.0,
    }
}
