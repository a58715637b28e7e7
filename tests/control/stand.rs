//! A daemon on ports in memory and real time: the real score, front and socket; a desk that does nothing else.

use std::path::{Path, PathBuf};
use std::process::{Child, Command, Stdio};
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::sync::{Arc, Mutex};
use std::thread::JoinHandle;
use std::time::{Duration, Instant};
use trued::daemon::front::Front;
use trued::daemon::orders::Orders;
use trued::daemon::socket::{Socket, Unopened};
use trued::daemon::status::{Device, Status, Waits};
use trued::daemon::systemd::Systemd;
use trued::daemon::{Player, Score, Slot};
use trued::engine::Engine;
use trued::ports::clock::Clock;
use trued::ports::outbox::{Outbox, outboxes};
use trued::ports::system::{Bell, readable, wait};
use trued::ports::{Backend, Broken, Cycle, Inbox, Link, Next, Outlet, Wire};
use trued::stage::Stage;
use trued::time::Span;

pub const STAGE: &str = "\
stage: Three songs
keyboards: {keys: {port: '*Keys*'}}
synths: {organ: {port: virtual}}
tunings: {just: {like: five-limit-scale, also: {D: {low: 10/9}}}}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
  - {song: Ballad, tuning: vallotti}
  - {song: Harbour tag, tuning: just}
";

/// Waits for something that must come; the machine may be slow and busy.
pub fn patiently(what: &str, mut come: impl FnMut() -> bool) {
    let end = Instant::now() + Duration::from_secs(60);
    while !come() {
        assert!(Instant::now() < end, "waited a minute for {what}");
        std::thread::sleep(Duration::from_millis(10));
    }
}

/// A folder of its own for one test, gone afterwards.
pub struct Folder(PathBuf);

impl Folder {
    pub fn new(name: &str) -> Folder {
        let path = std::env::temp_dir().join(format!("trued-{name}-{}", std::process::id()));
        let _ = std::fs::remove_dir_all(&path);
        std::fs::create_dir_all(&path).expect("a place for files");
        Folder(path)
    }

    pub fn at(&self, name: &str) -> PathBuf {
        self.0.join(name)
    }
}

impl Drop for Folder {
    fn drop(&mut self) {
        let _ = std::fs::remove_dir_all(&self.0);
    }
}

fn command(folder: &Folder, arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_trued"));
    command
        .args(arguments)
        .current_dir(&folder.0)
        .env_remove("RUNTIME_DIRECTORY")
        .env_remove("NOTIFY_SOCKET")
        .env("XDG_RUNTIME_DIR", &folder.0);
    command
}

/// Exit code, standard output, standard error.
pub fn trued(folder: &Folder, arguments: &[&str]) -> (i32, String, String) {
    let output = command(folder, arguments)
        .output()
        .expect("the binary under test");
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).expect("UTF-8");
    let code = output.status.code().expect("it ended by itself");
    (code, text(output.stdout), text(output.stderr))
}

/// The binary, going on in the background.
pub struct Running {
    child: Child,
    said: Arc<Mutex<String>>,
}

impl Running {
    pub fn trued(folder: &Folder, arguments: &[&str]) -> Running {
        let mut child = command(folder, arguments)
            .stdout(Stdio::piped())
            .stderr(Stdio::null())
            .spawn()
            .expect("the binary under test");
        let said = Arc::new(Mutex::new(String::new()));
        let (out, into) = (child.stdout.take().expect("piped"), said.clone());
        std::thread::spawn(move || {
            use std::io::BufRead;
            for line in std::io::BufReader::new(out).lines().map_while(Result::ok) {
                *into.lock().unwrap() += &(line + "\n");
            }
        });
        Running { child, said }
    }

    pub fn said(&self) -> String {
        self.said.lock().unwrap().clone()
    }
}

impl Drop for Running {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

pub fn open(path: &Path) -> Result<Socket, Unopened> {
    Socket::open(path)
}

/// What the threads of a stand share.
#[derive(Default)]
struct Shared {
    heard: Mutex<Vec<Vec<u8>>>,
    /// The score thread is to hang, and does.
    hang: AtomicBool,
    hangs: AtomicBool,
    looks: AtomicU64,
    stop: AtomicBool,
    ended: AtomicBool,
}

pub struct Stand {
    path: PathBuf,
    shared: Arc<Shared>,
    bell: Bell,
    threads: Vec<JoinHandle<()>>,
}

impl Stand {
    pub fn begin(path: &Path) -> Stand {
        Stand::supervised(path, Systemd::default())
    }

    pub fn supervised(path: &Path, systemd: Systemd) -> Stand {
        let stage = Stage::parse(Path::new("stage.yaml"), STAGE);
        let stage = stage.unwrap_or_else(|complaints| panic!("{complaints:?}"));
        let (commands_in, commands_out) = rtrb::RingBuffer::new(16);
        let (news_in, _) = rtrb::RingBuffer::new(16);
        let (pulses_in, pulses) = rtrb::RingBuffer::new(64);
        let engine = Engine::new(stage.plan());
        let status = status(&stage, &engine);
        let slot = Slot::new(Score::new(engine, 1, commands_out, news_in).with_pulses(pulses_in));
        let bell = Bell::new().unwrap();
        let shared: Arc<Shared> = Arc::default();
        let mut fake = Fake {
            bell: bell.clone(),
            shared: shared.clone(),
            clock: Clock::start(),
            outboxes: outboxes(1),
        };
        let stage = Arc::new(stage);
        let mut front = Front::new(
            stage,
            status,
            Some(open(path).unwrap()),
            systemd,
            pulses,
            Bell::new().unwrap(),
        );
        let mut orders = Orders::new(commands_in, Box::new(bell.clone()));
        front.ready();
        let desk = shared.clone();
        let score = std::thread::spawn(move || fake.run(&mut Player::new(slot)).unwrap());
        let desk = std::thread::spawn(move || {
            while !desk.ended.load(Ordering::SeqCst) {
                if desk.stop.swap(false, Ordering::SeqCst) {
                    front.stop(&mut orders);
                }
                for asked in front.look(Span::from_millis(50), &mut orders) {
                    front.answer(asked, 0, "read again");
                }
                desk.looks.fetch_add(1, Ordering::SeqCst);
            }
            front.close();
        });
        Stand {
            path: path.to_owned(),
            shared,
            bell,
            threads: vec![score, desk],
        }
    }

    pub fn socket(&self) -> String {
        self.path.to_str().expect("UTF-8").to_string()
    }

    pub fn forget(&self) {
        self.shared.heard.lock().unwrap().clear();
    }

    /// Whether the synth has been told this.
    pub fn has_heard(&self, message: &[u8]) -> bool {
        self.shared
            .heard
            .lock()
            .unwrap()
            .iter()
            .any(|m| m == message)
    }

    pub fn hang(&self, hang: bool) {
        self.shared.hang.store(hang, Ordering::SeqCst);
        self.bell.ring();
        patiently("the score thread to hang, or not", || {
            self.shared.hangs.load(Ordering::SeqCst) == hang
        });
    }

    /// Times the desk has looked up.
    pub fn looks(&self) -> u64 {
        self.shared.looks.load(Ordering::SeqCst)
    }

    /// As SIGTERM does.
    pub fn stop(&self) {
        self.shared.stop.store(true, Ordering::SeqCst);
    }

    pub fn has_ended(&self) -> bool {
        self.shared.ended.load(Ordering::SeqCst)
    }
}

/// Dies at once, as a process would; only the socket's file is removed.
impl Drop for Stand {
    fn drop(&mut self) {
        self.shared.hang.store(false, Ordering::SeqCst);
        self.shared.ended.store(true, Ordering::SeqCst);
        self.bell.ring();
        for thread in self.threads.drain(..) {
            let joined = thread.join();
            assert!(
                joined.is_ok() || std::thread::panicking(),
                "a thread failed"
            );
        }
    }
}

fn status(stage: &Stage, engine: &Engine) -> Status {
    let mut status = Status::of(
        stage,
        "trued",
        "loopback",
        Path::new("stage.yaml"),
        engine.report(),
    );
    let device = |name: &str, waits, linked| Device {
        name: name.to_string(),
        ports: Vec::new(),
        waits,
        linked,
    };
    status.keyboards = vec![device("keys", Waits::For("*Keys*".to_string()), false)];
    status.synths = vec![device("organ", Waits::ForOthers, true)];
    status
}

/// One synth that is always there, and a bell.
struct Fake {
    bell: Bell,
    shared: Arc<Shared>,
    clock: Clock,
    outboxes: Vec<Outbox>,
}

impl Backend for Fake {
    fn run(&mut self, cycle: &mut dyn Cycle) -> Result<(), Broken> {
        let mut inbox = Inbox::new();
        inbox.add_synth(self.clock.now(), 0, Link::Up);
        while !self.shared.ended.load(Ordering::SeqCst) {
            let now = self.clock.now();
            let mut wire = Ear(&self.shared.heard);
            let mut outlet = Outlet {
                outboxes: &mut self.outboxes,
                wire: &mut wire,
            };
            outlet.retry();
            let next = cycle.run(now, &mut inbox, &mut outlet);
            inbox.clear();
            let Next::Wait(deadline) = next else { break };
            let at_most = deadline.map(|time| time.since(self.clock.now()));
            wait(&mut [readable(self.bell.fd())], at_most).unwrap();
            self.bell.hush();
            while self.shared.hang.load(Ordering::SeqCst) {
                self.shared.hangs.store(true, Ordering::SeqCst);
                std::thread::sleep(Duration::from_millis(5));
            }
            self.shared.hangs.store(false, Ordering::SeqCst);
        }
        self.shared.ended.store(true, Ordering::SeqCst);
        Ok(())
    }
}

struct Ear<'a>(&'a Mutex<Vec<Vec<u8>>>);

impl Wire for Ear<'_> {
    fn write(&mut self, _synth: usize, bytes: &[u8]) -> usize {
        self.0.lock().unwrap().push(bytes.to_vec());
        bytes.len()
    }
}
