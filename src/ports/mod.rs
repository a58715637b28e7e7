//! Ports: bytes in from keyboards, bytes out to synths, and the loop that runs between them.
//!
//! **What this room is**: each backend is a loop ([`Backend::run`]) that waits, gathers what has arrived ([`Inbox`]),
//! runs one [`Cycle`] and writes what comes out ([`Outlet`]). What a cycle does is not known here.
//! **Start reading at** [`Cycle`], then `outbox.rs`; `alsa.rs` is the loop of a stage, `jack/process.rs` the other.
//! **May know** `time`, `limits`.
//! **Owns** alsa, jack, midir, crossbeam-channel, the only clock (`clock.rs`), the only unsafe code (`system.rs`; in `jack/` one signature), which port fits which name (`names.rs`),
//! and when a device has come or gone (`hotplug.rs`).
//! Nothing in a loop blocks but its one wait, and nothing in it logs or locks. Nothing allocates either, but for one
//! occasion: after an input overrun the sequencer is asked who is still connected.
//! **Not here**: the engine and what is done in a cycle (`daemon/`), what a stage file says (`stage/`).

#[cfg(target_os = "linux")]
pub mod alsa;
pub mod clock;
pub mod hotplug;
pub mod inbox;
#[cfg(target_os = "linux")]
pub mod jack;
pub mod loopback;
mod message;
pub mod midir;
pub mod names;
pub mod outbox;
#[cfg(target_os = "linux")]
#[allow(unsafe_code)]
pub mod system;

pub use inbox::{Inbox, What};
use names::{Address, Port, Wanted};
pub use outbox::{Outlet, Room, Weight, Wire};

use crate::time::Time;
use std::sync::atomic::{AtomicBool, AtomicU8, AtomicU64, Ordering};

/// One unit of the score thread's work. Must not block, allocate, lock or log.
pub trait Cycle {
    /// Takes in what has arrived, in order, and everything that falls due up to `to`, and sends what comes of it.
    fn run(&mut self, to: Time, inbox: &mut Inbox, outlet: &mut Outlet<'_>) -> Next;
}

/// What a loop does after a cycle.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Next {
    /// Waits for something to arrive, or for this time.
    Wait(Option<Time>),
    /// Ends: there is nothing more to do.
    Leave,
}

/// A way to ports.
pub trait Backend {
    /// Runs cycles until one of them says [`Next::Leave`].
    ///
    /// # Errors
    /// The connection to the system's ports is gone and does not come back by waiting.
    fn run(&mut self, cycle: &mut dyn Cycle) -> Result<(), Broken>;
}

/// Why a backend cannot be opened or cannot go on: what is wrong, and what would help.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Broken {
    pub wrong: String,
    pub right: String,
}

impl std::fmt::Display for Broken {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "{}; {}", self.wrong, self.right)
    }
}

/// What has become of the way to a synth.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Link {
    /// Connected as the loop began.
    Up,
    /// Connected later: it may have been lost before, or still be waking.
    Back,
    Down,
}

/// Ends a loop's wait early, so that it looks for what the desk has sent.
pub trait Ring: Send {
    fn ring(&self);
}

/// What the desk reads while a loop runs: mostly counts.
#[derive(Debug, Default)]
pub struct Tally {
    /// Ports that came, went or changed, or may have: time to look for devices again.
    pub changes: AtomicU64,
    /// Times that the system threw our input away because we were too slow.
    pub overruns: AtomicU64,
    /// Packets too long for us, or for the port they were to leave by.
    pub too_long: AtomicU64,
    /// Times that our own notes came back to us and were not heard.
    pub loops: AtomicU64,
    /// The thread that plays runs before all ordinary ones.
    pub real_time: AtomicBool,
    server: AtomicU8,
}

/// How it stands with the server that a backend's ports belong to. One that is part of the system always runs.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Server {
    #[default]
    Runs,
    Absent,
    /// It is there, and gives us no cycles.
    StandsStill,
}

impl Tally {
    pub fn server(&self) -> Server {
        match self.server.load(Ordering::Relaxed) {
            0 => Server::Runs,
            1 => Server::Absent,
            _ => Server::StandsStill,
        }
    }

    pub fn set_server(&self, server: Server) {
        self.server.store(server as u8, Ordering::Relaxed);
    }
}

/// The desk's view of a backend's ports, and its hand to connect them.
pub trait Patchbay: Send {
    /// Every port that others may connect to.
    fn ports(&self) -> Vec<Port>;

    /// What the devices wish for from now on. Only a backend without a port of ours for each of them needs to know.
    ///
    /// # Errors
    /// A port that others are to connect to cannot be had.
    fn offer(&self, _keyboards: &[Wanted], _synths: &[Wanted]) -> Result<(), Broken> {
        Ok(())
    }

    /// A port in words.
    fn shown(&self, address: Address) -> String;

    /// Connects two ports. Connected already is as good.
    ///
    /// # Errors
    /// One of them is gone or does not want it.
    fn connect(&self, from: Address, to: Address) -> Result<(), Broken>;

    /// Takes two ports apart. Not connected is as good.
    ///
    /// # Errors
    /// The backend is gone.
    fn disconnect(&self, from: Address, to: Address) -> Result<(), Broken>;

    /// Undoes every connection into a keyboard's port that brings back what goes out by the synths' ports; gives where
    /// they came from. A backend that cannot know of any leaves it at this.
    fn cut_loops(&self, _keyboard: Address, _synths: &[Address]) -> Vec<Address> {
        Vec::new()
    }
}
