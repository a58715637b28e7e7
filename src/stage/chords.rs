//! The chords a piece stands on: how wide their thirds and fifths are as they are played, and in which keys nothing howls.

use super::Song;
use super::circle::Circle;
use crate::engine::plan::TwoNames;
use crate::pitch::{Interval, Log, Pitch};
use crate::tuning::{Key, Letter, Tuning};

/// A third this far from pure is not meant to be played: beyond the 21.5 of a Pythagorean one.
const HARSH_THIRD: Interval = Interval::from_cents(30);
const HARSH_FIFTH: Interval = Interval::from_cents(12);

/// A third or fifth of a chord the piece stands on.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Pair {
    /// As the harmony spells them.
    pub low: Letter,
    pub high: Letter,
    pub played: Played,
    pub size: Interval,
    /// Above nought is wide.
    pub from_pure: Interval,
}

/// Which keys sound it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Played {
    AsNamed,
    /// The upper key goes by another name in the song, and has no other.
    On(Letter),
    /// A black key that stands for two notes begins as the first and has to be the second.
    AsSecond(TwoNames),
    /// Transposed: what sounds belongs to these keys of the tuning.
    Moved(Letter, Letter),
}

impl Song {
    /// The thirds of the chords on tonic, fourth and fifth of the keys the piece is in, and the tonic's fifth. None where
    /// chords are followed: there the tuning does not decide how wide they are.
    pub fn pairs(&self) -> Vec<(String, Vec<Pair>)> {
        if self.follows {
            return Vec::new();
        }
        let tuning = self.as_it_begins();
        let keys = self.in_keys.iter().filter_map(|(tonic, mode)| {
            let minor = match mode.as_str() {
                "" | "major" | "lydian" | "mixolydian" | "ionian" => false,
                "minor" | "aeolian" | "dorian" | "phrygian" => true,
                _ => return None, // nobody's thirds are presumed
            };
            // On the line of fifths a major third is four places up, a minor one three down.
            let third = if minor { -3 } else { 4 };
            let pairs = [(0, third), (-1, third), (1, 4), (0, 1)];
            let named = if mode.is_empty() {
                tonic.to_string()
            } else {
                format!("{tonic} {mode}")
            };
            let pairs = pairs
                .iter()
                .filter_map(|(root, up)| self.pair(&tuning, *tonic, *root, *up));
            Some((named, pairs.collect()))
        });
        keys.collect()
    }

    fn pair(&self, tuning: &Tuning, tonic: Letter, root: i8, up: i8) -> Option<Pair> {
        let low = Letter::on_line(tonic.place() + root)?;
        let high = Letter::on_line(low.place() + up)?;
        let pure = match up {
            1 => Log::of_ratio(3, 2),
            4 => Log::of_ratio(5, 4),
            _ => Log::of_ratio(6, 5),
        };
        let size = (self.sounds(tuning, high)? - self.sounds(tuning, low)?).within_octave();
        Some(Pair {
            low,
            high,
            played: self.played(low, high),
            size,
            from_pure: size - pure.interval(),
        })
    }

    fn sounds(&self, tuning: &Tuning, letter: Letter) -> Option<Pitch> {
        let moved = i32::from(letter.pitch_class()) + i32::from(self.transpose_keys);
        let apart = self
            .second_name(letter)
            .map_or(Interval::ZERO, |names| names.apart);
        Some(tuning.pitch(Key::C4.moved(moved)?)? + apart)
    }

    /// Where a black key can be this note, and begins as another.
    fn second_name(&self, letter: Letter) -> Option<TwoNames> {
        let names = self.two_names[letter.pitch_class() as usize]?;
        (self.transpose_keys == 0 && names.second == letter).then_some(names)
    }

    fn played(&self, low: Letter, high: Letter) -> Played {
        let moved = |letter: Letter| self.moved(letter.pitch_class());
        let name = self.names[high.pitch_class() as usize];
        match self.second_name(high).or(self.second_name(low)) {
            Some(names) => Played::AsSecond(names),
            None if self.transpose_keys != 0 => Played::Moved(moved(low), moved(high)),
            None if name != high => Played::On(name),
            None => Played::AsNamed,
        }
    }

    /// The key that a transposed one sounds as.
    fn moved(&self, pitch_class: u8) -> Letter {
        let moved = i32::from(pitch_class) + i32::from(self.transpose_keys);
        self.names[moved.rem_euclid(12) as usize]
    }

    /// What a transposition does to an unequal tuning; nothing where every chord stays as wide as it was.
    pub fn moved_from_its_keys(&self) -> Option<String> {
        let keys = i32::from(self.transpose_keys);
        let apart = |key: i32| {
            let key = Key::C4.moved(key)?;
            Some(self.tuning.pitch(key.moved(keys)?)? - self.tuning.pitch(key)?)
        };
        if keys == 0 || self.follows || (1..12).all(|key| apart(key) == apart(0)) {
            return None;
        }
        let from = self
            .in_keys
            .first()
            .map_or(self.names[0], |(tonic, _)| *tonic);
        let to = self.moved(from.pitch_class());
        let reference = self.placement.reference;
        let hertz = self.placement.hertz.hertz() * f64::from(keys as f32 / 12.0).exp2();
        Some(format!(
            "`transpose: {keys}` under an unequal tuning changes the key: {from} plays {to}, with the chords of {to}; to sound \
             {} with the chords of {from}, write `pitch: {reference} = {hertz:.2} Hz` in its place",
            if keys < 0 { "lower" } else { "higher" },
        ))
    }

    /// As [`good_keys`], where some key is not.
    pub fn good_keys(&self) -> Option<String> {
        if self.follows {
            return None;
        }
        good_keys(&self.as_it_begins(), &self.names).filter(|keys| keys != EVERYWHERE)
    }
}

const EVERYWHERE: &str = "no wolf in any key";

/// The major and minor keys whose chords on tonic, fourth and fifth have no wolf in them. Nothing where the octave has not
/// twelve keys, or some of them are neutral steps.
pub fn good_keys(tuning: &Tuning, names: &[Letter; 12]) -> Option<String> {
    let circle = Circle::of(tuning, names)?;
    if circle.fifths.iter().any(|fifth| fifth.neutral) {
        return None;
    }
    let howls = |low: u8, keys: u8, pure: Log, limit: Interval| {
        let pitch = |class: u8| tuning.pitch(Key::C4.moved(i32::from(class % 12))?);
        let size = pitch(low + keys).zip(pitch(low));
        size.is_none_or(|(high, low)| {
            ((high - low).within_octave() - pure.interval()).abs() > limit
        })
    };
    let is_good = |tonic: Letter, minor: bool| {
        let (third, pure) = match minor {
            true => (3, Log::of_ratio(6, 5)),
            false => (4, Log::of_ratio(5, 4)),
        };
        let tonic = tonic.pitch_class();
        !howls(tonic, third, pure, HARSH_THIRD)
            && !howls(tonic + 5, third, pure, HARSH_THIRD)
            && !howls(tonic + 7, 4, Log::of_ratio(5, 4), HARSH_THIRD)
            && !howls(tonic, 7, Log::of_ratio(3, 2), HARSH_FIFTH)
    };
    let good = |minor: bool| -> Vec<String> {
        let tonics = circle.fifths.iter().map(|fifth| fifth.low);
        tonics
            .filter(|tonic| is_good(*tonic, minor))
            .map(|tonic| tonic.to_string())
            .collect()
    };
    Some(match (good(false).as_slice(), good(true).as_slice()) {
        ([], []) => String::from("a wolf in every key"),
        (major, minor) if major.len() + minor.len() == 24 => String::from(EVERYWHERE),
        (major, []) => format!("no wolf in {} major", major.join(", ")),
        ([], minor) => format!("no wolf in {} minor", minor.join(", ")),
        (major, minor) => format!(
            "no wolf in {} major and in {} minor",
            major.join(", "),
            minor.join(", ")
        ),
    })
}

impl Pair {
    pub fn is_fifth(&self) -> bool {
        self.high.place() - self.low.place() == 1
    }

    pub fn is_harsh(&self) -> bool {
        let limit = match self.is_fifth() {
            true => HARSH_FIFTH,
            false => HARSH_THIRD,
        };
        self.from_pure.abs() > limit
    }
}

impl std::fmt::Display for Pair {
    /// `the third F#-A# is 427.4 c, 41.1 c wide (A# is played on Bb)`.
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let what = if self.is_fifth() { "fifth" } else { "third" };
        let off = self.from_pure;
        write!(
            f,
            "the {what} {}-{} is {:.1} c, ",
            self.low,
            self.high,
            self.size.cents()
        )?;
        match off.abs().microcents() {
            0..=5 => write!(f, "pure")?,
            _ if off < Interval::ZERO => write!(f, "{:.1} c narrow", off.abs().cents())?,
            _ => write!(f, "{:.1} c wide", off.cents())?,
        }
        match self.played {
            Played::AsNamed => Ok(()),
            Played::On(name) => write!(f, " ({} is played on {name})", self.high),
            Played::AsSecond(names) => {
                write!(f, " (with {} for {})", names.second, names.first)
            }
            Played::Moved(low, high) => write!(f, " (transposed, it sounds as {low}-{high})"),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::stage::complaint::{Complaints, Trail};
    use crate::stage::tunings::Library;
    use std::path::Path;

    // Meantone with Eb and G# has six major keys and three minor ones (common practice, as in every history of tuning);
    // a circulating temperament has all. The scale on C has a wolf from D to A.
    #[test]
    fn keys_without_a_wolf() {
        let mut complaints = Complaints::default();
        let mut library = Library::new(None, Path::new("nowhere/stage.yaml"), &mut complaints);
        let mut said = |name: &str| {
            let found = library.find(name, &Trail::default(), &mut complaints);
            let found = found.expect(name);
            let placement = found.placement(None, None, None);
            let tuning = found.scale.tune(&placement).expect(name);
            good_keys(&tuning, &found.scale.names(&placement))
        };
        let meantone = "no wolf in Bb, F, C, G, D, A major and in G, D, A minor";
        for (name, wanted) in [
            ("quarter-comma-meantone", Some(meantone)),
            ("two-sevenths-comma-meantone", Some(meantone)),
            ("werckmeister-3", Some(EVERYWHERE)),
            ("equal-12", Some(EVERYWHERE)),
            ("rast-al-farabi", None),
            ("equal-19", None),
        ] {
            assert_eq!(said(name).as_deref(), wanted, "{name}");
        }
    }
}
