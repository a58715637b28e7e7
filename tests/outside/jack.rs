//! trued on a real JACK server (jackd of Debian, its dummy driver): a scripted player, trued, a recorder beside a
//! direct connection. What was heard is judged by the independent receiver of `tests/support`.
//!
//! libjack finds its server by an environment variable, so each test here runs in a process of its own.

mod bench;
mod frames;
mod lamps;
mod processes;
mod set;
mod trouble;

use crate::no_alloc::heap_calls_so_far;
use crate::support::dice::Dice;
use crate::support::plans;
use crate::support::receiver::{Kind, Receiver};
use bench::{Bench, Event};
use processes::{Server, Trued, in_a_process_of_its_own, wait_for};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::time::{Duration, Instant};
use trued::daemon::{Player, Score, Slot};
use trued::engine::Engine;
use trued::engine::plan::Dialect;
use trued::ports::clock::Clock;
use trued::ports::jack::Jack;
use trued::ports::{Cycle, Inbox, Next, Outlet};
use trued::time::Time;

const NOTES: usize = 10_000;
/// The song changes after so many notes.
const NOTES_A_SONG: usize = 500;
/// Half a bend step at range 2: 400 cents over 16384 steps, halved.
const HALF_STEP_CENTS: f64 = 400.0 / 16384.0 / 2.0 + 1e-6;
/// Frames a cycle. A machine with other work makes the server skip cycles, and what is skipped is lost to everybody:
/// then once more, and at last with cycles that give it time.
const PERIODS: [u32; 3] = [64, 64, 1024];

const STAGE: &str = r#"
stage: Server check
keyboards:
  keys: {port: "Player:*"}
synths:
  organ: {port: "recorder:through", bend_range: 2, tail_ms: 50}
cues:
  - {when: {program: any, channel: 16}, do: song}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
  - {song: Harbour tag, tuning: equal-12}
  - {song: Low bell, tuning: quarter-comma-meantone, pitch: A4 = 415 Hz}
"#;

/// Cents (100 x MIDI key) with A4 at 440 Hz: quarter-comma meantone, Eb to G#, from its definition, four fifths make
/// 5/1 (common practice); then equal; then the first with A4 at 415 Hz.
fn wanted_cents(key: u8, song: usize) -> f64 {
    match song {
        0 => {}
        1 => return f64::from(key) * 100.0,
        _ => return wanted_cents(key, 0) + 1200.0 * (415f64 / 440.0).log2(),
    }
    let fifth = 1200.0 * 5f64.log2() / 4.0;
    let above_c = |class: u8| {
        let fifths = [0, 7, 2, -3, 4, -1, 6, 1, 8, 3, -2, 5][class as usize];
        (f64::from(fifths) * fifth).rem_euclid(1200.0)
    };
    6900.0 + (f64::from(key / 12) - 5.0) * 1200.0 + above_c(key % 12) - above_c(9)
}

struct Played {
    key: u8,
    velocity: u8,
    song: usize,
}

/// Notes one to three at a time, about a thousand a second, at any frame; song changes between them, each at the frame
/// of the note that needs it. Three songs need more bends than there are channels, so every change makes bends.
fn write_evening(dice: &mut Dice) -> (Vec<Event>, Vec<Played>) {
    let mut events = Vec::new();
    let mut played: Vec<Played> = Vec::new();
    let mut free_at = [0u64; 128];
    let (mut frame, mut song) = (0u64, 0);
    while played.len() < NOTES {
        frame += 1 + dice.below(180);
        let due = played.len() / NOTES_A_SONG % 3;
        if due != song {
            song = due;
            // What sounded has died away, so that nothing has to be stolen.
            frame += 6_000;
            events.push(Event::new(frame, &[0xCF, song as u8]));
        }
        for _ in 0..(1 + dice.below(3) as usize).min(NOTES - played.len()) {
            let key = 36 + dice.below(49) as u8;
            let velocity = 1 + dice.below(127) as u8;
            let off = frame + 200 + dice.below(600);
            if free_at[key as usize] >= frame {
                continue;
            }
            free_at[key as usize] = off;
            events.push(Event::new(frame, &[0x90, key, velocity]));
            events.push(Event::new(off, &[0x80, key, 64]));
            played.push(Played {
                key,
                velocity,
                song,
            });
        }
    }
    events.sort_by_key(|event| event.frame);
    (events, played)
}

#[test]
fn ten_thousand_notes_and_no_frame_later() {
    in_a_process_of_its_own("ten_thousand_notes_and_no_frame_later", || {
        for (attempt, period) in PERIODS.into_iter().enumerate() {
            let _server = Server::start(period);
            let trued = Trued::start(STAGE);
            let (events, played) = write_evening(&mut Dice::new(attempt as u64));
            let bench = Bench::open();
            bench.wait_until_connected();
            // The set-up is said again 2 s after a port came.
            std::thread::sleep(Duration::from_millis(2_500));
            bench.play(&events);
            let heard = bench.finish();
            let verdict = judge(&heard, &played);
            println!(
                "{period} frames a cycle, {} xruns: {verdict:?}",
                heard.xruns
            );
            trued.stop_cleanly();
            let once_more = heard.xruns > 0 && attempt + 1 < PERIODS.len();
            if verdict.is_ok() || !once_more {
                verdict.expect("every note in its place");
                break;
            }
        }
    });
}

/// The figures, or what is wrong.
fn judge(heard: &bench::Heard, played: &[Played]) -> Result<String, String> {
    // A power-on range that is no range of ours, so that one never told is heard.
    let mut receiver = Receiver::new(Kind::Plain, Duration::ZERO, 7);
    let frames = |events: &[Event], kinds: &[u8]| -> Vec<u64> {
        let is = |event: &&Event| kinds.contains(&(event.bytes()[0] & 0xF0));
        events.iter().filter(is).map(|event| event.frame).collect()
    };
    for event in &heard.through {
        let micros = event.frame * 1_000_000 / 48_000;
        receiver.hear(Duration::from_micros(micros), event.bytes());
    }
    for kind in [0x90, 0x80] {
        let direct = frames(&heard.direct, &[kind]);
        let through = frames(&heard.through, &[kind]);
        if direct.len() != played.len() || through.len() != direct.len() {
            return Err(format!(
                "{:x}: {} direct, {} through, {} played",
                kind,
                direct.len(),
                through.len(),
                played.len()
            ));
        }
        let late: Vec<i64> = through
            .iter()
            .zip(&direct)
            .map(|(t, d)| *t as i64 - *d as i64)
            .collect();
        if late.iter().any(|late| *late != 0) {
            return Err(format!(
                "{kind:x}: frames added {:?}..{:?}",
                late.iter().min(),
                late.iter().max()
            ));
        }
    }
    let mut worst: f64 = 0.0;
    for (note, played) in receiver.notes.iter().zip(played) {
        if note.velocity != played.velocity {
            return Err("notes out of order".to_string());
        }
        worst = worst.max((note.onset_cents() - wanted_cents(played.key, played.song)).abs());
    }
    if worst > HALF_STEP_CENTS || !receiver.stuck().is_empty() || !receiver.orphans.is_empty() {
        return Err(format!(
            "worst onset {worst} cents off, {} stuck",
            receiver.stuck().len()
        ));
    }
    Ok(format!(
        "{} notes, 0 lost, 0 frames added, each in tune at its onset (worst {worst:.6} cents, half a step is \
         {HALF_STEP_CENTS:.6}), {} bends",
        played.len(),
        receiver.bends
    ))
}

#[test]
fn a_server_killed_under_play_comes_back_and_nothing_is_stuck() {
    in_a_process_of_its_own(
        "a_server_killed_under_play_comes_back_and_nothing_is_stuck",
        || {
            let kills = std::env::var("TRUED_JACK_KILLS")
                .ok()
                .and_then(|n| n.parse().ok());
            let kills: u64 = kills.unwrap_or(3);
            let mut server = Server::start(64);
            let trued = Trued::start(STAGE);
            // Hardware behind the server: it knows nothing of servers, and what it sounds goes on sounding.
            let mut receiver = Receiver::new(Kind::Plain, Duration::ZERO, 7);
            let mut dice = Dice::new(77);
            let mut notes_before = 0;
            for kill in 1..=kills {
                let bench = Bench::open();
                bench.wait_until_connected();
                let (events, _) = write_evening(&mut dice);
                bench.begin(&events);
                let at_least = notes_before + 50;
                wait_for("notes of this server", || {
                    bench.hear(&mut receiver);
                    receiver.notes.len() > at_least && !receiver.sounding().is_empty()
                });
                std::thread::sleep(Duration::from_millis(dice.below(200)));
                server.kill();
                bench.hear(&mut receiver);
                let sounding = receiver.sounding().len();
                drop(bench);
                notes_before = receiver.notes.len();
                let began = Instant::now();
                server = Server::start(64);
                let up = began.elapsed();
                let bench = Bench::open();
                bench.wait_until_connected();
                let back = began.elapsed();
                wait_for("silence", || {
                    bench.hear(&mut receiver);
                    receiver.sounding().is_empty()
                });
                println!(
                    "kill {kill}: {notes_before} notes so far, {sounding} sounding at the kill, server up after {up:.1?}, \
                 trued connected after {back:.1?}, silence after {:.1?}",
                    began.elapsed()
                );
            }
            in_tune_after_all(&mut receiver);
            trued.stop_cleanly();
        },
    );
}

/// One last note, and then nothing.
fn in_tune_after_all(receiver: &mut Receiver) {
    let bench = Bench::open();
    bench.wait_until_connected();
    let before = receiver.notes.len();
    bench.begin(&[
        Event::new(100, &[0xCF, 0]),
        Event::new(200, &[0x90, 64, 99]),
        Event::new(9_000, &[0x80, 64, 64]),
    ]);
    wait_for("the last note", || {
        bench.hear(receiver);
        receiver.notes.len() == before + 1 && receiver.sounding().is_empty()
    });
    let off = receiver.notes[before].onset_cents() - wanted_cents(64, 0);
    assert!(off.abs() <= HALF_STEP_CENTS, "{off} cents off");
}

/// Counts what its thread asks of the heap from one cycle to the next: all of the callback, before and behind it.
struct Counted {
    player: Player,
    before: Option<u64>,
    calls: Arc<AtomicU64>,
    cycles: Arc<AtomicU64>,
    last: u64,
    /// They count from now on.
    begun: Arc<AtomicBool>,
}

impl Cycle for Counted {
    fn run(&mut self, to: Time, inbox: &mut Inbox, outlet: &mut Outlet<'_>) -> Next {
        let now = heap_calls_so_far();
        let calls = now - self.before.unwrap_or(now);
        self.before = Some(now);
        self.calls.fetch_add(calls, Ordering::Relaxed);
        let next = self.player.run(to, inbox, outlet);
        let counts = u64::from(self.begun.load(Ordering::Relaxed));
        let cycles = self.cycles.fetch_add(counts, Ordering::Relaxed) + counts;
        if cycles >= self.last {
            Next::Leave
        } else {
            next
        }
    }
}

#[test]
fn the_callback_takes_nothing_from_the_heap() {
    in_a_process_of_its_own("the_callback_takes_nothing_from_the_heap", || {
        const CYCLES: u64 = 3_000;
        let _server = Server::start(64);
        let synth = plans::synth("organ", Dialect::ChannelBend, 2);
        let low = plans::offsets([0.0, 0.0, 0.0, 0.0, -14.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0]);
        let plan = plans::plan(synth, vec![plans::song("Lantern hymn", low)]);
        let (_commands, commands_out) = rtrb::RingBuffer::new(8);
        let (news_in, _news) = rtrb::RingBuffer::new(64);
        let engine = Engine::new(Box::new(plan));
        let slot = Slot::new(Score::new(engine, 1, commands_out, news_in));
        let (calls, cycles) = (Arc::new(AtomicU64::new(0)), Arc::new(AtomicU64::new(0)));
        let begun = Arc::new(AtomicBool::new(false));
        let bench = Bench::open();
        let loop_thread = {
            let (slot, calls, cycles) = (slot.clone(), calls.clone(), cycles.clone());
            let begun = begun.clone();
            std::thread::spawn(move || {
                let names = |name: &str| vec![name.to_string()];
                let mut jack =
                    Jack::open("counted", &names("keys"), &names("organ"), Clock::start())
                        .expect("jack");
                assert!(jack.found_server());
                jack.run(&|| {
                    Box::new(Counted {
                        player: Player::new(slot.clone()),
                        before: None,
                        calls: calls.clone(),
                        cycles: cycles.clone(),
                        last: CYCLES,
                        begun: begun.clone(),
                    })
                })
            })
        };
        bench.connect_to("counted");
        let (events, _) = write_evening(&mut Dice::new(5));
        bench.begin(&events);
        begun.store(true, Ordering::Relaxed);
        loop_thread
            .join()
            .expect("no panic")
            .expect("left of itself");
        let heard = bench.finish();
        let played = slot.take().expect("put back").report().counters.notes;
        let cycles = cycles.load(Ordering::Relaxed);
        println!(
            "{cycles} cycles, {played} notes, {} messages heard",
            heard.through.len()
        );
        assert!(played > 500 && heard.through.len() > 1000);
        assert_eq!(calls.load(Ordering::Relaxed), 0, "calls to the heap");
    });
}

#[test]
fn without_a_server_it_waits_and_auto_says_what_to_do() {
    in_a_process_of_its_own("without_a_server_it_waits_and_auto_says_what_to_do", || {
        let trued = Trued::start(STAGE);
        wait_for("it to say so", || {
            trued.log().contains("no JACK server answers; waiting")
        });
        trued.stop_cleanly();
        if std::path::Path::new("/dev/snd/seq").exists() {
            return; // auto takes it
        }
        let (code, log) = Trued::run_auto(STAGE);
        assert_eq!(code, Some(69), "{log}");
        for words in [
            "sudo modprobe snd-seq",
            "no JACK server runs",
            "start a JACK server",
        ] {
            assert!(log.contains(words), "{words:?} in {log}");
        }
    });
}
