//! What waits for a synth's port while it is full: bounded, and fair by weight.
//!
//! As long as a port takes what it is given, nothing waits here. When it does not, what is owed goes first and is never
//! dropped, notes go whole or not at all, and of a controller only the newest value is kept. Whatever happens, two
//! messages of one channel never change places, so a bend stays before its note and a note-off behind it.

use super::message::{channels, cut, replaceable};
use crate::limits::{OWED_BYTES, OWED_ITEMS, SYNTHS_MAX, WAITING_BYTES, WAITING_ITEMS};
use crate::time::{Span, Time};

/// How long a full port is left alone before it is tried again.
pub const RETRY: Span = Span::from_millis(2);

/// All Notes Off on channel 1: it will be said again, with all the rest, once the port is known to read.
const PROBE: [u8; 3] = [0xB0, 0x7B, 0];

/// How a message is treated when there is not room for all.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Weight {
    /// Never dropped, first in line.
    Owed,
    /// Whole or not at all.
    Note,
    /// The newest value of each is enough.
    Control,
    /// In order.
    Through,
}

/// How much room is left at a synth.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Room {
    Easy,
    /// What is left is kept for what is owed.
    Tight,
    /// Not even what is owed found room: the port must be taken for dead. Nothing more is kept for it.
    None,
    /// It was full, takes messages again, but has thrown away all it had not read: what it sounds and what it knows is
    /// uncertain. Nothing more is kept for it until it is forgotten and begins anew.
    Emptied,
}

impl Room {
    fn is_closed(self) -> bool {
        matches!(self, Room::None | Room::Emptied)
    }
}

/// Where bytes leave the house.
pub trait Wire {
    /// Writes as much as is taken at once and in order, and says how many bytes that was. A short message is taken
    /// whole or not at all; fewer bytes than given means that the port is full.
    fn write(&mut self, synth: usize, bytes: &[u8]) -> usize;

    /// What is written from now on belongs to this time, never earlier than what was written before. Only a wire that
    /// carries times needs to know.
    fn at(&mut self, _time: Time) {}

    /// Whether a port that was full has lost messages that it had taken.
    fn loses_when_full(&self) -> bool {
        false
    }
}

/// All outboxes, and the wire behind them: what a cycle sends into.
pub struct Outlet<'a> {
    pub outboxes: &'a mut [Outbox],
    pub wire: &'a mut dyn Wire,
}

impl Outlet<'_> {
    /// What is sent from now on belongs to this time.
    pub fn at(&mut self, time: Time) {
        self.wire.at(time);
    }

    /// Sends one message or one bundle.
    pub fn send(&mut self, synth: usize, weight: Weight, bytes: &[u8]) {
        if let Some(outbox) = self.outboxes.get_mut(synth) {
            outbox.push(weight, bytes, &mut |bytes| self.wire.write(synth, bytes));
        }
    }

    /// Tries once more to send what waits. To be called before anything new is sent.
    ///
    /// Where a full port loses what it had taken, what waits is of no use any more: one message that does no harm is
    /// enough to find out whether it reads again.
    pub fn retry(&mut self) {
        let loses = self.wire.loses_when_full();
        for (synth, outbox) in self.outboxes.iter_mut().enumerate() {
            let mut write = |bytes: &[u8]| self.wire.write(synth, bytes);
            if outbox.is_empty() || !loses {
                outbox.flush(&mut write);
            } else if write(&PROBE) == PROBE.len() {
                outbox.close(Room::Emptied);
            }
        }
    }

    /// Whether anything waits, so that a loop must come back without being asked.
    pub fn is_waiting(&self) -> bool {
        self.outboxes.iter().any(|outbox| !outbox.is_empty())
    }

    /// Messages and bundles dropped for want of room, by all that is here.
    pub fn dropped(&self) -> u64 {
        self.outboxes.iter().map(Outbox::dropped).sum()
    }

    /// The room at a synth, if it has changed since this was last asked.
    pub fn room_news(&mut self, synth: usize) -> Option<Room> {
        self.outboxes.get_mut(synth)?.room_news()
    }

    /// Forgets what waits for a synth: its port has gone, or begins anew.
    pub fn forget(&mut self, synth: usize) {
        if let Some(outbox) = self.outboxes.get_mut(synth) {
            outbox.forget();
        }
    }
}

/// One synth's outbox.
#[derive(Debug)]
pub struct Outbox {
    bytes: Vec<u8>,
    items: Vec<Item>,
    /// What the live items hold.
    live_items: usize,
    live_bytes: usize,
    room: Room,
    room_said: Room,
    dropped: u64,
}

#[derive(Clone, Copy, Debug)]
struct Item {
    start: u32,
    end: u32,
    weight: Weight,
    channels: u16,
    /// Part of it has gone out: it must be finished before anything else is sent.
    begun: bool,
    gone: bool,
}

/// One outbox for each synth.
pub fn outboxes(synths: usize) -> Vec<Outbox> {
    (0..synths.min(SYNTHS_MAX)).map(|_| Outbox::new()).collect()
}

impl Default for Outbox {
    fn default() -> Self {
        Outbox::new()
    }
}

impl Outbox {
    /// The only allocation.
    pub fn new() -> Outbox {
        Outbox {
            bytes: Vec::with_capacity(WAITING_BYTES),
            items: Vec::with_capacity(WAITING_ITEMS),
            live_items: 0,
            live_bytes: 0,
            room: Room::Easy,
            room_said: Room::Easy,
            dropped: 0,
        }
    }

    pub fn is_empty(&self) -> bool {
        self.live_items == 0
    }

    /// Messages and bundles dropped for want of room since the start.
    pub fn dropped(&self) -> u64 {
        self.dropped
    }

    pub fn room_news(&mut self) -> Option<Room> {
        let news = (self.room != self.room_said).then_some(self.room);
        self.room_said = self.room;
        news
    }

    pub fn forget(&mut self) {
        self.clear();
        self.room = Room::Easy;
        self.room_said = Room::Easy;
    }

    /// Writes a message or bundle, or lets it wait.
    pub fn push(&mut self, weight: Weight, bytes: &[u8], write: &mut dyn FnMut(&[u8]) -> usize) {
        if self.room.is_closed() {
            self.dropped += 1;
            return;
        }
        let mut written = 0;
        if self.is_empty() {
            written = write(bytes);
            if written >= bytes.len() {
                return;
            }
        }
        let rest = &bytes[written..];
        // A bundle that has begun must be finished, whatever it is.
        let owed = weight == Weight::Owed || written > 0;
        if !owed && weight == Weight::Control && self.replace(rest) {
            return;
        }
        if !self.make_room(owed, rest.len()) {
            return;
        }
        self.append(weight, rest, written > 0);
        self.measure();
    }

    /// Writes what waits, as far as the port takes it: what is owed first.
    pub fn flush(&mut self, write: &mut dyn FnMut(&[u8]) -> usize) {
        if self.is_empty() {
            return;
        }
        let begun = self.items.iter().position(|item| item.begun && !item.gone);
        let _ = begun.is_none_or(|index| self.send(index, write))
            && self.flush_owed(write)
            && (0..self.items.len()).all(|index| self.send(index, write));
        if self.is_empty() {
            self.clear();
        }
        self.measure();
    }

    /// What is owed overtakes everything but what is earlier on its own channels.
    fn flush_owed(&mut self, write: &mut dyn FnMut(&[u8]) -> usize) -> bool {
        let mut passed = 0u16;
        for index in 0..self.items.len() {
            let item = self.items[index];
            if item.gone {
                continue;
            }
            if item.weight != Weight::Owed || item.channels & passed != 0 {
                passed |= item.channels;
            } else if !self.send(index, write) {
                return false;
            }
        }
        true
    }

    /// True if the item has gone out whole.
    fn send(&mut self, index: usize, write: &mut dyn FnMut(&[u8]) -> usize) -> bool {
        let item = &mut self.items[index];
        if item.gone {
            return true;
        }
        let bytes = &self.bytes[item.start as usize..item.end as usize];
        let written = write(bytes).min(bytes.len());
        self.live_bytes -= written;
        item.start += written as u32;
        item.begun |= written > 0;
        item.gone = item.start == item.end;
        self.live_items -= item.gone as usize;
        item.gone
    }

    /// Puts a newer value in the place of one that waits, if nothing but other controllers of the channel came since.
    fn replace(&mut self, bytes: &[u8]) -> bool {
        let Some(key) = replaceable(bytes) else {
            return false;
        };
        let channel = channels(bytes);
        for item in self.items.iter().rev().filter(|item| !item.gone) {
            let waiting = &mut self.bytes[item.start as usize..item.end as usize];
            if item.weight == Weight::Control && replaceable(waiting) == Some(key) {
                waiting.copy_from_slice(bytes);
                return true;
            }
            let steps_aside = item.weight == Weight::Control && replaceable(waiting).is_some();
            if item.channels & channel != 0 && !steps_aside {
                return false;
            }
        }
        false
    }

    /// Whether so many bytes may be added; if what is owed does not fit, the port is given up.
    fn make_room(&mut self, owed: bool, bytes: usize) -> bool {
        let (items_kept, bytes_kept) = if owed {
            (0, 0)
        } else {
            (OWED_ITEMS, OWED_BYTES)
        };
        let fits = self.live_items + 1 + items_kept <= WAITING_ITEMS
            && self.live_bytes + bytes + bytes_kept <= WAITING_BYTES;
        if !fits {
            self.dropped += 1;
            if owed {
                self.close(Room::None);
            }
            return false;
        }
        if self.items.len() == WAITING_ITEMS || self.bytes.len() + bytes > WAITING_BYTES {
            self.close_gaps();
        }
        true
    }

    fn append(&mut self, weight: Weight, bytes: &[u8], begun: bool) {
        debug_assert!(begun || cut(bytes).is_some(), "not a whole message");
        let start = self.bytes.len() as u32;
        self.bytes.extend_from_slice(bytes);
        self.items.push(Item {
            start,
            end: self.bytes.len() as u32,
            weight,
            // What is left of a sysex has no status byte; nothing may overtake it anyway.
            channels: if begun { u16::MAX } else { channels(bytes) },
            begun,
            gone: false,
        });
        self.live_items += 1;
        self.live_bytes += bytes.len();
    }

    /// Moves what waits to the front of its memory.
    fn close_gaps(&mut self) {
        self.items.retain(|item| !item.gone);
        let mut end = 0;
        for item in &mut self.items {
            let length = (item.end - item.start) as usize;
            self.bytes
                .copy_within(item.start as usize..item.end as usize, end);
            item.start = end as u32;
            item.end = (end + length) as u32;
            end += length;
        }
        self.bytes.truncate(end);
    }

    /// Drops what waits, and what comes, until it is forgotten.
    fn close(&mut self, room: Room) {
        self.dropped += self.live_items as u64;
        self.clear();
        self.room = room;
    }

    fn clear(&mut self) {
        self.bytes.clear();
        self.items.clear();
        self.live_items = 0;
        self.live_bytes = 0;
    }

    /// Tight from half of what others may fill, easy again at an eighth of it.
    fn measure(&mut self) {
        let items = WAITING_ITEMS - OWED_ITEMS;
        let bytes = WAITING_BYTES - OWED_BYTES;
        self.room = match self.room {
            Room::Easy if self.live_items > items / 2 || self.live_bytes > bytes / 2 => Room::Tight,
            Room::Tight if self.live_items <= items / 8 && self.live_bytes <= bytes / 8 => {
                Room::Easy
            }
            room => room,
        };
    }
}

#[cfg(test)]
mod tests;
