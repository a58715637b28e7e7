//! The plug is pulled at a thousand random steps of the writing, each time on the disk that the last time left behind.

use super::disk::{FakeDisk, Honesty};
use super::{evening, state};
use crate::support::dice::Dice;
use trued::daemon::remember::disk::{Disk, forget, replace};
use trued::daemon::remember::pace::Pace;
use trued::daemon::remember::record::{Found, State, decode, encode};
use trued::limits::REMEMBERED_BYTES_MAX;
use trued::time::{Span, Time};

const PULLS: usize = 1_000;
const NAME: &str = "remembered";
/// What a player changes is on the disk so long after at the latest, where a writing takes no longer than `WRITE_MS`.
const LATEST: Span = Span::from_millis(1_500);
const WRITE_MS: u64 = 200;
/// How often the desk looks.
const LOOK_MS: u64 = 50;

/// How a thousand pulls ended.
#[derive(Debug, Default, PartialEq, Eq)]
struct Tally {
    /// What was being written, or had been written last.
    last: usize,
    /// The one before.
    before: usize,
    damaged: usize,
    /// Older, or nothing at all although something had been written.
    older: usize,
    /// A change that a player made longer ago than `LATEST` is lost.
    late: usize,
}

/// One run of a daemon on a disk, from what it finds to the pull of the plug.
struct Run<'a> {
    disk: &'a FakeDisk,
    dice: &'a mut Dice,
    pace: Pace<Vec<u8>>,
    /// The states that were in force, each since when; the first is the one found.
    history: Vec<(Time, State)>,
    /// The last two that a writing began with; only the last once that is done.
    given: [Option<State>; 2],
}

impl Run<'_> {
    /// Plays until the power goes, in the middle of a writing or after one; gives when that was.
    fn until_the_plug(&mut self, next: &mut u64) -> Time {
        let mut now = Time::START;
        let mut busy_until: Option<Time> = None;
        while !self.disk.is_dead() {
            now = now + Span::from_millis(LOOK_MS);
            if self.dice.percent(20) {
                *next += 1;
                self.history.push((now, state(*next)));
            }
            let current = &self.history[self.history.len() - 1].1;
            self.pace.want(now, &encode(&evening(), current));
            if busy_until.is_some_and(|until| now >= until) {
                busy_until = None;
                self.pace.done(now, true);
            }
            if let Some(bytes) = self.pace.due(now) {
                let Found::Good(_, state) = decode(&bytes) else {
                    panic!("what is to be written is damaged");
                };
                self.given.rotate_left(1);
                self.given[1] = Some(state);
                let took = Span::from_millis(self.dice.below(WRITE_MS));
                if replace(self.disk, NAME, &bytes).is_err() {
                    assert!(self.disk.is_dead(), "it fails only without power");
                    return now + took;
                }
                busy_until = Some(now + took);
                if self.dice.percent(5) {
                    self.given[0] = None;
                    return now + took;
                }
            }
        }
        now
    }

    /// The newest moment at which things stood so.
    fn in_force_until(&self, state: &State, end: Time) -> Time {
        let at = self.history.iter().rposition(|(_, known)| known == state);
        let at = at.expect("a state of this run");
        self.history.get(at + 1).map_or(end, |(since, _)| *since)
    }
}

fn pull(honesty: Honesty) -> Tally {
    let mut dice = Dice::new(5);
    let mut disk = FakeDisk::new(honesty);
    let mut found: Option<State> = None;
    let mut tally = Tally::default();
    let mut next = 0;
    for _ in 0..PULLS {
        disk.pull_after(1 + dice.below(60));
        let first = found.clone().unwrap_or_else(|| state(0));
        let kept = found.as_ref().map(|state| encode(&evening(), state));
        let mut run = Run {
            disk: &disk,
            dice: &mut dice,
            pace: Pace::new(kept),
            history: vec![(Time::START, first)],
            given: [None, found.take()],
        };
        let end = run.until_the_plug(&mut next);
        let after = disk.restarted(run.dice);
        match after
            .read(NAME, REMEMBERED_BYTES_MAX)
            .map(|bytes| decode(&bytes))
        {
            Ok(Found::Good(of, state)) => {
                assert_eq!(of, evening());
                let [before, last] = &run.given;
                let is_last = last.as_ref() == Some(&state);
                if is_last || before.as_ref() == Some(&state) {
                    tally.last += usize::from(is_last);
                    tally.before += usize::from(!is_last);
                    let lost = end.since(run.in_force_until(&state, end));
                    tally.late += usize::from(lost > LATEST);
                } else {
                    tally.older += 1;
                }
                found = Some(state);
            }
            Ok(_) => tally.damaged += 1,
            // Nothing is right only where nothing had been there before this writing.
            Err(_) if run.given[0].is_none() => tally.before += 1,
            Err(_) => tally.older += 1,
        }
        disk = after;
    }
    tally
}

#[test]
fn a_thousand_pulled_plugs_leave_the_last_state_or_the_one_before() {
    let tally = pull(Honesty::Honest);
    println!("{PULLS} pulled plugs: {tally:?}");
    assert_eq!((tally.damaged, tally.older, tally.late), (0, 0, 0));
    assert_eq!(tally.last + tally.before, PULLS);
    // Both happen, or the plug was never pulled where it hurts.
    assert!(tally.last > 100 && tally.before > 100, "{tally:?}");
}

/// The test above would notice if a step were left out.
#[test]
fn a_disk_that_does_not_do_what_it_says_is_found_out() {
    let tally = pull(Honesty::FilesNot);
    assert!(tally.damaged > 0, "{tally:?}");
}

#[test]
fn names_that_are_not_synced_are_found_out() {
    let tally = pull(Honesty::FolderNot);
    assert!(tally.older > 0, "{tally:?}");
}

#[test]
fn what_is_forgotten_stays_forgotten() {
    let mut dice = Dice::new(6);
    for steps in 1..=2 {
        let mut came_back = 0;
        for _ in 0..100 {
            let disk = FakeDisk::new(Honesty::Honest);
            replace(&disk, NAME, &encode(&evening(), &state(7))).expect("written");
            disk.pull_after(steps);
            forget(&disk, NAME).expect_err("no power");
            let after = disk.restarted(&mut dice);
            came_back += usize::from(!after.names().is_empty());
        }
        assert!((1..100).contains(&came_back), "not done, so either may be");
    }
    for _ in 0..100 {
        let disk = FakeDisk::new(Honesty::Honest);
        replace(&disk, NAME, &encode(&evening(), &state(7))).expect("written");
        forget(&disk, NAME).expect("removed");
        assert!(disk.restarted(&mut dice).names().is_empty());
    }
}

#[test]
fn on_a_full_disk_the_old_one_stays_and_nothing_is_left_lying_about() {
    let disk = FakeDisk::new(Honesty::Honest);
    let old = encode(&evening(), &state(1));
    replace(&disk, NAME, &old).expect("room");
    for free in [0, 1, 70, old.len() - 1] {
        disk.set_free(free);
        replace(&disk, NAME, &encode(&evening(), &state(2))).expect_err("no room");
        assert_eq!(disk.names(), [NAME]);
        assert_eq!(disk.read(NAME, usize::MAX).expect("there"), old);
    }
    disk.set_free(10 * old.len());
    replace(&disk, NAME, &encode(&evening(), &state(2))).expect("room again");
    assert!(disk.steps() > 0);
    assert_eq!(
        decode(&disk.read(NAME, usize::MAX).expect("there")),
        Found::Good(evening(), state(2))
    );
}
