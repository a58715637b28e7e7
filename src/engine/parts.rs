//! Which parts play: those of the song now playing, and behind them those of songs before that still ring.
//!
//! A part that the next song has too, to the letter, goes on with all that its player has set. One that it has not
//! starts no more notes, but wheel, pedals and pressure reach what rings of it until that is silent. A channel belongs to
//! the part that played on it last; where none has, to the one in whose pool it is.

use super::Engine;
use super::Hand;
use super::channel::{AT_REST, UNSAID};
use super::mono::Below;
use super::part::{Part, owner_of};
use super::plan::{ChannelSet, PartId, PartPlan, SynthId};
use super::synth::PEDALS;
use super::traffic::Weight;
use super::voices::Voice;
use crate::limits::{CHANNELS, PART_PLACES, PARTS_MAX};
use crate::midi::controller;
use crate::pitch::Interval;
use crate::time::Time;

// Whatever a song brings, what rings of the song before has room.
const _: () = assert!(PART_PLACES >= 2 * PARTS_MAX);

impl Engine {
    /// The parts of the song now playing.
    pub(super) fn parts_playing(&self) -> impl Iterator<Item = &PartPlan> {
        let playing = self.parts[..self.playing_parts].iter();
        playing.map(|part| &part.plan)
    }

    /// The part to which a channel belongs.
    pub(super) fn part_of(&self, id: SynthId, number: u8) -> Option<(PartId, PartPlan)> {
        let owner = self.owner_of(id, number)?;
        Some((owner, self.parts[owner.index()].plan))
    }

    /// The same by its place among the parts.
    pub(super) fn owner_of(&self, id: SynthId, number: u8) -> Option<PartId> {
        let played = self.synths[id.index()].channels[number as usize].part;
        played.or_else(|| owner_of(&self.parts[..self.playing_parts], id, number))
    }

    /// The channels that belong to a part.
    pub(super) fn channels_of(&self, index: usize) -> ChannelSet {
        let part = &self.parts[index].plan;
        let synth = &self.synths[part.to.index()];
        let is_its = |number: &u8| match synth.channels[*number as usize].part {
            Some(played) => played.index() == index,
            None => index < self.playing_parts && part.pool.has(*number),
        };
        let channels = synth.rig.members.iter().filter(is_its);
        channels.fold(ChannelSet::NONE, ChannelSet::with)
    }

    /// The channels that hear a part's controllers and programs: the manager alone under MPE (MPE 1.1, 2.3), each of the
    /// part's own otherwise.
    pub(super) fn gesture_channels(&self, index: usize) -> ChannelSet {
        let synth = &self.synths[self.parts[index].plan.to.index()];
        match synth.rig.manager() {
            Some(manager) => ChannelSet::NONE.with(manager),
            None => self.channels_of(index),
        }
    }

    fn song_parts(&self) -> &[PartPlan] {
        self.plan.parts_of(&self.plan.set[self.song])
    }

    fn plays_song_parts(&self) -> bool {
        self.parts_playing().eq(self.song_parts())
    }

    /// The parts of a song that begins take over. Nothing that sounds is moved.
    pub(super) fn take_parts(&mut self, now: Time) {
        if self.plays_song_parts() {
            return;
        }
        let count = self.song_parts().len();
        self.drop_silent_parts(now);
        while self.parts.len() + count > PART_PLACES {
            self.cut_part(now, self.playing_parts);
        }
        let old: [Option<Part>; PART_PLACES] =
            std::array::from_fn(|place| self.parts.get(place).copied());
        let old_playing = self.playing_parts;
        let mut moved = [None; PART_PLACES];
        self.parts.clear();
        for index in 0..count {
            let plan = self.song_parts()[index];
            let is_it = |place: &usize| old[*place].is_some_and(|part| part.plan == plan);
            let part = match (0..PART_PLACES).find(|place| moved[*place].is_none() && is_it(place))
            {
                Some(place) => {
                    moved[place] = PartId::new(index);
                    old[place].unwrap_or(Part::new(plan))
                }
                None => self.begun(plan, old[..old_playing].iter().flatten()),
            };
            self.parts.push(part);
        }
        self.playing_parts = count;
        for (place, part) in old.into_iter().enumerate() {
            if let Some(part) = part
                && moved[place].is_none()
                && self.part_rings(now, place)
            {
                moved[place] = PartId::new(self.parts.len());
                self.parts.push(part);
            }
        }
        self.relabel(|place| moved[place]);
        self.brief_managers(now);
    }

    /// A part that the last song did not have: with the hands that play it now, and what the player of one like it has
    /// set.
    fn begun<'p>(&self, plan: PartPlan, mut before: impl Iterator<Item = &'p Part>) -> Part {
        let is_like = |part: &&Part| part.plan.to == plan.to && part.plan.from == plan.from;
        let mut part = Part::new(plan);
        if let Some(like) = before.find(is_like) {
            let below = Below::NOTHING;
            part = Part {
                plan,
                below,
                ..*like
            };
        }
        for (which, pedal) in PEDALS.into_iter().enumerate() {
            let value = self.deepest(&plan, which);
            if value > 0 || part.controllers[pedal as usize] != UNSAID {
                part.set(pedal, value);
            }
        }
        (part.wheel, part.pressure) = (Interval::ZERO, 0);
        for (index, keyboard) in self.keyboards.iter().enumerate() {
            for (channel, source) in keyboard.sources.iter().enumerate() {
                let plays = |hand: Hand| self.feeds(&plan, hand) && !self.is_finger(hand);
                if !Hand::new(index, channel as u8).is_some_and(plays) {
                    continue;
                }
                if plan.pass.wheel && source.wheel_interval() != Interval::ZERO {
                    part.wheel = source.wheel_interval();
                }
                if plan.pass.pressure {
                    part.pressure = part.pressure.max(source.pressure);
                }
            }
        }
        part
    }

    /// Managers speak for all their members at once, so they are told of new parts at once.
    fn brief_managers(&mut self, now: Time) {
        for index in 0..self.playing_parts {
            let synth = &self.synths[self.parts[index].plan.to.index()];
            if let Some(manager) = synth.rig.manager().filter(|_| synth.up) {
                self.say_gestures(synth.id, manager, index);
                self.play_wheel(now, index, Weight::Owed);
            }
        }
    }

    /// Whether anything of a part can still be heard.
    fn part_rings(&self, now: Time, place: usize) -> bool {
        let of_it = |v: &Voice| !v.drum && v.part.index() == place;
        self.voices.iter().any(of_it)
            || self.synths.iter().any(|synth| {
                synth.channels.iter().any(|channel| {
                    channel.part.is_some_and(|part| part.index() == place)
                        && channel.rings(now, synth.rig.tail)
                })
            })
    }

    /// Parts of songs before that have fallen silent are forgotten.
    pub(super) fn drop_silent_parts(&mut self, now: Time) {
        for place in (self.playing_parts..self.parts.len()).rev() {
            if !self.part_rings(now, place) {
                self.drop_part(place);
            }
        }
    }

    fn drop_part(&mut self, place: usize) {
        self.parts.swap_remove(place);
        let last = self.parts.len();
        self.relabel(|part| {
            if part == place {
                None
            } else if part == last {
                PartId::new(place)
            } else {
                PartId::new(part)
            }
        });
    }

    /// Ends what rings of a song before, to make room.
    fn cut_part(&mut self, now: Time, place: usize) {
        while let Some(voice) = self.voices.take(|v| !v.drum && v.part.index() == place) {
            self.out.counters.stolen += 1;
            self.end(now, &voice, 64, None);
        }
        let id = self.parts[place].plan.to;
        let synth = &mut self.synths[id.index()];
        for number in 0..CHANNELS as u8 {
            if synth.channels[number as usize]
                .part
                .is_some_and(|part| part.index() == place)
            {
                synth.lift_pedals(number, &mut self.out);
                let channel = synth.channel(number);
                channel.damper = false;
                channel.sostenuto = false;
            }
        }
        self.drop_part(place);
    }

    /// Parts have another place now, or none.
    fn relabel(&mut self, place: impl Fn(usize) -> Option<PartId>) {
        for voice in self.voices.iter_mut().filter(|voice| !voice.drum) {
            voice.part = place(voice.part.index()).unwrap_or(voice.part);
        }
        for index in 0..self.plan.synths.len() {
            for number in 0..CHANNELS as u8 {
                let channel = self.synths[index].channel(number);
                channel.part = channel.part.and_then(|part| place(part.index()));
                if channel.part.is_none() {
                    channel.version = 0; // perhaps it was in another's pool
                    self.undo_hands(self.synths[index].id, number);
                }
            }
        }
    }

    /// A part is about to play on a channel, in place of another or of none.
    pub(super) fn hand_over(&mut self, now: Time, id: SynthId, number: u8, to: PartId) {
        let synth = &mut self.synths[id.index()];
        let before = synth.channel(number).part.replace(to);
        if before == Some(to) || synth.rig.manager().is_some() {
            return;
        }
        if before.is_some() {
            synth.channel(number).version = 0;
        }
        let program = self.parts[to.index()].program;
        self.undo_hands(id, number);
        let synth = &mut self.synths[id.index()];
        if synth.program(number, program, &mut self.out) {
            synth.range_due(number, now); // it may have reset its range with it
        }
    }

    /// Of what was done on a channel by the player of a part that it no longer belongs to nothing stays.
    fn undo_hands(&mut self, id: SynthId, number: u8) {
        let owner = self.part_of(id, number);
        let synth = &mut self.synths[id.index()];
        if synth.rig.manager().is_some() {
            return; // told to the manager alone, for all players
        }
        for (cc, value) in AT_REST {
            let told = synth.channels[number as usize].controllers[cc as usize];
            let of_owner = owner.map(|(part, _)| self.parts[part.index()].controllers[cc as usize]);
            if told != UNSAID && of_owner.is_none_or(|value| value == UNSAID) {
                synth.controller(number, cc, value, Weight::Owed, &mut self.out);
            }
        }
    }

    /// After an edit each part has the place, pedals and controllers of the one that stood there before. What rings
    /// belongs to the part that has its channel now; where none has it, it is ended.
    pub(super) fn edit_parts(&mut self, now: Time) {
        if self.plays_song_parts() {
            return;
        }
        self.parts.truncate(self.playing_parts);
        let count = self.song_parts().len();
        for index in 0..count {
            let plan = self.song_parts()[index];
            match self.parts.get_mut(index) {
                Some(part) => {
                    part.plan = plan;
                    part.below = Below::NOTHING;
                }
                None => self.parts.push(Part::new(plan)),
            }
        }
        self.parts.truncate(count);
        self.playing_parts = count;
        for synth in &mut self.synths {
            for (number, channel) in synth.channels.iter_mut().enumerate() {
                channel.part = owner_of(&self.parts, synth.id, number as u8);
            }
        }
        self.fit_parts(now);
    }

    /// Each part takes the pedals of the hands that play it now, and what rings under a pedal that nobody holds any more
    /// is let go.
    fn fit_parts(&mut self, now: Time) {
        self.rehome_voices(now);
        for index in 0..self.parts.len() {
            let part = self.parts[index].plan;
            for (which, pedal) in PEDALS.into_iter().enumerate() {
                let value = self.deepest(&part, which);
                if value > 0 || self.parts[index].controllers[pedal as usize] != UNSAID {
                    self.parts[index].set(pedal, value);
                }
            }
            self.release_waiting(now, index);
        }
        for index in 0..self.plan.synths.len() {
            self.fit_channels(now, index);
        }
        // Where pedals are the synth's own now, nothing has to wait for them here.
        loop {
            let parts = &self.parts;
            let waits = |v: &Voice| !v.drum && !v.down && !parts[v.part.index()].plan.late_offs;
            match self.voices.take(waits) {
                Some(voice) => self.end(now, &voice, 64, None),
                None => return,
            }
        }
    }

    /// An open note belongs to the part that has its channel now; where none has, it is ended.
    fn rehome_voices(&mut self, now: Time) {
        for voice in self.voices.iter_mut().filter(|v| !v.drum) {
            let owner = owner_of(&self.parts, voice.synth, voice.channel);
            voice.part = owner.unwrap_or(voice.part);
        }
        loop {
            let parts = &self.parts;
            let homeless = |v: &Voice| !v.drum && owner_of(parts, v.synth, v.channel).is_none();
            match self.voices.take(homeless) {
                Some(voice) => self.end(now, &voice, 64, None),
                None => return,
            }
        }
    }

    /// Brings a synth's channels in line with the parts that own them now.
    fn fit_channels(&mut self, now: Time, index: usize) {
        let (id, rig) = (self.synths[index].id, self.synths[index].rig);
        let mut parts = self.parts.iter().map(|part| &part.plan);
        let late = parts.any(|part| part.to == id && part.late_offs);
        for number in rig.channels().iter() {
            let owner = self.part_of(id, number);
            let pedal_down = |engine: &Engine, pedal| {
                owner.is_some_and(|(id, _)| engine.parts[id.index()].pedal_down(pedal))
            };
            let damper = pedal_down(self, controller::DAMPER);
            let sostenuto = pedal_down(self, controller::SOSTENUTO);
            let manager = rig.manager() == Some(number);
            if (manager && late) || (!manager && !damper && !sostenuto) {
                self.synths[index].lift_pedals(number, &mut self.out);
            }
            self.undo_hands(id, number);
            let channel = self.synths[index].channel(number);
            channel.version = 0;
            if (channel.damper && !damper) || (channel.sostenuto && !sostenuto) {
                channel.damper &= damper;
                channel.sostenuto &= sostenuto;
                channel.released_at = Some(now);
            }
            if channel.rings(now, rig.tail) {
                self.catch_up(id, number);
            }
        }
        for part in 0..self.parts.len() {
            if let Some(manager) = rig.manager()
                && self.parts[part].plan.to == id
                && self.synths[index].up
            {
                self.say_gestures(id, manager, part);
            }
        }
    }
}
