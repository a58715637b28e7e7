//! The built-in rehearsal: a stage file, a score of invented music, and what there is to hear in it.

use super::moments::{Found, Pair, moved_cents};
use super::retune::Recording;
use super::{measure::Sound, score_file};
use crate::tuning::Key;

/// To be changed by whoever plays with it.
pub const STAGE: &str = include_str!("../../config/rehearsal.yaml");

/// A thing to hear.
pub struct Scene {
    pub from_s: f64,
    /// What sounds.
    pub what: &'static str,
    /// What to listen for, where the stage file is as we wrote it.
    pub listen: &'static str,
    pub checks: Vec<Check>,
}

/// What is measured of a scene.
#[derive(Clone, Copy)]
pub enum Check {
    Pair(Pair),
    /// That a key stays where it is from one stretch to another.
    Still {
        key: Key,
        before_s: (f64, f64),
        after_s: (f64, f64),
    },
}

/// What was found.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Finding {
    Pair(Found),
    Moved { key: Key, cents: f64 },
}

const TICKS_PER_QUARTER: u16 = 480;
/// At 120 quarters a minute.
const TICKS_PER_S: f64 = 960.0;
const LENGTH_S: f64 = 78.5;

const C3: u8 = 48;
const G3: u8 = 55;
const GS3: u8 = 56;
const C4: u8 = 60;
const EB4: u8 = 63;
const E4: u8 = 64;
const G4: u8 = 67;
const A4: u8 = 69;

/// Songs of the stage file by number of program.
const PLAIN: u8 = 1;
const PURE: u8 = 2;
const MEANTONE: u8 = 3;
const AB: u8 = 4;
const HALFWAY: u8 = 5;

/// The phrase: when its chords begin (in half seconds) and what is in them.
const PHRASE: [(u32, &[u8]); 11] = [
    (0, &[48, 55, 60, 76]),
    (2, &[45, 57, 64, 72]),
    (4, &[53, 57, 60, 69]),
    (6, &[50, 57, 65, 74]),
    (7, &[50, 57, 65, 72]),
    (8, &[52, 56, 64, 71]),
    (10, &[45, 57, 64, 72]),
    (12, &[43, 59, 62, 74]),
    (13, &[43, 59, 62, 71]),
    (14, &[48, 55, 64, 72]),
    (19, &[]),
];

/// A tune over a drone: when (in tenths of a second) and which key.
const TUNE: [(u32, u8); 8] = [
    (0, 60),
    (6, 62),
    (12, 64),
    (18, 65),
    (24, 64),
    (30, 62),
    (36, 60),
    (56, 0),
];

/// When each scene begins, in seconds.
mod at {
    pub const EQUAL_THIRD: f64 = 1.0;
    pub const PURE_THIRD: f64 = 7.5;
    pub const PURE_CHORD: f64 = 13.0;
    pub const FIFTH: f64 = 17.5;
    pub const EQUAL_PHRASE: f64 = 23.0;
    pub const MEANTONE_PHRASE: f64 = 33.5;
    pub const WOLF: f64 = 44.0;
    pub const NAMED: f64 = 49.0;
    pub const RINGING: f64 = 54.5;
    pub const CHANGE: f64 = 57.5;
    pub const AGAIN: f64 = 62.5;
    pub const NEUTRAL: f64 = 67.0;
    pub const TUNE: f64 = 72.0;
}

/// The score, as a MIDI file of format 0.
pub fn score() -> Vec<u8> {
    let mut score = Writer { events: Vec::new() };
    score.song(0.5, PLAIN);
    score.chord(at::EQUAL_THIRD, 6.0, &[C4, E4]);
    score.song(at::PURE_THIRD - 0.2, PURE);
    score.chord(at::PURE_THIRD, 5.0, &[C4, E4]);
    score.chord(at::PURE_CHORD, 4.0, &[C4, E4, G4]);
    score.song(at::FIFTH - 0.2, MEANTONE);
    score.chord(at::FIFTH, 5.0, &[C4, G4]);
    for (start, song) in [(at::EQUAL_PHRASE, PLAIN), (at::MEANTONE_PHRASE, MEANTONE)] {
        score.song(start - 0.2, song);
        for pair in PHRASE.windows(2) {
            let (from, until) = (pair[0].0 as f64 / 2.0, pair[1].0 as f64 / 2.0);
            score.chord(start + from, until - from - 0.02, pair[0].1);
        }
    }
    score.chord(at::WOLF, 4.5, &[GS3, EB4]);
    score.song(at::NAMED - 0.2, AB);
    score.chord(at::NAMED, 5.0, &[GS3, EB4]);
    score.song(at::RINGING - 0.2, PLAIN);
    score.chord(at::RINGING, 7.5, &[C4, E4, G4]);
    score.song(at::CHANGE, PURE);
    score.chord(at::CHANGE + 0.5, 4.0, &[A4]);
    score.chord(at::AGAIN, 4.0, &[C4, E4, G4, A4]);
    score.song(at::NEUTRAL - 0.2, HALFWAY);
    score.chord(at::NEUTRAL, 4.5, &[C4, E4]);
    score.chord(at::TUNE, 5.6, &[C3, G3]);
    for pair in TUNE.windows(2) {
        let (from, until) = (pair[0].0 as f64 / 10.0, pair[1].0 as f64 / 10.0);
        score.chord(at::TUNE + from, until - from - 0.02, &[pair[0].1]);
    }
    score.finish()
}

struct Writer {
    /// Tick, whether it starts something, message, its length.
    events: Vec<(u64, bool, [u8; 3], usize)>,
}

impl Writer {
    /// What a player's program button on channel 16 sends.
    fn song(&mut self, at_s: f64, number: u8) {
        self.events
            .push((tick(at_s), true, [0xCF, number - 1, 0], 2));
    }

    fn chord(&mut self, at_s: f64, length_s: f64, keys: &[u8]) {
        for key in keys {
            self.events.push((tick(at_s), true, [0x90, *key, 84], 3));
            let until = tick(at_s + length_s);
            self.events.push((until, false, [0x80, *key, 64], 3));
        }
    }

    fn finish(mut self) -> Vec<u8> {
        // What ends comes before what begins at the same tick.
        self.events
            .sort_by_key(|(tick, starts, ..)| (*tick, *starts));
        let events: Vec<_> = self
            .events
            .iter()
            .map(|(tick, _, bytes, length)| (*tick, *bytes, *length))
            .collect();
        score_file::write_new(TICKS_PER_QUARTER, "Rehearsal", &events, tick(LENGTH_S))
            .expect("a minute of music fits into a MIDI file")
    }
}

fn tick(at_s: f64) -> u64 {
    (at_s * TICKS_PER_S).round() as u64
}

/// Everything there is to hear, in order.
pub fn scenes() -> Vec<Scene> {
    let phrase_end = |start: f64| (start + 7.3, start + 9.4);
    let before_s = (at::RINGING + 0.3, at::CHANGE - 0.1);
    let after_s = (at::CHANGE + 0.8, at::CHANGE + 4.4);
    let still = |key| Check::Still {
        key: known(key),
        before_s,
        after_s,
    };
    let third = |span_s| pair(C4, E4, Some((5, 4)), span_s);
    let tenth = |span_s| pair(C3, E4, Some((5, 2)), span_s);
    let scene = |from_s, what, listen, checks| Scene {
        from_s,
        what,
        listen,
        checks,
    };
    vec![
        scene(
            at::EQUAL_THIRD,
            "C and E",
            "high above them the sound trembles, ten times a second",
            vec![third((at::EQUAL_THIRD + 2.2, at::EQUAL_THIRD + 5.9))],
        ),
        scene(
            at::PURE_THIRD,
            "the same two keys",
            "the trembling has stopped",
            vec![third((at::PURE_THIRD + 0.3, at::PURE_THIRD + 4.9))],
        ),
        scene(
            at::PURE_CHORD,
            "C, E and G",
            "the chord stands still",
            vec![
                third((at::PURE_CHORD + 0.3, at::PURE_CHORD + 3.9)),
                pair(
                    C4,
                    G4,
                    Some((3, 2)),
                    (at::PURE_CHORD + 0.3, at::PURE_CHORD + 3.9),
                ),
            ],
        ),
        scene(
            at::FIFTH,
            "C and G",
            "a slow wave: meantone pays for its pure thirds with narrow fifths",
            vec![pair(
                C4,
                G4,
                Some((3, 2)),
                (at::FIFTH + 0.3, at::FIFTH + 4.9),
            )],
        ),
        scene(
            at::EQUAL_PHRASE,
            "a phrase",
            "every chord is a little restless, the last one too",
            vec![tenth(phrase_end(at::EQUAL_PHRASE))],
        ),
        scene(
            at::MEANTONE_PHRASE,
            "the same phrase",
            "the thirds rest now, and leading notes lie lower",
            vec![tenth(phrase_end(at::MEANTONE_PHRASE))],
        ),
        scene(
            at::WOLF,
            "the keys G# and Eb",
            "the wolf: in meantone that is no fifth at all",
            vec![pair(
                GS3,
                EB4,
                Some((3, 2)),
                (at::WOLF + 0.3, at::WOLF + 4.4),
            )],
        ),
        scene(
            at::NAMED,
            "the same two keys, once the player has named the lower one Ab",
            "a fifth like the others",
            vec![pair(
                GS3,
                EB4,
                Some((3, 2)),
                (at::NAMED + 0.3, at::NAMED + 4.9),
            )],
        ),
        scene(
            at::RINGING,
            "C, E and G held; the song changes under them, then A joins",
            "the chord does not move; only the new A takes the new tuning",
            vec![
                third(before_s),
                still(C4),
                still(E4),
                still(G4),
                pair(C4, A4, None, after_s),
            ],
        ),
        scene(
            at::AGAIN,
            "the same four keys struck again",
            "now all of them are in the new tuning",
            vec![
                third((at::AGAIN + 0.3, at::AGAIN + 3.9)),
                pair(C4, A4, None, (at::AGAIN + 0.3, at::AGAIN + 3.9)),
            ],
        ),
        scene(
            at::NEUTRAL,
            "C and E",
            "neither minor nor major: a neutral third",
            vec![pair(C4, E4, None, (at::NEUTRAL + 0.3, at::NEUTRAL + 4.4))],
        ),
        scene(
            at::TUNE,
            "a tune with that third over C and G",
            "the fifth below is pure and rests",
            vec![pair(C3, G3, Some((3, 2)), (at::TUNE + 0.3, at::TUNE + 5.5))],
        ),
    ]
}

fn pair(lower: u8, upper: u8, partials: Option<(u8, u8)>, span_s: (f64, f64)) -> Check {
    Check::Pair(Pair {
        lower: known(lower),
        upper: known(upper),
        partials,
        span_s,
    })
}

fn known(key: u8) -> Key {
    Key::new(key).expect("keys of the score are keys")
}

impl Check {
    /// `None` if the keys do not sound there.
    pub fn measure(&self, recording: &Recording, sound: &Sound) -> Option<Finding> {
        match *self {
            Check::Pair(pair) => pair.measure(recording, sound).map(Finding::Pair),
            Check::Still {
                key,
                before_s,
                after_s,
            } => moved_cents(recording, sound, key, before_s, after_s)
                .map(|cents| Finding::Moved { key, cents }),
        }
    }
}

impl std::fmt::Display for Finding {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Finding::Pair(found) => write!(f, "{found}"),
            // Adding 0.0 turns a -0.0 that rounding left into 0.0.
            Finding::Moved { key, cents } => {
                let moved = (cents * 100.0).round() / 100.0 + 0.0;
                write!(f, "{key} moved by {moved:.2} cents")
            }
        }
    }
}
