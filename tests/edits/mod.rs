//! A stage file is edited in every way that editors and copying programs have, while somebody plays: real folders, real
//! time, the daemon's own reading and score, a port in memory, and the independent receiver.

mod kept;
mod playing;
mod stand;
mod watching;

use std::path::{Path, PathBuf};

/// Half a bend step at range 12 is 0.073 cents (12 x 200 / 16384 / 2); edits change a key by a cent at least.
const NEAR_CENTS: f64 = 0.08;

/// A folder of a test's own, empty; not in /tmp, where editors behave otherwise.
fn folder(name: &str) -> PathBuf {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join(name);
    if folder.exists() {
        std::fs::remove_dir_all(&folder).expect("left over from the last run");
    }
    std::fs::create_dir_all(&folder).expect("a folder");
    folder
}

/// What rsync, `sed -i` and most programs do: a new file beside the old one, then in its place.
fn rename_over(file: &Path, text: &str) {
    let beside = file.with_extension("tmp");
    std::fs::write(&beside, text).expect("written");
    std::fs::rename(&beside, file).expect("renamed");
}

/// What vim does by default outside /tmp (as `strace` shows): the old file becomes a backup, a new one is made under
/// the name, the backup goes.
fn as_vim_does(file: &Path, text: &str) {
    let backup = file.with_extension("yaml~");
    std::fs::rename(file, &backup).expect("renamed");
    std::fs::write(file, text).expect("written");
    std::fs::remove_file(&backup).expect("removed");
}

/// The name becomes a link to a new file, or a link to another one than before.
fn swap_link(file: &Path, text: &str, number: usize) {
    let target = file.with_file_name(format!("version-{number}.yaml"));
    std::fs::write(&target, text).expect("written");
    let link = file.with_extension("link");
    std::os::unix::fs::symlink(&target, &link).expect("linked");
    std::fs::rename(&link, file).expect("renamed");
}
