//! Cues: what a player does, how long it is held, and what that makes happen.

use super::next_key::Names;
use super::plan::{Act, CuePlan, Gesture, Press, Values};
use super::traffic::Command;
use super::{Engine, Hand};
use crate::limits::PRESSES_MAX;
use crate::time::{Span, Time};
use crate::tuning::Key;

/// A message, as far as cues can be about it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Heard {
    Program { number: u8, bank: [u8; 2] },
    SongSelect(u8),
    KeyDown(Key),
    KeyUp(Key),
    Moved { control: Control, from: u8, to: u8 },
}

/// What has a value that moves.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Control {
    Controller(u8),
    Pressure,
}

/// What a message is to a gesture.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Phase {
    Down,
    Up,
    /// Another movement of the control: it does nothing, and is taken away all the same.
    Idle,
}

impl Heard {
    /// `None`: the message has nothing to do with the gesture.
    fn phase(self, gesture: Gesture) -> Option<Phase> {
        match (self, gesture) {
            (
                Heard::Program { number, bank },
                Gesture::Program {
                    number: one,
                    bank: of,
                },
            ) => {
                let is = |wanted: Option<u8>, value| wanted.is_none_or(|wanted| wanted == value);
                (is(one, number) && is(of.msb, bank[0]) && is(of.lsb, bank[1]))
                    .then_some(Phase::Down)
            }
            (Heard::SongSelect(number), Gesture::SongSelect(one)) => {
                one.is_none_or(|one| one == number).then_some(Phase::Down)
            }
            (Heard::KeyDown(heard), Gesture::Note(key)) => (heard == key).then_some(Phase::Down),
            (Heard::KeyUp(heard), Gesture::Note(key)) => (heard == key).then_some(Phase::Up),
            (Heard::Moved { control, from, to }, Gesture::Controller { number, values }) => {
                (control == Control::Controller(number)).then(|| moved(values, from, to))
            }
            (Heard::Moved { control, from, to }, Gesture::Pressure(values)) => {
                (control == Control::Pressure).then(|| moved(values, from, to))
            }
            _ => None,
        }
    }

    /// What `do: song` counts by.
    fn number(self) -> Option<u8> {
        match self {
            Heard::Program { number, .. } | Heard::SongSelect(number) => Some(number),
            _ => None,
        }
    }
}

/// Down on coming into the values, up on leaving them. A button that only ever sends one value is pressed each time.
fn moved(values: Values, from: u8, to: u8) -> Phase {
    let one = values.first == values.last;
    match (values.has(from), values.has(to)) {
        (was_in, true) if !was_in || one => Phase::Down,
        (true, false) => Phase::Up,
        _ => Phase::Idle,
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
        cues.any(|cue| !cue.pass && heard.phase(cue.gesture).is_some() && self.is_for(cue, hand))
    }

    pub(super) fn has_cue(&self, hand: Hand, heard: Heard) -> bool {
        let mut cues = self.plan.cues.iter();
        cues.any(|cue| heard.phase(cue.gesture).is_some() && self.is_for(cue, hand))
    }

    /// Runs the cues on a message. A controller can leave the values of one and come into those of another: what is let
    /// go comes first.
    pub(super) fn cue(&mut self, now: Time, hand: Hand, heard: Heard) {
        for phase in [Phase::Up, Phase::Down] {
            for index in 0..self.plan.cues.len() {
                let gesture = self.plan.cues[index].gesture;
                if heard.phase(gesture) == Some(phase) && self.is_first(index, hand) {
                    self.gesture(now, hand, gesture, phase, heard.number());
                }
            }
        }
    }

    /// Whether a cue is for a hand, and none before it has the same gesture.
    fn is_first(&self, index: usize, hand: Hand) -> bool {
        let gesture = self.plan.cues[index].gesture;
        let mut cues = self.plan.cues[..=index].iter();
        let first = cues.position(|cue| cue.gesture == gesture && self.is_for(cue, hand));
        first == Some(index)
    }

    /// Runs the cues on a gesture.
    fn gesture(
        &mut self,
        now: Time,
        hand: Hand,
        gesture: Gesture,
        phase: Phase,
        number: Option<u8>,
    ) {
        if phase == Phase::Up {
            self.let_go_of(now, hand, gesture);
            self.end_wait(|by, with, held| held && (by, with) == (hand, gesture));
        }
        let length = self.press(now, hand, gesture, phase);
        for index in 0..self.plan.cues.len() {
            let cue = self.plan.cues[index];
            if cue.gesture == gesture && self.is_for(&cue, hand) && fires(&cue, phase, length) {
                self.fire(now, hand, &cue, number);
            }
        }
    }

    fn press(&mut self, now: Time, hand: Hand, gesture: Gesture, phase: Phase) -> Length {
        if phase == Phase::Down {
            return match self.long_press(hand, gesture) {
                None => Length::Any,
                Some(long) if self.presses.begin(hand, gesture, now + long) => Length::Open,
                Some(_) => {
                    self.out.counters.ignored += 1;
                    Length::Any
                }
            };
        }
        self.fire_long(now);
        match self.presses.end(hand, gesture) {
            None => Length::Any,
            Some(held) if held.long_at.is_some() => Length::Short,
            Some(_) => Length::Long,
        }
    }

    fn long_press(&self, hand: Hand, gesture: Gesture) -> Option<Span> {
        let mut cues = self.plan.cues.iter();
        cues.find_map(|cue| match cue.press {
            Press::Long(long) if cue.gesture == gesture && self.is_for(cue, hand) => Some(long),
            _ => None,
        })
    }

    /// Presses that are still held once their time has come.
    pub(super) fn fire_long(&mut self, now: Time) {
        while let Some((hand, gesture)) = self.presses.take_due(now) {
            for index in 0..self.plan.cues.len() {
                let cue = self.plan.cues[index];
                let is_long = matches!(cue.press, Press::Long(_)) && cue.gesture == gesture;
                if is_long && self.is_for(&cue, hand) {
                    self.fire(now, hand, &cue, None);
                }
            }
        }
    }

    fn fire(&mut self, now: Time, hand: Hand, cue: &CuePlan, number: Option<u8>) {
        let command = match (cue.act, number) {
            (Act::Command(command), _) => command,
            (Act::SongByNumber, Some(number)) => Command::Song(number as u16),
            (Act::SongByNumber, None) => {
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

    fn is_for(&self, cue: &CuePlan, hand: Hand) -> bool {
        let keyboard = self.plays_as(hand.keyboard);
        cue.from.is_none_or(|from| from == keyboard) && cue.channels.has(hand.channel)
    }
}

/// Where a control has a long press too, a short one is only known when it is let go.
fn fires(cue: &CuePlan, phase: Phase, length: Length) -> bool {
    match (cue.press, phase) {
        (_, Phase::Down) if cue.held => true,
        (_, _) if cue.held => false,
        (Press::Down, Phase::Down) => length == Length::Any,
        (Press::Down, Phase::Up) => length == Length::Short,
        (Press::Up, Phase::Up) => length != Length::Long,
        (Press::Either, Phase::Down | Phase::Up) => true,
        _ => false,
    }
}
