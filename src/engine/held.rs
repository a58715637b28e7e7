//! Cues `while: held`: what they do lasts as long as the control is down, on top of what was told for good.

use super::lasting::Lasting;
use super::plan::{Act, Gesture};
use super::traffic::Command;
use super::{Engine, Hand};
use crate::limits::HELD_MAX;
use crate::time::Time;

#[derive(Clone, Copy)]
struct Layer {
    hand: Hand,
    gesture: Gesture,
    command: Command,
}

/// What is held down, the latest last; room is taken once.
pub(super) struct Held {
    list: Vec<Layer>,
}

impl Held {
    pub fn new() -> Held {
        Held {
            list: Vec::with_capacity(HELD_MAX),
        }
    }

    pub fn clear(&mut self) {
        self.list.clear();
    }

    /// What belongs to a song ends with it, also while the control stays down.
    pub fn end_song(&mut self) {
        self.list.retain(|layer| outlasts_songs(layer.command));
    }
}

fn outlasts_songs(command: Command) -> bool {
    matches!(command, Command::Pitch { .. } | Command::Plain)
}

impl Engine {
    /// A control with a cue `while: held` has gone down.
    pub(super) fn hold(&mut self, now: Time, hand: Hand, gesture: Gesture, command: Command) {
        let again = |layer: &Layer| (layer.hand, layer.gesture) == (hand, gesture);
        self.held.list.retain(|layer| !again(layer));
        let mut after = self.folded();
        if self.held.list.len() == HELD_MAX || !after.take(command, &self.playing) {
            self.out.counters.ignored += 1;
            self.put_in_force(now, false);
            return;
        }
        self.held.list.push(Layer {
            hand,
            gesture,
            command,
        });
        self.put_in_force(now, moves_held_notes(command));
    }

    pub(super) fn let_go_of(&mut self, now: Time, hand: Hand, gesture: Gesture) {
        self.drop_held(now, |layer| layer.hand == hand && layer.gesture == gesture);
    }

    /// Hands on a keyboard that is gone hold nothing.
    pub(super) fn let_go_of_hands(&mut self, now: Time, gone: impl Fn(Hand) -> bool) {
        self.drop_held(now, |layer| gone(layer.hand));
    }

    /// After an edit: what no cue holds any more is let go, for nobody would hear it come up.
    pub(super) fn let_go_of_edited(&mut self, now: Time) {
        let list = std::mem::take(&mut self.held.list);
        let goes_on = |layer: &Layer| {
            let keyboard = self.plays_as(layer.hand.keyboard);
            let known = self.plan.keyboards.get(keyboard.index());
            known.is_some_and(|keyboard| keyboard.channels.has(layer.hand.channel))
                && self.plan.cues.iter().any(|cue| {
                    cue.held
                        && cue.gesture == layer.gesture
                        && cue.act == Act::Command(layer.command)
                })
        };
        let ends: u64 = (list.iter().enumerate())
            .filter(|(_, layer)| !goes_on(layer))
            .fold(0, |ends, (place, _)| ends | 1 << place);
        self.held.list = list;
        let mut place = 0;
        self.drop_held(now, |_| {
            place += 1;
            ends >> (place - 1) & 1 == 1
        });
    }

    fn drop_held(&mut self, now: Time, mut ends: impl FnMut(&Layer) -> bool) {
        let (mut any, mut moves) = (false, false);
        self.held.list.retain(|layer| {
            let ends = ends(layer);
            any |= ends;
            moves |= ends && moves_held_notes(layer.command);
            !ends
        });
        if any {
            self.put_in_force(now, moves);
        }
    }

    /// Takes a command that lasts for good.
    pub(super) fn latch_told(&mut self, now: Time, command: Command) {
        if !self.latched.take(command, &self.playing) {
            self.out.counters.ignored += 1;
        }
        self.put_in_force(now, moves_held_notes(command));
    }

    /// A song begins: what was told of the last one is over.
    pub(super) fn begin_told(&mut self) {
        self.held.end_song();
        self.next_key = None;
        self.line.forget();
        self.latched.begin(&self.playing.by_hand);
        self.retell();
    }

    /// Another tuning, the same hands.
    pub(super) fn retell(&mut self) {
        let told = self.folded();
        let turned = self.plain != told.plain;
        let before = self.in_force;
        self.nudge = told.nudge;
        self.plain = told.plain;
        self.transposed = told.transposed;
        self.in_force = told;
        self.playing.retune(&told);
        if turned {
            self.begin_harmony();
        }
        self.tell_harmony(&before, &told, turned);
    }

    /// What is latched, with what is held on top.
    fn folded(&self) -> Lasting {
        let mut told = self.latched;
        for layer in &self.held.list {
            told.take(layer.command, &self.playing);
        }
        told
    }

    /// Makes what was told count from the next note on.
    pub(super) fn put_in_force(&mut self, now: Time, move_held_notes: bool) {
        if self.folded() != self.in_force {
            self.retell();
        }
        if move_held_notes {
            self.move_all_held(now);
        }
    }
}

fn moves_held_notes(command: Command) -> bool {
    matches!(command, Command::Pitch { held_too: true, .. })
}
