//! What is said on the two standard streams. Plain characters, never a colour.

use crate::failure::{Failure, Status};
use shaftwise_run::Progress;
use std::cell::Cell;
use std::io::{ErrorKind, IsTerminal, Write};
use std::process::ExitCode;

/// Writes results. A reader that has heard enough is no failure.
pub(crate) fn say(text: &str) -> Result<(), Failure> {
    let mut out = std::io::stdout().lock();
    match out.write_all(text.as_bytes()).and_then(|()| out.flush()) {
        Err(error) if error.kind() != ErrorKind::BrokenPipe => Err(Failure::new(
            Status::Failed,
            format!("standard output: {error}"),
        )),
        _ => Ok(()),
    }
}

/// Says why the program ends.
pub(crate) fn complain(failure: &Failure) {
    note("error", &failure.message);
    if let Some(hint) = &failure.hint {
        note("hint", hint);
    }
}

/// Says what must be known beside the results.
pub(crate) fn warn(warnings: &[String]) {
    for warning in warnings {
        note("warning", warning);
    }
}

/// Says what is wrong with a command line, or the help that was asked for.
pub(crate) fn refuse(refusal: &clap::Error) -> ExitCode {
    let text = refusal.render().to_string();
    if !refusal.use_stderr() {
        return match say(&text) {
            Ok(()) => ExitCode::SUCCESS,
            Err(failure) => failure.status.into(),
        };
    }
    let text = text.replace("\n  tip: ", "\nhint: ").replace(
        "For more information, try",
        "hint: every flag with examples:",
    );
    let _ = std::io::stderr().lock().write_all(text.as_bytes());
    Status::Usage.into()
}

/// Nobody may be listening on standard error; there is no better place to say so.
fn note(kind: &str, text: &str) {
    let _ = writeln!(std::io::stderr().lock(), "{kind}: {text}");
}

/// One line on standard error that says how far the work has come, for somebody who waits there.
pub(crate) struct ProgressLine {
    shown: bool,
    last: Cell<(&'static str, u32)>,
    width: Cell<usize>,
}

impl ProgressLine {
    pub(crate) fn new(quiet: bool) -> Self {
        Self {
            shown: !quiet && std::io::stderr().is_terminal(),
            last: Cell::new(("", 0)),
            width: Cell::new(0),
        }
    }

    pub(crate) fn show(&self, progress: Progress) {
        let percent = (progress.share.clamp(0.0, 1.0) * 100.0) as u32;
        let now = (progress.stage, percent);
        if !self.shown || self.last.replace(now) == now {
            return;
        }
        let text = format!("{} {percent:3} %", progress.stage);
        let old = self.width.replace(text.chars().count());
        let _ = write!(std::io::stderr().lock(), "\r{text:old$}");
    }

    /// Leaves the line empty.
    pub(crate) fn clear(&self) {
        let width = self.width.take();
        if width > 0 {
            let _ = write!(std::io::stderr().lock(), "\r{:width$}\r", "");
        }
    }
}

impl Drop for ProgressLine {
    fn drop(&mut self) {
        self.clear();
    }
}
