//! Lamps: what a keyboard's device is told while something lasts, by an output port of its own behind those of the synths.
//!
//! Looked at whenever all else of an instant has been said. Each is told what it shows when its port comes, and from then
//! on only when that changes.

use super::plan::{LampPlan, Plan, Shown, SynthId};
use super::traffic::{Command, InflectTo, Link, Nudge, Place, RootTo, Weight};
use super::{Engine, Inflected};
use crate::intonation::{Ratios, Sevenths};
use crate::limits::{LAMPS_MAX, SYNTHS_MAX};
use crate::pitch::Interval;
use crate::tuning::Key;

/// What the devices know; room is taken once.
pub(super) struct Lamps {
    /// In the order of the plan; `None` for a lamp that has been told nothing.
    told: Vec<Option<bool>>,
    /// By place among all ports, synths' and lamps'.
    up: [bool; SYNTHS_MAX],
}

impl Lamps {
    pub fn new() -> Lamps {
        Lamps {
            told: vec![None; LAMPS_MAX],
            up: [false; SYNTHS_MAX],
        }
    }
}

impl Engine {
    /// The state of a port has changed that leads to lamps.
    pub(super) fn lamp_link_changed(&mut self, id: SynthId, link: Link) {
        match link {
            Link::Up | Link::Back => {
                self.forget_lamps(id);
                self.lamps.up[id.index()] = true;
            }
            Link::Down => {
                self.forget_lamps(id);
                self.lamps.up[id.index()] = false;
            }
            Link::Going => {
                self.put_out(id);
                self.lamps.up[id.index()] = false;
            }
            Link::Tight | Link::Easy => {}
        }
    }

    fn forget_lamps(&mut self, id: SynthId) {
        for (lamp, told) in self.plan.lamps.iter().zip(&mut self.lamps.told) {
            if port(&self.plan, lamp) == Some(id) {
                *told = None;
            }
        }
    }

    /// Tells every lamp that is not known to show it already whether it is lit.
    pub(super) fn show_lamps(&mut self) {
        for index in 0..self.plan.lamps.len() {
            let lamp = self.plan.lamps[index];
            let lit = !self.stopping && self.shows(lamp.show);
            if self.lamps.told[index] == Some(lit) {
                continue;
            }
            let id = port(&self.plan, &lamp);
            if let Some(id) = id.filter(|id| self.lamps.up[id.index()]) {
                self.lamps.told[index] = Some(lit);
                let bytes = if lit { lamp.on } else { lamp.off };
                self.out.send(id, Weight::Owed, &bytes);
            }
        }
    }

    fn put_out(&mut self, id: SynthId) {
        for (lamp, told) in self.plan.lamps.iter().zip(&mut self.lamps.told) {
            if *told == Some(true) && port(&self.plan, lamp) == Some(id) {
                *told = Some(false);
                self.out.send(id, Weight::Owed, &lamp.off);
            }
        }
    }

    /// After an edit: a lamp that the new plan has as well stays as it is, the others go out.
    pub(super) fn take_over_lamps(&mut self, old: &Plan) {
        let mut told_before = [None; LAMPS_MAX];
        told_before.copy_from_slice(&self.lamps.told);
        self.lamps.told.fill(None);
        for (lamp, told) in old.lamps.iter().zip(told_before) {
            let id = port(old, lamp);
            let same = |new: &LampPlan| {
                port(&self.plan, new) == id && (new.on, new.off) == (lamp.on, lamp.off)
            };
            match (self.plan.lamps.iter().position(same), id) {
                (Some(place), _) => self.lamps.told[place] = told,
                (None, Some(id)) if told == Some(true) && self.lamps.up[id.index()] => {
                    self.out.send(id, Weight::Owed, &lamp.off);
                }
                _ => {}
            }
        }
        let ports = self.plan.synths.len()..self.plan.ports();
        for (place, up) in self.lamps.up.iter_mut().enumerate() {
            *up &= ports.contains(&place);
        }
    }

    /// Whether something lasts now.
    fn shows(&self, show: Shown) -> bool {
        let command = match show {
            Shown::Song(place) => return self.song == place as usize,
            Shown::Title(place) => return self.is_playing(place),
            Shown::Told(command) => command,
        };
        let (song, told) = (&self.playing, &self.in_force);
        match command {
            Command::Plain => self.plain,
            Command::Pitch { to, .. } => {
                self.nudge
                    == match to {
                        Nudge::By(nudge) => nudge,
                        Nudge::To(pitch) => pitch - song.reference,
                        Nudge::Home => Interval::ZERO,
                    }
            }
            Command::Transpose(keys) => {
                self.transpose_keys() == keys.unwrap_or(song.transpose_keys)
            }
            Command::BlackKey(name) => self.black_keys()[name.pitch_class() as usize] == Some(name),
            Command::Tonic { to, .. } => self
                .tonic_in_force()
                .0
                .is_some_and(|tonic| tonic.pitch_class() == to.pitch_class()),
            Command::TonicHome => song.by_hand.turning.is_some() && told.tonic.is_none(),
            Command::TonicNextKey(_) => self.waits_for_tonic(),
            Command::RootNextKey => self.waits_for_root(),
            Command::Root(to) => {
                let free = matches!(told.root, RootTo::Free);
                song.method.settings().is_some() && free == matches!(to, RootTo::Free)
            }
            Command::Sevenths(sevenths) => song.method.settings().is_some_and(|settings| {
                let own = match settings.ratios {
                    Ratios::PureWith7 => Sevenths::Harmonic,
                    Ratios::Pure | Ratios::Own(_) => Sevenths::Plain,
                };
                told.sevenths.unwrap_or(own) == sevenths
            }),
            Command::Home => !self.plain && told.is_as_begun(&song.by_hand),
            Command::Inflect { key, to } => match to {
                InflectTo::Place(place) => told.stands(key, place, &song.by_hand),
                InflectTo::By(trim) => told.trim_of(key) == trim,
            },
            Command::InflectHome => Key::all()
                .map(Inflected::Alone)
                .all(|key| told.stands(key, Place::Home, &song.by_hand)),
            Command::Turn(name) => told.is_turned(name, &song.by_hand),
            _ => false,
        }
    }
}

/// The port that leads to a lamp.
fn port(plan: &Plan, lamp: &LampPlan) -> Option<SynthId> {
    SynthId::new(plan.synths.len() + lamp.port as usize)
}
