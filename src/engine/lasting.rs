//! What a player has told and what lasts: nudge, transposition, tonic, places of keys, names of black keys.
//!
//! Told once it is latched; by a cue `while: held` it lies on top of what is latched, until the control is let go.

use super::Playing;
use super::by_hand::{ByHand, NameId};
use super::following::level;
use super::traffic::{Command, InflectTo, Inflected, Nudge, Place, RootTo, TonicBy};
use crate::intonation::{Method, Sevenths};
use crate::limits::{INFLECT_MAX_CENTS, KEYS, NUDGE_MAX_CENTS};
use crate::pitch::{Interval, Pitch};
use crate::tuning::{Key, Letter, Scale, Tonic, Tuning};

#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Lasting {
    /// Over all songs.
    pub nudge: Interval,
    /// Twelve-equal, whatever the song says; outlasts songs too.
    pub plain: bool,
    /// In place of the song's own.
    pub transposed: Option<i8>,
    /// In place of the song's own.
    pub tonic: Option<Tonic>,
    pub root: RootTo,
    /// In place of the song's own.
    pub sevenths: Option<Sevenths>,
    /// By pitch class.
    pub places: [Place; 12],
    pub trims: [Interval; 12],
    /// Keys that go alone.
    pub alone: [Option<Place>; KEYS],
    pub trims_alone: [Interval; KEYS],
    /// Pitch classes whose black key was told to be its second name, one bit each.
    pub second_names: u16,
    /// Those that were told a name where the harmony would choose one.
    pub named: u16,
    /// Those whose second name the harmony has chosen; what was told goes before it.
    pub by_chord: u16,
    /// Pitch classes whose place was told since the last rest, so that the line does not choose it; one bit each.
    pub told: u16,
    /// Where the line has put keys, by pitch class.
    pub by_line: [Option<Place>; 12],
}

const EVERY_PITCH_CLASS: u16 = 0xFFF;

impl Lasting {
    pub fn new(song: &ByHand) -> Lasting {
        Lasting {
            nudge: Interval::ZERO,
            plain: false,
            transposed: None,
            tonic: None,
            root: RootTo::Free,
            sevenths: None,
            places: song.begin_with,
            trims: [Interval::ZERO; 12],
            alone: [None; KEYS],
            trims_alone: [Interval::ZERO; KEYS],
            second_names: 0,
            named: 0,
            by_chord: 0,
            told: 0,
            by_line: [None; 12],
        }
    }

    /// As a song begins; what outlasts songs stays.
    pub fn begin(&mut self, song: &ByHand) {
        *self = Lasting {
            nudge: self.nudge,
            plain: self.plain,
            ..Lasting::new(song)
        };
    }

    /// Takes a command that lasts. Tells whether the song has what it asks for.
    pub fn take(&mut self, command: Command, playing: &Playing) -> bool {
        match command {
            Command::Pitch { to, .. } => return self.nudge_pitch(to, playing.reference),
            Command::Transpose(keys) => self.transposed = keys,
            Command::Plain => self.plain = !self.plain,
            Command::Inflect { key, to } => return self.inflect(key, to, playing),
            Command::InflectHome => {
                *self = Lasting {
                    places: [Place::Home; 12],
                    trims: [Interval::ZERO; 12],
                    alone: [None; KEYS],
                    trims_alone: [Interval::ZERO; KEYS],
                    told: EVERY_PITCH_CLASS,
                    ..*self
                }
            }
            Command::Turn(name) => {
                let steps = playing.by_hand.turns.iter().flatten();
                let mut found = false;
                for step in steps.filter(|step| step.turn == name) {
                    let tonic = self.tonic_key(&playing.by_hand).pitch_class();
                    self.place((tonic + step.keys_above) % 12, step.place);
                    found = true;
                }
                return found;
            }
            Command::BlackKey(name) => {
                let bit = 1 << name.pitch_class();
                match playing.by_hand.black_keys[name.pitch_class() as usize] {
                    Some(names) if names.first == name => self.second_names &= !bit,
                    Some(names) if names.second == name => self.second_names |= bit,
                    _ => return false,
                }
                if playing.by_hand.by_chord.is_some() {
                    self.named |= bit;
                }
            }
            Command::Tonic { to, by } => {
                return self.move_tonic(Scale::tonic_key(to), by, playing);
            }
            Command::TonicAt(tonic) => return self.put_tonic(tonic, playing),
            Command::TonicHome => {
                self.tonic = None;
                return playing.by_hand.turning.is_some();
            }
            Command::Root(_) | Command::Sevenths(_) if playing.method == Method::Fixed => {
                return false;
            }
            Command::Root(to) => self.root = to,
            Command::Sevenths(sevenths) => self.sevenths = Some(sevenths),
            _ => return false,
        }
        true
    }

    fn nudge_pitch(&mut self, to: Nudge, reference: Pitch) -> bool {
        let nudge = match to {
            Nudge::By(further) => self.nudge + further,
            Nudge::To(pitch) => pitch - reference,
            Nudge::Home => Interval::ZERO,
        };
        let near = nudge.abs() <= Interval::from_cents(NUDGE_MAX_CENTS);
        if near {
            self.nudge = nudge;
        }
        near
    }

    fn inflect(&mut self, key: Inflected, to: InflectTo, playing: &Playing) -> bool {
        let place = match to {
            InflectTo::By(further) => return self.trim(key, further),
            InflectTo::Place(place) => place,
        };
        if self.sounded(key.pitch_class(), place, &playing.by_hand) != place {
            return false;
        }
        match key {
            Inflected::Everywhere(pitch_class) => self.place(pitch_class, place),
            Inflected::Alone(key) => {
                self.alone[key.number() as usize] = Some(place);
                if place == Place::Home {
                    self.trims_alone[key.number() as usize] = Interval::ZERO;
                }
            }
        }
        true
    }

    /// A place, or home where the key has none of that name under the tonic.
    pub fn sounded(&self, pitch_class: u8, place: Place, song: &ByHand) -> Place {
        let Place::Named(name) = place else {
            return place;
        };
        let tonic = self.tonic_key(song).pitch_class();
        let keys_above = (pitch_class + 12 - tonic) % 12;
        let known = song.other_place(keys_above, name);
        known.map_or(Place::Home, |_| place)
    }

    /// Puts all keys of a pitch class there, those that went alone too.
    fn place(&mut self, pitch_class: u8, place: Place) {
        self.places[pitch_class as usize] = place;
        self.told |= 1 << pitch_class;
        if place == Place::Home {
            self.trims[pitch_class as usize] = Interval::ZERO;
        }
        for number in (pitch_class as usize..KEYS).step_by(12) {
            self.alone[number] = None;
            if place == Place::Home {
                self.trims_alone[number] = Interval::ZERO;
            }
        }
    }

    fn trim(&mut self, key: Inflected, further: Interval) -> bool {
        let trim = match key {
            Inflected::Everywhere(pitch_class) => &mut self.trims[pitch_class as usize],
            Inflected::Alone(key) => &mut self.trims_alone[key.number() as usize],
        };
        let near = (*trim + further).abs() <= Interval::from_cents(INFLECT_MAX_CENTS);
        if near {
            *trim += further;
        }
        near
    }

    /// As `move_tonic`, to where it once was.
    fn put_tonic(&mut self, tonic: Tonic, playing: &Playing) -> bool {
        let turning = playing.by_hand.turning.as_ref();
        let sounds = turning.and_then(|turning| turning.pitch(tonic, tonic.key));
        if sounds.is_some() {
            self.tonic = Some(tonic);
        }
        sounds.is_some()
    }

    /// Tells whether the tuning has a tonic, and it can be put there.
    pub fn move_tonic(&mut self, key: Key, by: TonicBy, playing: &Playing) -> bool {
        let Some(turning) = &playing.by_hand.turning else {
            return false;
        };
        let put_at = |pitch| Tonic {
            key,
            anchor: key,
            anchor_pitch: pitch,
        };
        let tonic = match by {
            TonicBy::Absolute => turning.absolute(key),
            TonicBy::Equal => Some(put_at(turning.equal(key))),
            TonicBy::Pivot => playing.pitch(self, key).map(|now| {
                // What is told of that key beside its tonic stays on it, and is not added twice.
                let mut moved = *self;
                moved.tonic = Some(put_at(now));
                let sounds = playing.pitch(&moved, key).unwrap_or(now);
                put_at(now + (now - sounds))
            }),
        };
        if tonic.is_some() {
            self.tonic = tonic;
        }
        tonic.is_some()
    }

    /// By pitch class: its place and how far it was nudged from there. A place that the key has only under another
    /// tonic is none now.
    pub fn shown(&self, song: &ByHand) -> [(Place, Interval); 12] {
        let tonic = self.tonic_key(song).pitch_class();
        std::array::from_fn(|key| {
            let has = |name| {
                song.other_place((key as u8 + 12 - tonic) % 12, name)
                    .is_some()
            };
            let place = match self.places[key] {
                Place::Named(name) if !has(name) => Place::Home,
                place => place,
            };
            (place, self.trims[key])
        })
    }

    /// Pitch classes some of whose keys go alone, one bit each.
    pub fn shown_alone(&self) -> u16 {
        let goes_alone = |number: &usize| {
            self.alone[*number].is_some() || self.trims_alone[*number] != Interval::ZERO
        };
        let keys = (0..KEYS).filter(goes_alone);
        keys.fold(0, |all, number| all | 1 << (number % 12))
    }

    /// Whether keys stand at a place. At home they are not nudged either.
    pub fn stands(&self, key: Inflected, place: Place, song: &ByHand) -> bool {
        let pitch_class = key.pitch_class();
        let now = match key {
            Inflected::Everywhere(pitch_class) => self.place_of_all(pitch_class as usize),
            Inflected::Alone(key) => self.place_of(key),
        };
        let trim = match key {
            Inflected::Everywhere(_) => Interval::ZERO,
            Inflected::Alone(_) => self.trim_of(key),
        };
        let nudged = trim != Interval::ZERO || self.trims[pitch_class as usize] != Interval::ZERO;
        self.sounded(pitch_class, now, song) == place && (place != Place::Home || !nudged)
    }

    /// How far keys were nudged from their place.
    pub fn trim_of(&self, key: Inflected) -> Interval {
        match key {
            Inflected::Everywhere(pitch_class) => self.trims[pitch_class as usize],
            Inflected::Alone(key) => self.trims_alone[key.number() as usize],
        }
    }

    /// Whether all keys of a turn stand where it puts them.
    pub fn is_turned(&self, name: NameId, song: &ByHand) -> bool {
        let tonic = self.tonic_key(song).pitch_class();
        let mut steps = song
            .turns
            .iter()
            .flatten()
            .filter(|step| step.turn == name)
            .peekable();
        steps.peek().is_some()
            && steps.all(|step| {
                let pitch_class = (tonic + step.keys_above) % 12;
                self.stands(Inflected::Everywhere(pitch_class), step.place, song)
            })
    }

    /// Whether all that belongs to a song is as it begins.
    pub fn is_as_begun(&self, song: &ByHand) -> bool {
        let begun = Lasting::new(song);
        *self
            == Lasting {
                nudge: self.nudge,
                plain: self.plain,
                told: self.told,
                by_line: self.by_line,
                by_chord: self.by_chord,
                ..begun
            }
    }

    /// What a black key was told to be, if that is not what it would be without.
    pub fn told_name(&self, pitch_class: usize, song: &ByHand) -> Option<Letter> {
        let names = song.black_keys[pitch_class]?;
        let has = |bits: u16| bits >> pitch_class & 1 == 1;
        match has(self.second_names) {
            true => Some(names.second),
            false => has(self.named).then_some(names.first),
        }
    }

    /// Whether a black key is the second of its two names.
    pub fn is_second(&self, pitch_class: usize) -> bool {
        (self.second_names | self.by_chord & !self.named) >> pitch_class & 1 == 1
    }

    /// The key that places are counted from.
    fn tonic_key(&self, song: &ByHand) -> Key {
        self.tonic.map_or(song.home, |tonic| tonic.key)
    }

    /// A key alone goes before the line, the line before what was told before the last rest.
    fn place_of(&self, key: Key) -> Place {
        let all = self.place_of_all(key.pitch_class() as usize);
        self.alone[key.number() as usize].unwrap_or(all)
    }

    /// Of the keys of a pitch class that do not go alone.
    fn place_of_all(&self, pitch_class: usize) -> Place {
        let told = self.told >> pitch_class & 1 == 1;
        let line = self.by_line[pitch_class].filter(|_| !told);
        line.unwrap_or(self.places[pitch_class])
    }
}

impl Playing {
    /// What a key sounds with all that was told, but for the nudge; `None` where it is silent.
    pub(super) fn pitch(&self, told: &Lasting, key: Key) -> Option<Pitch> {
        let pitch_class = key.pitch_class() as usize;
        let named = match told.place_of(key) {
            Place::Home => None,
            Place::Named(name) => {
                let tonic = told.tonic_key(&self.by_hand);
                let above = key.number() as i64 - tonic.number() as i64;
                let (octaves, keys_above) = (above.div_euclid(12), above.rem_euclid(12) as u8);
                // A name that the key has under another tonic only is no place of it now.
                let place = self.by_hand.other_place(keys_above, name);
                place.and_then(|place| {
                    Some(self.at_rest(told, tonic)? + self.by_hand.period() * octaves + place)
                })
            }
        };
        let at_home = || {
            let names = self.by_hand.black_keys[pitch_class];
            let second = names.filter(|_| told.is_second(pitch_class));
            let apart = second.map_or(Interval::ZERO, |names| names.apart);
            Some(self.at_rest(told, key)? + apart)
        };
        let trims = told.trims[pitch_class] + told.trims_alone[key.number() as usize];
        Some(named.or_else(at_home)? + trims)
    }

    /// The song's tuning under the tonic that was told.
    fn at_rest(&self, told: &Lasting, key: Key) -> Option<Pitch> {
        match (told.tonic, &self.by_hand.turning) {
            (Some(tonic), Some(turning)) => turning.pitch(tonic, key),
            _ => self.rest.pitch(key),
        }
    }

    /// Puts in force what was told.
    pub(super) fn retune(&mut self, told: &Lasting) {
        let pitch = |number: usize| self.pitch(told, Key::new(number as u8)?);
        self.tuning = Tuning::new(std::array::from_fn(pitch));
        self.level = level(&self.tuning);
    }
}
