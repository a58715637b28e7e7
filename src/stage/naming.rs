//! Whether what words name is there: songs of the set, synths, turns and places of the tunings.

use super::expression::Mistake;
use super::node::nearest;
use super::resolve::{Names, Refusal};
use super::rig::Rig;
use super::tunings::TuningText;
use super::values::one_of;
use super::words::{Inflected, Words};
use std::rc::Rc;

/// What cues and lamps are read against.
pub struct Scene<'s> {
    pub rig: &'s Rig,
    /// Also of songs that are written wrong.
    pub names: Names<'s>,
    /// The tunings of the songs, for the names of turns and places.
    pub tunings: &'s [Rc<TuningText>],
    pub programs_from: u8,
}

impl Scene<'_> {
    /// What the words name and nobody has.
    pub fn missing(&self, words: &Words) -> Option<Mistake> {
        match words {
            Words::Turn(name) => self.no_turn(name),
            Words::Inflect { key, place } => self.no_place(*key, place),
            words => match self.names.resolve(words) {
                Err(Refusal::Wrong(mistake)) => Some(mistake),
                Ok(_) | Err(Refusal::NotPlayed) => None,
            },
        }
    }

    fn no_turn(&self, name: &str) -> Option<Mistake> {
        let turns = self.tunings.iter().flat_map(|tuning| &tuning.turns);
        let names: Vec<&str> = turns.map(|turn| turn.name.as_str()).collect();
        if names.contains(&name) {
            return None;
        }
        let right = match (nearest(name, &names), names.is_empty()) {
            (Some(near), _) => format!("did you mean `{near}`?"),
            (None, true) => String::from("name it in a tuning, as in `turns: {saba: {G: flat}}`"),
            (None, false) => format!("the tunings have {}", one_of(&names)),
        };
        Some(mistake(format!("no tuning has a turn `{name}`"), right))
    }

    fn no_place(&self, key: Inflected, place: &str) -> Option<Mistake> {
        let letter_matches = |other: crate::tuning::Letter| match key {
            Inflected::Everywhere(letter) => letter == other,
            Inflected::One(key) => key.pitch_class() == other.pitch_class(),
        };
        let also = self.tunings.iter().flat_map(|tuning| &tuning.also);
        let names: Vec<&str> = also
            .filter(|other| letter_matches(other.key))
            .map(|other| other.name.as_str())
            .collect();
        if place == "home" || names.contains(&place) {
            return None;
        }
        let key = match key {
            Inflected::Everywhere(letter) => letter.to_string(),
            Inflected::One(key) => key.to_string(),
        };
        let letter = key.trim_end_matches(|c: char| c.is_ascii_digit() || c == '-');
        let right = match names.is_empty() {
            true => format!("name it in a tuning, as in `also: {{{letter}: {{{place}: 150 c}}}}`"),
            false => format!("it has {}", one_of(&names)),
        };
        Some(mistake(
            format!("no tuning has a place `{place}` for {key}"),
            right,
        ))
    }
}

fn mistake(wrong: impl Into<String>, right: impl Into<String>) -> Mistake {
    Mistake {
        wrong: wrong.into(),
        right: right.into(),
    }
}
