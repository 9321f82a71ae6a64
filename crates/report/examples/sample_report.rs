//! Writes the report of a made-up run into a folder, to look at every figure and the page:
//! `cargo run -p shaftwise-report --example sample_report -- DIR`.

#[path = "../tests/fixture/mod.rs"]
#[allow(dead_code, missing_docs, unreachable_pub)]
mod fixture;

use std::io::Write;

use shaftwise_report::{OutputOptions, prepare, report_summary, summary};

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let dir = std::env::args()
        .nth(1)
        .unwrap_or_else(|| "report".to_owned());
    let prepared = prepare(&OutputOptions {
        dir: dir.into(),
        png: true,
        svg: false,
        dpi: 300,
        figures: true,
    })?;
    let (run, context) = (fixture::full_run(), fixture::context());
    let written = prepared.write_report(&run, &context)?;
    let mut out = std::io::stdout().lock();
    for index in 0..run.analyses.len() {
        writeln!(out, "{}", summary(&run, index, &context))?;
    }
    write!(out, "{}", report_summary(&run, &written, &context))?;
    Ok(())
}
