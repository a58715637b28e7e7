//! What one channel of a receiver sounds, and what it has been told.

use super::following::Class;
use super::plan::PartId;
use crate::midi::controller;
use crate::pitch::Interval;
use crate::pitch::word::Bend;
use crate::time::{Span, Time};
use crate::tuning::Key;

/// A controller value that nobody has said yet.
pub(super) const UNSAID: u8 = 0xFF;
/// A controller away from its rest that was said, and that the receiver may have forgotten.
pub(super) const DOUBTFUL: u8 = 0xFE;

/// Bank and program as told to a receiver; `UNSAID` where nothing was.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Program {
    pub bank_msb: u8,
    pub bank_lsb: u8,
    pub program: u8,
}

impl Program {
    pub const UNSAID: Program = Program {
        bank_msb: UNSAID,
        bank_lsb: UNSAID,
        program: UNSAID,
    };
}

/// How much of a channel's set-up is still to be said.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Due {
    Nothing,
    /// The bend range, since a program change may have reset it.
    Range,
    /// All of it.
    Everything,
}

/// What a channel is doing.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Rest {
    /// A key holds a note on it.
    Held,
    /// A pedal holds a note on it that still follows its bend.
    Pedal,
    /// Released, and still ringing.
    Tail(Time),
    /// Released beyond its tail.
    Quiet(Time),
    New,
}

#[derive(Clone, Copy)]
pub(super) struct Channel {
    /// Notes on it whose note-off is still to come.
    pub held: u8,
    /// A released note rings on under the damper.
    pub damper: bool,
    /// A released note rings on under the sostenuto pedal.
    pub sostenuto: bool,
    /// The part that played on it last; `None` if none of those now playing has.
    pub part: Option<PartId>,
    /// When a note was last let go by key or pedal; `None` if it never played.
    pub released_at: Option<Time>,
    pub struck_at: Time,
    pub last_key: Option<Key>,
    /// Where its notes stand from their numbers, without the player's wheel.
    pub offset: Interval,
    /// The pitch nudge that is in the offset.
    pub nudge: Interval,
    /// What their player's finger adds to that, on a keyboard that sends a channel for each.
    pub finger: Interval,
    /// Controller 74 as that finger has it; `UNSAID` where it goes with the part.
    pub brightness: u8,
    /// What moves its notes, and where that stood when they were last moved.
    pub follows: Option<Class>,
    pub stood: Interval,
    /// The offset as a bend word.
    pub word: Bend,
    pub due: Due,
    // What the receiver has been told:
    pub bend: Option<Bend>,
    pub pressure: u8,
    pub program: Program,
    pub controllers: [u8; 128],
    /// The part's `version` up to which its controllers have been told here.
    pub version: u32,
}

impl Channel {
    pub const NEW: Channel = Channel {
        held: 0,
        damper: false,
        sostenuto: false,
        part: None,
        released_at: None,
        struck_at: Time::START,
        last_key: None,
        offset: Interval::ZERO,
        nudge: Interval::ZERO,
        finger: Interval::ZERO,
        brightness: UNSAID,
        follows: None,
        stood: Interval::ZERO,
        word: Bend::CENTRE,
        due: Due::Nothing,
        bend: None,
        pressure: 0,
        program: Program::UNSAID,
        controllers: [UNSAID; 128],
        version: 0,
    };

    /// Under MPE (`keeps_pitch`) a released note no longer follows its channel, so a pedal does not occupy it.
    pub fn rest(&self, now: Time, tail: Span, keeps_pitch: bool) -> Rest {
        if self.held > 0 {
            return Rest::Held;
        }
        let pedal = self.damper || self.sostenuto;
        match self.released_at {
            None => Rest::New,
            Some(_) if pedal && !keeps_pitch => Rest::Pedal,
            Some(at) if pedal || now < at + tail => Rest::Tail(at),
            Some(at) => Rest::Quiet(at),
        }
    }

    /// Whether anything can be heard on it.
    pub fn rings(&self, now: Time, tail: Span) -> bool {
        self.held > 0
            || self.damper
            || self.sostenuto
            || self.released_at.is_some_and(|at| now < at + tail)
    }

    /// When it falls silent if nothing more happens; `None` while a key or pedal holds it.
    pub fn silent_at(&self, tail: Span) -> Option<Time> {
        if self.held > 0 || self.damper || self.sostenuto {
            return None;
        }
        Some(self.released_at.map_or(Time::START, |at| at + tail))
    }

    /// A note of a key has started on it.
    pub fn take(&mut self, now: Time, key: Key) {
        self.last_key = Some(key);
        self.struck_at = now;
        self.released_at.get_or_insert(now);
        self.held = self.held.saturating_add(1);
    }

    /// Forgets what the receiver was told, because it may have forgotten too.
    pub fn unsay(&mut self) {
        self.bend = None;
        self.pressure = 0;
        self.program = Program::UNSAID;
        let mut controllers = [UNSAID; 128];
        for (number, rest) in AT_REST {
            let told = self.controllers[number as usize];
            if told != UNSAID && told != rest {
                controllers[number as usize] = DOUBTFUL;
            }
        }
        self.controllers = controllers;
        self.version = 0;
        self.due = Due::Everything;
    }

    /// After Reset All Controllers the receiver stands here (RP-015): these, and nothing else.
    pub fn reset_controllers(&mut self) {
        self.bend = Some(Bend::CENTRE);
        self.pressure = 0;
        for (number, value) in RESET_VALUES {
            self.controllers[number as usize] = value;
        }
    }
}

/// Controllers that must not stay as another part's player has left them, with their values at rest.
pub(super) const AT_REST: [(u8, u8); 7] = [
    (1, 0),
    (11, 127),
    (controller::DAMPER, 0),
    (65, 0),
    (controller::SOSTENUTO, 0),
    (controller::SOFT, 0),
    (controller::HOLD_2, 0),
];

/// Controllers that Reset All Controllers sets, with their values (RP-015).
pub(super) const RESET_VALUES: [(u8, u8); 6] = [
    (1, 0),
    (11, 127),
    (controller::DAMPER, 0),
    (65, 0),
    (controller::SOSTENUTO, 0),
    (controller::SOFT, 0),
];
