//! Results to figures, tables and findings, written whole or not at all.
//!
//! A finished run ([`RunResult`](shaftwise_run::RunResult)) becomes
//!
//! - words for the terminal: [`summary()`], [`report_summary`];
//! - JSON with fixed names: [`command_json`], laid out by [`json_text`];
//! - files: [`prepare`] opens the folder before the long work, [`Prepared::write_command`] and
//!   [`Prepared::write_report`] fill it, [`write_wav`] writes samples.
//!
//! Every file is written beside its place under a temporary name, brought to the disk and renamed;
//! all of them are complete before the first one is renamed. Nothing here reads a clock, and
//! nothing here analyses: what is shown is what the run found, in the detector it names.

mod batch;
mod context;
mod curves;
mod error;
mod figure;
mod findings;
mod folder;
mod json;
mod name;
mod next;
mod number;
mod shown;
mod summary;
mod table;
mod wav;
mod words;

pub use context::Context;
pub use error::Error;
pub use folder::{OutputOptions, Prepared, prepare};
pub use json::{command_json, json_text, report_json};
pub use summary::{report_summary, summary};
pub use wav::write_wav;
