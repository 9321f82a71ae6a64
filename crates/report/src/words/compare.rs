use shaftwise_run::{CompareChannel, CompareResult, ComparedPeak, detector_factor};

use super::{Part, speed_range};
use crate::number::{count, fixed, place, significant};
use crate::shown::{channel_title, clean, detector_word, level_unit};
use crate::table::Table;

/// The peak that lost most to smearing, among those at orders to be trusted where there are any.
fn worst_loss(channel: &CompareChannel, trusted: f64) -> Option<&ComparedPeak> {
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

pub(super) fn compare_part(
    compare: &CompareResult,
    channel: &CompareChannel,
    trusted: f64,
    rows: Option<usize>,
) -> Part {
    let scale = detector_factor(channel.detector);
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
