//! Whether what words name is there: songs of the set, synths, turns and places of the tunings.

use super::expression::Mistake;
use super::node::nearest;
use super::rig::Rig;
use super::tunings::TuningText;
use super::values::one_of;
use super::words::{Inflected, Words};
use crate::engine::plan::SynthId;
use std::rc::Rc;

/// What cues and lamps are read against.
pub struct Scene<'s> {
    pub rig: &'s Rig,
    /// The titles of the set in their order, also of songs that are written wrong.
    pub titles: &'s [String],
    /// The tunings of the songs, for the names of turns and places.
    pub tunings: &'s [Rc<TuningText>],
    pub programs_from: u8,
}

impl Scene<'_> {
    /// What the words name and nobody has.
    pub fn missing(&self, words: &Words) -> Option<Mistake> {
        match words {
            Words::Song(None) => Some(mistake(
                "`song` alone takes its number from a program change",
                "write `song 3`, `song TITLE`, or `when: {program: any}`",
            )),
            Words::Song(Some(name)) => self.song_named(name).is_none().then(|| self.no_song(name)),
            Words::Next { from: Some(title) } => {
                self.titled(title).is_none().then(|| self.no_song(title))
            }
            Words::Resend(Some(name)) => self.synth_named(name).is_none().then(|| {
                mistake(
                    format!("no synth is called `{name}`"),
                    format!("write `resend` for all, or {}", one_of(&self.synths())),
                )
            }),
            Words::Turn(name) => self.no_turn(name),
            Words::Inflect { key, place } => self.no_place(*key, place),
            _ => None,
        }
    }

    /// The place in the set of a title, or of a number people count from 1.
    pub fn song_named(&self, name: &str) -> Option<usize> {
        let number = || name.parse::<usize>().ok().and_then(|n| n.checked_sub(1));
        self.titled(name)
            .or_else(|| number().filter(|place| *place < self.titles.len()))
    }

    fn titled(&self, title: &str) -> Option<usize> {
        self.titles.iter().position(|known| known == title)
    }

    pub fn synth_named(&self, name: &str) -> Option<SynthId> {
        let place = self.synths().iter().position(|synth| *synth == name)?;
        SynthId::new(place)
    }

    fn synths(&self) -> Vec<&str> {
        let synths = self.rig.synths.iter();
        synths.map(|synth| synth.device.name.as_str()).collect()
    }

    fn no_song(&self, name: &str) -> Mistake {
        if name.bytes().all(|b| b.is_ascii_digit()) {
            return mistake(
                format!("there is no song {name}"),
                format!("the songs of the set are 1 to {}", self.titles.len()),
            );
        }
        let titles: Vec<&str> = self.titles.iter().map(String::as_str).collect();
        let right = match nearest(name, &titles) {
            Some(near) => format!("did you mean `{near}`?"),
            None => String::from("write a title of the set, or its number, from 1"),
        };
        mistake(format!("no song of the set is called `{name}`"), right)
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
