//! Tunings from the tonic as written: `pitches`, `equal`, `harmonics`, and the keys they fall on.

use super::body::{distance_at, pitch_at};
use super::by_letter::not_a_letter;
use crate::pitch::{Hertz, Log};
use crate::stage::complaint::{Complaints, Segment, Trail};
use crate::stage::expression::Expression;
use crate::stage::node::At;
use crate::tuning::{FromTonic, Key, KeyMap, Letter};

/// Steps in a period; a microtonal keyboard of the widest kind has far fewer.
const STEPS_MAX: i64 = 1200;
const HARMONIC_MAX: i64 = 4096;

fn from_steps(steps: Vec<Log>, period: Log) -> FromTonic {
    FromTonic {
        steps,
        period,
        map: KeyMap::EachKey,
        changes: [Log::ZERO; 12],
    }
}

/// `pitches: [1/1, 9/8, ...]` with `period`; also what step 0 sounds, where that is in hertz.
pub(super) fn pitches(
    at: &At<'_>,
    period: Option<&At<'_>>,
    complaints: &mut Complaints,
) -> Option<(FromTonic, Option<Hertz>)> {
    let period = match period {
        Some(at) => rising(at, complaints),
        None => Some(Log::OCTAVE),
    };
    let items = at.items();
    let mut read = Some(Vec::new());
    for item in &items {
        match pitch_at(item, complaints) {
            Some(pitch) => read
                .iter_mut()
                .for_each(|list: &mut Vec<_>| list.push((pitch, item))),
            None => read = None,
        }
    }
    let (period, pitches) = (period?, read?);
    let heard_at = match pitches.first() {
        Some((Expression::Distance(Log::ZERO), _)) => None,
        Some((Expression::Absolute(hertz, Log::ZERO), _)) => Some(*hertz),
        first => {
            let trail = first.map_or(&at.trail, |(_, item)| &item.trail);
            complaints.add(
                trail,
                "the first pitch is step 0, the tonic itself",
                "begin with 1/1, or with a frequency",
            );
            return None;
        }
    };
    let steps = above_first(&pitches, heard_at, complaints)?;
    if let (Some(last), Some((_, item))) = (steps.last(), pitches.last())
        && last.interval() == period.interval()
    {
        complaints.add(
            &item.trail,
            "this is the period, where the scale begins again",
            "leave it out",
        );
        return None;
    }
    Some((from_steps(steps, period), heard_at))
}

/// The pitches as distances from the first.
fn above_first(
    pitches: &[(Expression, &At<'_>)],
    heard_at: Option<Hertz>,
    complaints: &mut Complaints,
) -> Option<Vec<Log>> {
    let mut steps = Vec::with_capacity(pitches.len());
    for (pitch, item) in pitches {
        steps.push(match (pitch, heard_at) {
            (Expression::Distance(above), _) => *above,
            (Expression::Absolute(hertz, more), Some(tonic)) => {
                Log::of_ratio(hertz.micro(), tonic.micro()) + *more
            }
            (Expression::Absolute(..), None) => {
                complaints.add(
                    &item.trail,
                    "this pitch is in hertz, and step 0 is not",
                    "give the first one in hertz too",
                );
                return None;
            }
        });
    }
    Some(steps)
}

/// A distance upwards.
fn rising(at: &At<'_>, complaints: &mut Complaints) -> Option<Log> {
    let period = distance_at(at, complaints)?;
    if period <= Log::ZERO {
        complaints.add(
            &at.trail,
            "a period has to rise",
            "write one such as 2/1 or 1208 c",
        );
        return None;
    }
    Some(period)
}

/// `equal: {steps: 19, of: 2/1}`.
pub(super) fn equal(at: &At<'_>, complaints: &mut Complaints) -> Option<FromTonic> {
    let mut fields = at.fields("steps and of, such as {steps: 19, of: 2/1}", complaints)?;
    let (steps, of) = (fields.take("steps"), fields.take("of"));
    if steps.is_none() {
        complaints.add(
            &at.trail,
            "`steps` is missing",
            "write how many there are, such as {steps: 19, of: 2/1}",
        );
    }
    fields.finish(complaints);
    let steps =
        steps.and_then(|at| at.whole("how many steps there are", 1..=STEPS_MAX, complaints));
    let period = match of {
        Some(at) => rising(&at, complaints),
        None => Some(Log::OCTAVE),
    };
    let (steps, period) = (steps?, period?);
    Some(from_steps(
        (0..steps).map(|step| period.part(step, steps)).collect(),
        period,
    ))
}

/// `harmonics: {from: 8, to: 16}`: `to` is where the scale begins again.
pub(super) fn harmonics(at: &At<'_>, complaints: &mut Complaints) -> Option<FromTonic> {
    let mut fields = at.fields("from and to, such as {from: 8, to: 16}", complaints)?;
    let (from, to) = (fields.take("from"), fields.take("to"));
    for (field, at_field) in [("from", &from), ("to", &to)] {
        if at_field.is_none() {
            complaints.add(
                &at.trail,
                format!("`{field}` is missing"),
                "write both, such as {from: 8, to: 16}",
            );
        }
    }
    fields.finish(complaints);
    let mut number = |at: Option<At<'_>>| at?.whole("a harmonic", 1..=HARMONIC_MAX, complaints);
    let (from, to) = (number(from), number(to));
    let (from, to) = (from?, to?);
    if to <= from {
        complaints.add(
            &at.trail,
            format!("harmonics from {from} to {to} do not rise"),
            "let `to` be the larger",
        );
        return None;
    }
    let above = |number: i64| Log::of_ratio(number as u64, from as u64);
    Some(from_steps((from..to).map(above).collect(), above(to)))
}

/// `keys`, with `every` or without. The inner `None`: nothing is said, one key a step.
pub(super) fn key_map(
    keys: Option<&At<'_>>,
    every: Option<&At<'_>>,
    complaints: &mut Complaints,
) -> Option<Option<KeyMap>> {
    let Some(at) = keys else {
        if let Some(every) = every {
            complaints.add(
                &every.trail,
                "`every` goes with `keys`",
                "say which key has which step: keys: {C4: 0, D4: 1}",
            );
            return None;
        }
        return Some(None);
    };
    let every = match every {
        Some(at) => Some(at.whole("after how many keys the scale repeats", 1..=127, complaints)?),
        None => None,
    };
    let mut fields = at.fields("keys and their steps, such as {C: 0, D: 3}", complaints)?;
    let map = fields.trail.clone();
    let mut named = Some(Vec::new());
    for (name, at) in fields.take_all() {
        let trail = map.then(Segment::Name(name.clone()));
        let key = named_key(&name, every.is_some(), &trail, complaints);
        let step = at.whole("a step, counted from 0", 0..=STEPS_MAX * 10, complaints);
        match (key, step) {
            (Some(key), Some(step)) => {
                named
                    .iter_mut()
                    .for_each(|list: &mut Vec<_>| list.push((key, step as u32, trail.clone())));
            }
            _ => named = None,
        }
    }
    let named = named?;
    let Some((start, ..)) = named.iter().find(|(_, step, _)| *step == 0) else {
        complaints.add(
            &at.trail,
            "no key has step 0",
            "say which key the tonic is: give it step 0",
        );
        return None;
    };
    match every {
        Some(every) => by_key(*start, every, &named, complaints),
        None => by_letter(*start, &named, complaints),
    }
    .map(Some)
}

/// A key named in `keys`: with its octave where `every` is given, else a letter (then in the octave from C4).
fn named_key(name: &str, full: bool, trail: &Trail, complaints: &mut Complaints) -> Option<Key> {
    let key = Key::parse(name);
    let letter = Letter::parse(name);
    match (key, letter, full) {
        (Some(key), _, true) => Some(key),
        (_, Some(letter), false) => crate::tuning::Scale::tonic_key(letter).into(),
        (_, Some(_), true) => {
            complaints.add(
                trail,
                format!("`{name}` has no octave"),
                format!("beside `every` keys have their octave: `{name}4`"),
            );
            None
        }
        (Some(_), _, false) => {
            let wrong = format!("`{name}` has an octave");
            complaints.add(trail, wrong, "without `every` the letters repeat every twelve keys: leave the octave out, or add `every`");
            None
        }
        (None, None, _) => {
            let (wrong, right) = not_a_letter(name);
            complaints.add(trail, wrong, right);
            None
        }
    }
}

type Named = [(Key, u32, Trail)];

fn by_letter(start: Key, named: &Named, complaints: &mut Complaints) -> Option<KeyMap> {
    let mut steps = [None; 12];
    for (key, step, trail) in named {
        if steps[key.pitch_class() as usize].replace(*step).is_some() {
            complaints.add(
                trail,
                "this key stands here already under another name",
                "keep one of the two",
            );
            return None;
        }
    }
    Some(KeyMap::Letters {
        home: start.pitch_class(),
        steps,
    })
}

fn by_key(start: Key, every: i64, named: &Named, complaints: &mut Complaints) -> Option<KeyMap> {
    let mut steps = vec![None; every as usize];
    for (key, step, trail) in named {
        let above = key.number() as i64 - start.number() as i64;
        if !(0..every).contains(&above) {
            let wrong =
                format!("{key} is not within {every} keys upwards of {start}, which has step 0");
            complaints.add(
                trail,
                wrong,
                "name the keys from step 0 up to the next repeat",
            );
            return None;
        }
        if steps[above as usize].replace(*step).is_some() {
            complaints.add(
                trail,
                "this key stands here already under another name",
                "keep one of the two",
            );
            return None;
        }
    }
    Some(KeyMap::Keys { start, steps })
}
