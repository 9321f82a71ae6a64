//! Levels as people are shown them: detector, quantity, unit.

use shaftwise_run::{AnalysisResult, AxisChoice, ChannelFacts, Detector, SpectrumResult};

/// The detector's name.
pub(crate) fn detector_word(detector: Detector) -> &'static str {
    match detector {
        Detector::Rms => "rms",
        Detector::Peak => "peak",
        Detector::PeakToPeak => "peak-to-peak",
    }
}

/// The unit of a level with its detector: `m/s² rms`.
pub(crate) fn level_unit(channel: &ChannelFacts, detector: Detector) -> String {
    format!("{} {}", clean(&channel.unit), detector_word(detector))
}

/// The unit of a spectrum's lines: `m/s² rms`, or with density `m/s² rms/√order`.
pub(crate) fn line_unit(
    result: &SpectrumResult,
    channel: &ChannelFacts,
    detector: Detector,
) -> String {
    level_unit(channel, detector) + per_root(result)
}

/// What density adds to a unit.
pub(crate) fn per_root(result: &SpectrumResult) -> &'static str {
    match (result.density, result.axis) {
        (false, _) => "",
        (true, AxisChoice::Orders) => "/√order",
        (true, AxisChoice::Hz) => "/√Hz",
    }
}

/// What a channel measures; "level" where nothing is known of it.
pub(crate) fn quantity(channel: &ChannelFacts) -> String {
    match channel.quantity.as_str() {
        "" | "other" => "level".to_owned(),
        name => clean(name),
    }
}

/// `channel 1, Drive end horizontal`; the name alone says enough where it is the number.
pub(crate) fn channel_title(channel: &ChannelFacts) -> String {
    let number = format!("channel {}", channel.number);
    let name = clean(&channel.name);
    if name.is_empty() || name == number {
        number
    } else {
        format!("{number}, {name}")
    }
}

/// Text from a file without anything that could steer a terminal or turn a line around.
pub(crate) fn clean(text: &str) -> String {
    let steering = |c: char| {
        c.is_control()
            || matches!(c, '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2028}' | '\u{2029}' | '\u{2066}'..='\u{2069}')
    };
    let plain: String = text
        .chars()
        .map(|c| if steering(c) { ' ' } else { c })
        .collect();
    plain.trim().to_owned()
}

/// Channels of an analysis; none for `speed`.
pub(crate) fn channels(analysis: &AnalysisResult) -> Vec<&ChannelFacts> {
    match analysis {
        AnalysisResult::Speed(_) => Vec::new(),
        AnalysisResult::Spectrum(r) => r.channels.iter().map(|c| &c.channel).collect(),
        AnalysisResult::Synchronous(r) => r.channels.iter().map(|c| &c.channel).collect(),
        AnalysisResult::Compare(r) => r.channels.iter().map(|c| &c.channel).collect(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn text_from_a_file_cannot_steer_the_terminal() {
        assert_eq!(clean(" a\u{1b}[2Jb\r\nc\u{202e}d "), "a [2Jb  c d");
    }
}
