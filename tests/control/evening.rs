//! The binary from its first word to its last, as a supervisor and a player's shell meet it. No JACK server runs here,
//! so it plays on none and waits for one, which wants no sound hardware; tests/outside has it on ports.

use super::stand::{Folder, STAGE, patiently, trued};
use super::supervisor::Supervisor;
use std::process::{Child, Command, Stdio};
use trued::ports::clock::monotonic_micros;

/// The daemon, in a folder with its stage file.
pub struct Daemon<'a> {
    folder: &'a Folder,
    child: Child,
    over: bool,
}

const SOCKET: &str = "trued.sock";

impl<'a> Daemon<'a> {
    /// Where `more` are settings of its environment.
    pub fn start(folder: &'a Folder, more: &[(&str, &str)]) -> Daemon<'a> {
        let log = std::fs::File::create(folder.at("log")).expect("a file");
        let mut command = Command::new(env!("CARGO_BIN_EXE_trued"));
        command
            .args(["run", "--backend", "jack", "--socket", SOCKET, "stage.yaml"])
            .current_dir(folder.at("."))
            .env_remove("NOTIFY_SOCKET")
            .env_remove("WATCHDOG_USEC")
            .env("NO_COLOR", "1")
            .env("STATE_DIRECTORY", folder.at("state"))
            .env("JACK_DEFAULT_SERVER", "trued-test-no-server")
            .envs(more.iter().copied())
            .stdout(Stdio::null())
            .stderr(log);
        let child = command.spawn().expect("the binary under test");
        Daemon {
            folder,
            child,
            over: false,
        }
    }

    /// With this supervisor, once it has been told that all is ready.
    fn supervised(folder: &'a Folder, supervisor: &Supervisor, watchdog: &str) -> Daemon<'a> {
        let address = folder.at("notify");
        let address = address.to_str().expect("UTF-8");
        let more = [("NOTIFY_SOCKET", address), ("WATCHDOG_USEC", watchdog)];
        let daemon = Daemon::start(folder, &more);
        supervisor.waits_for("READY=1");
        daemon
    }

    pub fn log(&self) -> String {
        std::fs::read_to_string(self.folder.at("log")).unwrap_or_default()
    }

    fn signal(&self, name: &str) {
        let pid = self.child.id().to_string();
        let sent = Command::new("kill").args(["-s", name, &pid]).status();
        assert!(sent.expect("kill").success());
    }

    /// Exit code.
    pub fn ends(&mut self) -> Option<i32> {
        let mut status = None;
        patiently("the end", || {
            status = self.child.try_wait().expect("a child");
            status.is_some()
        });
        status.and_then(|status| status.code())
    }

    /// Exit code, once.
    pub fn newly_ended(&mut self) -> Option<i32> {
        if self.over {
            return None;
        }
        let status = self.child.try_wait().expect("a child")?;
        self.over = true;
        status.code()
    }

    fn tell(&self, words: &[&str]) -> (i32, String, String) {
        let mut arguments = vec!["tell", "--socket", SOCKET];
        arguments.extend(words);
        trued(self.folder, &arguments)
    }

    fn status(&self) -> serde_json::Value {
        let (code, text, err) = trued(self.folder, &["status", "--json", "--socket", SOCKET]);
        assert_eq!(code, 0, "{err}");
        serde_json::from_str(&text).expect("JSON")
    }

    fn sentences(&self) -> String {
        trued(self.folder, &["status", "--socket", SOCKET]).1
    }
}

impl Drop for Daemon<'_> {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
        if std::thread::panicking() {
            eprintln!("its log:\n{}", self.log());
        }
    }
}

fn write(folder: &Folder, text: &str) {
    // Beside it first, so that it is never half there.
    std::fs::write(folder.at("beside"), text).expect("written");
    std::fs::rename(folder.at("beside"), folder.at("stage.yaml")).expect("renamed");
}

/// One reload as sd_notify(3) wants it told: `RELOADING=1` with the time by CLOCK_MONOTONIC in one datagram, then
/// `READY=1`. Gives what was said between the two.
fn hears_a_reload(supervisor: &Supervisor, since_micros: u64) -> Vec<String> {
    supervisor.waits_for_some("RELOADING=1", |heard| {
        let Some(rest) = heard.strip_prefix("RELOADING=1") else {
            return false;
        };
        let micros = rest.strip_prefix("\nMONOTONIC_USEC=");
        let micros: u64 = micros.and_then(|n| n.parse().ok()).expect("a time");
        assert!(micros <= monotonic_micros());
        // A save may be read twice where the system tells of it slowly; what is left of that is over.
        micros >= since_micros
    });
    supervisor.waits_for("READY=1")
}

#[test]
fn a_reload_is_told_from_its_beginning_to_its_end() {
    let folder = Folder::new("reload");
    write(&folder, STAGE);
    let supervisor = Supervisor::at(&folder.at("notify"));
    let daemon = Daemon::supervised(&folder, &supervisor, "0");

    // Nothing has changed, so only the signal can be the reason.
    let before = monotonic_micros();
    daemon.signal("HUP");
    hears_a_reload(&supervisor, before);
    patiently("a word in the log", || {
        daemon
            .log()
            .contains("the stage file is as it is being played")
    });
    let before = monotonic_micros();
    let (code, out, err) = daemon.tell(&["reload"]);
    let in_force = "the stage file is in force as it is now\n";
    assert_eq!((code, out.as_str()), (0, in_force), "{err}");
    hears_a_reload(&supervisor, before);
    assert_eq!(daemon.status()["reloads"], 0);

    // Saving is asking.
    let before = monotonic_micros();
    write(&folder, &STAGE.replace("Three songs", "Three others"));
    hears_a_reload(&supervisor, before);
    let status = daemon.status();
    assert_eq!(
        (&status["stage"], &status["reloads"]),
        (&"Three others".into(), &1.into())
    );

    // One that is bad ends as well, and says so to whoever asked.
    let before = monotonic_micros();
    write(&folder, &STAGE.replace("vallotti", "valotti"));
    let between = hears_a_reload(&supervisor, before);
    assert!(
        between
            .iter()
            .any(|heard| heard.contains("the stage file has mistakes")),
        "{between:?}"
    );
    let (code, out, err) = daemon.tell(&["reload"]);
    assert_eq!((code, out.as_str()), (65, ""));
    assert!(err.starts_with("stage.yaml:7:"), "{err}");
    daemon.signal("HUP");
    hears_a_reload(&supervisor, before);
    let status = daemon.status();
    assert!(
        status["complaint"]
            .as_str()
            .is_some_and(|text| text.contains("did you mean `vallotti`"))
    );
    assert_eq!(
        (&status["from_copy"], &status["reloads"]),
        (&false.into(), &1.into())
    );
}

#[test]
fn with_no_server_it_is_ready_lives_and_says_what_it_waits_for() {
    let folder = Folder::new("alone");
    write(&folder, STAGE);
    let supervisor = Supervisor::at(&folder.at("notify"));
    let daemon = Daemon::supervised(&folder, &supervisor, "1000000");
    for _ in 0..5 {
        supervisor.waits_for("WATCHDOG=1");
    }
    let status = daemon.status();
    assert_eq!(status["backend"], "jack");
    assert_eq!(status["real_time"], false);
    assert_eq!(status["trouble"], "no JACK server answers; waiting for one");
    let text = daemon.sentences();
    assert!(
        text.contains("\nTrouble: no JACK server answers; waiting for one.\n"),
        "{text}"
    );
    assert!(
        text.contains(" on jack, without real-time priority"),
        "{text}"
    );
    // It plays all the same: orders are followed.
    let (code, out, err) = daemon.tell(&["song", "2"]);
    assert_eq!((code, out.as_str()), (0, "song 2 of 3: Ballad\n"), "{err}");
}

#[test]
fn signals_and_tell_stop_end_it_well() {
    for end in ["TERM", "INT", "tell stop"] {
        let folder = Folder::new("end");
        write(&folder, STAGE);
        let supervisor = Supervisor::at(&folder.at("notify"));
        let mut daemon = Daemon::supervised(&folder, &supervisor, "0");
        match end {
            "tell stop" => assert_eq!(daemon.tell(&["stop"]).0, 0),
            signal => daemon.signal(signal),
        }
        supervisor.waits_for("STOPPING=1");
        assert_eq!(daemon.ends(), Some(0), "{end}: {}", daemon.log());
        let after: Vec<String> = supervisor.everything();
        let wrong = ["READY=1", "RELOADING=1", "STOPPING=1"];
        let told = |what: &&str| after.iter().any(|heard| heard.starts_with(*what));
        assert_eq!(wrong.iter().find(|what| told(what)), None, "after {end}");
        assert!(!folder.at(SOCKET).exists());
    }
}

#[test]
fn a_bad_file_at_the_start_plays_the_copy_and_says_so() {
    let folder = Folder::new("copy");
    write(&folder, STAGE);
    let supervisor = Supervisor::at(&folder.at("notify"));
    let mut first = Daemon::supervised(&folder, &supervisor, "0");
    first.signal("TERM");
    assert_eq!(first.ends(), Some(0));
    drop(first);
    let bad = STAGE
        .replace("Three songs", "Bad")
        .replace("vallotti", "valotti");
    write(&folder, &bad);

    let daemon = Daemon::supervised(&folder, &supervisor, "0");
    let status = daemon.status();
    assert_eq!(status["stage"], "Three songs");
    assert_eq!(status["from_copy"], true);
    let complaint = status["complaint"].as_str().expect("a complaint");
    assert!(complaint.starts_with("stage.yaml:7:"), "{complaint}");
    let text = daemon.sentences();
    let says =
        "\nThe file has mistakes, so the copy kept of its last good text plays: stage.yaml:7:";
    assert!(text.contains(says), "{text}");
    let log = daemon.log();
    assert!(
        log.contains("what it was when last good is played:") && log.contains("stage.yaml:7:"),
        "{log}"
    );
    // Mended to what is played: nothing changes but what is said of it.
    write(&folder, STAGE);
    patiently("all to be in order", || {
        let status = daemon.status();
        status["complaint"].is_null() && status["from_copy"] == false
    });
}

#[test]
fn without_a_copy_it_says_what_is_wrong_by_its_exit_code() {
    let folder = Folder::new("codes");
    let run = || {
        let mut daemon = Daemon::start(&folder, &[]);
        (daemon.ends(), daemon.log())
    };
    let (code, log) = run();
    assert_eq!(code, Some(66), "no such file: {log}");
    write(&folder, &STAGE.replace("vallotti", "valotti"));
    let (code, log) = run();
    assert_eq!(code, Some(65), "bad data: {log}");
    assert!(log.contains("stage.yaml:7:"), "{log}");
    write(&folder, STAGE);
    assert_eq!(trued(&folder, &["run"]).0, 64, "usage");
    let code = trued(&folder, &["run", "--backend", "drums", "stage.yaml"]).0;
    assert_eq!(code, 64, "usage");
    if !std::path::Path::new("/dev/snd/seq").exists() {
        let (code, _, err) = trued(&folder, &["run", "--backend", "alsa", "stage.yaml"]);
        assert_eq!(code, 69, "unavailable: {err}");
        assert!(err.contains("modprobe snd-seq"), "{err}");
    }
}
