//! Programs and parameters: what a player sets once, and what the engine answers to instead of passing on.

use super::channel::{Program, RESET_VALUES, UNSAID};
use super::keyboard::Select;
use super::outbox::{Bundle, Outbox};
use super::plan::{ChannelSet, PartPlan};
use super::synth::{PEDALS, Synth, bend_message};
use super::traffic::Weight;
use super::{Engine, Hand};
use crate::limits::{BEND_RANGE_MAX, SYNTHS_MAX};
use crate::midi::{controller, parameter, status};
use crate::pitch::Interval;
use crate::pitch::word::Bend;
use crate::time::Time;

/// Registered parameters that are trued's own business on a synth: bend range, tuning program and bank, MPE zone.
const OURS: [[u8; 2]; 4] = [[0, 0], [0, 3], [0, 4], [0, 6]];
/// The parameter that data entry cannot change (GM2 3.4.5).
const NULL: [u8; 2] = [0x7F; 2];

impl Engine {
    pub(super) fn program_in(&mut self, now: Time, hand: Hand, number: u8) {
        let [bank_msb, bank_lsb] = self.source(hand).bank;
        let program = Program {
            bank_msb,
            bank_lsb,
            program: number,
        };
        self.for_parts(hand, |engine, index, part| {
            if part.pass.programs && index < engine.playing_parts {
                engine.set_program(now, index, program);
            }
        });
    }

    /// Gives a program to a part. Some synths reset their bend range with it, so that is said again.
    pub(super) fn set_program(&mut self, now: Time, index: usize, program: Program) {
        self.parts[index].program = program;
        let part = self.parts[index].plan;
        let channels = self.gesture_channels(index);
        let synth = &mut self.synths[part.to.index()];
        let mut told = ChannelSet::NONE;
        for channel in channels.iter() {
            if synth.program(channel, program, &mut self.out) {
                told = told.with(channel);
            }
        }
        if synth.rig.manager().is_some() && told.count() > 0 {
            told = synth.rig.channels();
        }
        for channel in told.iter() {
            synth.range_due(channel, now);
        }
        for channel in told.iter() {
            let synth = &self.synths[part.to.index()];
            let member = synth.rig.manager() != Some(channel);
            if member && synth.channels[channel as usize].rings(now, synth.rig.tail) {
                self.say_channel(now, part.to, channel); // what sounds cannot wait its turn
            }
        }
        self.say_pieces(now, part.to);
    }

    /// Data entry. RPN 0 says what the wheel means and goes no further; what is trued's own is not passed on.
    pub(super) fn set_parameter(&mut self, now: Time, hand: Hand, msb: u8, lsb: u8) {
        let select = self.source(hand).select;
        let sequence: fn(u8, [u8; 2], [u8; 2]) -> [u8; parameter::PARAMETER_BYTES] = match select {
            Select::Registered([0, 0]) => {
                let range =
                    Interval::from_cents(msb.min(BEND_RANGE_MAX) as i64 * 100 + lsb.min(99) as i64);
                if self.is_finger(hand) {
                    return self.set_finger_range(hand, range);
                }
                self.source(hand).wheel_range = range;
                self.widen_managers(now, hand);
                self.wheel_moved(now, hand);
                return;
            }
            Select::Registered([0, 6]) => return self.set_zone(now, hand, msb),
            _ if self.is_finger(hand) => return, // the manager's to say
            Select::Registered(number) if OURS.contains(&number) || number == NULL => {
                return;
            }
            Select::Nothing => return,
            Select::Registered(_) => parameter::registered,
            Select::NonRegistered(_) => parameter::non_registered,
        };
        let (Select::Registered(number) | Select::NonRegistered(number)) = select else {
            return;
        };
        self.tell_gesture_channels(hand, |channel| sequence(channel, number, [msb, lsb]));
    }

    /// Data increment and decrement, passed on with the selection they belong to.
    pub(super) fn step_parameter(&mut self, hand: Hand, step: u8, value: u8) {
        let (number, select) = match self.source(hand).select {
            Select::Registered(number) if !OURS.contains(&number) && number != NULL => {
                (number, [controller::RPN_MSB, controller::RPN_LSB])
            }
            Select::NonRegistered(number) => (number, [controller::NRPN_MSB, controller::NRPN_LSB]),
            _ => return,
        };
        self.tell_gesture_channels(hand, |channel| {
            let s = status::CONTROLLER | channel;
            let null = [controller::RPN_MSB, controller::RPN_LSB];
            #[rustfmt::skip]
            let bytes = [
                s, select[0], number[0], s, select[1], number[1], s, step, value,
                s, null[0], 0x7F, s, null[1], 0x7F,
            ];
            bytes
        });
    }

    /// Every channel that hears the controllers of the parts that a hand plays, by synth.
    fn gesture_channels_of(&self, hand: Hand) -> [ChannelSet; SYNTHS_MAX] {
        let mut channels = [ChannelSet::NONE; SYNTHS_MAX];
        for (index, part) in self.parts.iter().enumerate() {
            if part.plan.pass.controllers && self.feeds(&part.plan, hand) {
                channels[part.plan.to.index()].0 |= self.gesture_channels(index).0;
            }
        }
        channels
    }

    /// Sends bytes to each of those channels, once.
    pub(super) fn tell_gesture_channels<const N: usize>(
        &mut self,
        hand: Hand,
        bytes: impl Fn(u8) -> [u8; N],
    ) {
        let channels = self.gesture_channels_of(hand);
        for (synth, channels) in self.synths.iter_mut().zip(channels) {
            for channel in channels.iter() {
                synth.send(Weight::Owed, &bytes(channel), &mut self.out);
            }
        }
    }

    /// Reset All Controllers: passed on, and since a receiver centres its bend then, the tuning is said again.
    pub(super) fn reset_all(&mut self, now: Time, hand: Hand) {
        let source = self.source(hand);
        source.wheel = Bend::CENTRE;
        source.pressure = 0;
        source.pedals = [0; PEDALS.len()];
        source.select = Select::Nothing;
        for finger in self.fingers_of(hand) {
            self.rest_finger(finger);
        }
        self.for_parts(hand, |engine, index, part| {
            if part.pass.controllers {
                engine.reset_part(index, part);
            }
        });
        let channels = self.gesture_channels_of(hand);
        for (synth, channels) in self.synths.iter_mut().zip(channels) {
            for channel in channels.iter() {
                pass_reset(now, synth, channel, &mut self.out);
            }
        }
        for (index, channels) in channels.into_iter().enumerate() {
            if channels != ChannelSet::NONE {
                self.say_again_what_sounds(now, index, channels);
            }
        }
        for index in 0..self.parts.len() {
            self.release_waiting(now, index);
        }
    }

    /// What the player of a part has set goes where a reset puts it; a pedal that another hand holds stays down.
    fn reset_part(&mut self, index: usize, part: &PartPlan) {
        let settings = &mut self.parts[index];
        settings.wheel = Interval::ZERO;
        settings.pressure = 0;
        for (number, value) in RESET_VALUES {
            if settings.controllers[number as usize] != UNSAID {
                settings.controllers[number as usize] = value;
            }
        }
        settings.version += 1;
        for (which, pedal) in PEDALS.into_iter().enumerate() {
            if self.parts[index].controllers[pedal as usize] != UNSAID {
                self.parts[index].controllers[pedal as usize] = self.deepest(part, which);
            }
        }
        let sostenuto = self.parts[index].pedal_down(controller::SOSTENUTO);
        for voice in self.voices.iter_mut().filter(|v| v.part.index() == index) {
            voice.latched &= part.late_offs && sostenuto;
        }
    }

    /// After a reset of some channels: bends and controllers that must stand all the same.
    fn say_again_what_sounds(&mut self, now: Time, index: usize, reset: ChannelSet) {
        let synth = &self.synths[index];
        let (id, tail, members) = (synth.id, synth.rig.tail, synth.rig.members);
        let by_manager = synth.rig.manager().is_some();
        for number in members.iter() {
            if !by_manager && !reset.has(number) {
                continue;
            }
            if self.synths[index].channels[number as usize].rings(now, tail) {
                self.say_bend(id, number);
                self.catch_up(id, number);
            }
        }
        for part in 0..self.parts.len() {
            if by_manager && self.parts[part].plan.to == id {
                self.play_wheel(now, part, Weight::Owed);
                self.say_gestures(id, reset.iter().next().unwrap_or(0), part);
            }
        }
    }
}

/// Passes Reset All Controllers to a channel, and in the same breath the bend that a note sounding there must keep.
fn pass_reset(now: Time, synth: &mut Synth, number: u8, out: &mut Outbox) {
    let (range, tail) = (synth.rig.bend_range, synth.rig.tail);
    let manager = synth.rig.manager() == Some(number);
    let channel = synth.channel(number);
    channel.reset_controllers();
    let mut bundle = Bundle::new();
    bundle.add(&[status::CONTROLLER | number, controller::RESET_ALL, 0]);
    let bend = Bend::encode(channel.offset + channel.finger, range).0;
    if !manager && channel.rings(now, tail) && bend != Bend::CENTRE {
        channel.bend = Some(bend);
        bundle.add(&bend_message(number, bend));
    }
    synth.send(Weight::Owed, bundle.bytes(), out);
    let lifted = if manager {
        synth.rig.members
    } else {
        ChannelSet::NONE.with(number)
    };
    for member in lifted.iter() {
        let channel = synth.channel(member);
        if channel.damper || channel.sostenuto {
            channel.released_at = Some(now);
        }
        channel.damper = false;
        channel.sostenuto = false;
        if manager {
            channel.bend = None; // whether members follow a reset of their manager, receivers disagree
            channel.pressure = 0;
        }
    }
}
