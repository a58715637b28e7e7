//! What runs in the server's process callback: one cycle of the score, each thing at its frame.
//!
//! Nothing here allocates, locks, logs or makes a system call, but for a question about priority at the very beginning
//! and the one ring of the bell at the very end.

use super::frames::Frames;
use super::{Ports, Shared};
use crate::limits::{KEYBOARDS_MAX, SYNTHS_MAX};
use crate::ports::hotplug::Change;
use crate::ports::message::cut;
use crate::ports::outbox::{Outbox, outboxes};
use crate::ports::{Cycle, Inbox, Link, Next, Outlet, Tally, Wire, system};
use crate::time::Time;
use jack::{Client, Control, MidiIn, MidiIter, MidiOut, MidiWriter, Port, ProcessScope, RawMidi};
use rtrb::Consumer;
use std::sync::Arc;
use std::sync::atomic::Ordering;

/// Empty cycles after the last one, so that the server's own ports have taken what it wrote before ours go.
const EMPTY_CYCLES: u32 = 4;

/// What the callback owns.
pub struct Process {
    synths: Vec<Port<MidiOut>>,
    player: Rounds,
    /// When this server's time begins on our clock, which whoever hands the score over says, and how many frames it has
    /// in a second.
    zero: Time,
    rate: u32,
    frames: Option<Frames>,
    shared: Arc<Shared>,
    /// Cycles since the score has left.
    left: Option<u32>,
}

/// All but the ports that are written to.
struct Rounds {
    cycle: Box<dyn Cycle + Send>,
    keyboards: Vec<Port<MidiIn>>,
    changes: Consumer<Change>,
    inbox: Inbox,
    outboxes: Vec<Outbox>,
    tally: Arc<Tally>,
    /// Which keyboard the device on each seat plays. The server mixes what is joined to one port, so all of them are one
    /// to the engine, and when one goes all let go.
    seats: [usize; KEYBOARDS_MAX],
    /// Synths that have somebody who hears them.
    linked: [bool; SYNTHS_MAX],
}

impl Process {
    /// The only allocation.
    pub fn new(
        cycle: Box<dyn Cycle + Send>,
        (keyboards, synths): Ports,
        rate: u32,
        changes: Consumer<Change>,
        shared: Arc<Shared>,
    ) -> Process {
        Process {
            player: Rounds {
                cycle,
                keyboards,
                changes,
                inbox: Inbox::new(),
                outboxes: outboxes(synths.len()),
                tally: shared.tally.clone(),
                seats: std::array::from_fn(|seat| seat),
                linked: [false; SYNTHS_MAX],
            },
            synths,
            zero: Time::START,
            rate,
            frames: None,
            shared,
            left: None,
        }
    }

    fn play(&mut self, scope: &ProcessScope) {
        let count = scope.last_frame_time();
        let resume_at = self.shared.resume_at.swap(0, Ordering::Acquire);
        if resume_at > 0 {
            // Until then time went on by another clock.
            self.zero = Time::from_nanos(resume_at);
            self.frames = None;
        }
        if self.frames.is_none() {
            let real_time = system::is_hurried();
            self.player
                .tally
                .real_time
                .store(real_time, Ordering::Relaxed);
        }
        let first = || Frames::new(self.rate, self.zero, count);
        let frames = self.frames.get_or_insert_with(first);
        frames.begin(count, scope.n_frames());
        let mut ports = self.synths.iter_mut();
        let mut wire = FrameWire {
            frames: *frames,
            at: 0,
            // To ask for a writer is to clear what the port held.
            synths: std::array::from_fn(|_| ports.next().map(|port| Writer::new(port, scope))),
            too_long: 0,
        };
        if let Some(left) = &mut self.left {
            *left += 1;
            if *left == EMPTY_CYCLES {
                self.shared.left.store(true, Ordering::Release);
                self.shared.bell.ring();
            }
            return;
        }
        let next = self.player.run(&mut wire, scope, resume_at > 0);
        self.left = (next == Next::Leave).then_some(0);
        let reached = frames.end().nanos();
        self.shared.reached.store(reached, Ordering::Release);
    }
}

impl Rounds {
    /// All that has come in this cycle; in several rounds, should it be more than the inbox holds.
    ///
    /// `resumes`: the server had stood still, and the score has been told that all is lost.
    fn run(&mut self, wire: &mut FrameWire<'_>, scope: &ProcessScope, resumes: bool) -> Next {
        let frames = wire.frames;
        let mut outlet = Outlet {
            outboxes: &mut self.outboxes,
            wire,
        };
        let start = frames.time(0);
        if resumes {
            for synth in (0..SYNTHS_MAX).filter(|synth| self.linked[*synth]) {
                outlet.forget(synth);
                self.inbox.add_synth(start, synth, Link::Back);
            }
        }
        outlet.retry();
        while self.inbox.has_room()
            && let Ok(change) = self.changes.pop()
        {
            match change {
                Change::Seat { seat, keyboard } => {
                    if let Some(place) = self.seats.get_mut(seat) {
                        *place = keyboard;
                    }
                }
                Change::KeyboardLost { seat } => {
                    let keyboard = self.seats.get(seat).copied().unwrap_or(seat);
                    self.inbox.add_keyboard_lost(start, keyboard);
                }
                Change::Loop { .. } => {}
                Change::Synth(synth, link) => {
                    if let Some(linked) = self.linked.get_mut(synth) {
                        *linked = link != Link::Down;
                    }
                    self.inbox.add_synth(start, synth, link);
                }
            }
        }
        let mut sources = Sources::new(&self.keyboards, scope);
        while let Some((keyboard, event)) = sources.earliest() {
            let time = frames.time(event.time);
            if !self.inbox.has_room() {
                let next = self.cycle.run(time, &mut self.inbox, &mut outlet);
                self.inbox.clear();
                if next == Next::Leave {
                    return next;
                }
            }
            if !self.inbox.add_midi(time, keyboard, event.bytes) {
                self.tally.too_long.fetch_add(1, Ordering::Relaxed);
            }
        }
        let next = self.cycle.run(frames.end(), &mut self.inbox, &mut outlet);
        self.inbox.clear();
        self.tally
            .too_long
            .fetch_add(wire.too_long, Ordering::Relaxed);
        next
    }
}

impl jack::ProcessHandler for Process {
    fn process(&mut self, _: &Client, scope: &ProcessScope) -> Control {
        let shared = self.shared.clone();
        shared.beats.fetch_add(1, Ordering::AcqRel);
        if let Some(_inside) = shared.gate.enter() {
            if shared.lent.load(Ordering::Acquire) {
                // Else what they hold from the last cycle would go out again.
                for port in &mut self.synths {
                    let _ = port.writer(scope);
                }
            } else {
                self.play(scope);
            }
        }
        Control::Continue
    }
}

/// All that keyboards sent in this cycle, merged by time; at one time by the order of the stage file.
struct Sources<'a>([Option<MidiIter<'a>>; KEYBOARDS_MAX]);

impl<'a> Sources<'a> {
    fn new(keyboards: &'a [Port<MidiIn>], scope: &'a ProcessScope) -> Sources<'a> {
        Sources(std::array::from_fn(|n| Some(keyboards.get(n)?.iter(scope))))
    }

    fn earliest(&mut self) -> Option<(usize, RawMidi<'a>)> {
        let waiting = self.0.iter().enumerate();
        let (keyboard, _) = waiting
            .filter_map(|(n, source)| Some((n, source.as_ref()?.peek()?.time)))
            .min_by_key(|(n, time)| (*time, *n))?;
        Some((keyboard, self.0[keyboard].as_mut()?.next()?))
    }
}

/// Writes into this cycle's port buffers, in order of frames.
struct FrameWire<'a> {
    frames: Frames,
    at: u32,
    synths: [Option<Writer<'a>>; SYNTHS_MAX],
    too_long: u64,
}

struct Writer<'a> {
    writer: MidiWriter<'a>,
    /// The longest message that an empty port takes.
    longest: usize,
}

impl<'a> Writer<'a> {
    fn new(port: &'a mut Port<MidiOut>, scope: &'a ProcessScope) -> Writer<'a> {
        let writer = port.writer(scope);
        Writer {
            longest: writer.max_event_size(),
            writer,
        }
    }
}

impl Wire for FrameWire<'_> {
    fn write(&mut self, synth: usize, bytes: &[u8]) -> usize {
        let Some(Some(out)) = self.synths.get_mut(synth) else {
            return bytes.len();
        };
        let mut rest = bytes;
        while let Some((message, more)) = cut(rest) {
            let event = RawMidi {
                time: self.at,
                bytes: message,
            };
            if out.writer.write(&event).is_err() {
                if message.len() <= out.longest {
                    return bytes.len() - rest.len();
                }
                // It would wait for ever and hold up all behind it.
                self.too_long += 1;
            }
            rest = more;
        }
        bytes.len() - rest.len()
    }

    fn at(&mut self, time: Time) {
        self.at = self.at.max(self.frames.frame(time));
    }
}
