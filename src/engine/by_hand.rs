//! What a player can change of a song's tuning by hand: other places of keys, second names of black keys, the tonic.
//!
//! Fixed tables, so that a song is begun without a heap. Built by `stage/`, changed by nobody.

use super::traffic::Place;
use crate::limits::{PLACES_MAX, TURN_STEPS_MAX};
use crate::pitch::Interval;
use crate::tuning::{Key, Letter, Turning};

/// The name of a place or a turn, as a number made of it (FNV-1a): it means the same in a plan that was edited.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct NameId(u64);

impl NameId {
    pub fn of(name: &str) -> NameId {
        let number = name.bytes().fold(0xcbf2_9ce4_8422_2325u64, |hash, byte| {
            (hash ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3)
        });
        NameId(number)
    }
}

#[derive(Clone, Debug, PartialEq)]
pub struct ByHand {
    /// The key that places are counted from, until the tonic is moved.
    pub home: Key,
    pub places: [Option<OtherPlace>; PLACES_MAX],
    pub turns: [Option<TurnStep>; TURN_STEPS_MAX],
    /// By pitch class: where the song begins.
    pub begin_with: [Place; 12],
    /// By pitch class.
    pub by_line: [Option<ByLine>; 12],
    /// By pitch class: those that stand for two notes.
    pub black_keys: [Option<TwoNames>; 12],
    /// The harmony chooses between their names; by pitch class, what every key is called as the song begins.
    pub by_chord: Option<[Letter; 12]>,
    /// `None` for a tuning by letter: its keys keep their pitches whatever the tonic.
    pub turning: Option<Turning>,
}

/// Another place of a key.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct OtherPlace {
    /// Which key: so many above home or the tonic, 0-11.
    pub keys_above: u8,
    pub name: NameId,
    /// Above what home or the tonic sounds.
    pub above: Interval,
}

/// One of the keys that a turn moves.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct TurnStep {
    pub turn: NameId,
    pub keys_above: u8,
    pub place: Place,
}

/// Which place a key takes when the melody comes from below, and from above; `None` changes nothing.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct ByLine {
    pub up: Option<Place>,
    pub down: Option<Place>,
}

/// A black key that stands for two notes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct TwoNames {
    /// What it starts as.
    pub first: Letter,
    pub second: Letter,
    /// From the first up to the second.
    pub apart: Interval,
}

impl ByHand {
    /// Nothing to change by hand.
    pub const fn nothing(home: Key) -> ByHand {
        ByHand {
            home,
            places: [None; PLACES_MAX],
            turns: [None; TURN_STEPS_MAX],
            begin_with: [Place::Home; 12],
            by_line: [None; 12],
            black_keys: [None; 12],
            by_chord: None,
            turning: None,
        }
    }

    /// Where a key so many above the tonic stands under that name, above what the tonic sounds.
    pub fn other_place(&self, keys_above: u8, name: NameId) -> Option<Interval> {
        let is_it = |place: &&OtherPlace| place.keys_above == keys_above && place.name == name;
        let place = self.places.iter().flatten().find(is_it)?;
        Some(place.above)
    }

    /// After which its keys repeat.
    pub fn period(&self) -> Interval {
        match &self.turning {
            Some(turning) => turning.period,
            None => Interval::OCTAVE,
        }
    }
}
