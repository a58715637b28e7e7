//! `notes`: places of named keys above a tonic of their own.

use super::body::{letter_at, pitch_at};
use super::by_letter::{entries, equal};
use crate::pitch::{Hertz, Log};
use crate::stage::complaint::Complaints;
use crate::stage::expression::Expression;
use crate::stage::node::At;
use crate::tuning::{ByLetter, Letter, near_key};

/// `notes: {D: 1/1, E: 145 c}` with `tonic` and `others`; also what the tonic sounds, where that is in hertz.
pub(super) fn notes(
    at: &At<'_>,
    tonic: Option<&At<'_>>,
    others: Option<&At<'_>>,
    complaints: &mut Complaints,
) -> Option<(ByLetter, Option<Hertz>)> {
    let tonic = match tonic {
        Some(at) => letter_at(at, complaints),
        None => Some(Letter::C),
    };
    let silent = match others {
        Some(at) => silent_others(at, complaints),
        None => Some(false),
    };
    let fields = at.fields(
        "keys and their places above the tonic, such as {D: 1/1, E: 145 c}",
        complaints,
    );
    let mut pitches = Some(Vec::new());
    for (name, at) in entries(fields, complaints)? {
        match pitch_at(&at, complaints) {
            Some(pitch) => pitches
                .iter_mut()
                .for_each(|list: &mut Vec<_>| list.push((name, pitch, at.clone()))),
            None => pitches = None,
        }
    }
    let (tonic, silent, pitches) = (tonic?, silent?, pitches?);
    let mut scale = equal();
    if silent {
        scale.places = [None; 12];
    }
    scale.home = tonic.pitch_class();
    scale.names[scale.home as usize] = tonic;
    scale.places[scale.home as usize] = Some(Log::OCTAVE.part(scale.home as i64, 12));
    let heard_at = tonic_hertz(tonic, &pitches, complaints)?;
    let mut good = Some(());
    for (name, pitch, at) in pitches {
        match note_place(name, tonic, pitch, heard_at, &at, complaints) {
            Some(place) => {
                scale.places[name.pitch_class() as usize] = Some(place);
                scale.names[name.pitch_class() as usize] = name;
            }
            None => good = None,
        }
    }
    good?;
    Some((scale.from_c(), heard_at))
}

fn silent_others(at: &At<'_>, complaints: &mut Complaints) -> Option<bool> {
    match at.text("equal or silent", complaints)?.as_str() {
        "equal" => Some(false),
        "silent" => Some(true),
        other => {
            complaints.add(
                &at.trail,
                format!("`{other}` is not what other keys can be"),
                "write equal or silent",
            );
            None
        }
    }
}

/// What the tonic sounds, where it is written in hertz. The tonic of `notes` is 1/1 otherwise.
fn tonic_hertz(
    tonic: Letter,
    pitches: &[(Letter, Expression, At<'_>)],
    complaints: &mut Complaints,
) -> Option<Option<Hertz>> {
    let written = pitches
        .iter()
        .find(|(name, ..)| name.pitch_class() == tonic.pitch_class());
    match written {
        None | Some((_, Expression::Distance(Log::ZERO), _)) => Some(None),
        Some((_, Expression::Absolute(hertz, Log::ZERO), _)) => Some(Some(*hertz)),
        Some((name, _, at)) => {
            let wrong = format!("{name} is the tonic, from which the others are counted");
            complaints.add(
                &at.trail,
                wrong,
                "write 1/1 for it, or a plain frequency; `change` moves a key afterwards",
            );
            None
        }
    }
}

/// Where a note stands above C (the zero of the tonic's equal place).
fn note_place(
    name: Letter,
    tonic: Letter,
    pitch: Expression,
    heard_at: Option<Hertz>,
    at: &At<'_>,
    complaints: &mut Complaints,
) -> Option<Log> {
    let tonic_place = Log::OCTAVE.part(tonic.pitch_class() as i64, 12);
    match (pitch, heard_at) {
        (Expression::Distance(above), _) if above < Log::ZERO => {
            complaints.add(
                &at.trail,
                format!("this puts {name} below the tonic"),
                "places are above the tonic: add an octave, 2/1 or 1200 c",
            );
            None
        }
        (Expression::Distance(above), _) => {
            // Keys below the tonic within C's octave are played an octave down.
            let octave = if name.pitch_class() < tonic.pitch_class() {
                Log::OCTAVE
            } else {
                Log::ZERO
            };
            Some(tonic_place + above - octave)
        }
        (Expression::Absolute(hertz, more), Some(tonic)) => {
            let above = Log::of_ratio(hertz.micro(), tonic.micro()) + more;
            Some(near_key(name, tonic_place + above))
        }
        (Expression::Absolute(..), None) => {
            complaints.add(
                &at.trail,
                format!("{name} is in hertz, and the tonic is not"),
                format!("give {tonic} in hertz too"),
            );
            None
        }
    }
}
