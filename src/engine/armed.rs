//! What cues `at: quiet` have armed, until every key and pedal of every keyboard is up.

use super::Engine;
use super::plan::{ChannelSet, Plan, SongPlan};
use super::traffic::Command;
use crate::limits::ARMED_MAX;
use crate::time::Time;
use std::mem::discriminant;

/// Commands that wait, oldest first, one of a kind; room is taken once.
pub(super) struct Armed {
    list: Vec<Command>,
}

impl Armed {
    pub fn new() -> Armed {
        Armed {
            list: Vec::with_capacity(ARMED_MAX),
        }
    }

    pub fn len(&self) -> usize {
        self.list.len()
    }

    /// A second press does not arm twice, and of two songs the later one is meant. Tells whether there was room.
    fn add(&mut self, command: Command) -> bool {
        self.list.retain(|other| !alike(*other, command));
        let room = self.list.len() < ARMED_MAX;
        if room {
            self.list.push(command);
        }
        room
    }

    fn take(&mut self) -> Option<Command> {
        (!self.list.is_empty()).then(|| self.list.remove(0))
    }

    pub fn clear(&mut self) {
        self.list.clear();
    }

    /// A song chosen otherwise is the later wish.
    pub fn forget_songs(&mut self) {
        self.list.retain(|command| !begins_a_song(*command));
    }
}

fn alike(one: Command, other: Command) -> bool {
    match (one, other) {
        (Command::Inflect { key, .. }, Command::Inflect { key: other, .. }) => key == other,
        (Command::Turn(name), Command::Turn(other)) => name == other,
        (Command::Ask(ask), Command::Ask(other)) => ask == other,
        (Command::BlackKey(name), Command::BlackKey(other)) => {
            name.pitch_class() == other.pitch_class()
        }
        _ => {
            begins_a_song(one) && begins_a_song(other) || discriminant(&one) == discriminant(&other)
        }
    }
}

fn begins_a_song(command: Command) -> bool {
    match command {
        Command::Song(_)
        | Command::Next
        | Command::NextFrom(_)
        | Command::Back
        | Command::Fresh => true,
        Command::Pitch { .. }
        | Command::Transpose(_)
        | Command::Plain
        | Command::Inflect { .. }
        | Command::InflectHome
        | Command::Turn(_)
        | Command::BlackKey(_)
        | Command::Tonic { .. }
        | Command::TonicNextKey(_)
        | Command::TonicAt(_)
        | Command::TonicHome
        | Command::Root(_)
        | Command::RootNextKey
        | Command::Sevenths(_)
        | Command::Home
        | Command::Ask(_)
        | Command::Panic
        | Command::Resend(_)
        | Command::End
        | Command::Stop => false,
    }
}

impl Engine {
    /// Keeps a command until all is quiet; if it is, follows it now.
    pub(super) fn arm(&mut self, now: Time, command: Command) {
        if self.is_deaf(now, command) {
            return;
        }
        if begins_a_song(command) && self.goal(command).is_none() {
            self.out.counters.ignored += 1;
            return;
        }
        if !self.armed.add(command) {
            self.out.counters.ignored += 1;
        }
        self.when_quiet(now);
    }

    /// The song of the set that a command would begin now.
    pub(super) fn goal(&self, command: Command) -> Option<usize> {
        let place = match command {
            Command::Song(place) => Some(place as usize),
            Command::Next | Command::NextFrom(_) => Some(self.song + 1),
            Command::Back => self.song.checked_sub(1),
            Command::Fresh => Some(0),
            _ => None,
        };
        place.filter(|place| *place < self.plan.set.len())
    }

    pub(super) fn armed_song(&self) -> Option<u16> {
        let mut armed = self.armed.list.iter();
        armed.find_map(|command| self.goal(*command).map(|place| place as u16))
    }

    /// To be asked whenever a key or pedal may have come up.
    pub(super) fn when_quiet(&mut self, now: Time) {
        if self.armed.len() == 0 || !self.is_quiet() {
            return;
        }
        while let Some(command) = self.armed.take() {
            self.follow(now, command);
        }
    }

    /// Whether every key and pedal is up, of every device that plays as a keyboard of the plan.
    pub(super) fn is_quiet(&self) -> bool {
        self.keyboards.iter().all(|keyboard| {
            let plan = self.plan.keyboards.get(keyboard.plays_as.index());
            let heard = plan.map_or(ChannelSet::NONE, |plan| plan.channels).iter();
            heard
                .map(|channel| &keyboard.sources[channel as usize])
                .all(|source| source.is_quiet())
        })
    }

    /// After an edit: armed songs are found again by title, or are armed no more.
    pub(super) fn find_armed_again(&mut self, old: &Plan) {
        let set = &self.plan.set;
        self.armed.list.retain_mut(|command| match command {
            Command::Song(place) | Command::NextFrom(place) => {
                let again = find_again(set, old, *place as usize);
                *place = again.map_or(*place, |again| again as u16);
                again.is_some()
            }
            _ => true,
        });
    }
}

/// Where a song of an old set stands now: in its old place if it can, else where its title is.
pub(super) fn find_again(set: &[SongPlan], old: &Plan, place: usize) -> Option<usize> {
    let title = &old.set.get(place)?.title;
    if set.get(place).is_some_and(|song| song.title == *title) {
        return Some(place);
    }
    set.iter().position(|song| song.title == *title)
}
