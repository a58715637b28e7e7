//! Cycles on our own thread: while there is no server, and while there is one that stands still.
//!
//! A server that stands still (stopped, or stuck in its driver) calls nobody and says nothing. We could do no better by
//! starting anew: whoever asks it for anything is kept for as long as it stands. So the score is taken out of its hands
//! and goes on here without ports: what was held is let go, orders are followed, the desk hears that the score lives
//! (so a supervisor leaves us alone), and when the server goes on, the score comes back with all it knows and sets
//! every synth up again. A callback of ours that does not come back is another thing: then the score cannot be taken,
//! gives no sign of life, and a supervisor that starts us anew is right.

use super::{Jack, Over, Shared};
use crate::ports::{Broken, Cycle, Link, Next, Outlet, Server, Wire};
use crate::time::{Span, Time};
use std::sync::atomic::Ordering;
use std::time::Duration;
use tracing::{error, info};

/// After so long without a cycle, the server stands still. The longest cycle of a server takes 1.02 s (8192 frames at
/// 8000 Hz); whoever tells us something waits 2 s for an answer.
const STANDS_STILL: Span = Span::from_millis(1_500);
/// How often to look whether it does, and whether it goes on again.
const LOOK: Span = Span::from_millis(250);
pub(super) const SOON: Span = Span::from_millis(20);

impl Jack {
    /// Waits for a client's end, and plays in the server's place while it stands still.
    pub(super) fn watch(&mut self, shared: &Shared, own: &mut dyn Cycle) -> Result<Over, Broken> {
        let mut beats = shared.beats.load(Ordering::Acquire);
        let mut beat_at = self.clock.now();
        loop {
            if let Some(over) = over(shared) {
                return Ok(over);
            }
            self.wait(Some(LOOK))?;
            let (now, seen) = (self.clock.now(), shared.beats.load(Ordering::Acquire));
            if seen != beats {
                (beats, beat_at) = (seen, now);
            } else if now.since(beat_at) >= STANDS_STILL && shared.gate.shut() {
                shared.lent.store(true, Ordering::Release);
                shared.gate.open();
                if let Some(over) = self.stand_in(shared, own)? {
                    return Ok(over);
                }
                beat_at = self.clock.now();
            }
        }
    }

    /// The score is lent to us. Gives it back once the server calls again.
    fn stand_in(&mut self, shared: &Shared, own: &mut dyn Cycle) -> Result<Option<Over>, Broken> {
        error!("the JACK server stands still; nothing is heard or sent until it goes on");
        self.tally.set_server(Server::StandsStill);
        self.tally.real_time.store(false, Ordering::Relaxed);
        let reached = Time::from_nanos(shared.reached.load(Ordering::Acquire));
        self.now = self.now.max(reached);
        self.say_lost();
        let beats = shared.beats.load(Ordering::Acquire);
        while shared.beats.load(Ordering::Acquire) == beats {
            if self.alone(own, SOON)? == Next::Leave {
                return Ok(Some(Over::Left));
            }
            if let Some(over) = over(shared) {
                return Ok(Some(over));
            }
        }
        info!("the JACK server goes on");
        self.hand_over(shared);
        Ok(None)
    }

    /// The server took with it whatever was connected.
    pub(super) fn say_lost(&mut self) {
        self.now = self.now.max(self.clock.now());
        for keyboard in 0..self.names.keyboards.len() {
            self.inbox.add_keyboard_lost(self.now, keyboard);
        }
        for synth in 0..self.names.synths.len() {
            self.inbox.add_synth(self.now, synth, Link::Down);
        }
    }

    /// Cycles without ports, for so long, or until there is a client.
    pub(super) fn alone(&mut self, cycle: &mut dyn Cycle, span: Span) -> Result<Next, Broken> {
        let until = self.clock.now() + span;
        loop {
            self.now = self.now.max(self.clock.now());
            let mut outlet = Outlet {
                outboxes: &mut self.outboxes,
                wire: &mut Nowhere,
            };
            let next = cycle.run(self.now, &mut self.inbox, &mut outlet);
            self.inbox.clear();
            let Next::Wait(deadline) = next else {
                return Ok(Next::Leave);
            };
            self.waiting = self
                .waiting
                .take()
                .or_else(|| self.opener.client(Duration::ZERO));
            let now = self.clock.now();
            if now >= until || self.waiting.is_some() {
                return Ok(next);
            }
            let then = deadline.map_or(until, |deadline| deadline.min(until));
            self.wait(Some(then.since(now)))?;
        }
    }
}

/// Why a client has come to its end, if it has.
fn over(shared: &Shared) -> Option<Over> {
    if shared.left.load(Ordering::Acquire) {
        return Some(Over::Left);
    }
    shared
        .dead
        .load(Ordering::Acquire)
        .then_some(Over::ServerGone)
}

/// A way for bytes while there is no server.
struct Nowhere;

impl Wire for Nowhere {
    fn write(&mut self, _: usize, bytes: &[u8]) -> usize {
        bytes.len()
    }
}
