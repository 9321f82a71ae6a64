//! Run file, settings and the engine: passes, chunks and threads. Draws nothing, prints nothing.

mod results;
mod settings;

pub use results::*;
pub use settings::*;
