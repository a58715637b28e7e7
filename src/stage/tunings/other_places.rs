//! Other places of keys (`also`) and groups of them (`turns`), to be taken while playing.

use super::body::distance_at;
use super::{OtherPlace, Turn, by_letter};
use crate::limits::{PLACES_MAX, TURN_STEPS_MAX};
use crate::stage::complaint::Complaints;
use crate::stage::node::{At, nearest};
use crate::tuning::{Letter, Scale};

/// `also: {E: {natural: 9/8, flat: 90 c}}`.
pub(super) fn read_also(
    at: Option<&At<'_>>,
    also: &mut Vec<OtherPlace>,
    complaints: &mut Complaints,
) -> Option<()> {
    let Some(at) = at else { return Some(()) };
    let wanted = "keys and their other places by name, such as {E: {natural: 9/8}}";
    let fields = at.fields(wanted, complaints);
    let mut good = Some(());
    for (key, at) in by_letter::entries(fields, complaints)? {
        let Some(mut places) = at.fields(
            "places by name, such as {natural: 9/8, flat: 90 c}",
            complaints,
        ) else {
            good = None;
            continue;
        };
        for (name, at) in places.take_all() {
            let place = distance_at(&at, complaints);
            if name == "home" {
                complaints.add(
                    &at.trail,
                    "`home` is the place the key begins with",
                    "choose another name",
                );
                good = None;
            }
            if name.starts_with(['+', '-']) {
                let wrong =
                    format!("`{name}` begins with a sign, and `inflect {key} +5 c` is a nudge");
                complaints.add(&at.trail, wrong, "choose a name that begins with a letter");
                good = None;
            }
            let Some(place) = place else {
                good = None;
                continue;
            };
            also.retain(|other| other.key != key || other.name != name);
            also.push(OtherPlace { key, name, place });
        }
    }
    good
}

/// `turns: {saba: {G: flat}}`.
pub(super) fn read_turns(
    at: Option<&At<'_>>,
    also: &[OtherPlace],
    turns: &mut Vec<Turn>,
    complaints: &mut Complaints,
) -> Option<()> {
    let Some(at) = at else { return Some(()) };
    let mut fields = at.fields("turns by name, such as {saba: {G: flat}}", complaints)?;
    let mut good = Some(());
    for (name, at) in fields.take_all() {
        let fields = at.fields(
            "keys and the names of their places, such as {G: flat}",
            complaints,
        );
        let Some(entries) = by_letter::entries(fields, complaints) else {
            good = None;
            continue;
        };
        let mut keys = Vec::new();
        for (key, at) in entries {
            match place_name(key, &at, also, complaints) {
                Some(place) => keys.push((key, place)),
                None => good = None,
            }
        }
        turns.retain(|turn| turn.name != name);
        turns.push(Turn { name, keys });
    }
    good
}

/// Moves all of them so many keys up; they then go by their usual names.
pub(super) fn turn(also: &mut [OtherPlace], turns: &mut [Turn], keys: u8) {
    let moved = |letter: Letter| Letter::usual(letter.pitch_class() + keys);
    for other in also {
        other.key = moved(other.key);
    }
    for (letter, _) in turns.iter_mut().flat_map(|turn| &mut turn.keys) {
        *letter = moved(*letter);
    }
}

/// Whether the scale has room for its other places.
pub(super) fn fits(
    at: Option<&At<'_>>,
    scale: &Scale,
    also: &[OtherPlace],
    turns: &[Turn],
    complaints: &mut Complaints,
) -> Option<()> {
    let Some(at) = at else { return Some(()) };
    let steps: usize = turns.iter().map(|turn| turn.keys.len()).sum();
    let (wrong, right) = if scale.keys_to_period() != 12 {
        (
            format!(
                "`also` names keys by letter, and this tuning repeats after {} keys",
                scale.keys_to_period()
            ),
            String::from("give it twelve keys to the period, with `keys`"),
        )
    } else if also.len() > PLACES_MAX {
        (
            format!("these are {} other places", also.len()),
            format!("a tuning has at most {PLACES_MAX}"),
        )
    } else if steps > TURN_STEPS_MAX {
        (
            format!("the turns of this tuning name {steps} places"),
            format!("all turns together name at most {TURN_STEPS_MAX}"),
        )
    } else {
        return Some(());
    };
    complaints.add(&at.trail, wrong, right);
    None
}

/// The name of a place that `also` gives to a key.
fn place_name(
    key: Letter,
    at: &At<'_>,
    also: &[OtherPlace],
    complaints: &mut Complaints,
) -> Option<String> {
    let place = at.text("the name of a place", complaints)?;
    let mut known: Vec<&str> = also
        .iter()
        .filter(|other| other.key == key)
        .map(|other| other.name.as_str())
        .collect();
    known.push("home");
    if known.contains(&place.as_str()) {
        return Some(place);
    }
    let right = match nearest(&place, &known) {
        Some(near) => format!("did you mean `{near}`?"),
        None => format!("add it under `also`, or use {}", known.join(", ")),
    };
    complaints.add(
        &at.trail,
        format!("{key} has no place called `{place}`"),
        right,
    );
    None
}
