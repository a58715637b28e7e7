//! JACK: one client, a port of ours for each keyboard and synth, the score in the server's process callback.
//!
//! The library is loaded when this backend is chosen and not before. A server may come, go and come again: in
//! between, the calling thread runs cycles without ports, so that time and the desk's commands go on.

pub mod desk;
mod frames;
mod gate;
mod notices;
mod process;

use super::clock::Clock;
use super::hotplug::End;
use super::outbox::{Outbox, outboxes};
use super::system::{Bell, readable, wait};
use super::{Broken, Cycle, Inbox, Link, Next, Outlet, Tally, Wire};
use crate::time::{Span, Time};
use gate::Gate;
use jack::{AsyncClient, Client, ClientOptions, LoggerType, MidiIn, MidiOut};
use notices::Notices;
use process::Process;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::sync::{Arc, Mutex, PoisonError};
use std::time::Duration;
use tracing::{error, info, warn};

/// How soon a server that has gone is looked for again, at first and at last.
const FIRST_LOOK: Span = Span::from_millis(100);
const LAST_LOOK: Span = Span::from_millis(500);
/// A library's thread that has lost its server is given so long to notice, before it is taken down.
const SETTLE: Duration = Duration::from_millis(50);
/// Changes of connections between two cycles.
const CHANGES: usize = 1024;

type Active = AsyncClient<Notices, Process>;

/// The client, while there is one: shared with the desk, which asks it for ports and connects them.
type Place = Arc<Mutex<Option<Active>>>;

/// What makes a cycle for each client; what it knows must lie elsewhere, because it dies with the client.
pub type MakeCycle<'a> = &'a dyn Fn() -> Box<dyn Cycle + Send>;

/// Our ports, in the order of the stage file.
type Ports = (Vec<jack::Port<MidiIn>>, Vec<jack::Port<MidiOut>>);

/// What one client's threads tell the thread that keeps it.
struct Shared {
    gate: Gate,
    /// The end of the last cycle, in nanoseconds.
    reached: AtomicU64,
    /// The score has left, and what it said last is out.
    left: AtomicBool,
    /// The server has gone.
    dead: AtomicBool,
    bell: Bell,
    tally: Arc<Tally>,
}

/// The backend.
pub struct Jack {
    name: String,
    keyboards: Vec<String>,
    synths: Vec<String>,
    /// Opened, not active yet.
    waiting: Option<Client>,
    place: Place,
    clock: Clock,
    now: Time,
    bell: Bell,
    tally: Arc<Tally>,
    inbox: Inbox,
    outboxes: Vec<Outbox>,
}

/// Why a client is not there any more.
#[derive(PartialEq, Eq)]
enum Over {
    Left,
    ServerGone,
}

impl Jack {
    /// Loads the library and looks for a server; that none runs is no error.
    ///
    /// # Errors
    /// The library is not there.
    pub fn open(
        name: &str,
        keyboards: &[String],
        synths: &[String],
        clock: Clock,
    ) -> Result<Jack, Broken> {
        jack::jack_sys::library().map_err(|error| Broken {
            wrong: format!("JACK's library cannot be loaded ({error})"),
            right: "install it and a server (sudo apt-get install jackd2), or use --backend alsa"
                .to_string(),
        })?;
        // What it would print says less than we do, and a callback may not wait for a terminal.
        jack::set_logger(LoggerType::None);
        let bell = Bell::new().map_err(|error| Broken {
            wrong: format!("The system gives no event descriptor ({error})"),
            right: "raise the limit of open files".to_string(),
        })?;
        Ok(Jack {
            waiting: open_client(name),
            name: name.to_string(),
            keyboards: keyboards.to_vec(),
            synths: synths.to_vec(),
            place: Place::default(),
            now: clock.now(),
            clock,
            bell,
            tally: Arc::default(),
            inbox: Inbox::new(),
            outboxes: outboxes(synths.len()),
        })
    }

    /// Whether a server was there as we opened.
    pub fn found_server(&self) -> bool {
        self.waiting.is_some()
    }

    /// How many keyboards and synths.
    /// The score's time.
    pub fn clock(&self) -> Clock {
        self.clock
    }

    pub fn counts(&self) -> (usize, usize) {
        (self.keyboards.len(), self.synths.len())
    }

    /// Ends a wait, so that what the desk has sent is looked for; a running server looks each cycle anyway.
    pub fn bell(&self) -> Bell {
        self.bell.clone()
    }

    pub fn tally(&self) -> Arc<Tally> {
        self.tally.clone()
    }

    pub fn desk(&self) -> desk::Desk {
        desk::Desk::new(
            self.place.clone(),
            &self.name,
            &self.keyboards,
            &self.synths,
        )
    }

    /// Plays until a cycle leaves, through as many servers as come and go.
    ///
    /// # Errors
    /// The system refuses to wait, or a server refuses our ports.
    pub fn run(&mut self, make: MakeCycle<'_>) -> Result<(), Broken> {
        let mut cycle = make();
        if self.waiting.is_none() {
            warn!("no JACK server runs; waiting for one");
        }
        let mut look = FIRST_LOOK;
        loop {
            let client = self.waiting.take().or_else(|| open_client(&self.name));
            if let Some(client) = client {
                if self.serve(client, make())? == Over::Left {
                    return Ok(());
                }
                error!("the JACK server has gone; waiting for one to come back");
                self.say_lost();
                look = FIRST_LOOK;
            }
            if self.alone(cycle.as_mut(), look)? == Next::Leave {
                return Ok(());
            }
            look = Span::from_nanos((look.nanos() * 2).min(LAST_LOOK.nanos()));
        }
    }

    /// One client, from its activation to its end.
    fn serve(&mut self, client: Client, cycle: Box<dyn Cycle + Send>) -> Result<Over, Broken> {
        let shared = Arc::new(Shared {
            gate: Gate::default(),
            reached: AtomicU64::new(self.now.nanos()),
            left: AtomicBool::new(false),
            dead: AtomicBool::new(false),
            bell: self.bell.clone(),
            tally: self.tally.clone(),
        });
        let Some((keyboards, synths)) = self.register(&client) else {
            return self.refused(&client);
        };
        let ends = (0..keyboards.len()).map(End::Keyboard);
        let raw = keyboards.iter().map(|port| port.raw() as usize);
        let mut ports: Vec<(End, usize)> = ends.zip(raw).collect();
        let ends = (0..synths.len()).map(End::Synth);
        ports.extend(ends.zip(synths.iter().map(|port| port.raw() as usize)));

        let (changes_in, changes) = rtrb::RingBuffer::new(CHANGES);
        let notices = Notices::new(ports, changes_in, shared.clone());
        self.now = self.now.max(self.clock.now());
        let time = (self.now, client.sample_rate());
        let process = Process::new(cycle, (keyboards, synths), time, changes, shared.clone());
        info!(
            "client {} of a JACK server at {} Hz, {} frames a cycle",
            client.name(),
            client.sample_rate(),
            client.buffer_size()
        );
        match client.activate_async(notices, process) {
            Ok(active) => *lock(&self.place) = Some(active),
            Err(_) => return Ok(Over::ServerGone),
        }
        self.tally.changes.fetch_add(1, Ordering::Relaxed);
        let over = self.watch(&shared);
        self.close(&shared);
        over
    }

    fn watch(&self, shared: &Shared) -> Result<Over, Broken> {
        loop {
            if shared.left.load(Ordering::Acquire) {
                return Ok(Over::Left);
            }
            if shared.dead.load(Ordering::Acquire) {
                return Ok(Over::ServerGone);
            }
            self.wait(None)?;
        }
    }

    /// Takes the client down, with nobody inside its callback.
    fn close(&mut self, shared: &Shared) {
        while !shared.gate.shut() {
            std::thread::sleep(Duration::from_millis(1));
        }
        if shared.dead.load(Ordering::Acquire) {
            std::thread::sleep(SETTLE);
        }
        drop(lock(&self.place).take());
        let reached = Time::from_nanos(shared.reached.load(Ordering::Acquire));
        self.now = self.now.max(reached);
        self.tally.changes.fetch_add(1, Ordering::Relaxed);
    }

    /// One port each. A synth that is called like a keyboard is told apart.
    fn register(&self, client: &Client) -> Option<Ports> {
        let keyboards = self.keyboards.iter();
        let keyboards: Result<_, _> = keyboards
            .map(|name| client.register_port(&desk::short(name), MidiIn::default()))
            .collect();
        let synths = desk::synth_names(&self.keyboards, &self.synths).into_iter();
        let synths: Result<_, _> = synths
            .map(|name| client.register_port(&name, MidiOut::default()))
            .collect();
        Some((keyboards.ok()?, synths.ok()?))
    }

    /// A server that gives us a client but no ports: dying perhaps, else full.
    fn refused(&self, client: &Client) -> Result<Over, Broken> {
        if client.register_port("probe", MidiIn::default()).is_err() {
            return Ok(Over::ServerGone);
        }
        Err(Broken {
            wrong: "The JACK server refuses a port's name".to_string(),
            right: "give every keyboard and synth a short name of its own".to_string(),
        })
    }

    /// The server took with it whatever was connected.
    fn say_lost(&mut self) {
        self.now = self.now.max(self.clock.now());
        for keyboard in 0..self.keyboards.len() {
            self.inbox.add_keyboard_lost(self.now, keyboard);
        }
        for synth in 0..self.synths.len() {
            self.inbox.add_synth(self.now, synth, Link::Down);
        }
    }

    /// Cycles without ports, for so long.
    fn alone(&mut self, cycle: &mut dyn Cycle, span: Span) -> Result<Next, Broken> {
        let until = self.clock.now() + span;
        loop {
            self.now = self.now.max(self.clock.now());
            let mut outlet = Outlet {
                outboxes: &mut self.outboxes,
                wire: &mut Nowhere,
            };
            let next = cycle.run(self.now, &mut self.inbox, &mut outlet);
            self.inbox.clear();
            let Next::Wait(deadline) = next else {
                return Ok(Next::Leave);
            };
            let now = self.clock.now();
            if now >= until {
                return Ok(next);
            }
            let then = deadline.map_or(until, |deadline| deadline.min(until));
            self.wait(Some(then.since(now)))?;
        }
    }

    fn wait(&self, at_most: Option<Span>) -> Result<(), Broken> {
        wait(&mut [readable(self.bell.fd())], at_most).map_err(|error| Broken {
            wrong: format!("Waiting for JACK failed ({error})"),
            right: "start trued again".to_string(),
        })?;
        self.bell.hush();
        Ok(())
    }
}

/// A way for bytes while there is no server.
struct Nowhere;

impl Wire for Nowhere {
    fn write(&mut self, _: usize, bytes: &[u8]) -> usize {
        bytes.len()
    }
}

/// `None` if no server answers. One is never started.
fn open_client(name: &str) -> Option<Client> {
    let name = name.replace('\0', " ");
    let opened = Client::new(&name, ClientOptions::NO_START_SERVER);
    opened.ok().map(|(client, _)| client)
}

/// A thread that failed with the client in its hands has not harmed it.
fn lock(place: &Place) -> std::sync::MutexGuard<'_, Option<Active>> {
    place.lock().unwrap_or_else(PoisonError::into_inner)
}
