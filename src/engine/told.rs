//! What would have to be told again after a restart, with every control let go.

use super::Engine;
use super::by_hand::NameId;
use super::lasting::Lasting;
use super::traffic::{Command, Inflected, Place};
use crate::intonation::{Method, Sevenths};
use crate::limits::KEYS;
use crate::pitch::{Interval, Pitch};
use crate::tuning::{Key, Letter, Scale, Tonic};

/// What was told for good and is not as the song begins.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Told {
    pub nudge: Interval,
    pub transposed: Option<i8>,
    pub plain: bool,
    pub tonic: Option<ToldTonic>,
    /// In place of the song's own. (What root is held is not among it: it goes with what sounds.)
    pub sevenths: Option<Sevenths>,
    places: [Option<Place>; 12],
    trims: [Interval; 12],
    alone: [Option<Place>; KEYS],
    trims_alone: [Interval; KEYS],
    black_keys: [Option<Letter>; 12],
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ToldTonic {
    /// Where the reference puts it.
    Named(Letter),
    /// Where it was when it was told.
    At(Tonic),
}

impl Engine {
    /// A place that a key has only under a tonic of before is not sounded now, and is not among it.
    pub fn told(&self) -> Told {
        let song = &self.playing.by_hand;
        let (now, begun) = (&self.latched, Lasting::new(song));
        let named = |tonic: Tonic| {
            let name = Letter::usual(tonic.key.pitch_class());
            let there = song.turning.as_ref()?.absolute(Scale::tonic_key(name))?;
            (there == tonic).then_some(ToldTonic::Named(name))
        };
        Told {
            nudge: now.nudge,
            transposed: now.transposed,
            plain: now.plain,
            tonic: now
                .tonic
                .map(|tonic| named(tonic).unwrap_or(ToldTonic::At(tonic))),
            places: std::array::from_fn(|key| {
                let (place, at_first) = (now.places[key], begun.places[key]);
                let sounded = now.sounded(key as u8, place, song);
                (place != at_first && sounded != at_first).then_some(sounded)
            }),
            sevenths: now
                .sevenths
                .filter(|_| self.playing.method != Method::Fixed),
            trims: now.trims,
            alone: std::array::from_fn(|key| {
                Some(now.sounded((key % 12) as u8, now.alone[key]?, song))
            }),
            trims_alone: now.trims_alone,
            black_keys: std::array::from_fn(|key| now.told_name(key, song)),
        }
    }
}

impl Told {
    /// Keys at another place, `None` for the one in their tuning; whole pitch classes first, for they take single keys
    /// along.
    pub fn places(&self) -> impl Iterator<Item = (Inflected, Option<NameId>)> {
        self.inflected(&self.places, &self.alone)
            .filter_map(|(key, place)| match place? {
                Place::Home => Some((key, None)),
                Place::Named(name) => Some((key, Some(name))),
            })
    }

    /// Keys that were nudged from their place.
    pub fn trims(&self) -> impl Iterator<Item = (Inflected, Interval)> {
        self.inflected(&self.trims, &self.trims_alone)
            .filter(|(_, trim)| *trim != Interval::ZERO)
    }

    /// Black keys that were told their name. (What the harmony chose is none of it.)
    pub fn black_keys(&self) -> impl Iterator<Item = Letter> {
        self.black_keys.into_iter().flatten()
    }

    fn inflected<T: Copy>(
        &self,
        all: &[T; 12],
        alone: &[T; KEYS],
    ) -> impl Iterator<Item = (Inflected, T)> {
        let all = (0u8..).zip(*all);
        let all = all.map(|(key, value)| (Inflected::Everywhere(key), value));
        let alone = Key::all().zip(*alone);
        all.chain(alone.map(|(key, value)| (Inflected::Alone(key), value)))
    }
}

impl Command {
    /// The tonic on the key of this number, with another key at this pitch. `None` where there are no such keys.
    pub fn tonic_at(key: u8, anchor: u8, anchor_pitch: Pitch) -> Option<Command> {
        Some(Command::TonicAt(Tonic {
            key: Key::new(key)?,
            anchor: Key::new(anchor)?,
            anchor_pitch,
        }))
    }
}
