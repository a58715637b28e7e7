//! Comings and goings as the system tells them, and what is made of them.

use super::*;

const OURS: i32 = 128;
const A: Address = address(20, 0);
const B: Address = address(24, 0);
const B2: Address = address(24, 1);
const C: Address = address(28, 0);
const THROUGH_PORT: Address = address(THROUGH, 0);

const fn address(client: i32, port: i32) -> Address {
    Address { client, port }
}

fn lost(seat: usize) -> Change {
    Change::KeyboardLost { seat }
}

fn seat(seat: usize, keyboard: usize) -> Change {
    Change::Seat { seat, keyboard }
}

fn run(hotplug: &mut Hotplug, notices: &[Notice]) -> Vec<Change> {
    let mut changes = Vec::new();
    for notice in notices {
        hotplug.handle(*notice, &mut |change| changes.push(change));
    }
    changes
}

/// The seat from which a port is heard, and what that causes.
fn hear(hotplug: &mut Hotplug, keyboard: usize, peer: Address) -> (Option<usize>, Vec<Change>) {
    let mut changes = Vec::new();
    let seat = hotplug.seat(keyboard, peer, &mut |change| changes.push(change));
    (seat, changes)
}

#[test]
fn a_keyboard_goes_once_however_often_it_is_said() {
    let mut hotplug = Hotplug::new(OURS, 2, 1);
    let keys = End::Keyboard(1);
    let changes = run(
        &mut hotplug,
        &[
            Notice::Joined(keys, A),
            Notice::Joined(keys, A),
            Notice::Left(keys, A),
            Notice::Left(keys, A),
            Notice::PortGone(A),
            Notice::ClientGone(A.client),
        ],
    );
    assert_eq!(changes, [seat(1, 1), lost(1)]);
    let again = [Notice::Joined(keys, A), Notice::ClientGone(A.client)];
    assert_eq!(run(&mut hotplug, &again), [seat(1, 1), lost(1)]);
}

#[test]
fn several_devices_of_one_keyboard_have_seats_of_their_own() {
    let mut hotplug = Hotplug::new(OURS, 2, 1);
    let keys = End::Keyboard(0);
    let joined = [A, B, B2].map(|peer| Notice::Joined(keys, peer));
    assert_eq!(
        run(&mut hotplug, &joined),
        [seat(0, 0), seat(7, 0), seat(6, 0)]
    );
    assert_eq!(hear(&mut hotplug, 0, A), (Some(0), vec![]));
    assert_eq!(hear(&mut hotplug, 0, B2), (Some(6), vec![]));
    assert_eq!(run(&mut hotplug, &[Notice::PortGone(B)]), [lost(7)]);
    // One device can play as two keyboards, told apart by channel.
    let second = [Notice::Joined(End::Keyboard(1), A)];
    assert_eq!(run(&mut hotplug, &second), [seat(1, 1)]);
    assert_eq!(
        run(&mut hotplug, &[Notice::ClientGone(A.client)]),
        [lost(0), lost(1)]
    );
    // The keyboard's own seat is free again and is the first to be taken.
    assert_eq!(run(&mut hotplug, &[Notice::Joined(keys, B)]), [seat(0, 0)]);
}

#[test]
fn when_seats_run_out_one_is_shared_and_let_go_as_one() {
    let mut hotplug = Hotplug::new(OURS, 1, 0);
    for client in 0..KEYBOARDS_MAX as i32 {
        let joined = Notice::Joined(End::Keyboard(0), address(20 + client, 0));
        assert_eq!(run(&mut hotplug, &[joined]).len(), 1);
    }
    let late = address(90, 0);
    assert_eq!(
        run(&mut hotplug, &[Notice::Joined(End::Keyboard(0), late)]),
        []
    );
    assert_eq!(hear(&mut hotplug, 0, late), (Some(0), vec![]));
    assert_eq!(run(&mut hotplug, &[Notice::PortGone(late)]), [lost(0)]);
}

#[test]
fn who_sends_without_having_joined_sits_down_and_its_going_is_noticed() {
    let mut hotplug = Hotplug::new(OURS, 1, 1);
    assert_eq!(hear(&mut hotplug, 0, A), (Some(0), vec![seat(0, 0)]));
    assert_eq!(hear(&mut hotplug, 0, A), (Some(0), vec![]));
    assert_eq!(
        run(&mut hotplug, &[Notice::ClientGone(A.client)]),
        [lost(0)]
    );
}

#[test]
fn a_synth_is_up_at_the_start_and_back_later() {
    let mut hotplug = Hotplug::new(OURS, 1, 1);
    let organ = End::Synth(0);
    let twice = [Notice::Joined(organ, A), Notice::Joined(organ, A)];
    assert_eq!(run(&mut hotplug, &twice), [Change::Synth(0, Link::Up)]);
    hotplug.settle();
    assert_eq!(
        run(
            &mut hotplug,
            &[Notice::PortGone(A), Notice::Joined(organ, A)]
        ),
        [Change::Synth(0, Link::Down), Change::Synth(0, Link::Back)]
    );
    assert_eq!(hotplug.hearing(0), [A]);
}

#[test]
fn a_synth_port_is_down_when_the_last_hearer_goes() {
    let mut hotplug = Hotplug::new(OURS, 0, 1);
    let organ = End::Synth(0);
    hotplug.settle();
    assert_eq!(
        run(
            &mut hotplug,
            &[
                Notice::Joined(organ, A),
                Notice::Joined(organ, B),
                Notice::Joined(organ, B2),
                Notice::PortGone(A),
            ]
        ),
        [Change::Synth(0, Link::Back); 3]
    );
    assert_eq!(
        run(&mut hotplug, &[Notice::ClientGone(24)]),
        [Change::Synth(0, Link::Down)]
    );
}

#[test]
fn strangers_are_nobodys_business() {
    let mut hotplug = Hotplug::new(OURS, 1, 1);
    let notices = [
        Notice::PortGone(A),
        Notice::ClientGone(9),
        Notice::Joined(End::Synth(7), A),
        Notice::Joined(End::Keyboard(7), A),
        Notice::Left(End::Keyboard(7), A),
    ];
    assert_eq!(run(&mut hotplug, &notices), []);
}

#[test]
fn our_own_sound_is_not_heard() {
    let mut hotplug = Hotplug::new(OURS, 1, 1);
    let own = address(OURS, 1);
    let round = Change::Loop { keyboard: 0 };
    let direct = [
        Notice::Joined(End::Synth(0), address(OURS, 0)),
        Notice::Joined(End::Keyboard(0), own),
    ];
    assert_eq!(run(&mut hotplug, &direct), [round]);
    assert_eq!(hear(&mut hotplug, 0, own), (None, vec![round]));
}

#[test]
fn midi_through_is_heard_until_we_play_into_it() {
    let mut hotplug = Hotplug::new(OURS, 1, 1);
    let keys = End::Keyboard(0);
    let organ = End::Synth(0);
    assert_eq!(
        run(&mut hotplug, &[Notice::Joined(keys, THROUGH_PORT)]),
        [seat(0, 0)]
    );
    // Another of its ports may be the first one's other side.
    let fed = [Notice::Joined(organ, address(THROUGH, 1))];
    let round = Change::Loop { keyboard: 0 };
    assert_eq!(
        run(&mut hotplug, &fed),
        [Change::Synth(0, Link::Up), lost(0), round]
    );
    assert_eq!(hear(&mut hotplug, 0, THROUGH_PORT), (None, vec![round]));
    assert_eq!(hear(&mut hotplug, 0, A), (Some(0), vec![seat(0, 0)]));
    run(&mut hotplug, &[Notice::Left(organ, address(THROUGH, 1))]);
    assert_eq!(
        hear(&mut hotplug, 0, THROUGH_PORT),
        (Some(7), vec![seat(7, 0)])
    );
}

#[test]
fn after_lost_notices_the_truth_is_agreed_on() {
    let mut hotplug = Hotplug::new(OURS, 1, 2);
    let (keys, organ, bells) = (End::Keyboard(0), End::Synth(0), End::Synth(1));
    let before = [
        Notice::Joined(keys, A),
        Notice::Joined(keys, B),
        Notice::Joined(organ, A),
    ];
    run(&mut hotplug, &before);
    hotplug.settle();
    let mut changes = Vec::new();
    let mut tell = |change| changes.push(change);
    hotplug.let_all_go(&mut tell);
    hotplug.agree(keys, &[B, C], &mut tell);
    hotplug.agree(organ, &[], &mut tell);
    hotplug.agree(bells, &[C], &mut tell);
    assert_eq!(
        changes,
        [
            seat(0, 0),
            seat(7, 0),
            lost(0),
            seat(0, 0),
            Change::Synth(0, Link::Down),
            Change::Synth(1, Link::Back),
        ]
    );
}

#[test]
fn in_another_rig_what_stays_does_not_notice() {
    let mut hotplug = Hotplug::new(OURS, 2, 2);
    let (keys, pads) = (End::Keyboard(0), End::Keyboard(1));
    let (organ, bells) = (End::Synth(0), End::Synth(1));
    run(
        &mut hotplug,
        &[
            Notice::Joined(keys, A),
            Notice::Joined(keys, B),
            Notice::Joined(pads, C),
            Notice::Joined(organ, A),
            Notice::Joined(bells, B),
        ],
    );
    let renewed = |from, same| Renewed {
        name: String::new(),
        from,
        same,
    };
    let mut changes = Vec::new();
    // The pads are gone, and the keys have a new one behind them; the bells come first now, then the organ, then another.
    let keyboards = [renewed(Some(0), true), renewed(None, false)];
    let synths = [
        renewed(Some(1), false),
        renewed(Some(0), false),
        renewed(None, false),
    ];
    hotplug.rearrange(&keyboards, &synths, &mut |change| changes.push(change));
    let back = |synth| Change::Synth(synth, Link::Back);
    assert_eq!(changes, [back(0), back(1)]);
    assert_eq!(hear(&mut hotplug, 0, B), (Some(7), vec![]));
    assert_eq!(hear(&mut hotplug, 1, C), (Some(1), vec![seat(1, 1)]));
    let gone = [Notice::PortGone(B), Notice::PortGone(A)];
    assert_eq!(
        run(&mut hotplug, &gone),
        [
            lost(7),
            Change::Synth(0, Link::Down),
            lost(0),
            Change::Synth(1, Link::Down)
        ]
    );
}

#[test]
fn a_seat_that_a_new_keyboard_needs_is_given_up() {
    let mut hotplug = Hotplug::new(OURS, 1, 0);
    let keys = End::Keyboard(0);
    run(
        &mut hotplug,
        &[Notice::Joined(keys, A), Notice::Joined(keys, B)],
    );
    let keyboards: Vec<Renewed> = (0..KEYBOARDS_MAX)
        .map(|place| Renewed {
            name: String::new(),
            from: (place == 0).then_some(0),
            same: place == 0,
        })
        .collect();
    let mut changes = Vec::new();
    hotplug.rearrange(&keyboards, &[], &mut |change| changes.push(change));
    // All seats are taken by keyboards now, so that the second device shares the first one's.
    assert_eq!(changes, [lost(7)]);
    assert_eq!(hear(&mut hotplug, 0, B), (Some(0), vec![]));
    assert_eq!(hear(&mut hotplug, 7, C), (Some(7), vec![seat(7, 7)]));
}
