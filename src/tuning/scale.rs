//! The two kinds of tuning, and where one is put to become 128 pitches.

use super::{ByLetter, Key, Letter, Tuning};
use crate::limits::KEYS;
use crate::pitch::{Hertz, Interval, Log};

/// A tuning as described, not yet put anywhere.
#[derive(Clone, Debug, PartialEq)]
pub enum Scale {
    /// Pitches belong to named keys; the key a piece is in changes nothing.
    ByLetter(ByLetter),
    /// Step 0 sits on the song's tonic.
    FromTonic(FromTonic),
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

/// What a tuning takes as the tonic a song names.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TonicWanted {
    /// By letter: the key a piece is in changes nothing.
    Nothing,
    /// Twelve keys to the period: a letter says it all.
    Letter,
    /// Any other count of keys: a key with its octave.
    Key,
}

impl Scale {
    /// The 128 pitches.
    ///
    /// # Errors
    /// Where the pinned key is silent, or nothing sounds.
    pub fn tune(&self, placement: &Placement) -> Result<Tuning, TuneError> {
        let tonic = self.tonic_of(placement);
        match (self, placement.turned_to) {
            (Scale::ByLetter(scale), Some(letter)) => {
                let turned = scale.turned(letter);
                put(placement, tonic, |key| turned.place_of_key(key))
            }
            (Scale::ByLetter(scale), None) => put(placement, tonic, |key| scale.place_of_key(key)),
            (Scale::FromTonic(scale), _) => {
                put(placement, tonic, |key| scale.place_of_key(key, tonic))
            }
        }
    }

    /// The key that `pin: tonic` holds: home in the octave from middle C, or the key with step 0.
    pub fn tonic_of(&self, placement: &Placement) -> Key {
        match self {
            Scale::ByLetter(scale) => match placement.turned_to {
                Some(letter) => Scale::tonic_key(letter),
                None => scale.home_key(),
            },
            Scale::FromTonic(scale) => placement.tonic.unwrap_or(scale.default_tonic()),
        }
    }

    /// What the twelve keys are called there; beyond tunings by letter they go by their usual names.
    pub fn names(&self, placement: &Placement) -> [Letter; 12] {
        match (self, placement.turned_to) {
            (Scale::ByLetter(scale), Some(letter)) => scale.turned(letter).names,
            (Scale::ByLetter(scale), None) => scale.names,
            (Scale::FromTonic(_), _) => std::array::from_fn(|key| Letter::usual(key as u8)),
        }
    }

    /// After how many keys it repeats.
    pub fn keys_to_period(&self) -> usize {
        match self {
            Scale::ByLetter(_) => 12,
            Scale::FromTonic(scale) => scale.keys_to_period(),
        }
    }

    /// Whether a song may name a tonic for this tuning, and how.
    pub fn tonic_wanted(&self) -> TonicWanted {
        match self {
            Scale::ByLetter(_) => TonicWanted::Nothing,
            Scale::FromTonic(scale) if scale.keys_to_period() == 12 => TonicWanted::Letter,
            Scale::FromTonic(_) => TonicWanted::Key,
        }
    }

    /// The key a `tonic` letter means: the one in the octave from middle C.
    pub fn tonic_key(letter: Letter) -> Key {
        Key::C4
            .moved(letter.pitch_class() as i32)
            .expect("the octave above C4 is on the keyboard")
    }
}

impl FromTonic {
    /// The key that has step 0 where no song names a tonic.
    pub fn default_tonic(&self) -> Key {
        match &self.map {
            KeyMap::EachKey => Key::C4,
            KeyMap::Letters { home, .. } => Key::C4
                .moved(*home as i32)
                .expect("the octave above C4 is on the keyboard"),
            KeyMap::Keys { start, .. } => *start,
        }
    }

    /// After how many keys the scale repeats.
    pub fn keys_to_period(&self) -> usize {
        match &self.map {
            KeyMap::EachKey => self.steps.len(),
            KeyMap::Letters { .. } => 12,
            KeyMap::Keys { steps, .. } => steps.len(),
        }
    }

    /// Where a key stands above step 0, or `None` where it is silent.
    fn place_of_key(&self, key: Key, tonic: Key) -> Option<Log> {
        let place = self.place_above_tonic(key.number() as i64 - tonic.number() as i64)?;
        Some(place + self.changes[key.pitch_class() as usize])
    }

    /// Where the key so many keys above the tonic stands, but for `changes`.
    pub(super) fn place_above_tonic(&self, above: i64) -> Option<Log> {
        let every = self.keys_to_period() as i64;
        let (times, within) = (above.div_euclid(every), above.rem_euclid(every) as usize);
        let step = match &self.map {
            KeyMap::EachKey => within,
            KeyMap::Letters { home, steps } => steps[(*home as usize + within) % 12]? as usize,
            KeyMap::Keys { steps, .. } => steps[within]? as usize,
        };
        let count = self.steps.len();
        let periods = times + (step / count) as i64;
        Some(self.steps[step % count] + self.period.times(periods))
    }
}

/// Lays places out over the keyboard so that the pinned key stands where it should.
fn put(
    placement: &Placement,
    tonic: Key,
    place: impl Fn(Key) -> Option<Log>,
) -> Result<Tuning, TuneError> {
    if Key::all().all(|key| place(key).is_none()) {
        return Err(TuneError::NothingSounds);
    }
    let pinned = match placement.pin {
        Pin::Key => placement.reference,
        Pin::Tonic => tonic,
    };
    let zero = place(pinned).ok_or(TuneError::SilentReference(pinned))?;
    let semitones = pinned.number() as i64 - placement.reference.number() as i64;
    let pinned_at = placement.hertz.pitch() + Interval::SEMITONE * semitones;

    let mut keys = [None; KEYS];
    for key in Key::all() {
        // Rounded here and nowhere before.
        keys[key.number() as usize] = place(key).map(|at| pinned_at + (at - zero).interval());
    }
    Ok(Tuning::new(keys))
}

#[cfg(test)]
#[path = "scale_tests.rs"]
mod tests;
