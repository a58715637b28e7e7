//! One synth: how it is to be spoken to, and what each of its channels does and knows.

use super::channel::{Channel, Due, Program, UNSAID};
use super::outbox::Outbox;
use super::plan::{ChannelSet, Dialect, Leave, Steal, SynthId, SynthPlan};
use super::traffic::Weight;
use super::wire::Wire;
use crate::limits::CHANNELS;
use crate::midi::{controller, status};
use crate::pitch::word::{Bend, BendRange};
use crate::time::{Span, Time};

/// The part of a synth's plan that its channels depend on. Changes only while the synth is silent, since a new bend
/// range would re-pitch what rings.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Rig {
    pub dialect: Dialect,
    pub members: ChannelSet,
    pub bend_range: BendRange,
    pub tail: Span,
    pub drums: ChannelSet,
    pub local_off: bool,
    pub share: bool,
    pub steal: Steal,
    pub leave: Leave,
    pub pace: Span,
    pub bytes_per_s: Option<u32>,
}

impl Rig {
    pub fn of(plan: &SynthPlan) -> Rig {
        Rig {
            dialect: plan.dialect,
            members: plan.members,
            bend_range: plan.bend_range,
            tail: plan.tail,
            drums: plan.drums,
            local_off: plan.local_off,
            share: plan.share,
            steal: plan.steal,
            leave: plan.leave,
            pace: plan.pace,
            bytes_per_s: plan.bytes_per_s,
        }
    }

    pub fn manager(&self) -> Option<u8> {
        match self.dialect {
            Dialect::Mpe { manager } => Some(manager),
            Dialect::ChannelBend => None,
        }
    }

    /// Whether a released note keeps its pitch whatever its channel's bend does (MPE 1.1, 2.2.6).
    pub fn keeps_pitch(&self) -> bool {
        self.manager().is_some()
    }

    /// Members and manager.
    pub fn channels(&self) -> ChannelSet {
        self.manager()
            .map_or(self.members, |manager| self.members.with(manager))
    }

    /// Channels on which pedals are played: the manager's under MPE (MPE 1.1, 2.3), and drums.
    pub fn pedal_channels(&self) -> ChannelSet {
        let tuned = self
            .manager()
            .map_or(self.members, |manager| ChannelSet::NONE.with(manager));
        ChannelSet(tuned.0 | self.drums.0)
    }
}

pub(super) struct Synth {
    pub id: SynthId,
    pub rig: Rig,
    /// To be taken on once silent.
    pub next_rig: Option<Rig>,
    pub up: bool,
    pub tight: bool,
    /// Left as the plan says, after `Command::Stop`.
    pub left: bool,
    pub channels: [Channel; CHANNELS],
    /// The MPE manager's own bend range: as far as the widest wheel that feeds it.
    pub manager_range: BendRange,
    /// The zone is to be declared before anything else.
    pub zone_due: bool,
    /// Everything is to be said again once nothing sounds.
    pub repeat_when_silent: bool,
    /// When the next piece of a set-up is due.
    pub piece_at: Option<Time>,
    pub wire: Wire,
    /// When set-up is to be said once more.
    pub again_at: Option<Time>,
    /// What of the song's own messages it has yet to be sent.
    pub song_due: SongDue,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum SongDue {
    Nothing,
    /// It may have forgotten system exclusive messages. The rest is said as it stands now, with every set-up.
    Exclusive,
    All,
}

impl SongDue {
    pub fn again(&mut self) {
        if *self == SongDue::Nothing {
            *self = SongDue::Exclusive;
        }
    }
}

impl Synth {
    pub fn new(id: SynthId, rig: Rig) -> Synth {
        Synth {
            id,
            rig,
            next_rig: None,
            up: false,
            tight: false,
            left: false,
            channels: [Channel::NEW; CHANNELS],
            manager_range: BendRange::TWO,
            zone_due: false,
            repeat_when_silent: false,
            piece_at: None,
            wire: Wire::IDLE,
            again_at: None,
            song_due: SongDue::All,
        }
    }

    pub fn channel(&mut self, channel: u8) -> &mut Channel {
        &mut self.channels[channel as usize]
    }

    /// Since when, or from when on, nothing sounds; `None` while a key or pedal holds a note.
    pub fn silent_at(&self) -> Option<Time> {
        self.channels
            .iter()
            .try_fold(Time::START, |latest, channel| {
                channel.silent_at(self.rig.tail).map(|at| latest.max(at))
            })
    }

    pub fn is_silent(&self, now: Time) -> bool {
        self.silent_at().is_some_and(|at| at <= now)
    }

    pub fn send(&mut self, weight: Weight, bytes: &[u8], out: &mut Outbox) {
        if self.up {
            self.wire.carry(bytes.len(), self.rig.bytes_per_s);
            out.send(self.id, weight, bytes);
        }
    }

    /// Whether something can only be done once nothing sounds.
    pub fn waits_for_silence(&self, stopping: bool) -> bool {
        if stopping {
            return !self.left;
        }
        self.up && (self.repeat_when_silent || self.next_rig.is_some())
    }

    /// When the engine has to come back for this synth.
    pub fn due_at(&self, stopping: bool) -> Option<Time> {
        let silence = if self.waits_for_silence(stopping) {
            self.silent_at()
        } else {
            None
        };
        // To a synth that is away nothing can be said; it is set up anew when it comes.
        let said = [self.piece_at, self.again_at, self.wire.free_at()];
        let said = said.map(|at| at.filter(|_| self.up));
        said.into_iter().flatten().chain(silence).min()
    }

    /// Whether something of that weight may go out now: gestures wait for a slow wire, and only their newest value is
    /// said then.
    fn may_send(&mut self, weight: Weight) -> bool {
        weight != Weight::Control || self.wire.has_room(self.rig.bytes_per_s)
    }

    /// Sends a bend unless the channel already has it; tells whether it did.
    pub fn bend(&mut self, channel: u8, bend: Bend, weight: Weight, out: &mut Outbox) -> bool {
        if self.channel(channel).bend == Some(bend) || !self.may_send(weight) {
            return false;
        }
        self.channel(channel).bend = Some(bend);
        self.send(weight, &bend_message(channel, bend), out);
        true
    }

    /// Sends a controller unless the channel already has it; tells whether it has it now.
    pub fn controller(
        &mut self,
        channel: u8,
        number: u8,
        value: u8,
        weight: Weight,
        out: &mut Outbox,
    ) -> bool {
        if self.channel(channel).controllers[number as usize] == value {
            return true;
        }
        if !self.may_send(weight) {
            return false;
        }
        self.channel(channel).controllers[number as usize] = value;
        self.send(weight, &[status::CONTROLLER | channel, number, value], out);
        true
    }

    /// Sends channel pressure unless the channel already has it.
    pub fn pressure(&mut self, channel: u8, value: u8, weight: Weight, out: &mut Outbox) {
        if self.channel(channel).pressure != value && self.may_send(weight) {
            self.channel(channel).pressure = value;
            self.send(weight, &[status::PRESSURE | channel, value], out);
        }
    }

    /// Sends bank and program unless the channel already has them; tells whether it did.
    pub fn program(&mut self, channel: u8, program: Program, out: &mut Outbox) -> bool {
        if program.program == UNSAID || self.channel(channel).program == program {
            return false;
        }
        self.channel(channel).program = program;
        let bank = [
            (controller::BANK_MSB, program.bank_msb),
            (controller::BANK_LSB, program.bank_lsb),
        ];
        for (number, value) in bank.into_iter().filter(|(_, value)| *value != UNSAID) {
            self.send(
                Weight::Owed,
                &[status::CONTROLLER | channel, number, value],
                out,
            );
        }
        self.send(
            Weight::Owed,
            &[status::PROGRAM | channel, program.program],
            out,
        );
        true
    }

    /// Lifts every pedal that the channel was told is down, even half.
    pub fn lift_pedals(&mut self, channel: u8, out: &mut Outbox) {
        for number in PEDALS {
            let told = self.channel(channel).controllers[number as usize];
            if told != UNSAID && told != 0 {
                self.controller(channel, number, 0, Weight::Owed, out);
            }
        }
    }

    /// Cuts what rings on a channel, so that its next bend is not heard on it; pedals come back with the next note.
    pub fn hush(&mut self, channel: u8, out: &mut Outbox) {
        self.lift_pedals(channel, out);
        self.send(
            Weight::Owed,
            &[status::CONTROLLER | channel, controller::ALL_SOUND_OFF, 0],
            out,
        );
        let channel = self.channel(channel);
        channel.damper = false;
        channel.sostenuto = false;
        channel.version = 0;
    }

    /// Marks a channel's bend range to be said again.
    pub fn range_due(&mut self, channel: u8, now: Time) {
        let pace = self.rig.pace;
        let channel = self.channel(channel);
        if channel.due == Due::Nothing {
            channel.due = Due::Range;
        }
        self.piece_at.get_or_insert(now + pace);
    }
}

/// Controllers that hold notes or colour them until lifted.
pub(super) const PEDALS: [u8; 4] = [
    controller::DAMPER,
    controller::SOSTENUTO,
    controller::SOFT,
    controller::HOLD_2,
];

pub(super) fn bend_message(channel: u8, bend: Bend) -> [u8; 3] {
    let value = bend.value();
    [
        status::BEND | channel,
        (value & 0x7F) as u8,
        (value >> 7) as u8,
    ]
}
