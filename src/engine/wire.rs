//! How busy the wire to a synth is, where its speed is known. A DIN cable carries 3,125 bytes a second; a wheel copied to
//! fifteen channels a hundred times a second would need 4,500.

use crate::time::{Span, Time};

/// Thins gestures (wheel, pressure, controllers), never notes. Without a speed nothing is thinned.
pub(super) struct Wire {
    now: Time,
    /// When all that was sent will have gone through.
    busy_until: Time,
    /// A gesture was left out; its newest value is owed once the wire is free.
    thinned: bool,
}

impl Wire {
    pub const IDLE: Wire = Wire {
        now: Time::START,
        busy_until: Time::START,
        thinned: false,
    };

    pub fn tick(&mut self, now: Time) {
        self.now = now;
    }

    /// Bytes go out now.
    pub fn carry(&mut self, bytes: usize, bytes_per_s: Option<u32>) {
        if let Some(speed) = bytes_per_s {
            let span = Span::from_nanos(bytes as u64 * 1_000_000_000 / speed as u64);
            self.busy_until = self.busy_until.max(self.now) + span;
        }
    }

    /// Whether a gesture may go out now; if not, it is remembered that one is owed.
    pub fn has_room(&mut self, bytes_per_s: Option<u32>) -> bool {
        let room = bytes_per_s.is_none() || self.busy_until <= self.now;
        self.thinned |= !room;
        room
    }

    /// When the gestures that were left out are to be said.
    pub fn free_at(&self) -> Option<Time> {
        self.thinned.then_some(self.busy_until)
    }

    /// Whether that time has come; asked once.
    pub fn take_freed(&mut self) -> bool {
        let freed = self.thinned && self.busy_until <= self.now;
        self.thinned &= !freed;
        freed
    }
}
