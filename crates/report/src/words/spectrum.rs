use shaftwise_run::{
    AxisChoice, PeakResult, PeakVerdict, SpectrumChannel, SpectrumResult, SpeedResult,
    detector_factor,
};

use super::{Part, left_out, order_spacing, selected_seconds, speed_range};
use crate::number::{count, fixed, place, short, significant};
use crate::shown::{channel_title, level_unit, line_unit};
use crate::table::Table;

/// Spacing of the lines in the unit of the spectrum's axis.
fn line_step(spectrum: &SpectrumResult) -> f64 {
    let blocks = &spectrum.blocks;
    match spectrum.axis {
        AxisChoice::Orders => blocks.order_step,
        AxisChoice::Hz => blocks.order_step * blocks.mean_speed_rev_s,
    }
}

/// `1/16 order` or `1.54 Hz`.
pub(crate) fn line_spacing(spectrum: &SpectrumResult) -> String {
    match spectrum.axis {
        AxisChoice::Orders => order_spacing(&spectrum.blocks),
        AxisChoice::Hz => format!("{} Hz", significant(line_step(spectrum), 3)),
    }
}

/// A peak's place, in orders or Hz.
pub(crate) fn peak_place(peak: &PeakResult, spectrum: &SpectrumResult) -> String {
    let least = match spectrum.axis {
        AxisChoice::Orders => 2,
        AxisChoice::Hz => 1,
    };
    let at = peak.order.or(peak.frequency_hz).unwrap_or(f64::NAN);
    place(at, line_step(spectrum), least)
}

/// `order 2.00` or `49.3 Hz`.
pub(crate) fn peak_named(peak: &PeakResult, spectrum: &SpectrumResult) -> String {
    let at = peak_place(peak, spectrum);
    match spectrum.axis {
        AxisChoice::Orders => format!("order {at}"),
        AxisChoice::Hz => format!("{at} Hz"),
    }
}

pub(super) fn spectrum_part(
    spectrum: &SpectrumResult,
    channel: &SpectrumChannel,
    speed: &SpeedResult,
    rows: Option<usize>,
) -> Part {
    let scale = detector_factor(channel.detector);
    let unit = line_unit(spectrum, &channel.channel, channel.detector);
    let at_speed = speed_range(&spectrum.blocks.speed_rpm);
    let mut findings = Vec::new();
    match channel.peaks.first() {
        None => findings.push(format!(
            "No peak stands out of its neighbourhood at {at_speed} (false-alarm rate of 5 % per spectrum)."
        )),
        Some(peak) => findings.push(format!(
            "{} out of the neighbourhood at {at_speed}; the highest is {} at {} {unit} ({} to {} at 90 %).",
            match channel.peaks.len() {
                1 => "1 peak stands".to_owned(),
                peaks => format!("{peaks} peaks stand"),
            },
            peak_named(peak, spectrum),
            significant(scale * peak.rms, 3),
            significant(scale * peak.lower, 3),
            significant(scale * peak.upper, 3),
        )),
    }
    if !channel.peaks.is_empty() {
        findings.push(verdict_sentence(spectrum, channel, speed));
    }
    let overall = &channel.overall;
    let (low, high) = overall.band_hz;
    findings.push(format!(
        "Overall level {} {} ({} to {} at 90 %) in {} to {} Hz at the mean speed.",
        significant(overall.value, 3),
        level_unit(&channel.channel, overall.detector),
        significant(overall.lower, 3),
        significant(overall.upper, 3),
        significant(low, 3),
        significant(high, 4),
    ));
    let shown = &channel.peaks[..channel.peaks.len().min(rows.unwrap_or(usize::MAX))];
    let levels = |level: fn(&PeakResult) -> f64| shown.iter().map(|p| scale * level(p)).collect();
    let head = match spectrum.axis {
        AxisChoice::Orders => "order",
        AxisChoice::Hz => "Hz",
    };
    let decibels =
        |value: fn(&PeakResult) -> f64| shown.iter().map(|p| fixed(value(p), 1)).collect();
    let mut table = Table::default();
    table
        .numbers(
            head,
            shown.iter().map(|p| peak_place(p, spectrum)).collect(),
        )
        .levels(unit.clone(), levels(|p| p.rms))
        .levels("lower 90 %", levels(|p| p.lower))
        .levels("upper 90 %", levels(|p| p.upper))
        .numbers("over noise, dB", decibels(|p| p.over_noise_db))
        .words("verdict", shown.iter().map(verdict_words).collect());
    let brief = channel.peaks.first().map_or_else(
        || "no peak stands out of its neighbourhood.".to_owned(),
        |peak| {
            format!(
                "{}, the highest {} at {} {unit}; {}.",
                count(channel.peaks.len(), "peak"),
                peak_named(peak, spectrum),
                significant(scale * peak.rms, 3),
                verdict_counts(spectrum, channel)
            )
        },
    );
    Part {
        title: channel_title(&channel.channel),
        number: channel.channel.number.to_string(),
        short: brief,
        findings,
        table: (!shown.is_empty()).then_some(table),
        note: left_out(channel.peaks.len(), shown.len(), "peak"),
    }
}

/// `20 repeat within ± 1 dB, 9 need more averages, 1 wanders`.
fn verdict_counts(spectrum: &SpectrumResult, channel: &SpectrumChannel) -> String {
    let count = |verdict, one: &str, many: &str| {
        let number = channel
            .peaks
            .iter()
            .filter(|p| p.verdict == verdict)
            .count();
        match number {
            0 => None,
            1 => Some(format!("1 {one}")),
            n => Some(format!("{n} {many}")),
        }
    };
    let within = format!("within ± {} dB", short(spectrum.repeatability_db, 3));
    let (repeats, repeat) = (format!("repeats {within}"), format!("repeat {within}"));
    [
        count(PeakVerdict::Repeatable, &repeats, &repeat),
        count(
            PeakVerdict::MoreAverages,
            "needs more averages",
            "need more averages",
        ),
        count(PeakVerdict::Wanders, "wanders", "wander"),
    ]
    .into_iter()
    .flatten()
    .collect::<Vec<_>>()
    .join(", ")
}

/// The same in full: how many averages, and what wandering means.
fn verdict_sentence(
    spectrum: &SpectrumResult,
    channel: &SpectrumChannel,
    speed: &SpeedResult,
) -> String {
    let mut text = format!("At 90 %, {}.", verdict_counts(spectrum, channel));
    let more = |p: &&PeakResult| p.verdict == PeakVerdict::MoreAverages;
    let most = channel
        .peaks
        .iter()
        .filter(more)
        .filter_map(|p| p.averages_needed)
        .max();
    if let Some(most) = most.filter(|&n| n > channel.averages && channel.averages > 0) {
        let seconds = selected_seconds(speed) * most as f64 / channel.averages as f64;
        text += &format!(
            " {most} averages would do for all of those that need more: about {} s like this.",
            fixed(seconds, 0)
        );
    }
    if channel
        .peaks
        .iter()
        .any(|p| p.verdict == PeakVerdict::Wanders)
    {
        text += " A level that wanders changed during the recording: more averages will not help.";
    }
    text
}

fn verdict_words(peak: &PeakResult) -> String {
    match (peak.verdict, peak.averages_needed) {
        (PeakVerdict::Repeatable, _) => "repeatable".to_owned(),
        (PeakVerdict::MoreAverages, Some(n)) => format!("more averages: {n}"),
        (PeakVerdict::MoreAverages, None) => "more averages".to_owned(),
        (PeakVerdict::Wanders, _) => {
            format!("wanders, {} dB seen", fixed(peak.seen_scatter_db, 1))
        }
    }
}
