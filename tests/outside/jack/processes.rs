//! The processes of a test: itself once more, a JACK server, trued.

use crate::control::supervisor::Supervisor;
use jack::{Client, ClientOptions};
use std::cell::RefCell;
use std::path::PathBuf;
use std::process::{Child, Command, Stdio};
use std::time::{Duration, Instant};

const SERVER: &str = "JACK_DEFAULT_SERVER";
/// For whatever has to happen on a busy machine.
const PATIENCE: Duration = Duration::from_secs(60);

/// Runs a test of `outside::jack` once more, in a process with a server name of its own; there, does the work.
pub fn in_a_process_of_its_own(test: &str, work: fn()) {
    let is_there = std::env::var(SERVER).is_ok_and(|name| name.starts_with("trued-test-"));
    if is_there {
        return work();
    }
    // Each of its own: a sum of the letters is short and differs from test to test.
    let sum = test.bytes().fold(0u32, |sum, byte| {
        sum.wrapping_mul(31).wrapping_add(byte.into())
    });
    let server = format!("trued-test-{}-{sum:x}", std::process::id());
    let name = format!("outside::jack::{test}");
    let out = Command::new(std::env::current_exe().expect("this test"))
        .args([&name, "--exact", "--nocapture"])
        .env(SERVER, server)
        .output()
        .expect("a second process");
    let text = |bytes: &[u8]| String::from_utf8_lossy(bytes).into_owned();
    let (stdout, stderr) = (text(&out.stdout), text(&out.stderr));
    println!("{stdout}");
    assert!(stdout.contains("1 passed"), "{stdout}\n{stderr}");
}

pub fn wait_for(what: &str, mut is_there: impl FnMut() -> bool) {
    let began = Instant::now();
    while !is_there() {
        assert!(began.elapsed() < PATIENCE, "waited too long for {what}");
        std::thread::sleep(Duration::from_millis(10));
    }
}

/// jackd, with real-time priority where that is allowed.
pub struct Server {
    child: Child,
    /// What it gives to its clients' callbacks.
    pub real_time: bool,
}

impl Server {
    pub fn start(period: u32) -> Server {
        jack::set_logger(jack::LoggerType::None);
        Server::try_start(&["-R", "-P", "60"], period)
            .or_else(|| Server::try_start(&["-r"], period))
            .expect("jackd starts")
    }

    fn try_start(priority: &[&str], period: u32) -> Option<Server> {
        let name = std::env::var(SERVER).expect("set for this process");
        let child = Command::new("jackd")
            .args(["-n", &name])
            .args(priority)
            .args([
                "-S",
                "-d",
                "dummy",
                "-r",
                "48000",
                "-p",
                &period.to_string(),
            ])
            .stdout(Stdio::null())
            .stderr(Stdio::null())
            .spawn()
            .expect("jackd (tests/setup --tests installs it)");
        let mut server = Server {
            child,
            real_time: priority != ["-r"],
        };
        let began = Instant::now();
        while began.elapsed() < PATIENCE {
            if Client::new("probe", ClientOptions::NO_START_SERVER).is_ok() {
                return Some(server);
            }
            if server.child.try_wait().expect("a child").is_some() {
                return None;
            }
            std::thread::sleep(Duration::from_millis(50));
        }
        None
    }

    /// As if it had crashed.
    pub fn kill(&mut self) {
        self.child.kill().expect("it runs");
        self.child.wait().expect("it ends");
    }

    pub fn signal(&self, name: &str) {
        signal(&self.child, name);
    }

    /// As long as what is given back lives: whoever asks the server for anything waits so long.
    pub fn stand_still(&self) -> StandsStill<'_> {
        self.signal("STOP");
        StandsStill(self)
    }
}

pub struct StandsStill<'a>(&'a Server);

impl Drop for StandsStill<'_> {
    fn drop(&mut self) {
        signal(&self.0.child, "CONT");
    }
}

impl Drop for Server {
    fn drop(&mut self) {
        // SIGTERM, so that it clears away what it shared.
        for name in ["TERM", "CONT"] {
            let pid = self.child.id().to_string();
            let _ = Command::new("kill").args(["-s", name, &pid]).status();
        }
        let _ = self.child.wait();
    }
}

fn signal(child: &Child, name: &str) {
    let pid = child.id().to_string();
    let sent = Command::new("kill").args(["-s", name, &pid]).status();
    assert!(sent.expect("kill").success());
}

/// trued on the test's server.
pub struct Trued {
    child: RefCell<Child>,
    folder: PathBuf,
}

impl Trued {
    pub fn start(stage: &str) -> Trued {
        Trued::begin(stage, &[])
    }

    /// With a rig file, where the stage names it.
    pub fn with_rig(stage: &str, name: &str, rig: &str) -> Trued {
        let path = folder_with(stage).join(name);
        std::fs::create_dir_all(path.parent().expect("a folder")).expect("a folder");
        std::fs::write(path, rig).expect("a file");
        Trued::begin(stage, &[])
    }

    /// The stage file that it plays.
    pub fn stage(&self) -> PathBuf {
        self.folder.join("stage.yaml")
    }

    /// With a supervisor that has been told that all is ready.
    pub fn supervised(stage: &str, watchdog: Duration) -> (Trued, Supervisor) {
        let address = folder_with(stage).join("notify");
        let _ = std::fs::remove_file(&address);
        let supervisor = Supervisor::at(&address);
        let micros = watchdog.as_micros().to_string();
        let more = [
            ("NOTIFY_SOCKET", address.to_str().expect("UTF-8")),
            ("WATCHDOG_USEC", &micros),
        ];
        let trued = Trued::begin(stage, &more);
        supervisor.waits_for("READY=1");
        (trued, supervisor)
    }

    fn begin(stage: &str, more: &[(&str, &str)]) -> Trued {
        let folder = folder_with(stage);
        let log = std::fs::File::create(folder.join("log")).expect("a file");
        let mut command = command(&folder, "jack");
        let child = command
            .envs(more.iter().copied())
            .stderr(log)
            .spawn()
            .expect("trued");
        let trued = Trued {
            child: RefCell::new(child),
            folder,
        };
        wait_for("trued to be ready", || trued.log().contains("ready: "));
        trued
    }

    pub fn log(&self) -> String {
        std::fs::read_to_string(self.folder.join("log")).unwrap_or_default()
    }

    /// The same process from start to end, and a clean one.
    pub fn stop_cleanly(self) {
        let ended = self.child.borrow_mut().try_wait().expect("a child");
        assert!(ended.is_none(), "{}", self.log());
        self.signal("TERM");
        self.ends_cleanly();
    }

    pub fn ends_cleanly(self) {
        let mut status = None;
        wait_for("trued to end", || {
            status = self.child.borrow_mut().try_wait().expect("a child");
            status.is_some()
        });
        println!("{}", self.log());
        assert!(status.is_some_and(|status| status.success()), "{status:?}");
    }

    pub fn signal(&self, name: &str) {
        signal(&self.child.borrow(), name);
    }

    /// Another stage file, read at once.
    pub fn edit(&self, stage: &str) {
        std::fs::write(self.folder.join("stage.yaml"), stage).expect("a file");
        self.tell("reload");
    }

    /// What is said to words that are followed.
    pub fn tell(&self, words: &str) -> String {
        self.ask("tell", words.split(' '))
    }

    pub fn status(&self) -> serde_json::Value {
        serde_json::from_str(&self.ask("status", ["--json"])).expect("JSON")
    }

    fn ask<'a>(&self, what: &str, words: impl IntoIterator<Item = &'a str>) -> String {
        let mut command = Command::new(env!("CARGO_BIN_EXE_trued"));
        command
            .args([what, "--socket"])
            .arg(self.folder.join("socket"))
            .args(words);
        let out = command.output().expect("trued");
        let text = |bytes: &[u8]| String::from_utf8_lossy(bytes).into_owned();
        assert!(out.status.success(), "{}", text(&out.stderr));
        text(&out.stdout)
    }

    /// Exit code and words of `--backend auto`.
    pub fn run_auto(stage: &str) -> (Option<i32>, String) {
        let folder = folder_with(stage);
        let out = command(&folder, "auto").output().expect("trued");
        let _ = std::fs::remove_dir_all(folder);
        let words = String::from_utf8_lossy(&out.stderr).into_owned();
        (out.status.code(), words)
    }
}

impl Drop for Trued {
    fn drop(&mut self) {
        let child = self.child.get_mut();
        let _ = child.kill();
        let _ = child.wait();
        let _ = std::fs::remove_dir_all(&self.folder);
    }
}

fn folder_with(stage: &str) -> PathBuf {
    let name = std::env::var(SERVER).expect("set for this process");
    let folder = std::env::temp_dir().join(name);
    std::fs::create_dir_all(&folder).expect("a folder");
    std::fs::write(folder.join("stage.yaml"), stage).expect("a file");
    folder
}

fn command(folder: &std::path::Path, backend: &str) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_trued"));
    command.arg("run").arg(folder.join("stage.yaml"));
    command.args(["--backend", backend, "--socket"]);
    command.arg(folder.join("socket"));
    command
        .env_remove("STATE_DIRECTORY")
        .env("XDG_STATE_HOME", folder);
    command
        .env_remove("NOTIFY_SOCKET")
        .env_remove("WATCHDOG_USEC");
    command
}
