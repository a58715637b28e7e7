//! When to write: soon after a change, seldom enough for a memory card, again if it failed. Reads no clock, writes no file.

use crate::time::{Span, Time};

/// Between a change and its writing: a song and the nudge that comes with it are one writing.
pub const MOMENT: Span = Span::from_millis(250);
/// From the beginning of one writing to the next.
pub const APART: Span = Span::from_millis(1_000);
/// A disk that is full or read-only is left alone so long. Somebody may see to it.
pub const AGAIN: Span = Span::from_millis(30_000);

/// What is to be on the disk, what is, and when the one becomes the other.
#[derive(Debug)]
pub struct Pace<T> {
    /// `None`: nothing, or who knows.
    kept: Option<T>,
    writing: Option<T>,
    wanted: Option<T>,
    /// The first change that is not being written.
    changed_at: Time,
    not_before: Time,
}

impl<T: Clone + PartialEq> Pace<T> {
    /// `kept` is on the disk already.
    pub fn new(kept: Option<T>) -> Pace<T> {
        Pace {
            kept,
            writing: None,
            wanted: None,
            changed_at: Time::START,
            not_before: Time::START,
        }
    }

    /// This is how things stand now.
    pub fn want(&mut self, now: Time, value: &T) {
        if self.writing.as_ref().or(self.kept.as_ref()) == Some(value) {
            self.wanted = None;
        } else if self.wanted.as_ref() != Some(value) {
            if self.wanted.is_none() {
                self.changed_at = now;
            }
            self.wanted = Some(value.clone());
        }
    }

    /// Write this now, and then say so to `done`.
    pub fn due(&mut self, now: Time) -> Option<T> {
        (now >= self.changed_at + MOMENT && now >= self.not_before)
            .then(|| self.take(now))
            .flatten()
    }

    /// There is no later: what is not on the disk, to be written now whatever the time.
    pub fn take(&mut self, now: Time) -> Option<T> {
        if self.writing.is_some() {
            return None;
        }
        let value = self.wanted.take()?;
        self.not_before = now + APART;
        self.writing = Some(value.clone());
        Some(value)
    }

    /// What was due has been written, or could not be.
    pub fn done(&mut self, now: Time, well: bool) {
        let written = self.writing.take();
        if well {
            self.kept = written;
            return;
        }
        self.kept = None;
        self.not_before = now + AGAIN;
        if self.wanted.is_none() {
            self.wanted = written;
        }
    }
}
