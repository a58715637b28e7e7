//! The listening synth's ears: what a synth does with MIDI, in front of a player of samples that does not know it all.
//!
//! rustysynth has sixteen channels, no MPE and no sostenuto, and keeps channel 10 for drums. So every note here gets a
//! *seat*: a rustysynth channel to itself, in one of several rustysynths, never number 10. The bytes of a channel's bend
//! and bend range go to its notes' seats as they came. What a receiver adds:
//!
//! * A plain synth: a channel's bend moves all that sounds there, held, pedalled or dying away.
//! * An MPE zone, once told by RPN 6: a note follows its member channel until its note-off and no further, pedal or not;
//!   pedals, wheel and volume of the manager are for all members, those of a member for nobody. (MPE 1.1, 2.2 to 2.4)
//! * Damper and sostenuto hold note-offs back. One note-off ends one note, the oldest of its number.
//!
//! Deliberately absent: drums (it has none, so drum channels are silent), programs (one sound), pressure and vibrato.

use crate::engine::plan::ChannelSet;
use crate::midi::{Message, controller, status};
use crate::pitch::Interval;
use crate::pitch::word::{Bend, BendRange};
use rustysynth::{SoundFont, Synthesizer, SynthesizerSettings};
use std::sync::Arc;

/// Samples drawn at once: a message is heard within 0.17 ms of its time.
const BLOCK: usize = 8;
/// Channels of one rustysynth that are of use; see above.
const SEATS_EACH: usize = 15;
const SEATS_MAX: usize = 8 * SEATS_EACH;

/// A synth that hears.
pub struct Receiver {
    drums: ChannelSet,
    channels: [Channel; 16],
    seats: Vec<Seat>,
    font: Arc<SoundFont>,
    rate_hz: i32,
    banks: Vec<Synthesizer>,
    /// Samples drawn so far: tells which seat has been silent for longest.
    now: u64,
}

#[derive(Clone, Copy)]
struct Channel {
    bend: Bend,
    /// Data bytes of RPN 0: semitones, cents.
    range: [u8; 2],
    /// Most significant byte first; `[127, 127]` is none.
    parameter: [u8; 2],
    volume: u8,
    pan: u8,
    expression: u8,
    damper: bool,
    sostenuto: bool,
    /// The manager of its zone, if it is a member of one.
    manager: Option<u8>,
}

#[derive(Clone, Copy)]
struct Seat {
    channel: u8,
    key: u8,
    state: State,
    /// Was held when the sostenuto pedal went down.
    caught: bool,
    /// `now` when its state last changed.
    since: u64,
}

#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum State {
    Dying,
    Pedalled,
    Held,
}

impl Channel {
    const FRESH: Channel = Channel {
        bend: Bend::CENTRE,
        range: [2, 0],
        parameter: [127, 127],
        volume: 100,
        pan: 64,
        expression: 127,
        damper: false,
        sostenuto: false,
        manager: None,
    };
}

impl Receiver {
    /// # Errors
    /// If the font is none.
    pub fn new(font: &[u8], rate_hz: u32, drums: ChannelSet) -> Result<Receiver, String> {
        let font = SoundFont::new(&mut &font[..]).map_err(|error| error.to_string())?;
        Ok(Receiver {
            drums,
            channels: [Channel::FRESH; 16],
            seats: Vec::new(),
            font: Arc::new(font),
            rate_hz: rate_hz as i32,
            banks: Vec::new(),
            now: 0,
        })
    }

    /// Adds what sounds now to both sides.
    pub fn render(&mut self, left: &mut [f32], right: &mut [f32]) {
        self.now += left.len() as u64;
        let (mut l, mut r) = (vec![0.0; left.len()], vec![0.0; right.len()]);
        for bank in &mut self.banks {
            bank.render(&mut l, &mut r);
            left.iter_mut().zip(&l).for_each(|(sum, more)| *sum += more);
            right
                .iter_mut()
                .zip(&r)
                .for_each(|(sum, more)| *sum += more);
        }
    }

    /// Takes one whole message.
    pub fn take(&mut self, message: Message<'_>) {
        match message {
            Message::NoteOn {
                channel,
                key,
                velocity,
            } if !self.drums.has(channel) => self.start(channel, key, velocity),
            Message::NoteOff { channel, key, .. } => self.key_up(channel, key),
            Message::PitchBend { channel, bend } => {
                self.channels[channel as usize].bend = bend;
                self.tell_bend(channel);
            }
            Message::Controller {
                channel,
                number,
                value,
            } => self.control(channel, number, value),
            _ => {}
        }
    }

    fn start(&mut self, channel: u8, key: u8, velocity: u8) {
        let seat = self.free_seat();
        self.seats[seat] = Seat {
            channel,
            key,
            state: State::Held,
            caught: false,
            since: self.now,
        };
        self.control_seat(seat, controller::ALL_SOUND_OFF, 0);
        self.tell_levels(seat);
        self.tell_pitch(seat);
        self.send(seat, status::NOTE_ON, key, velocity);
    }

    /// A seat that has gone silent, else a new one, else the one that matters least.
    fn free_seat(&mut self) -> usize {
        let silent_s = 0.5; // a note has then died away, see `font`
        let silent = (silent_s * self.rate_hz as f64) as u64;
        let seats = self.seats.iter().enumerate();
        let least = seats.min_by_key(|(_, seat)| (seat.state, seat.since));
        match least {
            Some((at, seat)) if seat.state == State::Dying && seat.since + silent < self.now => at,
            Some((at, _)) if self.seats.len() == SEATS_MAX => at,
            _ => self.new_seat(),
        }
    }

    fn new_seat(&mut self) -> usize {
        self.seats.push(Seat {
            channel: 0,
            key: 0,
            state: State::Dying,
            caught: false,
            since: 0,
        });
        if self.seats.len() > self.banks.len() * SEATS_EACH {
            let mut settings = SynthesizerSettings::new(self.rate_hz);
            settings.block_size = BLOCK;
            settings.enable_reverb_and_chorus = false;
            let bank = Synthesizer::new(&self.font, &settings)
                .expect("rate and block size are within rustysynth's limits");
            self.banks.push(bank);
        }
        self.seats.len() - 1
    }

    fn key_up(&mut self, channel: u8, key: u8) {
        let seats = self.seats.iter().enumerate();
        let oldest = seats
            .filter(|(_, s)| s.state == State::Held && s.channel == channel && s.key == key)
            .min_by_key(|(_, s)| s.since);
        if let Some((at, _)) = oldest {
            self.seats[at].state = State::Pedalled;
            self.seats[at].since = self.now;
            self.let_go(at);
        }
    }

    /// Lets a note whose key is up die away, unless a pedal holds it.
    fn let_go(&mut self, at: usize) {
        let seat = self.seats[at];
        let pedals = self.channels[self.leader(seat.channel) as usize];
        let held = pedals.damper || pedals.sostenuto && seat.caught;
        if seat.state == State::Pedalled && !held {
            self.seats[at].state = State::Dying;
            self.seats[at].since = self.now;
            self.send(at, status::NOTE_OFF, seat.key, 64);
        }
    }

    fn control(&mut self, channel: u8, number: u8, value: u8) {
        let state = &mut self.channels[channel as usize];
        match number {
            controller::RPN_MSB => state.parameter[0] = value,
            controller::RPN_LSB => state.parameter[1] = value,
            controller::NRPN_MSB | controller::NRPN_LSB => state.parameter = [127, 127],
            controller::DATA_MSB => self.data(channel, 0, value),
            controller::DATA_LSB => self.data(channel, 1, value),
            controller::DAMPER => {
                state.damper = value >= 64;
                self.pedal_moved(channel);
            }
            controller::SOSTENUTO => {
                let (was, is) = (state.sostenuto, value >= 64);
                state.sostenuto = is;
                if was != is {
                    for at in self.seats_of(channel) {
                        self.seats[at].caught = is && self.seats[at].state == State::Held;
                    }
                }
                self.pedal_moved(channel);
            }
            VOLUME => state.volume = value,
            PAN => state.pan = value,
            EXPRESSION => state.expression = value,
            controller::RESET_ALL => self.reset(channel),
            controller::ALL_SOUND_OFF => {
                for at in self.seats_of(channel) {
                    self.seats[at].state = State::Dying;
                    self.control_seat(at, controller::ALL_SOUND_OFF, 0);
                }
            }
            // 123, and 124-127 which end all notes too (MIDI 1.0, p. 20).
            controller::ALL_NOTES_OFF..=127 => {
                for at in self.seats_of(channel) {
                    if self.seats[at].state == State::Held {
                        self.seats[at].state = State::Pedalled;
                    }
                    self.let_go(at);
                }
            }
            _ => {}
        }
        if matches!(number, VOLUME | PAN | EXPRESSION) {
            for at in self.seats_of(channel) {
                self.tell_levels(at);
            }
        }
    }

    /// Data entry for bend range and MPE configuration; other parameters mean nothing here.
    fn data(&mut self, channel: u8, place: usize, value: u8) {
        match self.channels[channel as usize].parameter {
            [0, 0] => {
                self.channels[channel as usize].range[place] = value;
                self.tell_bend(channel);
            }
            [0, 6] if place == 0 && (channel == 0 || channel == 15) => {
                self.configure_zone(channel, value);
            }
            _ => {}
        }
    }

    /// MPE 1.1, 2.2.1 and 2.2.5: members next to the manager, manager range 2, member range 48.
    fn configure_zone(&mut self, manager: u8, count: u8) {
        let members: Vec<usize> = match manager {
            0 => (1..=count.min(15) as usize).collect(),
            _ => (15 - count.min(15) as usize..15).collect(),
        };
        for (number, channel) in self.channels.iter_mut().enumerate() {
            if members.contains(&number) {
                channel.manager = Some(manager);
                channel.range = [48, 0];
            } else if channel.manager == Some(manager) {
                channel.manager = None;
            }
        }
        self.channels[manager as usize].manager = None;
        self.channels[manager as usize].range = [2, 0];
    }

    /// RP-015: bend, expression and pedals go home, parameter numbers are forgotten.
    fn reset(&mut self, channel: u8) {
        let state = &mut self.channels[channel as usize];
        *state = Channel {
            range: state.range,
            volume: state.volume,
            pan: state.pan,
            manager: state.manager,
            ..Channel::FRESH
        };
        self.tell_bend(channel);
        self.pedal_moved(channel);
        for at in self.seats_of(channel) {
            self.tell_levels(at);
        }
    }

    fn pedal_moved(&mut self, channel: u8) {
        for at in self.seats_of(channel) {
            self.let_go(at);
        }
    }

    /// Whose pedals and levels a channel obeys.
    fn leader(&self, channel: u8) -> u8 {
        self.channels[channel as usize].manager.unwrap_or(channel)
    }

    /// Seats that obey the pedals and levels of this channel.
    fn seats_of(&self, channel: u8) -> Vec<usize> {
        (0..self.seats.len())
            .filter(|at| self.leader(self.seats[*at].channel) == channel)
            .collect()
    }

    fn tell_bend(&mut self, channel: u8) {
        for at in 0..self.seats.len() {
            let seat = self.seats[at];
            let own = seat.channel == channel;
            let state = self.channels[seat.channel as usize];
            match state.manager {
                None if own => self.tell_pitch(at),
                Some(_) if own && seat.state == State::Held => self.tell_pitch(at),
                Some(manager) if manager == channel => self.tell_wheel(at, manager),
                _ => {}
            }
        }
    }

    /// The channel's bend and range as they came, and the manager's wheel on top.
    fn tell_pitch(&mut self, at: usize) {
        let state = self.channels[self.seats[at].channel as usize];
        self.parameter(at, 0, state.range);
        let value = state.bend.value();
        self.send(at, status::BEND, value as u8 & 0x7F, (value >> 7) as u8);
        if let Some(manager) = state.manager {
            self.tell_wheel(at, manager);
        }
    }

    /// The manager's wheel becomes coarse and fine tuning of the seat (RPN 2 and 1), right to 0.006 cent.
    fn tell_wheel(&mut self, at: usize, manager: u8) {
        let state = self.channels[manager as usize];
        let range = BendRange::new(state.range[0]).unwrap_or(BendRange::TWO);
        let by = state.bend.decode(range).microcents();
        let semitone = Interval::SEMITONE.microcents();
        let whole = (by + semitone / 2).div_euclid(semitone);
        let fine = ((by - whole * semitone) * 8192 + semitone / 2).div_euclid(semitone) + 8192;
        self.parameter(at, 2, [(64 + whole) as u8, 0]);
        self.parameter(at, 1, [(fine >> 7) as u8, fine as u8 & 0x7F]);
    }

    fn tell_levels(&mut self, at: usize) {
        let state = self.channels[self.leader(self.seats[at].channel) as usize];
        self.control_seat(at, VOLUME, state.volume);
        self.control_seat(at, PAN, state.pan);
        self.control_seat(at, EXPRESSION, state.expression);
    }

    fn parameter(&mut self, at: usize, number: u8, data: [u8; 2]) {
        self.control_seat(at, controller::RPN_MSB, 0);
        self.control_seat(at, controller::RPN_LSB, number);
        self.control_seat(at, controller::DATA_MSB, data[0]);
        self.control_seat(at, controller::DATA_LSB, data[1]);
    }

    fn control_seat(&mut self, at: usize, number: u8, value: u8) {
        self.send(at, status::CONTROLLER, number, value);
    }

    fn send(&mut self, at: usize, status: u8, first: u8, second: u8) {
        let place = at % SEATS_EACH;
        let channel = place + (place >= Synthesizer::PERCUSSION_CHANNEL) as usize;
        self.banks[at / SEATS_EACH].process_midi_message(
            channel as i32,
            status as i32,
            first as i32,
            second as i32,
        );
    }
}

const VOLUME: u8 = 7;
const PAN: u8 = 10;
const EXPRESSION: u8 = 11;
