//! The commands that work a recording out.

use crate::command_line::{Paths, command_line};
use crate::failure::{Failure, Status};
use crate::flags::{FigureFormat, OutputFlags};
use crate::interruption::interruption;
use crate::request::Request;
use crate::speech::{ProgressLine, say, warn};
use shaftwise_report::{Context, OutputOptions, Prepared};
use shaftwise_run::{Analysis, Control, Job, RunResult};
use std::path::{Path, PathBuf};
use std::sync::atomic::AtomicBool;

const VERSION: &str = env!("CARGO_PKG_VERSION");

/// One analysis: printed, and written where a folder is named.
pub(crate) fn analyse(
    mut request: Request,
    analysis: Analysis,
    output: &OutputFlags,
) -> Result<(), Failure> {
    request.run.analyses = vec![analysis];
    let job = request.job(output.threads)?;
    let cancel = interruption()?;
    let prepared = match &output.out {
        Some(out) => Some(prepare(out, output)?.cancelled_by(cancel)),
        None => None,
    };
    let result = execute(&job, output.quiet, cancel, request.unused_recordings())?;
    let written = match &prepared {
        Some(prepared) => prepared.write_command(&result, 0, &context(&request, Paths::Bare))?,
        None => Vec::new(),
    };
    warn_of(&result);
    if output.json {
        let json = shaftwise_report::command_json(&result, 0, VERSION);
        return say(&shaftwise_report::json_text(&json));
    }
    if output.quiet {
        return Ok(());
    }
    let context = context(&request, Paths::AsTyped);
    say(&shaftwise_report::summary(&result, 0, &context))?;
    say(&list(&written))
}

/// Everything a run file asks for, in one folder.
pub(crate) fn report(request: &Request, output: &OutputFlags) -> Result<(), Failure> {
    if !request.from_run_file {
        let message = "a report needs a run file; this is a recording";
        let hint = "`shaftwise report --help` shows a run file in short; `shaftwise spectrum` takes the recording as it is";
        return Err(Failure::new(Status::Failed, message).hint(hint));
    }
    if request.run.analyses.is_empty() {
        let message = "the run file asks for nothing: `analyses` is empty";
        let hint = "add \"analyses\": [{\"command\": \"spectrum\"}]";
        return Err(Failure::new(Status::Failed, message).hint(hint));
    }
    let job = request.job(output.threads)?;
    let out = output
        .out
        .clone()
        .unwrap_or_else(|| request.base.join("report"));
    let cancel = interruption()?;
    let prepared = prepare(&out, output)?.cancelled_by(cancel);
    let result = execute(&job, output.quiet, cancel, request.unused_recordings())?;
    let context = context(request, Paths::Bare);
    let written = prepared.write_report(&result, &context)?;
    warn_of(&result);
    if output.json {
        let json = shaftwise_report::report_json(&result, &context);
        return say(&shaftwise_report::json_text(&json));
    }
    if output.quiet {
        return Ok(());
    }
    say(&shaftwise_report::report_summary(
        &result, &written, &context,
    ))
}

fn warn_of(result: &RunResult) {
    warn(&result.warnings);
    for outcome in &result.analyses {
        warn(&outcome.warnings);
    }
}

/// Opens the folder, so that long work is not done for nothing.
fn prepare(out: &Path, output: &OutputFlags) -> Result<Prepared, Failure> {
    Ok(shaftwise_report::prepare(&OutputOptions {
        dir: out.to_path_buf(),
        png: output.format.contains(&FigureFormat::Png),
        svg: output.format.contains(&FigureFormat::Svg),
        dpi: output.dpi,
        figures: !output.no_figures,
    })?)
}

fn execute(
    job: &Job,
    quiet: bool,
    cancel: &AtomicBool,
    warning: Option<String>,
) -> Result<RunResult, Failure> {
    let line = ProgressLine::new(quiet);
    let control = Control {
        progress: &|progress| line.show(progress),
        cancel,
    };
    let mut result = shaftwise_run::execute(job, &control)?;
    result.warnings.splice(0..0, warning);
    Ok(result)
}

fn context(request: &Request, paths: Paths) -> Context {
    Context {
        version: VERSION,
        command_line: command_line(std::env::args_os(), paths),
        machine: request.run.machine.clone(),
        conditions: request.run.conditions.clone(),
    }
}

fn list(written: &[PathBuf]) -> String {
    written
        .iter()
        .map(|path| format!("wrote {}\n", path.display()))
        .collect()
}
