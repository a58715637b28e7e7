//! The daemon: what runs while people play.
//!
//! **What this room is**: two threads. The score thread runs a backend's loop, and in it one [`Player`] cycle after
//! another: keyboards in, engine, synths out. The desk thread does all else: signals, connecting ports, the log.
//! **Start reading at** [`run::play`], then `score.rs`.
//! **May know** `ports/`, `stage/`, `engine/`, and for what it shows `intonation/`, `tuning/`, `pitch/`; `midi/`, `time`, `limits`.
//! **Owns** signal-hook and rtrb, and what is said on the control socket (`socket.rs`). The score thread never blocks,
//! logs, locks, parses or waits for the desk; between the two there are only queues that neither can hold up.
//! **Not here**: how bytes get in and out (`ports/`), what is made of them (`engine/`).

mod by_hand;
#[cfg(target_os = "linux")]
mod desk;
#[cfg(target_os = "linux")]
mod edits;
#[cfg(target_os = "linux")]
pub mod front;
#[cfg(target_os = "linux")]
pub mod open;
#[cfg(target_os = "linux")]
pub mod orders;
#[cfg(target_os = "linux")]
pub mod place;
#[cfg(unix)]
pub mod reload;
#[cfg(unix)]
pub mod remember;
pub mod rig;
#[cfg(target_os = "linux")]
pub mod run;
mod score;
#[cfg(target_os = "linux")]
pub mod socket;
#[cfg(unix)]
pub mod state;
pub mod status;
#[cfg(target_os = "linux")]
pub mod systemd;
#[cfg(target_os = "linux")]
mod tell;

pub use score::{Ending, Handover, News, Player, Pulse, Score, Slot};
