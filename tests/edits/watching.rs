//! What the watch sees of real folders: every way in which a name can come to stand for another text.

use super::{as_vim_does, folder, rename_over, swap_link};
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::time::{Duration, Instant};
use trued::ports::clock::Clock;
use trued::stage::watch::Watch;

/// How long a change is waited for. What the system tells comes after 0.1 s, what a look finds after 1.1 s at most;
/// more only where the machine is busy.
const GIVE_UP: Duration = Duration::from_secs(60);

struct Watched {
    watch: Watch,
    clock: Clock,
}

impl Watched {
    fn new(files: &[PathBuf]) -> Watched {
        let clock = Clock::start();
        let watch = Watch::new(files, clock.now(), Arc::new(|| ()));
        let mut watched = Watched { watch, clock };
        // At the first look they are to be read once more.
        watched.wait();
        watched.watch.follow(files, true);
        watched
    }

    fn is_due(&mut self) -> bool {
        let now = self.clock.now();
        self.watch.is_due(now) || self.watch.tries_again(now)
    }

    /// Waits for the next change.
    fn wait(&mut self) -> Duration {
        let began = Instant::now();
        while !self.is_due() {
            assert!(began.elapsed() < GIVE_UP, "not seen");
            std::thread::sleep(Duration::from_millis(5));
        }
        began.elapsed()
    }

    /// For longer than any look would take.
    fn sees_nothing(&mut self) {
        let began = Instant::now();
        while began.elapsed() < Duration::from_millis(2_300) {
            assert!(!self.is_due(), "there was nothing to see");
            std::thread::sleep(Duration::from_millis(20));
        }
    }
}

fn write(file: &Path, text: &str) {
    std::fs::write(file, text).expect("written");
}

#[test]
fn every_way_of_writing_is_seen_again_and_again() {
    let folder = folder("watch-writing");
    let file = folder.join("evening.yaml");
    write(&file, "0");
    let mut watched = Watched::new(std::slice::from_ref(&file));
    for round in 0..3 {
        write(&file, &format!("in place {round}"));
        watched.wait();
        rename_over(&file, &format!("over {round}"));
        watched.wait();
        as_vim_does(&file, &format!("vim {round}"));
        watched.wait();
        swap_link(&file, &format!("link {round}"), round);
        watched.wait();
        write(
            &folder.join(format!("version-{round}.yaml")),
            "behind the link",
        );
        watched.wait();
        std::fs::remove_file(&file).expect("removed");
        watched.wait();
    }
}

#[test]
fn links_and_folders_on_the_way_may_change() {
    let folder = folder("watch-folders");
    for version in ["one", "two"] {
        std::fs::create_dir(folder.join(version)).expect("made");
        write(&folder.join(version).join("evening.yaml"), version);
    }
    let current = folder.join("current");
    std::os::unix::fs::symlink("one", &current).expect("linked");
    let file = current.join("evening.yaml");
    let mut watched = Watched::new(std::slice::from_ref(&file));
    std::os::unix::fs::symlink("two", folder.join("next")).expect("linked");
    std::fs::rename(folder.join("next"), &current).expect("renamed");
    watched.wait();
    // Now it is the other folder that is listened to.
    rename_over(&folder.join("two/evening.yaml"), "edited");
    watched.wait();
    std::fs::remove_dir_all(folder.join("two")).expect("removed");
    watched.wait();
    std::fs::create_dir(folder.join("two")).expect("made");
    write(&file, "made anew");
    watched.wait();
    rename_over(&file, "and edited");
    watched.wait();
}

#[test]
fn neighbours_and_readers_are_nobodys_business() {
    let folder = folder("watch-neighbours");
    let file = folder.join("evening.yaml");
    write(&file, "0");
    let mut watched = Watched::new(std::slice::from_ref(&file));
    write(&folder.join("notes.txt"), "a neighbour");
    rename_over(&folder.join("other.yaml"), "another");
    std::fs::read(&file).expect("read");
    watched.sees_nothing();
}

#[test]
fn every_file_of_the_stage_counts_and_one_that_was_bad_is_tried_again() {
    let folder = folder("watch-several");
    let [stage, rig] = ["evening.yaml", "rig.yaml"].map(|name| folder.join(name));
    write(&stage, "0");
    write(&rig, "0");
    let mut watched = Watched::new(std::slice::from_ref(&stage));
    watched.watch.follow(&[stage.clone(), rig.clone()], true);
    watched.wait(); // the rig is new to it
    write(&rig, "11");
    watched.wait();
    watched.watch.follow(&[stage.clone(), rig.clone()], false);
    watched.wait();
    watched.wait();
    watched.watch.follow(&[stage, rig], true);
    watched.sees_nothing();
}

/// The test below runs this in a process of its own, which has no file descriptors left but one.
#[test]
#[ignore = "spoils its process; the next one runs it"]
fn without_watches_in_here() {
    let folder = folder("watch-exhausted");
    let file = folder.join("evening.yaml");
    write(&file, "0");
    let open = || std::fs::File::open("/dev/null");
    let mut hoard: Vec<_> = std::iter::from_fn(|| open().ok()).collect();
    hoard.pop().expect("one for reading");
    let mut watched = Watched::new(std::slice::from_ref(&file));
    let remark = watched.watch.remark().expect("said");
    assert!(remark.contains("each second"), "{remark}");
    assert_eq!(watched.watch.remark(), None, "once");
    for text in ["one more", "and longer still"] {
        write(&file, text);
        watched.wait();
    }
}

#[test]
fn with_no_watch_to_be_had_a_look_each_second_sees_the_same() {
    let this = std::env::current_exe().expect("a path");
    let done = std::process::Command::new("sh")
        .args(["-c", "ulimit -n 60; exec \"$0\" --ignored --exact \"$1\""])
        .arg(this)
        .arg("edits::watching::without_watches_in_here")
        .output()
        .expect("a shell");
    let said = String::from_utf8_lossy(&done.stdout).into_owned();
    assert!(done.status.success() && said.contains("1 passed"), "{said}");
}
