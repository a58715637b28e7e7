//! What is remembered: its text on the disk, the commands that bring it back, the words that announce it.
//!
//! A line that says what the file is, one JSON object, and a line with a checksum of both. Whoever adds something to be
//! remembered adds it to [`State`] and to each of its functions; a field that is missing stands for what a song begins
//! with, one that is not known is passed over, so old and new read each other's files. What would be misunderstood
//! gets a new number in the first line.

use crate::daemon::state::fnv;
use crate::daemon::status::cents;
use crate::engine::plan::NameId;
use crate::engine::{Command, Nudge, Told, ToldTonic};
use crate::pitch::{Interval, Pitch};
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
    /// The tonic, where its name would not put it: its key, another key, and the pitch of that.
    pub tonic: Option<(u8, u8, Pitch)>,
    /// The rest that was told of the song, in the words of `tell`, to be told again in this order.
    pub by_hand: Vec<String>,
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
    /// `names`: what the places of keys are called.
    pub fn of(place: u16, told: &Told, titles: &[String], names: &[(NameId, String)]) -> State {
        let title = titles.get(usize::from(place));
        let mut by_hand = Vec::new();
        let mut tonic = None;
        match told.tonic {
            Some(ToldTonic::Named(name)) => by_hand.push(format!("tonic {name}")),
            Some(ToldTonic::At(at)) => {
                tonic = Some((at.key.number(), at.anchor.number(), at.anchor_pitch));
            }
            None => {}
        }
        let name_of = |id: NameId| {
            let named = names.iter().find(|(known, _)| *known == id);
            named.map(|(_, name)| name.as_str())
        };
        let places = told.places().filter_map(|(key, place)| {
            let place = place.map_or(Some("home"), name_of)?;
            Some(format!("inflect {key} {place}"))
        });
        by_hand.extend(places);
        by_hand.extend(
            told.trims()
                .map(|(key, by)| format!("inflect {key} {}", in_cents(by))),
        );
        by_hand.extend(told.black_keys().map(|name| format!("black-key {name}")));
        by_hand.extend(told.sevenths.map(|which| format!("sevenths {which}")));
        State {
            place,
            title: title.cloned().unwrap_or_default(),
            nudge: told.nudge,
            transposed: told.transposed,
            plain: told.plain,
            tonic,
            by_hand,
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
    pub fn found_in(&self, titles: &[&str]) -> Option<State> {
        let places = (0u16..)
            .zip(titles)
            .filter(|(_, title)| **title == self.title);
        let nearest = places.min_by_key(|(place, _)| place.abs_diff(self.place));
        nearest.map(|(place, _)| State {
            place,
            ..self.clone()
        })
    }

    /// What brings a fresh engine here, but for what is told `by_hand` after it.
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
        let tonic = self.tonic;
        out.extend(tonic.and_then(|(key, anchor, pitch)| Command::tonic_at(key, anchor, pitch)));
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
        for command in self.commands() {
            if let Command::TonicAt(tonic) = command {
                out.push(format!("tonic {}", tonic.key));
            }
        }
        out.extend(self.by_hand.iter().cloned());
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
            "tonic": self.tonic.map(|(key, anchor, pitch)| json!({
                "key": key, "anchor": anchor, "anchor_microcents": pitch.microcents(),
            })),
            "by_hand": self.by_hand,
        })
    }

    /// `None` if something is not of its kind.
    fn read(object: &Value) -> Option<State> {
        let get = |name: &str| object.get(name).filter(|value| !value.is_null());
        let transposed = match get("transpose_keys") {
            Some(keys) => Some(i8::try_from(keys.as_i64()?).ok()?),
            None => None,
        };
        let tonic = match get("tonic") {
            Some(tonic) => Some(read_tonic(tonic)?),
            None => None,
        };
        let by_hand = match get("by_hand") {
            Some(told) => {
                let told = told.as_array()?.iter();
                let words = told.map(|words| Some(words.as_str()?.to_string()));
                words.collect::<Option<_>>()?
            }
            None => Vec::new(),
        };
        let nudge = get("pitch_microcents").map_or(Some(0), Value::as_i64)?;
        let song = get("song").map_or(Some(1), Value::as_u64)?;
        Some(State {
            place: u16::try_from(song.checked_sub(1)?).ok()?,
            title: get("title")?.as_str()?.to_string(),
            nudge: Interval::from_microcents(nudge),
            transposed,
            plain: get("plain").map_or(Some(false), Value::as_bool)?,
            tonic,
            by_hand,
        })
    }
}

fn read_tonic(tonic: &Value) -> Option<(u8, u8, Pitch)> {
    let key = |name: &str| u8::try_from(tonic.get(name)?.as_u64()?).ok();
    let pitch = Pitch::from_microcents(tonic.get("anchor_microcents")?.as_i64()?);
    Some((key("key")?, key("anchor")?, pitch))
}

/// To the last figure.
fn in_cents(interval: Interval) -> String {
    let sign = if interval < Interval::ZERO { '-' } else { '+' };
    let microcents = interval.abs().microcents();
    let (cents, rest) = (microcents / 1_000_000, microcents % 1_000_000);
    let figures = format!("{cents}.{rest:06}");
    let figures = figures.trim_end_matches('0').trim_end_matches('.');
    format!("{sign}{figures} c")
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
