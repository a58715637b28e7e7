//! What is remembered: its text on the disk, the commands that bring it back, the words that announce it.
//!
//! A line that says what the file is, one JSON object, and a line with a checksum of both. Whoever adds something to be
//! remembered adds it to [`State`] and to each of its functions; a field that is missing stands for what a song begins
//! with, one that is not known is passed over, so old and new read each other's files. What would be misunderstood
//! gets a new number in the first line.

use crate::daemon::state::fnv;
use crate::daemon::status::cents;
use crate::engine::{Command, Nudge, Report};
use crate::pitch::Interval;
use serde_json::{Value, json};

const HEAD: &str = "trued remembers here how things stood: version ";
const VERSION: &str = "1";
const CHECK: &str = "check ";

/// Of which evening a record is: what is remembered of one is nothing to another.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Evening {
    /// The whole path of the stage file.
    pub file: String,
    /// What the stage is called in it.
    pub stage: String,
}

/// How things stand, as far as it outlasts a restart. Keys and pedals do not: after a restart they are up.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct State {
    /// Place in the set, and the title that stands there: the set may change, and a title stand in it twice.
    pub place: u16,
    pub title: String,
    pub nudge: Interval,
    /// Set in place of the song's own.
    pub transposed: Option<i8>,
    pub plain: bool,
}

/// What became of a record.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Found {
    Good(Evening, State),
    Damaged,
    /// Written by a version that this one does not understand.
    Foreign,
}

impl State {
    pub fn of(report: &Report, titles: &[String]) -> State {
        let title = titles.get(usize::from(report.song));
        State {
            place: report.song,
            title: title.cloned().unwrap_or_default(),
            nudge: report.nudge,
            transposed: report.transposed,
            plain: report.plain,
        }
    }

    /// Whether an evening begins so.
    pub fn is_fresh(&self) -> bool {
        let fresh = State {
            title: self.title.clone(),
            ..State::default()
        };
        *self == fresh
    }

    /// The same in a set that may have changed: the song is where it was, else at the nearest place with its title.
    pub fn found_in(&self, titles: &[String]) -> Option<State> {
        let places = (0u16..)
            .zip(titles)
            .filter(|(_, title)| **title == self.title);
        let nearest = places.min_by_key(|(place, _)| place.abs_diff(self.place));
        nearest.map(|(place, _)| State {
            place,
            ..self.clone()
        })
    }

    /// What brings a fresh engine here.
    pub fn commands(&self) -> Vec<Command> {
        let mut out = Vec::new();
        if self.place != 0 {
            out.push(Command::Song(self.place));
        }
        if self.nudge != Interval::ZERO {
            out.push(Command::Pitch {
                to: Nudge::By(self.nudge),
                held_too: false,
            });
        }
        if self.transposed.is_some() {
            out.push(Command::Transpose(self.transposed));
        }
        if self.plain {
            out.push(Command::Plain);
        }
        out
    }

    /// `song 3 "Lament", pitch +13 c`.
    pub fn words(&self) -> String {
        let mut out = vec![format!("song {} \"{}\"", self.place + 1, self.title)];
        if self.nudge != Interval::ZERO {
            out.push(format!("pitch {:+} c", cents(self.nudge)));
        }
        if let Some(keys) = self.transposed {
            out.push(format!("transpose {keys:+}"));
        }
        if self.plain {
            out.push("plain".to_string());
        }
        out.join(", ")
    }

    fn json(&self, of: &Evening) -> Value {
        json!({
            "file": of.file,
            "stage": of.stage,
            "song": u32::from(self.place) + 1,
            "title": self.title,
            "pitch_microcents": self.nudge.microcents(),
            "transpose_keys": self.transposed,
            "plain": self.plain,
        })
    }

    /// `None` if something is not of its kind.
    fn read(object: &Value) -> Option<State> {
        let get = |name: &str| object.get(name).filter(|value| !value.is_null());
        let transposed = match get("transpose_keys") {
            Some(keys) => Some(i8::try_from(keys.as_i64()?).ok()?),
            None => None,
        };
        let nudge = get("pitch_microcents").map_or(Some(0), Value::as_i64)?;
        let song = get("song").map_or(Some(1), Value::as_u64)?;
        Some(State {
            place: u16::try_from(song.checked_sub(1)?).ok()?,
            title: get("title")?.as_str()?.to_string(),
            nudge: Interval::from_microcents(nudge),
            transposed,
            plain: get("plain").map_or(Some(false), Value::as_bool)?,
        })
    }
}

pub fn encode(of: &Evening, state: &State) -> Vec<u8> {
    let text = format!("{HEAD}{VERSION}\n{}\n", state.json(of));
    let check = fnv(text.as_bytes());
    format!("{text}{CHECK}{check:016x}\n").into_bytes()
}

pub fn decode(bytes: &[u8]) -> Found {
    let sound = || -> Option<&str> {
        let text = std::str::from_utf8(bytes).ok()?.strip_suffix('\n')?;
        let (before, check) = text.rsplit_once('\n')?;
        let before = &text[..=before.len()];
        let given = u64::from_str_radix(check.strip_prefix(CHECK)?, 16).ok()?;
        (fnv(before.as_bytes()) == given).then_some(before)
    };
    let Some((version, body)) = sound().and_then(|text| text.strip_prefix(HEAD)?.split_once('\n'))
    else {
        return Found::Damaged;
    };
    if version != VERSION {
        return Found::Foreign;
    }
    let read = || -> Option<Found> {
        let object: Value = serde_json::from_str(body).ok()?;
        let text = |name: &str| Some(object.get(name)?.as_str()?.to_string());
        let of = Evening {
            file: text("file")?,
            stage: text("stage")?,
        };
        Some(Found::Good(of, State::read(&object)?))
    };
    read().unwrap_or(Found::Damaged)
}
