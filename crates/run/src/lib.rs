//! Run file, settings and the engine: passes, chunks and threads. Draws nothing, prints nothing.

mod chunk;
mod engine;
mod error;
mod fault;
mod job;
mod outcome;
mod pass_one;
mod place;
mod plan;
mod results;
mod run_file;
mod schema;
mod settings;
mod spinning;
mod workers;

pub use engine::execute;
pub use error::Error;
pub use fault::{Fault, FaultKind};
pub use job::{Control, Job, Progress};
pub use outcome::detector_factor;
pub use results::*;
pub use schema::schema_json;
pub use settings::*;
