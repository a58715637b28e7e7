//! The MIDI files that `aplaymidi` plays in the guest.

use crate::support::dice::Dice;
use midly::num::{u4, u7, u15, u24, u28};
use midly::{Format, Header, MetaMessage, MidiMessage, Smf, Timing, TrackEvent, TrackEventKind};
use std::path::Path;

pub const NOTES: usize = 2000;
/// The song changes after so many notes: six changes in all, three times each song.
const NOTES_A_SONG: usize = NOTES / 6;

/// Keys that are down when the stop comes.
pub const HELD: [u8; 4] = [48, 52, 55, 61];

/// More events than a client's queue in the kernel can hold at most (2000).
const FLOOD: usize = 2600;

pub struct Played {
    pub key: u8,
    pub velocity: u8,
    pub song: usize,
}

/// A track under way: events with their ticks since the one before.
#[derive(Default)]
struct Track(Vec<TrackEvent<'static>>);

impl Track {
    fn add(&mut self, delta: u32, channel: u8, message: MidiMessage) {
        self.0.push(TrackEvent {
            delta: u28::new(delta),
            kind: TrackEventKind::Midi {
                channel: u4::new(channel),
                message,
            },
        });
    }

    /// One tick is a millisecond: 1000 ticks to a beat of one second.
    fn save(mut self, path: &Path) {
        let meta = |delta, message| TrackEvent {
            delta: u28::new(delta),
            kind: TrackEventKind::Meta(message),
        };
        let tempo = MetaMessage::Tempo(u24::new(1_000_000));
        self.0.insert(0, meta(0, tempo));
        self.0.push(meta(0, MetaMessage::EndOfTrack));
        let timing = Timing::Metrical(u15::new(1000));
        let mut smf = Smf::new(Header::new(Format::SingleTrack, timing));
        smf.tracks.push(self.0);
        smf.save(path).expect("a writable file");
    }
}

fn on(key: u8, velocity: u8) -> MidiMessage {
    MidiMessage::NoteOn {
        key: u7::new(key),
        vel: u7::new(velocity),
    }
}

fn off(key: u8) -> MidiMessage {
    MidiMessage::NoteOff {
        key: u7::new(key),
        vel: u7::new(64),
    }
}

fn pedal(value: u8) -> MidiMessage {
    MidiMessage::Controller {
        controller: u7::new(64),
        value: u7::new(value),
    }
}

/// Chords of one to four keys, some under the pedal, with song changes between them, mostly while keys are down.
pub fn write_evening(path: &Path) -> Vec<Played> {
    let mut dice = Dice::new(20);
    let mut track = Track::default();
    let mut played: Vec<Played> = Vec::new();
    let mut down: Vec<u8> = Vec::new();
    let mut song = 0;
    while played.len() < NOTES {
        let due = played.len() / NOTES_A_SONG % 2;
        if due != song {
            song = due;
            let program = u7::new(song as u8);
            track.add(5, 15, MidiMessage::ProgramChange { program });
        }
        track.add(15, 0, pedal(if dice.percent(20) { 127 } else { 0 }));
        let chord = (1 + dice.below(4) as usize).min(NOTES - played.len());
        let mut keys: Vec<u8> = Vec::new();
        while keys.len() < chord {
            let key = 36 + dice.below(49) as u8;
            if !keys.contains(&key) && !down.contains(&key) {
                keys.push(key);
            }
        }
        for (n, key) in keys.iter().enumerate() {
            let velocity = 1 + dice.below(127) as u8;
            track.add(if n == 0 { 5 } else { 0 }, 0, on(*key, velocity));
            played.push(Played {
                key: *key,
                velocity,
                song,
            });
        }
        for (n, key) in down.drain(..).enumerate() {
            track.add(if n == 0 { 10 } else { 0 }, 0, off(key));
        }
        down = keys;
    }
    for key in down {
        track.add(10, 0, off(key));
    }
    track.add(10, 0, pedal(0));
    track.save(path);
    played
}

/// A chord and a pedal that are still down when the stop comes, and the wheel pushed.
pub fn write_held(path: &Path) {
    let mut track = Track::default();
    track.add(0, 0, pedal(127));
    for key in HELD {
        track.add(0, 0, on(key, 90));
    }
    let bend = midly::PitchBend(midly::num::u14::new(12_000));
    track.add(200, 0, MidiMessage::PitchBend { bend });
    track.add(60_000, 0, pedal(0));
    track.save(path);
}

/// Notes one after another, so slowly that a reader on a busy machine keeps up.
pub fn write_run(path: &Path, notes: usize) {
    let mut track = Track::default();
    for n in 0..notes {
        let key = 48 + (n * 7 % 36) as u8;
        track.add(5, 0, on(key, 1 + (n % 127) as u8));
        track.add(5, 0, off(key));
    }
    track.save(path);
}

/// So much at once that a client that does not read loses all.
pub fn write_flood(path: &Path) {
    let mut track = Track::default();
    for n in 0..FLOOD / 2 {
        let key = 48 + (n * 7 % 36) as u8;
        track.add(1, 0, on(key, 60));
        track.add(0, 0, off(key));
    }
    track.save(path);
}
