//! Sets of pitch classes, twelve bits each: what a chord is once octaves do not count.

use std::fmt;

pub const CLASSES: u8 = 12;
const ALL: u16 = (1 << CLASSES) - 1;

/// A set of pitch classes, C = 0 to B = 11. Wherever one class is asked for, any key number will do: its octave is
/// dropped.
#[derive(Clone, Copy, Default, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct PitchClasses(u16);

impl PitchClasses {
    pub const NONE: PitchClasses = PitchClasses(0);
    pub const ALL: PitchClasses = PitchClasses(ALL);

    pub const fn of(keys: &[u8]) -> PitchClasses {
        let mut set = PitchClasses::NONE;
        let mut at = 0;
        while at < keys.len() {
            set = set.with(keys[at]);
            at += 1;
        }
        set
    }

    /// Bit 0 is C. Bits above the twelfth are dropped.
    pub const fn from_bits(bits: u16) -> PitchClasses {
        PitchClasses(bits & ALL)
    }

    pub const fn bits(self) -> u16 {
        self.0
    }

    pub const fn has(self, key: u8) -> bool {
        self.0 & bit(key) != 0
    }

    pub const fn with(self, key: u8) -> PitchClasses {
        PitchClasses(self.0 | bit(key))
    }

    pub const fn without(self, key: u8) -> PitchClasses {
        PitchClasses(self.0 & !bit(key))
    }

    /// In this set, in the other, or in both.
    pub const fn or(self, other: PitchClasses) -> PitchClasses {
        PitchClasses(self.0 | other.0)
    }

    /// In both.
    pub const fn and(self, other: PitchClasses) -> PitchClasses {
        PitchClasses(self.0 & other.0)
    }

    /// In this set and not in the other.
    pub const fn less(self, other: PitchClasses) -> PitchClasses {
        PitchClasses(self.0 & !other.0)
    }

    pub const fn is_empty(self) -> bool {
        self.0 == 0
    }

    pub const fn count(self) -> usize {
        self.0.count_ones() as usize
    }

    /// The lowest class, counted from C.
    pub const fn first(self) -> Option<u8> {
        if self.is_empty() {
            None
        } else {
            Some(self.0.trailing_zeros() as u8)
        }
    }

    /// From C upwards.
    pub fn iter(self) -> impl Iterator<Item = u8> {
        (0..CLASSES).filter(move |class| self.has(*class))
    }

    /// Every class this many semitones higher.
    pub const fn raised(self, semitones: u8) -> PitchClasses {
        let by = semitones % CLASSES;
        PitchClasses((self.0 << by | self.0 >> (CLASSES - by)) & ALL)
    }

    /// The semitones from `key` up to each class: a chord seen from its root.
    pub const fn above(self, key: u8) -> PitchClasses {
        self.raised(CLASSES - key % CLASSES)
    }
}

const fn bit(key: u8) -> u16 {
    1 << (key % CLASSES)
}

impl FromIterator<u8> for PitchClasses {
    fn from_iter<I: IntoIterator<Item = u8>>(keys: I) -> PitchClasses {
        keys.into_iter()
            .fold(PitchClasses::NONE, PitchClasses::with)
    }
}

impl fmt::Debug for PitchClasses {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_set().entries(self.iter()).finish()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_chord_is_seen_from_its_root() {
        let g7 = PitchClasses::of(&[43, 59, 62, 65, 74]);
        assert_eq!(g7.iter().collect::<Vec<_>>(), [2, 5, 7, 11]);
        assert_eq!(g7.above(43), PitchClasses::of(&[0, 4, 7, 10]));
        assert_eq!(g7.above(7).raised(7), g7);
        assert_eq!(g7.first(), Some(2));
        assert!(g7.has(11) && g7.has(23) && !g7.has(0));
        assert_eq!(format!("{g7:?}"), "{2, 5, 7, 11}");
    }

    #[test]
    fn every_set_turns_full_circle() {
        for bits in 0..1 << CLASSES {
            let set = PitchClasses::from_bits(bits);
            for by in 0..=2 * CLASSES {
                let turned: PitchClasses = set.iter().map(|class| class + by).collect();
                assert_eq!(set.raised(by), turned);
                assert_eq!(turned.above(by), set);
                assert_eq!(turned.count(), set.count());
            }
        }
    }

    #[test]
    fn sets_meet_and_part() {
        let (c, am) = (PitchClasses::of(&[0, 4, 7]), PitchClasses::of(&[9, 0, 4]));
        assert_eq!(c.and(am), PitchClasses::of(&[0, 4]));
        assert_eq!(c.or(am), PitchClasses::of(&[0, 4, 7, 9]));
        assert_eq!(c.less(am), PitchClasses::of(&[7]));
        assert_eq!(c.without(19), c.and(am));
        assert_eq!(PitchClasses::NONE.first(), None);
        assert_eq!(PitchClasses::ALL.count(), 12);
    }
}
