//! Whether the files of a stage have changed.
//!
//! Two ways to know, because each is blind where the other sees: the system tells of changes in a folder at once, but
//! not behind a link, on some network disks, or when it has no more watches to give; a look each second sees all that,
//! a second late. What was seen is judged in `decide.rs`; here is only the asking.

mod decide;

use crate::time::Time;
use decide::Decide;
use notify::event::{AccessKind, AccessMode, EventKind, ModifyKind, RenameMode};
use notify::{Event, RecommendedWatcher, RecursiveMode, Watcher};
use std::fs::Metadata;
use std::os::unix::fs::MetadataExt;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::mpsc::{Receiver, Sender, channel};
use std::time::{Duration, UNIX_EPOCH};

/// What a look at a file sees; another print is another content, for all we know.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Print {
    device: u64,
    inode: u64,
    changed_s: i64,
    changed_ns: i64,
    size: u64,
}

/// A folder in which the system listens for us. A folder made anew may get the number of the old one, but not its birth.
#[derive(Debug, PartialEq, Eq)]
struct Folder {
    path: PathBuf,
    device: u64,
    inode: u64,
    born: Option<Duration>,
}

/// Called when the system has told of something, on a thread of its own: time for [`Watch::is_due`].
pub type Wake = Arc<dyn Fn() + Send + Sync>;

/// The files, and what is known of them.
pub struct Watch {
    files: Vec<PathBuf>,
    /// Names whose change is a change of a file: the files themselves, and what they link to.
    spots: Vec<PathBuf>,
    folders: Vec<Folder>,
    listener: Option<RecommendedWatcher>,
    heard: Receiver<Heard>,
    tell: Sender<Heard>,
    wake: Wake,
    decide: Decide,
    deaf: Deaf,
}

/// Whether the system refuses to tell us of changes.
#[derive(Debug, PartialEq, Eq)]
enum Deaf {
    No,
    /// Why; to be said once.
    Unsaid(String),
    Said,
}

#[derive(Debug)]
enum Heard {
    Changed(PathBuf),
    /// A folder or file has gone; if it is a folder of ours, its watch went with it.
    Gone(PathBuf),
    /// Too much happened at once.
    Missed,
}

impl Watch {
    /// At the first look they are to be read once more, so that nothing is missed that happened since they were read.
    pub fn new(files: &[PathBuf], now: Time, wake: Wake) -> Watch {
        let (tell, heard) = channel();
        let mut watch = Watch {
            files: Vec::new(),
            spots: Vec::new(),
            folders: Vec::new(),
            listener: None,
            heard,
            tell,
            wake,
            decide: Decide::new(now),
            deaf: Deaf::No,
        };
        watch.follow(files, false);
        watch.know();
        watch
    }

    /// Takes over the files of a new stage. `good`: they could be used as they are; if not, they are tried again at
    /// each look, for what was missing may be a file that nobody watches.
    pub fn follow(&mut self, files: &[PathBuf], good: bool) {
        self.decide.settled(good);
        if self.files != files {
            // A file that was not looked at before it was read counts as changed at the next look.
            let seen = files.iter().map(|file| {
                let known = self.files.iter().position(|known| known == file);
                known.and_then(|place| self.decide.seen(place))
            });
            let seen = seen.collect();
            self.files = files.to_vec();
            self.decide.know(seen);
            self.arm();
        }
    }

    /// Whether the files have changed and are to be read now. What is seen of them then counts as known.
    pub fn is_due(&mut self, now: Time) -> bool {
        while let Ok(heard) = self.heard.try_recv() {
            match heard {
                Heard::Changed(path) if self.spots.contains(&path) => self.decide.touched(now),
                Heard::Gone(path) => self.folders.retain(|folder| folder.path != path),
                Heard::Missed => self.decide.touched(now),
                Heard::Changed(_) => {}
            }
        }
        if self.decide.is_look_due(now) {
            self.arm();
            self.decide.looked(now, self.prints());
        }
        let due = self.decide.is_due(now);
        if due {
            self.know();
        }
        due
    }

    /// To be asked after `is_due`: whether to read again what could not be used. What was missing may be a file that
    /// nobody watches.
    pub fn tries_again(&mut self, now: Time) -> bool {
        let again = self.decide.tries_again(now);
        if again {
            self.know();
        }
        again
    }

    /// When `is_due` is to be asked again, if the system says nothing until then.
    pub fn due_at(&self) -> Option<Time> {
        self.decide.due_at()
    }

    /// Before reading: what changes while we read is seen at the next look.
    fn know(&mut self) {
        self.arm();
        self.decide.know(self.prints());
    }

    /// Something to be told, once: the system does not tell us of changes.
    pub fn remark(&mut self) -> Option<String> {
        let Deaf::Unsaid(why) = &self.deaf else {
            return None;
        };
        let remark = format!(
            "the system does not tell of edits ({why}); the stage file is looked at each second instead"
        );
        self.deaf = Deaf::Said;
        Some(remark)
    }

    fn prints(&self) -> Vec<Option<Print>> {
        self.files.iter().map(|file| print(file)).collect()
    }

    /// Listens in every folder that matters, and only there; a folder that is another one than before is heard anew.
    fn arm(&mut self) {
        self.spots = self.files.iter().flat_map(|file| spots(file)).collect();
        let mut wanted: Vec<Folder> = Vec::new();
        for folder in self.spots.iter().filter_map(|spot| folder(spot.parent()?)) {
            if !wanted.contains(&folder) {
                wanted.push(folder);
            }
        }
        if wanted == self.folders {
            return;
        }
        let (tell, wake) = (self.tell.clone(), self.wake.clone());
        let handler = move |event| {
            sort(event, &mut |heard| {
                // Nobody listens any more when this fails.
                drop(tell.send(heard));
                wake();
            });
        };
        match notify::recommended_watcher(handler) {
            Ok(mut listener) => {
                let listen = |folder: &Folder| {
                    let heard = listener.watch(&folder.path, RecursiveMode::NonRecursive);
                    heard.map_err(|error| self.deaf.because(&error)).is_ok()
                };
                self.folders = wanted;
                self.folders.retain(listen);
                self.listener = Some(listener);
            }
            Err(error) => {
                self.deaf.because(&error);
                self.folders.clear();
                self.listener = None;
            }
        }
    }
}

impl Deaf {
    fn because(&mut self, error: &notify::Error) {
        if *self == Deaf::No {
            let why = match &error.kind {
                notify::ErrorKind::MaxFilesWatch => {
                    "no watches left; sysctl fs.inotify.max_user_watches".to_string()
                }
                notify::ErrorKind::Io(error) => error.to_string(),
                _ => error.to_string(),
            };
            *self = Deaf::Unsaid(why);
        }
    }
}

/// Follows links: what counts is the file that is read.
fn print(file: &Path) -> Option<Print> {
    let metadata = std::fs::metadata(file).ok()?;
    Some(Print {
        device: metadata.dev(),
        inode: metadata.ino(),
        changed_s: metadata.mtime(),
        changed_ns: metadata.mtime_nsec(),
        size: metadata.size(),
    })
}

fn folder(path: &Path) -> Option<Folder> {
    let metadata = std::fs::metadata(path).ok().filter(Metadata::is_dir)?;
    Some(Folder {
        path: path.to_path_buf(),
        device: metadata.dev(),
        inode: metadata.ino(),
        born: (metadata.created().ok()).and_then(|born| born.duration_since(UNIX_EPOCH).ok()),
    })
}

/// Links that are followed from one file name to the next.
const HOPS_MAX: usize = 8;

/// A file's name and, where it is a link, the name it links to, and so on. Links among the folders on the way are left
/// to the look each second.
fn spots(file: &Path) -> Vec<PathBuf> {
    // Fails only where there is no current folder any more.
    let Ok(mut spot) = std::path::absolute(file) else {
        return Vec::new();
    };
    let mut spots = Vec::new();
    while spots.len() < HOPS_MAX {
        spots.push(spot.clone());
        let (Ok(target), Some(folder)) = (std::fs::read_link(&spot), spot.parent()) else {
            break;
        };
        spot = folder.join(target);
    }
    spots
}

/// Only what may leave a new text under a name: writing ended, a name appeared. Not the writing itself, nor reading.
fn sort(event: notify::Result<Event>, tell: &mut dyn FnMut(Heard)) {
    let Ok(event) = event else {
        return tell(Heard::Missed);
    };
    if event.need_rescan() {
        return tell(Heard::Missed);
    }
    let heard: fn(PathBuf) -> Heard = match event.kind {
        EventKind::Access(AccessKind::Close(AccessMode::Write)) | EventKind::Create(_) => {
            Heard::Changed
        }
        EventKind::Modify(ModifyKind::Name(RenameMode::From)) => Heard::Gone,
        EventKind::Modify(ModifyKind::Name(_)) => Heard::Changed,
        EventKind::Remove(_) => Heard::Gone,
        _ => return,
    };
    event.paths.into_iter().map(heard).for_each(tell);
}
