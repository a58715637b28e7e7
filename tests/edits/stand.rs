//! The daemon without a sequencer: its score on a thread with a port in memory, its reading of edits on another.

use crate::support::receiver::{Kind, Receiver};
use std::path::Path;
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::mpsc::{RecvTimeoutError, Sender, channel};
use std::sync::{Arc, Mutex};
use std::thread::JoinHandle;
use std::time::Duration;
use trued::daemon::reload::{Handing, Reload, StageNews, Todo};
use trued::daemon::state::Boot;
use trued::daemon::{Player, Score, Slot};
use trued::engine::{Counters, Engine};
use trued::ports::clock::Clock;
use trued::ports::outbox::outboxes;
use trued::ports::system::{Bell, readable, wait};
use trued::ports::{Cycle, Inbox, Link, Next, Outlet, Wire};
use trued::time::Time;

/// Strange on purpose, so that a range never told is heard at once.
const RANGE_AT_POWER_ON: u8 = 7;
/// How long a set-up is waited for.
const SET_UP: Duration = Duration::from_secs(60);
pub const TAIL: Duration = Duration::from_millis(50);

pub struct Stand {
    pub clock: Clock,
    pub heard: Arc<Mutex<Receiver>>,
    pub news: Arc<Mutex<StageNews>>,
    reload: Arc<Mutex<Reload>>,
    keys: Sender<Vec<u8>>,
    slot: Arc<Slot>,
    done: Arc<AtomicBool>,
    threads: Vec<JoinHandle<()>>,
}

/// The port: every byte goes to the receiver.
struct Port {
    clock: Clock,
    heard: Arc<Mutex<Receiver>>,
}

impl Wire for Port {
    fn write(&mut self, _: usize, bytes: &[u8]) -> usize {
        let at = elapsed(self.clock.now());
        self.heard.lock().expect("no panic there").hear(at, bytes);
        bytes.len()
    }
}

pub fn elapsed(at: Time) -> Duration {
    Duration::from_nanos(at.nanos())
}

impl Stand {
    /// Plays a stage file with one synth.
    pub fn new(stage: &Path, state: Option<&Path>) -> Stand {
        let clock = Clock::start();
        let boot = Boot::read(stage, state).expect("something to play");
        let (commands, commands_out) = rtrb::RingBuffer::new(8);
        let (news_in, news_out) = rtrb::RingBuffer::new(8);
        let (plans, plans_out) = rtrb::RingBuffer::new(2);
        let (old_in, old) = rtrb::RingBuffer::new(2);
        let engine = Engine::new(boot.stage.plan());
        let score = Score::new(engine, 1, commands_out, news_in).with_plans(plans_out, old_in);
        let bell = Bell::new().expect("a descriptor");
        let reload = Reload::new(boot, Handing { plans, old }, clock.now(), bell.ringer());
        let heard = Receiver::new(Kind::Plain, TAIL, RANGE_AT_POWER_ON);
        let (keys, keys_out) = channel::<Vec<u8>>();
        let mut stand = Stand {
            clock,
            heard: Arc::new(Mutex::new(heard)),
            news: reload.news(),
            reload: Arc::new(Mutex::new(reload)),
            keys: keys.clone(),
            slot: Slot::new(score),
            done: Arc::default(),
            threads: Vec::new(),
        };
        let desk = desk(stand.reload.clone(), bell, clock, keys, stand.done.clone());
        let mut player = Player::new(stand.slot.clone());
        let mut port = Port {
            clock,
            heard: stand.heard.clone(),
        };
        let done = stand.done.clone();
        let score = move || {
            run(&mut player, &mut port, &keys_out, &done);
            drop((commands, news_out));
        };
        stand.threads = vec![std::thread::spawn(desk), std::thread::spawn(score)];
        // Set-up is said in pieces, the last channel last; what follows counts from when it is over.
        let told = |stand: &Stand| {
            let heard = stand.heard.lock().expect("no panic there");
            heard.range_cents(15) != 100.0 * f64::from(RANGE_AT_POWER_ON)
        };
        assert!(stand.wait(SET_UP, told), "it is set up");
        std::thread::sleep(Duration::from_millis(100));
        stand
    }

    pub fn play(&self, bytes: &[u8]) {
        self.keys.send(bytes.to_vec()).expect("the score runs");
    }

    pub fn ask(&self) {
        self.reload.lock().expect("no panic there").ask();
    }

    pub fn now(&self) -> Duration {
        elapsed(self.clock.now())
    }

    /// Waits until something holds; false after `limit`.
    pub fn wait(&self, limit: Duration, mut holds: impl FnMut(&Stand) -> bool) -> bool {
        let until = self.now() + limit;
        while self.now() < until {
            if holds(self) {
                return true;
            }
            std::thread::sleep(Duration::from_millis(5));
        }
        holds(self)
    }

    /// Ends both threads; what the engine counted.
    pub fn end(mut self) -> Counters {
        self.done.store(true, Ordering::Release);
        for thread in self.threads.drain(..) {
            thread.join().expect("no panic");
        }
        self.reload.lock().expect("no panic there").finish();
        self.slot.take().expect("put back").report().counters
    }
}

/// What the daemon's desk does with edits.
fn desk(
    reload: Arc<Mutex<Reload>>,
    bell: Bell,
    clock: Clock,
    score: Sender<Vec<u8>>,
    done: Arc<AtomicBool>,
) -> impl FnOnce() {
    move || {
        while !done.load(Ordering::Acquire) {
            let patience = {
                let mut reload = reload.lock().expect("no panic there");
                reload.begins(clock.now());
                if reload.look(clock.now()) == Todo::Ring {
                    score.send(Vec::new()).expect("the score runs");
                }
                reload.patience(clock.now())
            };
            wait(&mut [readable(bell.fd())], Some(patience)).expect("a wait");
            bell.hush();
        }
    }
}

fn run(
    player: &mut Player,
    port: &mut Port,
    keys: &std::sync::mpsc::Receiver<Vec<u8>>,
    done: &AtomicBool,
) {
    let mut inbox = Inbox::new();
    let mut boxes = outboxes(1);
    let clock = port.clock;
    inbox.add_synth(clock.now(), 0, Link::Up);
    while !done.load(Ordering::Acquire) {
        let mut outlet = Outlet {
            outboxes: &mut boxes,
            wire: port,
        };
        let Next::Wait(deadline) = player.run(clock.now(), &mut inbox, &mut outlet) else {
            panic!("the score has left");
        };
        inbox.clear();
        let soon = Duration::from_millis(20);
        let until = deadline.map(|at| elapsed(at).saturating_sub(elapsed(clock.now())));
        match keys.recv_timeout(until.map_or(soon, |until| until.min(soon))) {
            Ok(bytes) if !bytes.is_empty() => {
                assert!(inbox.add_midi(clock.now(), 0, &bytes));
            }
            Ok(_) | Err(RecvTimeoutError::Timeout) => {}
            Err(RecvTimeoutError::Disconnected) => return,
        }
    }
}
