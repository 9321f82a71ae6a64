//! What was found, in words that stay within the evidence, and the tables beside them. The
//! terminal and the page say the same sentences.

mod compare;
mod spectrum;
mod speed;
mod synchronous;

use shaftwise_run::{AnalysisResult, AxisChoice, BlockFacts, RunResult, SpeedRange, SpeedResult};

pub(crate) use compare::{lost, showcase};
pub(crate) use spectrum::{line_spacing, peak_named, peak_place};
pub(crate) use speed::{ledger_count, selected_seconds, speed_part};
pub(crate) use synchronous::{amplitude_sigma, convergence_verdict, strongest_orders};

use crate::number::{rpm, short, significant};
use crate::shown::clean;
use crate::table::Table;
use compare::compare_part;
use spectrum::spectrum_part;
use synchronous::synchronous_part;

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

/// Title of the part that is of no channel.
pub(crate) const SHAFT: &str = "shaft";

fn left_out(all: usize, shown: usize, noun: &str) -> String {
    match all - shown {
        0 => String::new(),
        more => format!(
            "and {more} lower {noun}{}",
            if more == 1 { "" } else { "s" }
        ),
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
            "highest trusted order {} (10° of scatter there, common practice)",
            significant(order, 3)
        ),
        order if order > 0.0 => "the angle sets no highest trusted order".to_owned(),
        _ => "highest trusted order not worked out".to_owned(),
    };
    let mut limits = Vec::new();
    let mut blocks_say = |blocks: &BlockFacts, spacing: &str| {
        limits.push(format!(
            "{trusted}; rate reaches order {}",
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
