//! What of a song's tuning the player changes by hand: `begin_with`, `by_line`, and the table of places for the engine.

use super::complaint::{Complaints, Segment};
use super::node::{At, Fields};
use super::placing::Placed;
use super::songs::Desk;
use super::tunings::TuningText;
use super::values::letter_remedy;
use crate::engine::Place;
use crate::engine::plan::{ByHand, ByLine, NameId, OtherPlace, TurnStep};
use crate::tuning::{Letter, Scale, Turning};
use std::sync::Arc;

/// The keys that have other places in a song, as the tuning writes them and as they lie on the keyboard.
struct Places<'t> {
    described: &'t TuningText,
    /// The pitch class that the tuning is written from, and the one it is put on.
    written_from: u8,
    home: u8,
}

impl Places<'_> {
    fn keys_above(&self, letter: Letter) -> u8 {
        (letter.pitch_class() + 12 - self.written_from) % 12
    }

    /// The places of a key of the keyboard, but for home.
    fn of(&self, pitch_class: u8) -> Vec<&str> {
        let also = self.described.also.iter();
        also.filter(|other| (self.home + self.keys_above(other.key)) % 12 == pitch_class)
            .map(|other| other.name.as_str())
            .collect()
    }
}

fn places<'t>(described: &'t TuningText, placed: Option<&Placed>) -> Places<'t> {
    let written_from = match &described.scale {
        Scale::ByLetter(scale) => scale.home,
        Scale::FromTonic(scale) => scale.default_tonic().pitch_class(),
    };
    let home = placed.map_or(written_from, |placed| {
        placed.scale.tonic_of(&placed.placement).pitch_class()
    });
    Places {
        described,
        written_from,
        home,
    }
}

/// Takes `begin_with` and `by_line` of a song. `None` where its tuning cannot be put on the keys.
pub fn read(
    fields: &mut Fields<'_>,
    described: Option<&TuningText>,
    placed: Option<&Placed>,
    desk: &mut Desk<'_, '_>,
) -> Option<Arc<ByHand>> {
    let places = described.map(|described| places(described, placed));
    let complaints = &mut desk.found.complaints;
    let begin_with = begin_with(fields, places.as_ref(), complaints);
    let by_line = by_line(fields, places.as_ref(), complaints);
    let (Some(placed), Some(places)) = (placed, places) else {
        desk.told.unsure = true;
        return None;
    };
    desk.told.note(places.described, places.home, placed);
    let song = table(&places, placed, begin_with, by_line);
    if let Some(known) = desk.by_hand.iter().find(|known| ***known == song) {
        return Some(Arc::clone(known));
    }
    let song = Arc::new(song);
    desk.by_hand.push(Arc::clone(&song));
    Some(song)
}

fn begin_with(
    fields: &mut Fields<'_>,
    places: Option<&Places<'_>>,
    complaints: &mut Complaints,
) -> [Place; 12] {
    let mut begin_with = [Place::Home; 12];
    let Some(at) = fields.take("begin_with") else {
        return begin_with;
    };
    let wanted = "keys and their places, as in `{B: natural}`";
    let entries = at.fields(wanted, complaints);
    for (name, place) in entries.map(|mut all| all.take_all()).unwrap_or_default() {
        if let Some((key, place)) = place_of(&name, &place, places, complaints) {
            begin_with[key as usize] = place;
        }
    }
    begin_with
}

fn by_line(
    fields: &mut Fields<'_>,
    places: Option<&Places<'_>>,
    complaints: &mut Complaints,
) -> [Option<ByLine>; 12] {
    let mut by_line = [None; 12];
    let Some(at) = fields.take("by_line") else {
        return by_line;
    };
    let wanted = "keys and their places, as in `{E: {up: natural, down: home}}`";
    let entries = at.fields(wanted, complaints);
    for (name, ways) in entries.map(|mut all| all.take_all()).unwrap_or_default() {
        let wanted = "`{up: natural, down: home}`";
        let Some(mut ways) = ways.fields(wanted, complaints) else {
            continue;
        };
        let [up, down] = ["up", "down"].map(|way| {
            let at = ways.take(way)?;
            place_of(&name, &at, places, complaints)
        });
        if let Some((key, _)) = up.or(down) {
            by_line[key as usize] = Some(ByLine {
                up: up.map(|(_, place)| place),
                down: down.map(|(_, place)| place),
            });
        }
        ways.finish(complaints);
    }
    by_line
}

/// A key's pitch class and its place of that name.
fn place_of(
    name: &str,
    place: &At<'_>,
    places: Option<&Places<'_>>,
    complaints: &mut Complaints,
) -> Option<(u8, Place)> {
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
        return None;
    };
    let word = place.text("the name of a place, or home", complaints)?;
    let places = places?;
    let others = places.of(letter.pitch_class());
    if word == "home" {
        return Some((letter.pitch_class(), Place::Home));
    }
    if others.contains(&word.as_str()) {
        let place = Place::Named(NameId::of(&word));
        return Some((letter.pitch_class(), place));
    }
    let right = match others.is_empty() {
        true => format!("name it in the tuning: `also: {{{letter}: {{{word}: 100 c}}}}`"),
        false => format!("it has home, {}", others.join(", ")),
    };
    complaints.add(
        &place.trail,
        format!(
            "{letter} has no place `{word}` in {}",
            places.described.name
        ),
        right,
    );
    None
}

/// What the engine goes by. A tuning keeps to the limits where it is read.
fn table(
    places: &Places<'_>,
    placed: &Placed,
    begin_with: [Place; 12],
    by_line: [Option<ByLine>; 12],
) -> ByHand {
    let mut song = ByHand::nothing(placed.scale.tonic_of(&placed.placement));
    song.begin_with = begin_with;
    song.by_line = by_line;
    song.black_keys = placed.two_names;
    if let Scale::FromTonic(scale) = &placed.scale {
        song.turning = Some(Turning::of(scale, &placed.placement));
    }
    let also = places.described.also.iter().map(|other| OtherPlace {
        keys_above: places.keys_above(other.key),
        name: NameId::of(&other.name),
        above: other.place.interval(),
    });
    for (room, other) in song.places.iter_mut().zip(also) {
        *room = Some(other);
    }
    let turns = places.described.turns.iter();
    let steps = turns.flat_map(|turn| turn.keys.iter().map(|key| (NameId::of(&turn.name), key)));
    let steps = steps.map(|(turn, (letter, place))| TurnStep {
        turn,
        keys_above: places.keys_above(*letter),
        place: match place.as_str() {
            "home" => Place::Home,
            name => Place::Named(NameId::of(name)),
        },
    });
    for (room, step) in song.turns.iter_mut().zip(steps) {
        *room = Some(step);
    }
    song
}
