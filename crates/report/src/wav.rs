use std::path::Path;

use shaftwise_recording::{FloatWidth, WavConfig, WavWriter};

use crate::Error;
use crate::batch::Batch;

/// Most frames asked for at a time.
const BLOCK: usize = 1 << 16;

/// Writes samples as a WAV of 32-bit floats, whole or not at all.
///
/// `next_block(n, channels)` is called until all `frames` are there; it must leave exactly `n`
/// samples in each channel's vector. There are as many channels as names; the format itself holds
/// no names.
///
/// # Errors
///
/// [`Error::Encode`] if the rate is not a whole number of Hz from 1, the number of channels not
/// 1 to 1024 or a block not of the length asked for; [`Error::File`] if the file cannot be written.
pub fn write_wav(
    path: &Path,
    sample_rate_hz: f64,
    channel_names: &[String],
    frames: u64,
    next_block: &mut dyn FnMut(usize, &mut [Vec<f64>]),
) -> Result<(), Error> {
    let folder = match path.parent() {
        Some(folder) if !folder.as_os_str().is_empty() => folder,
        _ => Path::new("."),
    };
    let Some(name) = path.file_name() else {
        return Err(Error::File {
            path: path.to_owned(),
            action: "write the file",
            source: std::io::ErrorKind::InvalidInput.into(),
        });
    };
    let config = WavConfig {
        channels: channel_names.len(),
        sample_rate_hz,
        frames,
        width: FloatWidth::F32,
    };
    let mut batch = Batch::new(folder);
    batch.stage(name, |sink| {
        let mut writer = WavWriter::new(sink, &config)?;
        let mut block = vec![Vec::new(); channel_names.len()];
        let mut left = frames;
        while left > 0 {
            let count = usize::try_from(left).map_or(BLOCK, |left| left.min(BLOCK));
            next_block(count, &mut block);
            if let Some(other) = block.iter().find(|c| c.len() != count) {
                return Err(shaftwise_recording::Error::Encode {
                    what: "WAV frames",
                    found: format!("a block of {}", other.len()),
                    expected: format!("{count}"),
                }
                .into());
            }
            writer.write_planar(&block)?;
            left -= count as u64;
        }
        writer.finish()?;
        Ok(())
    })?;
    batch.commit()?;
    Ok(())
}
