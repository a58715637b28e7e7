//! The score of the built-in rehearsal.

use super::{A4, BB4, C3, C4, E4, EB4, G3, G4, GS3, at};
use crate::offline::score_file;

const TICKS_PER_QUARTER: u16 = 480;
/// At 120 quarters a minute.
const TICKS_PER_S: f64 = 960.0;
const LENGTH_S: f64 = 109.0;

/// Songs of the stage file by number of program.
const PLAIN: u8 = 1;
const PURE: u8 = 2;
const MEANTONE: u8 = 3;
const AB: u8 = 4;
const HALFWAY: u8 = 5;
const SINKING: u8 = 6;
const STAYING: u8 = 7;
const LAST_CHORD: u8 = 8;

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

/// I, vi, ii and V: pure all round, they do not come back to where they began.
const ROUND: [&[u8]; 4] = [
    &[48, 60, 64, 67],
    &[45, 60, 64, 69],
    &[50, 62, 65, 69],
    &[43, 59, 62, 67],
];

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
    for (start, song) in [(at::SINKING, SINKING), (at::STAYING, STAYING)] {
        score.song(start - 0.2, song);
        score.rounds(start);
    }
    score.song(at::LAST_CHORD - 0.2, LAST_CHORD);
    score.chord(at::LAST_CHORD, 4.0, &[C4, E4, G4, BB4]);
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

    /// What two chords have in common is struck once and held over.
    fn rounds(&mut self, start: f64) {
        let all = ROUND.iter().cycle().take(at::LAST_OF_ROUNDS + 1);
        let chords: Vec<&[u8]> = all.copied().collect();
        for (place, chord) in chords.iter().enumerate() {
            let goes_on = |key: &u8| place > 0 && chords[place - 1].contains(key);
            for key in chord.iter().filter(|key| !goes_on(key)) {
                let with_it = chords[place..].iter().take_while(|c| c.contains(key));
                let (from, until) = (at::round(place), at::round(place + with_it.count()));
                self.chord(start + from, until - from, &[*key]);
            }
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
            .expect("two minutes of music fits into a MIDI file")
    }
}

fn tick(at_s: f64) -> u64 {
    (at_s * TICKS_PER_S).round() as u64
}
