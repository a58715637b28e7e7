//! What outlasts a restart or a pulled plug: song, pitch nudge and the like, for the same stage file and set.
//!
//! Lies in the state folder, never in the stage file. Written a moment after a change by a thread of its own (a slow
//! card may take a second), in place of what was there. Nothing that plays depends on it: where it cannot be written the
//! log says so once, and where it cannot be read the evening begins as the stage file says.

pub mod disk;
pub mod pace;
pub mod record;

use super::state::number;
use crate::engine::Command;
use crate::limits::REMEMBERED_BYTES_MAX;
use crate::stage::Stage;
use crate::stage::expression::Mistake;
use crate::stage::words::Words;
use crate::time::Time;
use disk::{Disk, Folder, forget, replace};
use pace::Pace;
use record::{Evening, Found, State, decode, encode};
use std::io;
use std::path::{Path, PathBuf};
use std::thread::JoinHandle;
use tracing::{info, warn};

pub struct Memory {
    /// The place for it, if there is one.
    folder: Option<Folder>,
    name: String,
    of: Evening,
    pace: Pace<Vec<u8>>,
    writing: Option<JoinHandle<io::Result<()>>>,
    /// As last looked at.
    seen: Option<State>,
    /// That it cannot be written has been said.
    said: bool,
}

/// How an evening takes up what is remembered.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Resumed {
    /// For an engine that has heard nothing yet.
    pub commands: Vec<Command>,
    /// What was resumed, or why nothing was, if there is anything to say.
    pub said: Option<String>,
}

impl Memory {
    /// For a daemon of this name with this stage file, with its state in this folder.
    pub fn new(file: &Path, daemon: &str, folder: Option<&Path>) -> Memory {
        let path = std::path::absolute(file).unwrap_or_else(|_| file.to_path_buf());
        Memory {
            folder: folder.map(|folder| Folder(folder.to_path_buf())),
            name: format!("remembered-{daemon}-{:016x}", number(&path)),
            of: Evening {
                file: path.to_string_lossy().into_owned(),
                stage: String::new(),
            },
            pace: Pace::new(None),
            writing: None,
            seen: None,
            said: false,
        }
    }

    /// Nothing of the last time is to come back.
    pub fn forget(&mut self) {
        if let Some(folder) = &self.folder
            && let Err(error) = forget(folder, &self.name)
        {
            let place = self.place().display().to_string();
            warn!("what is remembered in {place} cannot be removed ({error})");
        }
    }

    /// What the last run of this evening left behind.
    pub fn resume(&mut self, stage: &Stage) -> Resumed {
        self.of.stage.clone_from(&stage.name);
        let Some(folder) = &self.folder else {
            return Resumed::default();
        };
        let bytes = match folder.read(&self.name, REMEMBERED_BYTES_MAX) {
            Ok(bytes) => bytes,
            Err(error) if error.kind() == io::ErrorKind::NotFound => return Resumed::default(),
            Err(error) => return self.not_resumed(&format!("cannot be read ({error})")),
        };
        let (of, state) = match decode(&bytes) {
            Found::Good(of, state) => (of, state),
            Found::Damaged => return self.not_resumed("is damaged"),
            Found::Foreign => return self.not_resumed("was written by another version"),
        };
        if of != self.of {
            let other = format!("is of another stage, \"{}\" from {}", of.stage, of.file);
            return self.not_resumed(&other);
        }
        self.pace = Pace::new(Some(bytes));
        let titles: Vec<&str> = stage.set.iter().map(|song| song.title.as_str()).collect();
        match state.found_in(&titles) {
            Some(state) if state.is_fresh() => Resumed::default(),
            Some(state) => {
                let said = format!("resumed: {}, from before the restart", state.words());
                info!("{said}");
                Resumed {
                    commands: self.commands(&state, stage),
                    said: Some(said),
                }
            }
            None => {
                let text = format!("is of \"{}\", which is not in the set now", state.title);
                self.not_resumed(&text)
            }
        }
    }

    fn commands(&self, state: &State, stage: &Stage) -> Vec<Command> {
        let mut commands = state.commands();
        for words in &state.by_hand {
            let command = Words::parse(words).and_then(|words| stage.resolve(&words));
            match command {
                Ok(command) => commands.push(command),
                Err(Mistake { wrong, .. }) => warn!("not resumed: `{words}`, for {wrong}"),
            }
        }
        commands
    }

    fn not_resumed(&self, why: &str) -> Resumed {
        let place = self.place().display().to_string();
        let said = format!("not resumed: what is remembered in {place} {why}");
        warn!("{said}");
        Resumed {
            commands: Vec::new(),
            said: Some(said),
        }
    }

    /// To be called a few times a second with how things stand. True if they are not as at the last call.
    pub fn look(&mut self, now: Time, stage: &str, state: State) -> bool {
        let moved = self.seen.as_ref().is_some_and(|seen| *seen != state);
        if self.folder.is_none() {
            self.seen = Some(state);
            return moved;
        }
        if self.of.stage != stage || self.seen.as_ref() != Some(&state) {
            self.of.stage = stage.to_string();
            self.pace.want(now, &encode(&self.of, &state));
            self.seen = Some(state);
        }
        if self.writing.as_ref().is_some_and(JoinHandle::is_finished) {
            self.join(now);
        }
        if let Some(bytes) = self.pace.due(now) {
            self.write(now, bytes);
        }
        moved
    }

    /// Before the end: what is not on the disk yet is written now.
    pub fn finish(&mut self, now: Time) {
        self.join(now);
        if let Some(bytes) = self.pace.take(now) {
            self.write(now, bytes);
            self.join(now);
        }
    }

    fn write(&mut self, now: Time, bytes: Vec<u8>) {
        let Some(folder) = self.folder.clone() else {
            return;
        };
        let name = self.name.clone();
        let write = move || replace(&folder, &name, &bytes);
        match std::thread::Builder::new()
            .name("remember".into())
            .spawn(write)
        {
            Ok(writing) => self.writing = Some(writing),
            Err(error) => self.done(now, Err(error)),
        }
    }

    fn join(&mut self, now: Time) {
        if let Some(writing) = self.writing.take() {
            let written = writing.join();
            self.done(
                now,
                written.unwrap_or_else(|_| Err(io::ErrorKind::Other.into())),
            );
        }
    }

    fn done(&mut self, now: Time, written: io::Result<()>) {
        self.pace.done(now, written.is_ok());
        let place = self.place().display().to_string();
        match written {
            Err(error) if !std::mem::replace(&mut self.said, true) => {
                warn!(
                    "song and pitch cannot be remembered in {place} ({error}); it goes on without"
                );
            }
            Ok(()) if std::mem::take(&mut self.said) => info!("remembered again in {place}"),
            _ => {}
        }
    }

    fn place(&self) -> PathBuf {
        let folder = self.folder.as_ref();
        folder.map_or_else(PathBuf::new, |folder| folder.0.join(&self.name))
    }
}
