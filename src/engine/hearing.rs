//! From bytes to gestures: who hears what, what is taken by a cue, what is passed on as it came.

use super::channel::UNSAID;
use super::cues::{Control, Heard};
use super::plan::KeyboardId;
use super::synth::{PEDALS, bend_message};
use super::traffic::Weight;
use super::{Engine, Hand};
use crate::limits::RESET_MS;
use crate::midi::{Message, Splitter, controller, is_reset, status};
use crate::time::{Span, Time};
use crate::tuning::Key;

impl Engine {
    pub(super) fn bytes_in(&mut self, now: Time, id: KeyboardId, bytes: &[u8]) {
        if self.plays_as(id).index() >= self.plan.keyboards.len() {
            self.out.counters.bad_bytes += bytes.len() as u64;
            return;
        }
        // The splitter lends out messages while the rest of the engine acts on them.
        let keyboard = &mut self.keyboards[id.index()];
        if keyboard.sensed_at.is_some() {
            keyboard.sensed_at = Some(now);
        }
        let mut splitter = std::mem::replace(&mut keyboard.splitter, Splitter::lent());
        for byte in bytes {
            if let Some(message) = splitter.push(*byte) {
                self.message_in(now, id, message);
            }
        }
        self.out.counters.bad_bytes += splitter.take_bad_bytes();
        self.out.counters.sysex_lost += splitter.take_sysex_lost();
        self.keyboards[id.index()].splitter = splitter;
    }

    fn message_in(&mut self, now: Time, id: KeyboardId, message: Message<'_>) {
        let channel = match message {
            Message::NoteOn { channel, .. }
            | Message::NoteOff { channel, .. }
            | Message::PolyPressure { channel, .. }
            | Message::Controller { channel, .. }
            | Message::Program { channel, .. }
            | Message::Pressure { channel, .. }
            | Message::PitchBend { channel, .. } => channel,
            Message::Sysex(bytes) => return self.sysex_in(now, id, bytes),
            Message::Common(bytes) => return self.common_in(now, id, bytes),
            Message::RealTime(0xFE) => {
                self.keyboards[id.index()].sensed_at = Some(now);
                return;
            }
            Message::RealTime(0xFF) => return self.let_go(now, id), // System Reset: obeyed, never echoed
            Message::RealTime(byte) => return self.pass_on(id, &[byte]),
        };
        let hand = Hand {
            keyboard: id,
            channel,
        };
        let keyboard = &self.plan.keyboards[self.plays_as(id).index()];
        let is_heard = keyboard.channels.has(channel);
        let waits = match message {
            Message::NoteOn { .. } => false,
            Message::NoteOff { key, .. } => self.is_waiting(hand, key),
            _ => true,
        };
        if waits {
            self.play_chord();
        }
        if let Message::NoteOff { key, velocity, .. } = message {
            self.source(hand).keys &= !(1 << key);
            self.note_silence(now);
            if self.named_by_key(hand, key) {
                return self.when_quiet(now);
            }
            if self.is_open(hand, key) {
                // Whatever a new plan says of this key or channel, a note that was started is ended.
                let key = Key::new(key).expect("MIDI keys are 0-127");
                self.key_up(now, hand, key, velocity);
                if is_heard {
                    self.cue(now, hand, Heard::KeyUp(key));
                }
                return self.when_quiet(now);
            }
        }
        if is_heard {
            self.gesture_in(now, hand, message);
        }
        if matches!(
            message,
            Message::NoteOff { .. } | Message::Controller { .. }
        ) {
            self.when_quiet(now);
        }
    }

    fn gesture_in(&mut self, now: Time, hand: Hand, message: Message<'_>) {
        let key = |key| Key::new(key).expect("MIDI keys are 0-127");
        if let Message::NoteOn { key: k, .. } = message
            && self.names_by_key(now, hand, key(k))
        {
            return;
        }
        if let Some(heard) = self.heard(hand, message) {
            let taken = self.takes(hand, heard);
            if !taken {
                self.keep_hand(hand, message);
            }
            self.cue(now, hand, heard);
            if taken {
                return;
            }
        }
        self.pass_drums(hand, message);
        if self.is_finger(hand) && self.finger_in(now, hand, message) {
            return;
        }
        match message {
            Message::NoteOn {
                key: k, velocity, ..
            } => {
                self.follow_line(now, hand, key(k));
                self.key_down(now, hand, key(k), velocity);
            }
            Message::NoteOff {
                key: k, velocity, ..
            } => self.key_up(now, hand, key(k), velocity),
            Message::PolyPressure { key: k, value, .. } => {
                self.poly_pressure_in(hand, key(k), value);
            }
            Message::Controller { number, value, .. } => {
                self.controller_in(now, hand, number, value);
            }
            Message::Program { number, .. } => self.program_in(now, hand, number),
            Message::Pressure { value, .. } => self.pressure_in(now, hand, value),
            Message::PitchBend { bend, .. } => self.wheel_in(now, hand, bend),
            Message::Sysex(_) | Message::Common(_) | Message::RealTime(_) => {}
        }
    }

    /// What a member of an MPE zone says otherwise than an ordinary channel; tells whether it was that.
    fn finger_in(&mut self, now: Time, hand: Hand, message: Message<'_>) -> bool {
        match message {
            Message::PitchBend { bend, .. } => self.finger_bend_in(hand, bend),
            Message::Pressure { value, .. } => self.finger_pressure_in(hand, value),
            Message::Controller { number, value, .. } => {
                self.finger_controller_in(now, hand, number, value);
            }
            Message::Program { .. } => {} // the manager's to say (MPE 1.1, 2.3)
            _ => return false,
        }
        true
    }

    fn is_open(&self, hand: Hand, key: u8) -> bool {
        self.voices
            .iter()
            .any(|v| v.down && v.key.number() == key && hand.is_of(v))
    }

    /// What a hand holds down, so that it is known when all is up.
    fn keep_hand(&mut self, hand: Hand, message: Message<'_>) {
        let is_finger = self.is_finger(hand);
        let source = self.source(hand);
        match message {
            Message::NoteOn { key, .. } => source.keys |= 1 << key,
            Message::Controller { .. } if is_finger => {} // pedals are the manager's
            Message::Controller { number, value, .. } => {
                if let Some(which) = PEDALS.iter().position(|pedal| *pedal == number) {
                    source.pedals[which] = value;
                }
            }
            _ => {}
        }
    }

    /// The gesture in a message, if it can be one.
    fn heard(&mut self, hand: Hand, message: Message<'_>) -> Option<Heard> {
        match message {
            Message::Program { number, .. } => {
                let latest = self.source(hand).latest;
                let bank = [controller::BANK_MSB, controller::BANK_LSB];
                let bank = bank.map(|half| latest[half as usize]);
                Some(Heard::Program {
                    number,
                    bank: bank.map(|half| if half == UNSAID { 0 } else { half }),
                })
            }
            Message::Controller { number, value, .. } => {
                let latest = &mut self.source(hand).latest[number as usize];
                Some(Heard::Moved {
                    control: Control::Controller(number),
                    from: std::mem::replace(latest, value),
                    to: value,
                })
            }
            Message::Pressure { value, .. } => {
                let latest = &mut self.source(hand).latest_pressure;
                Some(Heard::Moved {
                    control: Control::Pressure,
                    from: std::mem::replace(latest, value),
                    to: value,
                })
            }
            Message::NoteOn { key, .. } => Key::new(key).map(Heard::KeyDown),
            Message::NoteOff { key, .. } => Key::new(key).map(Heard::KeyUp),
            _ => None,
        }
    }

    /// Whatever is on a synth's drum channel goes through as it came. Notes go by their own way, so that they can be
    /// ended when a keyboard is lost.
    fn pass_drums(&mut self, hand: Hand, message: Message<'_>) {
        let channel = hand.channel;
        let (bytes, length) = match message {
            Message::PolyPressure { key, value, .. } => {
                ([status::POLY_PRESSURE | channel, key, value], 3)
            }
            Message::Controller { number, value, .. }
                if number != controller::VELOCITY_LOW && number < controller::ALL_SOUND_OFF =>
            {
                ([status::CONTROLLER | channel, number, value], 3)
            }
            Message::Program { number, .. } => ([status::PROGRAM | channel, number, 0], 2),
            Message::Pressure { value, .. } => ([status::PRESSURE | channel, value, 0], 2),
            Message::PitchBend { bend, .. } => (bend_message(channel, bend), 3),
            _ => return,
        };
        for id in self.drum_synths(hand).iter() {
            self.synths[id.index()].send(Weight::Through, &bytes[..length], &mut self.out);
        }
    }

    fn sysex_in(&mut self, now: Time, id: KeyboardId, bytes: &[u8]) {
        self.pass_on(id, bytes);
        if is_reset(bytes) {
            for synth in self.synths_of(id).iter() {
                self.synths[synth.index()].again_at = Some(now + Span::from_millis(RESET_MS));
            }
        }
    }

    /// A song select may be a cue; it comes on no channel, so any will do.
    fn common_in(&mut self, now: Time, id: KeyboardId, bytes: &[u8]) {
        let heard = match bytes {
            [status::SONG_SELECT, number] => Heard::SongSelect(*number),
            _ => return self.pass_on(id, bytes),
        };
        let hand = Hand {
            keyboard: id,
            channel: 0,
        };
        let taken = self.takes(hand, heard);
        self.cue(now, hand, heard);
        if !taken {
            self.pass_on(id, bytes);
        }
    }

    /// Not ours: to every synth that the keyboard plays, once.
    fn pass_on(&mut self, id: KeyboardId, bytes: &[u8]) {
        for synth in self.synths_of(id).iter() {
            self.synths[synth.index()].send(Weight::Through, bytes, &mut self.out);
        }
    }

    /// A keyboard has gone, or wants everything reset: what it held is let go.
    pub(super) fn let_go(&mut self, now: Time, id: KeyboardId) {
        let index = id.index();
        self.keyboards[index].splitter.reset();
        self.presses.forget(|hand| hand.keyboard == id);
        self.end_wait(|hand, _, _| hand.keyboard == id);
        self.let_go_of_hands(now, |hand| hand.keyboard == id);
        self.release_keyboard(now, id);
        for channel in 0..16 {
            let hand = Hand {
                keyboard: id,
                channel,
            };
            self.hand_off(now, hand);
        }
        let plan = self.plan.keyboards.get(self.plays_as(id).index());
        self.keyboards[index].let_go(plan);
        self.note_silence(now);
        self.when_quiet(now);
    }

    /// A device sits down to play as one of the plan's keyboards.
    pub(super) fn seat(&mut self, now: Time, id: KeyboardId, plays_as: KeyboardId) {
        self.let_go(now, id);
        self.keyboards[id.index()].plays_as = plays_as;
        self.keyboards[id.index()].let_go(self.plan.keyboards.get(plays_as.index()));
    }
}
