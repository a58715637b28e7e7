//! What of a song's tuning the player changes by hand: `begin_with`, `by_line`, and the table of places for the engine.

use super::Song;
use super::complaint::{Complaints, Segment};
use super::node::{At, Fields};
use super::placing::Placed;
use super::songs::Desk;
use super::tunings::TuningText;
use super::values::letter_remedy;
use crate::engine::Place;
use crate::engine::plan::{ByHand, ByLine, NameId, OtherPlace, TurnStep};
use crate::tuning::{Key, Letter, Scale, Tuning, Turning};
use std::sync::Arc;

impl Song {
    /// What its keys sound as it begins: with the places of `begin_with`.
    pub fn as_it_begins(&self) -> Tuning {
        let song = &self.by_hand;
        let pitch = |key: Key| {
            let Place::Named(name) = song.begin_with[key.pitch_class() as usize] else {
                return self.tuning.pitch(key);
            };
            let above = i64::from(key.number()) - i64::from(song.home.number());
            match song.other_place(above.rem_euclid(12) as u8, name) {
                Some(place) => {
                    let home = self.tuning.pitch(song.home)?;
                    Some(home + song.period() * above.div_euclid(12) + place)
                }
                None => self.tuning.pitch(key),
            }
        };
        Tuning::new(std::array::from_fn(|key| {
            Key::new(key as u8).and_then(pitch)
        }))
    }
}

/// The keys that have other places in a song, as the tuning writes them and as they lie on the keyboard.
struct Places<'t> {
    described: &'t TuningText,
    /// It stands in the stage file, where a place can be added.
    is_own: bool,
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

fn places<'t>(described: &'t TuningText, is_own: bool, placed: Option<&Placed>) -> Places<'t> {
    let written_from = match &described.scale {
        Scale::ByLetter(scale) => scale.home,
        Scale::FromTonic(scale) => scale.default_tonic().pitch_class(),
    };
    let home = placed.map_or(written_from, |placed| {
        placed.scale.tonic_of(&placed.placement).pitch_class()
    });
    Places {
        described,
        is_own,
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
    let places = described.map(|described| {
        let is_own = desk.tunings.is_own(&described.name);
        places(described, is_own, placed)
    });
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
        let Some(letter) = key_of(&name, &place, complaints) else {
            continue;
        };
        if let Some(place) = place_of(letter, &place, places, complaints) {
            begin_with[letter.pitch_class() as usize] = place;
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
        let Some(letter) = key_of(&name, &ways, complaints) else {
            continue;
        };
        let wanted = "`{up: natural, down: home}`";
        let Some(mut fields) = ways.fields(wanted, complaints) else {
            continue;
        };
        let [up, down] = ["up", "down"].map(|way| fields.take(way));
        if up.is_none() && down.is_none() && fields.is_empty() {
            let wrong = format!("neither way is named for {letter}");
            complaints.add(&ways.trail, wrong, format!("write {wanted}"));
        }
        fields.finish(complaints);
        let [up, down] = [up, down].map(|at| place_of(letter, &at?, places, complaints));
        if up.is_some() || down.is_some() {
            by_line[letter.pitch_class() as usize] = Some(ByLine { up, down });
        }
    }
    by_line
}

/// The key that an entry is about; `entry` is what stands behind its name, or within that.
fn key_of(name: &str, entry: &At<'_>, complaints: &mut Complaints) -> Option<Letter> {
    let letter = Letter::parse(name);
    if letter.is_none() {
        let mut trail = entry.trail.clone();
        if let Some(last) = trail.steps.last_mut() {
            *last = Segment::Name(name.to_string());
        }
        let wrong = format!("`{name}` is not the name of a key");
        complaints.add(&trail, wrong, letter_remedy(name));
    }
    letter
}

/// A key's place of that name.
fn place_of(
    letter: Letter,
    place: &At<'_>,
    places: Option<&Places<'_>>,
    complaints: &mut Complaints,
) -> Option<Place> {
    let word = place.text("the name of a place, or home", complaints)?;
    let places = places?;
    let others = places.of(letter.pitch_class());
    if word == "home" {
        return Some(Place::Home);
    }
    if others.contains(&word.as_str()) {
        return Some(Place::Named(NameId::of(&word)));
    }
    let tuning = &places.described.name;
    let right = match (others.is_empty(), places.is_own) {
        (true, true) => format!("name it in the tuning: `also: {{{letter}: {{{word}: 100 c}}}}`"),
        (true, false) => format!(
            "give it one in a tuning of your own: `{{like: {tuning}, also: {{{letter}: {{{word}: 100 c}}}}}}`"
        ),
        (false, _) => format!("it has home, {}", others.join(", ")),
    };
    complaints.add(
        &place.trail,
        format!("{letter} has no place `{word}` in {tuning}"),
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
    song.by_chord = placed.by_chord.then_some(placed.names);
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
