//! The root of a chord: how well each sounding class carries the others as a stack of thirds.
//!
//! A third, a fifth and a seventh above a class speak for it, every other class against it. The one with the best score is
//! the root; the bass and the root before it are favoured a little, so that what is in doubt stays as it was: augmented
//! triads and diminished sevenths look alike from each of their classes, and keys have no spelling to tell them by.

pub mod parncutt;

use super::PitchClasses;
use super::pitch_classes::CLASSES;

// Tenths of a point.
const THIRD: i32 = 60;
const FIFTH: i32 = 70;
/// Over a minor third.
const DIMINISHED_FIFTH: i32 = 30;
/// Over a major third.
const AUGMENTED_FIFTH: i32 = 20;
const MINOR_SEVENTH: i32 = 30;
const MAJOR_SEVENTH: i32 = 25;
/// Over a diminished triad.
const DIMINISHED_SEVENTH: i32 = 15;
/// What a class costs that has no place in the stack, by semitones above the root. A sixth costs the one tenth more that
/// lets a half-diminished chord over its third be that, and no minor chord with a sixth: they are the same keys.
const STRANGER: [i32; CLASSES as usize] = [0, 30, 10, 30, 0, 15, 30, 0, 30, 16, 0, 20];
const BASS: i32 = 5;
/// About a tenth of the best possible score: less than that is no reason to hear a new root.
const PREVIOUS: i32 = 20;

/// The root of what sounds over this bass, or `None` in silence. `previous` is the root before, where the music has not
/// paused since. Any key number will do for a class.
///
/// Only ask when a key goes down: what is left of a chord as it is let go is no new chord.
pub fn root(sounding: PitchClasses, bass: u8, previous: Option<u8>) -> Option<u8> {
    let bass = bass % CLASSES;
    let previous = previous.map(|key| key % CLASSES);
    if let Some(previous) = previous
        && says_nothing_new(sounding, previous)
    {
        return Some(previous);
    }
    let favour =
        |class| BASS * i32::from(class == bass) + PREVIOUS * i32::from(Some(class) == previous);
    // Ties go to the first one up from the bass, so that a transposed chord has the transposed root.
    let mut best = None;
    for class in (bass..bass + CLASSES).map(|key| key % CLASSES) {
        if sounding.has(class) {
            let score = stack(sounding.above(class)) + favour(class);
            if best.is_none_or(|(best, _)| score > best) {
                best = Some((score, class));
            }
        }
    }
    best.map(|(_, class)| class)
}

/// Two classes that are no third and no fifth do not make a root of their own: a tritone and a semitone never, a whole
/// tone (or seventh) not where both belong to the stack of thirds that was.
fn says_nothing_new(sounding: PitchClasses, previous: u8) -> bool {
    const IN_THIRDS: PitchClasses = PitchClasses::of(&[0, 2, 3, 4, 7, 10, 11]);
    let Some(lower) = sounding.first().filter(|_| sounding.count() == 2) else {
        return false;
    };
    let above = sounding.above(lower);
    if above.has(1) || above.has(6) || above.has(11) {
        return true;
    }
    (above.has(2) || above.has(10)) && sounding.above(previous).less(IN_THIRDS).is_empty()
}

/// How well a class carries a chord, given as the semitones above it.
fn stack(chord: PitchClasses) -> i32 {
    let mut rest = chord.without(0);
    let mut score = 0;
    let mut take = |semitones, points| {
        rest = rest.without(semitones);
        score += points;
    };
    let third = [4, 3].into_iter().find(|third| chord.has(*third));
    if let Some(third) = third {
        take(third, THIRD);
    }
    match third {
        _ if chord.has(7) => take(7, FIFTH),
        Some(3) if chord.has(6) => take(6, DIMINISHED_FIFTH),
        Some(4) if chord.has(8) => take(8, AUGMENTED_FIFTH),
        _ => {}
    }
    if chord.has(10) {
        take(10, MINOR_SEVENTH);
    } else if chord.has(11) {
        take(11, MAJOR_SEVENTH);
    } else if chord.has(9) && third == Some(3) && chord.has(6) {
        take(9, DIMINISHED_SEVENTH);
    }
    let cost: i32 = rest.iter().map(|class| STRANGER[usize::from(class)]).sum();
    score - cost
}

#[cfg(test)]
mod tests {
    use super::*;

    fn root_of(keys: &[u8], previous: Option<u8>) -> Option<u8> {
        root(PitchClasses::of(keys), keys[0], previous)
    }

    #[test]
    fn silence_has_no_root() {
        assert_eq!(root(PitchClasses::NONE, 0, Some(7)), None);
    }

    #[test]
    fn a_doubtful_chord_keeps_its_root() {
        let (c, f, g) = (Some(0), Some(5), Some(7));
        // Csus4 is Fsus2.
        assert_eq!(root_of(&[48, 53, 55], c), c);
        assert_eq!(root_of(&[48, 53, 55], f), f);
        // Symmetric chords: the root that was, if it sounds; else the bass.
        assert_eq!(root_of(&[50, 53, 56, 59], None), Some(2));
        assert_eq!(root_of(&[50, 53, 56, 59], Some(11)), Some(11));
        assert_eq!(root_of(&[50, 53, 56, 59], c), Some(2));
        assert_eq!(root_of(&[52, 56, 60], None), Some(4));
        assert_eq!(root_of(&[52, 56, 60], c), c);
        // A clear chord is heard at once.
        assert_eq!(root_of(&[55, 59, 62], c), g);
    }

    #[test]
    fn the_same_keys_are_a_sixth_or_a_seventh_by_what_was() {
        // A C Eb G: half-diminished on A, unless C minor came before.
        assert_eq!(root_of(&[48, 51, 55, 57], None), Some(9));
        assert_eq!(root_of(&[48, 51, 55, 57], Some(0)), Some(0));
    }

    #[test]
    fn two_classes_that_say_nothing_keep_the_root() {
        let g = Some(7);
        assert_eq!(root_of(&[53, 59], g), g);
        assert_eq!(root_of(&[59, 60], g), g);
        // F and G belong to G7, D and E to C with a ninth; else the root is a seventh's lower tone.
        assert_eq!(root_of(&[53, 55], g), g);
        assert_eq!(root_of(&[50, 52], Some(0)), Some(0));
        assert_eq!(root_of(&[53, 55], Some(0)), g);
        // Thirds and fifths speak for themselves.
        assert_eq!(root_of(&[57, 60], g), Some(9));
        assert_eq!(root_of(&[60, 65], g), Some(5));
    }

    #[test]
    fn a_transposed_chord_has_the_transposed_root() {
        for bits in 1..1 << CLASSES {
            let chord = PitchClasses::from_bits(bits);
            for previous in [None, Some(0), Some(7)] {
                let first = chord.first().expect("a class");
                let here = root(chord, first, previous).expect("a root");
                let there = root(chord.raised(5), first + 5, previous.map(|key| key + 5));
                assert_eq!(there, Some((here + 5) % CLASSES), "{chord:?}");
            }
        }
    }
}
