//! From a stage file to an evening: opens the ports, starts the threads, plays until it is told to stop.

use super::desk::Desk;
use super::open::Ports;
use super::rig::RigWanted;
use super::score::{Ending, Score, Slot};
use crate::engine::{Engine, Report};
use crate::ports::Broken;
use crate::stage::Stage;
use signal_hook::consts::{SIGINT, SIGTERM};
use signal_hook::iterator::Signals;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use tracing::{error, info, warn};

/// Commands and news that can be under way between the two threads.
const QUEUE: usize = 256;

/// Why an evening could not begin or go on.
#[derive(Debug)]
pub enum Trouble {
    /// No ports, or none any more.
    Ports(Broken),
    /// The system refused a thread or a signal handler.
    System(std::io::Error),
    /// A bug of ours; everything has been silenced as well as could be done.
    Bug,
}

/// Plays a stage file on the ALSA sequencer until SIGTERM or SIGINT. The calling thread becomes the score thread.
///
/// # Errors
/// There are no ports to play on, or we have failed.
pub fn play(stage: &Stage, client_name: &str) -> Result<(), Trouble> {
    let signals = Signals::new([SIGTERM, SIGINT]).map_err(Trouble::System)?;
    let rig = RigWanted::of(stage);
    let (mut ports, mut patch) = Ports::open(&rig, client_name).map_err(Trouble::Ports)?;
    let there = patch.connect(&rig);

    let (commands_in, commands_out) = rtrb::RingBuffer::new(QUEUE);
    let (news_in, news_out) = rtrb::RingBuffer::new(QUEUE);
    let engine = Engine::new(stage.plan());
    let slot = Slot::new(Score::new(engine, rig.synths.len(), commands_out, news_in));
    let done = Arc::new(AtomicBool::new(false));
    let clauses = rig.describe("is", &patch.choice, &there).join("; ");
    let desk = Desk {
        rig,
        patch,
        titles: stage.set.iter().map(|song| song.title.clone()).collect(),
        signals,
        commands: commands_in,
        news: news_out,
        bell: ports.bell(),
        tally: ports.tally(),
        done: done.clone(),
    };
    let desk = std::thread::Builder::new()
        .name("desk".to_string())
        .spawn(|| desk.run())
        .map_err(Trouble::System)?;
    info!("ready: {clauses}");

    let ran = catch_unwind(AssertUnwindSafe(|| ports.play(&slot)));
    done.store(true, Ordering::Release);
    if desk.join().is_err() {
        error!("the desk had failed before the end");
    }
    finish(ran, &slot)
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
