//! New plans while the score plays.

use super::{CHOKED, Score};
use crate::daemon::rig::Places;
use crate::engine::{self, Input, KeyboardId, Plan};
use crate::limits::{KEYBOARDS_MAX, SYNTHS_MAX};
use crate::ports::Outlet;
use crate::time::Time;
use rtrb::{Consumer, Producer};

/// A new plan for the score thread, and what has to be let go before it counts.
#[derive(Debug)]
pub struct Handover {
    pub plan: Box<Plan>,
    /// By place in the old plan: another keyboard stands there now, or none, or it is at another port.
    pub keyboards: Places,
    /// Likewise.
    pub synths: Places,
    /// Our own ports have to be others: the loop has to end, and to begin again with them.
    pub ports: bool,
    /// None of them stays: everything is let go.
    pub all: bool,
}

/// Where new plans come from, and where old ones go to be dropped.
pub(super) struct Edits {
    plans: Consumer<Handover>,
    old: Producer<Box<Plan>>,
}

impl Score {
    /// Takes new plans while it plays.
    #[must_use]
    pub fn with_plans(self, plans: Consumer<Handover>, old: Producer<Box<Plan>>) -> Score {
        Score {
            edits: Some(Edits { plans, old }),
            ..self
        }
    }

    /// True once after a plan that needs other ports than the loop had: the loop has to begin again, with them.
    pub fn take_ports_due(&mut self) -> bool {
        let due = self.ports_due.take();
        self.synths = due.unwrap_or(self.synths);
        due.is_some()
    }

    /// A new plan, between two messages. What hangs on a device that is not the same any more is let go first.
    pub(super) fn take_plan(&mut self, now: Time, outlet: &mut Outlet<'_>) {
        let Some(edits) = &mut self.edits else { return };
        if self.ports_due.is_some() || edits.old.is_full() {
            return;
        }
        let Ok(handover) = edits.plans.pop() else {
            return;
        };
        self.let_go(now, &handover, outlet);
        let synths = handover.plan.ports().min(SYNTHS_MAX);
        let old = self.engine.handle_plan(now, handover.plan);
        self.plans_taken += 1;
        // Only once the loop has begun again are there ports for all of them.
        self.ports_due = handover.ports.then_some(synths);
        self.drain(now, outlet);
        if let Some(edits) = &mut self.edits {
            // There is room: it was asked above, and nobody else pushes.
            let _ = edits.old.push(old);
        }
    }

    fn let_go(&mut self, now: Time, handover: &Handover, outlet: &mut Outlet<'_>) {
        for seat in 0..KEYBOARDS_MAX {
            if (handover.all || handover.keyboards.has(self.seats[seat]))
                && let Some(seat) = KeyboardId::new(seat)
            {
                self.engine.handle_input(now, Input::KeyboardLost(seat));
            }
        }
        for synth in 0..self.synths {
            if handover.all || handover.synths.has(synth) {
                self.link(now, synth, engine::Link::Going);
                self.drain(now, outlet);
                self.link(now, synth, engine::Link::Down);
                self.up[synth] = false;
                // Where nothing is connected otherwise, nobody else says that the way is free again.
                self.reopen_at[synth] = (!handover.ports).then_some(now + CHOKED);
            }
        }
        self.drain(now, outlet);
    }
}
