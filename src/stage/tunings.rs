//! Tunings as players write them, and where they are looked for by name.

mod body;
mod by_letter;
mod from_tonic;
mod notes;
mod other_places;

use super::complaint::{Complaints, Trail};
use super::node::{At, Node, nearest};
use super::shipped::SHIPPED;
use crate::pitch::{Hertz, Log};
use crate::tuning::{Key, Letter, Pin, Placement, Scale};
use std::path::{Path, PathBuf};
use std::rc::Rc;

/// A tuning as written, checked.
#[derive(Clone, Debug)]
pub struct TuningText {
    pub name: String,
    pub about: Option<String>,
    /// Where the figures come from.
    pub source: Option<String>,
    /// How sure that is.
    pub sure: Option<String>,
    pub scale: Scale,
    /// Other places of keys, by name, above home or step 0.
    pub also: Vec<OtherPlace>,
    /// Several other places taken at once, under one name.
    pub turns: Vec<Turn>,
    /// What home or step 0 sounds, where the tuning was written in hertz.
    pub heard_at: Option<Hertz>,
}

/// Another place of a key.
#[derive(Clone, Debug, PartialEq)]
pub struct OtherPlace {
    pub key: Letter,
    pub name: String,
    pub place: Log,
}

/// A named group of other places: key and the name of its place (`home` for the one it begins with).
#[derive(Clone, Debug, PartialEq)]
pub struct Turn {
    pub name: String,
    pub keys: Vec<(Letter, String)>,
}

/// The reference a song or stage asks for: this key, at this frequency, held like this.
pub type Reference = (Key, Hertz, Pin);

impl TuningText {
    /// Where the tuning is put. Without a reference of the song's or the stage's own: as written, if it was written in
    /// hertz, else A4 = 440 Hz.
    pub fn placement(
        &self,
        tonic: Option<Key>,
        turned_to: Option<Letter>,
        reference: Option<Reference>,
    ) -> Placement {
        let as_written = || {
            let hertz = self.heard_at?;
            let key = match &self.scale {
                Scale::ByLetter(scale) => {
                    let home = turned_to.map_or(scale.home, Letter::pitch_class);
                    // The home key nearest to that frequency, whatever its octave.
                    let nearest = hertz.pitch().nearest_key().unwrap_or(60) as i32;
                    let above = (home as i32 - nearest + 6).rem_euclid(12) - 6;
                    Key::A4.moved(nearest + above - 69)?
                }
                Scale::FromTonic(scale) => tonic.unwrap_or(scale.default_tonic()),
            };
            Some((key, hertz, Pin::Key))
        };
        let (reference, hertz, pin) =
            reference
                .or_else(as_written)
                .unwrap_or((Key::A4, Hertz::A440, Pin::Key));
        Placement {
            tonic,
            turned_to,
            reference,
            hertz,
            pin,
        }
    }
}

/// Every tuning that can be named: the stage file's own, those in tuning folders, those shipped; in this order.
pub struct Library<'n> {
    own: Vec<(String, At<'n>)>,
    folders: Vec<PathBuf>,
    /// What was asked for before, and whether it was good.
    read: Vec<(String, Option<Rc<TuningText>>)>,
    /// Names whose `like` is being followed.
    busy: Vec<String>,
    files: Vec<PathBuf>,
}

impl<'n> Library<'n> {
    /// `own` is the `tunings` map of the stage file; `tunings/` beside that file is searched too.
    pub fn new(own: Option<At<'n>>, stage_file: &Path, complaints: &mut Complaints) -> Library<'n> {
        let own = own
            .and_then(|at| at.fields("a map of tunings by name", complaints))
            .map(|mut fields| fields.take_all())
            .unwrap_or_default();
        let beside = stage_file.parent().unwrap_or(Path::new(""));
        let mut folders = vec![beside.join("tunings")];
        if let Some(home) = std::env::var_os("HOME") {
            folders.push(Path::new(&home).join(".config/trued/tunings"));
        }
        Library {
            own,
            folders,
            read: Vec::new(),
            busy: Vec::new(),
            files: Vec::new(),
        }
    }

    /// Reads every tuning of the stage file, so that mistakes show in those that no song uses too.
    pub fn check_own(&mut self, complaints: &mut Complaints) {
        for (name, at) in self.own.clone() {
            self.find(&name, &at.trail, complaints);
        }
    }

    /// The tuning of that name. Complains, at `asked`, if there is none, and about everything wrong inside it, once.
    pub fn find(
        &mut self,
        name: &str,
        asked: &Trail,
        complaints: &mut Complaints,
    ) -> Option<Rc<TuningText>> {
        if let Some((_, found)) = self.read.iter().find(|(read, _)| read == name) {
            return found.clone();
        }
        if self.busy.iter().any(|busy| busy == name) {
            let circle = format!("`{name}` is built on itself, by way of `like`");
            complaints.add(asked, circle, "give one of them pitches of its own");
            return None;
        }
        self.busy.push(name.to_string());
        let found = self.look_up(name, asked, complaints).map(Rc::new);
        self.busy.pop();
        self.read.push((name.to_string(), found.clone()));
        found
    }

    /// Tuning files that were read, to be watched.
    pub fn files(&self) -> &[PathBuf] {
        &self.files
    }

    /// Whether it stands in the stage file itself.
    pub fn is_own(&self, name: &str) -> bool {
        self.own.iter().any(|(own, _)| own == name)
    }

    /// Every name there is, own ones first.
    pub fn names(&self) -> Vec<String> {
        let own = self.own.iter().map(|(name, _)| name.clone());
        let filed = self.folders.iter().flat_map(|folder| filed_names(folder));
        let shipped = SHIPPED.iter().map(|(name, _)| name.to_string());
        let mut names: Vec<String> = Vec::new();
        for name in own.chain(filed).chain(shipped) {
            if !names.contains(&name) {
                names.push(name);
            }
        }
        names
    }

    fn look_up(
        &mut self,
        name: &str,
        asked: &Trail,
        complaints: &mut Complaints,
    ) -> Option<TuningText> {
        if let Some((_, at)) = self.own.iter().find(|(own, _)| own == name) {
            let at = at.clone();
            return body::read(name, &at, self, complaints);
        }
        let plain = !name.contains(['/', '\\']) && !name.starts_with('.');
        let file = (self.folders.iter())
            .map(|folder| folder.join(format!("{name}.yaml")))
            .find(|file| plain && complaints.has_file(file));
        if let Some(file) = file {
            self.files.push(file.clone());
            return match complaints.read(&file) {
                Ok(text) => self.read_text(name, &file, &text, complaints),
                Err(error) => {
                    let wrong = format!("cannot be read ({error})");
                    complaints.add_unread(&file, wrong, "make it readable, or take it away");
                    None
                }
            };
        }
        if let Some((_, text)) = SHIPPED.iter().find(|(shipped, _)| *shipped == name) {
            let file = PathBuf::from(format!("config/tunings/{name}.yaml"));
            return self.read_text(name, &file, text, complaints);
        }
        let names = self.names();
        let names: Vec<&str> = names.iter().map(String::as_str).collect();
        let right = match nearest(name, &names) {
            Some(near) => format!("did you mean `{near}`?"),
            None => "`trued chart --list` lists those there are".to_string(),
        };
        complaints.add(asked, format!("there is no tuning `{name}`"), right);
        None
    }

    /// A file that holds one tuning.
    fn read_text(
        &mut self,
        name: &str,
        file: &Path,
        text: &str,
        complaints: &mut Complaints,
    ) -> Option<TuningText> {
        let number = complaints.add_file(file, text);
        match serde_yaml::from_str::<Node>(text) {
            Ok(node) => body::read(name, &At::new(&node, Trail::root(number)), self, complaints),
            Err(error) => {
                let place = error
                    .location()
                    .map_or((1, 1), |at| (at.line(), at.column()));
                let wrong = format!("this cannot be read as YAML ({error})");
                complaints.add_place(
                    number,
                    place,
                    wrong,
                    "look for a missing quote, colon or bracket",
                );
                None
            }
        }
    }
}

fn filed_names(folder: &Path) -> Vec<String> {
    let Ok(entries) = std::fs::read_dir(folder) else {
        return Vec::new(); // no such folder is the usual case
    };
    let mut names: Vec<String> = entries
        .filter_map(|entry| {
            let name = entry.ok()?.file_name().into_string().ok()?;
            name.strip_suffix(".yaml").map(str::to_string)
        })
        .collect();
    names.sort();
    names
}

#[cfg(test)]
#[path = "tunings_tests.rs"]
mod tests;

#[cfg(test)]
#[path = "tunings_bad_tests.rs"]
mod bad_tests;
