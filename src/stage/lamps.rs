//! Lamps: feedback to a controller while something lasts. Checked here, played later.

use super::advice::Findings;
use super::complaint::Complaints;
use super::naming::Scene;
use super::node::At;
use super::rig;
use super::values::{channels, key};
use super::words::Words;

/// Checks the list behind `lamps`.
pub fn check(at: &At<'_>, scene: &Scene<'_>, found: &mut Findings) {
    for (index, item) in at.items().iter().enumerate() {
        let complaints = &mut found.complaints;
        let wanted = "a map such as `{show: turn saba, send: {note: E2, to: pads}}`";
        let Some(mut fields) = item.fields(wanted, complaints) else {
            continue;
        };
        match fields.take("show") {
            Some(at) => shows(&at, scene, complaints),
            None => complaints.add(
                &item.trail,
                "this lamp shows nothing",
                "add `show: turn saba`",
            ),
        }
        match fields.take("send") {
            Some(at) => send(&at, scene, complaints),
            None => complaints.add(
                &item.trail,
                "this lamp sends nothing",
                "add `send: {note: E2, to: pads}`",
            ),
        }
        fields.finish(complaints);
        found.not_played(format!("lamp {}", index + 1));
    }
}

/// Words that last; `next` is over in a moment.
fn shows(at: &At<'_>, scene: &Scene<'_>, complaints: &mut Complaints) {
    let Some(text) = at.text("words of `tell`, such as turn saba", complaints) else {
        return;
    };
    let mistake = match Words::parse(&text) {
        Ok(words) => match scene.missing(&words) {
            None if lasts(&words) => return,
            None => {
                complaints.add(
                    &at.trail,
                    format!("`{text}` is over in a moment, and a lamp shows what lasts"),
                    "show a song, a turn, a place, a black key, root hold, sevenths harmonic or plain",
                );
                return;
            }
            Some(mistake) => mistake,
        },
        Err(mistake) => mistake,
    };
    complaints.add(&at.trail, mistake.wrong, mistake.right);
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

/// `{note: E2, to: pads}` or `{controller: 20, to: pads}`; the controller is one of the keyboards.
fn send(at: &At<'_>, scene: &Scene<'_>, complaints: &mut Complaints) {
    let Some(mut fields) = at.fields("a map such as `{note: E2, to: pads}`", complaints) else {
        return;
    };
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
    if let Some(at) = fields.take("channel") {
        channels(&at, complaints);
    }
    match fields.take("to") {
        Some(at) => {
            rig::keyboard_named(&at, scene.rig, complaints);
        }
        None => complaints.add(
            &at.trail,
            "this lamp has no place",
            "add `to:` and a keyboard",
        ),
    }
    fields.finish(complaints);
}
