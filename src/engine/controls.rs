//! The player's hands: wheel, pressure, pedals, controllers. They keep their meaning for their own part only.

use super::channel::UNSAID;
use super::dialect::on_members;
use super::plan::{PartPlan, SynthId};
use super::synth::PEDALS;
use super::traffic::Weight;
use super::{Engine, Hand};
use crate::midi::{controller, status};
use crate::pitch::Interval;
use crate::pitch::word::Bend;
use crate::time::Time;

impl Engine {
    pub(super) fn controller_in(&mut self, now: Time, hand: Hand, number: u8, value: u8) {
        let source = self.source(hand);
        match number {
            controller::ALL_SOUND_OFF | controller::ALL_NOTES_OFF..=127 => {
                for finger in self.fingers_of(hand).chain([hand]) {
                    self.source(finger).keys = 0;
                    self.release(now, 64, None, |v| v.down && finger.is_of(v));
                }
                self.come_back_everywhere(now);
            }
            controller::RESET_ALL => self.reset_all(now, hand),
            controller::LOCAL => {
                self.tell_gesture_channels(hand, |channel| {
                    [status::CONTROLLER | channel, number, value]
                });
            }
            controller::VELOCITY_LOW => source.velocity_low = Some(value),
            controller::PORTAMENTO_FROM => source.portamento_from = Some(value),
            controller::RPN_MSB => source.select_half(true, false, value),
            controller::RPN_LSB => source.select_half(true, true, value),
            controller::NRPN_MSB => source.select_half(false, false, value),
            controller::NRPN_LSB => source.select_half(false, true, value),
            controller::DATA_MSB => {
                source.data_msb = value;
                self.set_parameter(now, hand, value, 0);
            }
            controller::DATA_LSB => {
                let msb = source.data_msb;
                self.set_parameter(now, hand, msb, value);
            }
            controller::DATA_UP | controller::DATA_DOWN => self.step_parameter(hand, number, value),
            controller::BANK_MSB => source.bank[0] = value,
            controller::BANK_LSB => source.bank[1] = value,
            number => match PEDALS.iter().position(|pedal| *pedal == number) {
                Some(which) => {
                    source.pedals[which] = value;
                    self.for_parts(hand, |engine, index, part| {
                        if part.pass.pedals {
                            engine.set_pedal(now, index, which);
                        }
                    });
                }
                None => self.for_parts(hand, |engine, index, part| {
                    if part.pass.controllers {
                        engine.parts[index].set(number, value);
                        engine.spread(now, index, number, value, Weight::Control);
                    }
                }),
            },
        }
    }

    /// Gives a controller to the channels that sound; the others catch up before their next note, so that a busy
    /// controller on fifteen channels does not choke a slow wire.
    fn spread(&mut self, now: Time, index: usize, number: u8, value: u8, weight: Weight) {
        let part = self.parts[index].plan;
        let version = self.parts[index].version;
        let channels = self.gesture_channels(index);
        let synth = &mut self.synths[part.to.index()];
        let tail = synth.rig.tail;
        for channel in channels.iter() {
            let manager = synth.rig.manager() == Some(channel);
            if number == controller::BRIGHTNESS && synth.channel(channel).brightness != UNSAID {
                continue; // its finger's own goes first
            }
            if manager || synth.channels[channel as usize].rings(now, tail) {
                let told = synth.controller(channel, number, value, weight, &mut self.out);
                let channel = synth.channel(channel);
                if told && channel.version + 1 == version {
                    channel.version = version;
                }
            }
        }
    }

    /// A pedal of a part is as far down as the keyboard that holds it deepest.
    fn set_pedal(&mut self, now: Time, index: usize, which: usize) {
        let part = self.parts[index].plan;
        let number = PEDALS[which];
        let value = self.deepest(&part, which);
        let was_down = self.parts[index].pedal_down(number);
        if self.parts[index].controllers[number as usize] == value {
            return;
        }
        self.parts[index].set(number, value);
        let is_down = self.parts[index].pedal_down(number);
        let holds = matches!(number, controller::DAMPER | controller::SOSTENUTO);
        if !(holds && part.late_offs) {
            self.spread(now, index, number, value, Weight::Owed);
        }
        if !holds || was_down == is_down {
            return;
        }
        if number == controller::SOSTENUTO {
            for voice in self.voices.iter_mut().filter(|v| v.part.index() == index) {
                voice.latched = is_down && (voice.down || voice.latched);
            }
        }
        if is_down && number == controller::DAMPER && !part.late_offs {
            self.catch_tails(now, index);
        }
        if !is_down {
            self.pedal_up(now, index, number);
        }
    }

    pub(super) fn deepest(&self, part: &PartPlan, which: usize) -> u8 {
        let mut deepest = 0;
        if !part.pass.pedals {
            return deepest;
        }
        for (index, keyboard) in self.keyboards.iter().enumerate() {
            for (channel, source) in keyboard.sources.iter().enumerate() {
                if source.pedals[which] > deepest
                    && Hand::new(index, channel as u8).is_some_and(|hand| self.feeds(part, hand))
                {
                    deepest = source.pedals[which];
                }
            }
        }
        deepest
    }

    /// A damper that goes down while a note still rings may catch it (GM2 3.3.7), so it counts as held.
    fn catch_tails(&mut self, now: Time, index: usize) {
        let channels = self.channels_of(index);
        let synth = &mut self.synths[self.parts[index].plan.to.index()];
        let tail = synth.rig.tail;
        for number in channels.iter() {
            let channel = synth.channel(number);
            if channel.held == 0 && channel.rings(now, tail) {
                channel.damper = true;
            }
        }
    }

    fn pedal_up(&mut self, now: Time, index: usize, number: u8) {
        self.damp_harmonies(now);
        if !self.parts[index].pedal_down(controller::DAMPER)
            && !self.parts[index].pedal_down(controller::SOSTENUTO)
        {
            self.by_chord.damp(index);
        }
        let channels = self.channels_of(index);
        let synth = &mut self.synths[self.parts[index].plan.to.index()];
        for member in channels.iter() {
            let channel = synth.channel(member);
            let held = if number == controller::DAMPER {
                std::mem::take(&mut channel.damper)
            } else {
                std::mem::take(&mut channel.sostenuto)
            };
            if held && !channel.damper && !channel.sostenuto {
                channel.released_at = Some(now);
            }
        }
        self.release_waiting(now, index);
    }

    /// Ends the notes that only waited for a pedal of their part.
    pub(super) fn release_waiting(&mut self, now: Time, index: usize) {
        let damper = self.parts[index].damper_down();
        while let Some(voice) = self
            .voices
            .take(|v| v.part.index() == index && !v.drum && !v.down && !v.latched && !damper)
        {
            self.end(now, &voice, 64, None);
        }
    }

    pub(super) fn wheel_in(&mut self, now: Time, hand: Hand, bend: Bend) {
        self.source(hand).wheel = bend;
        self.wheel_moved(now, hand);
    }

    pub(super) fn wheel_moved(&mut self, now: Time, hand: Hand) {
        let wheel = self.source(hand).wheel_interval();
        self.for_parts(hand, |engine, index, part| {
            if part.pass.wheel && engine.parts[index].wheel != wheel {
                engine.parts[index].wheel = wheel;
                engine.play_wheel(now, index, Weight::Control);
            }
        });
    }

    /// Puts a part's wheel on the wire: on the manager, or on the channels that sound.
    pub(super) fn play_wheel(&mut self, now: Time, index: usize, weight: Weight) {
        let part = self.parts[index].plan;
        let wheel = self.parts[index].wheel;
        let channels = self.channels_of(index);
        let synth = &mut self.synths[part.to.index()];
        let tail = synth.rig.tail;
        if !on_members(&synth.rig, &part) {
            if let Some(manager) = synth.rig.manager() {
                let bend = Bend::encode(wheel, synth.manager_range).0;
                synth.bend(manager, bend, weight, &mut self.out);
            }
            return;
        }
        let id = part.to;
        for number in channels.iter() {
            if self.synths[id.index()].channels[number as usize].rings(now, tail) {
                self.bend_channel(id, number, weight);
            }
        }
    }

    /// Gives a channel the bend it should have: tuning, finger, and the wheel where it is played there. Tells whether
    /// it was sent.
    pub(super) fn bend_channel(&mut self, id: SynthId, number: u8, weight: Weight) -> bool {
        let owner = self
            .owner_of(id, number)
            .map(|owner| &self.parts[owner.index()]);
        let wheel = match owner {
            Some(part) if on_members(&self.synths[id.index()].rig, &part.plan) => part.wheel,
            _ => Interval::ZERO,
        };
        let synth = &mut self.synths[id.index()];
        let channel = &synth.channels[number as usize];
        let wanted = channel.offset + channel.finger + wheel;
        let (bend, clipped) = Bend::encode(wanted, synth.rig.bend_range);
        self.out.counters.clipped += clipped as u64;
        synth.bend(number, bend, weight, &mut self.out)
    }

    pub(super) fn pressure_in(&mut self, now: Time, hand: Hand, value: u8) {
        self.source(hand).pressure = value;
        self.for_parts(hand, |engine, index, part| {
            if part.pass.pressure {
                engine.parts[index].pressure = value;
                engine.play_pressure(now, index);
            }
        });
    }

    /// Takes a hand off everything it moved: pedals up, wheel to centre, pressure to nothing.
    pub(super) fn hand_off(&mut self, now: Time, hand: Hand) {
        if self.is_finger(hand) {
            self.rest_finger(hand);
            self.source(hand).brightness = UNSAID;
            return;
        }
        let source = self.source(hand);
        let (wheel, pressure) = (source.wheel, source.pressure);
        source.pedals = [0; PEDALS.len()];
        for (which, pedal) in PEDALS.iter().enumerate() {
            self.for_parts(hand, |engine, index, part| {
                let known = engine.parts[index].controllers[*pedal as usize] != UNSAID;
                if part.pass.pedals && known {
                    engine.set_pedal(now, index, which);
                }
            });
        }
        if wheel != Bend::CENTRE {
            self.wheel_in(now, hand, Bend::CENTRE);
        }
        if pressure > 0 {
            self.pressure_in(now, hand, 0);
        }
    }

    fn play_pressure(&mut self, now: Time, index: usize) {
        let part = self.parts[index].plan;
        let synth = &self.synths[part.to.index()];
        let tail = synth.rig.tail;
        if !on_members(&synth.rig, &part) {
            let value = self.parts[index].pressure;
            let synth = &mut self.synths[part.to.index()];
            if let Some(manager) = synth.rig.manager() {
                synth.pressure(manager, value, Weight::Control, &mut self.out);
            }
            return;
        }
        for number in self.channels_of(index).iter() {
            if self.synths[part.to.index()].channels[number as usize].rings(now, tail) {
                self.press_channel(part.to, number, Weight::Control);
            }
        }
    }

    /// Gives a channel the pressure it should have.
    pub(super) fn press_channel(&mut self, id: SynthId, number: u8, weight: Weight) {
        if let Some((part_id, part)) = self.part_of(id, number) {
            let value = self.pressure_for(&part, id, number, part_id);
            self.synths[id.index()].pressure(number, value, weight, &mut self.out);
        }
    }

    /// The newest value of every gesture that was left out while the wire was busy; what does not fit now waits again.
    pub(super) fn say_gestures_left_out(&mut self, now: Time, id: SynthId) {
        for index in 0..self.parts.len() {
            let part = self.parts[index].plan;
            if part.to != id {
                continue;
            }
            self.play_wheel(now, index, Weight::Control);
            self.play_pressure(now, index);
            for number in 0..128 {
                let value = self.parts[index].controllers[number as usize];
                let by_late_offs =
                    part.late_offs && matches!(number, controller::DAMPER | controller::SOSTENUTO);
                if value != UNSAID && !by_late_offs {
                    self.spread(now, index, number, value, Weight::Control);
                }
            }
        }
        self.say_fingers_left_out(id);
    }

    /// Pressure on one key: as it came, where the synth may hear it so; as channel pressure of the note's own channel
    /// under MPE, the highest where several share (MPE 1.1, 2.4).
    pub(super) fn poly_pressure_in(&mut self, hand: Hand, key: crate::tuning::Key, value: u8) {
        for index in 0..self.voices.len() {
            let Some(voice) = self.voices.iter_mut().nth(index) else {
                return;
            };
            if voice.drum || !voice.down || voice.key != key || !hand.is_of(voice) {
                continue;
            }
            let part = self.parts[voice.part.index()].plan;
            if !part.pass.pressure {
                continue;
            }
            voice.pressure = value;
            let voice = *voice;
            let synth = &mut self.synths[voice.synth.index()];
            if synth.rig.keeps_pitch() || voice.finger {
                self.press_channel(voice.synth, voice.channel, Weight::Control);
            } else {
                let bytes = [status::POLY_PRESSURE | voice.channel, voice.number, value];
                synth.send(Weight::Control, &bytes, &mut self.out);
            }
        }
    }
}
