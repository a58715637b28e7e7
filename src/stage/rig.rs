//! Keyboards, synths and the parts that bind them.

use super::advice::Findings;
use super::complaint::{Complaints, Trail};
use super::node::{At, Fields, nearest};
use super::values::{channels, choice, key_range, one_of, spell_channels};
use super::{Device, Wish, defaults};
use crate::engine::plan::{
    ChannelSet, Dialect, KeyboardId, KeyboardPlan, Leave, Pass, Steal, SynthId, SynthPlan,
};
use crate::limits::{BEND_RANGE_MAX, KEYBOARDS_MAX, PARTS_MAX, SYNTHS_MAX, TAIL_MS_MAX};
use crate::pitch::Interval;
use crate::pitch::word::BendRange;
use crate::time::Span;
use crate::tuning::Key;

/// Everything that is plugged in, and how it is bound together.
#[derive(Default)]
pub struct Rig {
    pub keyboards: Vec<Keyboard>,
    pub synths: Vec<Synth>,
    pub parts: Vec<Part>,
}

pub struct Keyboard {
    pub device: Device,
    pub plan: KeyboardPlan,
}

pub struct Synth {
    pub device: Device,
    pub plan: SynthPlan,
}

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
}

/// The three sections of a rig, wherever they stand.
#[derive(Default)]
pub struct Sections<'n> {
    pub keyboards: Option<At<'n>>,
    pub synths: Option<At<'n>>,
    pub parts: Option<At<'n>>,
    /// How synths are left unless they say otherwise.
    pub leave: Leave,
}

const LEAVE: [(&str, Leave); 2] = [("plain", Leave::Plain), ("as-is", Leave::AsIs)];

/// `plain` or `as-is`.
pub fn leave(at: &At<'_>, complaints: &mut Complaints) -> Option<Leave> {
    choice(at, &LEAVE, complaints)
}

/// Reads a rig. Whatever is missing takes its default, so that checking can go on.
pub fn read(sections: &Sections<'_>, found: &mut Findings) -> Rig {
    let mut rig = Rig::default();
    let mut silenced = Vec::new();
    for (name, at) in named(&sections.keyboards, "keyboard", KEYBOARDS_MAX, found) {
        if let Some(keyboard) = keyboard(name, &at, &mut silenced, found) {
            rig.keyboards.push(keyboard);
        }
    }
    if rig.keyboards.is_empty() {
        rig.keyboards.push(any_keyboard("keyboard"));
    }
    for (name, at) in named(&sections.synths, "synth", SYNTHS_MAX, found) {
        if let Some(synth) = synth(name, &at, sections.leave, found) {
            rig.synths.push(synth);
        }
    }
    if rig.synths.is_empty() {
        rig.synths.push(any_synth("synth", sections.leave));
    }
    silence(&mut rig, &silenced, found);
    if let Some(at) = &sections.parts {
        rig.parts = parts(at, &rig, found);
    }
    if rig.parts.is_empty() {
        rig.parts.push(whole_keyboard());
    }
    rig
}

/// The entries of `keyboards` or `synths`, no more than there is room for.
fn named<'n>(
    section: &Option<At<'n>>,
    what: &str,
    max: usize,
    found: &mut Findings,
) -> Vec<(String, At<'n>)> {
    let Some(at) = section else {
        return Vec::new();
    };
    let wanted =
        format!("each {what} under a name, as in `{what}s: {{mine: {{port: \"*Name*\"}}}}`");
    let Some(mut fields) = at.fields(&wanted, &mut found.complaints) else {
        return Vec::new();
    };
    let mut entries = fields.take_all();
    if let Some((_, first_too_many)) = entries.get(max) {
        found.complaints.add(
            &first_too_many.trail,
            format!("this is {what} number {}", max + 1),
            format!("trued plays at most {max} {what}s"),
        );
        entries.truncate(max);
    }
    entries
}

fn keyboard(
    name: String,
    at: &At<'_>,
    silenced: &mut Vec<Wish>,
    found: &mut Findings,
) -> Option<Keyboard> {
    let complaints = &mut found.complaints;
    if at.is_nothing() {
        return Some(any_keyboard(&name));
    }
    let mut fields = at.fields("a map such as `{port: \"*Keys*\"}`", complaints)?;
    let mut keyboard = any_keyboard(&name);
    keyboard.device.port = port(&mut fields, complaints);
    if let Some(at) = fields.take("channel") {
        keyboard.plan.channels = channels(&at, complaints).unwrap_or(ChannelSet::ALL);
    }
    if let Some(at) = fields.take("wheel") {
        let range = 0..=BEND_RANGE_MAX as i64;
        let wheel = at.whole("semitones of a full push of the wheel", range, complaints);
        keyboard.plan.wheel_semitones = wheel.unwrap_or(0) as u8;
    }
    if let Some(at) = fields.take("local_sound")
        && at.flag(complaints) == Some(false)
    {
        silenced.push(keyboard.device.port.clone());
    }
    fields.finish(complaints);
    Some(keyboard)
}

fn any_keyboard(name: &str) -> Keyboard {
    Keyboard {
        device: Device {
            name: name.to_string(),
            port: Wish::Any,
        },
        plan: KeyboardPlan {
            name: name.into(),
            channels: ChannelSet::ALL,
            wheel_semitones: defaults::WHEEL,
        },
    }
}

/// `port` and `socket`.
fn port(fields: &mut Fields<'_>, complaints: &mut Complaints) -> Wish {
    let socket = fields.take("socket").and_then(|at| {
        let text = at.text("a USB place such as 1-1.3", complaints)?;
        Some(text)
    });
    let Some(at) = fields.take("port") else {
        return match socket {
            None => Wish::Any,
            socket => Wish::Named {
                globs: vec![String::from("*")],
                socket,
            },
        };
    };
    let mut globs = Vec::new();
    for item in at.items() {
        let wanted = "a port's name, with * for the rest, or virtual";
        match item.text(wanted, complaints) {
            Some(text) if text.trim().is_empty() => {
                complaints.add(
                    &item.trail,
                    "this port has no name",
                    format!("write {wanted}"),
                );
            }
            Some(text) => globs.push(text),
            None => {}
        }
    }
    if globs.iter().any(|glob| glob == "virtual") {
        if globs.len() > 1 || socket.is_some() {
            complaints.add(
                &at.trail,
                "`virtual` is a port of our own and stands alone",
                "write `port: virtual`, or only names of ports",
            );
        }
        return Wish::Virtual;
    }
    if globs.is_empty() {
        return Wish::Any;
    }
    Wish::Named { globs, socket }
}

/// The dialects this version plays.
#[derive(Clone, Copy, PartialEq)]
enum Spelling {
    Mpe,
    ChannelBend,
    NotYet,
}

const DIALECTS: [(&str, Spelling); 5] = [
    ("mpe", Spelling::Mpe),
    ("channel-bend", Spelling::ChannelBend),
    ("tuning-messages", Spelling::NotYet),
    ("octave-table", Spelling::NotYet),
    ("best", Spelling::NotYet),
];

fn synth(name: String, at: &At<'_>, left: Leave, found: &mut Findings) -> Option<Synth> {
    let complaints = &mut found.complaints;
    if at.is_nothing() {
        return Some(any_synth(&name, left));
    }
    let mut fields = at.fields(
        "a map such as `{port: \"*Organ*\", dialect: mpe}`",
        complaints,
    )?;
    let mut synth = any_synth(&name, left);
    synth.device.port = port(&mut fields, complaints);
    let mpe = dialect(&mut fields, complaints) == Spelling::Mpe;
    members(&mut synth.plan, mpe, at, &mut fields, complaints);
    let mut bend_range = if mpe {
        defaults::BEND_RANGE_MPE
    } else {
        defaults::BEND_RANGE
    };
    if let Some(at) = fields.take("bend_range") {
        let range = 1..=BEND_RANGE_MAX as i64;
        let semitones = at.whole("semitones of a full bend", range, complaints);
        bend_range = semitones.map_or(bend_range, |semitones| semitones as u8);
    }
    synth.plan.bend_range = BendRange::new(bend_range).unwrap_or(BendRange::TWO);
    if let Some(at) = fields.take("tail_ms") {
        let tail = at.whole("milliseconds", 0..=TAIL_MS_MAX as i64, complaints);
        synth.plan.tail = Span::from_millis(tail.unwrap_or(0) as u64);
    }
    if let Some(at) = fields.take("share") {
        synth.plan.share = at.flag(complaints).unwrap_or(true);
    }
    if let Some(at) = fields.take("steal") {
        let words = [
            ("oldest", Steal::Oldest),
            ("quietest", Steal::Quietest),
            ("nothing", Steal::Nothing),
        ];
        synth.plan.steal = choice(&at, &words, complaints).unwrap_or_default();
    }
    if let Some(at) = fields.take("leave") {
        synth.plan.leave = leave(&at, complaints).unwrap_or_default();
    }
    let thinned = fields
        .take("bytes_per_s")
        .and_then(|at| at.whole("bytes a second", 100..=10_000_000, complaints));
    fields.finish(complaints);
    if thinned.is_some() {
        found.not_played(format!("`bytes_per_s` of {name}"));
    }
    Some(synth)
}

fn dialect(fields: &mut Fields<'_>, complaints: &mut Complaints) -> Spelling {
    let Some(at) = fields.take("dialect") else {
        return Spelling::ChannelBend;
    };
    let spelling = choice(&at, &DIALECTS, complaints);
    if spelling == Some(Spelling::NotYet) {
        complaints.add(
            &at.trail,
            format!("{} is not played by this version", at.node.shown()),
            "use mpe or channel-bend",
        );
    }
    spelling.unwrap_or(Spelling::ChannelBend)
}

/// `channels` and `drums`: which channels carry notes.
fn members(
    plan: &mut SynthPlan,
    mpe: bool,
    synth: &At<'_>,
    fields: &mut Fields<'_>,
    complaints: &mut Complaints,
) {
    let written = fields.take("channels");
    let place = written.as_ref().unwrap_or(synth).trail.clone();
    let all = written
        .and_then(|at| channels(&at, complaints))
        .unwrap_or(defaults::CHANNELS);
    let drums_default = if mpe {
        defaults::DRUMS_MPE
    } else {
        defaults::DRUMS
    };
    plan.drums = match fields.take("drums") {
        Some(at) => channels(&at, complaints).unwrap_or(drums_default),
        None => drums_default,
    };
    let spelt = spell_channels(all);
    if !mpe {
        plan.members = all.without(plan.drums);
        if plan.members == ChannelSet::NONE {
            complaints.add(
                &place,
                "no channel is left beside the drums",
                "give it a channel that is not in `drums`, or write `drums: []`",
            );
        }
        return;
    }
    let Some(manager) = zone_manager(all) else {
        complaints.add(
            &place,
            format!("{spelt} makes no MPE zone"),
            "a lower zone begins at 1, as in 1-8 (manager 1), an upper one ends at 16, as in 9-16 (manager 16)",
        );
        return;
    };
    let drummed = ChannelSet(all.0 & plan.drums.0);
    if drummed != ChannelSet::NONE {
        complaints.add(
            &place,
            format!(
                "the drum channel {} lies inside the MPE zone {spelt}",
                spell_channels(drummed)
            ),
            "a zone has no gaps: end it below the drums, as in `channels: 1-9`, or write `drums: []`",
        );
    }
    plan.dialect = Dialect::Mpe { manager };
    plan.members = all.without(ChannelSet::NONE.with(manager));
}

/// The manager, 0-15, of a zone that covers just these channels (MPE 1.1, 2.1: the outermost channel manages, members
/// follow without gaps).
fn zone_manager(all: ChannelSet) -> Option<u8> {
    let (first, last) = (all.iter().next()?, all.iter().last()?);
    let gapless = all.count() == u32::from(last - first) + 1 && all.count() >= 2;
    match (gapless, first, last) {
        (true, 0, _) => Some(0),
        (true, _, 15) => Some(15),
        _ => None,
    }
}

fn any_synth(name: &str, leave: Leave) -> Synth {
    Synth {
        device: Device {
            name: name.to_string(),
            port: Wish::Any,
        },
        plan: SynthPlan {
            name: name.into(),
            dialect: Dialect::ChannelBend,
            members: defaults::CHANNELS.without(defaults::DRUMS),
            bend_range: BendRange::new(defaults::BEND_RANGE).unwrap_or(BendRange::TWO),
            tail: Span::from_millis(defaults::TAIL_MS),
            drums: defaults::DRUMS,
            local_off: false,
            share: true,
            steal: Steal::Oldest,
            leave,
            pace: Span::from_millis(defaults::PACE_MS),
        },
    }
}

/// Local control is switched off through the output port of the same device, so that one must be a synth here.
fn silence(rig: &mut Rig, silenced: &[Wish], found: &mut Findings) {
    for wish in silenced {
        let twin = rig
            .synths
            .iter_mut()
            .find(|synth| synth.device.port == *wish && *wish != Wish::Any);
        match twin {
            Some(synth) => synth.plan.local_off = true,
            None => found.advise(
                "`local_sound: no` does nothing unless one of the synths has the same `port`: \
                 it is told through there",
            ),
        }
    }
}

/// Without `parts`, every key of every keyboard plays the first synth.
fn whole_keyboard() -> Part {
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
        part.offset = super::values::interval(&at, complaints).unwrap_or_default();
    }
    if let Some(at) = fields.take("pass") {
        part.pass = pass(&at, complaints);
    }
    if let Some(at) = fields.take("tune") {
        part.tune = at.flag(complaints).unwrap_or(true);
    }
    let follow = fields.take("follow").and_then(|at| at.flag(complaints));
    let mono = fields.take("mono").and_then(|at| at.flag(complaints));
    fields.finish(complaints);
    if follow == Some(false) {
        found.not_played("`follow: no` of a part");
    }
    if mono == Some(true) {
        found.not_played("`mono: yes` of a part");
    }
    Some(part)
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

/// A keyboard by name.
pub fn keyboard_named(at: &At<'_>, rig: &Rig, complaints: &mut Complaints) -> Option<KeyboardId> {
    let names: Vec<&str> = rig
        .keyboards
        .iter()
        .map(|k| k.device.name.as_str())
        .collect();
    device_named(at, "keyboard", &names, complaints).and_then(KeyboardId::new)
}

/// A synth by name.
pub fn synth_named(at: &At<'_>, rig: &Rig, complaints: &mut Complaints) -> Option<SynthId> {
    let names: Vec<&str> = rig.synths.iter().map(|s| s.device.name.as_str()).collect();
    device_named(at, "synth", &names, complaints).and_then(SynthId::new)
}

fn device_named(
    at: &At<'_>,
    what: &str,
    names: &[&str],
    complaints: &mut Complaints,
) -> Option<usize> {
    let text = at.text(&format!("the name of a {what}"), complaints)?;
    let place = names.iter().position(|name| *name == text);
    if place.is_none() {
        let right = match nearest(&text, names) {
            Some(near) => format!("did you mean `{near}`?"),
            None => format!("the {what}s of this rig: {}", one_of(names)),
        };
        complaints.add(&at.trail, format!("no {what} is called `{text}`"), right);
    }
    place
}
