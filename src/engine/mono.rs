//! `mono: yes`: one channel, on which the newest key sounds. The keys held before it wait below, and when it comes up the
//! last of them that is still down sounds again.

use super::channel::Rest;
use super::choose::{Choice, Cost, Want};
use super::notes::Press;
use super::plan::{PartId, Steal};
use super::synth::Synth;
use super::voices::{Voice, Voices};
use super::{Engine, Hand};
use crate::limits::MONO_KEYS_MAX;
use crate::time::Time;
use crate::tuning::Key;

/// Keys that are held and make way for newer ones, the newest last.
#[derive(Clone, Copy)]
pub(super) struct Below {
    keys: [Option<Press>; MONO_KEYS_MAX],
}

impl Below {
    pub const NOTHING: Below = Below {
        keys: [None; MONO_KEYS_MAX],
    };

    /// The oldest is forgotten where there is no room.
    fn add(&mut self, press: Press) {
        self.keys.rotate_left(1);
        self.keys[MONO_KEYS_MAX - 1] = Some(press);
    }

    fn take_newest(&mut self) -> Option<Press> {
        let newest = self.keys.iter_mut().rev().find(|press| press.is_some());
        newest.and_then(Option::take)
    }

    /// Tells whether it was there.
    fn forget(&mut self, hand: Hand, key: Key) -> bool {
        let is_it = |press: &&mut Option<Press>| {
            press.is_some_and(|press| press.hand == hand && press.key == key)
        };
        let place = self.keys.iter_mut().find(is_it);
        place.is_some_and(|press| press.take().is_some())
    }
}

impl Engine {
    /// Voices of a mono part make way for a newer one. The keys that are still down wait below it.
    pub(super) fn make_way(&mut self, now: Time, id: PartId, yields: impl Fn(&Voice) -> bool) {
        while let Some(voice) = self.voices.take(|v| !v.drum && v.part == id && yields(v)) {
            if voice.down {
                self.parts[id.index()].below.add(Press::again(&voice));
            }
            self.end(now, &voice, 64, None);
        }
    }

    /// A key comes up. Where it is the one that sounds, the last one below it comes back; tells whether it only waited.
    pub(super) fn leave_mono(&mut self, now: Time, hand: Hand, key: Key) -> bool {
        let mut waited = false;
        for index in 0..self.playing_parts {
            if !self.parts[index].plan.mono {
                continue;
            }
            let of_part = |v: &&Voice| !v.drum && v.part.index() == index && v.down;
            let sounding = self.voices.iter().find(of_part);
            if sounding.is_some_and(|v| v.key == key && hand.is_of(v)) {
                self.come_back(now, index);
            }
            waited |= self.parts[index].below.forget(hand, key);
        }
        waited
    }

    /// After hands have been taken off: mono parts on which nothing sounds any more go back to what others hold.
    pub(super) fn come_back_everywhere(&mut self, now: Time) {
        for index in 0..self.playing_parts {
            let sounds = |v: &Voice| !v.drum && v.part.index() == index && v.down;
            if self.parts[index].plan.mono && !self.voices.iter().any(sounds) {
                self.come_back(now, index);
            }
        }
    }

    fn come_back(&mut self, now: Time, index: usize) {
        let part = self.parts[index].plan;
        let id = PartId::new(index).expect("a plan keeps to its limits");
        while let Some(press) = self.parts[index].below.take_newest() {
            let is_down = self.source(press.hand).keys >> press.key.number() & 1 == 1;
            if is_down
                && (self.wait_for_chord(now, id, &part, &press)
                    || self.start(now, id, &part, &press, None))
            {
                return;
            }
        }
    }
}

/// The one channel of a mono part. What another part has left ringing there gives way.
pub(super) fn choose(want: &Want, synth: &Synth, voices: &Voices, now: Time) -> Option<Choice> {
    let channel = want.pool.iter().next()?;
    let state = &synth.channels[channel as usize];
    let rest = state.rest(now, synth.rig.tail, synth.rig.keeps_pitch());
    let is_other_s =
        |v: &Voice| v.synth == synth.id && v.channel == channel && !v.drum && v.part != want.part;
    let other_pedal = rest == Rest::Pedal && state.part.is_some_and(|part| part != want.part);
    let cost = match voices.iter().any(is_other_s) || other_pedal {
        true if synth.rig.steal == Steal::Nothing => return None,
        true => Cost::Steal,
        false => Cost::Nothing,
    };
    Some(Choice { channel, cost })
}
