//! From a stage file to an evening: opens the ports, starts the threads, plays until it is told to stop.

use super::desk::Desk;
use super::edits::Edits;
use super::front::Front;
use super::open::{Asked, Ports};
use super::orders::Orders;
use super::place;
use super::reload::{Handing, Reload};
use super::remember::{Memory, Resumed};
use super::rig::RigWanted;
use super::score::{Ending, Score, Slot};
use super::state::Boot;
use super::status::Status;
use super::systemd::Systemd;
use crate::engine::{Engine, Input, Report};
use crate::ports::Broken;
use crate::ports::clock::Clock;
use crate::ports::system::Bell;
use crate::stage::Stage;
use crate::time::Time;
use signal_hook::consts::{SIGHUP, SIGINT, SIGTERM};
use signal_hook::iterator::Signals;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::PathBuf;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use tracing::{error, info, warn};

/// Commands and news that can be under way between the two threads.
const QUEUE: usize = 256;
/// Pulses that can wait for the desk: over a look's worth of the shortest cycles.
const PULSES: usize = 64;

/// Plans that can be under way, either way: one at a time.
const PLANS: usize = 2;

/// What a daemon was told on its command line.
#[derive(Clone, Debug)]
pub struct Evening {
    pub file: PathBuf,
    /// Which sound system carries the MIDI.
    pub asked: Asked,
    /// What it is called among the machine's ports and daemons.
    pub name: String,
    /// Where its control socket is to lie; else where it usually does.
    pub socket: Option<PathBuf>,
    /// Where what is remembered lies, if anywhere.
    pub state: Option<PathBuf>,
    /// What is remembered is to be forgotten.
    pub fresh: bool,
}

/// Why an evening could not begin or go on.
#[derive(Debug)]
pub enum Trouble {
    /// No ports, or none any more.
    Ports(Broken),
    /// Another daemon of this name is running, with its socket here.
    Taken(PathBuf),
    /// The system refused a thread or a signal handler.
    System(std::io::Error),
    /// A bug of ours; everything has been silenced as well as could be done.
    Bug,
}

/// Plays a stage file until SIGTERM or SIGINT. The calling thread becomes the score thread, but for JACK.
///
/// # Errors
/// There are no ports to play on, or we have failed.
pub fn play(boot: Boot, evening: &Evening) -> Result<(), Trouble> {
    let signals = Signals::new([SIGTERM, SIGINT, SIGHUP]).map_err(Trouble::System)?;
    let socket = place::open(&evening.name, evening.socket.as_deref()).map_err(Trouble::Taken)?;
    let clock = Clock::start();
    let rig = RigWanted::of(&boot.stage);
    let (ports, mut patch) =
        Ports::open(evening.asked, &rig, &evening.name, clock).map_err(Trouble::Ports)?;
    let there = patch.connect(&rig);

    let (commands_in, commands_out) = rtrb::RingBuffer::new(QUEUE);
    let (news_in, news_out) = rtrb::RingBuffer::new(QUEUE);
    let (pulses_in, pulses_out) = rtrb::RingBuffer::new(PULSES);
    let (plans, plans_out) = rtrb::RingBuffer::new(PLANS);
    let (old_in, old) = rtrb::RingBuffer::new(PLANS);
    let mut engine = Engine::new(boot.stage.plan());
    let (memory, resumed) = resume(&mut engine, &boot.stage, evening, clock.now());
    let score = Score::new(engine, rig.synths.len(), commands_out, news_in)
        .with_pulses(pulses_in)
        .with_plans(plans_out, old_in);
    let done = Arc::new(AtomicBool::new(false));
    let connected = patch.connected();
    let clauses = rig.describe("is", &connected, &there).join("; ");
    let Evening { name, file, .. } = evening;
    let mut status = Status::of(&boot.stage, name, ports.name(), file, score.report());
    status.resumed = resumed;
    (status.keyboards, status.synths) = rig.devices(&connected, &there);
    let bell = Bell::new().map_err(Trouble::System)?;
    let reload = Reload::new(boot, Handing { plans, old }, clock.now(), bell.ringer());
    let reload = reload.keeping_ports(ports.keep());
    reload.show(&mut status);
    let systemd = Systemd::from_environment();
    let mut front = Front::new(reload.stage(), status, socket, systemd, pulses_out, bell);
    front.ready();
    let slot = Slot::new(score);
    let (edits, turn) = Edits::new(reload, clock);
    let desk = Desk {
        rig,
        patch,
        front,
        signals,
        orders: Orders::new(commands_in, ports.bell()),
        news: news_out,
        tally: ports.tally(),
        done: done.clone(),
        edits,
        memory,
    };
    let desk = std::thread::Builder::new()
        .name("desk".to_string())
        .spawn(|| desk.run())
        .map_err(Trouble::System)?;
    info!("ready: {clauses}");

    let ran = catch_unwind(AssertUnwindSafe(|| turn.play(ports, &slot, evening)));
    done.store(true, Ordering::Release);
    if desk.join().is_err() {
        error!("the desk had failed before the end");
    }
    finish(ran, &slot)
}

/// Brings an engine that has heard nothing yet to where the last run was; says what that is.
fn resume(
    engine: &mut Engine,
    stage: &Stage,
    evening: &Evening,
    now: Time,
) -> (Memory, Option<String>) {
    let mut memory = Memory::new(&evening.file, &evening.name, evening.state.as_deref());
    if evening.fresh {
        memory.forget();
        return (memory, None);
    }
    let Resumed { commands, said } = memory.resume(stage);
    for command in commands {
        engine.handle_input(now, Input::Command(command));
        // No synth is there yet, so there is nothing that would have to be sent.
        while engine.poll_output().is_some() {}
    }
    (memory, said)
}

fn finish(ran: std::thread::Result<Result<(), Broken>>, slot: &Slot) -> Result<(), Trouble> {
    let score = slot.take();
    if let Some(score) = &score {
        log_report(&score.report());
    }
    match ran {
        Err(_) => return Err(Trouble::Bug),
        Ok(Err(broken)) => return Err(Trouble::Ports(broken)),
        Ok(Ok(())) => {}
    }
    match score.and_then(|score| score.ending()) {
        Some(Ending::Stopped) => Ok(()),
        Some(Ending::GaveUp) => {
            warn!("not every tail had died or not every port took its last messages");
            Ok(())
        }
        Some(Ending::Panicked) | None => Err(Trouble::Bug),
    }
}

fn log_report(report: &Report) {
    let c = &report.counters;
    info!(
        "played {} notes with {} bends; {} refused, {} stolen, {} silent keys, {} tails cut",
        c.notes, c.bends, c.refused, c.stolen, c.silent, c.tails_cut
    );
    let odd = c.bad_bytes + c.sysex_lost + c.orphans + c.overrun;
    if odd > 0 {
        warn!(
            "odd input: {} bytes made no message, {} sysex lost, {} note-offs without a note, {} outputs lost",
            c.bad_bytes, c.sysex_lost, c.orphans, c.overrun
        );
    }
}
