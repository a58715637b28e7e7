//! `by_line`: a key takes one place when the melody comes to it from below and another when from above.

use super::plan::PartPlan;
use super::{Engine, Hand};
use crate::limits::{KEYBOARDS_MAX, LINE_KEYS, REST_MS};
use crate::time::{Span, Time};
use crate::tuning::Key;

/// A key further away belongs to another line.
const REACH_KEYS: u8 = 12;

/// The keys last struck on each keyboard, the newest first.
pub(super) struct Line {
    struck: [[Option<Key>; LINE_KEYS]; KEYBOARDS_MAX],
    /// When the last key came up; `None` while one is down.
    silent_since: Option<Time>,
}

impl Line {
    pub const fn new() -> Line {
        Line {
            struck: [[None; LINE_KEYS]; KEYBOARDS_MAX],
            silent_since: None,
        }
    }

    pub fn forget(&mut self) {
        self.struck = [[None; LINE_KEYS]; KEYBOARDS_MAX];
    }
}

impl Engine {
    /// A key is about to sound. It first takes the place that the line gives it.
    pub(super) fn follow_line(&mut self, now: Time, hand: Hand, key: Key) {
        let silent_since = self.line.silent_since.take();
        if self.playing.by_hand.by_line.iter().all(Option::is_none) {
            return;
        }
        let rest = Span::from_millis(REST_MS);
        if silent_since.is_some_and(|since| now.since(since) >= rest) {
            self.line.forget();
            self.latched.told = 0;
            self.latched.by_line = [None; 12];
        }
        let Some(key) = self.as_tuned(hand, key) else {
            return;
        };
        let struck = &mut self.line.struck[hand.keyboard.index()];
        let near = |other: &Key| key.number().abs_diff(other.number()) <= REACH_KEYS;
        let before = struck.iter().flatten().copied().find(near);
        struck.rotate_right(1);
        struck[0] = Some(key);
        let pitch_class = key.pitch_class() as usize;
        if let Some(ways) = self.playing.by_hand.by_line[pitch_class]
            && before != Some(key)
        {
            let way = before.and_then(|before| if before < key { ways.up } else { ways.down });
            self.latched.by_line[pitch_class] = way;
        }
        self.put_in_force(now, false);
    }

    /// A key has come up.
    pub(super) fn note_silence(&mut self, now: Time) {
        let hands = self.keyboards.iter().flat_map(|keyboard| &keyboard.sources);
        if self.line.silent_since.is_none() && hands.into_iter().all(|source| source.keys == 0) {
            self.line.silent_since = Some(now);
        }
    }

    /// The key as the song's tuning sees it: moved by the transposition of the song and of the first part it plays.
    pub(super) fn as_tuned(&self, hand: Hand, key: Key) -> Option<Key> {
        let plays =
            |part: &&PartPlan| self.feeds(part, hand) && (part.keys.0..=part.keys.1).contains(&key);
        let part = self.parts_playing().find(plays)?;
        key.moved(part.transpose_keys as i32 + self.transpose_keys() as i32)
    }
}
