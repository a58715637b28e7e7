//! What a channel is told before a note: set-up that is due, controllers it has missed, pressure, bend.

use super::Engine;
use super::channel::{Channel, DOUBTFUL, Due, UNSAID};
use super::choose::Want;
use super::dialect::on_members;
use super::outbox::{Bundle, Outbox};
use super::plan::{ChannelSet, PartId, PartPlan, SynthId};
use super::synth::{Synth, bend_message};
use super::traffic::Weight;
use super::voices::{Voice, Voices};
use crate::midi::{controller, status};
use crate::pitch::word::Bend;
use crate::time::Time;

/// Where controller 74 does nothing: the middle (MPE 1.1, A.4.3).
const BRIGHTNESS_AT_REST: u8 = 64;

impl Engine {
    /// Set-up that is still due on a channel, then the controllers it has missed while it was silent.
    pub(super) fn say_what_a_note_needs(&mut self, now: Time, id: SynthId, number: u8) {
        if self.synths[id.index()].zone_due || self.manager_due(id) {
            self.say_manager(now, id);
        }
        if self.synths[id.index()].channels[number as usize].due != Due::Nothing {
            self.say_channel(now, id, number);
        }
        self.catch_up(id, number);
    }

    /// The pressure a channel should have while a new note starts on it: nothing of the old notes may colour it.
    pub(super) fn pressure_for(
        &self,
        part: &PartPlan,
        id: SynthId,
        number: u8,
        part_id: PartId,
    ) -> u8 {
        let rig = &self.synths[id.index()].rig;
        let of_part = if on_members(rig, part) {
            self.parts[part_id.index()].pressure
        } else {
            0
        };
        // To a plain synth pressure on one key of an ordinary keyboard goes as it came.
        let on_channel = |v: &&Voice| rig.keeps_pitch() || v.finger;
        let here = self.voices.iter().filter(on_channel);
        let here = here.filter(|v| v.synth == id && v.channel == number);
        here.map(|v| v.pressure).fold(of_part, u8::max)
    }

    /// Tells a channel every controller of its part that it has not heard yet.
    pub(super) fn catch_up(&mut self, id: SynthId, number: u8) {
        let Some((part_id, _)) = self.part_of(id, number) else {
            return;
        };
        let synth = &mut self.synths[id.index()];
        if synth.rig.manager().is_some() {
            return; // under MPE the manager hears every controller at once
        }
        let settings = &self.parts[part_id.index()];
        if synth.channels[number as usize].version == settings.version {
            return;
        }
        synth.channels[number as usize].version = settings.version;
        if settings.pedal_down(controller::SOSTENUTO) {
            latch(
                synth,
                number,
                ChannelSet::NONE.with(number),
                &mut self.voices,
            );
        }
        let finger = synth.channels[number as usize].brightness != UNSAID;
        for (cc, value) in settings.controllers.iter().enumerate() {
            let is_finger_s = finger && cc as u8 == controller::BRIGHTNESS;
            if *value != UNSAID && !is_finger_s {
                synth.controller(number, cc as u8, *value, Weight::Owed, &mut self.out);
            }
        }
    }
}

/// Adds to a bundle the brightness, pressure and bend that a channel must have before the wanted note, where it has not.
pub(super) fn bend_for(
    synth: &mut Synth,
    want: &Want,
    number: u8,
    pressure: u8,
    bundle: &mut Bundle,
    out: &mut Outbox,
) {
    let range = synth.rig.bend_range;
    let word = want.word;
    let channel = synth.channel(number);
    if channel.held == 0 || channel.word != word || want.alone {
        channel.offset = want.offset;
        channel.nudge = want.nudge;
        channel.finger = want.finger.bend;
        brightness_for(channel, want, number, bundle);
    }
    let (bend, clipped) = Bend::encode(channel.offset + channel.finger + want.wheel, range);
    out.counters.clipped += clipped as u64;
    if channel.pressure != pressure {
        channel.pressure = pressure;
        bundle.add(&[status::PRESSURE | number, pressure]);
    }
    if channel.bend != Some(bend) {
        out.counters.bends += (channel.word != word || channel.bend.is_none()) as u64;
        channel.bend = Some(bend);
        bundle.add(&bend_message(number, bend));
    }
    channel.word = word;
}

/// The finger's own, or its part's in place of what another finger has left there.
fn brightness_for(channel: &mut Channel, want: &Want, number: u8, bundle: &mut Bundle) {
    let told = &mut channel.controllers[controller::BRIGHTNESS as usize];
    let left_behind = channel.brightness != UNSAID;
    let wanted = match (want.finger.brightness, want.brightness) {
        (UNSAID, UNSAID) if left_behind => BRIGHTNESS_AT_REST,
        (UNSAID, of_part) => of_part,
        (own, _) => own,
    };
    channel.brightness = want.finger.brightness;
    if wanted != UNSAID && wanted != *told {
        *told = wanted;
        bundle.add(&[status::CONTROLLER | number, controller::BRIGHTNESS, wanted]);
    }
}

/// To be asked before a channel is told that the sostenuto pedal is down: if the receiver sees it go down only now, it
/// latches what is held on `governed` now, whenever the player pressed it.
pub(super) fn latch(synth: &Synth, channel: u8, governed: ChannelSet, voices: &mut Voices) {
    let told = synth.channels[channel as usize].controllers[controller::SOSTENUTO as usize];
    if told == UNSAID || told == DOUBTFUL || told < 64 {
        for voice in voices.iter_mut() {
            voice.latched |= voice.synth == synth.id && governed.has(voice.channel);
        }
    }
}
