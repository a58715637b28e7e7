//! Set-up: what a synth is told before it can obey, said in pieces that yield to a key; and how it is left.

use super::beforehand::latch;
use super::channel::{Channel, Due, UNSAID};
use super::dialect::{mpe, on_members};
use super::plan::{Dialect, Leave, SynthId};
use super::traffic::{Link, Weight};
use super::{Engine, Hand};
use crate::limits::{CHANNELS, SETTLE_MS};
use crate::midi::{controller, parameter, status};
use crate::pitch::Interval;
use crate::pitch::word::{Bend, BendRange};
use crate::time::{Span, Time};

impl Engine {
    pub(super) fn link_changed(&mut self, now: Time, id: SynthId, link: Link) {
        let synth = &mut self.synths[id.index()];
        match link {
            Link::Down => {
                synth.up = false;
                synth.tight = false;
                synth.piece_at = None;
                synth.again_at = None;
                synth.channels = [Channel::NEW; CHANNELS];
                while let Some(voice) = self.voices.take(|v| v.synth == id) {
                    self.leave_harmony(now, &voice, false);
                }
            }
            Link::Up | Link::Back => {
                synth.up = true;
                synth.tight = false;
                if let Some(rig) = synth.next_rig.take() {
                    synth.rig = rig;
                }
                if link == Link::Back {
                    synth.again_at = Some(now + Span::from_millis(SETTLE_MS));
                }
                self.synths[id.index()].song_due.again();
                self.set_up(now, id);
            }
            Link::Going => {
                while let Some(voice) = self.voices.take(|v| v.synth == id) {
                    self.end(now, &voice, 64, None);
                }
                let synth = &mut self.synths[id.index()];
                for number in synth.rig.channels().iter() {
                    synth.lift_pedals(number, &mut self.out);
                }
            }
            Link::Tight => synth.tight = true,
            Link::Easy => synth.tight = false,
        }
    }

    /// Begins to say everything again. A zone is only declared in silence, so while something sounds it waits.
    pub(super) fn set_up(&mut self, now: Time, id: SynthId) {
        if !self.synths[id.index()].up {
            return; // it is set up when it comes
        }
        self.fit_manager_range(id);
        let synth = &mut self.synths[id.index()];
        let silent = synth.is_silent(now);
        let zone = synth.rig.manager().is_some();
        synth.zone_due = zone && silent;
        synth.repeat_when_silent = zone && !silent;
        synth.left = false;
        for channel in synth.rig.channels().iter() {
            synth.channel(channel).unsay();
        }
        synth.piece_at = Some(now);
        self.say_pieces(now, id);
    }

    /// Says the pieces that are due by now.
    pub(super) fn say_pieces(&mut self, now: Time, id: SynthId) {
        loop {
            let synth = &mut self.synths[id.index()];
            if !synth.up || synth.piece_at.is_none_or(|at| at > now) {
                return;
            }
            synth.piece_at = Some(now + synth.rig.pace);
            if self.synths[id.index()].zone_due || self.manager_due(id) {
                self.say_manager(now, id);
                continue;
            }
            let synth = &mut self.synths[id.index()];
            let due = |channel: &u8| synth.channels[*channel as usize].due != Due::Nothing;
            match synth.rig.members.iter().find(due) {
                Some(channel) => self.say_channel(now, id, channel),
                None => {
                    synth.piece_at = None;
                    return;
                }
            }
        }
    }

    pub(super) fn manager_due(&self, id: SynthId) -> bool {
        let synth = &self.synths[id.index()];
        let due = |manager: u8| synth.channels[manager as usize].due != Due::Nothing;
        synth.rig.manager().is_some_and(due)
    }

    /// The zone, then what its manager speaks for.
    pub(super) fn say_manager(&mut self, now: Time, id: SynthId) {
        let synth = &mut self.synths[id.index()];
        let Some(manager) = synth.rig.manager() else {
            return;
        };
        if std::mem::take(&mut synth.zone_due) {
            mpe::open_zone(synth, manager, &mut self.out);
        }
        synth.channel(manager).due = Due::Nothing;
        let range = synth.manager_range.semitones();
        synth.send(
            Weight::Owed,
            &parameter::bend_range(manager, range),
            &mut self.out,
        );
        synth.channel(manager).bend = None;
        for index in 0..self.parts.len() {
            if self.parts[index].plan.to == id {
                self.say_gestures(id, manager, index);
                self.play_wheel(now, index, Weight::Owed);
            }
        }
        let synth = &mut self.synths[id.index()];
        if synth.channel(manager).bend.is_none() {
            synth.bend(manager, Bend::CENTRE, Weight::Owed, &mut self.out);
        }
    }

    /// One member's bend range, and whatever of its part the receiver may have forgotten.
    pub(super) fn say_channel(&mut self, now: Time, id: SynthId, number: u8) {
        let part = self.part_of(id, number);
        let synth = &mut self.synths[id.index()];
        let due = std::mem::replace(&mut synth.channel(number).due, Due::Nothing);
        if due == Due::Everything && synth.rig.local_off {
            let off = [status::CONTROLLER | number, controller::LOCAL, 0];
            synth.send(Weight::Owed, &off, &mut self.out);
        }
        if let (Some((part_id, _)), None) = (part, synth.rig.manager()) {
            // The program first: it may reset the range.
            let program = self.parts[part_id.index()].program;
            synth.program(number, program, &mut self.out);
        }
        let range = synth.rig.bend_range.semitones();
        synth.send(
            Weight::Owed,
            &parameter::bend_range(number, range),
            &mut self.out,
        );
        synth.channel(number).bend = None;
        let rings = synth.channels[number as usize].rings(now, synth.rig.tail);
        self.catch_up(id, number);
        if rings {
            self.say_bend(id, number);
        }
    }

    /// A part's program, controllers and pressure, on a channel that speaks for it.
    pub(super) fn say_gestures(&mut self, id: SynthId, number: u8, index: usize) {
        let settings = self.parts[index];
        let part = settings.plan;
        let synth = &mut self.synths[id.index()];
        synth.program(number, settings.program, &mut self.out);
        if settings.pedal_down(controller::SOSTENUTO) && !part.late_offs {
            latch(synth, number, synth.rig.members, &mut self.voices);
        }
        for (cc, value) in settings.controllers.iter().enumerate() {
            let by_late_offs =
                part.late_offs && matches!(cc as u8, controller::DAMPER | controller::SOSTENUTO);
            if *value != UNSAID && !by_late_offs {
                synth.controller(number, cc as u8, *value, Weight::Owed, &mut self.out);
            }
        }
        if !on_members(&synth.rig, &part) {
            synth.pressure(number, settings.pressure, Weight::Owed, &mut self.out);
        }
    }

    /// The bend that a member should have now.
    pub(super) fn say_bend(&mut self, id: SynthId, number: u8) {
        self.bend_channel(id, number, Weight::Owed);
    }

    /// A manager's range reaches as far as the widest wheel that plays on it.
    fn fit_manager_range(&mut self, id: SynthId) -> bool {
        let mut widest = Interval::SEMITONE;
        for part in self.parts.iter().map(|part| &part.plan) {
            if part.to != id {
                continue;
            }
            if on_members(&self.synths[id.index()].rig, part) {
                continue;
            }
            for (index, keyboard) in self.keyboards.iter().enumerate() {
                for (channel, source) in keyboard.sources.iter().enumerate() {
                    let plays = |hand: Hand| self.feeds(part, hand) && !self.is_finger(hand);
                    if Hand::new(index, channel as u8).is_some_and(plays) {
                        widest = widest.max(source.wheel_range);
                    }
                }
            }
        }
        let range = covering(widest);
        let synth = &mut self.synths[id.index()];
        let changed = synth.manager_range != range;
        synth.manager_range = range;
        changed
    }

    /// After RPN 0 from a keyboard: managers that have to reach further are told so.
    pub(super) fn widen_managers(&mut self, now: Time, hand: Hand) {
        for index in 0..self.parts.len() {
            let part = self.parts[index].plan;
            let id = part.to;
            if self.feeds(&part, hand)
                && self.synths[id.index()].rig.manager().is_some()
                && self.fit_manager_range(id)
                && self.synths[id.index()].up
            {
                self.say_manager(now, id);
            }
        }
    }

    /// What waits for silence: a changed rig, a repeated set-up, or going away.
    pub(super) fn when_silent(&mut self, now: Time) {
        for index in 0..self.plan.synths.len() {
            let synth = &mut self.synths[index];
            if !synth.waits_for_silence(self.stopping) || !synth.is_silent(now) {
                continue;
            }
            let id = synth.id;
            if self.stopping {
                self.leave(id);
            } else if synth.next_rig.is_some() {
                self.adopt(now, id);
            } else {
                self.set_up(now, id);
            }
        }
    }

    /// Takes on a changed rig.
    fn adopt(&mut self, now: Time, id: SynthId) {
        let synth = &mut self.synths[id.index()];
        let Some(rig) = synth.next_rig.take() else {
            return;
        };
        if let Some(manager) = synth.rig.manager()
            && rig.dialect != synth.rig.dialect
        {
            mpe::close_zone(synth, manager, &mut self.out);
        }
        synth.rig = rig;
        synth.channels = [Channel::NEW; CHANNELS];
        self.set_up(now, id);
    }

    /// Leaves a silent synth as its plan says.
    fn leave(&mut self, id: SynthId) {
        let synth = &mut self.synths[id.index()];
        synth.left = true;
        synth.piece_at = None;
        synth.again_at = None;
        if synth.rig.leave == Leave::AsIs {
            return;
        }
        let range = BendRange::TWO;
        if let Dialect::Mpe { manager } = synth.rig.dialect {
            mpe::close_zone(synth, manager, &mut self.out);
        }
        for channel in synth.rig.channels().iter() {
            let bytes = parameter::bend_range(channel, range.semitones());
            synth.send(Weight::Owed, &bytes, &mut self.out);
            synth.channel(channel).bend = None; // also where never bent: the last host may have left it anywhere
            synth.bend(channel, Bend::CENTRE, Weight::Owed, &mut self.out);
            if synth.rig.local_off {
                let on = [status::CONTROLLER | channel, controller::LOCAL, 127];
                synth.send(Weight::Owed, &on, &mut self.out);
            }
        }
    }
}

/// The bend range that covers an interval: whole semitones, rounded up.
fn covering(interval: Interval) -> BendRange {
    let semitone = Interval::SEMITONE.microcents();
    let semitones = (interval.microcents() + semitone - 1) / semitone;
    let within = semitones.clamp(1, crate::limits::BEND_RANGE_MAX as i64);
    BendRange::new(within as u8).expect("held within the limits")
}
