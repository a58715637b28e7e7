//! What has arrived since the last cycle, in memory that was taken once.

use super::Link;
use crate::limits::{INBOX_ARRIVALS, INBOX_BYTES, SYSEX_BYTES_MAX};
use crate::time::Time;

/// Packets and changes, put in by a backend in any order, taken out by (time, port order, order of coming).
#[derive(Debug)]
pub struct Inbox {
    bytes: Vec<u8>,
    arrivals: Vec<Arrival>,
}

#[derive(Clone, Copy, Debug)]
struct Arrival {
    time: Time,
    /// Synths first, then keyboards as the stage file has them, at one time.
    port: usize,
    sequence: usize,
    kind: Kind,
}

#[derive(Clone, Copy, Debug)]
enum Kind {
    Midi { start: usize, end: usize },
    KeyboardLost,
    Seat { plays_as: usize },
    Synth(Link),
}

/// One thing that arrived. Synths by their place in the stage file; keyboards too, or by a place beyond those, after a
/// `Seat` has said as which of them it plays.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum What<'a> {
    Midi {
        keyboard: usize,
        bytes: &'a [u8],
    },
    KeyboardLost {
        keyboard: usize,
    },
    /// A device begins to play as one of the stage file's keyboards; what was held at this place is let go.
    Seat {
        keyboard: usize,
        plays_as: usize,
    },
    Synth {
        synth: usize,
        link: Link,
    },
}

/// Changes that one event can cause: every seat let go and taken again, every synth gone and back.
const CHANGES_MAX: usize = 2 * crate::limits::KEYBOARDS_MAX + 2 * crate::limits::SYNTHS_MAX;
/// Keyboards come after all synths in the order of ports.
const FIRST_KEYBOARD: usize = crate::limits::SYNTHS_MAX;

impl Default for Inbox {
    fn default() -> Self {
        Inbox::new()
    }
}

impl Inbox {
    /// The only allocation.
    pub fn new() -> Inbox {
        Inbox {
            bytes: Vec::with_capacity(INBOX_BYTES),
            arrivals: Vec::with_capacity(INBOX_ARRIVALS),
        }
    }

    /// Whether one more packet of any legal length and one more event's changes surely fit. A backend stops reading when not.
    pub fn has_room(&self) -> bool {
        self.bytes.len() + SYSEX_BYTES_MAX <= INBOX_BYTES
            && self.arrivals.len() + CHANGES_MAX < INBOX_ARRIVALS
    }

    pub fn is_empty(&self) -> bool {
        self.arrivals.is_empty()
    }

    /// Bytes from a keyboard. False if they did not fit and are lost, which asking [`has_room`](Self::has_room) prevents.
    pub fn add_midi(&mut self, time: Time, keyboard: usize, bytes: &[u8]) -> bool {
        let start = self.bytes.len();
        let end = start + bytes.len();
        if end > INBOX_BYTES || self.arrivals.len() == INBOX_ARRIVALS {
            return false;
        }
        self.bytes.extend_from_slice(bytes);
        self.add(time, FIRST_KEYBOARD + keyboard, Kind::Midi { start, end });
        true
    }

    pub fn add_keyboard_lost(&mut self, time: Time, keyboard: usize) {
        self.add(time, FIRST_KEYBOARD + keyboard, Kind::KeyboardLost);
    }

    pub fn add_seat(&mut self, time: Time, keyboard: usize, plays_as: usize) {
        self.add(time, FIRST_KEYBOARD + keyboard, Kind::Seat { plays_as });
    }

    pub fn add_synth(&mut self, time: Time, synth: usize, link: Link) {
        self.add(time, synth, Kind::Synth(link));
    }

    fn add(&mut self, time: Time, port: usize, kind: Kind) {
        debug_assert!(self.arrivals.len() < INBOX_ARRIVALS);
        let sequence = self.arrivals.len();
        if sequence < INBOX_ARRIVALS {
            self.arrivals.push(Arrival {
                time,
                port,
                sequence,
                kind,
            });
        }
    }

    /// Everything that arrived, in order.
    pub fn sorted(&mut self) -> impl Iterator<Item = (Time, What<'_>)> {
        // Unstable, because a stable sort allocates; the sequence makes it stable again.
        self.arrivals
            .sort_unstable_by_key(|a| (a.time, a.port, a.sequence));
        let bytes = &self.bytes;
        self.arrivals
            .iter()
            .map(move |a| (a.time, a.kind.what(a.port, bytes)))
    }

    pub fn clear(&mut self) {
        self.bytes.clear();
        self.arrivals.clear();
    }
}

impl Kind {
    fn what(self, port: usize, bytes: &[u8]) -> What<'_> {
        match self {
            Kind::Midi { start, end } => What::Midi {
                keyboard: port - FIRST_KEYBOARD,
                bytes: &bytes[start..end],
            },
            Kind::KeyboardLost => What::KeyboardLost {
                keyboard: port - FIRST_KEYBOARD,
            },
            Kind::Seat { plays_as } => What::Seat {
                keyboard: port - FIRST_KEYBOARD,
                plays_as,
            },
            Kind::Synth(link) => What::Synth { synth: port, link },
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn merged_by_time_then_port_then_coming() {
        let mut inbox = Inbox::new();
        let at = Time::from_millis;
        inbox.add_midi(at(2), 0, &[0x90, 60, 1]);
        inbox.add_midi(at(1), 1, &[0x90, 61, 1]);
        inbox.add_midi(at(1), 0, &[0x90, 62, 1]);
        inbox.add_midi(at(1), 0, &[0x80, 62, 0]);
        inbox.add_keyboard_lost(at(1), 0);
        inbox.add_synth(at(1), 0, Link::Down);
        let order: Vec<_> = inbox.sorted().collect();
        let midi = |keyboard, bytes| What::Midi { keyboard, bytes };
        assert_eq!(
            order,
            [
                (
                    at(1),
                    What::Synth {
                        synth: 0,
                        link: Link::Down
                    }
                ),
                (at(1), midi(0, &[0x90, 62, 1])),
                (at(1), midi(0, &[0x80, 62, 0])),
                (at(1), What::KeyboardLost { keyboard: 0 }),
                (at(1), midi(1, &[0x90, 61, 1])),
                (at(2), midi(0, &[0x90, 60, 1])),
            ]
        );
    }

    #[test]
    fn says_when_it_is_full_before_anything_is_lost() {
        let mut inbox = Inbox::new();
        let mut packets = 0;
        while inbox.has_room() {
            assert!(inbox.add_midi(Time::START, 0, &[0x90, 60, 1]));
            packets += 1;
        }
        assert!(packets > 100);
        assert!(inbox.add_midi(Time::START, 0, &[0; 3]));
        assert_eq!(inbox.sorted().count(), packets + 1);
    }
}
