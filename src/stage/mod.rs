//! The paper side: a stage file in, a plan out.
//!
//! **What this room is**: YAML to a tree (`node`), where it stumbles in words of our own (`slips`, `cuts`, `yaml_errors`);
//! the tree, section by section, to checked types with every complaint at once (`rig`, `songs`, `tunings`, `cues`;
//! `complaint`, `locate`); those to a [`Plan`] (`compile`, `pools`); what to expect of it (`outlook`, `chords`); when to read it
//! again (`watch`).
//! **Start reading at** [`Stage`], then `compile.rs`.
//! **May know** `engine/` (its plan), `tuning/`, `pitch/`, `intonation/`, `limits`.
//! **Owns** serde_yaml and notify. A [`Stage`] cannot be wrong.
//! **Not here**: what is done with an edit while playing (`daemon/reload.rs`).

mod advice;
mod black_keys;
pub mod chords;
pub mod circle;
mod compile;
pub mod complaint;
mod cues;
mod cuts;
pub mod defaults;
pub mod expression;
mod inflections;
mod intonation;
mod lamps;
pub mod landing;
mod locate;
mod naming;
pub mod node;
pub mod outlook;
mod parts;
mod placing;
mod pools;
mod resolve;
mod rig;
mod sends;
pub mod shipped;
mod slips;
mod songs;
mod synth;
mod told;
pub mod tunings;
mod values;
#[cfg(unix)]
pub mod watch;
pub mod words;
mod yaml_errors;

use crate::engine::plan::{ByHand, NameId, TwoNames};
use crate::engine::{Command, Plan};
use crate::tuning::{Letter, Placement, Scale, Tuning};
use complaint::{Complaint, Complaints};
use expression::Mistake;
use resolve::{Names, Refusal};
use std::path::{Path, PathBuf};
use std::sync::Arc;
use told::Told;
use words::Words;

/// An evening that cannot be wrong: rig, tunings, set, cues, all checked.
pub struct Stage {
    pub name: String,
    pub keyboards: Vec<Device>,
    pub synths: Vec<Device>,
    /// Tonight's order; the same song may stand twice.
    pub set: Vec<Song>,
    /// What is worth knowing and not wrong: wolves, reach, pins, two ports for one wish, what is not played yet.
    pub advice: Vec<String>,
    /// Every file that was read: the stage file first, then rig and tuning files. To be watched.
    pub files: Vec<PathBuf>,
    /// What stood in them, in the same order.
    pub texts: Vec<String>,
    told: Told,
    plan: Plan,
}

/// A keyboard or synth as named in the rig, in the order of the plan's ids.
#[derive(Clone, Debug, PartialEq)]
pub struct Device {
    pub name: String,
    pub port: Wish,
}

/// Which port a device wants.
#[derive(Clone, Debug, PartialEq)]
pub enum Wish {
    /// Nothing was said: keyboards take every port that fits, a synth the first one.
    Any,
    /// A port of our own that others connect to, named after the device.
    Virtual,
    /// Globs on port or device names, any case, in order of preference; `socket` is a USB place such as `1-1.3`.
    Named {
        globs: Vec<String>,
        socket: Option<String>,
    },
}

/// A song with everything that chart, check and the offline commands want to say about it.
#[derive(Clone, Debug)]
pub struct Song {
    pub title: String,
    pub tuning_name: String,
    pub tuning_about: Option<String>,
    pub scale: Scale,
    pub placement: Placement,
    /// Of the placement; shared with the plan.
    pub tuning: Arc<Tuning>,
    /// The keys the piece is `in`: tonic and mode as typed (`E phrygian`).
    pub in_keys: Vec<(Letter, String)>,
    /// What each of the twelve keys is called in this song (`Ab` or `G#`).
    pub names: [Letter; 12],
    /// Black keys that stand for two notes, by pitch class.
    pub two_names: [Option<TwoNames>; 12],
    pub transpose_keys: i8,
    /// What can be changed of it by hand; shared with the plan.
    pub by_hand: Arc<ByHand>,
    /// Its chords are followed, so that they are pure whatever the tuning says.
    pub follows: bool,
}

impl Stage {
    /// Reads a stage file and whatever it names (rig file, tuning folders).
    ///
    /// # Errors
    /// Every complaint at once, in reading order. A file that cannot be read is one complaint with line 0.
    pub fn read(path: &Path) -> Result<Stage, Vec<Complaint>> {
        let unread = |wrong: String, right: &str| {
            let mut complaints = Complaints::default();
            complaints.add_unread(path, wrong, right);
            complaints.into_sorted()
        };
        let bytes = std::fs::read(path).map_err(|error| {
            let wrong = match error.kind() {
                std::io::ErrorKind::NotFound => String::from("there is no such file"),
                _ => format!("cannot be read ({error})"),
            };
            unread(wrong, "give the path of a stage file")
        })?;
        let text = String::from_utf8(bytes)
            .map_err(|_| unread(String::from("is not UTF-8 text"), "save it as UTF-8"))?;
        Stage::parse(path, &text)
    }

    /// As `read`, for a text already in hand; `path` is where it is said to come from.
    pub fn parse(path: &Path, text: &str) -> Result<Stage, Vec<Complaint>> {
        compile::parse(path, text, &[])
    }

    /// From a copy of everything that was read once: absolute paths and texts, the stage file first.
    ///
    /// # Errors
    /// Every complaint at once.
    pub fn from_copy(copy: &[(PathBuf, String)]) -> Result<Stage, Vec<Complaint>> {
        let Some((path, text)) = copy.first() else {
            return Err(Vec::new());
        };
        compile::parse(path, text, copy)
    }

    /// What the engine or the desk does for words that were told. The same grammar as behind `do:`.
    ///
    /// # Errors
    /// A song or synth that is not there, words that mean something in a cue only or that nothing plays yet.
    pub fn resolve(&self, words: &Words) -> Result<Command, Mistake> {
        let names = Names {
            titles: self.set.iter().map(|song| song.title.as_str()).collect(),
            synths: (self.synths.iter())
                .map(|synth| synth.name.as_str())
                .collect(),
            references: self.plan.set.iter().map(|song| song.reference).collect(),
            told: &self.told,
        };
        names.resolve(words).map_err(|refusal| match refusal {
            Refusal::Wrong(mistake) => mistake,
            Refusal::NotPlayed => Mistake {
                wrong: String::from("these words are understood but not played by this version"),
                right: format!("it plays {}", resolve::PLAYED),
            },
        })
    }

    /// What the places of keys are called that the engine reports.
    pub fn place_names(&self) -> Vec<(NameId, String)> {
        self.told.place_names()
    }

    /// Keyboards that have lamps, by place.
    pub fn keyboards_with_lamps(&self) -> impl Iterator<Item = usize> + '_ {
        self.plan.lamp_ports.iter().map(|keyboard| keyboard.index())
    }

    /// A plan for the live engine.
    pub fn plan(&self) -> Box<Plan> {
        Box::new(self.plan.clone())
    }

    /// The same plan for a file's clock: set-up is said all at once, so that it stands before the first note.
    pub fn plan_offline(&self) -> Box<Plan> {
        let mut plan = self.plan.clone();
        for synth in &mut plan.synths {
            synth.pace = crate::time::Span::ZERO;
        }
        Box::new(plan)
    }
}
