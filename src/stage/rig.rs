//! Keyboards, synths and the parts that bind them.

use super::advice::Findings;
use super::complaint::Complaints;
use super::node::{At, Fields, nearest};
use super::parts::{self, Part};
use super::synth;
use super::values::{channels, choice, one_of};
use super::{Device, Wish, defaults};
use crate::engine::plan::{ChannelSet, KeyboardId, KeyboardPlan, Leave, SynthId, SynthPlan, Zones};
use crate::limits::{BEND_RANGE_MAX, KEYBOARDS_MAX, SYNTHS_MAX};

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
        if let Some(synth) = synth::synth(name, &at, sections.leave, found) {
            rig.synths.push(synth);
        }
    }
    if rig.synths.is_empty() {
        rig.synths.push(synth::any_synth("synth", sections.leave));
    }
    silence(&mut rig, &silenced, found);
    if let Some(at) = &sections.parts {
        rig.parts = parts::parts(at, &rig, found);
    }
    if rig.parts.is_empty() {
        rig.parts.push(parts::whole_keyboard());
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
    let written = fields.take("channel");
    if let Some(at) = &written {
        keyboard.plan.channels = channels(at, complaints).unwrap_or(ChannelSet::ALL);
    }
    const SENDS: [(&str, bool); 2] = [(defaults::SENDS, false), ("mpe", true)];
    let sends = fields.take("sends");
    let sends = sends.and_then(|at| choice(&at, &SENDS, complaints));
    if sends == Some(true) {
        let all = keyboard.plan.channels;
        let place = &written.as_ref().unwrap_or(at).trail;
        if let Some(manager) = synth::zone(all, place, complaints) {
            keyboard.plan.zones.set(manager, all.count() as u8 - 1);
        }
    }
    if let Some(at) = fields.take("bend_range") {
        let range = 1..=BEND_RANGE_MAX as i64;
        let bends = at.whole("semitones of a full bend of one note", range, complaints);
        keyboard.plan.finger_semitones = bends.unwrap_or(1) as u8;
        if sends != Some(true) {
            complaints.add(
                &at.trail,
                "this keyboard sends all notes on one channel and bends none by itself",
                "write `sends: mpe` if each has a channel of its own, or `wheel: 12` for what the wheel means",
            );
        }
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
            zones: Zones::NONE,
            finger_semitones: defaults::BEND_RANGE_MPE,
        },
    }
}

/// `port` and `socket`.
pub fn port(fields: &mut Fields<'_>, complaints: &mut Complaints) -> Wish {
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

/// A keyboard by name.
pub fn keyboard_named(at: &At<'_>, rig: &Rig, complaints: &mut Complaints) -> Option<KeyboardId> {
    let names: Vec<&str> = rig
        .keyboards
        .iter()
        .map(|k| k.device.name.as_str())
        .collect();
    let synth = |name: &str| rig.synths.iter().any(|s| s.device.name == name);
    device_named(at, ("keyboard", "synth"), &names, synth, complaints).and_then(KeyboardId::new)
}

/// A synth by name.
pub fn synth_named(at: &At<'_>, rig: &Rig, complaints: &mut Complaints) -> Option<SynthId> {
    let names: Vec<&str> = rig.synths.iter().map(|s| s.device.name.as_str()).collect();
    let keyboard = |name: &str| rig.keyboards.iter().any(|k| k.device.name == name);
    device_named(at, ("synth", "keyboard"), &names, keyboard, complaints).and_then(SynthId::new)
}

fn device_named(
    at: &At<'_>,
    (what, other): (&str, &str),
    names: &[&str],
    is_other: impl Fn(&str) -> bool,
    complaints: &mut Complaints,
) -> Option<usize> {
    let text = at.text(&format!("the name of a {what}"), complaints)?;
    let place = names.iter().position(|name| *name == text);
    if place.is_none() {
        let right = match nearest(&text, names) {
            Some(near) => format!("did you mean `{near}`?"),
            None => format!("the {what}s of this rig: {}", one_of(names)),
        };
        let wrong = match is_other(&text) {
            true => format!("`{text}` is a {other}, and a {what} belongs here"),
            false => format!("no {what} is called `{text}`"),
        };
        complaints.add(&at.trail, wrong, right);
    }
    place
}
