//! Where the control socket lies: the same places, in the same order, for a daemon that makes it and for a `tell` that
//! looks for it.

use super::socket::{Socket, Unopened};
use crate::ports::system;
use std::fs::{self, DirBuilder};
use std::io;
use std::os::unix::fs::{DirBuilderExt, MetadataExt};
use std::path::{Path, PathBuf};
use tracing::warn;

/// The places for a daemon of this name, the best first: what systemd gave us, the user's own, the machine's, and a
/// folder that is nobody else's.
pub fn candidates(name: &str) -> Vec<PathBuf> {
    let given = |variable: &str| {
        let value = std::env::var_os(variable).filter(|value| !value.is_empty())?;
        // systemd gives several folders with colons between them if a unit asks for several; the first is ours.
        let first = value.to_string_lossy().split(':').next()?.to_string();
        Some(PathBuf::from(first)).filter(|path| path.is_absolute())
    };
    let folders = [
        given("RUNTIME_DIRECTORY"),
        given("XDG_RUNTIME_DIR").map(|folder| folder.join("trued")),
        Some(PathBuf::from("/run/trued")),
        Some(PathBuf::from(format!("/tmp/trued-{}", system::user()))),
    ];
    let file = format!("{name}.sock");
    folders
        .into_iter()
        .flatten()
        .map(|folder| folder.join(&file))
        .collect()
}

/// Opens the control socket at the first place that can be had, or at the one that was asked for. Without one the
/// evening goes on, and the log says so.
///
/// # Errors
/// A daemon of this name is running already, with its socket here.
pub fn open(name: &str, asked: Option<&Path>) -> Result<Option<Socket>, PathBuf> {
    let places = asked.map_or_else(|| candidates(name), |path| vec![path.to_owned()]);
    let mut failed = Vec::new();
    for path in places {
        let folder = path.parent().filter(|_| asked.is_none());
        let prepared = folder.map_or(Ok(()), prepare);
        let opened = prepared.map_err(Unopened::Failed);
        match opened.and_then(|()| Socket::open(&path)) {
            Ok(socket) => return Ok(Some(socket)),
            Err(Unopened::Taken) => return Err(path),
            Err(Unopened::Failed(error)) => failed.push(format!("{}: {error}", path.display())),
        }
    }
    let failed = failed.join("; ");
    warn!("no control socket, so `tell` and `status` cannot reach this daemon: {failed}");
    Ok(None)
}

/// Whether a daemon may be called so: it becomes a file's name.
///
/// # Errors
/// What is wrong with it, and what would be right.
pub fn check_name(name: &str) -> Result<(), String> {
    let fits = |c: char| c.is_alphanumeric() || matches!(c, '-' | '_' | '.' | ' ');
    if name.is_empty() || name.len() > 40 || name.starts_with('.') || !name.chars().all(fits) {
        return Err(format!(
            "`{name}` cannot be a daemon's name; use at most 40 letters, figures, - and _"
        ));
    }
    Ok(())
}

/// Makes the folder if it is missing, for us alone. One that is there may be of any kind, except under the folder that
/// all users share: there it must be ours and closed to others.
///
/// # Errors
/// It cannot be made, or somebody else has prepared it.
pub fn prepare(folder: &Path) -> io::Result<()> {
    match DirBuilder::new().mode(0o700).create(folder) {
        Err(error) if error.kind() != io::ErrorKind::AlreadyExists => return Err(error),
        _ => {}
    }
    is_safe(folder)
}

/// Whether what lies in this folder can be trusted to be ours.
///
/// # Errors
/// It is missing, or anybody may have put something there.
pub fn is_safe(folder: &Path) -> io::Result<()> {
    let found = fs::symlink_metadata(folder)?;
    let shared = folder.parent() == Some(Path::new("/tmp"));
    let ours = found.is_dir() && found.uid() == system::user() && found.mode() & 0o077 == 0;
    if shared && !ours {
        let text = format!(
            "{} is not a folder of this user alone; remove it",
            folder.display()
        );
        return Err(io::Error::other(text));
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_that_would_leave_their_folder_are_refused() {
        for good in ["trued", "left manual", "Bühne-2"] {
            assert_eq!(check_name(good), Ok(()), "{good}");
        }
        for bad in ["", "..", "a/b", ".hidden", "a\nb", &"x".repeat(41)] {
            assert!(check_name(bad).is_err(), "{bad:?}");
        }
    }

    #[test]
    fn a_folder_in_the_shared_place_must_be_ours_alone() {
        use std::os::unix::fs::PermissionsExt;
        let folder = PathBuf::from(format!("/tmp/trued-safe-{}", std::process::id()));
        prepare(&folder).unwrap();
        assert_eq!(fs::metadata(&folder).unwrap().mode() & 0o777, 0o700);
        prepare(&folder).unwrap();
        fs::set_permissions(&folder, fs::Permissions::from_mode(0o770)).unwrap();
        assert!(prepare(&folder).is_err(), "others may write there");
        fs::remove_dir(&folder).unwrap();
        std::os::unix::fs::symlink("/usr", &folder).unwrap();
        assert!(prepare(&folder).is_err(), "a link leads elsewhere");
        fs::remove_file(&folder).unwrap();
    }
}
