//! What players type at a shell: arguments in, an exit code out.
//!
//! **What this room is**: one file a command, each with its arguments and what they do.
//! **Start reading at** [`run`].
//! **May know** everything above the core.
//! **Owns** clap and the exit codes: 0 done, 64 usage, 65 bad data, 66 no such input, 69 unavailable, 70 our bug, 74 I/O.
//! Errors go to stderr, data to stdout.
//! **Not here**: the work itself.

mod chart;
mod check;
mod ports;
mod rehearse;
mod retune;
mod run;

use clap::{Parser, Subcommand};
use std::process::ExitCode;

/// Gives every note of a keyboard the pitch the song asks for.
#[derive(Parser)]
#[command(
    name = "trued",
    version,
    propagate_version = true,
    arg_required_else_help = true
)]
struct Trued {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    Rehearse(rehearse::Args),
    Run(run::Args),
    Check(check::Args),
    Chart(chart::Args),
    Retune(retune::Args),
    Ports(ports::Args),
}

/// Why a command could not do what was asked: one clear text for stderr, and the exit code.
pub struct Failure {
    pub code: u8,
    pub text: String,
}

impl Failure {
    pub const USAGE: u8 = 64;
    pub const DATA: u8 = 65;
    pub const NO_INPUT: u8 = 66;
    pub const UNAVAILABLE: u8 = 69;
    pub const IO: u8 = 74;

    pub fn new(code: u8, text: impl Into<String>) -> Failure {
        Failure {
            code,
            text: text.into(),
        }
    }
}

/// Reads the arguments and does what they say.
pub fn run() -> ExitCode {
    let arguments = match Trued::try_parse() {
        Ok(arguments) => arguments,
        Err(error) => {
            let _ = error.print();
            return ExitCode::from(if error.use_stderr() {
                Failure::USAGE
            } else {
                0
            });
        }
    };
    let done = match arguments.command {
        Command::Rehearse(args) => rehearse::run(args),
        Command::Run(args) => run::run(args),
        Command::Check(args) => check::run(args),
        Command::Chart(args) => chart::run(args),
        Command::Retune(args) => retune::run(args),
        Command::Ports(args) => ports::run(args),
    };
    match done {
        Ok(()) => ExitCode::SUCCESS,
        Err(failure) => {
            eprintln!("{}", failure.text.trim_end());
            ExitCode::from(failure.code)
        }
    }
}
