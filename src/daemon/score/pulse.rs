//! What the desk hears after each cycle.

use super::Score;
use crate::engine::{Report, Told};
use crate::ports::Outlet;
use crate::time::{Span, Time};
use rtrb::Producer;

/// How often the desk hears from us even if nothing happens.
const BEAT: Span = Span::from_millis(250);
/// How soon a pulse for which there was no room is tried again.
const PULSE_AGAIN: Span = Span::from_millis(20);

/// How things stand, for the desk: a copy after each cycle, and so a sign of life.
#[derive(Clone, Copy, Debug)]
pub struct Pulse {
    pub report: Report,
    pub told: Told,
    /// Commands followed since the beginning.
    pub obeyed: u64,
    /// Plans taken over since the beginning: places in the set are by the last of them.
    pub plans: u64,
    /// Cycles after which something waited for a port that was full.
    pub waited: u64,
    /// Messages and bundles left out because a port stayed full.
    pub dropped: u64,
}

#[derive(Default)]
pub(super) struct Pulses {
    out: Option<Producer<Pulse>>,
    waited: u64,
    dropped: u64,
    /// What the outboxes had dropped by the last cycle; those of a new server begin at nothing.
    dropped_before: u64,
}

impl Score {
    /// Says after each cycle how things stand, and at least four times a second.
    #[must_use]
    pub fn with_pulses(mut self, pulses: Producer<Pulse>) -> Score {
        self.pulses.out = Some(pulses);
        self
    }

    /// Gives a pulse; says when the next one is due.
    pub(super) fn beat(&mut self, now: Time, outlet: &Outlet<'_>) -> Option<Time> {
        let pulses = &mut self.pulses;
        pulses.waited += u64::from(outlet.is_waiting());
        let dropped = outlet.dropped();
        pulses.dropped += dropped
            .checked_sub(pulses.dropped_before)
            .unwrap_or(dropped);
        pulses.dropped_before = dropped;
        let pulse = Pulse {
            report: self.engine.report(),
            told: self.engine.told(),
            obeyed: self.obeyed,
            plans: self.plans_taken,
            waited: pulses.waited,
            dropped: pulses.dropped,
        };
        let went = pulses.out.as_mut()?.push(pulse).is_ok();
        Some(now + if went { BEAT } else { PULSE_AGAIN })
    }
}
