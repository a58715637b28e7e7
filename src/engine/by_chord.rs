//! `by_chord`: which of its two names a black key sounds, from what is played.
//!
//! Presses of one instant wait for each other, as those that follow the harmony do. A key that sounds, or rings under a
//! pedal, keeps its name, and so does one that was told its name.

use super::Engine;
use super::plan::{Follow, PartId, PartPlan};
use crate::intonation::spelling::{Called, Spelling, Strokes};
use crate::limits::PARTS_MAX;
use crate::pitch::Pitch;
use crate::time::Time;
use crate::tuning::{Key, Letter};

pub(super) struct ByChord {
    spelling: Spelling,
    /// For each part: pitch classes that a pedal of it keeps ringing, one bit each.
    ringing: [u16; PARTS_MAX],
}

impl ByChord {
    pub const fn new() -> ByChord {
        ByChord {
            spelling: Spelling::new(),
            ringing: [0; PARTS_MAX],
        }
    }

    /// A pedal of a part keeps a key ringing, if there are such.
    pub fn rings_on(&mut self, part: Option<PartId>, key: Option<Key>) {
        if let (Some(part), Some(key)) = (part, key) {
            self.ringing[part.index()] |= 1 << key.pitch_class();
        }
    }

    /// A part's pedals are up.
    pub fn damp(&mut self, part: usize) {
        self.ringing[part] = 0;
    }
}

impl Engine {
    /// Whether the harmony chooses what black keys of a part are called.
    pub(super) fn is_named_by_chord(&self, part: &PartPlan) -> bool {
        self.playing.by_hand.by_chord.is_some() && part.tune && !self.plain
    }

    /// Names the black keys that wait to sound.
    pub(super) fn name_by_chord(&mut self, now: Time) {
        let Some(at_first) = self.playing.by_hand.by_chord else {
            return;
        };
        let strokes = self.strokes();
        if strokes.struck == [0; 12] {
            return;
        }
        let mut called = self.called(at_first);
        self.by_chord.spelling.name(now, &strokes, &mut called);
        let names = &self.playing.by_hand.black_keys;
        let mut chosen = self.latched.by_chord;
        for (key, names) in names.iter().enumerate() {
            if let (Some(names), Some(_)) = (names, called[key].choice) {
                let second = called[key].now == names.second;
                chosen = chosen & !(1 << key) | u16::from(second) << key;
            }
        }
        if chosen != self.latched.by_chord {
            self.latched.by_chord = chosen;
            self.put_in_force(now, false);
            self.rename_waiting(now);
        }
    }

    /// How often each pitch class waits to be struck, and is held, by parts that count.
    fn strokes(&self) -> Strokes {
        let counts = |part: &PartPlan| {
            self.is_named_by_chord(part) && matches!(part.follow, Follow::Harmony | Follow::Own)
        };
        let mut strokes = Strokes::default();
        let add = |counts: &mut [u8; 12], key: Key| {
            let count = &mut counts[key.pitch_class() as usize];
            *count = count.saturating_add(1);
        };
        for waiting in &self.waiting {
            let part = &self.parts[waiting.part.index()].plan;
            if let Some(key) = self
                .moved_key(part, waiting.press.key)
                .filter(|_| counts(part))
            {
                add(&mut strokes.struck, key);
            }
        }
        for voice in self.voices.iter() {
            let part = &self.parts[voice.part.index()].plan;
            if let Some(key) = voice.tuned.filter(|_| counts(part)) {
                add(&mut strokes.held, key);
            }
        }
        strokes
    }

    /// What every key is called now, and which of them may be called otherwise.
    fn called(&self, at_first: [Letter; 12]) -> [Called; 12] {
        let rings = self.by_chord.ringing.iter().fold(0, |all, bits| all | bits);
        let sounds = self.voices.iter().filter_map(|voice| voice.tuned);
        let sounds = sounds.fold(rings, |all, key| all | 1 << key.pitch_class());
        std::array::from_fn(|key| {
            let Some(names) = self.playing.by_hand.black_keys[key] else {
                return Called {
                    now: at_first[key],
                    choice: None,
                };
            };
            let stays = (sounds | self.in_force.named) >> key & 1 == 1;
            let second = self.in_force.is_second(key);
            Called {
                now: if second { names.second } else { names.first },
                choice: (!stays).then_some((names.first, names.second)),
            }
        })
    }

    /// What waits to go with the harmony is told where its key stands now.
    fn rename_waiting(&mut self, now: Time) {
        for index in 0..self.waiting.len() {
            if let Some(followed) = self.waiting[index].followed
                && let Some(pitch) = self.rest(followed.key)
            {
                let rest = pitch - Pitch::of_key(followed.key.number());
                self.harmonies[followed.harmony as usize].rename(now, followed.key, rest);
            }
        }
    }

    /// The song begins, or is plain: what sounds from before is no harmony of it.
    pub(super) fn begin_names(&mut self) {
        self.by_chord = ByChord::new();
        for voice in self.voices.iter_mut() {
            voice.tuned = None;
        }
    }
}
