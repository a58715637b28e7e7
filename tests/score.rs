//! The daemon's score on simulated time and ports in memory: deadlines, stop, full ports, lost ports, a panic.

use crate::no_alloc::heap_calls;
use crate::support::dice::Dice;
use crate::support::plans;
use std::sync::Arc;
use trued::daemon::{Ending, News, Player, Score, Slot};
use trued::engine::plan::Dialect;
use trued::engine::{Command, Engine};
use trued::limits::WAITING_ITEMS;
use trued::ports::loopback::{Loopback, Sent, Step};
use trued::ports::{Backend, Cycle, Inbox, Link, Next, Outlet, Wire, outbox};
use trued::time::{Span, Time};

const UP: Step = Step::Synth {
    synth: 0,
    link: Link::Up,
};

struct Stand {
    slot: Arc<Slot>,
    commands: rtrb::Producer<Command>,
    news: rtrb::Consumer<News>,
}

fn stand() -> Stand {
    let synth = plans::synth("organ", Dialect::ChannelBend, 2);
    let third_low = plans::offsets([0.0, 0.0, 0.0, 0.0, -14.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0]);
    let plan = plans::plan(synth, vec![plans::song("Lantern hymn", third_low)]);
    let (commands, commands_out) = rtrb::RingBuffer::new(8);
    let (news_in, news) = rtrb::RingBuffer::new(64);
    let engine = Engine::new(Box::new(plan));
    Stand {
        slot: Slot::new(Score::new(engine, 1, commands_out, news_in)),
        commands,
        news,
    }
}

fn at(millis: u64) -> Time {
    Time::from_millis(millis)
}

fn midi(bytes: &[u8]) -> Step {
    Step::Midi {
        keyboard: 0,
        bytes: bytes.to_vec(),
    }
}

fn play(stand: &Stand, script: Vec<(Time, Step)>, end: Time) -> Vec<Sent> {
    let mut loopback = Loopback::new(1, script, end);
    loopback.run(&mut Player::new(stand.slot.clone())).unwrap();
    loopback.sent().to_vec()
}

/// Messages of some status, channel aside.
fn of_kind(sent: &[Sent], status: u8) -> Vec<&Sent> {
    let kind = |sent: &&Sent| sent.bytes[0] & 0xF0 == status;
    sent.iter().filter(kind).collect()
}

#[test]
fn a_synth_that_comes_is_silenced_first_and_one_that_joins_it_does_not_stop_it() {
    let stand = stand();
    let back = Step::Synth {
        synth: 0,
        link: Link::Back,
    };
    let script = vec![
        (at(1), UP),
        (at(500), midi(&[0x90, 64, 100])),
        (at(600), back),
        (at(900), midi(&[0x80, 64, 0])),
    ];
    let sent = play(&stand, script, at(1_000));
    let quiet = |sent: &Sent| {
        let [status, number, value] = sent.bytes[..] else {
            return false;
        };
        status & 0xF0 == 0xB0 && [64, 66, 120, 123].contains(&number) && value == 0
    };
    let first = sent.iter().take_while(|sent| quiet(sent)).count();
    assert_eq!(first, 16 * 4, "pedals up and silence on every channel");
    let silences = |sent: &&Sent| sent.bytes[0] & 0xF0 == 0xB0 && sent.bytes[1] >= 120;
    assert_eq!(sent[first..].iter().find(silences), None);
}

#[test]
fn a_note_goes_through_at_once_with_its_bend_before_it() {
    let stand = stand();
    let script = vec![
        (at(1), UP),
        (at(500), midi(&[0x90, 64, 100])),
        (at(900), midi(&[0x80, 64, 0])),
    ];
    let sent = play(&stand, script, at(1_000));
    let onset = sent
        .iter()
        .position(|sent| sent.bytes[0] & 0xF0 == 0x90)
        .expect("the note");
    assert_eq!(sent[onset].time, at(500));
    let channel = sent[onset].bytes[0] & 0x0F;
    // 14 cents down at range 2: 8192 - 14 / 200 * 8192, rounded, is 7619.
    let bend = [0xE0 | channel, (7619 % 128) as u8, (7619 / 128) as u8];
    assert!(sent[..onset].iter().any(|sent| sent.bytes == bend));
    assert_eq!(of_kind(&sent, 0x80)[0].time, at(900));
    assert_eq!(stand.slot.take().expect("put back").ending(), None);
}

#[test]
fn what_an_earlier_run_left_sounding_ends_before_anything_else_is_said() {
    for link in [Link::Up, Link::Back] {
        let begin = Step::Synth { synth: 0, link };
        let sent = play(&stand(), vec![(at(1), begin)], at(1_000));
        let (quiet, set_up) = sent.split_at(4 * 16);
        for channel in 0..16 {
            for number in [64, 66, 123, 120] {
                let message = [0xB0 | channel, number, 0];
                let told = quiet.iter().any(|s| s.time == at(1) && s.bytes == message);
                assert!(told, "{link:?}: controller {number}, channel {channel}");
            }
        }
        assert!(!set_up.is_empty(), "then it is set up");
    }
}

#[test]
fn stop_lets_go_waits_for_the_tail_and_leaves() {
    let mut stand = stand();
    let begin = vec![(at(1), UP), (at(10), midi(&[0x90, 64, 100]))];
    play(&stand, begin, at(20));
    stand.commands.push(Command::Stop).unwrap();
    let sent = play(&stand, vec![], at(9_000));
    assert_eq!(of_kind(&sent, 0x80).len(), 1);
    let last = sent.last().expect("the synth is left plain").time;
    assert!(last >= at(plans::TAIL_MS) && last < at(4_000), "{last:?}");
    let bends = of_kind(&sent, 0xE0);
    assert!(
        bends
            .iter()
            .all(|sent| sent.bytes[1..] == [0, 0x40] && sent.time == last)
    );
    assert!(!bends.is_empty(), "the bend of the note is centred");
    assert_eq!(stand.slot.take().unwrap().ending(), Some(Ending::Stopped));
}

#[test]
fn a_stop_does_not_wait_for_ever_for_a_port_that_is_stuck() {
    let mut stand = stand();
    let script = vec![
        (at(1), UP),
        (at(10), midi(&[0x90, 64, 100])),
        (
            at(20),
            Step::Takes {
                synth: 0,
                messages: 0,
            },
        ),
    ];
    play(&stand, script, at(30));
    stand.commands.push(Command::Stop).unwrap();
    let stuck = vec![(
        at(0),
        Step::Takes {
            synth: 0,
            messages: 0,
        },
    )];
    let sent = play(&stand, stuck, at(60_000));
    assert_eq!(sent, []);
    assert_eq!(stand.slot.take().unwrap().ending(), Some(Ending::GaveUp));
}

#[test]
fn a_full_port_loses_no_note_off() {
    let stand = stand();
    let mut script = vec![
        (at(1), UP),
        (
            at(99),
            Step::Takes {
                synth: 0,
                messages: 0,
            },
        ),
    ];
    // More notes than may wait, each struck and let go while the port is full.
    for n in 0..2 * WAITING_ITEMS as u64 {
        let key = 36 + (n % 48) as u8;
        script.push((at(100 + n), midi(&[0x90, key, 100])));
        script.push((at(100 + n), midi(&[0x80, key, 64])));
    }
    let open = at(200 + 2 * WAITING_ITEMS as u64);
    script.push((
        open,
        Step::Takes {
            synth: 0,
            messages: usize::MAX,
        },
    ));
    script.push((open + Span::from_millis(100), midi(&[0x90, 60, 100])));
    let sent = play(&stand, script, open + Span::from_millis(200));
    let mut open_notes = std::collections::BTreeMap::new();
    for sent in &sent {
        let [status, key, _] = sent.bytes[..] else {
            continue;
        };
        let note = open_notes.entry((status & 0x0F, key)).or_insert(0i32);
        match status & 0xF0 {
            0x90 => *note += 1,
            0x80 => *note -= 1,
            _ => {}
        }
    }
    let left: i32 = open_notes.values().sum();
    assert_eq!(left, 1, "only the last note is still open");
    let report = stand.slot.take().unwrap().report();
    assert!(report.counters.refused > 0, "new notes gave way");
    assert_eq!(of_kind(&sent, 0x90).len() as u64, report.counters.notes);
    assert_eq!(report.counters.overrun, 0);
}

#[test]
fn a_keyboard_that_goes_lets_go_of_its_keys() {
    let mut stand = stand();
    let script = vec![
        (at(1), UP),
        (at(10), midi(&[0x90, 64, 100, 0xB0, 64, 127])),
        (at(50), Step::KeyboardLost { keyboard: 0 }),
    ];
    let sent = play(&stand, script, at(100));
    assert_eq!(of_kind(&sent, 0x80)[0].time, at(50));
    assert!(
        of_kind(&sent, 0xB0)
            .iter()
            .any(|sent| sent.time == at(50) && sent.bytes[1..] == [64, 0])
    );
    let news: Vec<News> = std::iter::from_fn(|| stand.news.pop().ok()).collect();
    let up = News::Synth {
        synth: 0,
        link: Link::Up,
    };
    assert_eq!(news, [up, News::KeyboardLost { keyboard: 0 }]);
}

/// A wire that fails once, in the middle of a cycle.
struct Rotten {
    writes_left: usize,
    heard: Vec<Vec<u8>>,
}

impl Wire for Rotten {
    fn write(&mut self, _synth: usize, bytes: &[u8]) -> usize {
        self.writes_left = self.writes_left.wrapping_sub(1);
        assert!(self.writes_left != 0, "a made-up failure inside a cycle");
        self.heard.push(bytes.to_vec());
        bytes.len()
    }
}

#[test]
fn a_panic_inside_a_cycle_silences_every_channel_and_keeps_the_engine() {
    let stand = stand();
    let mut player = Player::new(stand.slot.clone());
    let mut wire = Rotten {
        writes_left: 0,
        heard: Vec::new(),
    };
    let mut outboxes = outbox::outboxes(1);
    let mut inbox = Inbox::new();
    let mut cycle = |at: Time, fill: &dyn Fn(&mut Inbox), wire: &mut Rotten| {
        inbox.clear();
        fill(&mut inbox);
        let mut outlet = Outlet {
            outboxes: &mut outboxes,
            wire,
        };
        player.run(at, &mut inbox, &mut outlet)
    };
    let begin = |inbox: &mut Inbox| {
        inbox.add_synth(at(1), 0, Link::Up);
        inbox.add_midi(at(1), 0, &[0x90, 64, 100]);
    };
    assert!(matches!(cycle(at(1), &begin, &mut wire), Next::Wait(_)));
    wire.heard.clear();
    wire.writes_left = 1;
    let second = |inbox: &mut Inbox| {
        inbox.add_midi(at(2), 0, &[0x90, 67, 100]);
    };
    assert_eq!(cycle(at(2), &second, &mut wire), Next::Leave);
    let all: Vec<u8> = wire.heard.concat();
    let has = |message: [u8; 3]| all.windows(3).any(|window| window == message);
    let off = |key: u8| (0..16).any(|channel| has([0x80 | channel, key, 64]));
    assert!(
        off(64),
        "the note known to be open is let go: {:02x?}",
        wire.heard
    );
    for channel in 0..16 {
        assert!(has([0xB0 | channel, 123, 0]) && has([0xB0 | channel, 120, 0]));
    }
    let score = stand.slot.take().expect("the engine has survived");
    assert_eq!(score.ending(), Some(Ending::Panicked));
}

/// A wire that carries times: when each message was meant to leave.
#[derive(Default)]
struct Timed {
    now: Time,
    sent: Vec<Time>,
}

impl Wire for Timed {
    fn write(&mut self, _synth: usize, bytes: &[u8]) -> usize {
        self.sent.push(self.now);
        bytes.len()
    }

    fn at(&mut self, time: Time) {
        self.now = self.now.max(time);
    }
}

#[test]
fn a_deadline_in_the_middle_of_a_cycle_has_its_own_time() {
    let stand = stand();
    let mut player = Player::new(stand.slot.clone());
    let (mut wire, mut inbox) = (Timed::default(), Inbox::new());
    let mut outboxes = outbox::outboxes(1);
    let mut cycle = |to: Time, inbox: &mut Inbox, wire: &mut Timed| {
        let mut outlet = Outlet {
            outboxes: &mut outboxes,
            wire,
        };
        player.run(to, inbox, &mut outlet);
        inbox.clear();
    };
    // A synth that came back is set up once more after two seconds (limits::SETTLE_MS), whether something comes in later
    // in that cycle or nothing does.
    for (back, later) in [(1, false), (3_001, true)] {
        inbox.add_synth(at(back), 0, Link::Down);
        inbox.add_synth(at(back), 0, Link::Back);
        for millis in back..back + 1_990 {
            cycle(at(millis), &mut inbox, &mut wire);
        }
        wire.sent.clear();
        if later {
            inbox.add_midi(at(back + 2_200), 0, &[0x90, 64, 100]);
        }
        cycle(at(back + 2_300), &mut inbox, &mut wire);
        assert_eq!(wire.sent.first(), Some(&at(back + 2_000)), "later: {later}");
    }
}

/// A wire that is full now and then, and keeps nothing.
struct Narrow {
    takes: usize,
    bytes: u64,
}

impl Wire for Narrow {
    fn write(&mut self, _synth: usize, bytes: &[u8]) -> usize {
        if self.takes == 0 {
            return 0;
        }
        self.takes -= 1;
        self.bytes += bytes.len() as u64;
        bytes.len()
    }
}

#[test]
fn the_score_thread_takes_nothing_from_the_heap() {
    let stand = stand();
    let mut player = Player::new(stand.slot.clone());
    let mut wire = Narrow { takes: 0, bytes: 0 };
    let mut outboxes = outbox::outboxes(1);
    let mut inbox = Inbox::new();
    let mut dice = Dice::new(3);
    let sysex = [&[0xF0][..], &[1; 3000], &[0xF7]].concat();
    let calls = heap_calls(|| {
        inbox.add_synth(at(1), 0, Link::Up);
        for cycle in 2..30_000 {
            for _ in 0..dice.below(4) {
                let key = dice.below(128) as u8;
                let keyboard = dice.below(2) as usize;
                match dice.below(100) {
                    0 => inbox.add_keyboard_lost(at(cycle), keyboard),
                    1 => inbox.add_synth(at(cycle), 0, Link::Down),
                    2 => inbox.add_synth(at(cycle), 0, Link::Back),
                    3 => assert!(inbox.add_midi(at(cycle), keyboard, &sysex)),
                    4..30 => assert!(inbox.add_midi(at(cycle), keyboard, &[0xB0, key, 90])),
                    30..65 => assert!(inbox.add_midi(at(cycle), keyboard, &[0x90, key, 90])),
                    _ => assert!(inbox.add_midi(at(cycle), keyboard, &[0x80, key, 64])),
                }
            }
            wire.takes = if dice.percent(30) { 0 } else { 40 };
            let mut outlet = Outlet {
                outboxes: &mut outboxes,
                wire: &mut wire,
            };
            outlet.retry();
            assert!(matches!(
                player.run(at(cycle), &mut inbox, &mut outlet),
                Next::Wait(_)
            ));
            inbox.clear();
        }
    });
    assert!(wire.bytes > 100_000, "{} bytes went out", wire.bytes);
    assert_eq!(calls, 0, "calls to the heap");
}
