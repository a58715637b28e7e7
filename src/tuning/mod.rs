//! Scales and temperaments, and the keys they fall on.
//!
//! **What this room is**: the ways a tuning can be described ([`Scale`]), where one is put ([`Placement`]), and the 128
//! pitches that come out ([`Tuning`]); a scale laid out for every tonic ([`Turning`]).
//! **Start reading at** [`Scale`] and [`Scale::tune`].
//! **May know** `pitch/`, `limits`.
//! **Owns**: a [`Tuning`] never changes once built; a tuning by letter never moves because of the key a piece is in.
//! **Not here**: how players write a tuning (`stage/`), what a chord makes of it (`intonation/`).

mod by_letter;
mod key;
mod letter;
mod scale;
mod turning;

pub use by_letter::{ByLetter, near_key};
pub use key::Key;
pub use letter::Letter;
pub use scale::{FromTonic, KeyMap, Pin, Placement, Scale, TonicWanted, TuneError};
pub use turning::{Tonic, Turning};

use crate::limits::KEYS;
use crate::pitch::{Interval, Pitch};

/// 128 keys, each with a pitch or silent.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Tuning {
    keys: [Option<Pitch>; KEYS],
    groups: u8,
}

impl Tuning {
    pub fn new(keys: [Option<Pitch>; KEYS]) -> Tuning {
        let groups = groups(&keys);
        Tuning { keys, groups }
    }

    /// The pitch of a key, or `None` where the key is silent.
    pub fn pitch(&self, key: Key) -> Option<Pitch> {
        self.keys[key.number() as usize]
    }

    /// How many different distances from equal its keys have, each of which needs a bend: at most 128.
    pub fn groups(&self) -> u8 {
        self.groups
    }
}

/// Distances that no bend can tell apart count as one.
fn groups(keys: &[Option<Pitch>; KEYS]) -> u8 {
    let alike = Interval::from_microcents(5_000);
    let mut found = [Interval::ZERO; KEYS];
    let mut count = 0;
    for pitch in keys.iter().flatten() {
        let Some(number) = pitch.nearest_key() else {
            continue;
        };
        let offset = *pitch - Pitch::of_key(number);
        if found[..count].iter().all(|f| (*f - offset).abs() > alike) {
            found[count] = offset;
            count += 1;
        }
    }
    count as u8
}
