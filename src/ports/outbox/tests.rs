//! The outbox before a port that is full whenever the script says so.

use super::*;

/// A port that takes so many messages and then is full.
struct Port {
    takes: usize,
    heard: Vec<Vec<u8>>,
}

impl Port {
    fn full() -> Port {
        Port {
            takes: 0,
            heard: Vec::new(),
        }
    }

    fn write(&mut self, bytes: &[u8]) -> usize {
        let mut rest = bytes;
        let mut taken = 0;
        while let Some((message, more)) = cut(rest) {
            if self.takes == 0 {
                break;
            }
            self.takes -= 1;
            self.heard.push(message.to_vec());
            taken += message.len();
            rest = more;
        }
        taken
    }
}

struct Rig {
    outbox: Outbox,
    port: Port,
}

impl Rig {
    fn new() -> Rig {
        Rig {
            outbox: Outbox::new(),
            port: Port::full(),
        }
    }

    fn push(&mut self, weight: Weight, bytes: &[u8]) -> &mut Rig {
        let port = &mut self.port;
        self.outbox
            .push(weight, bytes, &mut |bytes| port.write(bytes));
        self
    }

    /// Lets so many messages pass and gives what was heard.
    fn open(&mut self, takes: usize) -> Vec<Vec<u8>> {
        let port = &mut self.port;
        port.takes = takes;
        self.outbox.flush(&mut |bytes| port.write(bytes));
        port.takes = 0;
        std::mem::take(&mut port.heard)
    }
}

const BEND_1: [u8; 3] = [0xE0, 0, 0x41];
const ON_1: [u8; 3] = [0x90, 60, 100];
const OFF_1: [u8; 3] = [0x80, 60, 64];
const OFF_2: [u8; 3] = [0x81, 60, 64];
const OFF_3: [u8; 3] = [0x82, 60, 64];

fn note_1() -> Vec<u8> {
    [BEND_1, ON_1].concat()
}

#[test]
fn an_open_port_gets_everything_at_once() {
    let mut rig = Rig::new();
    rig.port.takes = usize::MAX;
    rig.push(Weight::Note, &note_1()).push(Weight::Owed, &OFF_1);
    assert_eq!(rig.port.heard, [BEND_1, ON_1, OFF_1]);
    assert!(rig.outbox.is_empty());
}

#[test]
fn owed_goes_first_but_never_before_its_own_note() {
    let mut rig = Rig::new();
    rig.push(Weight::Note, &note_1())
        .push(Weight::Through, &[0xF0, 1, 0xF7])
        .push(Weight::Owed, &OFF_1);
    // The sysex may mean any channel: nothing passes it.
    assert_eq!(rig.open(1), [BEND_1]);
    assert_eq!(rig.open(9), [&ON_1[..], &[0xF0, 1, 0xF7], &OFF_1]);

    let mut rig = Rig::new();
    rig.push(Weight::Note, &note_1())
        .push(Weight::Control, &[0xB3, 11, 5])
        .push(Weight::Owed, &OFF_1)
        .push(Weight::Owed, &OFF_2)
        .push(Weight::Owed, &OFF_3);
    assert_eq!(rig.open(2), [OFF_2, OFF_3]);
    assert_eq!(rig.open(9), [&BEND_1[..], &ON_1, &[0xB3, 11, 5], &OFF_1]);
}

#[test]
fn a_bundle_that_has_begun_is_finished_before_anything_else() {
    let mut rig = Rig::new();
    rig.port.takes = 1;
    rig.push(Weight::Note, &note_1());
    assert_eq!(std::mem::take(&mut rig.port.heard), [BEND_1]);
    rig.push(Weight::Owed, &OFF_2);
    assert_eq!(rig.open(1), [ON_1]);
    assert_eq!(rig.open(1), [OFF_2]);

    // Also one that was cut while it waited.
    rig.push(Weight::Note, &note_1());
    rig.open(1);
    rig.push(Weight::Owed, &OFF_2);
    assert_eq!(rig.open(9), [ON_1, OFF_2]);
}

#[test]
fn of_a_controller_the_newest_value_is_kept() {
    let mut rig = Rig::new();
    rig.push(Weight::Control, &[0xB0, 1, 10])
        .push(Weight::Control, &[0xB0, 11, 20])
        .push(Weight::Control, &[0xB0, 1, 30])
        .push(Weight::Control, &[0xB1, 1, 40])
        .push(Weight::Control, &[0xD0, 50])
        .push(Weight::Control, &[0xD0, 60]);
    assert_eq!(
        rig.open(9),
        [
            &[0xB0, 1, 30][..],
            &[0xB0, 11, 20],
            &[0xB1, 1, 40],
            &[0xD0, 60]
        ]
    );
    // A pedal that went down and up has done two things.
    rig.push(Weight::Control, &[0xB0, 64, 127])
        .push(Weight::Control, &[0xB0, 64, 0]);
    assert_eq!(rig.open(9), [[0xB0, 64, 127], [0xB0, 64, 0]]);
}

#[test]
fn a_bend_is_not_replaced_across_a_note() {
    let mut rig = Rig::new();
    rig.push(Weight::Control, &[0xE0, 0, 0x50])
        .push(Weight::Note, &ON_1)
        .push(Weight::Control, &[0xE0, 0, 0x60])
        .push(Weight::Control, &[0xE0, 0, 0x61]);
    assert_eq!(rig.open(9), [[0xE0, 0, 0x50], ON_1, [0xE0, 0, 0x61]]);
}

#[test]
fn notes_and_controls_leave_room_for_what_is_owed() {
    let mut rig = Rig::new();
    let mut pushed = 0;
    while rig.outbox.room_news().is_none() {
        rig.push(Weight::Note, &note_1());
        pushed += 1;
    }
    assert_eq!(rig.outbox.room, Room::Tight);
    assert_eq!(rig.outbox.dropped(), 0);
    // Even an engine that does not listen cannot fill it.
    for _ in 0..2 * WAITING_ITEMS {
        rig.push(Weight::Note, &note_1());
        rig.push(Weight::Through, &[0xC0, 5]);
    }
    assert!(rig.outbox.dropped() > 0);
    let dropped = rig.outbox.dropped();
    for _ in 0..OWED_ITEMS {
        rig.push(Weight::Owed, &OFF_1);
    }
    assert_eq!(rig.outbox.dropped(), dropped, "everything owed found room");
    let heard = rig.open(usize::MAX);
    let offs = heard.iter().filter(|m| m[..] == OFF_1).count();
    let ons = heard.iter().filter(|m| m[..] == ON_1).count();
    let bends = heard.iter().filter(|m| m[..] == BEND_1).count();
    assert_eq!(offs, OWED_ITEMS);
    assert!(ons >= pushed && ons == bends, "bundles whole or not at all");
    assert_eq!(rig.outbox.room_news(), Some(Room::Easy));
}

#[test]
fn a_port_that_takes_nothing_for_ever_is_given_up() {
    let mut rig = Rig::new();
    for _ in 0..=WAITING_ITEMS {
        rig.push(Weight::Owed, &OFF_1);
    }
    let news: Vec<_> = std::iter::from_fn(|| rig.outbox.room_news()).collect();
    assert_eq!(news, [Room::None]);
    assert!(rig.open(9).is_empty());
    rig.push(Weight::Owed, &OFF_1);
    assert!(
        rig.open(9).is_empty(),
        "nothing is taken until it is forgotten"
    );
    rig.outbox.forget();
    rig.push(Weight::Owed, &OFF_1);
    assert_eq!(rig.open(9), [OFF_1]);
}

#[test]
fn long_trouble_loses_no_owed_message_and_no_order() {
    // A port that takes a little now and then, for a long time: memory is used again, order holds on each channel.
    let mut rig = Rig::new();
    let mut seed = 1u32;
    let mut random = move || {
        seed = seed.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
        seed >> 16
    };
    let mut sent = vec![Vec::new(); 16];
    let mut heard = vec![Vec::new(); 16];
    for step in 0..60_000u32 {
        let channel = (random() % 16) as u8;
        let number = (step % 128) as u8;
        let (weight, bytes) = match random() % 3 {
            0 => (
                Weight::Owed,
                [0x80 | channel, number, (step >> 7 & 0x7F) as u8],
            ),
            1 => (
                Weight::Note,
                [0x90 | channel, number, (step >> 7 & 0x7F) as u8],
            ),
            _ => (Weight::Through, [0xB0 | channel, 64, number]),
        };
        let dropped = rig.outbox.dropped();
        rig.push(weight, &bytes);
        if rig.outbox.dropped() == dropped {
            sent[channel as usize].push(bytes.to_vec());
        } else {
            assert_ne!(weight, Weight::Owed);
        }
        if step % 40 == 0 {
            for message in rig.open((random() % 80) as usize) {
                heard[(message[0] & 15) as usize].push(message);
            }
        }
    }
    for message in rig.open(usize::MAX) {
        heard[(message[0] & 15) as usize].push(message);
    }
    assert_eq!(sent, heard);
}

/// A port that throws away what it has not read when it runs over, as a sequencer's queue does.
impl Wire for Port {
    fn write(&mut self, _synth: usize, bytes: &[u8]) -> usize {
        Port::write(self, bytes)
    }

    fn loses_when_full(&self) -> bool {
        true
    }
}

#[test]
fn a_port_that_loses_when_full_begins_anew() {
    let mut outboxes = outboxes(1);
    let mut port = Port::full();
    let mut outlet = Outlet {
        outboxes: &mut outboxes,
        wire: &mut port,
    };
    outlet.send(0, Weight::Note, &note_1());
    outlet.send(0, Weight::Owed, &OFF_2);
    outlet.retry();
    assert!(outlet.is_waiting());
    assert_eq!(outlet.room_news(0), None, "still full: nobody knows yet");

    port.takes = 1;
    let mut outlet = Outlet {
        outboxes: &mut outboxes,
        wire: &mut port,
    };
    outlet.retry();
    assert_eq!(outlet.room_news(0), Some(Room::Emptied));
    outlet.send(0, Weight::Owed, &OFF_2);
    assert!(!outlet.is_waiting());
    outlet.forget(0);
    let probe: [&[u8]; 1] = [&PROBE];
    assert_eq!(port.heard, probe, "what waited is of no use any more");
    port.takes = 9;
    port.heard.clear();
    let mut outlet = Outlet {
        outboxes: &mut outboxes,
        wire: &mut port,
    };
    outlet.send(0, Weight::Note, &note_1());
    assert_eq!(port.heard, [BEND_1, ON_1]);
}
