//! The binary: restarts, signals, `--fresh`, edits. On JACK without a server, where all goes on but the notes.

use super::only_file;
use crate::control::stand::{Folder, patiently};
use crate::support::dice::Dice;
use serde_json::Value;
use std::fs::File;
use std::io::{BufRead, BufReader, Write};
use std::os::unix::fs::MetadataExt;
use std::os::unix::net::UnixStream;
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Stdio};
use std::time::{Duration, Instant};
use trued::daemon::remember::record::{Found, State, decode};

const STAGE: &str = "\
stage: Evening
keyboards: {keys: {port: virtual}}
synths: {organ: {port: virtual}}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
  - {song: Ballad, tuning: equal-12}
  - {song: Lament, tuning: vallotti}
";
const RESUMED: &str = "resumed: song 3 \"Lament\", pitch +13 c, from before the restart";
const LANES: u64 = 5;
const KILLS: usize = 10;

struct Daemon {
    child: Child,
    folder: PathBuf,
}

fn folder(name: &str) -> Folder {
    let folder = Folder::new(&format!("remembered-{name}"));
    std::fs::write(folder.at("stage.yaml"), STAGE).expect("written");
    folder
}

/// What lies in the state folder.
fn remembered(folder: &Path) -> Option<State> {
    let file = only_file(&folder.join("state/trued"), "remembered-")?;
    match decode(&std::fs::read(file).expect("it is there")) {
        Found::Good(_, state) => Some(state),
        damaged => panic!("{damaged:?}"),
    }
}

impl Daemon {
    fn start(folder: &Path, arguments: &[&str]) -> Daemon {
        Daemon::start_with_state(folder, &folder.join("state"), arguments)
    }

    fn start_with_state(folder: &Path, state: &Path, arguments: &[&str]) -> Daemon {
        let log = File::create(folder.join("log")).expect("a file");
        let child = Command::new(env!("CARGO_BIN_EXE_trued"))
            .args(["run", "stage.yaml", "--backend", "jack", "--socket", "s"])
            .args(arguments)
            .current_dir(folder)
            .env_remove("STATE_DIRECTORY")
            .env_remove("NOTIFY_SOCKET")
            .env("XDG_STATE_HOME", state)
            .env("JACK_DEFAULT_SERVER", "trued-test-no-such-server")
            .stdout(Stdio::null())
            .stderr(log)
            .spawn()
            .expect("the binary under test");
        let folder = folder.to_path_buf();
        let daemon = Daemon { child, folder };
        patiently("trued to be ready", || daemon.log().contains("ready: "));
        daemon
    }

    fn log(&self) -> String {
        std::fs::read_to_string(self.folder.join("log")).unwrap_or_default()
    }

    fn line(&self) -> Line {
        Line(BufReader::new(
            UnixStream::connect(self.folder.join("s")).expect("it answers"),
        ))
    }

    fn tell(&self, words: &str) {
        let (code, text) = self
            .line()
            .ask(&format!("tell {words}"))
            .expect("an answer");
        assert!(code == "0", "{words}: {code} {text}");
    }

    fn status(&self) -> Value {
        let (_, text) = self.line().ask("status json").expect("an answer");
        serde_json::from_str(&text).expect("JSON")
    }

    fn status_text(&self) -> String {
        self.line().ask("status").expect("an answer").1
    }

    /// At once, as the kernel does it.
    fn kill(mut self) {
        self.child.kill().expect("it runs");
        self.child.wait().expect("it ends");
    }

    fn stop(mut self) {
        let pid = self.child.id().to_string();
        let killed = Command::new("kill").arg(pid).status().expect("kill");
        assert!(killed.success());
        assert!(
            self.child.wait().expect("it ends").success(),
            "{}",
            self.log()
        );
    }
}

impl Drop for Daemon {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

struct Line(BufReader<UnixStream>);

impl Line {
    /// The code, and all that is said. `None` if the daemon dies over it.
    fn ask(&mut self, what: &str) -> Option<(String, String)> {
        writeln!(self.0.get_mut(), "{what}").ok()?;
        let mut text = String::new();
        while !text.ends_with("\n\n") {
            if self.0.read_line(&mut text).ok()? == 0 {
                return None;
            }
        }
        let (code, text) = text.split_once(' ')?;
        Some((code.to_string(), text.trim().to_string()))
    }
}

#[test]
fn a_restart_goes_on_where_it_was_until_it_is_told_to_forget() {
    let folder = folder("restart");
    let at = folder.at("");
    let first = Daemon::start(&at, &[]);
    assert!(!first.log().contains("resumed"), "{}", first.log());
    assert_eq!(first.status()["resumed"], Value::Null);
    first.tell("song 3");
    first.tell("pitch +13 c");
    first.stop();

    let second = Daemon::start(&at, &[]);
    assert_eq!(second.log().matches(RESUMED).count(), 1, "{}", second.log());
    let status = second.status();
    assert_eq!(status["resumed"], RESUMED);
    assert_eq!(status["song"]["number"], 3);
    assert_eq!(status["pitch_nudge_cents"], 13.0);
    let text = second.status_text();
    assert!(text.lines().any(|line| line == RESUMED), "{text}");
    second.tell("transpose -2");
    second.tell("plain");
    patiently("no more talk of the restart", || {
        second.status()["resumed"].is_null()
    });
    patiently("the transposition in the file", || {
        remembered(&at).is_some_and(|state| state.transposed == Some(-2) && state.plain)
    });
    second.kill();

    let third = Daemon::start(&at, &[]);
    let said =
        "resumed: song 3 \"Lament\", pitch +13 c, transpose -2, plain, from before the restart";
    assert_eq!(third.status()["resumed"], said);
    third.tell("fresh");
    patiently("a fresh start in the file", || {
        remembered(&at).is_some_and(|state| state.is_fresh())
    });
    third.kill();

    let fourth = Daemon::start(&at, &[]);
    assert_eq!(fourth.status()["resumed"], Value::Null);
    assert_eq!(fourth.status()["song"]["number"], 1);
    fourth.tell("song 2");
    fourth.stop();

    let fifth = Daemon::start(&at, &["--fresh"]);
    assert_eq!(fifth.status()["song"]["number"], 1);
    fifth.kill();
    let sixth = Daemon::start(&at, &[]);
    assert_eq!(sixth.status()["resumed"], Value::Null, "it stays forgotten");
    assert_eq!(
        std::fs::read_to_string(at.join("stage.yaml")).expect("there"),
        STAGE
    );
}

#[test]
fn a_set_that_is_edited_while_playing_is_remembered_as_it_is_then() {
    let folder = folder("edited");
    let at = folder.at("");
    let daemon = Daemon::start(&at, &[]);
    daemon.tell("song 2");
    let longer = STAGE.replace("set:\n", "set:\n  - {song: Prelude, tuning: equal-12}\n");
    std::fs::write(at.join("stage.yaml"), longer).expect("written");
    daemon.tell("reload");
    patiently("the song's new place", || {
        remembered(&at).is_some_and(|state| state.place == 2)
    });
    assert_eq!(remembered(&at).expect("there").title, "Ballad");
    daemon.kill();
    let again = Daemon::start(&at, &[]);
    let said = "resumed: song 3 \"Ballad\", from before the restart";
    assert_eq!(again.status()["resumed"], said);
    again.kill();
    // Edited while nothing runs: another song stands there, and at last the song is gone.
    std::fs::write(at.join("stage.yaml"), STAGE).expect("written");
    let again = Daemon::start(&at, &[]);
    assert_eq!(again.status()["song"]["title"], "Ballad");
    again.stop();
    let without = STAGE.replace("Ballad", "Ballade");
    std::fs::write(at.join("stage.yaml"), without).expect("written");
    let again = Daemon::start(&at, &[]);
    assert!(again.log().contains("not resumed: "), "{}", again.log());
    assert_eq!(again.status()["song"]["number"], 1);
}

#[test]
fn where_nothing_can_be_written_it_plays_and_says_so_once() {
    let folder = folder("nowhere");
    let daemon = Daemon::start_with_state(&folder.at(""), Path::new("/proc"), &[]);
    let says = || {
        daemon
            .log()
            .matches("cannot be remembered in /proc/trued")
            .count()
    };
    patiently("a word in the log", || says() == 1);
    for place in [2, 3, 1] {
        daemon.tell(&format!("song {place}"));
        std::thread::sleep(Duration::from_millis(400));
    }
    assert_eq!(says(), 1, "{}", daemon.log());
    daemon.stop();
}

#[test]
fn a_storm_of_nudges_wears_out_no_card() {
    let folder = folder("storm");
    let at = folder.at("");
    let daemon = Daemon::start(&at, &[]);
    patiently("the first writing", || remembered(&at).is_some());
    let file = only_file(&at.join("state/trued"), "remembered-").expect("written");
    let version = || {
        let found = std::fs::metadata(&file).expect("it is always there");
        (found.ino(), found.mtime(), found.mtime_nsec())
    };
    let (began, mut line) = (Instant::now(), daemon.line());
    let (mut versions, mut nudges) = (vec![version()], 0);
    while began.elapsed() < Duration::from_secs(5) {
        nudges += 1;
        line.ask("tell pitch +0.01 c").expect("an answer");
        if versions.last() != Some(&version()) {
            versions.push(version());
        }
    }
    let end = Instant::now();
    let is_there =
        || remembered(&at).is_some_and(|state| state.nudge.microcents() == nudges * 10_000);
    patiently("the last nudge in the file", is_there);
    let took = end.elapsed();
    println!(
        "{nudges} nudges in 5 s: {} writings, the last {took:?} after",
        versions.len() - 1
    );
    assert!(nudges > 100, "a storm");
    assert!(
        (2..=6).contains(&(versions.len() - 1)),
        "{}",
        versions.len() - 1
    );
    // On a machine with nothing else to do 1.05 s and the time of one writing.
    assert!(took < Duration::from_secs(10), "{took:?}");
}

/// A hundredth of a cent a nudge.
fn nudges(state: &State) -> i64 {
    assert_eq!(state.nudge.microcents() % 10_000, 0);
    state.nudge.microcents() / 10_000
}

#[test]
fn killed_fifty_times_while_it_writes_it_goes_on_from_the_last_state_or_the_one_before() {
    // A start takes its time, so several daemons are killed side by side.
    let counts: Vec<_> = std::thread::scope(|scope| {
        let lanes = (0..LANES).map(|lane| scope.spawn(move || kill(lane)));
        let lanes: Vec<_> = lanes.collect();
        let join = |lane: std::thread::ScopedJoinHandle<_>| lane.join().expect("all is well");
        lanes.into_iter().map(join).collect()
    });
    let moved: usize = counts.iter().map(|(moved, _)| moved).sum();
    let in_the_middle: usize = counts.iter().map(|(_, middle)| middle).sum();
    println!(
        "{} kills, {in_the_middle} of them in the middle of a writing; {moved} left a newer state, 0 a damaged one",
        LANES * KILLS as u64
    );
    assert!(moved > KILLS, "{moved}");
}

/// How many of `KILLS` kills left a newer state than was there before, and how many came in the middle of a writing.
fn kill(lane: u64) -> (usize, usize) {
    let folder = folder(&format!("killed-{lane}"));
    let at = folder.at("");
    let mut dice = Dice::new(lane);
    let (mut found, mut sent, mut moved, mut in_the_middle) = (0, 0, 0, 0);
    for round in 0..=KILLS {
        let daemon = Daemon::start(&at, &[]);
        let resumed = daemon.status()["pitch_nudge_cents"]
            .as_f64()
            .expect("a number");
        let resumed = (resumed * 100.0).round() as i64;
        let on_disk = remembered(&at).map_or(0, |state| nudges(&state));
        assert_eq!(resumed, on_disk, "round {round}");
        // One more may have been followed than was answered; nothing that was on the disk before is lost.
        assert!(
            (found..=sent).contains(&resumed),
            "{found} {resumed} {sent}"
        );
        moved += usize::from(resumed > found);
        assert_eq!(daemon.log().contains("resumed: song 1"), resumed > 0);
        if round == KILLS {
            break;
        }
        (found, sent) = (resumed, resumed);
        let mut line = daemon.line();
        // Half of them at any time, half as soon as a file is seen being written.
        let wait = (round % 2 == 0).then(|| Duration::from_millis(dice.below(800)));
        let state = at.join("state/trued");
        let left_over = being_written(&state);
        let killer = std::thread::spawn(move || {
            let is_writing = || {
                let beside = being_written(&state);
                beside.is_some() && beside != left_over
            };
            match wait {
                Some(wait) => std::thread::sleep(wait),
                None => patiently("a writing", is_writing),
            }
            daemon.kill();
            is_writing()
        });
        loop {
            sent += 1;
            if line.ask("tell pitch +0.01 c").is_none() {
                break;
            }
        }
        in_the_middle += usize::from(killer.join().expect("killed"));
    }
    (moved, in_the_middle)
}

/// Which new file lies beside the old one.
fn being_written(folder: &Path) -> Option<(u64, i64, i64)> {
    let entries = std::fs::read_dir(folder).into_iter().flatten();
    let is_new = |entry: &std::fs::DirEntry| {
        let name = entry.file_name();
        let name = name.to_string_lossy();
        name.starts_with("remembered-") && name.ends_with(".new")
    };
    let found = entries.flatten().find(is_new)?.metadata().ok()?;
    Some((found.ino(), found.mtime(), found.mtime_nsec()))
}
