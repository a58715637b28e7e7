//! A JACK server, trued, and a player and a recorder around it.

use crate::support::receiver::Receiver;
use jack::{
    AsyncClient, Client, ClientOptions, Control, MidiIn, MidiOut, Port, ProcessScope, RawMidi,
};
use std::cell::RefCell;
use std::path::PathBuf;
use std::process::{Child, Command, Stdio};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::time::{Duration, Instant};

const SERVER: &str = "JACK_DEFAULT_SERVER";
/// For whatever has to happen on a busy machine.
const PATIENCE: Duration = Duration::from_secs(30);

/// Runs a test of `outside::jack` once more, in a process with a server name of its own; there, does the work.
pub fn in_a_process_of_its_own(test: &str, work: fn()) {
    let is_there = std::env::var(SERVER).is_ok_and(|name| name.starts_with("trued-test-"));
    if is_there {
        return work();
    }
    let server = format!("trued-test-{}-{}", std::process::id(), &test[..8]);
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
pub struct Server(Child);

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
        let mut server = Server(child);
        let began = Instant::now();
        while began.elapsed() < PATIENCE {
            if Client::new("probe", ClientOptions::NO_START_SERVER).is_ok() {
                return Some(server);
            }
            if server.0.try_wait().expect("a child").is_some() {
                return None;
            }
            std::thread::sleep(Duration::from_millis(50));
        }
        None
    }

    /// As if it had crashed.
    pub fn kill(&mut self) {
        self.0.kill().expect("it runs");
        self.0.wait().expect("it ends");
    }
}

impl Drop for Server {
    fn drop(&mut self) {
        // SIGTERM, so that it clears away what it shared.
        let _ = Command::new("kill").arg(self.0.id().to_string()).status();
        let _ = self.0.wait();
    }
}

/// trued on the test's server.
pub struct Trued {
    child: RefCell<Child>,
    folder: PathBuf,
}

impl Trued {
    pub fn start(stage: &str) -> Trued {
        let folder = folder_with(stage);
        let log = std::fs::File::create(folder.join("log")).expect("a file");
        let child = command(&folder, "jack").stderr(log).spawn().expect("trued");
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
        let mut child = self.child.borrow_mut();
        assert!(
            child.try_wait().expect("a child").is_none(),
            "{}",
            self.log()
        );
        let pid = child.id().to_string();
        assert!(
            Command::new("kill")
                .arg(pid)
                .status()
                .expect("kill")
                .success()
        );
        let status = child.wait().expect("it ends");
        println!("{}", self.log());
        assert!(status.success(), "{status}");
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
    command.env("XDG_STATE_HOME", folder);
    command.arg("run").arg(folder.join("stage.yaml"));
    command.args(["--backend", backend, "--socket"]);
    command.arg(folder.join("socket"));
    command
}

/// A short message at a frame.
#[derive(Clone, Copy, Debug)]
pub struct Event {
    pub frame: u64,
    bytes: [u8; 3],
    length: usize,
}

impl Event {
    pub fn new(frame: u64, message: &[u8]) -> Event {
        let mut bytes = [0; 3];
        bytes[..message.len()].copy_from_slice(message);
        Event {
            frame,
            bytes,
            length: message.len(),
        }
    }

    pub fn bytes(&self) -> &[u8] {
        &self.bytes[..self.length]
    }
}

/// What both ways brought, by frames of the server.
pub struct Heard {
    pub direct: Vec<Event>,
    pub through: Vec<Event>,
    pub xruns: u64,
}

struct Playing {
    out: Port<MidiOut>,
    score: rtrb::Consumer<Event>,
    /// Frames since the first event was there.
    position: Option<u64>,
    done: Arc<AtomicBool>,
}

impl jack::ProcessHandler for Playing {
    fn process(&mut self, _: &Client, scope: &ProcessScope) -> Control {
        let mut writer = self.out.writer(scope);
        if self.position.is_none() && self.score.is_empty() {
            return Control::Continue;
        }
        let begin = self.position.unwrap_or(0);
        let end = begin + u64::from(scope.n_frames());
        while let Ok(event) = self.score.peek().copied() {
            if event.frame >= end {
                break;
            }
            let time = event.frame.saturating_sub(begin) as u32;
            let bytes = event.bytes();
            if writer.write(&RawMidi { time, bytes }).is_err() {
                break;
            }
            let _ = self.score.pop();
        }
        self.position = Some(end);
        self.done.store(self.score.is_empty(), Ordering::Release);
        Control::Continue
    }
}

struct Recording {
    direct: Port<MidiIn>,
    through: Port<MidiIn>,
    heard: [rtrb::Producer<Event>; 2],
}

impl jack::ProcessHandler for Recording {
    fn process(&mut self, _: &Client, scope: &ProcessScope) -> Control {
        let cycle = u64::from(scope.last_frame_time());
        for (port, heard) in [&self.direct, &self.through]
            .into_iter()
            .zip(&mut self.heard)
        {
            for event in port.iter(scope) {
                // Sysex is nothing that this test sends.
                if event.bytes.len() <= 3 {
                    let frame = cycle + u64::from(event.time);
                    heard.push(Event::new(frame, event.bytes)).expect("room");
                }
            }
        }
        Control::Continue
    }
}

struct Xruns(Arc<AtomicU64>);

impl jack::NotificationHandler for Xruns {
    fn xrun(&mut self, _: &Client) -> Control {
        self.0.fetch_add(1, Ordering::Relaxed);
        Control::Continue
    }
}

/// `Player:out` to `recorder:direct` by a connection, to `recorder:through` by trued.
pub struct Bench {
    player: AsyncClient<(), Playing>,
    recorder: AsyncClient<Xruns, Recording>,
    score: RefCell<rtrb::Producer<Event>>,
    heard: RefCell<[rtrb::Consumer<Event>; 2]>,
    done: Arc<AtomicBool>,
    xruns: Arc<AtomicU64>,
}

impl Bench {
    pub fn open() -> Bench {
        let open = |name| {
            Client::new(name, ClientOptions::NO_START_SERVER)
                .expect("a server")
                .0
        };
        let (score, score_out) = rtrb::RingBuffer::new(100_000);
        let (heard_direct, direct) = rtrb::RingBuffer::new(200_000);
        let (heard_through, through) = rtrb::RingBuffer::new(200_000);
        let (done, xruns) = (
            Arc::new(AtomicBool::new(false)),
            Arc::new(AtomicU64::new(0)),
        );
        let player = open("Player");
        let playing = Playing {
            out: player
                .register_port("out", MidiOut::default())
                .expect("a port"),
            score: score_out,
            position: None,
            done: done.clone(),
        };
        let recorder = open("recorder");
        let port = |name| {
            recorder
                .register_port(name, MidiIn::default())
                .expect("a port")
        };
        let recording = Recording {
            direct: port("direct"),
            through: port("through"),
            heard: [heard_direct, heard_through],
        };
        let player = player.activate_async((), playing).expect("active");
        let recorder = recorder
            .activate_async(Xruns(xruns.clone()), recording)
            .expect("active");
        let client = recorder.as_client();
        client
            .connect_ports_by_name("Player:out", "recorder:direct")
            .expect("connected");
        Bench {
            player,
            recorder,
            score: RefCell::new(score),
            heard: RefCell::new([direct, through]),
            done,
            xruns,
        }
    }

    /// trued does it by itself.
    pub fn wait_until_connected(&self) {
        wait_for("trued to connect", || {
            self.connections("Player:out") >= 2 && self.connections("recorder:through") >= 1
        });
    }

    fn connections(&self, port: &str) -> usize {
        let port = self.player.as_client().port_by_name(port);
        port.and_then(|port| port.connected_count().ok())
            .unwrap_or(0)
    }

    /// By hand, as soon as its ports are there.
    pub fn connect_to(&self, name: &str) {
        let client = self.player.as_client();
        let (keys, organ) = (format!("{name}:keys"), format!("{name}:organ"));
        wait_for("its ports", || {
            client.connect_ports_by_name("Player:out", &keys).is_ok()
        });
        wait_for("its ports", || {
            client
                .connect_ports_by_name(&organ, "recorder:through")
                .is_ok()
        });
    }

    /// Begins to play; frames count from the first cycle on.
    pub fn begin(&self, events: &[Event]) {
        let mut score = self.score.borrow_mut();
        self.done.store(false, Ordering::Release);
        for event in events {
            score.push(*event).expect("room");
        }
    }

    /// Plays to the end, and a little longer.
    pub fn play(&self, events: &[Event]) {
        self.begin(events);
        wait_for("the last event", || self.done.load(Ordering::Acquire));
        std::thread::sleep(Duration::from_millis(300));
    }

    /// Hands what came through to a receiver.
    pub fn hear(&self, receiver: &mut Receiver) {
        while let Ok(event) = self.heard.borrow_mut()[1].pop() {
            receiver.hear(Duration::ZERO, event.bytes());
        }
    }

    pub fn finish(self) -> Heard {
        let _ = self.player.deactivate();
        let _ = self.recorder.deactivate();
        let [mut direct, mut through] = self.heard.into_inner();
        Heard {
            direct: std::iter::from_fn(|| direct.pop().ok()).collect(),
            through: std::iter::from_fn(|| through.pop().ok()).collect(),
            xruns: self.xruns.load(Ordering::Relaxed),
        }
    }
}
