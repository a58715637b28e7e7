//! A disk in memory that forgets what the real ones may forget when the power goes.
//!
//! What is certain is only what fsync(2) and rename(2) promise: a file that was synced has its contents; a name means
//! what it meant when its folder was synced, or anything it has meant since, each name by itself, so a rename may have
//! reached one of its two names and not the other. A file that was not synced has any length up to what was written, and
//! each block of it what was written, what was there before, zeros or rubbish.

use crate::support::dice::Dice;
use std::cell::RefCell;
use std::collections::BTreeMap;
use std::io;
use trued::daemon::remember::disk::Disk;

const BLOCK: usize = 16;

/// What a disk may leave out, so that the tests are seen to notice.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Honesty {
    Honest,
    /// Says that a file is synced, and does nothing.
    FilesNot,
    /// Likewise for the folder.
    FolderNot,
}

#[derive(Clone, Debug, Default)]
struct Contents {
    /// Surely on the disk.
    synced: Vec<u8>,
    written: Vec<u8>,
}

#[derive(Debug)]
struct Inner {
    files: Vec<Contents>,
    /// What each name has meant since the folder was synced; the last is what it means now.
    names: BTreeMap<String, Vec<Option<usize>>>,
    honesty: Honesty,
    /// Steps until the power goes.
    steps_left: u64,
    steps: u64,
    bytes_free: usize,
}

#[derive(Debug)]
pub struct FakeDisk(RefCell<Inner>);

impl FakeDisk {
    pub fn new(honesty: Honesty) -> FakeDisk {
        FakeDisk(RefCell::new(Inner {
            files: Vec::new(),
            names: BTreeMap::new(),
            honesty,
            steps_left: u64::MAX,
            steps: 0,
            bytes_free: usize::MAX,
        }))
    }

    /// The power goes in the middle of so many steps from now; everything fails from then on.
    pub fn pull_after(&self, steps: u64) {
        self.0.borrow_mut().steps_left = steps;
    }

    pub fn is_dead(&self) -> bool {
        self.0.borrow().steps_left == 0
    }

    pub fn steps(&self) -> u64 {
        self.0.borrow().steps
    }

    pub fn set_free(&self, bytes: usize) {
        self.0.borrow_mut().bytes_free = bytes;
    }

    pub fn names(&self) -> Vec<String> {
        let inner = self.0.borrow();
        let is_there =
            |(_, means): &(&String, &Vec<Option<usize>>)| means.last().is_some_and(Option::is_some);
        let there = inner.names.iter().filter(is_there);
        there.map(|(name, _)| name.clone()).collect()
    }

    /// The disk as it may be found when the power is back.
    pub fn restarted(&self, dice: &mut Dice) -> FakeDisk {
        let inner = self.0.borrow();
        let files = inner.files.iter().map(|file| {
            let left = left_of(file, dice);
            Contents {
                synced: left.clone(),
                written: left,
            }
        });
        let files = files.collect();
        let chosen = inner.names.iter().map(|(name, means)| {
            let means = means[dice.below(means.len() as u64) as usize];
            (name.clone(), vec![means])
        });
        let again = FakeDisk::new(inner.honesty);
        {
            let mut again = again.0.borrow_mut();
            again.names = chosen.collect();
            again.files = files;
        }
        again
    }
}

fn left_of(file: &Contents, dice: &mut Dice) -> Vec<u8> {
    if file.synced == file.written {
        return file.synced.clone();
    }
    let length = match dice.below(3) {
        0 => file.written.len(),
        1 => file.synced.len().min(file.written.len()),
        _ => dice.below(file.written.len() as u64 + 1) as usize,
    };
    let mut left = Vec::new();
    for at in (0..length).step_by(BLOCK) {
        let kind = dice.below(4);
        for at in at..length.min(at + BLOCK) {
            left.push(match kind {
                0 | 1 => file.written[at],
                2 => file.synced.get(at).copied().unwrap_or(0),
                _ => dice.below(256) as u8,
            });
        }
    }
    left
}

fn no_power() -> io::Error {
    io::Error::other("no power")
}

impl Inner {
    fn means(&self, name: &str) -> Option<usize> {
        *self.names.get(name)?.last()?
    }

    fn now_means(&mut self, name: &str, file: Option<usize>) {
        let means = self.names.entry(name.to_string());
        // Before it was made it meant nothing.
        means.or_insert_with(|| vec![None]).push(file);
    }

    /// One step further; an error if the power has gone already.
    fn step(&mut self) -> io::Result<()> {
        if self.steps_left == 0 {
            return Err(no_power());
        }
        self.steps += 1;
        self.steps_left -= 1;
        Ok(())
    }

    /// A step's own error if the power went in the middle of it.
    fn survived(&self) -> io::Result<()> {
        match self.steps_left {
            0 => Err(no_power()),
            _ => Ok(()),
        }
    }
}

impl Disk for FakeDisk {
    type File = usize;

    fn read(&self, name: &str, bytes_max: usize) -> io::Result<Vec<u8>> {
        let inner = self.0.borrow();
        let file = inner.means(name).ok_or(io::ErrorKind::NotFound)?;
        let bytes = &inner.files[file].written;
        Ok(bytes[..bytes.len().min(bytes_max)].to_vec())
    }

    fn create(&self, name: &str) -> io::Result<usize> {
        let mut inner = self.0.borrow_mut();
        inner.step()?;
        if inner.means(name).is_some() {
            return Err(io::ErrorKind::AlreadyExists.into());
        }
        inner.files.push(Contents::default());
        let file = inner.files.len() - 1;
        inner.now_means(name, Some(file));
        inner.survived()?;
        Ok(file)
    }

    /// In pieces, as a long one goes.
    fn write(&self, file: &mut usize, bytes: &[u8]) -> io::Result<()> {
        let mut inner = self.0.borrow_mut();
        for piece in bytes.chunks(BLOCK * 4) {
            inner.step()?;
            if inner.bytes_free < piece.len() {
                return Err(io::ErrorKind::StorageFull.into());
            }
            inner.bytes_free -= piece.len();
            inner.files[*file].written.extend_from_slice(piece);
            inner.survived()?;
        }
        Ok(())
    }

    fn sync(&self, file: &mut usize) -> io::Result<()> {
        let mut inner = self.0.borrow_mut();
        inner.step()?;
        inner.survived()?;
        if inner.honesty != Honesty::FilesNot {
            let contents = &mut inner.files[*file];
            contents.synced.clone_from(&contents.written);
        }
        Ok(())
    }

    fn rename(&self, from: &str, to: &str) -> io::Result<()> {
        let mut inner = self.0.borrow_mut();
        inner.step()?;
        let file = inner.means(from).ok_or(io::ErrorKind::NotFound)?;
        inner.now_means(to, Some(file));
        inner.now_means(from, None);
        inner.survived()
    }

    fn remove(&self, name: &str) -> io::Result<()> {
        let mut inner = self.0.borrow_mut();
        inner.step()?;
        let file = inner.means(name).ok_or(io::ErrorKind::NotFound)?;
        inner.bytes_free = inner
            .bytes_free
            .saturating_add(inner.files[file].written.len());
        inner.now_means(name, None);
        inner.survived()
    }

    fn sync_folder(&self) -> io::Result<()> {
        let mut inner = self.0.borrow_mut();
        inner.step()?;
        inner.survived()?;
        if inner.honesty != Honesty::FolderNot {
            for means in inner.names.values_mut() {
                means.drain(..means.len() - 1);
            }
        }
        Ok(())
    }
}
