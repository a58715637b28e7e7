//! `trued tell`: a word to the running daemon.

use super::{Failure, which::Which};
use crate::stage::words::Words;

#[derive(clap::Args)]
pub struct Args {
    #[command(flatten)]
    which: Which,
    /// What is to be done, in the words that also stand after `do:` in a stage file
    #[arg(required = true, trailing_var_arg = true, allow_hyphen_values = true)]
    words: Vec<String>,
}

pub fn run(args: Args) -> Result<(), Failure> {
    let words = args.words.join(" ");
    // Looked at here too: a slip of the hand is told even when nobody listens.
    Words::parse(&words).map_err(|mistake| {
        Failure::new(
            Failure::USAGE,
            format!("{}; {}", mistake.wrong, mistake.right),
        )
    })?;
    tell(&args.which, &words)
}

#[cfg(target_os = "linux")]
fn tell(which: &Which, words: &str) -> Result<(), Failure> {
    let (code, text, _) = which.call()?.ask(&format!("tell {words}"))?;
    match code {
        0 => super::print(&format!("{text}\n")),
        code => Err(Failure::new(code, text)),
    }
}

#[cfg(not(target_os = "linux"))]
fn tell(_: &Which, _: &str) -> Result<(), Failure> {
    Err(super::which::nowhere())
}
