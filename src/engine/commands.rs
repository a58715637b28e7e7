//! What can be asked of a running engine, and what comes of it.

use super::Engine;
use super::channel::{Rest, UNSAID};
use super::mono::Below;
use super::next_key::Names;
use super::plan::SynthId;
use super::synth::PEDALS;
use super::traffic::{Command, Weight};
use crate::limits::PARTS_MAX;
use crate::midi::{controller, status};
use crate::pitch::Interval;
use crate::time::{Span, Time};

/// `next` and `back` are deaf to a second press within this time: footswitches bounce.
const STEP_DEAF_MS: u64 = 400;

impl Engine {
    /// Takes a command as it is given, and follows it at once.
    pub(super) fn command(&mut self, now: Time, command: Command) {
        if !self.is_deaf(now, command) {
            self.follow(now, command);
        }
    }

    /// Whether a command is a bounce of the last step, or was meant for another song.
    pub(super) fn is_deaf(&mut self, now: Time, command: Command) -> bool {
        if !matches!(
            command,
            Command::Next | Command::NextFrom(_) | Command::Back
        ) {
            return false;
        }
        if let Command::NextFrom(place) = command
            && !self.is_playing(place)
        {
            self.out.counters.ignored += 1;
            return true;
        }
        let deaf_until = self
            .stepped_at
            .map(|at| at + Span::from_millis(STEP_DEAF_MS));
        let deaf = deaf_until.is_some_and(|until| now < until);
        if !deaf {
            self.stepped_at = Some(now);
        }
        deaf
    }

    /// Whether the song of a place is the one now playing; it may stand in the set more than once.
    pub(super) fn is_playing(&self, place: u16) -> bool {
        let set = &self.plan.set;
        set.get(place as usize)
            .is_some_and(|song| song.title == set[self.song].title)
    }

    pub(super) fn follow(&mut self, now: Time, command: Command) {
        self.play_chord();
        if self.goal(command).is_some() {
            self.armed.forget_songs();
        }
        match command {
            Command::Song(place) => self.begin_song(now, place as usize),
            Command::NextFrom(place) if !self.is_playing(place) => self.out.counters.ignored += 1,
            Command::Next | Command::NextFrom(_) | Command::Back => match self.goal(command) {
                Some(place) => self.begin_song(now, place),
                None => self.out.counters.ignored += 1, // never wraps
            },
            Command::Pitch { .. }
            | Command::Transpose(_)
            | Command::Plain
            | Command::Inflect { .. }
            | Command::InflectHome
            | Command::Turn(_)
            | Command::BlackKey(_)
            | Command::Root(_)
            | Command::Sevenths(_)
            | Command::Tonic { .. }
            | Command::TonicAt(_) => self.latch_told(now, command),
            Command::TonicHome => {
                self.next_key = None;
                self.latch_told(now, command);
            }
            Command::TonicNextKey(by) => self.wait_for_key(Names::Tonic(by), None),
            Command::RootNextKey => self.wait_for_key(Names::Root, None),
            Command::Home => self.begin_again(now, self.song),
            Command::Fresh => {
                self.latched.nudge = Interval::ZERO;
                self.armed.clear();
                self.begin_again(now, 0);
            }
            Command::Ask(ask) => self.out.ask(ask),
            Command::Panic => self.panic(now),
            Command::Resend(Some(id)) if id.index() < self.plan.synths.len() => {
                self.synths[id.index()].song_due.again();
                self.set_up(now, id);
            }
            Command::Resend(Some(_)) => self.out.counters.ignored += 1,
            Command::Resend(None) => {
                for index in 0..self.plan.synths.len() {
                    let id = self.synths[index].id;
                    self.synths[index].song_due.again();
                    self.set_up(now, id);
                }
            }
            Command::End => self.end_all(now),
            Command::Stop => {
                self.end_all(now);
                self.stopping = true;
                self.when_silent(now);
            }
        }
    }

    fn begin_again(&mut self, now: Time, place: usize) {
        self.latched.plain = false;
        self.held.clear();
        self.begin_song(now, place);
    }

    /// The transposition in force, without a part's own.
    pub(super) fn transpose_keys(&self) -> i8 {
        self.transposed.unwrap_or(self.playing.transpose_keys)
    }

    /// Brings all that is held to where the nudge puts it.
    pub(super) fn move_all_held(&mut self, now: Time) {
        for index in 0..self.plan.synths.len() {
            for channel in self.synths[index].rig.members.iter() {
                self.move_held(now, self.synths[index].id, channel);
            }
        }
    }

    /// Brings what a key or pedal holds on a channel to where the nudge puts it.
    fn move_held(&mut self, now: Time, id: SynthId, number: u8) {
        let is_tuned = self.part_of(id, number).is_some_and(|(_, part)| part.tune);
        if is_tuned && self.is_held(now, id, number) {
            let channel = self.synths[id.index()].channel(number);
            let by = self.nudge - channel.nudge;
            channel.nudge = self.nudge;
            if by != Interval::ZERO {
                self.move_channel(id, number, by, Weight::Owed);
            }
        }
    }

    /// Whether a key or pedal holds a note that still follows its channel's bend.
    pub(super) fn is_held(&self, now: Time, id: SynthId, number: u8) -> bool {
        let synth = &self.synths[id.index()];
        let channel = &synth.channels[number as usize];
        let rest = channel.rest(now, synth.rig.tail, synth.rig.keeps_pitch());
        matches!(rest, Rest::Held | Rest::Pedal)
    }

    /// Note-offs for all that is open, then pedals up.
    fn end_all(&mut self, now: Time) {
        for keyboard in &mut self.keyboards {
            for source in &mut keyboard.sources {
                source.pedals = Default::default();
                source.keys = 0;
            }
        }
        while let Some(voice) = self.voices.take(|_| true) {
            self.end(now, &voice, 64, None);
        }
        for part in &mut self.parts {
            part.below = Below::NOTHING;
        }
        self.lift_all_pedals(now);
        self.damp_harmonies(now);
        (0..PARTS_MAX).for_each(|part| self.by_chord.damp(part));
    }

    fn lift_all_pedals(&mut self, now: Time) {
        for part in &mut self.parts {
            for pedal in PEDALS {
                if part.controllers[pedal as usize] != UNSAID {
                    part.set(pedal, 0);
                }
            }
        }
        for synth in &mut self.synths {
            for number in synth.rig.channels().iter() {
                synth.lift_pedals(number, &mut self.out);
                let channel = synth.channel(number);
                if channel.damper || channel.sostenuto {
                    channel.released_at = Some(now);
                }
                channel.damper = false;
                channel.sostenuto = false;
            }
        }
    }

    /// Every note-off itself, then pedals up, then All Notes Off and All Sound Off, on every channel in use, whatever
    /// it was told before; then the synths are set up again. No song state changes.
    fn panic(&mut self, now: Time) {
        self.end_all(now);
        for index in 0..self.plan.synths.len() {
            let synth = &mut self.synths[index];
            for channel in synth.rig.pedal_channels().iter() {
                for pedal in PEDALS {
                    synth.channel(channel).controllers[pedal as usize] = UNSAID;
                    synth.controller(channel, pedal, 0, Weight::Owed, &mut self.out);
                }
            }
            let tail = synth.rig.tail;
            for channel in synth.rig.channels().iter().chain(synth.rig.drums.iter()) {
                for number in [controller::ALL_NOTES_OFF, controller::ALL_SOUND_OFF] {
                    let bytes = [status::CONTROLLER | channel, number, 0];
                    synth.send(Weight::Owed, &bytes, &mut self.out);
                }
                let channel = synth.channel(channel);
                // All Sound Off leaves no tail.
                channel.released_at = channel.released_at.map(|_| now - tail);
            }
            let id = synth.id;
            self.set_up(now, id);
        }
    }
}
