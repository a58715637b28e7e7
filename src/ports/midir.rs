//! midir: a crate that knows the MIDI of several systems. For systems without a backend of their own here; on Linux the
//! sequencer itself (`alsa.rs`) does better in every way named below.
//!
//! Each keyboard connected is a connection of midir's, whose callback comes on a thread of midir's and feeds one bounded
//! channel; what does not fit is counted, and every key is let go. The desk opens and closes connections, and hands
//! them over in a queue. The loop sleeps in `park_timeout`: callbacks and desk end that by `unpark`, which a wait inside
//! the channel would sleep through.
//!
//! What midir cannot do, and so this backend cannot:
//! * It says nothing of ports that come and go, so they are looked for a few times a second. What goes and comes back
//!   between two looks is not noticed, and stays unconnected until it goes again.
//! * It says nothing of input that the system threw away because we were too slow.
//! * A system exclusive message from a keyboard that is cut off would swallow every note after it, so none is heard.
//! * It gives one port, not its client, so several players at a port of ours share one pair of hands, and a loop that
//!   somebody else connects is not seen.
//! * A bundle is a write for each message; a long system exclusive message may be refused, and is then left out.

pub mod desk;
mod look;
mod wire;

use super::clock::Clock;
use super::hotplug::{Change, End, Hotplug, Notice, PEERS_MAX};
use super::names::{Address, Wanted};
use super::outbox::{Outbox, RETRY, outboxes};
use super::{Backend, Broken, Cycle, Inbox, Next, Outlet, Ring, Tally};
use crate::limits::{FEED_MESSAGES, SYNTHS_MAX};
use crate::time::{Span, Time};
use crossbeam_channel::{Receiver, Sender};
use midir::MidiOutputConnection;
use rtrb::{Consumer, Producer, RingBuffer};
use std::sync::atomic::{AtomicU64, Ordering};
use std::sync::{Arc, OnceLock};
use std::thread::Thread;
use std::time::Duration;

/// How often ports are looked for.
const LOOK: Span = Span::from_millis(250);
/// Connections made and closed that can be under way between desk and loop; a join takes two places at most.
const CHANGES: usize = 256;
const _: () = assert!(CHANGES > 2 * (PEERS_MAX + SYNTHS_MAX) + 3);
/// Most that midir makes of one event of a sequencer: a parameter with its value, four controllers.
const PACKET_BYTES: usize = 12;

/// No port has this place in the desk's list.
const OURS: i32 = -1;
/// Connections by their number, as the hot-plug state knows ports.
const CONNECTION: i32 = 0;

/// Bytes as a callback had them.
#[derive(Clone, Copy)]
struct Packet {
    keyboard: usize,
    connection: i32,
    length: usize,
    bytes: [u8; PACKET_BYTES],
}

/// What the desk has done, in order. Every connection has a number of its own.
enum Done {
    Joined(End, i32),
    Left(End, i32),
    /// Follows a synth's `Joined`.
    Output(usize, MidiOutputConnection),
}

/// Ends the loop's sleep, once there is one.
#[derive(Clone, Debug, Default)]
pub struct Waker(Arc<OnceLock<Thread>>);

impl Ring for Waker {
    fn ring(&self) {
        if let Some(thread) = self.0.get() {
            thread.unpark();
        }
    }
}

/// What a connection's callback needs.
#[derive(Clone)]
struct Feed {
    packets: Sender<Packet>,
    lost: Arc<AtomicU64>,
    waker: Waker,
}

impl Feed {
    /// Never waits.
    fn take(&self, keyboard: usize, connection: i32, bytes: &[u8]) {
        for piece in bytes.chunks(PACKET_BYTES) {
            let mut packet = Packet {
                keyboard,
                connection,
                length: piece.len(),
                bytes: [0; PACKET_BYTES],
            };
            packet.bytes[..piece.len()].copy_from_slice(piece);
            if self.packets.try_send(packet).is_err() {
                self.lost.fetch_add(1, Ordering::Relaxed);
            }
        }
        self.waker.ring();
    }
}

/// The desk's ends of what leads to the loop and back.
struct Ends {
    feed: Feed,
    done: Producer<Done>,
    closing: Consumer<MidiOutputConnection>,
}

/// The loop's side.
pub struct Midir {
    packets: Receiver<Packet>,
    done: Consumer<Done>,
    /// Connections that are to be closed, which is nothing for the loop.
    closing: Producer<MidiOutputConnection>,
    outputs: Vec<Option<MidiOutputConnection>>,
    /// Keyboards' connections that are open.
    heard: Vec<i32>,
    lost: Arc<AtomicU64>,
    lost_before: u64,
    hotplug: Hotplug,
    inbox: Inbox,
    outboxes: Vec<Outbox>,
    clock: Clock,
    waker: Waker,
    tally: Arc<Tally>,
}

impl Midir {
    /// Gives the loop's side and the desk's.
    ///
    /// # Errors
    /// The system has no MIDI.
    pub fn open(
        name: &str,
        keyboards: &[Wanted],
        synths: &[Wanted],
        clock: Clock,
    ) -> Result<(Midir, desk::Desk), Broken> {
        let (midir, ends) = Midir::new(keyboards.len(), synths.len(), clock);
        let desk = desk::Desk::open(name, keyboards, synths, ends)?;
        Ok((midir, desk))
    }

    fn new(keyboards: usize, synths: usize, clock: Clock) -> (Midir, Ends) {
        let (packets_in, packets) = crossbeam_channel::bounded(FEED_MESSAGES);
        let (done_in, done) = RingBuffer::new(CHANGES);
        let (closing, closing_out) = RingBuffer::new(CHANGES);
        let feed = Feed {
            packets: packets_in,
            lost: Arc::default(),
            waker: Waker::default(),
        };
        let midir = Midir {
            packets,
            done,
            closing,
            outputs: (0..synths).map(|_| None).collect(),
            heard: Vec::with_capacity(PEERS_MAX),
            lost: feed.lost.clone(),
            lost_before: 0,
            hotplug: Hotplug::new(OURS, keyboards, synths),
            inbox: Inbox::new(),
            outboxes: outboxes(synths),
            clock,
            waker: feed.waker.clone(),
            tally: Arc::default(),
        };
        let ends = Ends {
            feed,
            done: done_in,
            closing: closing_out,
        };
        (midir, ends)
    }

    pub fn waker(&self) -> Waker {
        self.waker.clone()
    }

    pub fn tally(&self) -> Arc<Tally> {
        self.tally.clone()
    }

    pub fn clock(&self) -> Clock {
        self.clock
    }

    /// Takes in what has come. False if there was more than room for it.
    fn read(&mut self, now: Time) -> bool {
        self.see_to_connections(now);
        while self.inbox.has_room() {
            let Ok(packet) = self.packets.try_recv() else {
                self.see_to_losses(now);
                return true;
            };
            self.hear(now, &packet);
        }
        false
    }

    fn hear(&mut self, now: Time, packet: &Packet) {
        let Packet {
            keyboard,
            connection,
            length,
            ..
        } = *packet;
        // What is not known even now is closed, or not quite open.
        if !self.heard.contains(&connection) {
            self.see_to_connections(now);
            if !self.heard.contains(&connection) {
                return;
            }
        }
        let peer = peer(connection);
        let seat = tell(&mut self.inbox, now, |tell| {
            self.hotplug.seat(keyboard, peer, tell)
        });
        if let Some(seat) = seat {
            self.inbox.add_midi(now, seat, &packet.bytes[..length]);
        }
    }

    /// What the desk has done since it was last asked, as far as there is room.
    fn see_to_connections(&mut self, now: Time) {
        while self.inbox.has_room()
            && let Ok(done) = self.done.pop()
        {
            let notice = match done {
                Done::Output(synth, connection) => {
                    self.put_output(synth, Some(connection));
                    continue;
                }
                Done::Joined(end, connection) => {
                    if matches!(end, End::Keyboard(_)) && self.heard.len() < PEERS_MAX {
                        self.heard.push(connection);
                    }
                    Notice::Joined(end, peer(connection))
                }
                Done::Left(end, connection) => {
                    match end {
                        End::Keyboard(_) => self.heard.retain(|known| *known != connection),
                        End::Synth(synth) => self.put_output(synth, None),
                    }
                    Notice::Left(end, peer(connection))
                }
            };
            tell(&mut self.inbox, now, |tell| {
                self.hotplug.handle(notice, tell);
            });
        }
    }

    fn put_output(&mut self, synth: usize, connection: Option<MidiOutputConnection>) {
        let Some(place) = self.outputs.get_mut(synth) else {
            return;
        };
        if let Some(old) = std::mem::replace(place, connection) {
            // There is room for more than the desk ever hands over between two of its looks.
            let _ = self.closing.push(old);
        }
    }

    /// Note-offs may be among what was lost: every key is let go.
    fn see_to_losses(&mut self, now: Time) {
        let lost = self.lost.load(Ordering::Relaxed);
        if lost != self.lost_before && self.inbox.has_room() {
            self.lost_before = lost;
            self.tally.overruns.fetch_add(1, Ordering::Relaxed);
            tell(&mut self.inbox, now, |tell| self.hotplug.let_all_go(tell));
        }
    }

    fn turn(&mut self, now: Time, cycle: &mut dyn Cycle) -> (Next, bool) {
        let mut wire = wire::Outputs {
            outputs: &mut self.outputs,
            tally: &self.tally,
        };
        let mut outlet = Outlet {
            outboxes: &mut self.outboxes,
            wire: &mut wire,
        };
        outlet.retry();
        let next = cycle.run(now, &mut self.inbox, &mut outlet);
        self.inbox.clear();
        (next, outlet.is_waiting())
    }
}

impl Backend for Midir {
    fn run(&mut self, cycle: &mut dyn Cycle) -> Result<(), Broken> {
        self.waker.0.get_or_init(std::thread::current);
        let mut look_at = self.clock.now();
        loop {
            let now = self.clock.now();
            if now >= look_at {
                look_at = now + LOOK;
                self.tally.changes.fetch_add(1, Ordering::Relaxed);
            }
            let all = self.read(now);
            if all {
                self.hotplug.settle();
            }
            let (next, waiting) = self.turn(now, cycle);
            let Next::Wait(deadline) = next else {
                return Ok(());
            };
            if all {
                let retry = waiting.then_some(now + RETRY);
                let then = deadline.into_iter().chain(retry).fold(look_at, Time::min);
                let span = then.since(self.clock.now());
                std::thread::park_timeout(Duration::from_nanos(span.nanos()));
            }
        }
    }
}

fn peer(connection: i32) -> Address {
    Address {
        client: CONNECTION,
        port: connection,
    }
}

/// Puts what the hot-plug state makes of something into the inbox.
fn tell<T>(inbox: &mut Inbox, now: Time, act: impl FnOnce(&mut dyn FnMut(Change)) -> T) -> T {
    act(&mut |change| match change {
        Change::Seat { seat, keyboard } => inbox.add_seat(now, seat, keyboard),
        Change::KeyboardLost { seat } => inbox.add_keyboard_lost(now, seat),
        Change::Synth(synth, link) => inbox.add_synth(now, synth, link),
        // Only ports of ours and Midi Through make one, and neither is ever connected here.
        Change::Loop { .. } => {}
    })
}

#[cfg(test)]
mod tests;
