//! An independent receiver: turns sent bytes back into sounding pitch.
//!
//! Built from the published rules alone (the source stands beside each), with its own arithmetic in cents; it uses
//! nothing of trued. Deliberately absent: MIDI Tuning, portamento, hold 2, half pedals.

mod channel;
mod stream;
mod vectors;
mod zone;

use channel::{BEND, Channel, PRESSURE, PROGRAM};
use std::time::Duration;
pub use stream::Stream;

/// What kind of synth listens.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// Sixteen channels, each bending all that rings on it.
    Plain,
    /// Obeys MPE 1.1: zones, managers, released notes that keep their member bend.
    Mpe,
}

/// A note as it sounded.
#[derive(Clone, Debug)]
pub struct Note {
    /// 0-15.
    pub channel: u8,
    pub number: u8,
    pub velocity: u8,
    pub on: Duration,
    /// Its own note-off message.
    pub off: Option<Duration>,
    /// The key is up for the synth: the note-off, or a message that ends all notes.
    pub released: Option<Duration>,
    /// Neither key nor pedal holds it; what follows is its tail.
    pub end: Option<Duration>,
    /// Silenced at once, without a tail.
    pub cut: bool,
    /// The synth was switched off while it sounded.
    pub forgotten: bool,
    /// Cents (100 x MIDI key) from the onset on.
    pub pitch: Vec<(Duration, f64)>,
    /// A released MPE note keeps its member's bend (MPE 1.1, 2.2.6).
    frozen_cents: Option<f64>,
    latched: bool,
}

impl Note {
    /// Cents at the onset.
    pub fn onset_cents(&self) -> f64 {
        self.pitch[0].1
    }

    /// Cents now, or when it was last heard.
    pub fn cents(&self) -> f64 {
        self.pitch[self.pitch.len() - 1].1
    }
}

/// What was holding a note that a message moved.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Hold {
    /// A key or a pedal.
    Held,
    /// Nothing: its tail was ringing.
    Ringing,
}

/// A sounding note was bent.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Move {
    pub at: Duration,
    /// Place in [`Receiver::notes`].
    pub note: usize,
    pub cents: f64,
    pub hold: Hold,
}

/// A message with something wrong about it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Fault {
    pub at: Duration,
    pub message: Vec<u8>,
}

/// Hears one port.
#[derive(Debug)]
pub struct Receiver {
    kind: Kind,
    tail: Duration,
    range_at_power_on: u8,
    stream: Stream,
    channels: Vec<Channel>,
    /// Members of the lower and the upper zone; 0 is off.
    zones: [u8; 2],
    /// Notes that may still be heard.
    live: Vec<usize>,
    /// Notes whose own note-off is still to come.
    open: Vec<usize>,
    pub notes: Vec<Note>,
    pub moves: Vec<Move>,
    /// Note-offs without a note.
    pub orphans: Vec<Fault>,
    /// Bends, controllers, programs and pressures that said what the channel already had, outside a set-up. A set-up
    /// is recognised by its bend range (RPN 0) or zone (RPN 6): it and the first statement of each thing on that
    /// channel after it are free.
    pub repeats: Vec<Fault>,
    /// What MPE 1.1 (2.3 and appendix E) forbids on a member channel.
    pub prohibited: Vec<Fault>,
    /// Channel mode messages, 120-127.
    pub modes: Vec<Fault>,
    /// Everything without a channel, in order.
    pub system: Vec<Fault>,
    /// A key went down that was already down on that channel.
    pub doubled: Vec<Fault>,
    /// Zones set while a note was sounding.
    pub zones_while_sounding: u64,
    pub bends: u64,
    /// Bend ranges and zones told.
    pub setups: u64,
    pub messages: u64,
}

impl Receiver {
    /// `range_at_power_on`: MIDI 1.0 (p. 19) leaves it to the receiver, so a test had better make it a strange one.
    pub fn new(kind: Kind, tail: Duration, range_at_power_on: u8) -> Receiver {
        Receiver {
            kind,
            tail,
            range_at_power_on,
            stream: Stream::default(),
            channels: vec![Channel::new(range_at_power_on); 16],
            zones: [0, 0],
            live: Vec::new(),
            open: Vec::new(),
            notes: Vec::new(),
            moves: Vec::new(),
            orphans: Vec::new(),
            repeats: Vec::new(),
            prohibited: Vec::new(),
            modes: Vec::new(),
            system: Vec::new(),
            doubled: Vec::new(),
            zones_while_sounding: 0,
            bends: 0,
            setups: 0,
            messages: 0,
        }
    }

    /// Bytes as they come down the cable.
    pub fn hear(&mut self, at: Duration, bytes: &[u8]) {
        self.live.retain(|&n| {
            let note = &self.notes[n];
            !note.cut && note.end.is_none_or(|end| at < end + self.tail)
        });
        for message in self.stream.cut(bytes) {
            self.messages += 1;
            match message[0] {
                0xF0..=0xFF => self.system_message(at, message),
                _ => self.channel_message(at, &message),
            }
        }
    }

    /// Switched off and on again: sounding notes are gone, all settings are those of power-on.
    pub fn power_cycle(&mut self, at: Duration) {
        self.silence(at, |_| true);
        for index in self.open.drain(..) {
            self.notes[index].forgotten = true;
        }
        self.stream = Stream::default();
        self.power_on_state();
    }

    /// Notes whose note-off never came.
    pub fn stuck(&self) -> Vec<&Note> {
        self.open.iter().map(|&n| &self.notes[n]).collect()
    }

    /// Notes that a key or a pedal still holds.
    pub fn sounding(&self) -> Vec<&Note> {
        self.notes.iter().filter(|n| n.end.is_none()).collect()
    }

    pub fn stray_bytes(&self) -> u64 {
        self.stream.stray_bytes
    }

    /// 0-15.
    pub fn range_cents(&self, channel: u8) -> f64 {
        self.channels[channel as usize].range_cents
    }

    pub fn bend_cents(&self, channel: u8) -> f64 {
        self.channels[channel as usize].bend_cents()
    }

    /// The last value of a controller, if it was ever told or reset.
    pub fn controller(&self, channel: u8, number: u8) -> Option<u8> {
        self.channels[channel as usize].controllers[number as usize]
    }

    pub fn program(&self, channel: u8) -> Option<u8> {
        self.channels[channel as usize].program
    }

    pub fn pressure(&self, channel: u8) -> u8 {
        self.channels[channel as usize].pressure
    }

    /// Members of the lower and the upper zone.
    pub fn zones(&self) -> [u8; 2] {
        self.zones
    }

    /// The manager whose zone a member channel belongs to.
    fn manager_of(&self, channel: u8) -> Option<u8> {
        match channel {
            1..=15 if channel <= self.zones[0] => Some(0),
            0..=14 if channel >= 15 - self.zones[1] => Some(15),
            _ => None,
        }
    }

    /// The channel whose pedals and mode messages govern this one.
    fn governor(&self, channel: u8) -> u8 {
        self.manager_of(channel).unwrap_or(channel)
    }

    fn pitch_cents(&self, note: &Note) -> f64 {
        let channel = &self.channels[note.channel as usize];
        let member = note.frozen_cents.unwrap_or_else(|| channel.bend_cents());
        let manager = self
            .manager_of(note.channel)
            .map_or(0.0, |m| self.channels[m as usize].bend_cents());
        note.number as f64 * 100.0 + channel.fine_cents + channel.coarse_cents + member + manager
    }

    /// Something about these channels' pitch has changed.
    fn retune(&mut self, at: Duration, hit: impl Fn(u8) -> bool) {
        for index in self.live.clone() {
            let note = &self.notes[index];
            if !hit(note.channel) {
                continue;
            }
            let (from, to) = (note.cents(), self.pitch_cents(note));
            if (to - from).abs() < 1e-9 {
                continue;
            }
            let hold = match note.end {
                None => Hold::Held,
                Some(_) => Hold::Ringing,
            };
            self.moves.push(Move {
                at,
                note: index,
                cents: to - from,
                hold,
            });
            self.notes[index].pitch.push((at, to));
        }
    }

    fn system_message(&mut self, at: Duration, message: Vec<u8>) {
        // General MIDI on and off (GM1 p. 6, GM2 4.9) and System Reset (MIDI 1.0 p. 33) bring back power-on.
        let general =
            matches!(message[..], [0xF0, 0x7E, _, 0x09, sub, 0xF7] if (1..=3).contains(&sub));
        if general || message == [0xFF] {
            self.silence(at, |_| true);
            self.power_on_state();
        }
        self.system.push(Fault { at, message });
    }

    fn power_on_state(&mut self) {
        self.channels = vec![Channel::new(self.range_at_power_on); 16];
        self.zones = [0, 0];
    }

    fn channel_message(&mut self, at: Duration, message: &[u8]) {
        let channel = message[0] & 0x0F;
        self.check_member_rules(at, channel, message);
        match (message[0] & 0xF0, message[1]) {
            (0x90, number) if message[2] > 0 => self.note_on(at, channel, number, message),
            (0x80 | 0x90, number) => self.note_off(at, channel, number, message),
            (0xB0, number) => self.controller_message(at, channel, number, message),
            (0xC0, number) => {
                self.statement(at, channel, PROGRAM, number as u16, message);
                self.channels[channel as usize].program = Some(number);
            }
            (0xD0, value) => {
                self.statement(at, channel, PRESSURE, value as u16, message);
                self.channels[channel as usize].pressure = value;
            }
            (0xE0, low) => {
                let bend = low as u16 | (message[2] as u16) << 7;
                self.bends += 1;
                self.statement(at, channel, BEND, bend, message);
                self.channels[channel as usize].bend = bend;
                let governed: Vec<bool> = (0..16).map(|c| self.governor(c) == channel).collect();
                self.retune(at, |c| c == channel || governed[c as usize]);
            }
            _ => {}
        }
    }

    fn statement(&mut self, at: Duration, channel: u8, slot: usize, value: u16, message: &[u8]) {
        if self.channels[channel as usize].say(slot, value) {
            self.repeats.push(Fault {
                at,
                message: message.to_vec(),
            });
        }
    }

    fn note_on(&mut self, at: Duration, channel: u8, number: u8, message: &[u8]) {
        let down = |n: &&usize| {
            let note = &self.notes[**n];
            note.channel == channel && note.number == number && note.released.is_none()
        };
        if self.live.iter().any(|n| down(&n)) {
            self.doubled.push(Fault {
                at,
                message: message.to_vec(),
            });
        }
        let mut note = Note {
            channel,
            number,
            velocity: message[2],
            on: at,
            off: None,
            released: None,
            end: None,
            cut: false,
            forgotten: false,
            pitch: Vec::new(),
            frozen_cents: None,
            latched: false,
        };
        note.pitch.push((at, self.pitch_cents(&note)));
        self.live.push(self.notes.len());
        self.open.push(self.notes.len());
        self.notes.push(note);
    }

    fn note_off(&mut self, at: Duration, channel: u8, number: u8, message: &[u8]) {
        let open = self
            .open
            .iter()
            .position(|&n| self.notes[n].channel == channel && self.notes[n].number == number);
        match open {
            Some(place) => {
                let index = self.open.remove(place);
                self.notes[index].off = Some(at);
                self.release(at, index);
            }
            None => self.orphans.push(Fault {
                at,
                message: message.to_vec(),
            }),
        }
    }

    /// The key is up; a pedal may go on holding.
    fn release(&mut self, at: Duration, index: usize) {
        let channel = self.notes[index].channel;
        let member = self.manager_of(channel).is_some();
        let bend_cents = self.channels[channel as usize].bend_cents();
        let damper = self.channels[self.governor(channel) as usize].damper;
        let note = &mut self.notes[index];
        if note.released.is_none() {
            note.released = Some(at);
            note.frozen_cents = member.then_some(bend_cents);
            if !damper && !note.latched {
                note.end = Some(at);
            }
        }
    }

    fn controller_message(&mut self, at: Duration, channel: u8, number: u8, message: &[u8]) {
        let value = message[2];
        match number {
            6 | 38 | 98..=101 => return self.parameter_message(at, channel, number, value),
            120..=127 => return self.mode_message(at, channel, number, message),
            // Data up and down, and the prefixes of the next note (CA-031; MIDI 1.0 p. 16), are no lasting state.
            84 | 88 | 96 | 97 => {}
            _ => self.statement(at, channel, number as usize, value as u16, message),
        }
        self.channels[channel as usize].controllers[number as usize] = Some(value);
        match number {
            64 => self.channels[channel as usize].damper = value >= 64,
            66 => self.sostenuto(channel, value >= 64),
            _ => return,
        }
        self.let_go(at);
    }

    /// Latches the keys that are down as the pedal goes down; later ones are not caught (GM2 3.3.9).
    fn sostenuto(&mut self, channel: u8, down: bool) {
        let was_down = self.channels[channel as usize].sostenuto;
        self.channels[channel as usize].sostenuto = down;
        for index in self.live.clone() {
            if self.governor(self.notes[index].channel) == channel {
                let note = &mut self.notes[index];
                note.latched = down && (note.latched || (!was_down && note.released.is_none()));
            }
        }
    }

    /// Ends released notes that no pedal holds any more.
    fn let_go(&mut self, at: Duration) {
        for index in self.live.clone() {
            let damper = self.channels[self.governor(self.notes[index].channel) as usize].damper;
            let note = &mut self.notes[index];
            if note.released.is_some() && note.end.is_none() && !damper && !note.latched {
                note.end = Some(at);
            }
        }
    }

    fn mode_message(&mut self, at: Duration, channel: u8, number: u8, message: &[u8]) {
        self.modes.push(Fault {
            at,
            message: message.to_vec(),
        });
        // On a manager, 121 and 123 act on its zone (MPE 1.1, table 6); 120 is for the channel it stands on.
        let governed: Vec<bool> = (0..16)
            .map(|c| c == channel || self.governor(c) == channel)
            .collect();
        match number {
            120 => self.silence(at, |c| c == channel),
            121 => {
                for c in (0..16).filter(|c| governed[*c]) {
                    self.channels[c].reset_controllers();
                }
                for index in self.live.clone() {
                    if governed[self.notes[index].channel as usize] {
                        self.notes[index].latched = false;
                    }
                }
                self.let_go(at);
                self.retune(at, |c| governed[c as usize]);
            }
            // Into release, and held by a pedal as ever (MIDI 1.0 p. A-5); 124-127 do the same (p. 20).
            123..=127 => {
                for index in self.live.clone() {
                    if governed[self.notes[index].channel as usize] {
                        self.release(at, index);
                    }
                }
            }
            _ => {}
        }
    }

    fn silence(&mut self, at: Duration, hit: impl Fn(u8) -> bool) {
        for &index in &self.live {
            let note = &mut self.notes[index];
            if hit(note.channel) {
                note.released.get_or_insert(at);
                note.end.get_or_insert(at);
                note.cut = true;
            }
        }
        let notes = &self.notes;
        self.live.retain(|&n| !notes[n].cut);
    }
}
