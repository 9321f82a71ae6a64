//! The page of a report: findings in words, with their numbers, bounds and limits.

use serde_json::{Map, Value};
use shaftwise_run::{AnalysisResult, RunResult};

use crate::Context;
use crate::context::{key_text, value_text};
use crate::number::{count, fixed};
use crate::shown::clean;
use crate::summary::plain_verdict;
use crate::table::{Table, escape};
use crate::words::{
    SCATTER_ONLY, SHAFT, analysis_title, ledger_count, limits, parts, phase_reference,
    selected_seconds, speed_range,
};

/// Entries of the ledger shown; all of them are in results.json.
const LEDGER_ROWS: usize = 20;

/// What the page is made of.
pub(crate) struct Page<'r> {
    pub(crate) result: &'r RunResult,
    pub(crate) context: &'r Context,
    /// Figures of the speed, where no analysis brings them.
    pub(crate) speed_pictures: Vec<String>,
    /// Figures of each analysis.
    pub(crate) pictures: Vec<Vec<String>>,
    /// Every file of the report.
    pub(crate) files: Vec<String>,
}

/// The page as Markdown.
pub(crate) fn page(page: &Page<'_>) -> String {
    let mut out = Text::default();
    let name = match page.context.machine_name() {
        name if name.is_empty() => clean(&page.result.recording.file),
        name => name,
    };
    out.heading(1, &format!("Findings: {name}"));
    cautions(&mut out);
    measured(&mut out, page.result, page.context);
    in_short(&mut out, page.result);
    speed(&mut out, page);
    for index in 0..page.result.analyses.len() {
        analysis(&mut out, page, index);
    }
    ledger(&mut out, page.result);
    settings(&mut out, page.result);
    warnings(&mut out, page.result);
    files(&mut out, page);
    out.0
}

/// Markdown under construction. Text from outside is escaped here, once.
#[derive(Default)]
struct Text(String);

impl Text {
    /// A block of its own: one blank line before it.
    fn block(&mut self, text: &str) {
        if !self.0.is_empty() {
            self.0.push('\n');
        }
        self.0.push_str(text.trim_end());
        self.0.push('\n');
    }

    fn heading(&mut self, level: usize, text: &str) {
        self.block(&format!("{} {}", "#".repeat(level), escape(text)));
    }

    fn paragraph(&mut self, text: &str) {
        self.block(&escape(text));
    }

    fn items(&mut self, items: impl IntoIterator<Item = impl AsRef<str>>) {
        let lines = items.into_iter();
        let lines = lines.map(|item| format!("- {}", escape(item.as_ref())));
        self.block(&lines.collect::<Vec<_>>().join("\n"));
    }

    fn table(&mut self, table: &Table) {
        self.block(&table.markdown());
    }

    fn pictures(&mut self, names: &[String], what: &str) {
        for name in names {
            self.block(&format!("![{}]({name})", escape(what)));
        }
    }
}

fn cautions(out: &mut Text) {
    out.heading(2, "Cautions");
    out.items([
        "Rotating machinery injures. Guards, lock-out, safe distance and the maker's speed limits come first.",
        "This page informs a qualified person's judgement. It does not replace it, nor local codes.",
        "No limit was supplied: no level here is judged, and nothing here clears the machine to run.",
    ]);
}

fn pairs(map: &Map<String, Value>) -> Vec<(String, String)> {
    map.iter()
        .map(|(key, value)| (key_text(key), value_text(value)))
        .collect()
}

fn measured(out: &mut Text, result: &RunResult, context: &Context) {
    out.heading(2, "What was measured, and how");
    let recording = &result.recording;
    let mut rows = vec![
        ("recording".to_owned(), clean(&recording.file)),
        ("SHA-256".to_owned(), clean(&recording.sha256)),
        (
            "length".to_owned(),
            format!(
                "{} s, {} at {} Hz",
                fixed(recording.seconds, 3),
                count(recording.channel_count, "channel"),
                recording.sample_rate_hz
            ),
        ),
        (
            "analysed".to_owned(),
            format!(
                "{} s between the first and the last pulse, less what was left out",
                fixed(selected_seconds(&result.speed), 3)
            ),
        ),
        ("speed".to_owned(), speed_range(&result.speed.speed_rpm)),
    ];
    for (title, map) in [
        ("machine", &context.machine),
        ("conditions", &context.conditions),
    ] {
        if map.is_empty() {
            rows.push((title.to_owned(), "not stated".to_owned()));
        }
        rows.extend(
            pairs(map)
                .into_iter()
                .map(|(key, value)| (format!("{title}: {key}"), value)),
        );
    }
    out.table(&two_columns("what", "found or stated", rows));
    if context.conditions.is_empty() {
        out.paragraph("conditions: not stated");
    }
}

fn two_columns(left: &str, right: &str, rows: Vec<(String, String)>) -> Table {
    let (keys, values) = rows.into_iter().unzip();
    let mut table = Table::default();
    table.words(left, keys).words(right, values);
    table
}

/// The first sentence of each analysis and channel.
fn in_short(out: &mut Text, result: &RunResult) {
    out.heading(2, "In short");
    let mut lines = Vec::new();
    for index in 0..result.analyses.len() {
        let title = analysis_title(&result.analyses[index].result);
        for part in parts(result, index, Some(0)) {
            let of = match part.title.as_str() {
                SHAFT => String::new(),
                channel => format!(", {channel}"),
            };
            lines.push(format!("{title}{of}: {}", part.short));
        }
    }
    out.items(lines);
    out.paragraph(&format!("Throughout, {SCATTER_ONLY}."));
}

/// The speed, where no analysis of its own speaks of it.
fn speed(out: &mut Text, page: &Page<'_>) {
    let asked = |o: &shaftwise_run::Outcome| matches!(o.result, AnalysisResult::Speed(_));
    if page.result.analyses.iter().any(asked) {
        return;
    }
    out.heading(2, "Shaft speed");
    part(out, crate::words::speed_part(&page.result.speed));
    out.pictures(&page.speed_pictures, "shaft speed against time");
}

fn part(out: &mut Text, part: crate::words::Part) {
    out.items(part.findings);
    if let Some(table) = part.table {
        out.table(&table);
    }
    if !part.note.is_empty() {
        out.paragraph(&format!("({})", part.note));
    }
}

fn analysis(out: &mut Text, page: &Page<'_>, index: usize) {
    let analysis = &page.result.analyses[index].result;
    let title = analysis_title(analysis);
    out.heading(2, &format!("{}. {title}", index + 1));
    if let AnalysisResult::Compare(r) = analysis {
        out.paragraph(plain_verdict(r.plain_is_good_enough));
    }
    let of_shaft = matches!(analysis, AnalysisResult::Speed(_));
    for said in parts(page.result, index, None) {
        if !of_shaft {
            out.heading(3, &said.title);
        }
        part(out, said);
    }
    out.pictures(&page.pictures[index], title);
    out.heading(3, "What limits this");
    out.items(limits(page.result, index));
}

fn ledger(out: &mut Text, result: &RunResult) {
    let speed = &result.speed;
    out.heading(2, "Ledger of the pulses");
    out.paragraph(&format!(
        "Nothing is corrected silently. {} timed, {} used; {}. {}.",
        count(speed.pulses.timed, "pulse"),
        speed.pulses.used,
        ledger_count(speed),
        phase_reference(speed)
    ));
    let shown = &speed.ledger[..speed.ledger.len().min(LEDGER_ROWS)];
    if shown.is_empty() {
        return;
    }
    let mut table = Table::default();
    table
        .numbers(
            "time, s",
            shown.iter().map(|l| fixed(l.time_s, 6)).collect(),
        )
        .words("action", shown.iter().map(|l| clean(&l.action)).collect())
        .words("reason", shown.iter().map(|l| clean(&l.reason)).collect());
    out.table(&table);
    let more = speed.ledger.len() - shown.len();
    if more > 0 {
        out.paragraph(&format!(
            "The first {} of {} entries; all are in results.json.",
            shown.len(),
            speed.ledger.len()
        ));
    }
}

fn settings(out: &mut Text, result: &RunResult) {
    out.heading(2, "Settings, as done");
    for (index, outcome) in result.analyses.iter().enumerate() {
        out.heading(3, &format!("{}. {}", index + 1, outcome.command));
        let rows = match &outcome.settings {
            Value::Object(map) => map
                .iter()
                .filter(|(_, value)| !value.is_null())
                .map(|(key, value)| (clean(key), value_text(value)))
                .collect(),
            other => vec![("settings".to_owned(), value_text(other))],
        };
        out.table(&two_columns("setting", "value", rows));
    }
}

fn warnings(out: &mut Text, result: &RunResult) {
    out.heading(2, "Warnings");
    let of_analyses = result.analyses.iter().enumerate().flat_map(|(i, o)| {
        let name = format!("{}. {}", i + 1, o.command);
        o.warnings
            .iter()
            .map(move |w| format!("{name}: {}", clean(w)))
    });
    let all: Vec<String> = result
        .warnings
        .iter()
        .map(|w| clean(w))
        .chain(of_analyses)
        .collect();
    if all.is_empty() {
        out.paragraph("None.");
    } else {
        out.items(all);
    }
}

fn files(out: &mut Text, page: &Page<'_>) {
    out.heading(2, "Files of this report");
    out.items(&page.files);
    out.paragraph("What else lies in this folder is not of this run.");
    out.heading(2, "To run it again");
    let line = clean(&page.context.command_line);
    let fence = "`".repeat(3.max(longest_run(&line, '`') + 1));
    out.block(&format!("{fence}\n{line}\n{fence}"));
    out.paragraph(&format!(
        "shaftwise {}, instruction set {}; the same build on the same instruction set gives the same bytes.",
        page.context.version, page.result.cpu_level
    ));
}

fn longest_run(text: &str, of: char) -> usize {
    text.split(|c| c != of).map(str::len).max().unwrap_or(0)
}
