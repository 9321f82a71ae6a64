//! What was found, in words that stay within the evidence, and the tables beside them. The
//! terminal and the page say the same sentences.

use shaftwise_run::{
    AnalysisResult, AxisChoice, BlockFacts, CompareChannel, CompareResult, ComparedPeak,
    PeakResult, PeakVerdict, RunResult, SpectrumChannel, SpectrumResult, SpeedRange, SpeedResult,
    SynchronousChannel, SynchronousResult,
};

use crate::number::{count, fixed, place, rpm, short, significant};
use crate::shown::{channel_title, clean, detector_word, factor, level_unit, line_unit, quantity};
use crate::table::Table;

/// What is said of one channel (of `speed`: of the shaft).
pub(crate) struct Part {
    pub(crate) title: String,
    /// Number for a table of several channels.
    pub(crate) number: String,
    /// The finding in one sentence, where several channels share a page.
    pub(crate) short: String,
    pub(crate) findings: Vec<String>,
    pub(crate) table: Option<Table>,
    /// What the table leaves out or takes for granted; may be empty.
    pub(crate) note: String,
}

/// What is said of an analysis, channel by channel. For the terminal with at most so many rows in
/// each table, and no more columns than a line holds.
pub(crate) fn parts(result: &RunResult, index: usize, rows: Option<usize>) -> Vec<Part> {
    match &result.analyses[index].result {
        AnalysisResult::Speed(speed) => vec![speed_part(speed)],
        AnalysisResult::Spectrum(r) => {
            let part = |c| spectrum_part(r, c, &result.speed, rows);
            r.channels.iter().map(part).collect()
        }
        AnalysisResult::Synchronous(r) => {
            let part = |c| synchronous_part(r, c, rows);
            r.channels.iter().map(part).collect()
        }
        AnalysisResult::Compare(r) => {
            let part = |c| compare_part(r, c, result.speed.highest_trusted_order, rows);
            r.channels.iter().map(part).collect()
        }
    }
}

/// What an analysis is called in headings.
pub(crate) fn analysis_title(analysis: &AnalysisResult) -> &'static str {
    match analysis {
        AnalysisResult::Speed(_) => "Shaft speed",
        AnalysisResult::Spectrum(r) if r.axis == AxisChoice::Hz => "Plain spectrum",
        AnalysisResult::Spectrum(_) => "Order spectrum",
        AnalysisResult::Synchronous(_) => "Synchronous average",
        AnalysisResult::Compare(_) => "Smeared against tracked",
    }
}

/// `1447–1507 rpm`.
pub(crate) fn speed_range(range: &SpeedRange) -> String {
    let (min, max) = (rpm(range.min), rpm(range.max));
    if min == max {
        format!("{min} rpm")
    } else {
        format!("{min}–{max} rpm")
    }
}

/// `1/16 order`.
pub(crate) fn order_spacing(blocks: &BlockFacts) -> String {
    let parts = 1.0 / blocks.order_step;
    if (parts - parts.round()).abs() < 1e-9 * parts && parts >= 1.5 {
        format!("1/{parts:.0} order")
    } else {
        format!("{} order", significant(blocks.order_step, 3))
    }
}

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

/// `2 inserted, 3 rejected, 0 moved`.
pub(crate) fn ledger_count(speed: &SpeedResult) -> String {
    let moved = speed.ledger.iter().filter(|l| l.action == "moved").count();
    format!(
        "{} inserted, {} rejected, {moved} moved",
        speed.pulses.inserted, speed.pulses.rejected
    )
}

/// Seconds that count.
pub(crate) fn selected_seconds(speed: &SpeedResult) -> f64 {
    speed.selected_s.iter().map(|(from, to)| to - from).sum()
}

pub(crate) fn speed_part(speed: &SpeedResult) -> Part {
    let range = &speed.speed_rpm;
    let mut findings = vec![format!(
        "The shaft turned at {}, {} rpm in the mean: a spread of {} %.",
        speed_range(range),
        fixed(range.mean, 1),
        significant(100.0 * (range.max - range.min) / range.mean, 2)
    )];
    if speed.angle_sigma_deg.is_finite() && speed.timing_sigma_s.is_finite() {
        findings.push(format!(
            "Its angle is known to {}° and its pulses to {} µs (1 sigma, from the scatter in the data).",
            significant(speed.angle_sigma_deg, 2),
            significant(1e6 * speed.timing_sigma_s, 2)
        ));
    }
    let pulses = &speed.pulses;
    findings.push(format!(
        "{} timed, {} used; ledger: {}.",
        count(pulses.timed, "pulse"),
        pulses.used,
        ledger_count(speed)
    ));
    if speed.edge_width_deg.is_finite() && speed.pulse_width_deg.is_finite() {
        findings.push(format!(
            "The timed edge is {}° wide, the pulse {}°.",
            significant(speed.edge_width_deg, 2),
            significant(speed.pulse_width_deg, 3)
        ));
    }
    let mut table = Table::default();
    let section = |i: usize| speed.sections_s[i];
    let rows = 0..speed.sections_s.len();
    let inside = |i: usize| {
        let (from, to) = section(i);
        let stretches = speed.selected_s.iter();
        let overlap = stretches.map(|&(a, b)| (b.min(to) - a.max(from)).max(0.0));
        fixed(overlap.sum(), 2)
    };
    table
        .numbers(
            "section",
            rows.clone().map(|i| (i + 1).to_string()).collect(),
        )
        .numbers(
            "from, s",
            rows.clone().map(|i| fixed(section(i).0, 3)).collect(),
        )
        .numbers(
            "to, s",
            rows.clone().map(|i| fixed(section(i).1, 3)).collect(),
        )
        .numbers("selected, s", rows.map(inside).collect());
    Part {
        title: SHAFT.to_owned(),
        number: String::new(),
        short: findings[0].clone(),
        findings,
        table: Some(table),
        note: String::new(),
    }
}

/// Title of the part that is of no channel.
pub(crate) const SHAFT: &str = "shaft";

fn spectrum_part(
    spectrum: &SpectrumResult,
    channel: &SpectrumChannel,
    speed: &SpeedResult,
    rows: Option<usize>,
) -> Part {
    let scale = factor(channel.detector);
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

fn left_out(all: usize, shown: usize, noun: &str) -> String {
    match all - shown {
        0 => String::new(),
        more => format!(
            "and {more} lower {noun}{}",
            if more == 1 { "" } else { "s" }
        ),
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

/// 1 sigma of the amplitude of an order of the mean revolution: √(2/M · mean of the M squared
/// standard deviations of the mean), the scatter taken as spread evenly over the orders.
pub(crate) fn amplitude_sigma(channel: &SynchronousChannel) -> f64 {
    let values = channel.sd_of_mean.len() as f64;
    let power: f64 = channel.sd_of_mean.iter().map(|s| s * s).sum();
    (2.0 * power).sqrt() / values
}

/// Indices of the orders above zero that stand 3 sigma out of the scatter, highest first.
pub(crate) fn strongest_orders(channel: &SynchronousChannel, most: usize) -> Vec<usize> {
    let sigma = amplitude_sigma(channel);
    let amplitude = &channel.amplitude_peak;
    let mut strongest: Vec<usize> = (0..amplitude.len())
        .filter(|&i| channel.orders[i] > 0.0 && amplitude[i] > 3.0 * sigma)
        .collect();
    strongest.sort_by(|&i, &j| amplitude[j].total_cmp(&amplitude[i]));
    strongest.truncate(most);
    strongest
}

/// Noise that falls this much less than the law is not random, dB: three times the scatter of a
/// level from some twenty independent values.
const OFF_LAW_DB: f64 = 3.0;

/// How the noise fell against the law.
pub(crate) fn convergence_verdict(channel: &SynchronousChannel) -> String {
    let curve = &channel.convergence;
    let last = |values: &[f64]| values.iter().rev().copied().find(|v| v.is_finite());
    let behind = match (last(&curve.law_db), last(&curve.seen_db)) {
        (Some(law), Some(seen)) => law - seen,
        _ => return "too few revolutions to set it against the 1/√N law".to_owned(),
    };
    if behind > OFF_LAW_DB {
        format!("{} dB short of the 1/√N law", fixed(behind, 1))
    } else if behind < -OFF_LAW_DB {
        format!("{} dB more than the 1/√N law", fixed(-behind, 1))
    } else {
        "in line with the 1/√N law".to_owned()
    }
}

fn synchronous_part(
    average: &SynchronousResult,
    channel: &SynchronousChannel,
    rows: Option<usize>,
) -> Part {
    let unit = clean(&channel.channel.unit);
    let sigma = amplitude_sigma(channel);
    let mut findings = vec![format!(
        "{} % of the power (without bias) repeats with the shaft over {} revolutions at {}. {LOCKED}",
        significant(100.0 * channel.synchronous_fraction, 2),
        channel.revolutions,
        speed_range(&average.blocks.speed_rpm)
    )];
    findings.push(format!(
        "What does not repeat has {} of {} {unit} rms in all.",
        significant(channel.residual_rms, 3),
        significant(channel.total_rms, 3),
    ));
    let law = convergence_verdict(channel);
    let mut noise = format!(
        "Averaging lowered the noise by {} dB, {law}.",
        fixed(channel.noise_reduction_db, 1)
    );
    if law.contains("short") {
        noise.push_str(
            " What is left does not behave as random noise: compatible with lines of another shaft or fixed in frequency close to a multiple of this one's speed.",
        );
    }
    findings.push(noise);
    let all = strongest_orders(channel, usize::MAX);
    if all.is_empty() {
        findings
            .push("No order of the mean revolution stands 3 sigma out of its scatter.".to_owned());
    }
    let shown = &all[..all.len().min(rows.unwrap_or(usize::MAX))];
    let amplitudes = shown.iter().map(|&i| channel.amplitude_peak[i]).collect();
    let spread = |i: &usize| (sigma / channel.amplitude_peak[*i]).to_degrees();
    let mut table = Table::default();
    table
        .numbers(
            "order",
            shown
                .iter()
                .map(|&i| place(channel.orders[i], 1.0, 0))
                .collect(),
        )
        .levels(format!("{unit} peak"), amplitudes)
        .numbers("± 1 sigma", vec![significant(sigma, 2); shown.len()])
        .numbers(
            format!("lag of {}, deg", quantity(&channel.channel)),
            shown
                .iter()
                .map(|&i| fixed(channel.phase_lag_deg[i], 1))
                .collect(),
        )
        .numbers(
            "± 1 sigma, deg",
            shown.iter().map(|i| significant(spread(i), 2)).collect(),
        );
    let mut note = left_out(all.len(), shown.len(), "order");
    if !shown.is_empty() {
        if !note.is_empty() {
            note.push_str("; ");
        }
        note.push_str("sigma takes the scatter as spread evenly over the orders");
    }
    let strongest = all.first().map_or_else(
        || "no order stands out of the scatter".to_owned(),
        |&i| {
            format!(
                "order {} is highest, {} {unit} peak",
                place(channel.orders[i], 1.0, 0),
                significant(channel.amplitude_peak[i], 3)
            )
        },
    );
    Part {
        title: channel_title(&channel.channel),
        number: channel.channel.number.to_string(),
        short: format!(
            "{} % of the power repeats with the shaft; {strongest}; noise lowered by {} dB, {law}.",
            significant(100.0 * channel.synchronous_fraction, 2),
            fixed(channel.noise_reduction_db, 1)
        ),
        findings,
        table: (!shown.is_empty()).then_some(table),
        note,
    }
}

/// The peak that lost most to smearing, among those at orders to be trusted where there are any.
pub(crate) fn worst_loss(channel: &CompareChannel, trusted: f64) -> Option<&ComparedPeak> {
    let worst = |trusted: f64| {
        let losses = channel
            .peaks
            .iter()
            .filter(move |p| p.loss_db.is_finite() && p.order <= trusted);
        losses.max_by(|a, b| a.loss_db.total_cmp(&b.loss_db))
    };
    worst(trusted).or_else(|| worst(f64::INFINITY))
}

/// The peak to magnify: what lost most among trusted orders that the axis still shows well, those
/// within 20 dB of the highest.
pub(crate) fn showcase(channel: &CompareChannel, trusted: f64) -> Option<&ComparedPeak> {
    let highest = channel
        .peaks
        .iter()
        .map(|p| p.tracked_rms)
        .fold(0.0, f64::max);
    let shown = channel
        .peaks
        .iter()
        .filter(|p| p.loss_db.is_finite() && p.order <= trusted && p.tracked_rms >= 0.1 * highest);
    shown
        .max_by(|a, b| a.loss_db.total_cmp(&b.loss_db))
        .or_else(|| worst_loss(channel, trusted))
}

/// Listed peaks that read low by 1 dB or more.
pub(crate) fn lost(channel: &CompareChannel) -> usize {
    channel.peaks.iter().filter(|p| p.loss_db >= 1.0).count()
}

fn compare_part(
    compare: &CompareResult,
    channel: &CompareChannel,
    trusted: f64,
    rows: Option<usize>,
) -> Part {
    let scale = factor(channel.detector);
    let unit = level_unit(&channel.channel, channel.detector);
    let at = |order: f64| place(order, compare.blocks.order_step, 2);
    let level = |value: f64| significant(scale * value, 3);
    let lost = lost(channel);
    let mut findings = Vec::new();
    let worst = worst_loss(channel, trusted);
    match worst {
        None => {
            findings.push("No peak stands out of its neighbourhood: nothing to compare.".to_owned())
        }
        Some(_) if lost == 0 => findings.push(format!(
            "None of {} lost 1 dB: on this channel plain averaging is good enough at {}.",
            count(channel.peaks.len(), "listed peak"),
            speed_range(&compare.blocks.speed_rpm)
        )),
        Some(peak) => {
            findings.push(format!(
                "Smearing made {lost} of {} read low by 1 dB or more. It cost most at order {}: tracked {} {unit}, smeared {}, {} dB low; the smeared peak sits at order {}.",
                count(channel.peaks.len(), "listed peak"),
                at(peak.order),
                level(peak.tracked_rms),
                level(peak.smeared_rms),
                fixed(peak.loss_db, 1),
                at(peak.smeared_at_order),
            ));
            let kept = 20.0 * (peak.smeared_summed_rms / peak.tracked_summed_rms).log10();
            findings.push(format!(
                "Its width at −3 dB is {} orders tracked and {} smeared. Summed over one band its level is {} tracked and {} smeared{}.",
                significant(peak.tracked_width_orders, 2),
                significant(peak.smeared_width_orders, 2),
                level(peak.tracked_summed_rms),
                level(peak.smeared_summed_rms),
                if kept.abs() < 1.0 {
                    ": smearing spreads, it does not lose"
                } else {
                    ""
                }
            ));
        }
    }
    let predicted = channel.onset.predicted_order.map_or_else(
        || "none within reach".to_owned(),
        |order| format!("order {} from the speed alone", significant(order, 3)),
    );
    let seen = channel
        .onset
        .seen_order
        .map_or_else(|| "none".to_owned(), |order| format!("order {}", at(order)));
    findings.push(format!(
        "Lowest order to lose 1 dB: predicted {predicted}, seen {seen}."
    ));
    let mut ranked: Vec<&ComparedPeak> = channel.peaks.iter().collect();
    if let Some(rows) = rows.filter(|&rows| rows < ranked.len()) {
        // Where not all have room, those that lost most tell more.
        let doubtful = |p: &ComparedPeak| p.order > trusted;
        ranked.sort_by(|a, b| {
            let by_loss = b.loss_db.total_cmp(&a.loss_db);
            doubtful(a).cmp(&doubtful(b)).then(by_loss)
        });
        ranked.truncate(rows);
    }
    ranked.sort_by(|a, b| a.order.total_cmp(&b.order));
    let levels =
        |value: fn(&ComparedPeak) -> f64| ranked.iter().map(|p| scale * value(p)).collect();
    let orders = |value: fn(&ComparedPeak) -> f64| ranked.iter().map(|p| at(value(p))).collect();
    let widths =
        |value: fn(&ComparedPeak) -> f64| ranked.iter().map(|p| fixed(value(p), 3)).collect();
    let detector = detector_word(channel.detector);
    let unit = clean(&channel.channel.unit);
    let mut table = Table::default();
    table
        .numbers("order", orders(|p| p.order))
        .levels(
            format!("tracked, {unit} {detector}"),
            levels(|p| p.tracked_rms),
        )
        .levels("smeared", levels(|p| p.smeared_rms))
        .numbers(
            "loss, dB",
            ranked.iter().map(|p| fixed(p.loss_db, 1)).collect(),
        )
        .numbers("smeared at order", orders(|p| p.smeared_at_order))
        .numbers("tracked width", widths(|p| p.tracked_width_orders))
        .numbers("smeared width", widths(|p| p.smeared_width_orders));
    if rows.is_none() {
        table
            .levels("tracked, summed", levels(|p| p.tracked_summed_rms))
            .levels("smeared, summed", levels(|p| p.smeared_summed_rms));
    }
    let note = match channel.peaks.len() - ranked.len() {
        0 => String::new(),
        more => format!("and {} that lost less", count(more, "peak")),
    };
    let brief = match worst {
        None => "no peak stands out of its neighbourhood.".to_owned(),
        Some(_) if lost == 0 => {
            format!("none of {} lost 1 dB.", count(channel.peaks.len(), "peak"))
        }
        Some(peak) => format!(
            "{lost} of {} read low by 1 dB or more, order {} by {} dB.",
            count(channel.peaks.len(), "peak"),
            at(peak.order),
            fixed(peak.loss_db, 1)
        ),
    };
    Part {
        title: channel_title(&channel.channel),
        number: channel.channel.number.to_string(),
        short: brief,
        findings,
        table: (!ranked.is_empty()).then_some(table),
        note,
    }
}

/// What an order that repeats with the shaft may come from.
const LOCKED: &str = "Locked to turning: may be mechanical, hydraulic or synchronous electrical.";

/// Where to look for what smearing did not lose.
const SPREADS: &str = "Smearing spreads a level over more lines: --json and findings.md hold the levels summed over them.";

/// What holds for every channel of an analysis, where each is spoken of in one sentence.
pub(crate) fn in_common(analysis: &AnalysisResult) -> &'static str {
    match analysis {
        AnalysisResult::Speed(_) | AnalysisResult::Spectrum(_) => "",
        AnalysisResult::Synchronous(_) => LOCKED,
        AnalysisResult::Compare(_) => SPREADS,
    }
}

/// What limits an analysis.
pub(crate) fn limits(result: &RunResult, index: usize) -> Vec<String> {
    let analysis = &result.analyses[index].result;
    let speed = &result.speed;
    let trusted = match speed.highest_trusted_order {
        order if order.is_finite() => format!(
            "highest trusted order {} (angle scatters by 10° there, common practice)",
            significant(order, 3)
        ),
        order if order > 0.0 => "the angle sets no highest trusted order".to_owned(),
        _ => "highest trusted order not worked out".to_owned(),
    };
    let mut limits = Vec::new();
    let mut blocks_say = |blocks: &BlockFacts, spacing: &str| {
        limits.push(format!(
            "{trusted}; rate reaches {}",
            significant(blocks.reachable_order, 3)
        ));
        limits.push(format!(
            "{} averages ({} equivalent), {} window, {} % overlap, {spacing}",
            blocks.averages,
            short(blocks.equivalent_averages, 4),
            clean(&blocks.window),
            short(blocks.overlap_pct, 3),
        ));
        if blocks.corner_order > 0.0 {
            limits.push(format!(
                "orders below {} lie within twice the high-pass corner and read low",
                significant(blocks.corner_order, 2)
            ));
        }
    };
    match analysis {
        AnalysisResult::Speed(_) => limits.push(trusted),
        AnalysisResult::Spectrum(r) => {
            blocks_say(&r.blocks, &format!("lines {} apart", line_spacing(r)));
            limits.push(NO_LIMIT.to_owned());
        }
        AnalysisResult::Synchronous(r) => {
            blocks_say(
                &r.blocks,
                &format!("{} values a revolution", r.blocks.samples_per_rev),
            );
            limits.push(phase_reference(speed).to_owned());
        }
        AnalysisResult::Compare(r) => {
            blocks_say(
                &r.blocks,
                &format!("lines {} apart, alike for both", order_spacing(&r.blocks)),
            );
        }
    }
    limits.push(SCATTER_ONLY.to_owned());
    limits
}

/// A missing limit is never a pass.
pub(crate) const NO_LIMIT: &str =
    "no limit supplied: no level here is judged, and nothing here clears the machine to run";

/// What bounds do not hold.
pub(crate) const SCATTER_ONLY: &str =
    "bounds: scatter of this recording only; calibration and mounting not included";

/// The caution of every command.
pub(crate) const CAUTION: &str = "informs a qualified person's judgement; replaces neither it nor the maker's limits nor local codes";

/// What phases are counted from.
pub(crate) fn phase_reference(speed: &SpeedResult) -> &'static str {
    match speed.phase_reference.as_str() {
        "pulse" => "phase lag, 0–360°, counted from the timed edge of the reference pulse",
        "arbitrary" => {
            "phase lag, 0–360°, from an arbitrary zero: not to be compared with other recordings"
        }
        _ => "no phase reference: phases hold within this recording only",
    }
}
