//! Lamps: feedback to a controller while something lasts.

use super::advice::Findings;
use super::complaint::{Complaints, Trail};
use super::expression::Mistake;
use super::naming::Scene;
use super::node::At;
use super::resolve::Refusal;
use super::values::{channels, key};
use super::words::{TonicBy, Words};
use super::{defaults, rig};
use crate::engine::Command;
use crate::engine::plan::{KeyboardId, LampPlan, Shown};
use crate::limits::{LAMPS_MAX, SYNTHS_MAX};
use crate::midi::status;

/// The lamps of an evening.
#[derive(Debug, Default)]
pub struct Lamps {
    pub plans: Vec<LampPlan>,
    /// Keyboards that have some.
    pub ports: Vec<KeyboardId>,
}

/// A light, and where it is written.
struct Light {
    trail: Trail,
    to: KeyboardId,
    on: [u8; 3],
    off: [u8; 3],
}

/// Reads the list behind `lamps`.
pub fn read(at: &At<'_>, scene: &Scene<'_>, found: &mut Findings) -> Lamps {
    let items = at.items();
    if let Some(first_too_many) = items.get(LAMPS_MAX) {
        found.complaints.add(
            &first_too_many.trail,
            format!("this is lamp number {}", LAMPS_MAX + 1),
            format!("a stage file holds at most {LAMPS_MAX} lamps"),
        );
    }
    let mut lamps = Lamps::default();
    let mut seen: Vec<Light> = Vec::new();
    for (index, item) in items.iter().take(LAMPS_MAX).enumerate() {
        let Some((show, light)) = lamp(item, index + 1, scene, found) else {
            continue;
        };
        // What a light is out by is its own, whatever it is lit by.
        let same = |other: &&Light| (other.to, other.off) == (light.to, light.off);
        if let Some(earlier) = seen.iter().find(same) {
            let line = found.complaints.line_of(&earlier.trail);
            found.complaints.add(
                &light.trail,
                format!("this light shows something already, on line {line}"),
                "give each its own note or controller",
            );
        }
        let place = lamps.ports.iter().position(|port| *port == light.to);
        let port = place.unwrap_or_else(|| {
            lamps.ports.push(light.to);
            lamps.ports.len() - 1
        });
        lamps.plans.extend(show.map(|show| LampPlan {
            show,
            port: port as u8,
            on: light.on,
            off: light.off,
        }));
        seen.push(light);
    }
    let (synths, ports) = (scene.rig.synths.len(), lamps.ports.len());
    if synths + ports > SYNTHS_MAX {
        found.complaints.add(
            &at.trail,
            format!(
                "{synths} synths and {ports} keyboards with lamps are {} output ports",
                synths + ports
            ),
            format!("trued has at most {SYNTHS_MAX}: give fewer keyboards lamps"),
        );
    }
    lamps
}

/// What is shown, if this version can, and where.
fn lamp(
    at: &At<'_>,
    number: usize,
    scene: &Scene<'_>,
    found: &mut Findings,
) -> Option<(Option<Shown>, Light)> {
    let wanted = "a map such as `{show: turn saba, send: {note: E2, to: pads}}`";
    let mut fields = at.fields(wanted, &mut found.complaints)?;
    let show = match fields.take("show") {
        Some(at) => shows(&at, number, scene, found),
        None => {
            let wrong = "this lamp shows nothing";
            found
                .complaints
                .add(&at.trail, wrong, "add `show: turn saba`");
            None
        }
    };
    let light = match fields.take("send") {
        Some(at) => light(&at, scene, &mut found.complaints),
        None => {
            let right = "add `send: {note: E2, to: pads}`";
            found
                .complaints
                .add(&at.trail, "this lamp sends nothing", right);
            None
        }
    };
    fields.finish(&mut found.complaints);
    Some((show, light?))
}

/// Words that last; `next` is over in a moment.
fn shows(at: &At<'_>, number: usize, scene: &Scene<'_>, found: &mut Findings) -> Option<Shown> {
    let text = at.text("words of `tell`, such as turn saba", &mut found.complaints)?;
    let mistake = match Words::parse(&text) {
        Err(mistake) => mistake,
        Ok(words) => match scene.names.resolve(&words) {
            Err(Refusal::Wrong(mistake)) => mistake,
            Err(Refusal::NotPlayed) => {
                found.not_played(format!("lamp {number}"));
                return None;
            }
            Ok(_) if !lasts(&words) => Mistake {
                wrong: format!("`{text}` is over in a moment, and a lamp shows what lasts"),
                right: String::from(
                    "show a song, a turn, a place, a black key, root hold, sevenths harmonic or plain",
                ),
            },
            Ok(_) if by_another_way(&words) => Mistake {
                wrong: String::from("a lamp shows where the tonic is, not how it came there"),
                right: String::from("leave `pivot` or `equal` out"),
            },
            Ok(command) => return Some(shown(&words, command, scene)),
        },
    };
    found
        .complaints
        .add(&at.trail, mistake.wrong, mistake.right);
    None
}

/// A song by its title is meant wherever it stands in the set, by its number only there.
fn shown(words: &Words, command: Command, scene: &Scene<'_>) -> Shown {
    match (words, command) {
        (Words::Song(Some(name)), Command::Song(place)) => {
            match scene.names.titles.contains(&name.as_str()) {
                true => Shown::Title(place),
                false => Shown::Song(place),
            }
        }
        (_, command) => Shown::Told(command),
    }
}

fn by_another_way(words: &Words) -> bool {
    matches!(words, Words::Tonic { by, .. } if *by != TonicBy::Absolute)
}

fn lasts(words: &Words) -> bool {
    match words {
        Words::Song(_)
        | Words::Pitch { .. }
        | Words::Transpose(_)
        | Words::Tonic { .. }
        | Words::TonicHome
        | Words::TonicByKey(_)
        | Words::Inflect { .. }
        | Words::InflectBy { .. }
        | Words::InflectHome
        | Words::Turn(_)
        | Words::BlackKey(_)
        | Words::Root(_)
        | Words::Sevenths { .. }
        | Words::Plain
        | Words::Home
        | Words::Keep => true,
        Words::Next { .. }
        | Words::Back
        | Words::Resend(_)
        | Words::Panic
        | Words::Fresh
        | Words::Reload
        | Words::Stop => false,
    }
}

/// `{note: E2, to: pads}` or `{controller: 20, to: pads}`, with `channel` and `value`.
fn light(at: &At<'_>, scene: &Scene<'_>, complaints: &mut Complaints) -> Option<Light> {
    let mut fields = at.fields("a map such as `{note: E2, to: pads}`", complaints)?;
    let note = fields.take("note").map(|at| key(&at, complaints));
    let controller = fields
        .take("controller")
        .map(|at| at.whole("a controller", 0..=119, complaints));
    if note.is_some() == controller.is_some() {
        complaints.add(
            &at.trail,
            "it is not clear what to send",
            "write one of `note: E2` and `controller: 20`",
        );
    }
    let value = match fields.take("value") {
        Some(at) => at.whole("how bright, or which colour", 1..=127, complaints),
        None => Some(i64::from(defaults::LAMP_VALUE)),
    };
    let channel = fields
        .take("channel")
        .map(|at| one_channel(&at, complaints));
    let to = match fields.take("to") {
        Some(at) => rig::keyboard_named(&at, scene.rig, complaints),
        None => {
            let right = "add `to:` and a keyboard";
            complaints.add(&at.trail, "this lamp has no place", right);
            None
        }
    };
    fields.finish(complaints);
    let (to, value) = (to?, value? as u8);
    let channel = match channel {
        Some(channel) => channel?,
        // Where the keyboard is heard, if that is one channel.
        None => {
            let heard = scene.rig.keyboards[to.index()].plan.channels;
            heard
                .iter()
                .next()
                .filter(|_| heard.count() == 1)
                .unwrap_or(0)
        }
    };
    let (on, off, number) = match (note, controller) {
        (Some(key), None) => (status::NOTE_ON, status::NOTE_OFF, key?.number()),
        (None, Some(number)) => (status::CONTROLLER, status::CONTROLLER, number? as u8),
        _ => return None,
    };
    Some(Light {
        trail: at.trail.clone(),
        to,
        on: [on | channel, number, value],
        off: [off | channel, number, 0],
    })
}

fn one_channel(at: &At<'_>, complaints: &mut Complaints) -> Option<u8> {
    let set = channels(at, complaints)?;
    let one = set.iter().next().filter(|_| set.count() == 1);
    if one.is_none() {
        let right = "write one channel, 1 to 16";
        complaints.add(&at.trail, "a light is on one channel", right);
    }
    one
}
