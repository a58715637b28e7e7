//! Songs, and edits of the whole plan.

use super::armed::find_again;
use super::channel::Program;
use super::plan::{KeyboardId, Plan, SynthId};
use super::synth::{Rig, SongDue, Synth};
use super::traffic::{Link, Weight};
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
        self.begin_told();
        self.begin_harmony();
        self.take_parts(now);
        for synth in self.synths.iter_mut().take(self.plan.synths.len()) {
            synth.repeat_when_silent = true;
        }
        self.song_is_due();
        self.send_song(now);
        self.when_silent(now);
    }

    fn song_is_due(&mut self) {
        for synth in &mut self.synths {
            synth.song_due = SongDue::All;
        }
    }

    /// A song's own messages go out once no key and no pedal is down; a change of sound may cut off what they hold.
    pub(super) fn send_song(&mut self, now: Time) {
        let synths = &self.synths[..self.plan.synths.len()];
        let is_due = |synth: &Synth| synth.up && synth.song_due != SongDue::Nothing;
        if !synths.iter().any(is_due) || self.voices.len() > 0 || !self.is_quiet() {
            return;
        }
        for index in 0..self.plan.set[self.song].sends.len() {
            let (id, ref bytes) = self.plan.set[self.song].sends[index];
            let synth = &mut self.synths[id.index()];
            if !synth.up {
                continue; // it gets them when it comes
            }
            match (Message::read(bytes), synth.song_due) {
                (_, SongDue::Nothing) => {}
                (Some(Message::Sysex(_)), _) => synth.send(Weight::Owed, bytes, &mut self.out),
                (_, SongDue::Exclusive) => {}
                (Some(Message::Program { number, .. }), _) => self.send_program(now, id, number),
                (Some(Message::Controller { number, value, .. }), _) => {
                    self.send_controller(now, id, number, value);
                }
                _ => self.out.counters.ignored += 1,
            }
        }
        for synth in self.synths.iter_mut().filter(|synth| synth.up) {
            synth.song_due = SongDue::Nothing;
        }
    }

    /// A whole set-up of the synth follows in this moment, and says programs and controllers itself.
    fn set_up_follows(&self, now: Time, id: SynthId) -> bool {
        let synth = &self.synths[id.index()];
        synth.repeat_when_silent && synth.is_silent(now)
    }

    fn send_program(&mut self, now: Time, id: SynthId, number: u8) {
        for index in 0..self.playing_parts {
            if self.parts[index].plan.to == id {
                let before = self.parts[index].program;
                let program = Program {
                    program: number,
                    bank_msb: self.parts[index].controllers[controller::BANK_MSB as usize],
                    bank_lsb: self.parts[index].controllers[controller::BANK_LSB as usize],
                };
                if self.set_up_follows(now, id) {
                    self.parts[index].program = program;
                } else if before != program {
                    self.set_program(now, index, program);
                }
            }
        }
    }

    /// Kept for every channel of the synth's parts; they hear it before their next note.
    fn send_controller(&mut self, now: Time, id: SynthId, number: u8, value: u8) {
        let set_up_follows = self.set_up_follows(now, id);
        for index in 0..self.playing_parts {
            if self.parts[index].plan.to == id {
                self.parts[index].set(number, value);
                let synth = &mut self.synths[id.index()];
                if let Some(manager) = synth.rig.manager().filter(|_| !set_up_follows) {
                    synth.controller(manager, number, value, Weight::Owed, &mut self.out);
                }
            }
        }
    }

    /// Takes over a new plan; gives back the old one.
    pub(super) fn swap_plan(&mut self, now: Time, plan: Box<Plan>) -> Box<Plan> {
        let gone = plan.keyboards.len()..self.plan.keyboards.len();
        for id in (0..KEYBOARDS_MAX).filter_map(KeyboardId::new) {
            let plays_as = self.plays_as(id).index();
            let zones = |plan: &Plan| plan.keyboards.get(plays_as).map(|plan| plan.zones);
            let is_other = zones(&plan) != zones(&self.plan);
            if gone.contains(&plays_as) || is_other {
                // It is heard no more, so nobody else would end what it holds.
                self.let_go(now, id);
            }
        }
        let old = std::mem::replace(&mut self.plan, plan);
        for keyboard in &mut self.keyboards {
            keyboard.fit(&self.plan, &old);
        }
        let place = find_again(&self.plan.set, &old, self.song);
        self.find_armed_again(&old);
        self.song = place.unwrap_or(self.song.min(self.plan.set.len() - 1));
        if place.is_none() || self.plan.edits_at_once {
            let method = self.playing.method;
            self.playing = Playing::of(&self.plan.set[self.song]);
            if place.is_none() {
                self.begin_told();
                self.song_is_due();
            }
            self.retell();
            if place.is_none() || self.playing.method != method {
                self.begin_harmony();
            }
        }
        self.let_go_of_edited(now);
        self.take_over_lamps(&old);
        for index in 0..self.plan.synths.len() {
            let rig = Rig::of(&self.plan.synths[index]);
            let synth = &mut self.synths[index];
            synth.next_rig = (rig != synth.rig).then_some(rig);
        }
        self.edit_parts(now);
        for index in self.plan.synths.len()..old.synths.len() {
            let id = self.synths[index].id;
            self.link_changed(now, id, Link::Down);
        }
        self.when_silent(now);
        old
    }
}
