//! The loop without a system behind it: what callbacks and desk bring, and what is made of it.

use super::*;
use crate::ports::What;

const KEYS: End = End::Keyboard(0);
const ON: [u8; 3] = [0x90, 60, 100];

fn midir() -> (Midir, Ends) {
    Midir::new(2, 1, Clock::start())
}

/// What one turn would find.
fn arrived(midir: &mut Midir) -> Vec<String> {
    assert!(midir.read(Time::START));
    let arrived = midir.inbox.sorted().map(|(_, what)| match what {
        What::Midi { keyboard, bytes } => format!("{keyboard}: {bytes:02x?}"),
        other => format!("{other:?}"),
    });
    let arrived = arrived.collect();
    midir.inbox.clear();
    arrived
}

#[test]
fn a_connection_that_is_closed_is_not_heard_any_more() {
    let (mut midir, mut ends) = midir();
    let note = "0: [90, 3c, 64]";
    ends.feed.take(0, 1, &ON);
    assert_eq!(arrived(&mut midir), [""; 0], "never joined");
    ends.done.push(Done::Joined(KEYS, 2)).unwrap();
    ends.feed.take(0, 2, &ON);
    let seat = "Seat { keyboard: 0, plays_as: 0 }";
    assert_eq!(arrived(&mut midir), [seat, note]);
    // Its callback came once more, after the desk had given it up.
    ends.done.push(Done::Left(KEYS, 2)).unwrap();
    ends.feed.take(0, 2, &ON);
    assert_eq!(arrived(&mut midir), ["KeyboardLost { keyboard: 0 }"]);
    assert_eq!(arrived(&mut midir), [""; 0]);
}

#[test]
fn two_devices_of_one_keyboard_have_hands_of_their_own() {
    let (mut midir, mut ends) = midir();
    for connection in [1, 2] {
        ends.done.push(Done::Joined(KEYS, connection)).unwrap();
    }
    arrived(&mut midir);
    ends.feed.take(0, 1, &ON);
    ends.feed.take(0, 2, &ON);
    let notes = ["0: [90, 3c, 64]", "7: [90, 3c, 64]"];
    assert_eq!(arrived(&mut midir), notes);
    ends.done.push(Done::Left(KEYS, 2)).unwrap();
    assert_eq!(arrived(&mut midir), ["KeyboardLost { keyboard: 7 }"]);
}

#[test]
fn what_does_not_fit_is_counted_and_every_key_let_go() {
    let (mut midir, mut ends) = midir();
    ends.done.push(Done::Joined(KEYS, 1)).unwrap();
    for _ in 0..FEED_MESSAGES + 10 {
        ends.feed.take(0, 1, &ON);
    }
    let mut heard = 0;
    loop {
        let all = midir.read(Time::START);
        let last = midir.inbox.sorted().last();
        let let_go = matches!(last, Some((_, What::Seat { keyboard: 0, .. })));
        heard += midir.inbox.sorted().count();
        assert_eq!(let_go, all, "only once all that came before is heard");
        midir.inbox.clear();
        if all {
            break;
        }
    }
    // With the seat taken, and taken anew.
    assert_eq!(heard, FEED_MESSAGES + 2);
    assert_eq!(midir.tally.overruns.load(Ordering::Relaxed), 1);
    assert_eq!(arrived(&mut midir), [""; 0], "once");
}

#[test]
fn a_ring_ends_a_sleep_that_has_not_begun() {
    let (midir, ends) = midir();
    midir.waker.0.get_or_init(std::thread::current);
    ends.feed.waker.ring();
    std::thread::park(); // for ever, if the ring were lost
}
