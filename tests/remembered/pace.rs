//! When it is written, in simulated time.

use crate::support::dice::Dice;
use trued::daemon::remember::pace::{AGAIN, Pace};
use trued::time::{Span, Time};

const LOOK: Span = Span::from_millis(50);
const SECOND: Span = Span::from_millis(1_000);
const LATEST: Span = Span::from_millis(1_500);

/// Begins of writings, each with what was written.
fn run(
    seconds: u64,
    write: Span,
    mut want: impl FnMut(Time) -> u64,
    well: impl Fn(Time) -> bool,
) -> Vec<(Time, u64)> {
    let mut pace = Pace::new(Some(0));
    let mut out = Vec::new();
    let mut busy_until = None;
    let mut now = Time::START;
    while now < Time::from_millis(seconds * 1_000) {
        now = now + LOOK;
        pace.want(now, &want(now));
        if busy_until.is_some_and(|until| now >= until) {
            busy_until = None;
            pace.done(now, well(now));
        }
        if let Some(value) = pace.due(now) {
            assert!(busy_until.is_none(), "one at a time");
            out.push((now, value));
            busy_until = Some(now + write);
        }
    }
    out
}

#[test]
fn a_storm_of_nudges_is_written_once_a_second_and_its_end_soon_after() {
    let end = Time::from_millis(20_000);
    let storm = |now: Time| now.min(end).nanos();
    let written = run(30, Span::from_millis(10), storm, |_| true);
    for pair in written.windows(2) {
        assert!(pair[1].0.since(pair[0].0) >= SECOND, "{pair:?}");
    }
    let (at, last) = written[written.len() - 1];
    assert_eq!(last, end.nanos());
    assert!(at.since(end) <= LATEST, "{at:?}");
    assert!(
        (20..=21).contains(&written.len()),
        "the storm did not hold it up: {written:?}"
    );
}

#[test]
fn whatever_changes_there_are_never_two_writings_within_a_second_nor_one_for_nothing() {
    for seed in 0..200 {
        let mut dice = Dice::new(seed);
        let write = Span::from_millis(dice.below(2_000));
        let often = dice.between(1, 60);
        let mut value = 0;
        let want = |_| {
            // Few values, so that it is often back at what it was.
            if dice.percent(often) {
                value = dice.below(4);
            }
            value
        };
        let written = run(60, write, want, |_| true);
        assert!(!written.is_empty(), "seed {seed}");
        for pair in written.windows(2) {
            assert!(
                pair[1].0.since(pair[0].0) >= SECOND,
                "seed {seed}: {pair:?}"
            );
            assert_ne!(pair[0].1, pair[1].1, "seed {seed}: written for nothing");
        }
    }
}

#[test]
fn one_change_is_one_writing_a_moment_later() {
    let change = Time::from_millis(5_000);
    let written = run(60, SECOND, |now| u64::from(now >= change), |_| true);
    assert_eq!(written.len(), 1);
    assert!(written[0].0 > change && written[0].0.since(change) <= Span::from_millis(300));
    // What is taken back before it was written is not written at all.
    let while_it_lasts = |now: Time| u64::from(now >= change && now < change + LOOK + LOOK);
    assert_eq!(run(60, SECOND, while_it_lasts, |_| true), []);
}

#[test]
fn what_failed_is_tried_again_later_with_the_newest() {
    let works_at = Time::from_millis(70_000);
    let want = |now: Time| 1 + now.nanos() / SECOND.nanos() / 10;
    let written = run(200, LOOK, want, |now| now >= works_at);
    let failed: Vec<_> = written
        .iter()
        .take_while(|(at, _)| *at < works_at)
        .collect();
    assert_eq!(failed.len(), 3, "{written:?}");
    for pair in failed.windows(2) {
        assert!(pair[1].0.since(pair[0].0) >= AGAIN);
    }
    for (at, value) in &written {
        // A writing begins up to a moment after the change it is for.
        assert!(want(*at).abs_diff(*value) <= 1, "{at:?} {value}");
    }
    assert!(written.len() > failed.len() + 5, "each later change");
}

#[test]
fn at_the_end_the_newest_is_written_whatever_the_time() {
    let mut pace = Pace::new(None);
    let at = Time::from_millis(100);
    assert_eq!(pace.take(at), None);
    pace.want(at, &1);
    assert_eq!(pace.due(at), None, "not yet");
    assert_eq!(pace.take(at), Some(1));
    pace.want(at, &2);
    assert_eq!(pace.take(at), None, "one at a time");
    pace.done(at, true);
    assert_eq!(pace.take(at), Some(2));
    pace.done(at, false);
    assert_eq!(pace.take(at), Some(2), "it failed");
    pace.done(at, true);
    assert_eq!(pace.take(at), None, "all is there");
}
