//! JACK: one client, a port of ours for each keyboard and synth, the score in the server's process callback.
//!
//! The library is loaded when this backend is chosen and not before. A server may come, go and come again: in
//! between, the calling thread runs cycles without ports, so that time and the desk's commands go on. It does the same
//! while a server stands still (`alone.rs`).

mod alone;
mod asking;
pub mod desk;
mod frames;
mod gate;
mod notices;
mod opener;
mod process;

use super::clock::Clock;
use super::outbox::{Outbox, outboxes};
use super::system::{Bell, readable, wait};
use super::{Broken, Cycle, Inbox, Next, Server, Tally};
use crate::time::{Span, Time};
use asking::Asked;
use gate::Gate;
use jack::{AsyncClient, Client, LoggerType, MidiIn, MidiOut};
use notices::Notices;
use opener::{Names, Opener};
use process::Process;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::sync::mpsc::RecvTimeoutError;
use std::sync::{Arc, Mutex, PoisonError};
use std::time::Duration;
use tracing::{error, warn};

/// How soon a server that has gone is looked for again, at first and at last.
const FIRST_LOOK: Span = Span::from_millis(100);
const LAST_LOOK: Span = Span::from_millis(500);
/// A library's thread that has lost its server is given so long to notice, before it is taken down.
const SETTLE: Duration = Duration::from_millis(50);
/// How long a server that does not answer is waited for before we go on without an answer.
const ANSWER: Duration = Duration::from_millis(2_000);

type Active = AsyncClient<Notices, Process>;

/// The client, while there is one: shared with the desk, which asks it for ports and connects them.
type Place = Arc<Mutex<Option<Arc<Active>>>>;

/// What makes a cycle for each client; what it knows must lie elsewhere, because it dies with the client.
pub type MakeCycle<'a> = &'a dyn Fn() -> Box<dyn Cycle + Send>;

/// Our ports, in the order of the stage file.
type Ports = (Vec<jack::Port<MidiIn>>, Vec<jack::Port<MidiOut>>);

/// What one client's threads tell the thread that keeps it.
struct Shared {
    gate: Gate,
    /// Somebody else has the score: the callback only keeps its ports clear.
    lent: AtomicBool,
    /// The end of the last cycle, in nanoseconds.
    reached: AtomicU64,
    /// Times that the server has called us.
    beats: AtomicU64,
    /// Not 0: the score has been played without the server until then, in nanoseconds, and comes to the callback.
    resume_at: AtomicU64,
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
    names: Names,
    /// Opened, not active yet.
    waiting: Option<Client>,
    opener: Opener,
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
        let mut opener = Opener::new(name, bell.clone());
        opener.ask();
        Ok(Jack {
            waiting: opener.client(ANSWER),
            opener,
            name: name.to_string(),
            names: Names {
                keyboards: keyboards.to_vec(),
                synths: synths.to_vec(),
            },
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

    /// The score's time.
    pub fn clock(&self) -> Clock {
        self.clock
    }

    /// How many keyboards and synths.
    pub fn counts(&self) -> (usize, usize) {
        (self.names.keyboards.len(), self.names.synths.len())
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
            (self.place.clone(), self.tally.clone()),
            &self.name,
            &self.names.keyboards,
            &self.names.synths,
        )
    }

    /// Plays until a cycle leaves, through as many servers as come and go.
    ///
    /// # Errors
    /// The system refuses to wait, or a server refuses our ports.
    pub fn run(&mut self, make: MakeCycle<'_>) -> Result<(), Broken> {
        let mut cycle = make();
        if self.waiting.is_none() {
            warn!("no JACK server answers; waiting for one");
        }
        let mut look = FIRST_LOOK;
        loop {
            if let Some(client) = self.waiting.take() {
                if self.serve(client, make(), cycle.as_mut())? == Over::Left {
                    return Ok(());
                }
                error!("the JACK server has gone; waiting for one to come back");
                self.say_lost();
                look = FIRST_LOOK;
            }
            self.tally.set_server(Server::Absent);
            self.opener.ask();
            if self.alone(cycle.as_mut(), look)? == Next::Leave {
                return Ok(());
            }
            look = Span::from_nanos((look.nanos() * 2).min(LAST_LOOK.nanos()));
        }
    }

    /// One client, from its activation to its end. `cycle` goes to its callback; `own` plays until that is called, and
    /// while the server stands still.
    fn serve(
        &mut self,
        client: Client,
        cycle: Box<dyn Cycle + Send>,
        own: &mut dyn Cycle,
    ) -> Result<Over, Broken> {
        let shared = Arc::new(Shared {
            gate: Gate::default(),
            lent: AtomicBool::new(true),
            reached: AtomicU64::new(self.now.nanos()),
            beats: AtomicU64::new(0),
            resume_at: AtomicU64::new(0),
            left: AtomicBool::new(false),
            dead: AtomicBool::new(false),
            bell: self.bell.clone(),
            tally: self.tally.clone(),
        });
        let (names, theirs) = (self.names.clone(), shared.clone());
        let activate = move || opener::activate(client, &names, cycle, theirs);
        let asked = Asked::begin("activator", Some(self.bell.clone()), activate);
        let Some(asked) = asked else {
            return Ok(Over::ServerGone);
        };
        let active = loop {
            match asked.answer(Duration::ZERO) {
                Ok(Ok(active)) => break active,
                Ok(Err(Some(broken))) => return Err(broken),
                Ok(Err(None)) | Err(RecvTimeoutError::Disconnected) => return Ok(Over::ServerGone),
                Err(RecvTimeoutError::Timeout) => {}
            }
            if self.alone(own, alone::SOON)? == Next::Leave {
                return Ok(Over::Left);
            }
        };
        *lock(&self.place) = Some(Arc::new(active));
        self.hand_over(&shared);
        let over = self.watch(&shared, own);
        self.close(&shared);
        over
    }

    /// From now on the callback plays.
    fn hand_over(&mut self, shared: &Shared) {
        self.tally.set_server(Server::Runs);
        self.now = self.now.max(self.clock.now());
        shared.resume_at.store(self.now.nanos(), Ordering::Release);
        shared.lent.store(false, Ordering::Release);
        self.tally.changes.fetch_add(1, Ordering::Relaxed);
    }

    /// Takes the client down, with nobody inside its callback.
    fn close(&mut self, shared: &Shared) {
        while !shared.gate.shut() {
            std::thread::sleep(Duration::from_millis(1));
        }
        if shared.dead.load(Ordering::Acquire) {
            std::thread::sleep(SETTLE);
        }
        if let Some(client) = lock(&self.place).take() {
            asking::ask("closer", ANSWER, move || drop(client));
        }
        let reached = Time::from_nanos(shared.reached.load(Ordering::Acquire));
        self.now = self.now.max(reached);
        self.tally.real_time.store(false, Ordering::Relaxed);
        self.tally.changes.fetch_add(1, Ordering::Relaxed);
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

/// A thread that failed with the client in its hands has not harmed it.
fn lock(place: &Place) -> std::sync::MutexGuard<'_, Option<Arc<Active>>> {
    place.lock().unwrap_or_else(PoisonError::into_inner)
}
