//! Parts: stretches of keyboard bound to a synth.

use super::advice::Findings;
use super::complaint::{Complaints, Trail};
use super::node::{At, Node};
use super::rig::{Rig, keyboard_named, synth_named};
use super::values::{channels, choice, interval, key_range};
use crate::engine::plan::{ChannelSet, Follow, KeyboardId, Pass, SynthId};
use crate::limits::PARTS_MAX;
use crate::pitch::Interval;
use crate::tuning::Key;

/// A part as written; its channels are given out once all parts are known.
pub struct Part {
    pub trail: Trail,
    pub from: Option<KeyboardId>,
    pub keys: (Key, Key),
    pub to: SynthId,
    /// Channels asked for by number, and where.
    pub channel: Option<(Trail, ChannelSet)>,
    pub transpose_keys: i8,
    pub offset: Interval,
    pub pass: Pass,
    pub tune: bool,
    pub mono: bool,
    pub follow: Follow,
}

/// Without `parts`, every key of every keyboard plays the first synth.
pub fn whole_keyboard() -> Part {
    Part {
        trail: Trail::default(),
        from: None,
        keys: all_keys(),
        to: SynthId::new(0).expect("0 is below every limit"),
        channel: None,
        transpose_keys: 0,
        offset: Interval::ZERO,
        pass: Pass::ALL,
        tune: true,
        mono: false,
        follow: Follow::Harmony,
    }
}

fn all_keys() -> (Key, Key) {
    let lowest = Key::all().next().expect("a keyboard has keys");
    let highest = Key::all().next_back().expect("a keyboard has keys");
    (lowest, highest)
}

/// The list behind `parts`, of the evening or of a song.
pub fn parts(at: &At<'_>, rig: &Rig, found: &mut Findings) -> Vec<Part> {
    let items = at.items();
    if let Some(first_too_many) = items.get(PARTS_MAX) {
        found.complaints.add(
            &first_too_many.trail,
            format!("this is part number {}", PARTS_MAX + 1),
            format!("trued plays at most {PARTS_MAX} parts"),
        );
    }
    items
        .iter()
        .take(PARTS_MAX)
        .filter_map(|item| part(item, rig, found))
        .collect()
}

fn part(at: &At<'_>, rig: &Rig, found: &mut Findings) -> Option<Part> {
    let complaints = &mut found.complaints;
    let mut fields = at.fields(
        "a map such as `{from: keys, keys: C2..B3, to: organ}`",
        complaints,
    )?;
    let mut part = whole_keyboard();
    part.trail = at.trail.clone();
    if let Some(at) = fields.take("from") {
        part.from = keyboard_named(&at, rig, complaints);
    }
    if let Some(at) = fields.take("to") {
        part.to = synth_named(&at, rig, complaints).unwrap_or(part.to);
    }
    if let Some(at) = fields.take("keys") {
        part.keys = key_range(&at, complaints).unwrap_or(part.keys);
    }
    if let Some(at) = fields.take("channel") {
        part.channel = channels(&at, complaints).map(|channels| (at.trail.clone(), channels));
    }
    if let Some(at) = fields.take("transpose") {
        part.transpose_keys = transpose(&at, complaints);
    }
    if let Some(at) = fields.take("offset") {
        part.offset = interval(&at, complaints).unwrap_or_default();
    }
    if let Some(at) = fields.take("pass") {
        part.pass = pass(&at, complaints);
    }
    if let Some(at) = fields.take("tune") {
        part.tune = at.flag(complaints).unwrap_or(true);
    }
    if let Some(at) = fields.take("follow") {
        part.follow = follow(&at, complaints);
    }
    if let Some(at) = fields.take("mono") {
        part.mono = at.flag(complaints).unwrap_or(false);
    }
    if let Some((trail, channels)) = &part.channel
        && part.mono
        && channels.count() > 1
    {
        let first = channels.iter().next().map_or(1, |channel| channel + 1);
        complaints.add(
            trail,
            "a part with `mono: yes` has one channel",
            format!("write `channel: {first}`"),
        );
    }
    fields.finish(complaints);
    Some(part)
}

/// How it stands to the harmony: `yes`, `no`, `own`, `uncounted`.
fn follow(at: &At<'_>, complaints: &mut Complaints) -> Follow {
    if let Node::Flag(flag) = at.node {
        return if *flag {
            Follow::Harmony
        } else {
            Follow::Nothing
        };
    }
    let words = [
        ("yes", Follow::Harmony),
        ("no", Follow::Nothing),
        ("own", Follow::Own),
        ("uncounted", Follow::Uncounted),
    ];
    choice(at, &words, complaints).unwrap_or_default()
}

/// Keys up or down: at most five octaves.
pub fn transpose(at: &At<'_>, complaints: &mut Complaints) -> i8 {
    at.whole("keys up or down", -60..=60, complaints)
        .unwrap_or(0) as i8
}

fn pass(at: &At<'_>, complaints: &mut Complaints) -> Pass {
    let mut pass = Pass {
        wheel: false,
        pedals: false,
        pressure: false,
        controllers: false,
        programs: false,
    };
    let words = [
        ("wheel", 0),
        ("pedals", 1),
        ("pressure", 2),
        ("controllers", 3),
        ("programs", 4),
    ];
    for item in at.items() {
        match choice(&item, &words, complaints) {
            Some(0) => pass.wheel = true,
            Some(1) => pass.pedals = true,
            Some(2) => pass.pressure = true,
            Some(3) => pass.controllers = true,
            Some(_) => pass.programs = true,
            None => {}
        }
    }
    pass
}
