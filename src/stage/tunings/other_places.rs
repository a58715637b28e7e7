//! Other places of keys (`also`) and groups of them (`turns`), to be taken while playing.

use super::body::distance_at;
use super::{OtherPlace, Turn, by_letter};
use crate::stage::complaint::Complaints;
use crate::stage::node::{At, nearest};
use crate::tuning::Letter;

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
