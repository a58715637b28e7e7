//! Once an engine is made it takes nothing from the heap and gives nothing back, whatever is played at it.

use crate::support::dice::Dice;
use crate::support::plans;
use std::alloc::{GlobalAlloc, Layout, System};
use std::cell::Cell;
use std::hint::black_box;
use std::path::Path;
use trued::engine::plan::{
    Act, ChannelSet, CuePlan, Dialect, Gesture, LampPlan, NameId, Press, Shown, SongPlan,
};
use trued::engine::{
    Ask, Command, Engine, InflectTo, Inflected, Input, KeyboardId, Link, Nudge, Place, Plan,
    SynthId, TonicBy,
};
use trued::pitch::Interval;
use trued::stage::Stage;
use trued::time::{Span, Time};
use trued::tuning::{Key, Letter};

/// Counts every call to the heap, for the thread that makes it.
struct Counting;

thread_local! {
    static HEAP_CALLS: Cell<u64> = const { Cell::new(0) };
}

fn count() {
    // A thread that is ending has no counter any more, and nobody asks for it.
    let _ = HEAP_CALLS.try_with(|calls| calls.set(calls.get() + 1));
}

// SAFETY: everything is handed on to the system's allocator unchanged.
unsafe impl GlobalAlloc for Counting {
    unsafe fn alloc(&self, layout: Layout) -> *mut u8 {
        count();
        unsafe { System.alloc(layout) }
    }

    unsafe fn dealloc(&self, at: *mut u8, layout: Layout) {
        count();
        unsafe { System.dealloc(at, layout) }
    }

    unsafe fn alloc_zeroed(&self, layout: Layout) -> *mut u8 {
        count();
        unsafe { System.alloc_zeroed(layout) }
    }

    unsafe fn realloc(&self, at: *mut u8, layout: Layout, bytes: usize) -> *mut u8 {
        count();
        unsafe { System.realloc(at, layout, bytes) }
    }
}

#[global_allocator]
static HEAP: Counting = Counting;

/// Calls to the heap while `work` runs.
pub fn heap_calls(work: impl FnOnce()) -> u64 {
    let before = heap_calls_so_far();
    work();
    heap_calls_so_far() - before
}

/// Calls to the heap that this thread has made.
pub fn heap_calls_so_far() -> u64 {
    HEAP_CALLS.get()
}

const LONG: Span = Span::from_millis(100);
const INPUTS: usize = 100_000;

/// A song with everything that can be changed by hand, and one with black keys that the harmony names.
fn by_hand() -> Vec<SongPlan> {
    let text = "tunings: {just: {like: five-limit-scale, also: {E: {low: 350 c}}, turns: {lower: {E: low}}}}\n\
                set: [{song: A, tuning: just, by_line: {E: {up: low, down: home}}, black_keys: [G# or Ab]}, \
                {song: B, tuning: quarter-comma-meantone, by_chord: yes, black_keys: [G# or Ab, Eb or D#, Bb or A#]}]\n";
    let stage = Stage::parse(Path::new("by-hand.yaml"), text).expect("good");
    stage.plan().set
}

/// Two synths, one of each dialect, a layer on both, cues, lamps, four songs.
fn evening() -> Plan {
    let mut songs = by_hand();
    songs.extend([
        plans::song("equal", plans::equal()),
        plans::song(
            "crooked",
            plans::tuning(|key| Some(key as f64 * 99.0 + 70.0)),
        ),
        plans::song(
            "gaps",
            plans::tuning(|key| (key % 3 > 0).then_some(key as f64 * 100.0 + 31.0)),
        ),
    ]);
    let mut plan = plans::plan(
        plans::synth("grand", Dialect::Mpe { manager: 0 }, 48),
        songs,
    );
    plan.synths
        .push(plans::synth("organ", Dialect::ChannelBend, 2));
    plan.synths[1].pace = Span::from_millis(2);
    plan.keyboards[1].zones.set(0, 7);
    let mut layer = plans::part(&plan.synths[1..]);
    layer.to = SynthId::new(1).expect("a synth");
    plan.parts.push(layer);
    let mut lead = layer;
    lead.mono = true;
    lead.pool = ChannelSet(1);
    plan.set[1].parts = Some([lead].into());
    plan.lamp_ports.extend(KeyboardId::new(0));
    for (number, show) in [
        (20, Shown::Song(1)),
        (21, Shown::Told(Command::Plain)),
        (22, Shown::Told(Command::InflectHome)),
    ] {
        plan.lamps.push(LampPlan {
            show,
            port: 0,
            on: [0xB0, number, 127],
            off: [0xB0, number, 0],
        });
    }
    plan.cues.push(CuePlan {
        from: None,
        channels: ChannelSet::ALL,
        gesture: Gesture::ANY_PROGRAM,
        press: Press::Down,
        at_quiet: false,
        act: Act::SongByNumber,
        held: false,
        pass: false,
    });
    plan.cues.push(CuePlan {
        from: None,
        channels: ChannelSet::ALL,
        gesture: Gesture::switch(66),
        press: Press::Down,
        at_quiet: false,
        act: Act::Command(Command::InflectHome),
        held: true,
        pass: true,
    });
    for (gesture, press, command) in [
        (Gesture::switch(7), Press::Down, Command::Next),
        (Gesture::switch(7), Press::Long(LONG), Command::Panic),
        (Gesture::switch(1), Press::Either, Command::Plain),
        (Gesture::Note(Key::C4), Press::Up, Command::Back),
    ] {
        plan.cues.push(CuePlan {
            from: None,
            channels: ChannelSet::ALL,
            gesture,
            press,
            act: Act::Command(command),
            at_quiet: matches!(press, Press::Down | Press::Either),
            held: false,
            pass: true,
        });
    }
    plan
}

/// One random input; `bytes` is room for it.
fn random_input<'a>(dice: &mut Dice, bytes: &'a mut [u8; 4096]) -> Input<'a> {
    let keyboard = KeyboardId::new(dice.below(2) as usize).expect("a keyboard");
    let synth = SynthId::new(dice.below(3) as usize).expect("a synth");
    match dice.below(200) {
        0 => Input::KeyboardLost(keyboard),
        1..=4 => Input::Synth {
            synth,
            link: dice.pick(&[Link::Down, Link::Up, Link::Back, Link::Tight, Link::Easy]),
        },
        5..=9 => Input::Command(dice.pick(&[
            Command::Next,
            Command::Back,
            Command::Song(1),
            Command::Song(900),
            Command::NextFrom(0),
            Command::Pitch {
                to: Nudge::By(Interval::from_cents(3)),
                held_too: true,
            },
            Command::Pitch {
                to: Nudge::Home,
                held_too: false,
            },
            Command::Transpose(Some(2)),
            Command::Inflect {
                key: Inflected::Everywhere(4),
                to: InflectTo::Place(Place::Named(NameId::of("low"))),
            },
            Command::Inflect {
                key: Inflected::Alone(Key::C4),
                to: InflectTo::By(Interval::from_cents(3)),
            },
            Command::InflectHome,
            Command::Turn(NameId::of("lower")),
            Command::BlackKey(Letter::usual(8)),
            Command::Tonic {
                to: Letter::A,
                by: TonicBy::Pivot,
            },
            Command::TonicNextKey(TonicBy::Equal),
            Command::TonicHome,
            Command::Plain,
            Command::Home,
            Command::Fresh,
            Command::Ask(Ask::Reload),
            Command::Panic,
            Command::Resend(None),
        ])),
        10 => {
            let length = dice.between(2, 4095) as usize;
            bytes[..length].fill(0x11);
            bytes[0] = 0xF0;
            bytes[length - 1] = 0xF7;
            Input::Midi {
                keyboard,
                bytes: &bytes[..length],
            }
        }
        11..=14 => {
            let length = dice.between(1, 40) as usize;
            for byte in &mut bytes[..length] {
                *byte = dice.below(256) as u8;
            }
            Input::Midi {
                keyboard,
                bytes: &bytes[..length],
            }
        }
        _ => {
            let status = dice.pick(&[0x80, 0x90, 0x90, 0x90, 0xA0, 0xB0, 0xB0, 0xC0, 0xD0, 0xE0]);
            bytes[0] = status | dice.below(16) as u8;
            bytes[1] = match status {
                0xB0 => dice.pick(&[
                    0, 1, 6, 7, 11, 32, 38, 64, 66, 67, 74, 84, 88, 100, 101, 120, 121, 123, 126,
                ]),
                _ => dice.below(128) as u8,
            };
            bytes[2] = dice.below(128) as u8;
            Input::Midi {
                keyboard,
                bytes: if matches!(status, 0xC0 | 0xD0) {
                    &bytes[..2]
                } else {
                    &bytes[..3]
                },
            }
        }
    }
}

/// Takes all output and follows the clock; gives the number of outputs.
fn drain(engine: &mut Engine, now: Time) -> u64 {
    let mut outputs = 0;
    loop {
        while let Some(output) = engine.poll_output() {
            black_box(&output);
            outputs += 1;
        }
        if engine.poll_timeout().is_none_or(|due| due > now) {
            return outputs;
        }
        engine.handle_timeout(now);
    }
}

#[test]
fn a_hundred_thousand_inputs_and_a_plan_swap_never_touch_the_heap() {
    let plan = evening();
    let mut next = plan.clone();
    next.set.truncate(2);
    next.parts.truncate(1);
    let mut engine = Engine::new(Box::new(plan));
    let mut next = Some(Box::new(next));
    let mut old = None;
    let mut dice = Dice::new(1);
    let mut bytes = [0; 4096];
    let mut now = Time::START;
    let mut outputs = 0;
    let calls = heap_calls(|| {
        for place in 0..3 {
            let synth = SynthId::new(place).expect("a synth");
            engine.handle_input(
                now,
                Input::Synth {
                    synth,
                    link: Link::Up,
                },
            );
        }
        for count in 0..INPUTS {
            now = now + Span::from_nanos(dice.below(20_000_000));
            outputs += drain(&mut engine, now);
            if count == INPUTS / 2 {
                old = next.take().map(|plan| engine.handle_plan(now, plan));
                outputs += drain(&mut engine, now);
            }
            engine.handle_input(now, random_input(&mut dice, &mut bytes));
            outputs += drain(&mut engine, now);
            black_box(engine.report());
        }
    });
    let report = engine.report();
    println!(
        "{INPUTS} inputs, 1 plan swap, {outputs} outputs, {} notes: {calls} heap calls",
        report.counters.notes
    );
    assert!(old.is_some(), "the old plan comes back");
    assert!(
        report.counters.notes > 10_000 && outputs > INPUTS as u64 / 2,
        "something was played"
    );
    assert_eq!(report.counters.overrun, 0);
    assert_eq!(calls, 0);
}

#[test]
fn the_counter_counts() {
    assert_eq!(heap_calls(|| drop(black_box(Box::new(1u64)))), 2);
    assert_eq!(
        heap_calls(|| drop(black_box(Vec::<u8>::with_capacity(8)))),
        2
    );
    let mut grows = vec![0u8; 8];
    assert_eq!(heap_calls(|| grows.push(1)), 1);
    assert_eq!(heap_calls(|| drop(black_box(evening_name()))), 2);
    assert_eq!(heap_calls(|| assert_eq!(black_box([1u64; 16])[3], 1)), 0);
}

fn evening_name() -> Box<str> {
    "evening".into()
}
