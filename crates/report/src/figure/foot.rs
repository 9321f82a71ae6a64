use shaftwise_run::{BlockFacts, ChannelFacts, RunResult};

use crate::number::{fixed, short};
use crate::shown::{channel_title, clean};
use crate::words::speed_range;

/// Channel, unit, resolution, window, averages (counted and equivalent), overlap, speed range, and
/// the source: what every figure says at its foot.
pub(super) fn foot(
    channel: &ChannelFacts,
    unit: &str,
    resolution: &str,
    blocks: &BlockFacts,
    result: &RunResult,
) -> Vec<String> {
    let averages = format!(
        "{} averages ({} equivalent)",
        blocks.averages,
        short(blocks.equivalent_averages, 4)
    );
    vec![
        format!(
            "{}, {unit}; {resolution}, {} window, {averages}, {} % overlap; {}",
            channel_title(channel),
            clean(&blocks.window),
            short(blocks.overlap_pct, 3),
            speed_range(&blocks.speed_rpm),
        ),
        source(result),
    ]
}

/// Where it came from.
pub(super) fn source(result: &RunResult) -> String {
    let recording = &result.recording;
    format!(
        "source: {}, {} Hz, {} s; SHA-256 begins {}",
        clean(&recording.file),
        recording.sample_rate_hz,
        fixed(recording.seconds, 1),
        recording.sha256.get(..12).unwrap_or(&recording.sha256),
    )
}
