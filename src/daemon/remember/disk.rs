//! Files that survive a pulled plug: what is there afterwards is the old one or the new one, whole.

use std::fs::{self, File, OpenOptions};
use std::io::{self, Read, Write};
use std::path::{Path, PathBuf};

/// One folder of a disk, in the few steps that matter when the power goes. Until a file is synced, all, some or none of
/// it may be on the disk; until the folder is, a name may be missing or stand for what it stood for before.
pub trait Disk {
    type File;

    /// At most so many bytes, from the beginning.
    ///
    /// # Errors
    /// It is not there, or cannot be read.
    fn read(&self, name: &str, bytes_max: usize) -> io::Result<Vec<u8>>;

    /// A new file. The folder is made if it is missing.
    ///
    /// # Errors
    /// One of this name is there, or none can be made.
    fn create(&self, name: &str) -> io::Result<Self::File>;

    /// # Errors
    /// Not all of it could be written.
    fn write(&self, file: &mut Self::File, bytes: &[u8]) -> io::Result<()>;

    /// Returns once the file's contents are on the disk.
    ///
    /// # Errors
    /// They are not.
    fn sync(&self, file: &mut Self::File) -> io::Result<()>;

    /// From now on `to` is what `from` was; what was called so before is gone.
    ///
    /// # Errors
    /// It is as before.
    fn rename(&self, from: &str, to: &str) -> io::Result<()>;

    /// # Errors
    /// It was not there, or still is.
    fn remove(&self, name: &str) -> io::Result<()>;

    /// Returns once the folder's names are on the disk.
    ///
    /// # Errors
    /// They are not.
    fn sync_folder(&self) -> io::Result<()>;
}

/// Puts new contents in the place of a file, so that a cut of the power at any moment leaves the old or the new ones.
///
/// # Errors
/// The new ones may not last; the old ones may still be there.
pub fn replace<D: Disk>(disk: &D, name: &str, bytes: &[u8]) -> io::Result<()> {
    let beside = format!("{name}.new");
    // Never written over: after a cut it may be the very file that already has the other name too.
    remove_if_there(disk, &beside)?;
    let written = write_through(disk, &beside, bytes).and_then(|()| disk.rename(&beside, name));
    if written.is_err() {
        // What is left of it is of no use; that it cannot be removed either changes nothing.
        let _ = disk.remove(&beside);
    }
    written?;
    disk.sync_folder()
}

/// Removes a file for good.
///
/// # Errors
/// It may still be there, or come back with a cut of the power.
pub fn forget<D: Disk>(disk: &D, name: &str) -> io::Result<()> {
    if remove_if_there(disk, name)? {
        disk.sync_folder()?;
    }
    Ok(())
}

fn remove_if_there<D: Disk>(disk: &D, name: &str) -> io::Result<bool> {
    match disk.remove(name) {
        Err(error) if error.kind() == io::ErrorKind::NotFound => Ok(false),
        done => done.map(|()| true),
    }
}

fn write_through<D: Disk>(disk: &D, name: &str, bytes: &[u8]) -> io::Result<()> {
    let mut file = disk.create(name)?;
    disk.write(&mut file, bytes)?;
    disk.sync(&mut file)
}

/// A real one.
#[derive(Clone, Debug)]
pub struct Folder(pub PathBuf);

impl Disk for Folder {
    type File = File;

    fn read(&self, name: &str, bytes_max: usize) -> io::Result<Vec<u8>> {
        let mut bytes = Vec::new();
        let file = File::open(self.0.join(name))?;
        file.take(bytes_max as u64).read_to_end(&mut bytes)?;
        Ok(bytes)
    }

    fn create(&self, name: &str) -> io::Result<File> {
        make(&self.0)?;
        let mut options = OpenOptions::new();
        options.write(true).create_new(true).open(self.0.join(name))
    }

    fn write(&self, file: &mut File, bytes: &[u8]) -> io::Result<()> {
        file.write_all(bytes)
    }

    fn sync(&self, file: &mut File) -> io::Result<()> {
        file.sync_all()
    }

    fn rename(&self, from: &str, to: &str) -> io::Result<()> {
        fs::rename(self.0.join(from), self.0.join(to))
    }

    fn remove(&self, name: &str) -> io::Result<()> {
        fs::remove_file(self.0.join(name))
    }

    fn sync_folder(&self) -> io::Result<()> {
        sync_names(&self.0)
    }
}

/// Makes a folder and those above it, each on the disk before the next.
fn make(folder: &Path) -> io::Result<()> {
    let Some(above) = folder.parent() else {
        return Ok(());
    };
    let made = fs::create_dir(folder).or_else(|error| match error.kind() {
        io::ErrorKind::NotFound => make(above).and_then(|()| fs::create_dir(folder)),
        _ => Err(error),
    });
    match made {
        Ok(()) => sync_names(above),
        Err(_) if folder.is_dir() => Ok(()),
        Err(error) => Err(error),
    }
}

fn sync_names(folder: &Path) -> io::Result<()> {
    let folder = if folder.as_os_str().is_empty() {
        Path::new(".")
    } else {
        folder
    };
    match File::open(folder)?.sync_all() {
        // Some file systems cannot, and have no need to: fsync(2), EINVAL.
        Err(error) if error.kind() == io::ErrorKind::InvalidInput => Ok(()),
        done => done,
    }
}
