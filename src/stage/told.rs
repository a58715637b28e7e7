//! What can be told by name of the songs of an evening: places of keys, turns, black keys with two names.

use super::expression::Mistake;
use super::node::nearest;
use super::placing::Placed;
use super::tunings::TuningText;
use super::values::one_of;
use crate::engine::Inflected;
use crate::engine::plan::NameId;
use crate::tuning::{Letter, Scale};

/// Over all songs, each once.
#[derive(Clone, Debug, Default)]
pub struct Told {
    /// Pitch classes and names.
    places: Vec<(u8, String)>,
    turns: Vec<String>,
    black_keys: Vec<Letter>,
    /// Some song takes a tonic.
    pub tonics: bool,
    /// Some song follows its harmony.
    pub follows: bool,
    /// A song is written wrong, and nobody knows what it would have.
    pub unsure: bool,
}

impl Told {
    /// Adds what a song has; its tuning is put on `home`.
    pub fn note(&mut self, described: &TuningText, home: u8, placed: &Placed) {
        self.tonics |= matches!(described.scale, Scale::FromTonic(_));
        for other in &described.also {
            match &described.scale {
                Scale::ByLetter(scale) => {
                    let above = other.key.pitch_class() + 12 - scale.home;
                    self.add_place((home + above) % 12, &other.name);
                }
                // The tonic may take it to any key.
                Scale::FromTonic(_) => (0..12).for_each(|key| self.add_place(key, &other.name)),
            }
        }
        for turn in &described.turns {
            if !self.turns.contains(&turn.name) {
                self.turns.push(turn.name.clone());
            }
        }
        for names in placed.two_names.iter().flatten() {
            for name in [names.first, names.second] {
                if !self.black_keys.contains(&name) {
                    self.black_keys.push(name);
                }
            }
        }
    }

    fn add_place(&mut self, key: u8, name: &str) {
        if !(self.places.iter()).any(|(known, other)| *known == key && other == name) {
            self.places.push((key, name.to_string()));
        }
    }

    pub fn place_names(&self) -> Vec<(NameId, String)> {
        let mut names = Vec::new();
        for (_, name) in &self.places {
            let named = (NameId::of(name), name.clone());
            if !names.contains(&named) {
                names.push(named);
            }
        }
        names
    }

    /// # Errors
    /// No song has such a turn.
    pub fn turn(&self, name: &str) -> Result<NameId, Mistake> {
        let names: Vec<&str> = self.turns.iter().map(String::as_str).collect();
        if self.unsure || names.contains(&name) {
            return Ok(NameId::of(name));
        }
        let right = match (nearest(name, &names), names.is_empty()) {
            (Some(near), _) => format!("did you mean `{near}`?"),
            (None, true) => String::from("name it in a tuning, as in `turns: {saba: {G: flat}}`"),
            (None, false) => format!("the tunings have {}", one_of(&names)),
        };
        Err(mistake(format!("no tuning has a turn `{name}`"), right))
    }

    /// # Errors
    /// In no song has the key such a place.
    pub fn place(&self, key: Inflected, place: &str) -> Result<NameId, Mistake> {
        let of_key = |other: &&(u8, String)| other.0 == key.pitch_class();
        let names: Vec<&str> = (self.places.iter().filter(of_key))
            .map(|(_, name)| name.as_str())
            .collect();
        if self.unsure || names.contains(&place) {
            return Ok(NameId::of(place));
        }
        let letter = Letter::usual(key.pitch_class());
        let key = match key {
            Inflected::Everywhere(_) => letter.to_string(),
            Inflected::Alone(key) => key.to_string(),
        };
        let right = match (nearest(place, &names), names.is_empty()) {
            (Some(near), _) => format!("did you mean `{near}`?"),
            (None, true) => {
                format!("name it in a tuning, as in `also: {{{letter}: {{{place}: 150 c}}}}`")
            }
            (None, false) => format!("it has {}", one_of(&names)),
        };
        let wrong = format!("no tuning has a place `{place}` for {key}");
        Err(mistake(wrong, right))
    }

    /// # Errors
    /// In no song may a black key go by that name and another.
    pub fn black_key(&self, name: Letter) -> Result<Letter, Mistake> {
        if self.unsure || self.black_keys.contains(&name) {
            return Ok(name);
        }
        let usual = Letter::usual(name.pitch_class());
        let (first, second) = match usual == name {
            true => (name, "another name"),
            false => (usual, &*name.to_string()),
        };
        Err(mistake(
            format!("no song has a black key that may be {name} or something else"),
            format!("give the song both names, as in `black_keys: [{first} or {second}]`"),
        ))
    }
}

fn mistake(wrong: String, right: String) -> Mistake {
    Mistake { wrong, right }
}
