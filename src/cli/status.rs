//! `trued status`: how things stand in the running daemon.

use super::{Failure, which::Which};

#[derive(clap::Args)]
pub struct Args {
    #[command(flatten)]
    which: Which,
    /// As one JSON object on a line
    #[arg(long)]
    json: bool,
    /// Goes on: a line for each change, until you end it; waits for a daemon that is not there
    #[arg(long)]
    follow: bool,
}

#[cfg(not(target_os = "linux"))]
pub fn run(_: Args) -> Result<(), Failure> {
    Err(super::which::nowhere())
}

#[cfg(target_os = "linux")]
pub fn run(args: Args) -> Result<(), Failure> {
    let form = if args.json { " json" } else { "" };
    if args.follow {
        return follow(&args.which, form);
    }
    let (_, _, text) = asked(&mut args.which.call()?, &format!("status{form}"))?;
    super::print(&text)
}

#[cfg(target_os = "linux")]
fn asked(line: &mut super::which::Line, request: &str) -> Result<(u8, String, String), Failure> {
    match line.ask(request)? {
        (0, text, more) => Ok((0, text, more)),
        (code, text, _) => Err(Failure::new(code, text)),
    }
}

/// Calls again and again; ends only when nobody reads what it prints, or for a wrong command line.
#[cfg(target_os = "linux")]
fn follow(which: &Which, form: &str) -> Result<(), Failure> {
    const AGAIN: std::time::Duration = std::time::Duration::from_millis(500);
    which.check()?;
    let mut said = false;
    loop {
        match which.call().and_then(|line| show(line, form)) {
            Ok(Shown::NobodyReads) => return Ok(()),
            Ok(Shown::HungUp) => eprintln!("The daemon has gone; waiting for it"),
            Err(failure) if !said => eprintln!("{}. Waiting for it", failure.text),
            Err(_) => {}
        }
        said = true;
        std::thread::sleep(AGAIN);
    }
}

/// Why a line to the daemon has come to its end.
#[cfg(target_os = "linux")]
enum Shown {
    NobodyReads,
    HungUp,
}

/// Prints what comes on a line until it ends.
#[cfg(target_os = "linux")]
fn show(mut line: super::which::Line, form: &str) -> Result<Shown, Failure> {
    let (_, _, mut text) = asked(&mut line, &format!("follow{form}"))?;
    loop {
        if !still_read(&text)? {
            return Ok(Shown::NobodyReads);
        }
        match line.next() {
            Some(next) => text = next,
            None => return Ok(Shown::HungUp),
        }
    }
}

/// Prints; false once nobody reads.
#[cfg(target_os = "linux")]
fn still_read(text: &str) -> Result<bool, Failure> {
    use std::io::Write;
    let mut stdout = std::io::stdout().lock();
    let written = stdout.write_all(text.as_bytes());
    match written.and_then(|()| stdout.flush()) {
        Ok(()) => Ok(true),
        Err(error) if error.kind() == std::io::ErrorKind::BrokenPipe => Ok(false),
        Err(error) => Err(Failure::new(
            Failure::IO,
            format!("standard output cannot be written: {error}"),
        )),
    }
}
