use shaftwise_run::SpeedResult;

use super::{Part, SHAFT, speed_range};
use crate::number::{count, fixed, significant};
use crate::shown::clean;
use crate::table::Table;

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
    if speed.sampling_error_s > 0.0 {
        findings.push(format!(
            "Sampling had moved the instants of its short edges by {} µs rms; that was learned from the pulses and taken off.",
            significant(1e6 * speed.sampling_error_s, 2)
        ));
    }
    for left_out in &speed.excluded {
        findings.push(format!(
            "Left out: {} to {} s, {}.",
            significant(left_out.from_s, 4),
            significant(left_out.to_s, 4),
            left_out
                .reason
                .as_deref()
                .map_or("no reason given".to_owned(), clean)
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
