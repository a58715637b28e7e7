//! The names of keys without their octave, as places on the line of fifths.

use std::fmt;

/// A note name such as `C`, `F#` or `Eb`: its place on the line of fifths, C = 0, G = 1, F = -1, C# = 7.
///
/// G# and Ab are two letters on one key.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Letter(i8);

const NATURALS: [(char, i8); 7] = [
    ('F', -1),
    ('C', 0),
    ('G', 1),
    ('D', 2),
    ('A', 3),
    ('E', 4),
    ('B', 5),
];
/// F double flat up to B double sharp.
const LINE: std::ops::RangeInclusive<i8> = -15..=19;

impl Letter {
    pub const C: Letter = Letter(0);
    pub const A: Letter = Letter(3);

    /// By place on the line of fifths; `None` beyond double accidentals.
    pub fn on_line(place: i8) -> Option<Letter> {
        LINE.contains(&place).then_some(Letter(place))
    }

    pub const fn place(self) -> i8 {
        self.0
    }

    /// Reads `C`, `c` is refused; `#` and `b`, once or twice.
    pub fn parse(text: &str) -> Option<Letter> {
        let mut chars = text.chars();
        let first = chars.next()?;
        let (_, natural) = NATURALS.iter().find(|(name, _)| *name == first)?;
        let accidentals = match chars.as_str() {
            "" => 0,
            "#" => 1,
            "##" => 2,
            "b" => -1,
            "bb" => -2,
            _ => return None,
        };
        Letter::on_line(natural + 7 * accidentals)
    }

    /// 0 for C, 11 for B; the key this name falls on.
    pub fn pitch_class(self) -> u8 {
        (self.0 as i32 * 7).rem_euclid(12) as u8
    }

    /// Semitones above the C of the same octave number: -1 for Cb, 12 for B#.
    pub fn semitones_above_c(self) -> i32 {
        let accidentals = (self.0 as i32 + 1).div_euclid(7);
        let natural = self.0 as i32 - 7 * accidentals;
        (natural * 7).rem_euclid(12) + accidentals
    }

    /// The usual name of a pitch class: C C# D Eb E F F# G G# A Bb B.
    pub fn usual(pitch_class: u8) -> Letter {
        const USUAL: [i8; 12] = [0, 7, 2, -3, 4, -1, 6, 1, 8, 3, -2, 5];
        Letter(USUAL[pitch_class as usize % 12])
    }
}

impl fmt::Display for Letter {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let accidentals = (self.0 as i32 + 1).div_euclid(7);
        let natural = (self.0 as i32 - 7 * accidentals) as i8;
        let name = NATURALS
            .iter()
            .find(|(_, place)| *place == natural)
            .expect("seven naturals cover the line")
            .0;
        let marks = match accidentals {
            0 => "",
            1 => "#",
            2 => "##",
            -1 => "b",
            _ => "bb",
        };
        write!(f, "{name}{marks}")
    }
}
