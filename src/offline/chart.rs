//! What every key sounds: for one song, or for a tuning by name.

use crate::pitch::{Interval, Pitch};
use crate::stage::Song;
use crate::stage::tunings::TuningText;
use crate::tuning::{Key, Letter, Pin, Placement, Scale, TonicWanted, TuneError, Tuning};
use serde::Serialize;

/// A tuning where it is put, and what is to be said about it.
#[derive(Clone, Debug)]
pub struct Chart {
    pub song: Option<String>,
    pub tuning_name: String,
    pub about: Option<String>,
    pub source: Option<String>,
    pub sure: Option<String>,
    pub scale: Scale,
    pub placement: Placement,
    pub names: [Letter; 12],
    pub tuning: Tuning,
    /// What the song adds to every key; `tuning` goes by keys without it.
    pub transpose_keys: i8,
}

/// One key that sounds.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct KeyLine {
    /// MIDI key number.
    pub key: u8,
    /// As it is spelled in this song or tuning, with its octave.
    pub name: String,
    /// To nine digits.
    pub hz: f64,
    /// A hundred times the fractional MIDI key number, to six decimals.
    pub cents: f64,
    /// Cents from equal temperament with the reference key at nought.
    pub offset: f64,
}

/// What `--format json` writes.
#[derive(Serialize)]
struct Page<'c> {
    song: Option<&'c str>,
    tuning: &'c str,
    /// For a tuning from the tonic: a letter, or a key with its octave where twelve keys are not a period.
    tonic: Option<String>,
    keys: Vec<KeyLine>,
}

impl Chart {
    /// Of a song as the stage file puts it.
    pub fn of_song(song: &Song) -> Chart {
        Chart {
            song: Some(song.title.clone()),
            tuning_name: song.tuning_name.clone(),
            about: song.tuning_about.clone(),
            source: None,
            sure: None,
            scale: song.scale.clone(),
            placement: song.placement,
            names: song.names,
            tuning: song.as_it_begins(),
            transpose_keys: song.transpose_keys,
        }
    }

    /// Of a tuning alone.
    ///
    /// # Errors
    /// Where it cannot be put there.
    pub fn of_tuning(text: &TuningText, placement: Placement) -> Result<Chart, TuneError> {
        Ok(Chart {
            song: None,
            tuning_name: text.name.clone(),
            about: text.about.clone(),
            source: text.source.clone(),
            sure: text.sure.clone(),
            names: text.scale.names(&placement),
            tuning: text.scale.tune(&placement)?,
            scale: text.scale.clone(),
            placement,
            transpose_keys: 0,
        })
    }

    /// Every key that sounds, from the lowest.
    pub fn keys(&self) -> Vec<KeyLine> {
        Key::all().filter_map(|key| self.key(key)).collect()
    }

    /// One key, if it sounds.
    pub fn key(&self, key: Key) -> Option<KeyLine> {
        let pitch = self.tuning.pitch(key)?;
        Some(KeyLine {
            key: key.number(),
            name: self.name(key),
            hz: nine_digits(pitch.hertz()),
            cents: pitch.cents(),
            offset: self.offset(key, pitch).cents(),
        })
    }

    /// What a key is called here, with its octave: the C key as B# is B#3 below C4.
    pub fn name(&self, key: Key) -> String {
        let letter = self.names[key.pitch_class() as usize];
        let octave = (key.number() as i32 - letter.semitones_above_c()).div_euclid(12) - 1;
        format!("{letter}{octave}")
    }

    fn offset(&self, key: Key, pitch: Pitch) -> Interval {
        let reference = self.placement.reference;
        // A silent reference (pinned at the tonic) still has its frequency.
        let zero = self
            .tuning
            .pitch(reference)
            .unwrap_or(self.placement.hertz.pitch());
        let keys = key.number() as i64 - reference.number() as i64;
        pitch - zero - Interval::SEMITONE * keys
    }

    /// The key with step 0 as a song would name it; `None` by letter.
    pub fn tonic(&self) -> Option<String> {
        let tonic = self.scale.tonic_of(&self.placement);
        match self.scale.tonic_wanted() {
            TonicWanted::Nothing => None,
            TonicWanted::Letter => Some(self.names[tonic.pitch_class() as usize].to_string()),
            TonicWanted::Key => Some(self.name(tonic)),
        }
    }

    /// `A4 = 415 Hz`, with what is pinned.
    pub fn reference(&self) -> String {
        let Placement {
            reference,
            hertz,
            pin,
            ..
        } = self.placement;
        let hertz = crate::stage::landing::short_hertz(hertz.hertz());
        match pin {
            Pin::Key => format!("{reference} = {hertz} Hz"),
            Pin::Tonic => format!("{reference} = {hertz} Hz, pin: tonic"),
        }
    }

    /// The object of `--format json`.
    pub fn json(&self) -> String {
        let page = Page {
            song: self.song.as_deref(),
            tuning: &self.tuning_name,
            tonic: self.tonic(),
            keys: self.keys(),
        };
        let mut text = serde_json::to_string_pretty(&page).expect("numbers and texts are JSON");
        text.push('\n');
        text
    }

    /// The table of `--format csv`: the fields of `keys`.
    pub fn csv(&self) -> String {
        let mut text = String::from("key,name,hz,cents,offset\n");
        for KeyLine {
            key,
            name,
            hz,
            cents,
            offset,
        } in self.keys()
        {
            text.push_str(&format!("{key},{name},{hz},{cents:.6},{offset:.6}\n"));
        }
        text
    }
}

fn nine_digits(hertz: f64) -> f64 {
    format!("{hertz:.8e}")
        .parse()
        .expect("a number just printed")
}

#[cfg(test)]
#[path = "chart_tests.rs"]
mod tests;
