use std::path::{Path, PathBuf};

use shaftwise_run::{AnalysisResult, RunResult};

use crate::Context;
use crate::context::stated;
use crate::name::Stems;
use crate::next::same_input;
use crate::number::{count, fixed};
use crate::shown::{channels, clean};
use crate::table::{Table, wrap};
use crate::words::{
    CAUTION, Part, SCATTER_ONLY, SHAFT, in_common, ledger_count, limits, parts, selected_seconds,
    speed_range,
};

/// Characters of a line.
const WIDTH: usize = 100;
/// Characters of the word that opens a block, with the blanks behind it.
const OPENING: usize = 9;
/// The same where the names of commands open blocks.
const WIDE_OPENING: usize = 14;
/// Rows of all tables together that keep a summary at about twenty lines.
const ROWS: usize = 9;
/// Channels spoken of one by one.
const CHANNELS: usize = 6;

/// What a command says when it is done: what was read, what was found, the numbers, what limits
/// them, and the next command to type. About twenty lines of plain characters, ending with a line
/// feed.
///
/// # Panics
///
/// If there is no analysis of that index.
#[must_use]
pub fn summary(result: &RunResult, index: usize, context: &Context) -> String {
    let outcome = &result.analyses[index];
    let mut out = opening(result, context, OPENING);
    if !matches!(outcome.result, AnalysisResult::Speed(_)) {
        out.speed(result);
    }
    if let AnalysisResult::Compare(r) = &outcome.result {
        out.block("found", &[plain_verdict(r.plain_is_good_enough)]);
    }
    let channels = channels(&outcome.result).len().max(1);
    let rows = if channels == 1 {
        ROWS
    } else {
        (ROWS / channels).max(2)
    };
    let mut parts = parts(result, index, Some(rows));
    if let [part] = parts.as_mut_slice() {
        out.block("found", &part.findings);
        // A speed without a break has its one section in the words already.
        let told = part.title == SHAFT && result.speed.sections_s.len() < 2;
        if let Some(table) = part.table.take().filter(|_| !told) {
            out.table(&table, &part.note);
        }
    } else {
        several(&mut out, parts, &outcome.result);
    }
    out.block("limits", &limits(result, index));
    out.next(context, next_command(&outcome.result));
    out.text
}

/// Several channels: a sentence for each, and one table.
fn several(out: &mut Page, mut parts: Vec<Part>, analysis: &AnalysisResult) {
    let left_out = parts.len().saturating_sub(CHANNELS);
    parts.truncate(CHANNELS);
    for part in &parts {
        out.block("found", &[format!("{}: {}", part.title, part.short)]);
    }
    let common = in_common(analysis);
    if !common.is_empty() {
        out.block("found", &[common]);
    }
    let tables = parts.into_iter().filter_map(|p| Some((p.number, p.table?)));
    let tables: Vec<(String, Table)> = tables.collect();
    let note = if left_out == 0 {
        "--out DIR writes all of them".to_owned()
    } else {
        format!(
            "and {}; --out DIR writes all of them",
            count(left_out, "channel")
        )
    };
    match Table::stacked("ch", &tables) {
        Some(table) => out.table(&table, &note),
        None => {
            for (number, table) in tables {
                out.table(&table, &format!("channel {number}"));
            }
        }
    }
}

fn next_command(analysis: &AnalysisResult) -> &'static str {
    match analysis {
        AnalysisResult::Spectrum(_) => "compare",
        AnalysisResult::Compare(r) if r.plain_is_good_enough == Some(false) => "synchronous",
        AnalysisResult::Speed(_) | AnalysisResult::Synchronous(_) | AnalysisResult::Compare(_) => {
            "spectrum"
        }
    }
}

/// What a report says when it is done: what was read, the main finding of each analysis and
/// channel, what was written, and where to look next.
#[must_use]
pub fn report_summary(result: &RunResult, written: &[PathBuf], context: &Context) -> String {
    let mut out = opening(result, context, WIDE_OPENING);
    out.speed(result);
    for (index, outcome) in result.analyses.iter().enumerate() {
        // As in the names of its files, so that two of one command are told apart.
        let word = Stems::new(result, index).command;
        for part in parts(result, index, Some(0)) {
            if part.title != SHAFT {
                let said = format!("{}: {}", part.title, part.short);
                out.block(&word, &[said]);
            }
        }
        let common = in_common(&outcome.result);
        if !common.is_empty() {
            out.block(&word, &[common]);
        }
    }
    let mut limits = vec![crate::words::NO_LIMIT.to_owned(), SCATTER_ONLY.to_owned()];
    let all: usize = result.warnings.len()
        + result
            .analyses
            .iter()
            .map(|o| o.warnings.len())
            .sum::<usize>();
    if all > 0 {
        limits.push(format!("{}, listed in findings.md", count(all, "warning")));
    }
    out.block("limits", &limits);
    let page = written
        .iter()
        .find(|path| path.file_name() == Some("findings.md".as_ref()));
    let folder = page.and_then(|path| path.parent()).unwrap_or(Path::new(""));
    out.line(
        "written",
        &format!("{} in {}", count(written.len(), "file"), folder.display()),
    );
    if let Some(page) = page {
        out.line("next", &format!("read {}", page.display()));
    }
    out.text
}

pub(crate) fn plain_verdict(good_enough: Option<bool>) -> &'static str {
    match good_enough {
        Some(true) => {
            "No listed peak lost 1 dB: plain averaging is good enough for this recording at this resolution."
        }
        Some(false) => "Plain averaging is not good enough for this recording at this resolution.",
        None => "No peak stands out: nothing says whether plain averaging is good enough.",
    }
}

struct Page {
    text: String,
    /// The word that opened the last block.
    open: String,
    /// Characters of the words that open blocks.
    indent: usize,
}

impl Page {
    /// A line behind the word that opens its block; the word is said once for each block.
    fn line(&mut self, word: &str, line: &str) {
        let shown = if word == self.open { "" } else { word };
        if !word.is_empty() {
            word.clone_into(&mut self.open);
        }
        let gap = self.indent.saturating_sub(shown.chars().count()).max(1);
        self.text.push_str(shown);
        self.text.extend(std::iter::repeat_n(' ', gap));
        self.text.push_str(line);
        self.text.push('\n');
    }

    /// Sentences, each from a line of its own on, broken where too long.
    fn block(&mut self, word: &str, sentences: &[impl AsRef<str>]) {
        for sentence in sentences {
            for line in wrap(sentence.as_ref(), WIDTH - self.indent) {
                self.line(word, &line);
            }
        }
    }

    fn table(&mut self, table: &Table, note: &str) {
        for line in table.plain() {
            self.line("", &line);
        }
        if !note.is_empty() {
            self.line("", &format!("({note})"));
        }
    }

    fn speed(&mut self, result: &RunResult) {
        let speed = &result.speed;
        let sections = match speed.sections_s.len() {
            0 | 1 => String::new(),
            n => format!(" in {n} sections"),
        };
        self.block(
            "speed",
            &[format!(
                "{}, mean {} rpm over {} s{sections}; {} used, {}",
                speed_range(&speed.speed_rpm),
                fixed(speed.speed_rpm.mean, 1),
                fixed(selected_seconds(speed), 1),
                count(speed.pulses.used, "pulse"),
                ledger_count(speed)
            )],
        );
    }

    fn next(&mut self, context: &Context, command: &str) {
        if let Some(line) = same_input(&context.command_line, command) {
            self.line("next", &line);
        }
    }
}

/// Caution, what was read, conditions.
fn opening(result: &RunResult, context: &Context, indent: usize) -> Page {
    let mut out = Page {
        text: String::new(),
        open: String::new(),
        indent,
    };
    let recording = &result.recording;
    out.line("caution", CAUTION);
    let name = match recording.file.as_str() {
        "-" => "standard input".to_owned(),
        name => clean(name),
    };
    out.block(
        "read",
        &[
            format!(
                "{name}: {} s, {} at {} Hz",
                fixed(recording.seconds, 1),
                count(recording.channel_count, "channel"),
                recording.sample_rate_hz,
            ),
            format!("conditions: {}", stated(&context.conditions)),
        ],
    );
    out
}
