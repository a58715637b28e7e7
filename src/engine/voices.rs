//! Notes whose note-off is still to come.

use super::Hand;
use super::following::Followed;
use super::plan::{KeyboardId, PartId, SynthId};
use crate::limits::VOICES_MAX;
use crate::tuning::Key;

/// A note on the wire. It carries all that is needed to end it, so no plan, song or tuning can lose it.
#[derive(Clone, Copy, Debug)]
pub(super) struct Voice {
    pub part: PartId,
    pub synth: SynthId,
    pub channel: u8,
    pub number: u8,
    pub velocity: u8,
    pub pressure: u8,
    pub keyboard: KeyboardId,
    /// The channel the key came in on.
    pub heard_on: u8,
    pub key: Key,
    /// One for each key press; layers of one press share it.
    pub strike: u64,
    /// The key is down. False only while a pedal is played by a late note-off.
    pub down: bool,
    /// Its key came on a channel of its own, with bend, pressure and brightness of its own.
    pub finger: bool,
    /// Latched by the sostenuto pedal.
    pub latched: bool,
    /// The key as the song's tuning sees it; `None` if it is not tuned, or is left from another song.
    pub tuned: Option<Key>,
    /// What it is to the harmony, if it follows it.
    pub followed: Option<Followed>,
    /// Passed through untouched on a drum channel.
    pub drum: bool,
}

impl Voice {
    /// The hand that moves it alone; `None` for a key on an ordinary channel.
    pub fn hand_of_finger(&self) -> Option<Hand> {
        self.finger.then_some(Hand {
            keyboard: self.keyboard,
            channel: self.heard_on,
        })
    }
}

/// All open notes, oldest first; room is taken once.
pub(super) struct Voices {
    list: Vec<Voice>,
}

impl Voices {
    pub fn new() -> Voices {
        Voices {
            list: Vec::with_capacity(VOICES_MAX),
        }
    }

    pub fn len(&self) -> usize {
        self.list.len()
    }

    pub fn full(&self) -> bool {
        self.list.len() == VOICES_MAX
    }

    /// The caller has asked `full`.
    pub fn add(&mut self, voice: Voice) {
        debug_assert!(!self.full());
        self.list.push(voice);
    }

    pub fn iter(&self) -> impl Iterator<Item = &Voice> {
        self.list.iter()
    }

    pub fn iter_mut(&mut self) -> impl Iterator<Item = &mut Voice> {
        self.list.iter_mut()
    }

    /// Takes out the oldest voice that fits. Keeps the order of the others.
    pub fn take(&mut self, fits: impl FnMut(&Voice) -> bool) -> Option<Voice> {
        let place = self.list.iter().position(fits)?;
        Some(self.list.remove(place))
    }
}
