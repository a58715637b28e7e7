//! Words that wait for the next key: `tonic next-key`, `root next-key`. That key names something and is silent, unless the cue passes it on.

use super::cues::Heard;
use super::plan::{CuePlan, Gesture};
use super::traffic::{Command, RootTo, TonicBy};
use super::{Engine, Hand};
use crate::intonation::Method;
use crate::pitch::Interval;
use crate::time::Time;
use crate::tuning::{Key, Letter, Tonic};

/// What the next key names.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Names {
    Tonic(TonicBy),
    Root,
}

/// What the next key is for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Wait {
    names: Names,
    /// The key sounds as well.
    pass: bool,
    /// The control it was asked by; `None` if it was told.
    asked_by: Option<(Hand, Gesture)>,
    /// It ends when that control is let go.
    while_held: bool,
}

impl Engine {
    pub(super) fn wait_for_key(&mut self, names: Names, cue: Option<(&CuePlan, Hand)>) {
        let has_it = match names {
            Names::Tonic(_) => self.playing.by_hand.turning.is_some(),
            Names::Root => self.playing.method != Method::Fixed,
        };
        if !has_it {
            self.out.counters.ignored += 1;
            return;
        }
        self.next_key = Some(Wait {
            names,
            pass: cue.is_some_and(|(cue, _)| cue.pass),
            asked_by: cue.map(|(cue, hand)| (hand, cue.gesture)),
            while_held: cue.is_some_and(|(cue, _)| cue.held),
        });
    }

    pub(super) fn waits_for_tonic(&self) -> bool {
        let wait = self.next_key;
        wait.is_some_and(|wait| matches!(wait.names, Names::Tonic(_)))
    }

    pub(super) fn waits_for_root(&self) -> bool {
        self.next_key.is_some_and(|wait| wait.names == Names::Root)
    }

    /// A key goes down. Tells whether it only named something, so that it is not played.
    pub(super) fn names_by_key(&mut self, now: Time, hand: Hand, key: Key) -> bool {
        self.source(hand).named &= !(1 << key.number());
        let Some(wait) = self.next_key else {
            return false;
        };
        let Some(tonic) = self.as_tuned(hand, key) else {
            return false;
        };
        if self.has_cue(hand, Heard::KeyDown(key)) {
            return false;
        }
        self.next_key = None;
        let done = match wait.names {
            Names::Tonic(by) => self.latched.move_tonic(tonic, by, &self.playing),
            Names::Root => {
                let root = Command::Root(RootTo::At(tonic.pitch_class()));
                self.latched.take(root, &self.playing)
            }
        };
        self.out.counters.ignored += !done as u64;
        self.put_in_force(now, false);
        if !wait.pass {
            self.source(hand).named |= 1 << key.number();
        }
        !wait.pass
    }

    /// A key that only named something comes up.
    pub(super) fn named_by_key(&mut self, hand: Hand, key: u8) -> bool {
        let source = self.source(hand);
        let named = source.named >> key & 1 == 1;
        source.named &= !(1 << key);
        named
    }

    /// The tonic in force, and how far it stands from where the reference would put it.
    pub(super) fn tonic_in_force(&self) -> (Option<Letter>, Interval) {
        let Some(turning) = &self.playing.by_hand.turning else {
            return (None, Interval::ZERO);
        };
        let letter = |key: Key| Some(Letter::usual(key.pitch_class()));
        let Some(tonic) = self.in_force.tonic else {
            return (letter(turning.tonic), Interval::ZERO);
        };
        let sounds = |tonic: Tonic| turning.pitch(tonic, tonic.key);
        let at_rest = turning.absolute(tonic.key).and_then(sounds);
        let from_home = sounds(tonic)
            .zip(at_rest)
            .map(|(now, at_rest)| now - at_rest);
        (letter(tonic.key), from_home.unwrap_or_default())
    }

    /// By pitch class: what black keys with two names are now.
    pub(super) fn black_keys(&self) -> [Option<Letter>; 12] {
        let names = &self.playing.by_hand.black_keys;
        std::array::from_fn(|key| {
            let names = names[key]?;
            Some(match self.in_force.is_second(key) {
                true => names.second,
                false => names.first,
            })
        })
    }

    pub(super) fn end_wait(&mut self, ends: impl Fn(Hand, Gesture, bool) -> bool) {
        if let Some(wait) = self.next_key
            && let Some((hand, gesture)) = wait.asked_by
            && ends(hand, gesture, wait.while_held)
        {
            self.next_key = None;
        }
    }
}
