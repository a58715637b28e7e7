//! Keys of the keyboard and their names.

use super::Letter;
use std::fmt;

/// A key of the keyboard by MIDI number, 0-127; 60 is C4, middle C.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Key(u8);

impl Key {
    pub const C4: Key = Key(60);
    pub const A4: Key = Key(69);

    /// `None` above 127.
    pub const fn new(number: u8) -> Option<Key> {
        if number < 128 {
            Some(Key(number))
        } else {
            None
        }
    }

    pub const fn number(self) -> u8 {
        self.0
    }

    /// 0 for every C, 11 for every B.
    pub const fn pitch_class(self) -> u8 {
        self.0 % 12
    }

    /// The key `by` semitones away, or `None` off the end of the keyboard.
    pub fn moved(self, by: i32) -> Option<Key> {
        u8::try_from(self.0 as i32 + by).ok().and_then(Key::new)
    }

    /// All 128 keys, from the lowest.
    pub fn all() -> impl DoubleEndedIterator<Item = Key> {
        (0..128).map(Key)
    }

    /// Reads `C4`, `Eb3`, `F#-1`; the octave changes at C, also for `B#3` (key 60) and `Cb4` (key 59).
    pub fn parse(text: &str) -> Option<Key> {
        let split = text.find(|c: char| c.is_ascii_digit() || c == '-')?;
        let letter = Letter::parse(&text[..split])?;
        let octave: i32 = text[split..]
            .parse()
            .ok()
            .filter(|o| (-2..=10).contains(o))?;
        let number = (octave + 1) * 12 + letter.semitones_above_c();
        u8::try_from(number).ok().and_then(Key::new)
    }
}

impl fmt::Display for Key {
    /// With the usual black keys: C# Eb F# G# Bb.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(
            f,
            "{}{}",
            Letter::usual(self.pitch_class()),
            self.0 as i32 / 12 - 1
        )
    }
}
