//! The engine: bytes and times in, bytes and a deadline out.
//!
//! **What this room is**: the one thing that plays. Live, offline and under test it is the same.
//! **Start reading at** [`Engine`], then `traffic.rs`, `plan.rs`.
//! **May know** `pitch/`, `midi/`, `tuning/`, `intonation/`, `time`, `limits`.
//! **Owns** the nine promises; each is counted in [`Counters`] where it must give way.
//! **Not here**: the stage file (`stage/`), ports and clocks (`ports/`), files (`offline/`).

pub mod plan;
pub mod traffic;

pub use plan::{KeyboardId, PartId, Plan, SynthId};
pub use traffic::{Command, Counters, Input, Link, Onset, Output, Report, Weight};

use crate::time::Time;

pub struct Engine {}

impl Engine {
    /// The only allocation.
    pub fn new(_plan: Box<Plan>) -> Engine {
        todo!()
    }

    /// Cannot fail; bad bytes are counted.
    pub fn handle_input(&mut self, _now: Time, _input: Input<'_>) {
        todo!()
    }

    /// To be called once `poll_timeout` has come; harmless earlier.
    pub fn handle_timeout(&mut self, _now: Time) {
        todo!()
    }

    /// A new plan takes over between two messages. The old one comes back, to be dropped off the hot path.
    pub fn handle_plan(&mut self, _now: Time, _plan: Box<Plan>) -> Box<Plan> {
        todo!()
    }

    /// Drain to `None` before time moves on.
    pub fn poll_output(&mut self) -> Option<Output<'_>> {
        todo!()
    }

    /// When `handle_timeout` is next due.
    pub fn poll_timeout(&self) -> Option<Time> {
        todo!()
    }

    pub fn report(&self) -> Report {
        todo!()
    }
}
