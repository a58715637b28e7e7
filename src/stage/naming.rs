//! Whether what words name is there: songs of the set, synths, turns and places of the tunings.

use super::expression::Mistake;
use super::resolve::{Names, Refusal};
use super::rig::Rig;
use super::words::Words;

/// What cues and lamps are read against.
pub struct Scene<'s> {
    pub rig: &'s Rig,
    /// Also of songs that are written wrong.
    pub names: Names<'s>,
    pub programs_from: u8,
}

impl Scene<'_> {
    /// What the words name and nobody has.
    pub fn missing(&self, words: &Words) -> Option<Mistake> {
        match self.names.resolve(words) {
            Err(Refusal::Wrong(mistake)) => Some(mistake),
            Ok(_) | Err(Refusal::NotPlayed) => None,
        }
    }
}
