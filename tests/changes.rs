//! Random play while everything around it changes: songs, whole plans, lost keyboards and synths, full ports, panic,
//! set-up said again. No note may stick, no note-off be without its note, no held note move, no new note be out of tune.
//! A failure names its seed.

use crate::support::dice::Dice;
use crate::support::plans;
use crate::support::receiver::Note;
use crate::support::rig::{Rig, elapsed, keyboard_id};
use std::time::Duration;
use trued::engine::plan::{ChannelSet, Dialect, Leave, PartPlan, Steal};
use trued::engine::{Command, Input, KeyboardId, Link, Plan};
use trued::pitch::Interval;
use trued::time::{Span, Time};
use trued::tuning::Key;

const MPE: Dialect = Dialect::Mpe { manager: 0 };

/// A set of four songs: equal, two with twelve offsets of their own, and quarter-tones; some with a transposition.
fn set(dice: &mut Dice) -> Vec<trued::engine::plan::SongPlan> {
    let mut offsets =
        |spread: u64| std::array::from_fn(|_| dice.between(0, 2 * spread) as f64 - spread as f64);
    let (first, second) = (offsets(40), offsets(20));
    let quarter = plans::tuning(|key| Some(6000.0 + (key as f64 - 60.0) * 50.0));
    let mut set = vec![
        plans::song("Plain", plans::equal()),
        plans::song("First", plans::offsets(first)),
        plans::song("Second", plans::offsets(second)),
        plans::song("Quarters", quarter),
    ];
    for song in &mut set {
        song.transpose_keys = dice.between(0, 4) as i8 - 2;
    }
    set
}

/// One or two parts on one synth.
fn a_plan(dice: &mut Dice, dialect: Dialect, range: u8) -> Plan {
    let mut synth = plans::synth("organ", dialect, range);
    synth.steal = dice.pick(&[Steal::Oldest, Steal::Quietest, Steal::Nothing]);
    synth.share = dice.percent(80);
    synth.leave = dice.pick(&[Leave::Plain, Leave::AsIs]);
    synth.pace = Span::from_millis(dice.pick(&[0, 8]));
    let mut plan = plans::plan(synth, set(dice));
    plan.edits_at_once = dice.percent(30);
    if dice.percent(30) {
        plan.keyboards[1].zones.set(0, dice.between(1, 15) as u8);
    }
    if dice.percent(50) {
        let middle = dice.between(50, 70) as u8;
        let mut upper = plan.parts[0];
        let members = plan.synths[0].members;
        let low = ChannelSet(members.0 & 0x00FF);
        plan.parts[0].keys.1 = Key::new(middle).expect("a key");
        plan.parts[0].pool = low;
        upper.keys.0 = Key::new(middle + 1).expect("a key");
        upper.pool = members.without(low);
        upper.offset = Interval::from_cents(dice.pick(&[-50, 0, 17]));
        plan.parts.push(upper);
    }
    own_parts(dice, &mut plan);
    let songs = plan.set.iter().filter_map(|song| song.parts.as_deref());
    let mut others = songs.filter(|parts| parts.len() > 1 || !parts[0].pass.pedals);
    let shared = plan.parts.len() > 1 || others.next().is_some();
    let late_offs = dialect == MPE && shared;
    let told = |part: &PartPlan| PartPlan { late_offs, ..*part };
    plan.parts = plan.parts.iter().map(told).collect();
    for song in &mut plan.set {
        let parts = song.parts.take();
        song.parts = parts.map(|parts| parts.iter().map(told).collect());
    }
    plan
}

/// Some songs have parts of their own: one without pedals, or three on channels that others have too.
fn own_parts(dice: &mut Dice, plan: &mut Plan) {
    let whole = plans::part(&plan.synths);
    for song in &mut plan.set {
        let mut parts = vec![whole];
        match dice.below(5) {
            0 => parts[0].pass.pedals = false,
            // On a plain synth what a pedal holds is bent with the one voice.
            1 if plan.synths[0].dialect == MPE => {
                parts[0].mono = true;
                parts[0].pool = ChannelSet(1 << dice.between(3, 6));
            }
            1 | 2 => {
                parts = vec![whole; 3];
                for (part, pool) in parts.iter_mut().zip([0x0003, 0x01FC, 0x7C00]) {
                    part.pool = ChannelSet(pool & whole.pool.0);
                    part.transpose_keys = dice.pick(&[-12, 0, 7]);
                    part.from = dice.pick(&[None, KeyboardId::new(0), KeyboardId::new(1)]);
                }
            }
            _ => continue,
        }
        song.parts = Some(parts.into());
    }
}

/// One thing that a player, a wire or an editor does.
fn happen(dice: &mut Dice, rig: &mut Rig, range: u8, dialect: Dialect) {
    let keyboard = dice.below(2) as usize;
    let channel = dice.pick(&[0u8, 0, 0, 1, 9]);
    let key = dice.between(30, 96) as u8;
    match dice.below(1000) {
        0..=419 => rig.midi(keyboard, &[0x90 | channel, key, dice.between(1, 127) as u8]),
        420..=839 => rig.midi(keyboard, &[0x80 | channel, key, 64]),
        840..=899 => {
            let pedal = dice.pick(&[64, 64, 64, 66, 67, 69]);
            rig.midi(
                keyboard,
                &[0xB0 | channel, pedal, dice.pick(&[0, 63, 64, 127])],
            );
        }
        900..=919 => rig.midi(keyboard, &[0xC0 | channel, dice.below(4) as u8]),
        920..=929 => rig.midi(
            keyboard,
            &[0xB0 | channel, dice.pick(&[121, 123, 120, 11]), 0],
        ),
        930..=959 => rig.command(Command::Song(dice.below(5) as u16)),
        960..=969 => {
            let plan = a_plan(dice, dialect, range);
            rig.plan(&plan);
        }
        970..=974 => rig.command(Command::Resend(None)),
        975..=979 => rig.input(Input::KeyboardLost(keyboard_id(keyboard))),
        980..=984 => rig.link(0, dice.pick(&[Link::Tight, Link::Easy])),
        985..=987 => {
            rig.link(0, Link::Down);
            rig.link(0, dice.pick(&[Link::Up, Link::Back]));
        }
        988..=989 => rig.command(Command::Panic),
        990..=994 => rig.midi(keyboard, &[0xF0, 0x7E, 0x7F, 0x09, 0x01]), // cut off
        _ => rig.midi(keyboard, &[0xFE]),
    }
}

fn play(seed: u64, dialect: Dialect, range: u8) -> Rig {
    let mut dice = Dice::new(seed);
    let plan = a_plan(&mut dice, dialect, range);
    let mut rig = Rig::ready(&plan);
    for _ in 0..4000 {
        let pause_ms = dice.pick(&[0, 0, 5, 20, 80, 300]);
        rig.until(rig.now + Span::from_millis(pause_ms));
        happen(&mut dice, &mut rig, range, dialect);
    }
    rig.link(0, Link::Easy);
    rig.command(Command::Stop);
    rig.until(rig.now + Span::from_millis(5_000));
    rig
}

fn check(seed: u64, dialect: Dialect, range: u8) {
    let rig = play(seed, dialect, range);
    let half_step_cents = half_step_cents(range);
    let heard = rig.heard();
    assert!(heard.notes.len() > 100, "seed {seed}: it played");
    let stuck = heard.stuck();
    assert!(stuck.is_empty(), "seed {seed}: stuck {:?}", stuck[0]);
    assert!(
        heard.orphans.is_empty(),
        "seed {seed}: {:?}",
        heard.orphans[0]
    );
    for note in &heard.notes {
        stays(note, seed);
    }
    assert_eq!(heard.zones_while_sounding, 0, "seed {seed}");
    assert_eq!(rig.engine.report().voices, 0, "seed {seed}");
    assert_eq!(rig.engine.report().counters.overrun, 0, "seed {seed}");
    assert!(
        rig.engine.report().stopped,
        "seed {seed}: it came to its end"
    );
    let tuned: Vec<_> = heard
        .notes
        .iter()
        .filter(|note| dialect == MPE || note.channel != 9)
        .collect();
    assert_eq!(
        tuned.len(),
        rig.onsets.len(),
        "seed {seed}: a note for each onset"
    );
    for (note, (at, onset)) in tuned.iter().zip(&rig.onsets) {
        assert_eq!(note.on, elapsed(*at), "seed {seed}");
        let error = note.onset_cents() - onset.target.cents();
        assert!(
            error.abs() <= half_step_cents + 1e-6,
            "seed {seed}: {note:?} wanted {} cents",
            onset.target.cents()
        );
    }
}

/// While it is held, a note stands where it began, whatever goes by in an instant (Reset All Controllers centres the bend
/// of a receiver, and the tuning follows at once).
fn stays(note: &Note, seed: u64) {
    let held = |at: Duration| note.end.is_none_or(|end| at < end);
    let moves = note.pitch.iter().enumerate().filter(|(place, (at, _))| {
        let last_of_its_instant = note.pitch.get(place + 1).is_none_or(|(next, _)| next > at);
        held(*at) && last_of_its_instant
    });
    for (_, (at, cents)) in moves {
        let moved = cents - note.onset_cents();
        assert!(
            moved.abs() < 1e-6,
            "seed {seed}: at {at:?} moved by {moved} cents: {note:?}"
        );
    }
}

/// Half a bend step: range x 100 / 8192 / 2 cents (MIDI 1.0, p. 19).
fn half_step_cents(range: u8) -> f64 {
    range as f64 * 100.0 / 8192.0 / 2.0
}

/// A dozen, or as many as `SEEDS` says for a long run.
fn seeds() -> std::ops::RangeInclusive<u64> {
    let many = std::env::var("SEEDS").ok().and_then(|n| n.parse().ok());
    1..=many.unwrap_or(12)
}

#[test]
fn a_plain_synth_keeps_its_notes_through_every_change() {
    for seed in seeds() {
        check(seed, Dialect::ChannelBend, 2);
    }
}

#[test]
fn an_mpe_synth_keeps_its_notes_through_every_change() {
    for seed in seeds() {
        check(seed, MPE, 48);
    }
}

#[test]
fn a_rig_that_changes_its_dialect_does_so_in_silence() {
    let mut dice = Dice::new(5);
    let mut rig = Rig::ready(&a_plan(&mut dice, Dialect::ChannelBend, 2));
    rig.until(Time::from_millis(500)); // set-up may be said in pieces
    rig.midi(0, &[0x90, 60, 100]);
    let other = a_plan(&mut dice, Dialect::ChannelBend, 12);
    rig.plan(&other);
    let before = rig.sent.len();
    rig.until(Time::from_millis(3_000));
    assert_eq!(rig.sent.len(), before, "nothing is said under a held key");
    rig.midi(0, &[0x80, 60, 64]);
    rig.until(Time::from_millis(3_000 + plans::TAIL_MS + 500));
    assert_eq!(rig.heard().range_cents(0), 1200.0);
}
