//! When to read again, by what was heard and seen: a state machine that asks nobody.

use super::Print;
use crate::time::{Span, Time};

/// A file is read once nothing has been heard of it for so long: editors write in several strokes.
const QUIET: Span = Span::from_millis(50);
/// Whoever writes without a pause is not waited for longer than this.
const PATIENCE: Span = Span::from_millis(1_000);
/// Between two looks.
const LOOK: Span = Span::from_millis(1_000);

#[derive(Debug)]
pub struct Decide {
    /// The first and the last sign of a change that has not been read yet.
    touched: Option<(Time, Time)>,
    looked_at: Time,
    /// What is known of each file; `None`: it is not there, or was never looked at.
    seen: Vec<Option<Print>>,
    /// What was read last could be used.
    good: bool,
}

impl Decide {
    pub fn new(now: Time) -> Decide {
        Decide {
            touched: None,
            looked_at: now,
            seen: Vec::new(),
            good: true,
        }
    }

    pub fn touched(&mut self, now: Time) {
        let first = self.touched.map_or(now, |(first, _)| first);
        self.touched = Some((first, now));
    }

    pub fn is_look_due(&self, now: Time) -> bool {
        now.since(self.looked_at) >= LOOK
    }

    pub fn looked(&mut self, now: Time, seen: Vec<Option<Print>>) {
        self.looked_at = now;
        if seen != self.seen {
            self.seen = seen;
            self.touched(now);
        }
    }

    /// What a look saw of a file.
    pub fn seen(&self, place: usize) -> Option<Print> {
        self.seen.get(place).copied().flatten()
    }

    /// Takes something for known that is about to be read.
    pub fn know(&mut self, seen: Vec<Option<Print>>) {
        self.seen = seen;
    }

    /// Whether what was read could be used.
    pub fn settled(&mut self, good: bool) {
        self.good = good;
    }

    /// When what was touched may be read, if nothing more is heard of it.
    pub fn due_at(&self) -> Option<Time> {
        let (first, last) = self.touched?;
        Some((last + QUIET).min(first + PATIENCE))
    }

    /// True once for each change.
    pub fn is_due(&mut self, now: Time) -> bool {
        let due = self.due_at().is_some_and(|at| at <= now);
        if due {
            self.touched = None;
        }
        due
    }

    /// Nothing has changed, for all we know; but what was read could not be used, and this is a look.
    pub fn tries_again(&self, now: Time) -> bool {
        !self.good && self.looked_at == now && self.touched.is_none()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn at(millis: u64) -> Time {
        Time::from_millis(millis)
    }

    fn print(size: u64) -> Option<Print> {
        Some(Print {
            device: 1,
            inode: 2,
            changed_s: 3,
            changed_ns: 4,
            size,
        })
    }

    #[test]
    fn strokes_that_follow_each_other_are_one_edit() {
        let mut decide = Decide::new(at(0));
        for stroke in [10, 40, 85] {
            decide.touched(at(stroke));
            assert!(!decide.is_due(at(stroke + 20)));
        }
        assert_eq!(decide.due_at(), Some(at(135)));
        assert!(!decide.is_due(at(134)));
        assert!(decide.is_due(at(135)));
        assert!(!decide.is_due(at(135)), "once");
    }

    #[test]
    fn a_writer_without_pause_is_read_in_between() {
        let mut decide = Decide::new(at(0));
        let mut read = Vec::new();
        for now in (0..2_500).step_by(25) {
            decide.touched(at(now));
            if decide.is_due(at(now)) {
                read.push(now);
            }
        }
        assert_eq!(read, [1_000, 2_025]);
    }

    #[test]
    fn a_look_sees_what_was_not_heard() {
        let mut decide = Decide::new(at(0));
        decide.know(vec![print(5), None]);
        assert!(!decide.is_look_due(at(999)));
        assert!(decide.is_look_due(at(1_000)));
        decide.looked(at(1_000), vec![print(5), None]);
        assert!(!decide.is_due(at(1_500)), "nothing has changed");
        decide.looked(at(2_000), vec![print(6), None]);
        assert!(!decide.is_due(at(2_000)), "it may still be being written");
        assert!(decide.is_due(at(2_050)));
        decide.looked(at(3_000), vec![print(6), print(1)]);
        assert!(decide.is_due(at(3_100)), "a file that was missing is there");
        decide.looked(at(4_000), vec![print(6), None]);
        assert!(decide.is_due(at(4_100)), "or has gone again");
    }

    #[test]
    fn what_could_not_be_used_is_tried_again_at_each_look() {
        let mut decide = Decide::new(at(0));
        decide.settled(false);
        decide.looked(at(1_000), vec![]);
        assert!(decide.tries_again(at(1_000)) && !decide.is_due(at(1_000)));
        assert!(!decide.tries_again(at(1_050)));
        decide.looked(at(2_000), vec![]);
        assert!(decide.tries_again(at(2_000)));
        decide.settled(true);
        decide.looked(at(3_000), vec![]);
        assert!(!decide.tries_again(at(3_000)));
    }
}
