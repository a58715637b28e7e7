//! What there is to hear in a recording, and how it is measured from the sound made of it.
//!
//! What was sent is used only to know where in time and roughly where in pitch to listen; every number comes out of the
//! samples.

use super::measure::{Sound, Swell, cents};
use super::retune::{Recording, Sounded};
use crate::time::Time;
use crate::tuning::Key;
use std::fmt;

/// Two keys that sound together.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pair {
    pub lower: Key,
    pub upper: Key,
    /// Which partial of the lower key is counted against which of the upper: `(5, 4)` for a major third.
    pub partials: Option<(u8, u8)>,
    pub span_s: (f64, f64),
}

/// What was found of a [`Pair`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Found {
    pub pair: Pair,
    pub cents: f64,
    pub swell: Option<Swell>,
}

/// From a key going down to where its tone is steady, and from there to its note-off.
const SETTLE_S: f64 = 0.25;
const BEFORE_OFF_S: f64 = 0.05;
/// How far around the pitch sent one listens.
const AROUND_CENTS: f64 = 60.0;

impl Pair {
    /// Measures the pair. `None` if one of the two does not sound there.
    pub fn measure(&self, recording: &Recording, sound: &Sound) -> Option<Found> {
        let hz = |key| {
            let near_hz = sounding(recording, key, self.span_s)?.onset.sent.hertz();
            sound.partial_hz(self.span_s, near_hz, AROUND_CENTS)
        };
        let (lower_hz, upper_hz) = (hz(self.lower)?, hz(self.upper)?);
        let swell = self.partials.and_then(|(of_lower, of_upper)| {
            let meet_hz = (lower_hz * of_lower as f64 + upper_hz * of_upper as f64) / 2.0;
            sound.swell(self.span_s, meet_hz)
        });
        Some(Found {
            pair: *self,
            cents: cents(upper_hz, lower_hz),
            swell,
        })
    }
}

/// How far a key has moved between two stretches, ringing on or struck again, in cents; from the samples of both.
pub fn moved_cents(
    recording: &Recording,
    sound: &Sound,
    key: Key,
    before_s: (f64, f64),
    after_s: (f64, f64),
) -> Option<f64> {
    let hz = |span_s| {
        let near_hz = sounding(recording, key, span_s)?.onset.sent.hertz();
        sound.partial_hz(span_s, near_hz, AROUND_CENTS)
    };
    Some(cents(hz(after_s)?, hz(before_s)?))
}

fn sounding(recording: &Recording, key: Key, span_s: (f64, f64)) -> Option<&Sounded> {
    recording.notes.iter().find(|note| {
        note.onset.key == key && seconds(note.time) <= span_s.0 && seconds(note.until) >= span_s.1
    })
}

pub fn seconds(time: Time) -> f64 {
    time.nanos() as f64 / 1e9
}

/// `1:07`
pub fn clock(at_s: f64) -> String {
    format!("{}:{:02}", at_s as u32 / 60, at_s as u32 % 60)
}

impl fmt::Display for Found {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (lower, upper) = (self.pair.lower, self.pair.upper);
        write!(f, "{lower}-{upper} {:.2} cents", self.cents)?;
        match self.swell {
            None => Ok(()),
            Some(Swell {
                beats_hz: Some(hz), ..
            }) => write!(f, ", {hz:.2} beats a second"),
            Some(still) => write!(f, ", no beats in {:.1} s", still.listened_s),
        }
    }
}

/// A chord that stands still long enough to be heard and measured.
#[derive(Clone, Debug, PartialEq)]
pub struct Chord {
    pub from_s: f64,
    pub song: u16,
    /// From the lowest.
    pub keys: Vec<Key>,
    /// Those worth measuring; may be none.
    pub pairs: Vec<Pair>,
}

/// A chord shorter than this is not listed.
const CHORD_S_MIN: f64 = 0.8;
/// So many different chords are listed of each stretch of one song.
const CHORDS_PER_SONG: usize = 6;
/// Frequencies as near to each other as this cannot be told apart, or disturb each other's beats.
const APART_HZ: f64 = 4.0;
const BEATS_APART_HZ: f64 = 70.0;
/// Partials of the listening synth.
const PARTIALS: u8 = 8;
/// Simple intervals whose beats are counted, and how far from them is still the same interval badly tuned.
const SIMPLE: [(u8, u8); 8] = [
    (3, 2),
    (5, 4),
    (6, 5),
    (4, 3),
    (5, 3),
    (8, 5),
    (5, 2),
    (3, 1),
];
const SIMPLE_CENTS: f64 = 40.0;

/// Chords to be told about, a few for each stretch of one song.
pub fn chords(recording: &Recording) -> Vec<Chord> {
    let mut found: Vec<Chord> = Vec::new();
    let mut edges: Vec<Time> = recording
        .notes
        .iter()
        .flat_map(|note| [note.time, note.until])
        .collect();
    edges.sort();
    edges.dedup();
    let mut stretch: Vec<Vec<Key>> = Vec::new();
    for pair in edges.windows(2) {
        let mut notes: Vec<&Sounded> = recording
            .notes
            .iter()
            .filter(|note| note.time <= pair[0] && note.until >= pair[1])
            .collect();
        notes.sort_by_key(|note| note.onset.sent);
        let Some(song) = notes.iter().max_by_key(|n| n.time).map(|n| n.song) else {
            continue;
        };
        let (from_s, until_s) = (seconds(pair[0]), seconds(pair[1]));
        if notes.len() < 2 || until_s - from_s < CHORD_S_MIN {
            continue;
        }
        if found.last().is_some_and(|last| last.song != song) {
            stretch.clear();
        }
        let keys: Vec<Key> = notes.iter().map(|note| note.onset.key).collect();
        if stretch.len() >= CHORDS_PER_SONG || stretch.contains(&keys) {
            continue;
        }
        stretch.push(keys.clone());
        let span_s = (from_s + SETTLE_S, until_s - BEFORE_OFF_S);
        found.push(Chord {
            from_s,
            song,
            keys,
            pairs: pairs(&notes, span_s),
        });
    }
    found
}

/// Every note against the lowest, leaving out those hidden under a partial of another.
fn pairs(notes: &[&Sounded], span_s: (f64, f64)) -> Vec<Pair> {
    let hz = |note: &Sounded| note.onset.sent.hertz();
    let hidden = |note: &Sounded| {
        notes.iter().any(|other| {
            !std::ptr::eq(*other, note)
                && (1..=PARTIALS).any(|n| (hz(other) * n as f64 - hz(note)).abs() < APART_HZ)
        })
    };
    let lowest = notes[0];
    notes[1..]
        .iter()
        .filter(|note| !hidden(note) && !hidden(lowest))
        .map(|note| Pair {
            lower: lowest.onset.key,
            upper: note.onset.key,
            partials: meeting_partials(notes, lowest, note),
            span_s,
        })
        .collect()
}

/// The partials at which two notes beat, if theirs is a simple interval and no third note meddles.
fn meeting_partials(notes: &[&Sounded], lower: &Sounded, upper: &Sounded) -> Option<(u8, u8)> {
    let hz = |note: &Sounded| note.onset.sent.hertz();
    let interval = cents(hz(upper), hz(lower));
    let away = |(a, b): (u8, u8)| (interval - cents(a as f64, b as f64)).abs();
    let nearest = SIMPLE
        .into_iter()
        .min_by(|a, b| away(*a).total_cmp(&away(*b)))?;
    if away(nearest) > SIMPLE_CENTS {
        return None;
    }
    let (of_lower, of_upper) = nearest;
    let meet_hz = hz(lower) * of_lower as f64;
    let alone = notes
        .iter()
        .filter(|other| !std::ptr::eq(**other, lower) && !std::ptr::eq(**other, upper))
        .all(|other| {
            (1..=PARTIALS).all(|n| (hz(other) * n as f64 - meet_hz).abs() > BEATS_APART_HZ)
        });
    alone.then_some((of_lower, of_upper))
}
