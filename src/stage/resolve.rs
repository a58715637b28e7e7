//! From words to what the engine does: one grammar for `tell` and for what stands after `do:`.

use super::expression::Mistake;
use super::node::nearest;
use super::told::Told;
use super::values::one_of;
use super::words::{PitchNudge, Root, TonicMove, Words};
use crate::engine::plan::SynthId;
use crate::engine::{Ask, Command, InflectTo, Nudge, Place, RootTo};
use crate::intonation::Sevenths;
use crate::limits::{INFLECT_MAX_CENTS, NUDGE_MAX_CENTS};
use crate::pitch::{Hertz, Interval, Log, Pitch};

/// The words that are played.
pub const PLAYED: &str = "next, back, song, pitch, transpose, tonic, inflect, turn, black-key, root, sevenths, plain, home, resend, panic, fresh, reload and \
     stop";

/// What an evening calls its songs and synths, in their order.
pub struct Names<'n> {
    pub titles: Vec<&'n str>,
    pub synths: Vec<&'n str>,
    /// The reference of each song.
    pub references: Vec<Pitch>,
    pub told: &'n Told,
}

/// Why words cannot be followed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Refusal {
    Wrong(Mistake),
    /// Understood, but nothing plays it yet.
    NotPlayed,
}

impl Names<'_> {
    /// What the words ask for.
    pub fn resolve(&self, words: &Words) -> Result<Command, Refusal> {
        Ok(match words {
            Words::Song(None) => return Err(wrong(SONG_ALONE.0, SONG_ALONE.1)),
            Words::Song(Some(name)) => Command::Song(self.song(name)?),
            Words::Next { from: None } => Command::Next,
            Words::Next { from: Some(title) } => Command::NextFrom(self.titled(title)?),
            Words::Back => Command::Back,
            Words::Pitch { to, now } => Command::Pitch {
                to: self.nudge(to)?,
                held_too: *now,
            },
            Words::Transpose(keys) => Command::Transpose(*keys),
            Words::Plain => Command::Plain,
            Words::Home => Command::Home,
            Words::Resend(None) => Command::Resend(None),
            Words::Resend(Some(name)) => Command::Resend(Some(self.synth(name)?)),
            Words::Panic => Command::Panic,
            Words::Fresh => Command::Fresh,
            Words::Reload => Command::Ask(Ask::Reload),
            Words::Stop => Command::Ask(Ask::Stop),
            Words::Tonic { to, by } => match to {
                TonicMove::To(to) => Command::Tonic { to: *to, by: *by },
                TonicMove::NextKey => Command::TonicNextKey(*by),
            },
            Words::TonicHome => Command::TonicHome,
            Words::TonicByKey(_) => return Err(wrong(TONIC_ALONE.0, TONIC_ALONE.1)),
            Words::Inflect { key, place } => Command::Inflect {
                key: *key,
                to: InflectTo::Place(match place.as_str() {
                    "home" => Place::Home,
                    name => Place::Named(self.told.place(*key, name).map_err(Refusal::Wrong)?),
                }),
            },
            Words::InflectBy { key, by } => Command::Inflect {
                key: *key,
                to: InflectTo::By(inflect_by(*by)?),
            },
            Words::InflectHome => Command::InflectHome,
            Words::Turn(name) => Command::Turn(self.told.turn(name).map_err(Refusal::Wrong)?),
            Words::BlackKey(name) => {
                Command::BlackKey(self.told.black_key(*name).map_err(Refusal::Wrong)?)
            }
            Words::Root(Root::Hold) => Command::Root(RootTo::Hold),
            Words::Root(Root::Free) => Command::Root(RootTo::Free),
            Words::Root(Root::NextKey) => Command::RootNextKey,
            Words::Sevenths { harmonic: true } => Command::Sevenths(Sevenths::Harmonic),
            Words::Sevenths { harmonic: false } => Command::Sevenths(Sevenths::Plain),
            Words::Keep => return Err(Refusal::NotPlayed),
        })
    }

    /// The place in the set of a title, or of a number people count from 1.
    fn song(&self, name: &str) -> Result<u16, Refusal> {
        let number = || name.parse::<usize>().ok().and_then(|n| n.checked_sub(1));
        let numbered = || number().filter(|place| *place < self.titles.len());
        let place = self.place(name).or_else(numbered);
        place
            .map(|place| place as u16)
            .ok_or_else(|| self.no_song(name))
    }

    fn titled(&self, title: &str) -> Result<u16, Refusal> {
        self.place(title)
            .map(|place| place as u16)
            .ok_or_else(|| self.no_song(title))
    }

    fn place(&self, title: &str) -> Option<usize> {
        self.titles.iter().position(|known| *known == title)
    }

    fn no_song(&self, name: &str) -> Refusal {
        if !name.is_empty() && name.bytes().all(|b| b.is_ascii_digit()) {
            let right = format!("the songs of the set are 1 to {}", self.titles.len());
            return wrong(format!("there is no song {name}"), right);
        }
        let right = match nearest(name, &self.titles) {
            Some(near) => format!("did you mean `{near}`?"),
            None => String::from("write a title of the set, or its number, from 1"),
        };
        wrong(format!("no song of the set is called `{name}`"), right)
    }

    fn synth(&self, name: &str) -> Result<SynthId, Refusal> {
        let place = self.synths.iter().position(|synth| *synth == name);
        place.and_then(SynthId::new).ok_or_else(|| {
            wrong(
                format!("no synth is called `{name}`"),
                format!("write `resend` for all, or {}", one_of(&self.synths)),
            )
        })
    }

    /// So many hertz above the first song's reference. A step up and one down are of one size, so that they cancel out.
    fn step(&self, hertz: Hertz) -> Option<Interval> {
        let reference = self.references.first()?.hertz();
        let micro = (reference * 1e6).round() as u64;
        Some(Log::of_ratio(micro + hertz.micro(), micro).interval())
    }

    fn nudge(&self, to: &PitchNudge) -> Result<Nudge, Refusal> {
        let near = |far: Interval| far.abs() <= Interval::from_cents(NUDGE_MAX_CENTS);
        match to {
            PitchNudge::Home => Ok(Nudge::Home),
            PitchNudge::By(log) if near(log.interval()) => Ok(Nudge::By(log.interval())),
            PitchNudge::By(_) => Err(too_far()),
            PitchNudge::ByHertz { up, hertz } => {
                let step = self.step(*hertz).filter(|step| near(*step));
                let step = step.ok_or_else(too_far)?;
                Ok(Nudge::By(if *up { step } else { -step }))
            }
            PitchNudge::To(hertz) => {
                let pitch = hertz.pitch();
                let reached = |reference: &Pitch| near(pitch - *reference);
                if self.references.is_empty() || self.references.iter().any(reached) {
                    return Ok(Nudge::To(pitch));
                }
                Err(wrong(
                    format!(
                        "{} Hz is more than an octave from every song's reference",
                        hertz.hertz()
                    ),
                    "name the frequency of the reference key, as in `pitch 416 Hz`",
                ))
            }
        }
    }
}

fn too_far() -> Refusal {
    wrong(
        "this nudge is more than an octave",
        "a nudge goes an octave up or down at most, as in `pitch +1 c`",
    )
}

fn inflect_by(by: Log) -> Result<Interval, Refusal> {
    let by = by.interval();
    if by.abs() <= Interval::from_cents(INFLECT_MAX_CENTS) {
        return Ok(by);
    }
    Err(wrong(
        "this moves a key by more than a semitone",
        format!("a key goes {INFLECT_MAX_CENTS} c up or down at most, as in `inflect B +5 c`"),
    ))
}

/// What is wrong with `song` alone, and what would be right.
const SONG_ALONE: (&str, &str) = (
    "`song` alone takes its number from a program change",
    "write `song 3`, `song TITLE`, or `when: {program: any}`",
);

/// Likewise of `tonic` alone.
const TONIC_ALONE: (&str, &str) = (
    "`tonic` without a key takes the one that is struck",
    "write `tonic D`, `tonic next-key`, or `when: {notes: C1..B1}`",
);

fn wrong(wrong: impl Into<String>, right: impl Into<String>) -> Refusal {
    Refusal::Wrong(Mistake {
        wrong: wrong.into(),
        right: right.into(),
    })
}
