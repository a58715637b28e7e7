//! Voices put on one keyboard, where a key is down once or not at all.

use crate::support::midi_file;

/// 80 quarters a minute.
pub const QUARTER_S: f64 = 0.75;
/// A tick is 0.1 ms.
const TICKS_PER_QUARTER: u16 = 7500;
pub const TICK_NS: u64 = 100_000;
const QUARTER_US: u32 = 750_000;

/// Two voices that strike one key within this time strike it once.
const TOGETHER_S: f64 = 0.02;
/// A key that is struck again while down is let go this much before.
const LIFT_S: f64 = 0.005;

/// A note that somebody wants played.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Touch {
    pub on_s: f64,
    pub off_s: f64,
    pub key: u8,
}

/// What is to be played.
#[derive(Clone, Debug, Default)]
pub struct Music {
    pub touches: Vec<Touch>,
    /// The damper, down or up, in order of time.
    pub pedal_s: Vec<(f64, bool)>,
}

impl Music {
    pub fn without_pedal(touches: Vec<Touch>) -> Music {
        Music {
            touches,
            pedal_s: Vec::new(),
        }
    }
}

/// A note as one keyboard sends it; its own velocity tells it from those around it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Stroke {
    pub on_ns: u64,
    /// The key is let go.
    pub off_ns: u64,
    /// Neither key nor pedal holds it any more.
    pub end_ns: u64,
    pub key: u8,
    pub velocity: u8,
}

/// What one keyboard makes of it: a unison of two voices is one key, struck again if the second comes later.
pub fn one_keyboard(music: &Music) -> Vec<Stroke> {
    let mut touches = music.touches.clone();
    sort(&mut touches);
    let mut merged: Vec<Touch> = Vec::new();
    let mut last_of_key = [None; 128];
    for mut touch in touches {
        let last: Option<usize> = last_of_key[touch.key as usize];
        if let Some(last) = last.map(|place| &mut merged[place])
            && last.off_s > touch.on_s
        {
            if touch.on_s - last.on_s < TOGETHER_S {
                last.off_s = last.off_s.max(touch.off_s);
                continue;
            }
            touch.off_s = touch.off_s.max(last.off_s);
            last.off_s = touch.on_s - LIFT_S;
        }
        last_of_key[touch.key as usize] = Some(merged.len());
        merged.push(touch);
    }
    sort(&mut merged);
    let stroke = |(place, touch): (usize, &Touch)| Stroke {
        on_ns: tick(touch.on_s) * TICK_NS,
        off_ns: tick(touch.off_s) * TICK_NS,
        end_ns: end_tick(tick(touch.off_s), &music.pedal_s) * TICK_NS,
        key: touch.key,
        velocity: 1 + (place * 37 % 127) as u8,
    };
    merged.iter().enumerate().map(stroke).collect()
}

/// A release stands before a pedal of the same moment, so only a pedal from before it holds the note.
fn end_tick(off: u64, pedal_s: &[(f64, bool)]) -> u64 {
    let pedals = pedal_s.iter().map(|(at_s, down)| (tick(*at_s), *down));
    let (before, after): (Vec<_>, Vec<_>) = pedals.partition(|(at, _)| *at < off);
    match (before.last(), after.first()) {
        (Some((_, true)), Some((lifted, _))) => *lifted,
        _ => off,
    }
}

fn sort(touches: &mut [Touch]) {
    let order = |a: &Touch, b: &Touch| a.on_s.total_cmp(&b.on_s).then(a.off_s.total_cmp(&b.off_s));
    touches.sort_by(|a, b| order(a, b).then(a.key.cmp(&b.key)));
}

fn tick(at_s: f64) -> u64 {
    (at_s / QUARTER_S * TICKS_PER_QUARTER as f64).round_ties_even() as u64
}

/// The MIDI file of it. Of one moment, releases stand first and strokes last.
pub fn midi(strokes: &[Stroke], pedal_s: &[(f64, bool)]) -> Vec<u8> {
    let mut events: Vec<(u64, u8, Vec<u8>)> = Vec::new();
    for stroke in strokes {
        let (key, velocity) = (stroke.key, stroke.velocity);
        events.push((stroke.on_ns / TICK_NS, 2, vec![0x90, key, velocity]));
        events.push((stroke.off_ns / TICK_NS, 0, vec![0x80, key, 64]));
    }
    for (at_s, down) in pedal_s {
        let value = if *down { 127 } else { 0 };
        events.push((tick(*at_s), 1, vec![0xB0, 64, value]));
    }
    events.sort_by_key(|(tick, order, _)| (*tick, *order));
    let end = events.last().map_or(0, |(tick, ..)| *tick);
    let sent = events.into_iter().map(|(tick, _, bytes)| (tick, bytes));
    let sent: Vec<(u64, Vec<u8>)> = sent.collect();
    midi_file::midi_file_at(TICKS_PER_QUARTER, QUARTER_US, &sent, end)
}

#[test]
fn unisons_are_one_key_and_later_ones_strike_again() {
    let touch = |on_s, off_s| Touch {
        on_s,
        off_s,
        key: 60,
    };
    let spans = |touches: Vec<Touch>| {
        let strokes = one_keyboard(&Music::without_pedal(touches));
        let ms = |ns| ns / 1_000_000;
        let spans = strokes.iter().map(|s| (ms(s.on_ns), ms(s.off_ns)));
        spans.collect::<Vec<_>>()
    };
    assert_eq!(spans(vec![touch(0.0, 1.0), touch(0.01, 2.0)]), [(0, 2000)]);
    assert_eq!(
        spans(vec![touch(0.0, 2.0), touch(0.5, 1.0)]),
        [(0, 495), (500, 2000)]
    );
    assert_eq!(
        spans(vec![touch(0.0, 1.0), touch(1.0, 2.0)]),
        [(0, 1000), (1000, 2000)]
    );
}

#[test]
fn a_pedal_holds_what_was_let_go_after_it_went_down() {
    let pedal_s = [(1.0, true), (2.0, false), (2.1, true), (3.0, false)];
    let quarters = |ticks: u64| ticks as f64 * QUARTER_S / TICKS_PER_QUARTER as f64;
    for (off_s, end_s) in [(0.9, 0.9), (1.0, 1.0), (1.5, 2.0), (2.05, 2.05), (2.5, 3.0)] {
        let end = quarters(end_tick(tick(off_s), &pedal_s));
        assert!((end - end_s).abs() < 1e-9, "{off_s}: {end}");
    }
}
