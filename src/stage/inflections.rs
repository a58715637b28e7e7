//! `begin_with` and `by_line`: which of its places a key takes. Checked here, played later.

use super::advice::Findings;
use super::complaint::{Complaints, Segment};
use super::node::{At, Fields};
use super::tunings::TuningText;
use super::values::letter_remedy;
use crate::tuning::Letter;

/// Takes both fields of a song.
pub fn check(
    fields: &mut Fields<'_>,
    title: &str,
    described: Option<&TuningText>,
    found: &mut Findings,
) {
    if let Some(at) = fields.take("begin_with") {
        let wanted = "keys and their places, as in `{B: natural}`";
        let entries = at.fields(wanted, &mut found.complaints);
        for (name, place) in entries.map(|mut all| all.take_all()).unwrap_or_default() {
            place_of(&name, &place, described, &mut found.complaints);
        }
        found.not_played(format!("`begin_with` ({title})"));
    }
    if let Some(at) = fields.take("by_line") {
        let wanted = "keys and their places, as in `{E: {up: natural, down: home}}`";
        let entries = at.fields(wanted, &mut found.complaints);
        for (name, ways) in entries.map(|mut all| all.take_all()).unwrap_or_default() {
            let wanted = "`{up: natural, down: home}`";
            let Some(mut ways) = ways.fields(wanted, &mut found.complaints) else {
                continue;
            };
            for way in ["up", "down"] {
                if let Some(place) = ways.take(way) {
                    place_of(&name, &place, described, &mut found.complaints);
                }
            }
            ways.finish(&mut found.complaints);
        }
        found.not_played(format!("`by_line` ({title})"));
    }
}

/// Checks that a key of the tuning has a place of that name.
fn place_of(
    name: &str,
    place: &At<'_>,
    described: Option<&TuningText>,
    complaints: &mut Complaints,
) {
    let mut key_trail = place.trail.clone();
    while let Some(step) = key_trail.steps.last() {
        if *step == Segment::Key(name.to_string()) {
            break;
        }
        key_trail.steps.pop();
    }
    if let Some(last) = key_trail.steps.last_mut() {
        *last = Segment::Name(name.to_string());
    }
    let Some(letter) = Letter::parse(name) else {
        complaints.add(
            &key_trail,
            format!("`{name}` is not the name of a key"),
            letter_remedy(name),
        );
        return;
    };
    let Some(word) = place.text("the name of a place, or home", complaints) else {
        return;
    };
    let Some(described) = described else {
        return;
    };
    let others: Vec<&str> = (described.also.iter())
        .filter(|other| other.key == letter)
        .map(|other| other.name.as_str())
        .collect();
    if word == "home" || others.contains(&word.as_str()) {
        return;
    }
    let right = match others.is_empty() {
        true => format!("name it in the tuning: `also: {{{letter}: {{{word}: 100 c}}}}`"),
        false => format!("it has home, {}", others.join(", ")),
    };
    complaints.add(
        &place.trail,
        format!("{letter} has no place `{word}` in {}", described.name),
        right,
    );
}
