use shaftwise_run::{SynchronousChannel, SynchronousResult};

use super::{LOCKED, Part, left_out, speed_range};
use crate::number::{fixed, place, significant};
use crate::shown::{channel_title, clean, quantity};
use crate::table::Table;

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

/// Noise that falls this much less than the law is not random, dB: three times the scatter
/// (4.3·√(2/ν) dB) of a level from some forty independent values.
const OFF_LAW_DB: f64 = 3.0;

/// How the noise fell against the law.
pub(crate) fn convergence_verdict(channel: &SynchronousChannel) -> String {
    let behind = 10.0 * (channel.revolutions as f64).log10() - channel.noise_reduction_db;
    if !behind.is_finite() {
        return "nothing to set against the 1/√N law".to_owned();
    }
    if behind > OFF_LAW_DB {
        format!("{} dB short of the 1/√N law", fixed(behind, 1))
    } else if behind < -OFF_LAW_DB {
        format!("{} dB more than the 1/√N law", fixed(-behind, 1))
    } else {
        "in line with the 1/√N law".to_owned()
    }
}

pub(super) fn synchronous_part(
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
