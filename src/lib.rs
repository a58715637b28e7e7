//! trued sits between a keyboard and a synth and gives every note the pitch the song asks for.
//!
//! # Floor plan, in reading order
//!
//! The core reads no clock, file or port, takes no lock, starts no thread, and allocates nothing once an engine is made:
//! [`limits`] · [`time`] · [`pitch`] · [`midi`] · [`tuning`] · [`intonation`] · [`engine`].
//! The paper side turns text into a plan: [`stage`].
//! The shell is thin and replaceable: [`ports`] · [`offline`] · [`daemon`] · [`cli`].
//!
//! Imports point down this list; `tests/tidy.rs` holds the table of who may know whom.

#![deny(unsafe_code)]

pub mod limits;
pub mod time;

#[forbid(unsafe_code)]
pub mod engine;
#[forbid(unsafe_code)]
pub mod intonation;
#[forbid(unsafe_code)]
pub mod midi;
#[forbid(unsafe_code)]
pub mod pitch;
#[forbid(unsafe_code)]
pub mod tuning;

pub mod stage;

pub mod cli;
pub mod daemon;
pub mod offline;
pub mod ports;
