//! `trued run`: the daemon in the foreground.

use super::Failure;
use super::which::Which;
use std::path::PathBuf;

#[derive(clap::Args)]
pub struct Args {
    /// The stage file of the evening
    stage: PathBuf,
    /// Start as the stage file says, and forget song, pitch and the like of the last time
    #[arg(long)]
    fresh: bool,
    /// Which sound system carries the MIDI
    #[arg(long, value_enum, default_value = "auto")]
    backend: Choice,
    #[command(flatten)]
    which: Which,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, clap::ValueEnum)]
enum Choice {
    /// What is there
    Auto,
    /// The Linux sequencer
    Alsa,
    /// A JACK server, or PipeWire in its place
    Jack,
    /// A crate for many systems: only where none of the others will do
    Midir,
}

pub fn run(args: Args) -> Result<(), Failure> {
    let Args {
        stage,
        fresh,
        backend,
        which,
    } = args;
    start_log();
    play(stage, backend, which, fresh)
}

#[cfg(target_os = "linux")]
fn play(file: PathBuf, backend: Choice, which: Which, fresh: bool) -> Result<(), Failure> {
    use crate::daemon::open::Asked;
    use crate::daemon::run::{Evening, Trouble, play};
    use crate::daemon::state::{Boot, folder};
    which.check()?;
    let state = folder();
    let boot = Boot::read(&file, state.as_deref())
        .map_err(|complaints| super::unusable(&file, &complaints))?;
    let Which { name, socket } = which;
    let asked = match backend {
        Choice::Alsa => Asked::Alsa,
        Choice::Jack => Asked::Jack,
        Choice::Midir => Asked::Midir,
        Choice::Auto => Asked::Auto,
    };
    let evening = Evening {
        file,
        asked,
        name,
        socket,
        state,
        fresh,
    };
    play(boot, &evening).map_err(|trouble| match trouble {
        Trouble::Taken(path) => Failure::new(
            Failure::UNAVAILABLE,
            format!(
                "A daemon of this name is running already ({}); stop it with `trued tell stop`, or give this one another --name",
                path.display()
            ),
        ),
        Trouble::Ports(broken) => Failure::new(Failure::UNAVAILABLE, broken.to_string()),
        Trouble::System(error) => {
            Failure::new(Failure::UNAVAILABLE, format!("The system refused: {error}"))
        }
        Trouble::Bug => Failure::new(
            Failure::BUG,
            "trued failed: this is a bug in trued, not a mistake of yours. Every synth was told to be silent",
        ),
    })
}

#[cfg(not(target_os = "linux"))]
fn play(_: PathBuf, _: Choice, _: Which, _: bool) -> Result<(), Failure> {
    Err(Failure::new(
        Failure::UNAVAILABLE,
        "this version plays on Linux only; check, chart, retune and rehearse work here",
    ))
}

/// The log goes to stderr, coloured only for a terminal that wants it.
fn start_log() {
    use std::io::IsTerminal;
    let wants = std::env::var_os("NO_COLOR").is_none_or(|value| value.is_empty());
    let colour = wants && std::io::stderr().is_terminal();
    // A log that was started already is as good.
    let _ = tracing_subscriber::fmt()
        .with_writer(std::io::stderr)
        .with_ansi(colour)
        .with_target(false)
        .try_init();
}
