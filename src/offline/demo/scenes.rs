//! What there is to hear in the built-in rehearsal, and what is measured of it.

use super::{A4, BB4, C3, C4, E4, EB4, G3, G4, GS3, at};
use crate::offline::measure::Sound;
use crate::offline::moments::{Found, Pair, moved_cents};
use crate::offline::retune::Recording;
use crate::tuning::Key;

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
    /// That keys stay where they are from one stretch to another.
    Still {
        keys: &'static [u8],
        before_s: (f64, f64),
        after_s: (f64, f64),
    },
    /// How far a key that is struck again stands from where it stood.
    Again {
        key: u8,
        first_s: (f64, f64),
        again_s: (f64, f64),
    },
}

/// What was found.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Finding {
    Pair(Found),
    /// What moved furthest moved this far.
    Moved {
        keys: &'static [u8],
        cents: f64,
    },
    /// Above where it stood before.
    Again {
        key: u8,
        cents: f64,
    },
}

/// Everything there is to hear, in order.
pub fn scenes() -> Vec<Scene> {
    let all = [
        intervals(),
        phrases(),
        fifths(),
        change(),
        neutral(),
        rounds(),
        last_chord(),
    ];
    all.into_iter().flatten().collect()
}

fn intervals() -> Vec<Scene> {
    vec![
        Scene {
            from_s: at::EQUAL_THIRD,
            what: "C and E",
            listen: "high above them the sound trembles, ten times a second",
            // Later than elsewhere: the first sound fades in.
            checks: vec![third((at::EQUAL_THIRD + 2.2, at::EQUAL_THIRD + 5.9))],
        },
        Scene {
            from_s: at::PURE_THIRD,
            what: "the same two keys",
            listen: "the trembling has stopped",
            checks: vec![third((at::PURE_THIRD + 0.3, at::PURE_THIRD + 4.9))],
        },
        Scene {
            from_s: at::PURE_CHORD,
            what: "C, E and G",
            listen: "the chord stands still",
            checks: vec![
                third((at::PURE_CHORD + 0.3, at::PURE_CHORD + 3.9)),
                fifth(C4, G4, (at::PURE_CHORD + 0.3, at::PURE_CHORD + 3.9)),
            ],
        },
        Scene {
            from_s: at::FIFTH,
            what: "C and G",
            listen: "a slow wave: meantone pays for its pure thirds with narrow fifths",
            checks: vec![fifth(C4, G4, (at::FIFTH + 0.3, at::FIFTH + 4.9))],
        },
    ]
}

fn phrases() -> Vec<Scene> {
    // The third of the last chord, an octave apart.
    let last = |start: f64| pair(C3, E4, Some((5, 2)), (start + 7.3, start + 9.4));
    vec![
        Scene {
            from_s: at::EQUAL_PHRASE,
            what: "a phrase",
            listen: "every chord is a little restless, the last one too",
            checks: vec![last(at::EQUAL_PHRASE)],
        },
        Scene {
            from_s: at::MEANTONE_PHRASE,
            what: "the same phrase",
            listen: "the thirds rest now, and leading notes lie lower",
            checks: vec![last(at::MEANTONE_PHRASE)],
        },
    ]
}

fn fifths() -> Vec<Scene> {
    vec![
        Scene {
            from_s: at::WOLF,
            what: "the keys G# and Eb",
            listen: "the wolf: in meantone that is no fifth at all",
            checks: vec![fifth(GS3, EB4, (at::WOLF + 0.3, at::WOLF + 4.4))],
        },
        Scene {
            from_s: at::NAMED,
            what: "the same two keys, once the player has named the lower one Ab",
            listen: "a fifth like the others",
            checks: vec![fifth(GS3, EB4, (at::NAMED + 0.3, at::NAMED + 4.9))],
        },
    ]
}

fn change() -> Vec<Scene> {
    let before_s = (at::RINGING + 0.3, at::CHANGE - 0.1);
    let after_s = (at::CHANGE + 0.8, at::CHANGE + 4.4);
    let again_s = (at::AGAIN + 0.3, at::AGAIN + 3.9);
    vec![
        Scene {
            from_s: at::RINGING,
            what: "C, E and G held; the song changes under them, then A joins",
            listen: "the chord does not move; only the new A takes the new tuning",
            checks: vec![
                third(before_s),
                Check::Still {
                    keys: &[C4, E4, G4],
                    before_s,
                    after_s,
                },
                pair(C4, A4, None, after_s),
            ],
        },
        Scene {
            from_s: at::AGAIN,
            what: "the same four keys struck again",
            listen: "now all of them are in the new tuning",
            checks: vec![third(again_s), pair(C4, A4, None, again_s)],
        },
    ]
}

fn neutral() -> Vec<Scene> {
    vec![
        Scene {
            from_s: at::NEUTRAL,
            what: "C and E",
            listen: "neither minor nor major: a neutral third",
            checks: vec![pair(C4, E4, None, (at::NEUTRAL + 0.3, at::NEUTRAL + 4.4))],
        },
        Scene {
            from_s: at::TUNE,
            what: "a tune with that third over C and G",
            listen: "the fifth below is pure and rests",
            checks: vec![fifth(C3, G3, (at::TUNE + 0.3, at::TUNE + 5.5))],
        },
    ]
}

fn rounds() -> Vec<Scene> {
    let scene = |start: f64, what, listen| {
        // Within the first second: what stands longer may set out for home.
        let heard = |chord| {
            (
                start + at::round(chord) + 0.3,
                start + at::round(chord) + 0.95,
            )
        };
        let last_s = heard(at::LAST_OF_ROUNDS);
        let again = Check::Again {
            key: C3,
            first_s: heard(0),
            again_s: last_s,
        };
        Scene {
            from_s: start,
            what,
            listen,
            checks: vec![again, pair(C3, E4, Some((5, 2)), last_s)],
        }
    };
    vec![
        scene(
            at::SINKING,
            "the chords C, Am, Dm and G five times round, then C, with nothing to hold them",
            "every chord is pure, and each time round all of it sinks by a comma: in the end by a semitone",
        ),
        scene(
            at::STAYING,
            "the same chords, as trued plays them unless told otherwise",
            "a leash to the tuning holds them, and nobody hears that it pulls",
        ),
    ]
}

fn last_chord() -> Vec<Scene> {
    let span_s = (at::LAST_CHORD + 0.3, at::LAST_CHORD + 3.9);
    vec![Scene {
        from_s: at::LAST_CHORD,
        what: "C, E, G and Bb as 4:5:6:7",
        listen: "a seventh that wants to go nowhere",
        checks: vec![
            third(span_s),
            fifth(C4, G4, span_s),
            pair(C4, BB4, Some((7, 4)), span_s),
        ],
    }]
}

/// C4 and E4: the fifth partial of the one against the fourth of the other.
fn third(span_s: (f64, f64)) -> Check {
    pair(C4, E4, Some((5, 4)), span_s)
}

fn fifth(lower: u8, upper: u8, span_s: (f64, f64)) -> Check {
    pair(lower, upper, Some((3, 2)), span_s)
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
                keys,
                before_s,
                after_s,
            } => {
                let moved =
                    |key: &u8| moved_cents(recording, sound, known(*key), before_s, after_s);
                let all: Option<Vec<f64>> = keys.iter().map(moved).collect();
                let cents = all?.into_iter().map(f64::abs).fold(0.0, f64::max);
                Some(Finding::Moved { keys, cents })
            }
            Check::Again {
                key,
                first_s,
                again_s,
            } => moved_cents(recording, sound, known(key), first_s, again_s)
                .map(|cents| Finding::Again { key, cents }),
        }
    }
}

impl std::fmt::Display for Finding {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Finding::Pair(found) => write!(f, "{found}"),
            Finding::Moved { keys, cents } => {
                let names: Vec<String> = keys.iter().map(|key| known(*key).to_string()).collect();
                write!(f, "{} moved by {cents:.2} cents", names.join(" "))
            }
            Finding::Again { key, cents } => {
                let side = if *cents < 0.0 { "below" } else { "above" };
                let (key, cents) = (known(*key), cents.abs());
                write!(f, "the last {key} is {cents:.2} cents {side} the first")
            }
        }
    }
}
