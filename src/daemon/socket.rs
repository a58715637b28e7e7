//! The control socket: what other programs on this machine may ask of a running daemon.
//!
//! # What is said on it
//!
//! A Unix stream socket, open to its user and group (0660). Lines of plain text, UTF-8, ended by a newline. A line asks:
//!
//! | line | answer |
//! |---|---|
//! | `tell WORDS` | what was done, or why not |
//! | `status`, `status json` | how things stand, in sentences or as one object |
//! | `follow`, `follow json` | the same, and after that a line for each change until either side hangs up |
//!
//! An answer begins with a line of a number and a text: `0 song 2 of 5: Ballad`. 0 is done, 64 not understood or not to
//! be done, 69 not possible now; they are the exit codes of `trued tell`. More lines may follow; an empty line ends the
//! answer. Several lines may be asked one after the other; each is answered before the next is read.
//!
//! # What it cannot do to us
//!
//! Nothing here waits for a client. A line is at most [`LINE_BYTES`] long; who sends a longer one is told so and hung up
//! on. Who does not read loses the connection once [`UNREAD_BYTES`] wait for it. There are at most [`CLIENTS`]; one more
//! and the oldest that only listens or dawdles goes.

use crate::ports::system::{Bell, lock, readable, wait};
use crate::time::Span;
use libc::{POLLERR, POLLHUP, POLLOUT, pollfd};
use std::fs::{self, File};
use std::io::{self, ErrorKind, Read, Write};
use std::os::fd::AsRawFd;
use std::os::unix::fs::{FileTypeExt, MetadataExt, PermissionsExt};
use std::os::unix::net::{UnixListener, UnixStream};
use std::path::{Path, PathBuf};
use std::time::Duration;

/// The longest line that can be asked.
pub const LINE_BYTES: usize = 1_024;
/// What may wait for a client that does not read.
pub const UNREAD_BYTES: usize = 64 * 1_024;
/// Connections at one time.
pub const CLIENTS: usize = 32;
/// New connections in one look, so that a flood of them does not hold the desk.
const ACCEPTS: usize = 64;
/// Others who start need the folder for a moment each; ten seconds are enough for many on a busy machine.
const LOCK_TRIES: u32 = 2_000;
const LOCK_PAUSE: Duration = Duration::from_millis(5);

/// Who asked. Never used twice.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct ClientId(u64);

/// One line, understood as far as the socket goes.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Request {
    Tell(String),
    Status(Form),
    Follow(Form),
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Form {
    Text,
    Json,
}

/// Why there is no socket.
#[derive(Debug)]
pub enum Unopened {
    /// A running daemon has it.
    Taken,
    Failed(io::Error),
}

pub struct Socket {
    listener: UnixListener,
    path: PathBuf,
    inode: u64,
    clients: Vec<Client>,
    known: u64,
}

struct Client {
    id: ClientId,
    stream: UnixStream,
    input: Vec<u8>,
    output: Vec<u8>,
    follows: Option<Form>,
    /// Has asked and is not answered yet.
    waits: bool,
    /// Says nothing more, but may still read.
    ended: bool,
    gone: bool,
}

impl Socket {
    /// Opens a socket at this path. What a dead daemon left there is replaced.
    ///
    /// # Errors
    /// A living daemon has it, or it cannot be made there.
    pub fn open(path: &Path) -> Result<Socket, Unopened> {
        // From looking who is there until we listen, nobody else of us is at it: else two that start at one moment could
        // both find a dead daemon's socket, and the second would remove that of the first.
        let _alone = alone_in(path.parent()).map_err(Unopened::Failed)?;
        remove_dead(path)?;
        let listener = UnixListener::bind(path).map_err(|error| match error.kind() {
            ErrorKind::AddrInUse => Unopened::Taken,
            _ => Unopened::Failed(error),
        })?;
        let open = || -> io::Result<u64> {
            fs::set_permissions(path, fs::Permissions::from_mode(0o660))?;
            listener.set_nonblocking(true)?;
            Ok(fs::symlink_metadata(path)?.ino())
        };
        Ok(Socket {
            inode: open().map_err(Unopened::Failed)?,
            listener,
            path: path.to_owned(),
            clients: Vec::with_capacity(CLIENTS),
            known: 0,
        })
    }

    pub fn path(&self) -> &Path {
        &self.path
    }

    /// Returns once somebody asks or can be written to, the bell rings, or the time is over.
    pub fn wait(&mut self, bell: &Bell, at_most: Span) {
        let more = self.clients.iter().any(Client::has_line);
        let at_most = if more { Span::ZERO } else { at_most };
        let client_fd = |client: &Client| pollfd {
            fd: client.stream.as_raw_fd(),
            events: {
                let reads = if client.reads() { libc::POLLIN } else { 0 };
                let writes = if client.output.is_empty() { 0 } else { POLLOUT };
                reads | writes
            },
            revents: 0,
        };
        let mut fds = vec![readable(self.listener.as_raw_fd()), readable(bell.fd())];
        fds.extend(self.clients.iter().map(client_fd));
        if wait(&mut fds, Some(at_most)).is_err() {
            return; // the next look tells who is there
        }
        for (client, fd) in self.clients.iter_mut().zip(&fds[2..]) {
            client.gone |= fd.revents & POLLERR != 0;
            client.gone |= client.ended && fd.revents & POLLHUP != 0;
        }
    }

    /// Everything that has been asked, at most one line from each client.
    pub fn requests(&mut self) -> Vec<(ClientId, Request)> {
        self.accept();
        let mut requests = Vec::new();
        for client in &mut self.clients {
            client.read();
            let Some(line) = client.line() else { continue };
            match parse(&line) {
                Some(request) => {
                    client.waits = true;
                    requests.push((client.id, request));
                }
                None => client.answer(
                    64,
                    "this is not understood; write tell WORDS, status or follow",
                    "",
                ),
            }
        }
        self.clients.retain(Client::is_there);
        requests
    }

    /// Answers who asked. `more` are further lines.
    pub fn answer(&mut self, to: ClientId, code: u8, text: &str, more: &str) {
        if let Some(client) = self.client(to) {
            client.answer(code, text, more);
        }
    }

    /// From now on this client hears of every change.
    pub fn begin_to_follow(&mut self, id: ClientId, form: Form) {
        if let Some(client) = self.client(id) {
            client.follows = Some(form);
        }
    }

    pub fn has_followers(&self) -> bool {
        self.clients.iter().any(|client| client.follows.is_some())
    }

    /// Says lines to all who follow in this form.
    pub fn tell_followers(&mut self, form: Form, lines: &str) {
        for client in &mut self.clients {
            if client.follows == Some(form) {
                client.say(lines.as_bytes());
            }
        }
        self.clients.retain(Client::is_there);
    }

    fn client(&mut self, id: ClientId) -> Option<&mut Client> {
        self.clients.iter_mut().find(|client| client.id == id)
    }

    fn accept(&mut self) {
        for _ in 0..ACCEPTS {
            let Ok((stream, _)) = self.listener.accept() else {
                return; // nobody, or no descriptor left for them
            };
            if stream.set_nonblocking(true).is_err() {
                continue;
            }
            if self.clients.len() == CLIENTS {
                let dawdles = |client: &Client| client.follows.is_none() && !client.waits;
                let oldest = self.clients.iter().position(dawdles).unwrap_or(0);
                self.clients.remove(oldest);
            }
            self.known += 1;
            let mut client = Client {
                id: ClientId(self.known),
                stream,
                input: Vec::new(),
                output: Vec::new(),
                follows: None,
                waits: false,
                ended: false,
                gone: false,
            };
            client.read();
            self.clients.push(client);
        }
    }
}

impl Drop for Socket {
    fn drop(&mut self) {
        // Another daemon may have taken the place of one that was thought dead.
        let ours = |found: fs::Metadata| found.ino() == self.inode;
        if fs::symlink_metadata(&self.path).is_ok_and(ours) {
            let _ = fs::remove_file(&self.path);
        }
    }
}

/// Nobody else of us opens a socket in this folder as long as the file lives. The folder itself is locked, so nothing is
/// left behind.
fn alone_in(folder: Option<&Path>) -> io::Result<File> {
    let folder = folder.filter(|folder| !folder.as_os_str().is_empty());
    let file = File::open(folder.unwrap_or(Path::new(".")))?;
    for _ in 0..LOCK_TRIES {
        if lock(&file)? {
            return Ok(file);
        }
        std::thread::sleep(LOCK_PAUSE);
    }
    let text = "its folder has been locked for long by somebody else";
    Err(io::Error::other(text))
}

/// Makes room where a dead daemon's socket lies; leaves alone what is alive or no socket at all.
fn remove_dead(path: &Path) -> Result<(), Unopened> {
    let found = match fs::symlink_metadata(path) {
        Err(error) if error.kind() == ErrorKind::NotFound => return Ok(()),
        found => found.map_err(Unopened::Failed)?,
    };
    if !found.file_type().is_socket() {
        let text = format!("{} is there and is no socket", path.display());
        return Err(Unopened::Failed(io::Error::other(text)));
    }
    match UnixStream::connect(path) {
        Ok(_) => Err(Unopened::Taken),
        Err(error) if error.kind() == ErrorKind::ConnectionRefused => {
            fs::remove_file(path).map_err(Unopened::Failed)
        }
        Err(error) => Err(Unopened::Failed(error)),
    }
}

fn parse(line: &str) -> Option<Request> {
    let line = line.trim();
    let (first, rest) = line.split_once(char::is_whitespace).unwrap_or((line, ""));
    let form = match rest.trim() {
        "" => Some(Form::Text),
        "json" => Some(Form::Json),
        _ => None,
    };
    match first {
        "tell" => Some(Request::Tell(rest.trim().to_string())),
        "status" => form.map(Request::Status),
        "follow" => form.map(Request::Follow),
        _ => None,
    }
}

impl Client {
    /// Whether more of it is wanted now.
    fn reads(&self) -> bool {
        !self.ended && !self.waits && self.input.len() <= LINE_BYTES
    }

    /// Whether a whole line lies here that may be answered now.
    fn has_line(&self) -> bool {
        !self.waits && self.input.contains(&b'\n')
    }

    /// Takes in what has come, at most a little over one line.
    fn read(&mut self) {
        let mut buffer = [0; LINE_BYTES];
        while self.reads() && !self.has_line() {
            match self.stream.read(&mut buffer) {
                Ok(0) => self.ended = true,
                Ok(count) => self.input.extend_from_slice(&buffer[..count]),
                Err(error) if error.kind() == ErrorKind::Interrupted => {}
                Err(error) if error.kind() == ErrorKind::WouldBlock => break,
                Err(_) => {
                    self.gone = true;
                    break;
                }
            }
        }
        self.flush();
    }

    /// The next whole line, if it may ask one. Hangs up on one that will never end.
    fn line(&mut self) -> Option<String> {
        if self.waits || self.gone {
            return None;
        }
        let end = self.input.iter().position(|byte| *byte == b'\n');
        let too_long = end.unwrap_or(self.input.len()) > LINE_BYTES;
        if too_long {
            let text = format!("a line is at most {LINE_BYTES} bytes long");
            self.answer(64, &text, "");
            self.input.clear();
            self.ended = true;
            return None;
        }
        let line: Vec<u8> = self.input.drain(..=end?).collect();
        Some(String::from_utf8_lossy(&line).into_owned())
    }

    fn answer(&mut self, code: u8, text: &str, more: &str) {
        let text = text.replace(['\n', '\r'], " ");
        let end = if more.is_empty() || more.ends_with('\n') {
            ""
        } else {
            "\n"
        };
        self.waits = false;
        self.say(format!("{code} {text}\n{more}{end}\n").as_bytes());
    }

    fn say(&mut self, bytes: &[u8]) {
        self.output.extend_from_slice(bytes);
        self.flush();
        self.gone |= self.output.len() > UNREAD_BYTES;
    }

    fn flush(&mut self) {
        while !self.output.is_empty() && !self.gone {
            match self.stream.write(&self.output) {
                Ok(0) => self.gone = true,
                Ok(count) => drop(self.output.drain(..count)),
                Err(error) if error.kind() == ErrorKind::Interrupted => {}
                Err(error) if error.kind() == ErrorKind::WouldBlock => return,
                Err(_) => self.gone = true,
            }
        }
    }

    /// Who says nothing more, waits for nothing and follows nothing is done with.
    fn is_there(&self) -> bool {
        let busy = self.waits || self.follows.is_some() || !self.output.is_empty();
        let asks = self.input.contains(&b'\n');
        !self.gone && (!self.ended || busy || asks)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_ask() {
        let tell = |words: &str| Some(Request::Tell(words.to_string()));
        assert_eq!(
            parse("tell  next from Lantern hymn "),
            tell("next from Lantern hymn")
        );
        assert_eq!(parse("status"), Some(Request::Status(Form::Text)));
        assert_eq!(parse("follow json"), Some(Request::Follow(Form::Json)));
        assert_eq!(parse("status xml"), None);
        assert_eq!(parse("GET / HTTP/1.1"), None);
        assert_eq!(parse(""), None);
    }
}
