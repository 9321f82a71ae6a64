//! One ready job: a recording, its tach and everything to work out from it in one go.

use crate::settings::{Analysis, RecordingSettings, Selection, TachSettings};
use std::path::PathBuf;
use std::sync::atomic::AtomicBool;

/// A job with nothing left to look up.
#[derive(Debug, Clone, PartialEq)]
pub struct Job {
    /// The recording; its `file` is relative to `base`, "-" is standard input.
    pub recording: RecordingSettings,
    /// The tach; its `times` file is relative to `base`.
    pub tach: TachSettings,
    /// The part that counts.
    pub select: Selection,
    /// What to work out; one pass serves all.
    pub analyses: Vec<Analysis>,
    /// Folder that relative file names start from.
    pub base: PathBuf,
    /// Worker threads, at least 1. Never changes a result.
    pub threads: usize,
}

/// How far a run has come.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Progress {
    /// What is being done, such as "reading the tach".
    pub stage: &'static str,
    /// Share done, 0…1.
    pub share: f64,
}

/// The caller's side of a run.
pub struct Control<'a> {
    /// Called from time to time, from the thread that called `execute`.
    pub progress: &'a dyn Fn(Progress),
    /// Set to stop the run at the next chunk.
    pub cancel: &'a AtomicBool,
}
