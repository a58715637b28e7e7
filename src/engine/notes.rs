//! Notes: started at the right pitch, ended where they were started.

use super::beforehand::bend_for;
use super::channel::UNSAID;
use super::choose::{Choice, Cost, Want, choose};
use super::dialect::{self, on_members};
use super::fingers::led_otherwise;
use super::following::Followed;
use super::mono;
use super::outbox::Bundle;
use super::plan::{ChannelSet, KeyboardId, PartId, PartPlan, SynthId};
use super::traffic::Weight;
use super::voices::Voice;
use super::{Engine, Hand};
use crate::midi::{controller, status};
use crate::pitch::word::Bend;
use crate::pitch::{Interval, Pitch};
use crate::time::Time;
use crate::tuning::Key;

/// What travels with a note: CC88 and CC84 that came before it.
#[derive(Clone, Copy, Default)]
struct Luggage {
    velocity_low: Option<u8>,
    portamento_from: Option<u8>,
}

impl Luggage {
    /// A bundle that begins with it, on the channel that the note takes.
    fn bundle(self, channel: u8) -> Bundle {
        let mut bundle = Bundle::new();
        for (number, value) in [
            (controller::PORTAMENTO_FROM, self.portamento_from),
            (controller::VELOCITY_LOW, self.velocity_low),
        ] {
            if let Some(value) = value {
                bundle.add(&[status::CONTROLLER | channel, number, value]);
            }
        }
        bundle
    }
}

/// A key press on its way to a part.
#[derive(Clone, Copy)]
pub(super) struct Press {
    pub hand: Hand,
    pub key: Key,
    velocity: u8,
    luggage: Luggage,
    /// One for each key press.
    strike: u64,
}

impl Press {
    /// The press of a voice once more, with nothing that travelled with it.
    pub fn again(voice: &Voice) -> Press {
        Press {
            hand: Hand {
                keyboard: voice.keyboard,
                channel: voice.heard_on,
            },
            key: voice.key,
            velocity: voice.velocity,
            luggage: Luggage::default(),
            strike: voice.strike,
        }
    }
}

impl Engine {
    pub(super) fn key_down(&mut self, now: Time, hand: Hand, key: Key, velocity: u8) {
        self.strikes += 1;
        let source = self.source(hand);
        let luggage = Luggage {
            velocity_low: source.velocity_low.take(),
            portamento_from: source.portamento_from.take(),
        };
        let press = Press {
            hand,
            key,
            velocity,
            luggage,
            strike: self.strikes,
        };
        for index in 0..self.playing_parts {
            let part = self.parts[index].plan;
            if self.feeds(&part, hand) && (part.keys.0..=part.keys.1).contains(&key) {
                let id = PartId::new(index).expect("a plan keeps to its limits");
                if !self.wait_for_chord(now, id, &part, &press) {
                    self.start(now, id, &part, &press, None);
                }
            }
        }
        for synth in self.drum_synths(hand).iter() {
            self.start_drum(synth, &press);
        }
    }

    /// Whether nothing new may sound there now.
    pub(super) fn refuses(&self, part: &PartPlan) -> bool {
        let synth = &self.synths[part.to.index()];
        !synth.up || synth.tight || self.stopping || self.voices.full()
    }

    /// Starts a note; tells whether it sounds.
    pub(super) fn start(
        &mut self,
        now: Time,
        id: PartId,
        part: &PartPlan,
        press: &Press,
        followed: Option<Followed>,
    ) -> bool {
        let target = match followed {
            Some(followed) => Some(self.followed_target(part, followed)),
            None => self.target(part, press.key),
        };
        let Some((target, number)) = target.and_then(|at| Some((at, at.nearest_key()?))) else {
            self.out.counters.silent += 1;
            return false;
        };
        if self.refuses(part) {
            self.out.counters.refused += 1;
            return false;
        }
        let want = self.want(id, part, press, followed, target, number);
        let synth = &self.synths[part.to.index()];
        let choice = match part.mono {
            true => mono::choose(&want, synth, &self.voices, now),
            false => choose(&want, synth, &self.voices, now),
        };
        let Some(choice) = choice else {
            self.out.counters.refused += 1;
            return false;
        };
        if part.mono {
            // Two notes of one number would end as one; and what is released first keeps its pitch in an MPE zone.
            let keeps_pitch = self.synths[part.to.index()].rig.keeps_pitch();
            let first = keeps_pitch || choice.cost == Cost::Steal;
            self.make_way(now, id, |v| v.number == number || first);
        }
        self.make_room(now, part.to, choice);
        self.sound(now, part, press, &want, choice, followed);
        if part.mono {
            // Only now, so that a plain synth in mono mode plays legato.
            self.make_way(now, id, |v| v.strike != press.strike);
        }
        true
    }

    /// What a note of a part at a pitch asks of a channel.
    fn want(
        &self,
        id: PartId,
        part: &PartPlan,
        press: &Press,
        followed: Option<Followed>,
        target: Pitch,
        number: u8,
    ) -> Want {
        let synth = &self.synths[part.to.index()];
        let wheel = if on_members(&synth.rig, part) {
            self.parts[id.index()].wheel
        } else {
            Interval::ZERO
        };
        let finger = self.finger(press.hand, part);
        let offset = target - Pitch::of_key(number);
        let word = Bend::encode(offset, synth.rig.bend_range).0;
        let pool = dialect::members(&synth.rig, part);
        let mut sounding_on = ChannelSet::NONE;
        for voice in self.voices.iter() {
            if voice.synth == part.to && voice.number == number && pool.has(voice.channel) {
                sounding_on = sounding_on.with(voice.channel);
            }
        }
        let is_double = |channel| synth.channels[channel as usize].word == word;
        Want {
            part: id,
            pool,
            key: press.key,
            number,
            offset,
            nudge: self.nudge_of(part),
            follows: followed.map(Followed::class),
            groups: self.playing.tuning.groups(),
            doubles: finger.hand.is_none() && sounding_on.iter().any(is_double),
            sounding_on,
            wheel,
            word,
            finger,
            led_otherwise: led_otherwise(&self.voices, part.to, finger.hand),
            brightness: match synth.rig.manager() {
                Some(_) => UNSAID, // told to the manager
                None => self.parts[id.index()].controllers[controller::BRIGHTNESS as usize],
            },
            alone: part.mono,
        }
    }

    /// The key after all transpositions.
    pub(super) fn moved_key(&self, part: &PartPlan, key: Key) -> Option<Key> {
        key.moved(part.transpose_keys as i32 + self.transpose_keys() as i32)
    }

    /// Where the song's tuning puts a key at rest; `None` where it is silent.
    pub(super) fn rest(&self, moved: Key) -> Option<Pitch> {
        self.playing.tuning.pitch(moved)
    }

    /// Where the song puts a key of a part that follows no harmony; `None` where it is silent.
    pub(super) fn target(&self, part: &PartPlan, key: Key) -> Option<Pitch> {
        let moved = self.moved_key(part, key)?;
        let equal = Pitch::of_key(moved.number());
        let pitch = match (part.tune, self.plain) {
            (false, _) => equal,
            (true, true) => equal + self.plan.plain_offset,
            (true, false) => self.rest(moved)?,
        };
        Some(pitch + part.offset + self.nudge_of(part))
    }

    /// Where the harmony puts a key of a part.
    fn followed_target(&self, part: &PartPlan, followed: Followed) -> Pitch {
        let harmony = &self.harmonies[followed.harmony as usize];
        Pitch::of_key(followed.key.number())
            + harmony.offset(followed.key.pitch_class())
            + part.offset
            + self.nudge_of(part)
    }

    /// Untuned parts are not nudged either.
    fn nudge_of(&self, part: &PartPlan) -> Interval {
        if part.tune {
            self.nudge
        } else {
            Interval::ZERO
        }
    }

    fn make_room(&mut self, now: Time, id: SynthId, choice: Choice) {
        match choice.cost {
            Cost::Nothing => {}
            Cost::Along => self.out.counters.moved_along += 1,
            Cost::Tail => self.out.counters.tails_cut += 1,
            Cost::Steal => {
                self.out.counters.stolen += 1;
                let there = |v: &Voice| v.synth == id && v.channel == choice.channel;
                while let Some(voice) = self.voices.take(there) {
                    self.end(now, &voice, 64, None);
                }
                if !self.synths[id.index()].rig.keeps_pitch() {
                    self.synths[id.index()].hush(choice.channel, &mut self.out);
                }
            }
        }
    }

    /// Tells a chosen channel all that must be in force, then starts the note on it.
    fn sound(
        &mut self,
        now: Time,
        part: &PartPlan,
        press: &Press,
        want: &Want,
        choice: Choice,
        followed: Option<Followed>,
    ) {
        let number = choice.channel;
        self.hand_over(now, part.to, number, want.part);
        self.say_what_a_note_needs(now, part.to, number);
        let portamento_from = press
            .luggage
            .portamento_from
            .and_then(|from| self.target(part, Key::new(from)?)?.nearest_key());
        let luggage = Luggage {
            portamento_from,
            ..press.luggage
        };
        let pressure = self.pressure_for(part, part.to, number, want.part);
        let pressure = pressure.max(want.finger.pressure);
        let synth = &mut self.synths[part.to.index()];
        let mut bundle = luggage.bundle(number);
        bend_for(synth, want, number, pressure, &mut bundle, &mut self.out);
        bundle.add(&[status::NOTE_ON | number, want.number, press.velocity]);
        synth.send(Weight::Note, bundle.bytes(), &mut self.out);
        let channel = synth.channel(number);
        channel.take(now, want.key);
        if choice.cost != Cost::Along {
            channel.follows = want.follows;
        }
        if let Some(class) = channel.follows {
            channel.stood = self.harmonies[class.harmony as usize].offset(class.class);
        }
        self.out.counters.notes += 1;
        let voice = self.voice(press, part.to, number, want.number);
        let voice = Voice {
            part: want.part,
            tuned: self.moved_key(part, press.key).filter(|_| part.tune),
            followed,
            finger: want.finger.hand.is_some(),
            pressure: want.finger.pressure,
            ..voice
        };
        self.record_onset(&voice, want.offset, want.word);
        self.voices.add(voice);
    }

    /// A voice for a press that has just been started.
    fn voice(&self, press: &Press, synth: SynthId, channel: u8, number: u8) -> Voice {
        Voice {
            part: PartId::new(0).expect("there is a part"),
            synth,
            channel,
            number,
            velocity: press.velocity,
            pressure: 0,
            keyboard: press.hand.keyboard,
            heard_on: press.hand.channel,
            key: press.key,
            strike: press.strike,
            down: true,
            finger: false,
            latched: false,
            tuned: None,
            followed: None,
            drum: false,
        }
    }

    fn start_drum(&mut self, id: SynthId, press: &Press) {
        let synth = &mut self.synths[id.index()];
        if !synth.up || synth.tight || self.stopping || self.voices.full() {
            self.out.counters.refused += 1;
            return;
        }
        let channel = press.hand.channel;
        let luggage = Luggage {
            portamento_from: None,
            ..press.luggage
        };
        let mut bundle = luggage.bundle(channel);
        let key = press.key.number();
        bundle.add(&[status::NOTE_ON | channel, key, press.velocity]);
        synth.send(Weight::Note, bundle.bytes(), &mut self.out);
        self.out.counters.notes += 1;
        let voice = self.voice(press, id, channel, key);
        self.voices.add(Voice {
            drum: true,
            ..voice
        });
    }

    /// Ends the oldest press of a key, in all its layers.
    pub(super) fn key_up(&mut self, now: Time, hand: Hand, key: Key, velocity: u8) {
        let luggage = self.source(hand).velocity_low.take();
        let of_key = |v: &Voice| v.down && v.key == key && hand.is_of(v);
        let waited = self.leave_mono(now, hand, key);
        let Some(strike) = self.voices.iter().find(|v| of_key(v)).map(|v| v.strike) else {
            self.out.counters.orphans += !waited as u64;
            return;
        };
        self.release(now, velocity, luggage, |v| v.down && v.strike == strike);
    }

    /// Lets go of every voice that fits: ends it, or, where pedals are played by late note-offs, keeps it for them.
    pub(super) fn release(
        &mut self,
        now: Time,
        velocity: u8,
        luggage: Option<u8>,
        fits: impl Fn(&Voice) -> bool,
    ) {
        loop {
            let Engine { voices, parts, .. } = self;
            let waits = |v: &Voice| {
                let part = &parts[v.part.index()];
                !v.drum && part.plan.late_offs && (v.latched || part.damper_down())
            };
            for voice in voices.iter_mut() {
                if fits(voice) && waits(voice) {
                    voice.down = false;
                }
            }
            match voices.take(|v| fits(v) && !waits(v)) {
                Some(voice) => self.end(now, &voice, velocity, luggage),
                None => return,
            }
        }
    }

    /// Sends the one note-off of a voice that has been taken out, and notes what keeps ringing.
    pub(super) fn end(&mut self, now: Time, voice: &Voice, velocity: u8, luggage: Option<u8>) {
        let owner = self.part_of(voice.synth, voice.channel);
        let pedal_held = |number| {
            owner.is_some_and(|(id, part)| {
                !part.late_offs && self.parts[id.index()].pedal_down(number)
            })
        };
        let damper = pedal_held(controller::DAMPER);
        let sostenuto = voice.latched && pedal_held(controller::SOSTENUTO);
        let synth = &mut self.synths[voice.synth.index()];
        let luggage = Luggage {
            velocity_low: luggage,
            portamento_from: None,
        };
        let mut bundle = luggage.bundle(voice.channel);
        bundle.add(&[status::NOTE_OFF | voice.channel, voice.number, velocity]);
        synth.send(Weight::Owed, bundle.bytes(), &mut self.out);
        if voice.drum {
            return;
        }
        let follows_on = (damper || sostenuto) && !synth.rig.keeps_pitch();
        let channel = synth.channel(voice.channel);
        channel.held = channel.held.saturating_sub(1);
        channel.released_at = Some(now);
        channel.damper |= damper;
        channel.sostenuto |= sostenuto;
        self.leave_harmony(now, voice, follows_on);
        let tuned = voice.tuned.filter(|_| damper || sostenuto);
        self.by_chord.rings_on(owner.map(|(part, _)| part), tuned);
        if voice.pressure > 0
            && let Some((id, part)) = owner
        {
            let pressure = self.pressure_for(&part, voice.synth, voice.channel, id);
            let synth = &mut self.synths[voice.synth.index()];
            if synth.channels[voice.channel as usize].held > 0 {
                synth.pressure(voice.channel, pressure, Weight::Control, &mut self.out);
            }
        }
    }

    /// Ends everything a keyboard holds.
    pub(super) fn release_keyboard(&mut self, now: Time, keyboard: KeyboardId) {
        self.release(now, 64, None, |v| v.keyboard == keyboard && v.down);
        self.come_back_everywhere(now);
    }
}
