//! Songs, and edits of the whole plan.

use super::armed::find_again;
use super::channel::{Program, UNSAID};
use super::part::owner_of;
use super::plan::{KeyboardId, Plan, SynthId};
use super::synth::{PEDALS, Rig};
use super::traffic::{Link, Weight};
use super::voices::Voice;
use super::{Engine, Playing};
use crate::limits::KEYBOARDS_MAX;
use crate::midi::{Message, controller};
use crate::time::Time;

impl Engine {
    /// Sounding notes keep their pitch: nothing is sent for them, and nothing they need is in the song.
    pub(super) fn begin_song(&mut self, now: Time, place: usize) {
        let Some(song) = self.plan.set.get(place) else {
            self.out.counters.ignored += 1;
            return;
        };
        self.song = place;
        self.playing = Playing::of(song);
        self.sends_due = !song.sends.is_empty();
        self.begin_told();
        self.begin_harmony();
        for synth in self.synths.iter_mut().take(self.plan.synths.len()) {
            synth.repeat_when_silent = true;
        }
        self.send_song(now);
        self.when_silent(now);
    }

    /// A song's own messages go out once no key is held.
    pub(super) fn send_song(&mut self, now: Time) {
        if !self.sends_due || self.voices.len() > 0 {
            return;
        }
        self.sends_due = false;
        for index in 0..self.plan.set[self.song].sends.len() {
            let (id, ref bytes) = self.plan.set[self.song].sends[index];
            match Message::read(bytes) {
                Some(Message::Sysex(_)) => {
                    self.synths[id.index()].send(Weight::Owed, bytes, &mut self.out);
                }
                Some(Message::Program { number, .. }) => self.send_program(now, id, number),
                Some(Message::Controller { number, value, .. }) => {
                    self.send_controller(id, number, value);
                }
                _ => self.out.counters.ignored += 1,
            }
        }
    }

    fn send_program(&mut self, now: Time, id: SynthId, number: u8) {
        for index in 0..self.plan.parts.len() {
            if self.plan.parts[index].to == id {
                let bank = self.parts[index].program;
                let program = Program {
                    program: number,
                    bank_msb: self.parts[index].controllers[controller::BANK_MSB as usize],
                    bank_lsb: self.parts[index].controllers[controller::BANK_LSB as usize],
                };
                if bank != program {
                    self.set_program(now, index, program);
                }
            }
        }
    }

    /// Kept for every channel of the synth's parts; they hear it before their next note.
    fn send_controller(&mut self, id: SynthId, number: u8, value: u8) {
        for index in 0..self.plan.parts.len() {
            if self.plan.parts[index].to == id {
                self.parts[index].set(number, value);
                let synth = &mut self.synths[id.index()];
                if let Some(manager) = synth.rig.manager() {
                    synth.controller(manager, number, value, Weight::Owed, &mut self.out);
                }
            }
        }
    }

    /// Takes over a new plan; gives back the old one.
    pub(super) fn swap_plan(&mut self, now: Time, plan: Box<Plan>) -> Box<Plan> {
        let gone = plan.keyboards.len()..self.plan.keyboards.len();
        for id in (0..KEYBOARDS_MAX).filter_map(KeyboardId::new) {
            if gone.contains(&self.plays_as(id).index()) {
                // It is heard no more, so nobody else would end what it holds.
                self.let_go(now, id);
            }
        }
        let old = std::mem::replace(&mut self.plan, plan);
        let place = find_again(&self.plan.set, &old, self.song);
        self.find_armed_again(&old);
        self.song = place.unwrap_or(self.song.min(self.plan.set.len() - 1));
        if place.is_none() || self.plan.edits_at_once {
            let method = self.playing.method;
            self.playing = Playing::of(&self.plan.set[self.song]);
            if place.is_none() {
                self.begin_told();
            }
            self.retell();
            if place.is_none() || self.playing.method != method {
                self.begin_harmony();
            }
        }
        self.let_go_of_edited(now);
        for index in 0..self.plan.synths.len() {
            let rig = Rig::of(&self.plan.synths[index]);
            let synth = &mut self.synths[index];
            synth.next_rig = (rig != synth.rig).then_some(rig);
        }
        if self.plan.parts != old.parts {
            self.fit_parts(now);
        }
        for index in self.plan.synths.len()..old.synths.len() {
            let id = self.synths[index].id;
            self.link_changed(now, id, Link::Down);
        }
        self.when_silent(now);
        old
    }

    /// After an edit of the parts: each takes the pedals and the wheel of the hands that play it now, and what rings
    /// under a pedal that nobody holds any more is let go.
    fn fit_parts(&mut self, now: Time) {
        self.rehome_voices(now);
        for index in 0..self.plan.parts.len() {
            let part = self.plan.parts[index];
            for (which, pedal) in PEDALS.into_iter().enumerate() {
                let value = self.deepest(&part, which);
                if value > 0 || self.parts[index].controllers[pedal as usize] != UNSAID {
                    self.parts[index].set(pedal, value);
                }
            }
            self.release_waiting(now, index);
        }
        for index in 0..self.plan.synths.len() {
            self.fit_channels(now, index);
        }
        // Where pedals are the synth's own now, nothing has to wait for them here.
        loop {
            let parts = &self.plan.parts;
            let waits = |v: &Voice| !v.drum && !v.down && !parts[v.part.index()].late_offs;
            match self.voices.take(waits) {
                Some(voice) => self.end(now, &voice, 64, None),
                None => return,
            }
        }
    }

    /// An open note belongs to the part that has its channel now; where none has, it is ended.
    fn rehome_voices(&mut self, now: Time) {
        for voice in self.voices.iter_mut().filter(|v| !v.drum) {
            let owner = owner_of(&self.plan.parts, voice.synth, voice.channel);
            voice.part = owner.unwrap_or(voice.part);
        }
        loop {
            let parts = &self.plan.parts;
            let homeless = |v: &Voice| !v.drum && owner_of(parts, v.synth, v.channel).is_none();
            match self.voices.take(homeless) {
                Some(voice) => self.end(now, &voice, 64, None),
                None => return,
            }
        }
    }

    /// Brings a synth's channels in line with the parts that own them now.
    fn fit_channels(&mut self, now: Time, index: usize) {
        let (id, rig) = (self.synths[index].id, self.synths[index].rig);
        let late = self.plan.parts.iter().any(|p| p.to == id && p.late_offs);
        for number in rig.channels().iter() {
            let owner = self.part_of(id, number);
            let pedal_down = |engine: &Engine, pedal| {
                owner.is_some_and(|(id, _)| engine.parts[id.index()].pedal_down(pedal))
            };
            let damper = pedal_down(self, controller::DAMPER);
            let sostenuto = pedal_down(self, controller::SOSTENUTO);
            let manager = rig.manager() == Some(number);
            if (manager && late) || (!manager && !damper && !sostenuto) {
                self.synths[index].lift_pedals(number, &mut self.out);
            }
            let channel = self.synths[index].channel(number);
            channel.version = 0;
            if (channel.damper && !damper) || (channel.sostenuto && !sostenuto) {
                channel.damper &= damper;
                channel.sostenuto &= sostenuto;
                channel.released_at = Some(now);
            }
            if channel.rings(now, rig.tail) {
                self.catch_up(id, number);
            }
        }
        for part in 0..self.plan.parts.len() {
            if let Some(manager) = rig.manager()
                && self.plan.parts[part].to == id
                && self.synths[index].up
            {
                self.say_gestures(id, manager, part);
            }
        }
    }
}

/// Whether a system exclusive message is General MIDI On or Off (universal, 09 01-03): the receiver forgets everything.
pub(super) fn is_reset(sysex: &[u8]) -> bool {
    matches!(sysex, [0xF0, 0x7E, _, 0x09, 0x01..=0x03, 0xF7])
}
