//! A scale from the tonic laid out for every tonic, so that the tonic can move while playing.

use super::{FromTonic, Key, Pin, Placement, Tuning};
use crate::limits::KEYS;
use crate::pitch::{Interval, Log, Pitch};

/// What [`Scale::tune`](super::Scale::tune) says for one tonic, for all of them: a table that needs no heap.
#[derive(Clone, Debug, PartialEq)]
pub struct Turning {
    /// Above step 0, by distance from the tonic in keys: from 127 below to 127 above.
    places: [Option<Log>; 2 * KEYS - 1],
    /// Added to named keys, wherever the tonic is.
    changes: [Log; 12],
    pub period: Interval,
    /// The song's own tonic.
    pub tonic: Key,
    reference: Key,
    reference_pitch: Pitch,
    pin: Pin,
}

/// Where a tonic has been put: its key, and a key whose pitch is given.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Tonic {
    pub key: Key,
    pub anchor: Key,
    pub anchor_pitch: Pitch,
}

impl Turning {
    pub fn of(scale: &FromTonic, placement: &Placement) -> Turning {
        let lowest = 1 - KEYS as i64;
        Turning {
            places: std::array::from_fn(|index| scale.place_above_tonic(lowest + index as i64)),
            changes: scale.changes,
            period: scale.period.interval(),
            tonic: placement.tonic.unwrap_or(scale.default_tonic()),
            reference: placement.reference,
            reference_pitch: placement.hertz.pitch(),
            pin: placement.pin,
        }
    }

    /// Where the reference puts a tonic; `None` if the reference key would be silent.
    pub fn absolute(&self, key: Key) -> Option<Tonic> {
        let anchor = match self.pin {
            Pin::Key => self.reference,
            Pin::Tonic => key,
        };
        self.place(anchor, key)?;
        Some(Tonic {
            key,
            anchor,
            anchor_pitch: self.equal(anchor),
        })
    }

    /// Where equal temperament at the reference puts a key.
    pub fn equal(&self, key: Key) -> Pitch {
        let semitones = key.number() as i64 - self.reference.number() as i64;
        self.reference_pitch + Interval::SEMITONE * semitones
    }

    /// What a key sounds; `None` where it is silent.
    pub fn pitch(&self, tonic: Tonic, key: Key) -> Option<Pitch> {
        let zero = self.place(tonic.anchor, tonic.key)?;
        // Rounded here and nowhere before.
        let above = (self.place(key, tonic.key)? - zero).interval();
        Some(tonic.anchor_pitch + above)
    }

    pub fn tuning(&self, tonic: Tonic) -> Tuning {
        let pitch = |key: usize| self.pitch(tonic, Key::new(key as u8)?);
        Tuning::new(std::array::from_fn(pitch))
    }

    fn place(&self, key: Key, tonic: Key) -> Option<Log> {
        let index = KEYS - 1 + key.number() as usize - tonic.number() as usize;
        Some(self.places[index]? + self.changes[key.pitch_class() as usize])
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::pitch::Hertz;
    use crate::tuning::{KeyMap, Scale};

    fn scales() -> Vec<FromTonic> {
        let ratios = |all: &[(u64, u64)]| all.iter().map(|(o, u)| Log::of_ratio(*o, *u)).collect();
        let five = FromTonic {
            steps: ratios(&[
                (1, 1),
                (16, 15),
                (9, 8),
                (6, 5),
                (5, 4),
                (4, 3),
                (45, 32),
                (3, 2),
                (8, 5),
                (5, 3),
                (9, 5),
                (15, 8),
            ]),
            period: Log::OCTAVE,
            map: KeyMap::EachKey,
            changes: std::array::from_fn(|key| Log::of_microcents(key as i64 * 1_234_567)),
        };
        let nineteen = FromTonic {
            steps: (0..19).map(|step| Log::OCTAVE.part(step, 19)).collect(),
            period: Log::OCTAVE,
            map: KeyMap::EachKey,
            changes: [Log::ZERO; 12],
        };
        let gaps = FromTonic {
            map: KeyMap::Letters {
                home: 2,
                steps: std::array::from_fn(|key| [0, 1, 0, 3, 4, 0][key % 6].into()),
            },
            period: Log::of_microcents(1_208_000_000),
            ..five.clone()
        };
        vec![five, nineteen, gaps]
    }

    #[test]
    fn every_tonic_is_what_the_scale_is_tuned_to_there() {
        for scale in scales() {
            for pin in [Pin::Key, Pin::Tonic] {
                for number in 0..128 {
                    let placement = Placement {
                        tonic: Key::new(number),
                        turned_to: None,
                        reference: Key::A4,
                        hertz: Hertz::from_micro(415_300_000).expect("a frequency"),
                        pin,
                    };
                    // Laid out for another tonic than the one asked for.
                    let other = Placement {
                        tonic: Key::new(127 - number),
                        ..placement
                    };
                    let turning = Turning::of(&scale, &other);
                    let tonic = turning.absolute(Key::new(number).expect("a key"));
                    let wanted = Scale::FromTonic(scale.clone()).tune(&placement).ok();
                    assert_eq!(tonic.map(|tonic| turning.tuning(tonic)), wanted);
                }
            }
        }
    }
}
