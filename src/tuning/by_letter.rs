//! A tuning whose pitches belong to named keys, and what can be done with one on purpose: turn it, rename a key.

use super::{Key, Letter};
use crate::pitch::Log;

/// Twelve named keys, repeating at the octave.
#[derive(Clone, Debug, PartialEq)]
pub struct ByLetter {
    /// For each pitch class from C: its place above the C of its octave; `None` is silent. Need not rise. Only
    /// differences count: where C is silent the zero lies anywhere.
    pub places: [Option<Log>; 12],
    /// What each key is called in this tuning.
    pub names: [Letter; 12],
    /// The pitch class the description starts from: C, or the tonic that `notes` gives for itself.
    pub home: u8,
    /// Every name of a chain of fifths with its place above C, when it was written as a chain (it may be longer than
    /// twelve: two names for one key). In the order of the chain, each within half an octave of its key's equal place.
    pub chain: Vec<(Letter, Log)>,
}

impl ByLetter {
    /// What stood on the home key stands on `to`; names and chain go along.
    pub fn turned(&self, to: Letter) -> ByLetter {
        let home_name = self.names[self.home as usize];
        let keys = (to.pitch_class() + 12 - self.home) as usize % 12;
        let along = to.place() as i32 - home_name.place() as i32;
        let turned_name = |name: Letter| {
            let place = i8::try_from(name.place() as i32 + along).ok();
            place.and_then(Letter::on_line)
        };

        let mut turned = self.clone();
        turned.home = to.pitch_class();
        for key in 0..12 {
            let from = (key + 12 - keys) % 12;
            let octave = if key < keys { Log::OCTAVE } else { Log::ZERO };
            turned.places[key] = self.places[from].map(|place| place - octave);
            // Beyond double flats and sharps a key goes by its usual name.
            turned.names[key] = turned_name(self.names[from]).unwrap_or(Letter::usual(key as u8));
        }
        turned.chain = (self.chain.iter())
            .filter_map(|(name, place)| {
                let name = turned_name(*name)?;
                Some((name, near_key(name, *place + equal_place(keys as u8))))
            })
            .collect();
        turned.from_c()
    }

    /// The same pitches with C (where it sounds) as zero, in places and chain alike.
    pub fn from_c(mut self) -> ByLetter {
        if let Some(zero) = self.places[0] {
            for place in self.places.iter_mut().flatten() {
                *place = *place - zero;
            }
        }
        let shift = self.chain.iter().find_map(|(name, place)| {
            let key = name.pitch_class() as usize;
            (self.names[key] == *name).then(|| Some(self.places[key]? - *place))?
        });
        for (name, place) in &mut self.chain {
            *place = near_key(*name, *place + shift.unwrap_or_default());
        }
        self
    }

    /// Gives a key another of its names, and the pitch that goes with it: from the chain; beyond the ends of a regular
    /// chain by one more fifth each; in any other tuning both names are one pitch.
    pub fn renamed(&self, name: Letter) -> ByLetter {
        let key = name.pitch_class() as usize;
        let mut renamed = self.clone();
        renamed.names[key] = name;
        if self.names[key] != name {
            renamed.places[key] = self.place_of_name(name).or(self.places[key]);
        }
        renamed
    }

    /// Where the chain puts a name, above C; `None` where it does not say.
    pub fn place_of_name(&self, name: Letter) -> Option<Log> {
        if let Some((_, place)) = self.chain.iter().find(|(known, _)| *known == name) {
            return Some(*place);
        }
        let (first, place) = self.chain.first()?;
        let fifths = name.place() as i64 - first.place() as i64;
        Some(near_key(name, *place + self.regular_fifth()?.times(fifths)))
    }

    /// The fifth of a chain whose fifths are all alike (to a thousandth of a microcent).
    fn regular_fifth(&self) -> Option<Log> {
        let mut fifths = self.chain.windows(2).map(|pair| {
            let fifth = pair[1].1 - pair[0].1;
            if fifth < Log::ZERO {
                fifth + Log::OCTAVE
            } else {
                fifth
            }
        });
        let first = fifths.next()?;
        fifths.all(|fifth| fifth == first).then_some(first)
    }

    /// The home key in the octave from middle C.
    pub(super) fn home_key(&self) -> Key {
        Key::C4
            .moved(self.home as i32)
            .expect("the octave above C4 is on the keyboard")
    }

    /// Where a key stands above the zero of key 0's octave, or `None` where it is silent.
    pub(super) fn place_of_key(&self, key: Key) -> Option<Log> {
        let octaves = Log::OCTAVE.times(key.number() as i64 / 12);
        self.places[key.pitch_class() as usize].map(|place| place + octaves)
    }
}

/// Where twelve-equal puts a pitch class, above C.
fn equal_place(pitch_class: u8) -> Log {
    Log::OCTAVE.part(pitch_class as i64, 12)
}

/// The same pitch, whole octaves aside, within half an octave of the equal place of the key that `name` falls on: B# on
/// the C key lies a little under C, not a little under the next C.
pub fn near_key(name: Letter, place: Log) -> Log {
    let equal = equal_place(name.pitch_class());
    let half = Log::OCTAVE.part(1, 2);
    let mut near = place;
    while near - equal >= half {
        near = near - Log::OCTAVE;
    }
    while near - equal < -half {
        near = near + Log::OCTAVE;
    }
    near
}
