//! Notes that follow the harmony: what the engine tells it, and how what it moves reaches the wire.
//!
//! Keys of one instant are one chord, so a press of a part that follows waits until the instant is over: until time
//! moves on, something else comes in, or the driver asks for output.

use super::lasting::Lasting;
use super::notes::Press;
use super::plan::{Follow, PartId, PartPlan, SynthId};
use super::traffic::{RootTo, Weight};
use super::voices::Voice;
use super::{Engine, Hand};
use crate::limits::{KEYS, PARTS_MAX};
use crate::pitch::word::Bend;
use crate::pitch::{Interval, Pitch};
use crate::time::Time;
use crate::tuning::{Key, Tuning};

/// A key that stands further than this off the others, by its tuning or an inflection, is a neutral step: it is left
/// alone and not counted.
const NEUTRAL: Interval = Interval::from_cents(30);

/// One for the stage, and one for each part that wants its own.
pub(super) const HARMONIES: usize = 1 + PARTS_MAX;

/// What a note is to a harmonic context. Notes of one context and pitch class move together.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Followed {
    pub harmony: u8,
    /// After all transpositions.
    pub key: Key,
    pub counted: bool,
}

/// What moves a channel: a pitch class of a context.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Class {
    pub harmony: u8,
    pub class: u8,
}

impl Followed {
    pub fn class(self) -> Class {
        Class {
            harmony: self.harmony,
            class: self.key.pitch_class(),
        }
    }
}

/// A press that waits for the instant to be over.
#[derive(Clone, Copy)]
pub(super) struct Waiting {
    pub part: PartId,
    pub press: Press,
    /// `None` if it only waits for its name.
    pub followed: Option<Followed>,
}

/// The middle of what a tuning's keys stand from equal: what a neutral step is measured against.
pub(super) fn level(tuning: &Tuning) -> Interval {
    let mut offsets = [Interval::ZERO; KEYS];
    let mut count = 0;
    for key in Key::all() {
        if let Some(pitch) = tuning.pitch(key) {
            offsets[count] = pitch - Pitch::of_key(key.number());
            count += 1;
        }
    }
    offsets[..count].sort_unstable();
    offsets[..count].get(count / 2).copied().unwrap_or_default()
}

impl Engine {
    /// What a key of a part is to the harmony, and where it stands at rest; `None` if it goes its own way.
    fn follows(&self, id: PartId, part: &PartPlan, key: Key) -> Option<(Followed, Interval)> {
        let harmony = match part.follow {
            Follow::Harmony | Follow::Uncounted => 0,
            Follow::Own => 1 + id.index() as u8,
            Follow::Nothing => return None,
        };
        if !self.harmonies[harmony as usize].is_adaptive() || !part.tune || self.plain {
            return None;
        }
        let moved = self.moved_key(part, key)?;
        let rest = self.rest(moved)? - Pitch::of_key(moved.number());
        if (rest + part.offset - self.playing.level).abs() > NEUTRAL {
            return None;
        }
        let followed = Followed {
            harmony,
            key: moved,
            counted: part.follow != Follow::Uncounted,
        };
        Some((followed, rest))
    }

    /// Lets a press wait for its chord, if its part follows the harmony or is named by it; tells whether it does.
    pub(super) fn wait_for_chord(
        &mut self,
        now: Time,
        id: PartId,
        part: &PartPlan,
        press: &Press,
    ) -> bool {
        let follows = self.follows(id, part, press.key);
        if follows.is_none() && !self.is_named_by_chord(part) {
            return false;
        }
        if self.waiting.len() == self.waiting.capacity() {
            self.play_chord();
        }
        if self.refuses(part) {
            self.out.counters.refused += 1;
            return true;
        }
        if let Some((followed, rest)) = follows {
            let harmony = &mut self.harmonies[followed.harmony as usize];
            harmony.press(now, followed.key, rest, followed.counted);
        }
        self.waiting.push(Waiting {
            part: id,
            press: *press,
            followed: follows.map(|(followed, _)| followed),
        });
        self.chord_at = Some(now);
        true
    }

    /// Whether a press of this hand still waits, so that it must sound before it can end.
    pub(super) fn is_waiting(&self, hand: Hand, key: u8) -> bool {
        let is_it = |w: &Waiting| w.press.hand == hand && w.press.key.number() == key;
        self.waiting.iter().any(is_it)
    }

    /// The instant is over: everything that sounds finds its place, and what waited sounds there.
    pub(super) fn play_chord(&mut self) {
        let Some(now) = self.chord_at.take() else {
            return;
        };
        self.name_by_chord(now);
        let contexts = self.contexts();
        for harmony in &mut self.harmonies[..contexts] {
            harmony.solve(now, &self.shapes);
        }
        self.move_followers(now, Weight::Owed);
        let mut waiting = std::mem::take(&mut self.waiting);
        for Waiting {
            part: id,
            press,
            followed,
        } in waiting.drain(..)
        {
            let part = self.parts.get(id.index()).map(|part| part.plan);
            let sounds = part.is_some_and(|part| self.start(now, id, &part, &press, followed));
            if let Some(followed) = followed.filter(|_| !sounds) {
                let harmony = &mut self.harmonies[followed.harmony as usize];
                harmony.release(now, followed.key, followed.counted, false);
                self.chord_at = Some(now);
            }
        }
        self.waiting = waiting;
    }

    /// How many of the contexts can have anything to do: the stage's and those of its parts.
    pub(super) fn contexts(&self) -> usize {
        1 + self.playing_parts
    }

    /// Before time moves on.
    pub(super) fn play_chord_before(&mut self, now: Time) {
        if self.chord_at.is_some_and(|at| at < now) {
            self.play_chord();
        }
    }

    /// A step of every glide that is due.
    pub(super) fn glide(&mut self, now: Time) {
        for index in 0..self.contexts() {
            if self.harmonies[index].due_at().is_some_and(|at| at <= now) {
                self.harmonies[index].glide(now);
                self.move_followers(now, Weight::Control);
            }
        }
    }

    /// The song begins, or is plain: what sounds is left where it is.
    pub(super) fn begin_harmony(&mut self) {
        self.play_chord();
        for harmony in &mut self.harmonies {
            harmony.begin(self.playing.method);
        }
        self.begin_names();
        for voice in self.voices.iter_mut() {
            voice.followed = None;
        }
        for synth in &mut self.synths {
            for channel in &mut synth.channels {
                channel.follows = None;
            }
        }
    }

    /// What is told of root and sevenths.
    pub(super) fn tell_harmony(&mut self, before: &Lasting, told: &Lasting, anew: bool) {
        for harmony in &mut self.harmonies {
            if anew || before.root != told.root {
                match told.root {
                    RootTo::Hold => harmony.hold_root(None),
                    RootTo::At(class) => harmony.hold_root(Some(class)),
                    RootTo::Free => harmony.free_root(),
                }
            }
            harmony.set_sevenths(told.sevenths);
        }
    }

    /// A voice has ended; `rings`: a pedal keeps it sounding on a channel that still bends it.
    pub(super) fn leave_harmony(&mut self, now: Time, voice: &Voice, rings: bool) {
        if let Some(followed) = voice.followed {
            let harmony = &mut self.harmonies[followed.harmony as usize];
            harmony.release(now, followed.key, followed.counted, rings);
            self.chord_at.get_or_insert(now);
        }
    }

    /// A pedal is up.
    pub(super) fn damp_harmonies(&mut self, now: Time) {
        for harmony in &mut self.harmonies {
            harmony.damp();
        }
        self.chord_at.get_or_insert(now);
    }

    /// Bends every channel whose notes have been moved.
    fn move_followers(&mut self, now: Time, weight: Weight) {
        for index in 0..self.plan.synths.len() {
            let id = self.synths[index].id;
            for number in self.synths[index].rig.members.iter() {
                let channel = self.synths[index].channel(number);
                let Some(class) = channel.follows else {
                    continue;
                };
                let stands = self.harmonies[class.harmony as usize].offset(class.class);
                let by = stands - channel.stood;
                if by != Interval::ZERO && self.is_held(now, id, number) {
                    self.synths[index].channel(number).stood = stands;
                    self.move_channel(id, number, by, weight);
                }
            }
        }
    }

    /// Moves all that a channel sounds: one bend.
    pub(super) fn move_channel(&mut self, id: SynthId, number: u8, by: Interval, weight: Weight) {
        let synth = &mut self.synths[id.index()];
        let range = synth.rig.bend_range;
        let channel = synth.channel(number);
        channel.offset += by;
        let offset = channel.offset;
        channel.word = Bend::encode(offset, range).0;
        let word = channel.word;
        if self.bend_channel(id, number, weight) {
            self.out.counters.bends += 1;
        }
        self.record_moved(id, number, offset, word);
    }
}
