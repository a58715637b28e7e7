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
mod status;
mod tell;
mod which;

use crate::stage::Stage;
use crate::stage::complaint::Complaint;
use clap::{Parser, Subcommand};
use std::io::Write;
use std::path::Path;
use std::process::ExitCode;

/// Gives every note of a keyboard the pitch the song asks for.
#[derive(Parser)]
#[command(
    name = "trued",
    version,
    propagate_version = true,
    arg_required_else_help = true,
    disable_help_subcommand = true,
    after_help = "\
Examples:
  trued rehearse                             hear what it does; no keyboard or synth needed
  trued ports --stage > evening.yaml         a stage file from what is plugged in
  trued check evening.yaml                   what is wrong with it, and what to expect
  trued run evening.yaml                     play
  trued tell next                            a word to the one that is playing
  trued status                               how it stands
  trued chart --tuning vallotti              what every key sounds
  trued retune evening.yaml in.mid out.mid   the same for a MIDI file

Ends with 0 when done, 64 for a wrong command line, 65 for a file with mistakes in it, 66 for a file that is not there,
69 when ports or a sound system are missing, 70 for a bug of ours, 74 when reading or writing failed.
Colours are left out when NO_COLOR is set."
)]
struct Trued {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    /// Plays a score through the real engine into a built-in synth; no hardware needed
    #[command(after_help = "\
Examples:
  trued rehearse                              the demo, into the folder rehearsal
  trued rehearse rehearsal/stage.yaml         the demo again after you changed its stage file
  trued rehearse evening.yaml hymn.mid --out hymn-tonight

Writes rehearsal.mid (what the synth was told), .wav (what it sounds like), .svg (a picture of it) and .jsonl
(one line a note), and measures from the .wav what there is to hear. Nothing is played aloud.")]
    Rehearse(rehearse::Args),
    /// Plays: keyboards in, synths out, until it is told to stop
    #[command(after_help = "\
Example:
  trued run evening.yaml

Volume down before the first note. Ctrl-C or SIGTERM ends it cleanly: nothing is left sounding.")]
    Run(run::Args),
    /// Reads a stage file and says what is wrong with it, or what to expect of it
    #[command(after_help = "\
Examples:
  trued check evening.yaml
  trued check evening.yaml --defaults         with everything you did not say
  trued check --defaults                      every setting, what it is unless you say, and what it does")]
    Check(check::Args),
    /// Says what every key sounds, for a song or for a tuning by name
    #[command(after_help = "\
Examples:
  trued chart evening.yaml --song 'Lantern hymn'
  trued chart --tuning werckmeister-3 --pitch 415
  trued chart --list")]
    Chart(chart::Args),
    /// Plays a MIDI file through the engine into a file
    #[command(after_help = "\
Examples:
  trued retune evening.yaml in.mid out.mid
  trued retune evening.yaml in.mid out.wav out.svg out.jsonl --song 'Lantern hymn'

What is written goes by the ending: .mid MIDI with every input time and the division kept, .wav what it sounds like,
.svg a picture of the notes and where they stand, .jsonl one line a note.")]
    Retune(retune::Args),
    /// Says what is connected, and which of it a stage file would use
    #[command(after_help = "\
Examples:
  trued ports
  trued ports --watch                         press something: each gesture as a line to paste
  trued ports --stage > evening.yaml")]
    Ports(ports::Args),
    /// Tells the running daemon what to do
    #[command(after_help = "\
Examples:
  trued tell next
  trued tell song 3
  trued tell sevenths harmonic                from the next chord on, in a song with intonation: chord-root
  trued tell panic
  trued tell --name left back                 to the one that was started with --name left

The words are those that may stand after `do:` in a stage file. Ends with 0 when it was done, 64 when the words are not
understood or cannot be followed now, 69 when no daemon answers.")]
    Tell(tell::Args),
    /// Says how the running daemon stands: stage, song, ports, what gave way
    #[command(after_help = "\
Examples:
  trued status
  trued status --follow                       and then a line for each change
  trued status --json")]
    Status(status::Args),
}

/// Why a command could not do what was asked: one clear text for stderr, and the exit code.
#[derive(Debug)]
pub struct Failure {
    pub code: u8,
    pub text: String,
}

impl Failure {
    pub const USAGE: u8 = 64;
    pub const DATA: u8 = 65;
    pub const NO_INPUT: u8 = 66;
    pub const UNAVAILABLE: u8 = 69;
    pub const BUG: u8 = 70;
    pub const IO: u8 = 74;

    pub fn new(code: u8, text: impl Into<String>) -> Failure {
        Failure {
            code,
            text: text.into(),
        }
    }

    /// A file that could not be opened or read.
    pub fn unread(path: &Path, error: &std::io::Error) -> Failure {
        let (code, why) = match error.kind() {
            std::io::ErrorKind::NotFound => (Failure::NO_INPUT, "there is no such file".into()),
            std::io::ErrorKind::IsADirectory => {
                (Failure::NO_INPUT, "that is a folder, not a file".into())
            }
            _ => (Failure::IO, format!("cannot be read: {error}")),
        };
        Failure::new(code, format!("{}: {why}", path.display()))
    }

    /// A file that could not be written.
    pub fn unwritten(path: &Path, error: &std::io::Error) -> Failure {
        let text = format!("{}: cannot be written: {error}", path.display());
        Failure::new(Failure::IO, text)
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
    // A panic is a bug of ours; the hook has already said where. Nothing of the command is used again afterwards.
    match std::panic::catch_unwind(|| dispatch(arguments.command)) {
        Ok(Ok(())) => ExitCode::SUCCESS,
        Ok(Err(failure)) => {
            eprintln!("{}", failure.text.trim_end());
            ExitCode::from(failure.code)
        }
        Err(_) => {
            eprintln!("trued: this is a bug in trued, not a mistake of yours");
            ExitCode::from(Failure::BUG)
        }
    }
}

fn dispatch(command: Command) -> Result<(), Failure> {
    match command {
        Command::Rehearse(args) => rehearse::run(args),
        Command::Run(args) => run::run(args),
        Command::Check(args) => check::run(args),
        Command::Chart(args) => chart::run(args),
        Command::Retune(args) => retune::run(args),
        Command::Ports(args) => ports::run(args),
        Command::Tell(args) => tell::run(args),
        Command::Status(args) => status::run(args),
    }
}

/// A stage file, or all complaints about it, one a line.
pub fn read_stage(path: &Path) -> Result<Stage, Failure> {
    Stage::read(path).map_err(|complaints| unusable(path, &complaints))
}

/// What is wrong with a stage file; one that is not there has its own exit code.
pub fn unusable(path: &Path, complaints: &[Complaint]) -> Failure {
    if let Err(error) = std::fs::File::open(path) {
        return Failure::unread(path, &error);
    }
    let lines: Vec<String> = complaints.iter().map(Complaint::to_string).collect();
    Failure::new(Failure::DATA, lines.join("\n"))
}

/// Data for stdout. A reader that has seen enough (`| head`) is no error.
pub fn print(text: &str) -> Result<(), Failure> {
    print_bytes(text.as_bytes())
}

pub fn print_bytes(bytes: &[u8]) -> Result<(), Failure> {
    let mut stdout = std::io::stdout().lock();
    match stdout.write_all(bytes).and_then(|()| stdout.flush()) {
        Err(error) if error.kind() != std::io::ErrorKind::BrokenPipe => Err(Failure::new(
            Failure::IO,
            format!("standard output cannot be written: {error}"),
        )),
        _ => Ok(()),
    }
}

/// This program as the player called it, so that a line we print can be pasted.
fn called() -> String {
    let typed = std::env::args_os().next();
    typed.map_or("trued".into(), |name| name.to_string_lossy().into_owned())
}
