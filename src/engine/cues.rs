//! Cues: what a player does, how long it is held, and what that makes happen.

use super::next_key::Names;
use super::plan::{Act, CuePlan, Gesture, Press};
use super::traffic::Command;
use super::{Engine, Hand};
use crate::limits::PRESSES_MAX;
use crate::time::{Span, Time};

/// A gesture as it came.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Heard {
    Program(u8),
    /// A key has gone down, or a controller has just risen through 64.
    Down(Gesture),
    /// The same let go.
    Up(Gesture),
    /// Another movement of a control: it does nothing, and is taken away all the same.
    Idle(Gesture),
}

impl Heard {
    fn is(self, gesture: Gesture) -> bool {
        match self {
            Heard::Program(number) => {
                gesture == Gesture::AnyProgram || gesture == Gesture::Program(number)
            }
            Heard::Down(heard) | Heard::Up(heard) | Heard::Idle(heard) => heard == gesture,
        }
    }
}

/// What is known of a press by its length.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Length {
    /// No cue asks for a long one.
    Any,
    /// It has just begun and may become a long one.
    Open,
    Short,
    Long,
}

/// A control that is held down and has a cue for a long press.
#[derive(Clone, Copy)]
struct Held {
    hand: Hand,
    gesture: Gesture,
    /// When it becomes a long one; `None` once it has.
    long_at: Option<Time>,
}

/// The controls that may become, or were, long presses; room is taken once.
pub(super) struct Presses {
    list: Vec<Held>,
}

impl Presses {
    pub fn new() -> Presses {
        Presses {
            list: Vec::with_capacity(PRESSES_MAX),
        }
    }

    /// Tells whether there was room.
    fn begin(&mut self, hand: Hand, gesture: Gesture, long_at: Time) -> bool {
        self.end(hand, gesture);
        if self.list.len() == PRESSES_MAX {
            return false;
        }
        self.list.push(Held {
            hand,
            gesture,
            long_at: Some(long_at),
        });
        true
    }

    fn end(&mut self, hand: Hand, gesture: Gesture) -> Option<Held> {
        let is_it = |held: &Held| held.hand == hand && held.gesture == gesture;
        let place = self.list.iter().position(is_it)?;
        Some(self.list.remove(place))
    }

    /// Hands on keyboards that are gone hold nothing.
    pub fn forget(&mut self, gone: impl Fn(Hand) -> bool) {
        self.list.retain(|held| !gone(held.hand));
    }

    pub fn due_at(&self) -> Option<Time> {
        self.list.iter().filter_map(|held| held.long_at).min()
    }

    fn take_due(&mut self, now: Time) -> Option<(Hand, Gesture)> {
        let is_due = |held: &&mut Held| held.long_at.is_some_and(|at| at <= now);
        let held = self.list.iter_mut().find(is_due)?;
        held.long_at = None;
        Some((held.hand, held.gesture))
    }
}

impl Engine {
    /// Whether a cue takes a message away from the synth.
    pub(super) fn takes(&self, hand: Hand, heard: Heard) -> bool {
        let mut cues = self.plan.cues.iter();
        cues.any(|cue| !cue.pass && self.is_for(cue, hand, heard))
    }

    pub(super) fn has_cue(&self, hand: Hand, heard: Heard) -> bool {
        let mut cues = self.plan.cues.iter();
        cues.any(|cue| self.is_for(cue, hand, heard))
    }

    /// Runs the cues on a gesture.
    pub(super) fn cue(&mut self, now: Time, hand: Hand, heard: Heard) {
        if let Heard::Up(gesture) = heard {
            self.let_go_of(now, hand, gesture);
            self.end_wait(|by, with, held| held && (by, with) == (hand, gesture));
        }
        let length = self.press(now, hand, heard);
        for index in 0..self.plan.cues.len() {
            let cue = self.plan.cues[index];
            if self.is_for(&cue, hand, heard) && fires(&cue, heard, length) {
                self.fire(now, hand, &cue, heard);
            }
        }
    }

    fn press(&mut self, now: Time, hand: Hand, heard: Heard) -> Length {
        match heard {
            Heard::Down(gesture) => match self.long_press(hand, gesture) {
                None => Length::Any,
                Some(long) if self.presses.begin(hand, gesture, now + long) => Length::Open,
                Some(_) => {
                    self.out.counters.ignored += 1;
                    Length::Any
                }
            },
            Heard::Up(gesture) => {
                self.fire_long(now);
                match self.presses.end(hand, gesture) {
                    None => Length::Any,
                    Some(held) if held.long_at.is_some() => Length::Short,
                    Some(_) => Length::Long,
                }
            }
            Heard::Program(_) | Heard::Idle(_) => Length::Any,
        }
    }

    fn long_press(&self, hand: Hand, gesture: Gesture) -> Option<Span> {
        let mut cues = self.plan.cues.iter();
        cues.find_map(|cue| match cue.press {
            Press::Long(long) if self.is_for(cue, hand, Heard::Idle(gesture)) => Some(long),
            _ => None,
        })
    }

    /// Presses that are still held once their time has come.
    pub(super) fn fire_long(&mut self, now: Time) {
        while let Some((hand, gesture)) = self.presses.take_due(now) {
            let heard = Heard::Idle(gesture);
            for index in 0..self.plan.cues.len() {
                let cue = self.plan.cues[index];
                if matches!(cue.press, Press::Long(_)) && self.is_for(&cue, hand, heard) {
                    self.fire(now, hand, &cue, heard);
                }
            }
        }
    }

    fn fire(&mut self, now: Time, hand: Hand, cue: &CuePlan, heard: Heard) {
        let command = match (cue.act, heard) {
            (Act::Command(command), _) => command,
            (Act::SongByProgram, Heard::Program(number)) => Command::Song(number as u16),
            (Act::SongByProgram, _) => {
                self.out.counters.ignored += 1;
                return;
            }
        };
        let names = match command {
            Command::TonicNextKey(by) => Some(Names::Tonic(by)),
            Command::RootNextKey => Some(Names::Root),
            _ => None,
        };
        if cue.at_quiet {
            self.arm(now, command);
        } else if let Some(names) = names {
            self.wait_for_key(names, Some((cue, hand)));
        } else if cue.held {
            self.hold(now, hand, cue.gesture, command);
        } else {
            self.command(now, command);
        }
    }

    fn is_for(&self, cue: &CuePlan, hand: Hand, heard: Heard) -> bool {
        let keyboard = self.plays_as(hand.keyboard);
        cue.from.is_none_or(|from| from == keyboard)
            && cue.channels.has(hand.channel)
            && heard.is(cue.gesture)
    }
}

/// Where a control has a long press too, a short one is only known when it is let go.
fn fires(cue: &CuePlan, heard: Heard, length: Length) -> bool {
    match (cue.press, heard) {
        (_, Heard::Down(_)) if cue.held => true,
        (_, _) if cue.held => false,
        (_, Heard::Program(_)) => true,
        (Press::Down, Heard::Down(_)) => length == Length::Any,
        (Press::Down, Heard::Up(_)) => length == Length::Short,
        (Press::Up, Heard::Up(_)) => length != Length::Long,
        (Press::Either, Heard::Down(_) | Heard::Up(_)) => true,
        _ => false,
    }
}
