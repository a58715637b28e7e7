//! One part: what it plays, and what its player has set: wheel, pressure, controllers, program.

use super::channel::{Program, UNSAID};
use super::mono::Below;
use super::plan::{PartId, PartPlan, SynthId};
use crate::midi::controller;
use crate::pitch::Interval;

#[derive(Clone, Copy)]
pub(super) struct Part {
    pub plan: PartPlan,
    pub wheel: Interval,
    pub pressure: u8,
    pub controllers: [u8; 128],
    /// Grows with every change of a controller, so that a channel knows whether it has to catch up.
    pub version: u32,
    pub program: Program,
    /// Of a part of one voice.
    pub below: Below,
}

impl Part {
    pub const fn new(plan: PartPlan) -> Part {
        Part {
            plan,
            wheel: Interval::ZERO,
            pressure: 0,
            controllers: [UNSAID; 128],
            version: 0,
            program: Program::UNSAID,
            below: Below::NOTHING,
        }
    }

    pub fn set(&mut self, number: u8, value: u8) {
        self.controllers[number as usize] = value;
        self.version += 1;
    }

    pub fn damper_down(&self) -> bool {
        self.pedal_down(controller::DAMPER)
    }

    /// Down from 64 up (MIDI 1.0, p. 12).
    pub fn pedal_down(&self, number: u8) -> bool {
        let value = self.controllers[number as usize];
        value != UNSAID && value >= 64
    }
}

/// The part to whose pool a channel belongs.
pub(super) fn owner_of(parts: &[Part], synth: SynthId, channel: u8) -> Option<PartId> {
    let owns = |part: &Part| part.plan.to == synth && part.plan.pool.has(channel);
    parts.iter().position(owns).and_then(PartId::new)
}
