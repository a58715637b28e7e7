//! Where a song puts its tuning: reference pitch, tonic, black keys.

use super::black_keys;
use super::complaint::Complaints;
use super::defaults;
use super::expression::{self, Mistake};
use super::node::{At, Fields, Node};
use super::songs::Desk;
use super::tunings::{Reference, TuningText};
use super::values::{self, choice, key, letter};
use crate::engine::plan::TwoNames;
use crate::pitch::{Hertz, Interval, Log};
use crate::tuning::{Key, Letter, Pin, Placement, Scale, TuneError, Tuning};
use std::sync::Arc;

/// `A4 = 415 Hz`.
fn equation(text: &str) -> Option<(Key, Hertz)> {
    let (key, hertz) = text.split_once('=')?;
    Some((
        Key::parse(key.trim())?,
        expression::hertz(hertz.trim()).ok()?,
    ))
}

/// `A4 = 415 Hz`, or `{key: A4, hz: 415, pin: key}`.
pub fn pitch(at: &At<'_>, complaints: &mut Complaints) -> Option<Reference> {
    if let Node::Map(_) = at.node {
        return pitch_map(at, complaints);
    }
    let text = at.text("a pitch such as A4 = 415 Hz", complaints)?;
    if let Some((key, hertz)) = equation(&text) {
        return Some((key, hertz, Pin::Key));
    }
    let Mistake { wrong, right } = bad_equation(&text);
    complaints.add(&at.trail, wrong, right);
    None
}

fn bad_equation(text: &str) -> Mistake {
    let example = String::from("write a key, = and its frequency, as in A4 = 415 Hz");
    let mistake = |wrong, right| Mistake { wrong, right };
    let Some((key, hertz)) = text.split_once('=') else {
        let right = match expression::hertz(text) {
            Ok(hertz) => format!("say which key sounds it: A4 = {} Hz", hertz.hertz()),
            Err(_) => example,
        };
        return mistake(format!("`{text}` is not a pitch"), right);
    };
    let key = key.trim();
    if Key::parse(key).is_none() {
        return mistake(
            format!("`{key}` in `{text}` is not a key"),
            values::key_remedy(key),
        );
    }
    match expression::hertz(hertz.trim()) {
        Ok(_) => mistake(format!("`{text}` is not a pitch"), example),
        Err(mistake) => mistake,
    }
}

fn pitch_map(at: &At<'_>, complaints: &mut Complaints) -> Option<Reference> {
    let mut fields = at.fields("A4 = 415 Hz", complaints)?;
    let usual = equation(defaults::REFERENCE);
    let reference = match fields.take("key") {
        Some(at) => key(&at, complaints),
        None => usual.map(|(key, _)| key),
    };
    let hertz = match fields.take("hz") {
        Some(at) => {
            let text = at.text("a frequency such as 415", complaints)?;
            match expression::hertz(&text) {
                Ok(hertz) => Some(hertz),
                Err(mistake) => {
                    complaints.add(&at.trail, mistake.wrong, mistake.right);
                    None
                }
            }
        }
        None => {
            // 440 belongs to A4; another key needs a frequency of its own.
            if reference.is_some_and(|key| usual.is_some_and(|(usual, _)| key != usual)) {
                complaints.add(&at.trail, "this pitch has no frequency", "add `hz: 415`");
            }
            usual.map(|(_, hertz)| hertz)
        }
    };
    let pin = match fields.take("pin") {
        Some(at) => choice(&at, &[("key", Pin::Key), ("tonic", Pin::Tonic)], complaints),
        None => Some(Pin::Key),
    };
    fields.finish(complaints);
    Some((reference?, hertz?, pin?))
}

/// A tuning put on the keys.
pub struct Placed {
    pub scale: Scale,
    pub placement: Placement,
    pub tuning: Arc<Tuning>,
    pub names: [Letter; 12],
    /// By pitch class.
    pub two_names: [Option<TwoNames>; 12],
    /// The harmony chooses between two names.
    pub by_chord: bool,
}

/// Takes `pitch`, `tonic`, `turned_to`, `black_keys` and `by_chord`, and puts the tuning there.
pub fn read(
    fields: &mut Fields<'_>,
    described: Option<&TuningText>,
    song: &At<'_>,
    desk: &mut Desk<'_, '_>,
) -> Option<Placed> {
    let pitch_at = fields.take("pitch");
    let reference = match &pitch_at {
        Some(at) => Some(pitch(at, &mut desk.found.complaints)),
        None => desk.pitch.map(Some),
    };
    let tonic_at = fields.take("tonic");
    let turned_at = fields.take("turned_to");
    let black_at = fields.take("black_keys");
    let chord_at = fields.take("by_chord");
    let by_chord = (chord_at.as_ref())
        .and_then(|at| at.flag(&mut desk.found.complaints))
        .unwrap_or(false);
    let described = described?;
    let mut scale = described.scale.clone();
    let complaints = &mut desk.found.complaints;
    let tonic = tonic(tonic_at.as_ref(), &scale, &described.name, complaints);
    let turned_to = turned_to(turned_at.as_ref(), &scale, &described.name, complaints);
    let two_names = match &black_at {
        Some(at) => black_keys::read(at, &mut scale, turned_to, &mut desk.found.complaints),
        None => [None; 12],
    };
    if let Some(at) = chord_at.filter(|_| by_chord) {
        black_keys::check_choice(&at, &two_names, described, &mut desk.found.complaints);
    }
    // Not written at all is one thing (the tuning may bring its own), written wrong is another.
    let reference = match reference {
        Some(written) => Some(written?),
        None => None,
    };
    for names in two_names.iter().flatten() {
        if names.apart == Interval::ZERO {
            desk.found.advise(format!(
                "{} and {} are one pitch in {}: as either the key sounds the same",
                names.first, names.second, described.name
            ));
        }
    }
    let placement = described.placement(tonic, turned_to, reference);
    let mut names = scale.names(&placement);
    if let (Scale::FromTonic(_), Some(at)) = (&scale, &black_at) {
        black_keys::call(at, &mut names);
    }
    let place = pitch_at.as_ref().unwrap_or(song);
    let tuning = put(&scale, &placement, &described.name, place, desk)?;
    Some(Placed {
        scale,
        placement,
        tuning,
        names,
        two_names,
        by_chord,
    })
}

/// Puts a scale on the keys, or hands out what another song has put there already.
fn put(
    scale: &Scale,
    placement: &Placement,
    name: &str,
    place: &At<'_>,
    desk: &mut Desk<'_, '_>,
) -> Option<Arc<Tuning>> {
    let known = desk
        .placed
        .iter()
        .find(|(other, at, _)| at == placement && other == scale);
    if let Some((_, _, tuning)) = known {
        return Some(Arc::clone(tuning));
    }
    match scale.tune(placement) {
        Ok(tuning) => {
            let tuning = Arc::new(tuning);
            desk.placed
                .push((scale.clone(), *placement, Arc::clone(&tuning)));
            Some(tuning)
        }
        Err(TuneError::SilentReference(key)) => {
            desk.found.complaints.add(
                &place.trail,
                format!("the reference key {key} is silent in {name}"),
                sounding_reference(scale, placement),
            );
            None
        }
        Err(TuneError::NothingSounds) => {
            desk.found.complaints.add(
                &place.trail,
                format!("no key at all sounds in {name} here"),
                "give at least one key a pitch, and a tonic within the keyboard",
            );
            None
        }
    }
}

/// Both remedies for a silent reference key: the nearest one that sounds, and the tonic.
fn sounding_reference(scale: &Scale, placement: &Placement) -> String {
    let silent = placement.reference;
    let hertz = placement.hertz.hertz();
    let by_tonic = Placement {
        pin: Pin::Tonic,
        ..*placement
    };
    let pin = format!(
        "let the tonic stand where equal temperament puts it, `pitch: {{key: {silent}, hz: {hertz}, pin: tonic}}`"
    );
    let distance = |key: &Key| key.number().abs_diff(silent.number());
    let nearest = scale.tune(&by_tonic).ok().and_then(|tuning| {
        let sounding = Key::all().filter(|key| tuning.pitch(*key).is_some());
        sounding.min_by_key(distance)
    });
    match nearest {
        Some(key) => {
            let semitones = f64::from(key.number()) - f64::from(silent.number());
            let equal = hertz * 2f64.powf(semitones / 12.0);
            format!("name a key that sounds, `pitch: {key} = {equal:.2} Hz`, or {pin}")
        }
        None => pin,
    }
}

/// The key with step 0. By letter there is none, and asking for one is a misunderstanding worth a word.
fn tonic(
    at: Option<&At<'_>>,
    scale: &Scale,
    name: &str,
    complaints: &mut Complaints,
) -> Option<Key> {
    let Scale::FromTonic(_) = scale else {
        let at = at?;
        let typed = at.node.shown();
        let letter = typed.trim_matches('`');
        complaints.add(
            &at.trail,
            format!("{name} goes by letter: its keys keep their pitches whatever the tonic"),
            format!(
                "leave `tonic` out (`in: {letter}` says which key the piece is in), or turn the tuning on purpose \
                 with `turned_to: {letter}`"
            ),
        );
        return None;
    };
    let at = at?;
    let text = at.text("a key such as D, or D4", complaints)?;
    let key = match Letter::parse(&text) {
        Some(letter) => Some(Scale::tonic_key(letter)),
        None => Key::parse(&text),
    };
    if key.is_none() {
        let mode = text.split_once(' ').map(|(first, _)| first);
        let (wrong, right) = match mode.and_then(Letter::parse) {
            Some(letter) => (
                format!("a tonic is one key, and `{text}` has a mode"),
                format!("write `tonic: {letter}`; `in: {text}` says which key the piece is in"),
            ),
            None => (
                format!("`{text}` is not a key"),
                String::from(
                    "write a letter, # or b if it has one, and an octave if you like: D, Eb, D4",
                ),
            ),
        };
        complaints.add(&at.trail, wrong, right);
    }
    key
}

fn turned_to(
    at: Option<&At<'_>>,
    scale: &Scale,
    name: &str,
    complaints: &mut Complaints,
) -> Option<Letter> {
    let at = at?;
    let letter = letter(at, complaints)?;
    if let Scale::FromTonic(_) = scale {
        complaints.add(
            &at.trail,
            format!("{name} goes from the tonic and is turned by it"),
            format!("write `tonic: {letter}`"),
        );
        return None;
    }
    Some(letter)
}

/// Whether a scale repeats at the octave every twelve keys, as harmony needs it.
pub fn twelve_to_the_octave(scale: &Scale) -> bool {
    match scale {
        Scale::ByLetter(_) => true,
        Scale::FromTonic(scale) => scale.keys_to_period() == 12 && scale.period == Log::OCTAVE,
    }
}
