//! Expressive keyboards: each note on a channel of its own, with bend, pressure and brightness of its own.
//!
//! Such a channel is a *finger*. What it does is added to the tuning of its note alone; what the zone's manager does
//! goes to the whole part, as a wheel or a pedal does. Once the key is up its finger moves nothing (MPE 1.1, 2.2.6).

use super::channel::UNSAID;
use super::keyboard::Select;
use super::plan::{ChannelSet, PartPlan, SynthId};
use super::traffic::Weight;
use super::voices::Voices;
use super::{Engine, Hand};
use crate::limits::BEND_RANGE_MAX;
use crate::midi::controller;
use crate::pitch::Interval;
use crate::pitch::word::Bend;
use crate::time::Time;

/// What a finger does to its note.
#[derive(Clone, Copy)]
pub(super) struct Finger {
    /// `None`: the key came on an ordinary channel.
    pub hand: Option<Hand>,
    pub bend: Interval,
    pub pressure: u8,
    /// Controller 74.
    pub brightness: u8,
}

impl Finger {
    const NONE: Finger = Finger {
        hand: None,
        bend: Interval::ZERO,
        pressure: 0,
        brightness: UNSAID,
    };
}

/// The finger that moves a channel: that of the first note down there.
pub(super) fn leader(voices: &Voices, id: SynthId, number: u8) -> Option<Hand> {
    let mut down = voices.iter();
    let first = down.find(|v| v.synth == id && v.channel == number && v.down && !v.drum)?;
    first.hand_of_finger()
}

/// Channels that another finger moves; for a finger, also those that none does.
pub(super) fn led_otherwise(voices: &Voices, id: SynthId, hand: Option<Hand>) -> ChannelSet {
    let mut seen = ChannelSet::NONE;
    let mut others = match hand {
        Some(_) => ChannelSet::ALL,
        None => ChannelSet::NONE,
    };
    for voice in voices.iter().filter(|v| v.synth == id && v.down && !v.drum) {
        if !seen.has(voice.channel) {
            let channel = ChannelSet::NONE.with(voice.channel);
            seen.0 |= channel.0;
            others = others.without(channel);
            if voice.hand_of_finger() != hand {
                others.0 |= channel.0;
            }
        }
    }
    others
}

impl Engine {
    /// Whether a hand is a member of a zone, and so moves a note of its own.
    pub(super) fn is_finger(&self, hand: Hand) -> bool {
        let zones = self.keyboards[hand.keyboard.index()].zones;
        zones.manager_of(hand.channel).is_some()
    }

    pub(super) fn is_in_zone(&self, hand: Hand) -> bool {
        let zones = self.keyboards[hand.keyboard.index()].zones;
        zones.zone_of(hand.channel).is_some()
    }

    /// What a hand does to a note of a part that it strikes now.
    pub(super) fn finger(&self, hand: Hand, part: &PartPlan) -> Finger {
        if !self.is_finger(hand) {
            return Finger::NONE;
        }
        let source = &self.keyboards[hand.keyboard.index()].sources[hand.channel as usize];
        let mut finger = Finger {
            hand: Some(hand),
            ..Finger::NONE
        };
        if part.pass.wheel {
            finger.bend = source.wheel_interval();
        }
        if part.pass.pressure {
            finger.pressure = source.pressure;
        }
        if part.pass.controllers {
            finger.brightness = source.brightness;
        }
        finger
    }

    /// Does something for each channel that a finger moves.
    fn for_led(&mut self, hand: Hand, mut act: impl FnMut(&mut Engine, SynthId, u8, &PartPlan)) {
        for index in 0..self.plan.synths.len() {
            let id = self.synths[index].id;
            for number in self.synths[index].rig.members.iter() {
                if leader(&self.voices, id, number) == Some(hand)
                    && let Some((_, part)) = self.part_of(id, number)
                {
                    act(self, id, number, &part);
                }
            }
        }
    }

    pub(super) fn finger_bend_in(&mut self, hand: Hand, bend: Bend) {
        self.source(hand).wheel = bend;
        self.finger_moved(hand);
    }

    fn finger_moved(&mut self, hand: Hand) {
        let bend = self.source(hand).wheel_interval();
        self.for_led(hand, |engine, id, number, part| {
            if part.pass.wheel {
                engine.synths[id.index()].channel(number).finger = bend;
                engine.bend_channel(id, number, Weight::Control);
            }
        });
    }

    pub(super) fn finger_pressure_in(&mut self, hand: Hand, value: u8) {
        self.source(hand).pressure = value;
        for index in 0..self.voices.len() {
            let Some(voice) = self.voices.iter_mut().nth(index) else {
                return;
            };
            let part = self.parts[voice.part.index()].plan;
            if voice.finger && voice.down && hand.is_of(voice) && part.pass.pressure {
                voice.pressure = value;
                let voice = *voice;
                self.press_channel(voice.synth, voice.channel, Weight::Control);
            }
        }
    }

    fn finger_brightness_in(&mut self, hand: Hand, value: u8) {
        self.source(hand).brightness = value;
        self.for_led(hand, |engine, id, number, part| {
            if part.pass.controllers {
                let synth = &mut engine.synths[id.index()];
                synth.channel(number).brightness = value;
                let out = &mut engine.out;
                synth.controller(number, controller::BRIGHTNESS, value, Weight::Control, out);
            }
        });
    }

    /// Controllers of a member: brightness is its own, pedals and all else are the manager's to say (MPE 1.1, 2.3).
    pub(super) fn finger_controller_in(&mut self, now: Time, hand: Hand, number: u8, value: u8) {
        match number {
            controller::BRIGHTNESS => self.finger_brightness_in(hand, value),
            controller::RESET_ALL => self.rest_finger(hand),
            controller::ALL_SOUND_OFF
            | controller::ALL_NOTES_OFF..=127
            | controller::VELOCITY_LOW
            | controller::PORTAMENTO_FROM
            | controller::DATA_MSB
            | controller::DATA_LSB
            | controller::NRPN_LSB..=controller::RPN_MSB => {
                self.controller_in(now, hand, number, value);
            }
            _ => {}
        }
    }

    /// Bend and pressure of a finger go where a reset puts them.
    pub(super) fn rest_finger(&mut self, hand: Hand) {
        self.source(hand).select = Select::Nothing;
        self.finger_bend_in(hand, Bend::CENTRE);
        self.finger_pressure_in(hand, 0);
    }

    /// The members of a manager's zone.
    pub(super) fn fingers_of(&self, manager: Hand) -> impl Iterator<Item = Hand> + use<> {
        let zones = self.keyboards[manager.keyboard.index()].zones;
        (0..16)
            .filter(move |channel| zones.manager_of(*channel) == Some(manager.channel))
            .map(move |channel| Hand { channel, ..manager })
    }

    /// RPN 0 on a member holds for all of its zone (MPE 1.1, 2.2.5).
    pub(super) fn set_finger_range(&mut self, hand: Hand, range: Interval) {
        let zones = self.keyboards[hand.keyboard.index()].zones;
        let Some(channel) = zones.manager_of(hand.channel) else {
            return;
        };
        for finger in self.fingers_of(Hand { channel, ..hand }) {
            self.source(finger).wheel_range = range;
            self.finger_moved(finger);
        }
    }

    /// The MPE Configuration Message of a keyboard of which the plan says that it sends MPE. What is held on channels
    /// that come into a zone or leave one is let go (MPE 1.1, 2.2.3); ranges are what the plan says, until told.
    pub(super) fn set_zone(&mut self, now: Time, manager: Hand, members: u8) {
        let plays_as = self.plays_as(manager.keyboard).index();
        let plan = self.plan.keyboards.get(plays_as);
        let Some(plan) = plan.filter(|plan| plan.sends_mpe()) else {
            return;
        };
        let (wheel, finger) = (plan.wheel_semitones, plan.finger_semitones);
        let before = self.keyboards[manager.keyboard.index()].zones;
        let mut zones = before;
        zones.set(manager.channel, members);
        let changed = |channel: &u8| before.zone_of(*channel) != zones.zone_of(*channel);
        for channel in (0..16).filter(changed) {
            let hand = Hand { channel, ..manager };
            self.source(hand).keys = 0;
            self.release(now, 64, None, |v| v.down && hand.is_of(v));
            self.hand_off(now, hand);
        }
        self.keyboards[manager.keyboard.index()].zones = zones;
        for channel in 0..16 {
            let hand = Hand { channel, ..manager };
            if !changed(&channel) && zones.zone_of(channel) != Some(manager.channel) {
                continue;
            }
            let semitones = match zones.manager_of(channel) {
                Some(_) => finger,
                None => wheel,
            };
            self.source(hand).wheel_range =
                Interval::SEMITONE * i64::from(semitones.min(BEND_RANGE_MAX));
            if self.is_finger(hand) {
                self.finger_moved(hand);
            } else {
                self.widen_managers(now, hand);
                self.wheel_moved(now, hand);
            }
        }
    }

    /// What fingers did while the wire was busy.
    pub(super) fn say_fingers_left_out(&mut self, id: SynthId) {
        for number in self.synths[id.index()].rig.members.iter() {
            if leader(&self.voices, id, number).is_none() {
                continue;
            }
            self.bend_channel(id, number, Weight::Control);
            self.press_channel(id, number, Weight::Control);
            let synth = &mut self.synths[id.index()];
            let value = synth.channel(number).brightness;
            if value != UNSAID {
                let out = &mut self.out;
                synth.controller(number, controller::BRIGHTNESS, value, Weight::Control, out);
            }
        }
    }
}
