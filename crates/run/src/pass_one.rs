//! Pass 1: the file's hash and the tach's edges, from one read.

use crate::{Control, Error, Progress};
use shaftwise_recording::{HashParts, Recording};
use shaftwise_rotation::{TachConfig, TachScan, TachScanner};
use std::sync::atomic::Ordering;
use std::sync::mpsc;

/// Frames in a buffer of about 2 MiB: large enough for the disk, small enough for the cache.
pub(crate) fn slab_frames(recording: &Recording) -> usize {
    ((2 << 20) / recording.frame_bytes().max(1)).clamp(1 << 10, 1 << 16)
}

/// What pass 1 found.
pub(crate) struct PassOne {
    pub(crate) sha256: String,
    pub(crate) scan: Option<TachScan>,
}

/// Reads the recording once. `tach` is the tach's channel, from 0, and how to read it.
pub(crate) fn read(
    recording: &Recording,
    tach: Option<(usize, TachConfig)>,
    threads: usize,
    control: &Control<'_>,
) -> Result<PassOne, Error> {
    let mut scanner = match &tach {
        Some((_, config)) => Some(TachScanner::new(config)?),
        None => None,
    };
    let failed = Error::in_recording(recording.name());
    let channels: Vec<usize> = tach.iter().map(|(channel, _)| *channel).collect();
    let sha256 = match recording.hash_parts().map_err(&failed)? {
        HashParts::Taken(sha256) => {
            if scanner.is_some() {
                let mut bytes = Vec::new();
                each_slab(recording, control, |first, frames| {
                    let read = recording
                        .read_raw(first, frames, &mut bytes)
                        .map_err(&failed)?;
                    scan(recording, &bytes, &channels, &mut scanner)?;
                    Ok(read)
                })?;
            }
            sha256
        }
        HashParts::Sequential(mut hasher) if threads <= 1 => {
            let mut bytes = Vec::new();
            each_slab(recording, control, |first, frames| {
                let read = recording
                    .read_raw(first, frames, &mut bytes)
                    .map_err(&failed)?;
                hasher.update(&bytes);
                scan(recording, &bytes, &channels, &mut scanner)?;
                Ok(read)
            })?;
            hasher.finish().map_err(&failed)?
        }
        HashParts::Sequential(mut hasher) => std::thread::scope(|scope| {
            // Buffers go round: filled here, decoded here, hashed there, and back.
            let (full, to_hash) = mpsc::channel::<Vec<u8>>();
            let (empty, back) = mpsc::channel::<Vec<u8>>();
            for _ in 0..4 {
                let _ = empty.send(Vec::new());
            }
            let hashing = scope.spawn(move || {
                for bytes in to_hash {
                    hasher.update(&bytes);
                    // The reader may be done already.
                    let _ = empty.send(bytes);
                }
                hasher.finish()
            });
            let result = each_slab(recording, control, |first, frames| {
                let mut bytes = back.recv().unwrap_or_default();
                let read = recording
                    .read_raw(first, frames, &mut bytes)
                    .map_err(&failed)?;
                scan(recording, &bytes, &channels, &mut scanner)?;
                let _ = full.send(bytes);
                Ok(read)
            });
            drop(full);
            let sha256 = hashing
                .join()
                .unwrap_or_else(|panic| std::panic::resume_unwind(panic));
            result?;
            sha256.map_err(&failed)
        })?,
    };
    let scan = match scanner {
        Some(scanner) => Some(scanner.finish()?),
        None => None,
    };
    Ok(PassOne { sha256, scan })
}

fn scan(
    recording: &Recording,
    bytes: &[u8],
    channels: &[usize],
    scanner: &mut Option<TachScanner>,
) -> Result<(), Error> {
    if let Some(scanner) = scanner {
        let mut samples = [Vec::new()];
        recording.decode(bytes, channels, &mut samples);
        scanner.push(&samples[0]);
    }
    Ok(())
}

/// Calls `read(first frame, frames)` for every slab; it returns the frames really read.
fn each_slab(
    recording: &Recording,
    control: &Control<'_>,
    mut read: impl FnMut(u64, usize) -> Result<usize, Error>,
) -> Result<(), Error> {
    let frames = slab_frames(recording);
    let total = recording.frames();
    let mut first = 0;
    while first < total {
        if control.cancel.load(Ordering::Relaxed) {
            return Err(Error::Cancelled);
        }
        (control.progress)(Progress {
            stage: "reading the tach",
            share: first as f64 / total as f64,
        });
        let wanted = frames.min(usize::try_from(total - first).unwrap_or(frames));
        let got = read(first, wanted)?;
        if got < wanted {
            return Err(shrunk(recording, first + got as u64));
        }
        first += wanted as u64;
    }
    Ok(())
}

/// The file ended before it said it would.
pub(crate) fn shrunk(recording: &Recording, at: u64) -> Error {
    Error::Setting {
        what: format!(
            "{}: the file became shorter while it was read: {} samples when opened, {at} now",
            recording.name(),
            recording.frames()
        ),
        hint: "is it still being written or copied? run again when that is done".to_owned(),
    }
}
