//! What a supervisor is told, in systemd's words: that we are ready, what we are doing, that we are alive.
//!
//! The protocol is one datagram of `NAME=value` lines to the socket named in `$NOTIFY_SOCKET` (manual page sd_notify(3)).
//! Without that variable nothing is said.

use crate::ports::clock::monotonic_micros;
use crate::time::{Span, Time};
use std::ffi::{OsStr, OsString};
use std::os::linux::net::SocketAddrExt;
use std::os::unix::ffi::OsStrExt;
use std::os::unix::net::{SocketAddr, UnixDatagram};

/// The way to the supervisor, and when it was last told that we live.
#[derive(Debug, Default)]
pub struct Systemd {
    way: Option<(UnixDatagram, SocketAddr)>,
    /// It kills us after so long without a ping.
    watchdog: Option<Span>,
    pinged_at: Option<Time>,
    status: String,
}

impl Systemd {
    /// As the environment says.
    pub fn from_environment() -> Systemd {
        let number = |name: &str| std::env::var(name).ok()?.parse::<u64>().ok();
        let ours = |pid: u64| pid == u64::from(std::process::id());
        let watchdog = number("WATCHDOG_USEC")
            .filter(|_| number("WATCHDOG_PID").is_none_or(ours))
            .map(|micros| Span::from_nanos(micros.saturating_mul(1_000)));
        Systemd::new(std::env::var_os("NOTIFY_SOCKET"), watchdog)
    }

    /// To this address: a path, or `@` and an abstract name.
    pub fn new(address: Option<OsString>, watchdog: Option<Span>) -> Systemd {
        Systemd {
            way: address.and_then(|address| way(&address)),
            watchdog: watchdog.filter(|span| *span > Span::ZERO),
            ..Systemd::default()
        }
    }

    /// Everything is open and the engine waits.
    pub fn ready(&self) {
        self.say("READY=1");
    }

    /// `ready` follows. The time is for `Type=notify-reload`, which wants to know which reload is meant.
    pub fn reloading(&self) {
        let micros = monotonic_micros();
        self.say(&format!("RELOADING=1\nMONOTONIC_USEC={micros}"));
    }

    pub fn stopping(&self) {
        self.say("STOPPING=1");
    }

    /// One line on how things stand, said when it has changed.
    pub fn status(&mut self, text: &str) {
        let text = text.replace('\n', " ");
        if text != self.status && self.say(&format!("STATUS={text}")) {
            self.status = text;
        }
    }

    /// Pings if it is time, which is twice in each span the supervisor allows; says whether it did.
    /// Ask only if there has been a sign of life since the last.
    pub fn ping(&mut self, now: Time) -> bool {
        let Some(watchdog) = self.watchdog else {
            return false;
        };
        let half = Span::from_nanos(watchdog.nanos() / 2);
        let due = self.pinged_at.is_none_or(|at| now.since(at) >= half);
        let pings = due && self.say("WATCHDOG=1");
        if pings {
            self.pinged_at = Some(now);
        }
        pings
    }

    /// A supervisor that does not read is not waited for.
    fn say(&self, text: &str) -> bool {
        let Some((socket, to)) = &self.way else {
            return false;
        };
        socket.send_to_addr(text.as_bytes(), to).is_ok()
    }
}

fn way(address: &OsStr) -> Option<(UnixDatagram, SocketAddr)> {
    let to = match address.as_bytes() {
        [b'@', name @ ..] => SocketAddr::from_abstract_name(name),
        _ => SocketAddr::from_pathname(address),
    };
    let socket = UnixDatagram::unbound().ok()?;
    socket.set_nonblocking(true).ok()?;
    Some((socket, to.ok()?))
}
