//! A score through the engine: what a synth would have been told, and when.

use super::score_file::{Score, Track};
use crate::engine::plan::{ChannelSet, Plan};
use crate::engine::{Command, Counters, Engine, Input, KeyboardId, Link, Onset, Output, SynthId};
use crate::midi::status;
use crate::time::Time;

/// Everything that came out of the engine.
#[derive(Clone, Debug, PartialEq)]
pub struct Recording {
    pub sent: Vec<Sent>,
    pub notes: Vec<Sounded>,
    /// Sounding notes that were moved, in order.
    pub moved: Vec<(Time, Onset)>,
    /// When the score ends.
    pub end: Time,
    pub counters: Counters,
    /// By place in the plan.
    pub synths: Vec<Synth>,
}

/// What is to be known of a synth once the plan has been played.
#[derive(Clone, Debug, PartialEq)]
pub struct Synth {
    pub name: String,
    pub drums: ChannelSet,
}

/// One message or bundle to a synth.
#[derive(Clone, Debug, PartialEq)]
pub struct Sent {
    pub tick: u64,
    pub time: Time,
    pub synth: SynthId,
    pub bytes: Box<[u8]>,
}

/// A note from its onset to its note-off (pedals may hold it longer).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sounded {
    pub time: Time,
    pub until: Time,
    /// The song it was played in, by place in the set.
    pub song: u16,
    pub onset: Onset,
}

/// So many events of one tick go in before the engine's outbox is emptied.
const TOGETHER: usize = 128;
const LONG_BYTES: usize = 256;

/// Plays `score` as if on a keyboard of the plan, beginning with a song of its set; both by place, from 0.
///
/// # Panics
/// If the plan has no such keyboard.
pub fn play(plan: Box<Plan>, score: &Score<'_>, song: u16, keyboard: usize) -> Recording {
    assert!(keyboard < plan.keyboards.len(), "a keyboard of the plan");
    let keyboard = KeyboardId::new(keyboard).expect("a plan keeps within the limits");
    let synths: Vec<Synth> = plan
        .synths
        .iter()
        .map(|synth| Synth {
            name: synth.name.to_string(),
            drums: synth.drums,
        })
        .collect();
    let mut player = Player {
        engine: Engine::new(plan),
        score,
        song: 0,
        sent: Vec::new(),
        notes: Vec::new(),
        moved: Vec::new(),
        open: Vec::new(),
    };
    player.engine.keep_records();
    player.begin(song, synths.len());
    for together in score.events.chunk_by(|a, b| a.tick == b.tick) {
        let (tick, time) = (together[0].tick, score.time(together[0].tick));
        player.run_deadlines(time);
        for some in together.chunks(TOGETHER) {
            for event in some {
                let bytes = &event.bytes[..];
                player
                    .engine
                    .handle_input(time, Input::Midi { keyboard, bytes });
                // What came before a song change belongs to the song before it; a long sysex wants the outbox alone.
                if player.engine.report().song != player.song || bytes.len() > LONG_BYTES {
                    player.drain(tick, time);
                }
            }
            player.drain(tick, time);
        }
    }
    let end = score.time(score.end_tick);
    player.run_deadlines(end);
    player
        .engine
        .handle_input(end, Input::Command(Command::End));
    player.drain(score.end_tick, end);
    for note in player.open {
        player.notes[note].until = end;
    }
    Recording {
        sent: player.sent,
        notes: player.notes,
        moved: player.moved,
        end,
        counters: player.engine.report().counters,
        synths,
    }
}

struct Player<'a> {
    engine: Engine,
    score: &'a Score<'a>,
    /// Of the notes being struck, by place in the set.
    song: u16,
    sent: Vec<Sent>,
    notes: Vec<Sounded>,
    moved: Vec<(Time, Onset)>,
    /// Notes whose note-off is still to come, oldest first.
    open: Vec<usize>,
}

impl Player<'_> {
    /// Song first, so that each synth is set up for it at once.
    fn begin(&mut self, song: u16, synths: usize) {
        let start = Time::START;
        if song > 0 {
            let song = Input::Command(Command::Song(song));
            self.engine.handle_input(start, song);
            self.drain(0, start);
        }
        for synth in (0..synths).filter_map(SynthId::new) {
            let link = Link::Up;
            self.engine
                .handle_input(start, Input::Synth { synth, link });
            self.drain(0, start);
        }
    }

    /// Everything that falls due up to and at `until`, each at its own moment.
    fn run_deadlines(&mut self, until: Time) {
        let mut before = None;
        while let Some(due) = self.engine.poll_timeout().filter(|due| *due <= until) {
            assert!(before != Some(due), "a deadline that has come is over");
            before = Some(due);
            self.engine.handle_timeout(due);
            self.drain(self.score.clock.tick_not_before(due), due);
        }
    }

    /// Takes everything the engine has to say, and then notes the song it is in.
    fn drain(&mut self, tick: u64, time: Time) {
        let song = self.song;
        while let Some(output) = self.engine.poll_output() {
            match output {
                Output::Send { synth, bytes, .. } => {
                    self.sent.push(Sent {
                        tick,
                        time,
                        synth,
                        bytes: bytes.into(),
                    });
                    close(&mut self.open, &mut self.notes, synth, bytes, time);
                }
                Output::Moved(onset) => self.moved.push((time, onset)),
                Output::Ask(_) => {} // no desk here
                Output::Onset(onset) => {
                    self.open.push(self.notes.len());
                    self.notes.push(Sounded {
                        time,
                        until: time,
                        song,
                        onset,
                    });
                }
            }
        }
        self.song = self.engine.report().song;
    }
}

/// Ends the oldest open note that this message is the note-off of.
fn close(open: &mut Vec<usize>, notes: &mut [Sounded], synth: SynthId, bytes: &[u8], time: Time) {
    let &[first, number, velocity] = bytes else {
        return;
    };
    let kind = first & 0xF0;
    if kind != status::NOTE_OFF && !(kind == status::NOTE_ON && velocity == 0) {
        return;
    }
    let is_it = |note: &Sounded| {
        let onset = note.onset;
        (onset.synth, onset.channel, onset.number) == (synth, first & 0x0F, number)
    };
    if let Some(at) = open.iter().position(|note| is_it(&notes[*note])) {
        notes[open.remove(at)].until = time;
    }
}

impl Recording {
    /// The MIDI file of it: the score's own times, tempi and texts, one track a synth.
    ///
    /// # Errors
    /// If something is too long for a MIDI file.
    pub fn midi_file(&self, score: &Score<'_>) -> Result<Vec<u8>, String> {
        let tracks: Vec<Track<'_>> = self
            .synths
            .iter()
            .enumerate()
            .map(|(place, synth)| Track {
                name: &synth.name,
                messages: self
                    .sent
                    .iter()
                    .filter(|sent| sent.synth.index() == place)
                    .map(|sent| (sent.tick, &sent.bytes[..]))
                    .collect(),
            })
            .collect();
        score.write(&tracks)
    }

    /// What could not be done as asked, in plain words.
    pub fn notices(&self) -> Vec<String> {
        let counters = &self.counters;
        [
        (
            counters.silent,
            "keys stayed silent: the tuning has no pitch for them, or it is out of reach",
        ),
        (
            counters.refused,
            "notes were refused: too many sounded at once",
        ),
        (
            counters.stolen,
            "notes were ended early: the synth has too few channels for so many pitches at once",
        ),
        (
            counters.moved_along,
            "notes went along with others that the harmony moves differently: the synth has too few channels",
        ),
        (
            counters.tails_cut,
            "notes were bent while they died away: the synth has too few channels",
        ),
        (
            counters.clipped,
            "bends stopped at the end of the synth's range: give it a wider bend_range",
        ),
        (
            counters.ignored,
            "song changes were ignored: the set has no such song",
        ),
        (
            counters.bad_bytes,
            "bytes of the file made no MIDI message and were left out",
        ),
        (
            counters.sysex_lost,
            "system exclusive messages were too long or cut off, and left out",
        ),
    ]
    .into_iter()
    .filter(|(count, _)| *count > 0)
    .map(|(count, words)| format!("{count} {words}"))
    .collect()
    }
}
