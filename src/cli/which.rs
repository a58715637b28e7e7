//! Which daemon is meant, and the way to it: what `run`, `tell` and `status` share.

use super::Failure;
use std::path::PathBuf;

#[derive(clap::Args, Clone, Debug)]
pub struct Which {
    /// What the daemon is called; with several on one machine each has its own name
    #[arg(long, default_value = "trued")]
    pub name: String,
    /// Where its control socket lies, if not in the usual place
    #[arg(long, value_name = "PATH")]
    pub socket: Option<PathBuf>,
}

#[cfg(target_os = "linux")]
pub use line::Line;

#[cfg(target_os = "linux")]
mod line {
    use super::{Failure, Which};
    use crate::daemon::place;
    use std::io::{self, BufRead, BufReader, ErrorKind, Write};
    use std::os::unix::net::UnixStream;
    use std::path::PathBuf;
    use std::time::Duration;

    /// How long an answer may take.
    const PATIENCE: Duration = Duration::from_secs(5);

    /// A line to a running daemon. What is said on it stands at the head of `daemon/socket.rs`.
    pub struct Line {
        reader: BufReader<UnixStream>,
        path: PathBuf,
    }

    impl Which {
        /// Whether a daemon may be called so.
        pub fn check(&self) -> Result<(), Failure> {
            place::check_name(&self.name).map_err(|text| Failure::new(Failure::USAGE, text))
        }

        /// Calls the daemon, at the first place where one answers.
        pub fn call(&self) -> Result<Line, Failure> {
            self.check()?;
            let places = match &self.socket {
                Some(path) => vec![path.clone()],
                None => place::candidates(&self.name),
            };
            let mut forbidden = None;
            for path in places {
                let folder = path.parent().filter(|_| self.socket.is_none());
                if folder.is_some_and(|folder| place::is_safe(folder).is_err()) {
                    continue;
                }
                match UnixStream::connect(&path) {
                    Ok(stream) => return Line::on(stream, path),
                    Err(error) if error.kind() == ErrorKind::PermissionDenied => {
                        forbidden.get_or_insert(path);
                    }
                    Err(_) => {}
                }
            }
            Err(self.nobody(forbidden))
        }

        fn nobody(&self, forbidden: Option<PathBuf>) -> Failure {
            let text = match (forbidden, &self.socket) {
                (Some(path), _) => format!(
                    "This user may not talk to the daemon ({}); join the group that the socket belongs to (often: audio)",
                    path.display()
                ),
                (None, Some(path)) => format!(
                    "No daemon answers at {}; start one with `trued run STAGE --socket {0}`",
                    path.display()
                ),
                (None, None) => format!(
                    "No daemon called {} is running; start one with `trued run STAGE`, or say which with --name or --socket",
                    self.name
                ),
            };
            Failure::new(Failure::UNAVAILABLE, text)
        }
    }

    impl Line {
        fn on(stream: UnixStream, path: PathBuf) -> Result<Line, Failure> {
            let line = Line {
                reader: BufReader::new(stream),
                path,
            };
            line.patience(Some(PATIENCE));
            Ok(line)
        }

        /// Asks, and gives the answer's code and text, then all its further lines.
        pub fn ask(&mut self, request: &str) -> Result<(u8, String, String), Failure> {
            let answered = self.try_ask(request);
            answered.map_err(|error| {
                let text = format!(
                    "The daemon at {} does not answer ({error})",
                    self.path.display()
                );
                Failure::new(Failure::UNAVAILABLE, text)
            })
        }

        /// The next line that the daemon says by itself; `None` once it has hung up. Waits for ever.
        pub fn next(&mut self) -> Option<String> {
            self.patience(None);
            let mut line = String::new();
            match self.reader.read_line(&mut line) {
                Ok(count) if count > 0 => Some(line),
                _ => None,
            }
        }

        fn try_ask(&mut self, request: &str) -> io::Result<(u8, String, String)> {
            let request = request.replace(['\n', '\r'], " ") + "\n";
            self.reader.get_mut().write_all(request.as_bytes())?;
            let first = self.line()?;
            let (code, text) = first
                .trim_end()
                .split_once(' ')
                .unwrap_or((first.trim_end(), ""));
            let code = code
                .parse()
                .map_err(|_| io::Error::other("it is not trued"))?;
            let mut more = String::new();
            loop {
                let line = self.line()?;
                if line == "\n" {
                    return Ok((code, text.to_string(), more));
                }
                more += &line;
            }
        }

        fn line(&mut self) -> io::Result<String> {
            let mut line = String::new();
            match self.reader.read_line(&mut line)? {
                0 => Err(io::Error::other("it has hung up")),
                _ => Ok(line),
            }
        }

        fn patience(&self, patience: Option<Duration>) {
            // Refused only for a span of zero.
            let _ = self.reader.get_ref().set_read_timeout(patience);
            let _ = self.reader.get_ref().set_write_timeout(patience);
        }
    }
}

/// What is said where there are no daemons.
#[cfg(not(target_os = "linux"))]
pub fn nowhere() -> Failure {
    Failure::new(
        Failure::UNAVAILABLE,
        "this version plays on Linux only, so no daemon can be running here",
    )
}
