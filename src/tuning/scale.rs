//! The two kinds of tuning, and where one is put to become 128 pitches.

use super::{Key, Letter, Tuning};
use crate::pitch::{Hertz, Log};

/// A tuning as described, not yet put anywhere.
#[derive(Clone, Debug, PartialEq)]
pub enum Scale {
    /// Pitches belong to named keys; the key a piece is in changes nothing.
    ByLetter(ByLetter),
    /// Step 0 sits on the song's tonic.
    FromTonic(FromTonic),
}

/// Twelve named keys, repeating at the octave.
#[derive(Clone, Debug, PartialEq)]
pub struct ByLetter {
    /// For each pitch class from C: its place above the C of its octave; `None` is silent. Need not rise.
    pub places: [Option<Log>; 12],
    /// What each key is called in this tuning.
    pub names: [Letter; 12],
    /// The pitch class the description starts from: C, or the tonic that `notes` gives for itself.
    pub home: u8,
    /// Every name of a chain of fifths with its place above C, when it was written as a chain (it may be longer than
    /// twelve: two names for one key).
    pub chain: Vec<(Letter, Log)>,
}

/// Steps counted from 0 at the tonic, repeating at a period.
#[derive(Clone, Debug, PartialEq)]
pub struct FromTonic {
    /// Step 0 is first and is usually zero; may stand in any order.
    pub steps: Vec<Log>,
    pub period: Log,
    pub map: KeyMap,
    /// What is added to named keys (by pitch class of the keyboard) after all else.
    pub changes: [Log; 12],
}

/// Which key sounds which step.
#[derive(Clone, Debug, PartialEq)]
pub enum KeyMap {
    /// One key a step, upwards and downwards from the tonic.
    EachKey,
    /// By letter, repeating every twelve keys and rising a period each time; `home` is the pitch class that has step 0.
    Letters { home: u8, steps: [Option<u32>; 12] },
    /// By key, repeating every so many keys: key `start + i` has `steps[i]`; `start` is the key with step 0.
    Keys { start: Key, steps: Vec<Option<u32>> },
}

/// Which key is held to the reference frequency.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Pin {
    /// The reference key sounds exactly the reference frequency.
    Key,
    /// The tonic stands where equal temperament at this reference puts it.
    Tonic,
}

/// Where a scale is put.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Placement {
    /// For a scale from the tonic: the key with step 0. Ignored by letter.
    pub tonic: Option<Key>,
    /// For a tuning by letter: its home is turned to this key.
    pub turned_to: Option<Letter>,
    pub reference: Key,
    pub hertz: Hertz,
    pub pin: Pin,
}

/// Why a scale cannot be put there.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum TuneError {
    /// The reference key sounds nothing in this tuning.
    SilentReference(Key),
    /// No key at all would sound.
    NothingSounds,
}

impl Scale {
    /// The 128 pitches.
    ///
    /// # Errors
    /// Where the pinned key is silent, or nothing sounds.
    pub fn tune(&self, _placement: &Placement) -> Result<Tuning, TuneError> {
        todo!()
    }
}
