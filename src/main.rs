//! The `shaftwise` program: flags, messages, progress and exit status. No mathematics.

mod analysis;
mod command_line;
mod demo;
mod failure;
mod flags;
mod interruption;
mod request;
mod speech;
mod value;

use clap::Parser;
use failure::Failure;
use flags::{Command, Flags};
use request::Request;
use std::process::ExitCode;

fn main() -> ExitCode {
    let flags = match Flags::try_parse() {
        Ok(flags) => flags,
        Err(refusal) => return speech::refuse(&refusal),
    };
    match run(&flags.command) {
        Ok(()) => ExitCode::SUCCESS,
        Err(failure) => {
            speech::complain(&failure);
            failure.status.into()
        }
    }
}

/// Does what a command line asks for.
fn run(command: &Command) -> Result<(), Failure> {
    match command {
        Command::Speed(flags) => {
            let request = Request::new(&flags.common)?;
            let analysis = request.speed(flags);
            analysis::analyse(request, analysis, &flags.output)
        }
        Command::Spectrum(flags) => {
            let request = Request::new(&flags.common)?;
            let analysis = request.spectrum(flags);
            analysis::analyse(request, analysis, &flags.output)
        }
        Command::Synchronous(flags) => {
            let request = Request::new(&flags.common)?;
            let analysis = request.synchronous(flags);
            analysis::analyse(request, analysis, &flags.output)
        }
        Command::Compare(flags) => {
            let request = Request::new(&flags.common)?;
            let analysis = request.compare(flags);
            analysis::analyse(request, analysis, &flags.output)
        }
        Command::Report(flags) => analysis::report(&Request::new(&flags.common)?, &flags.output),
        Command::Demo(flags) => demo::demo(flags),
    }
}
