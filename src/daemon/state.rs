//! The last good stage file, kept for a start at which the file is bad: a machine on a stage must play.
//!
//! One file for each stage file: all texts it was made of, each with its length, so that nothing has to be escaped.
//! Written a moment after a good load, by a thread of its own (a slow card may take a second), beside the old one and
//! then in its place, so that a cut of the power leaves one of the two.

use super::remember::disk::{Folder, replace};
use crate::stage::Stage;
use crate::stage::complaint::Complaint;
use crate::time::{Span, Time};
use std::fs;
use std::io;
use std::path::{Path, PathBuf};
use std::thread::JoinHandle;
use tracing::warn;

/// Between a good load and its copy: whoever tries out numbers need not wear out a card.
const MOMENT: Span = Span::from_millis(2_000);
const HEAD: &str = "trued keeps here what it last played: version 1\n";
const TAIL: &str = "end\n";

/// What an evening begins with.
pub struct Boot {
    pub path: PathBuf,
    pub stage: Stage,
    /// Not empty: the stage is the kept copy, and this is wrong with the file.
    pub complaints: Vec<Complaint>,
    pub keeper: Keeper,
}

impl Boot {
    /// The stage file, or else the copy that was kept of it.
    ///
    /// # Errors
    /// All that is wrong with the file, if there is no copy that can be played.
    pub fn read(path: &Path, folder: Option<&Path>) -> Result<Boot, Vec<Complaint>> {
        let (stage, complaints) = match Stage::read(path) {
            Ok(stage) => (stage, Vec::new()),
            Err(complaints) => match folder.and_then(|folder| kept(path, folder)) {
                Some(stage) => (stage, complaints),
                None => return Err(complaints),
            },
        };
        Ok(Boot {
            path: path.to_path_buf(),
            stage,
            complaints,
            keeper: Keeper::new(path, folder),
        })
    }
}

/// Where state is kept: the folder that systemd gives, or the user's own.
pub fn folder() -> Option<PathBuf> {
    let variable = |name| std::env::var_os(name).filter(|value| !value.is_empty());
    if let Some(given) = variable("STATE_DIRECTORY") {
        return std::env::split_paths(&given).next();
    }
    let home = || variable("HOME").map(|home| Path::new(&home).join(".local/state"));
    let state = variable("XDG_STATE_HOME").map(PathBuf::from).or_else(home);
    state.map(|state| state.join("trued"))
}

fn kept(path: &Path, folder: &Path) -> Option<Stage> {
    let bytes = fs::read(file_for(path, folder)?).ok()?;
    let copy = decode(&bytes)?;
    let ours = copy
        .first()
        .is_some_and(|(kept, _)| std::path::absolute(path).is_ok_and(|path| path == *kept));
    ours.then(|| Stage::from_copy(&copy).ok()).flatten()
}

/// The copy of a stage file is named after it, and after the whole path by a number, for there may be others
/// of that name.
fn file_for(path: &Path, folder: &Path) -> Option<PathBuf> {
    let path = std::path::absolute(path).ok()?;
    let stem = path.file_stem()?.to_string_lossy().into_owned();
    let short: String = stem.chars().take(40).collect();
    let number = number(&path);
    Some(folder.join(format!("last-good-{short}-{number:016x}")))
}

/// Tells paths apart in the names of files.
pub(super) fn number(path: &Path) -> u64 {
    fnv(path.as_os_str().as_encoded_bytes())
}

/// FNV-1a, 64 bits.
pub(super) fn fnv(bytes: &[u8]) -> u64 {
    bytes.iter().fold(0xcbf2_9ce4_8422_2325, |hash, byte| {
        (hash ^ u64::from(*byte)).wrapping_mul(0x0100_0000_01b3)
    })
}

/// `None` where a path cannot be written in a line.
fn encode(stage: &Stage) -> Option<Vec<u8>> {
    let mut out = HEAD.to_string();
    for (file, text) in stage.files.iter().zip(&stage.texts) {
        let path = std::path::absolute(file).ok()?;
        let path = path.to_str().filter(|path| !path.contains('\n'))?;
        out.push_str(&format!("{} {path}\n{text}\n", text.len()));
    }
    out.push_str(TAIL);
    Some(out.into_bytes())
}

/// `None` if it is not whole.
fn decode(bytes: &[u8]) -> Option<Vec<(PathBuf, String)>> {
    let mut rest = std::str::from_utf8(bytes).ok()?.strip_prefix(HEAD)?;
    let mut copy = Vec::new();
    while rest != TAIL {
        let (line, after) = rest.split_once('\n')?;
        let (length, path) = line.split_once(' ')?;
        let (text, after) = after.split_at_checked(length.parse().ok()?)?;
        copy.push((PathBuf::from(path), text.to_string()));
        rest = after.strip_prefix('\n')?;
    }
    Some(copy)
}

/// Keeps copies.
pub struct Keeper {
    /// `None`: there is no place for them.
    file: Option<PathBuf>,
    /// On the disk already, or being written.
    kept: Vec<u8>,
    /// To be written, and when.
    wanted: Option<(Time, Vec<u8>)>,
    writing: Option<JoinHandle<io::Result<()>>>,
    said: bool,
}

impl Keeper {
    /// For the copies of one stage file.
    fn new(path: &Path, folder: Option<&Path>) -> Keeper {
        let file = folder.and_then(|folder| file_for(path, folder));
        let kept = file.as_ref().and_then(|file| fs::read(file).ok());
        Keeper {
            file,
            kept: kept.unwrap_or_default(),
            wanted: None,
            writing: None,
            said: false,
        }
    }

    /// A good stage: it is written in a moment, if it is still the newest then.
    pub fn keep(&mut self, stage: &Stage, now: Time) {
        if self.file.is_some() {
            let bytes = encode(stage).filter(|bytes| *bytes != self.kept);
            self.wanted = bytes.map(|bytes| (now + MOMENT, bytes));
        }
    }

    /// To be called now and then.
    pub fn look(&mut self, now: Time) {
        if self.writing.as_ref().is_some_and(JoinHandle::is_finished) {
            self.join();
        }
        let due = self.wanted.as_ref().is_some_and(|(at, _)| *at <= now);
        if due && self.writing.is_none() {
            self.write();
        }
    }

    /// Before the end: what is still to be written is written now.
    pub fn finish(&mut self) {
        self.join();
        self.write();
        self.join();
    }

    fn write(&mut self) {
        let (Some(file), Some((_, bytes))) = (self.file.clone(), self.wanted.take()) else {
            return;
        };
        self.kept.clone_from(&bytes);
        let write = move || {
            let folder = file.parent().unwrap_or(Path::new(".")).to_path_buf();
            let name = file.file_name().unwrap_or_default().to_string_lossy();
            replace(&Folder(folder), &name, &bytes)
        };
        match std::thread::Builder::new().name("keep".into()).spawn(write) {
            Ok(writing) => self.writing = Some(writing),
            Err(error) => self.failed(&error),
        }
    }

    fn join(&mut self) {
        match self.writing.take().map(JoinHandle::join) {
            Some(Ok(Err(error))) => self.failed(&error),
            Some(Err(_)) => self.failed(&io::ErrorKind::Other.into()),
            Some(Ok(Ok(()))) | None => {}
        }
    }

    /// Said once: nothing that plays depends on it.
    fn failed(&mut self, error: &io::Error) {
        self.kept.clear();
        if !std::mem::replace(&mut self.said, true) {
            let place = self.file.as_deref().unwrap_or(Path::new("")).display();
            warn!(
                "the last good stage file cannot be kept in {place} ({error}); if the file is bad at the next start, nothing plays"
            );
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_copy_is_whole_or_none() {
        let text = "stage: Kept\nset:\n  - {song: Lantern hymn, tuning: vallotti}\n";
        let stage = Stage::parse(Path::new("/evening/stage.yaml"), text).expect("good");
        let bytes = encode(&stage).expect("plain paths");
        let copy = decode(&bytes).expect("whole");
        assert_eq!(
            copy,
            [(PathBuf::from("/evening/stage.yaml"), text.to_string())]
        );
        assert_eq!(Stage::from_copy(&copy).expect("good").name, "Kept");
        for cut in 0..bytes.len() {
            assert_eq!(decode(&bytes[..cut]), None, "cut at {cut}");
        }
        assert_eq!(decode(&[&bytes[..], b"more"].concat()), None);
    }

    #[test]
    fn stage_files_of_one_name_are_kept_apart() {
        let file = |path| file_for(Path::new(path), Path::new("/state"));
        assert_ne!(file("/a/evening.yaml"), file("/b/evening.yaml"));
        assert_eq!(
            // FNV-1a, 64 bits, of "/a", worked out apart from this code.
            file("/a").map(|file| file.to_string_lossy().into_owned()),
            Some("/state/last-good-a-07d66707b49cd92d".to_string())
        );
    }
}
