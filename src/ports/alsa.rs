//! The Linux sequencer: one client, one port of ours for each keyboard and synth, one loop.

mod deaf;
pub mod desk;
mod events;
mod reader;
mod wire;

use super::clock::Clock;
use super::hotplug::{Hotplug, Renewed};
use super::names::Address;
use super::outbox::{Outbox, RETRY, outboxes};
use super::system::{Bell, readable, wait};
use super::{Backend, Broken, Cycle, Inbox, Link, Next, Outlet, Tally};
use crate::limits::{KEYBOARDS_MAX, SYNTHS_MAX, SYSEX_BYTES_MAX};
use crate::time::{Span, Time};
use alsa::poll::{Descriptors, pollfd};
use alsa::seq::{Addr, PortCap, PortSubscribe, PortType};
use alsa::{Direction, Seq};
use reader::Reader;
use std::ffi::CString;
use std::sync::Arc;

/// Events that may wait for us in the kernel: its largest allowed pool. When it runs over, the kernel throws all away.
const INPUT_POOL: u32 = 2000;

/// Our client, open and with its ports in place.
pub struct Alsa {
    seq: Seq,
    client: i32,
    /// Our port number for each keyboard and each synth.
    keyboards: Vec<i32>,
    synths: Vec<i32>,
    hotplug: Hotplug,
    inbox: Inbox,
    outboxes: Vec<Outbox>,
    deaf: deaf::Deaf,
    clock: Clock,
    bell: Bell,
    tally: Arc<Tally>,
}

impl Alsa {
    /// Opens the client with one input port for each keyboard and one output port for each synth.
    ///
    /// # Errors
    /// There is no sequencer, or it has no room for us.
    pub fn open(name: &str, keyboards: &[String], synths: &[String]) -> Result<Alsa, Broken> {
        assert!(keyboards.len() <= KEYBOARDS_MAX && synths.len() <= SYNTHS_MAX);
        let seq = open_sequencer()?;
        seq.set_client_name(&text(name)).map_err(broken)?;
        seq.set_client_pool_input(INPUT_POOL).map_err(broken)?;
        seq.input()
            .set_input_buffer_size(SYSEX_BYTES_MAX as u32)
            .map_err(broken)?;
        let client = seq.client_id().map_err(broken)?;
        let make = |names: &[String], can: PortCap| -> Result<Vec<i32>, Broken> {
            names.iter().map(|name| port(&seq, name, can)).collect()
        };
        let keyboards = make(keyboards, HEARS)?;
        let synths = make(synths, SENDS)?;
        hear_announcements(&seq, client)?;
        let bell = Bell::new().map_err(|error| Broken {
            wrong: format!("The system gives no event descriptor ({error})"),
            right: "raise the limit of open files".to_string(),
        })?;
        Ok(Alsa {
            hotplug: Hotplug::new(client, keyboards.len(), synths.len()),
            inbox: Inbox::new(),
            outboxes: outboxes(synths.len()),
            deaf: deaf::Deaf::new(),
            clock: Clock::start(),
            seq,
            client,
            keyboards,
            synths,
            bell,
            tally: Arc::default(),
        })
    }

    /// Ends the loop's wait, so that it looks for what the desk has sent.
    pub fn bell(&self) -> Bell {
        self.bell.clone()
    }

    pub fn tally(&self) -> Arc<Tally> {
        self.tally.clone()
    }

    pub fn clock(&self) -> Clock {
        self.clock
    }

    /// Goes on by the clock of ports that were there before: a score knows no other time.
    pub fn keep_time(&mut self, clock: Clock) {
        self.clock = clock;
    }

    pub fn client(&self) -> i32 {
        self.client
    }

    /// Where a keyboard's bytes come in.
    pub fn keyboard_address(&self, index: usize) -> Address {
        Address {
            client: self.client,
            port: self.keyboards[index],
        }
    }

    /// Where a synth's bytes go out.
    pub fn synth_address(&self, index: usize) -> Address {
        Address {
            client: self.client,
            port: self.synths[index],
        }
    }

    /// Takes on another rig: devices keep their ports with all that is connected there, new ones get one. Those that
    /// stay as they are play on. Not while the loop runs.
    ///
    /// # Errors
    /// The sequencer has no room for more ports.
    pub fn rearrange(&mut self, keyboards: &[Renewed], synths: &[Renewed]) -> Result<(), Broken> {
        assert!(keyboards.len() <= KEYBOARDS_MAX && synths.len() <= SYNTHS_MAX);
        let seq = &self.seq;
        let fit = |old: &[i32], new: &[Renewed], can: PortCap| -> Result<Vec<i32>, Broken> {
            let kept = |renewed: &Renewed| renewed.from.and_then(|from| old.get(from).copied());
            for number in old {
                if !new.iter().any(|renewed| kept(renewed) == Some(*number)) {
                    seq.delete_port(*number).map_err(broken)?;
                }
            }
            let ports = new.iter();
            ports
                .map(|renewed| kept(renewed).map_or_else(|| port(seq, &renewed.name, can), Ok))
                .collect()
        };
        self.keyboards = fit(&self.keyboards, keyboards, HEARS)?;
        self.synths = fit(&self.synths, synths, SENDS)?;
        self.deaf = deaf::Deaf::new();
        let mut old = std::mem::take(&mut self.outboxes).into_iter();
        for synth in synths {
            let outbox = old.next().filter(|_| synth.same);
            self.outboxes.push(outbox.unwrap_or_default());
        }
        let (now, inbox, tally) = (self.clock.now(), &mut self.inbox, &self.tally);
        (self.hotplug).rearrange(keyboards, synths, &mut |change| {
            reader::put(change, now, inbox, tally);
        });
        Ok(())
    }

    /// Takes in what has come until there is no more, or no more room.
    fn read(&mut self, now: Time) -> Result<Reading, Broken> {
        let mut reader = Reader {
            seq: &self.seq,
            now,
            client: self.client,
            keyboards: &self.keyboards,
            synths: &self.synths,
            hotplug: &mut self.hotplug,
            inbox: &mut self.inbox,
            tally: &self.tally,
        };
        let mut input = self.seq.input();
        while reader.inbox.has_room() {
            match input.event_input() {
                Ok(event) => reader.take(&event),
                Err(error) => match error.errno() {
                    libc::EAGAIN | libc::EINTR => return Ok(Reading::Done),
                    libc::ENOSPC => reader.overrun(),
                    libc::ENOTSUP => {} // an event of a kind that is too new for us
                    _ => return Err(broken(error)),
                },
            }
        }
        Ok(Reading::More)
    }

    fn turn(&mut self, now: Time, cycle: &mut dyn Cycle) -> (Next, bool) {
        let mut wire = wire::SeqWire {
            seq: &self.seq,
            ports: &self.synths,
            hotplug: &self.hotplug,
            missed: 0,
        };
        let mut outlet = Outlet {
            outboxes: &mut self.outboxes,
            wire: &mut wire,
        };
        outlet.retry();
        let next = cycle.run(now, &mut self.inbox, &mut outlet);
        self.inbox.clear();
        let waiting = outlet.is_waiting();
        for (synth, port) in self.synths.iter().enumerate() {
            if wire.missed >> synth & 1 == 1 {
                (self.deaf).find(now, &self.seq, *port, synth, &self.hotplug);
            }
        }
        (next, waiting)
    }
}

#[derive(PartialEq, Eq)]
enum Reading {
    Done,
    More,
}

impl Backend for Alsa {
    fn run(&mut self, cycle: &mut dyn Cycle) -> Result<(), Broken> {
        let mut descriptors: Vec<pollfd> = (&self.seq, Some(Direction::Capture))
            .get()
            .map_err(broken)?;
        descriptors.push(readable(self.bell.fd()));
        let mut at_most = Some(Span::ZERO);
        loop {
            wait(&mut descriptors, at_most).map_err(|error| Broken {
                wrong: format!("Waiting for MIDI failed ({error})"),
                right: "start trued again".to_string(),
            })?;
            self.bell.hush();
            let now = self.clock.now();
            let reading = self.read(now)?;
            if reading == Reading::Done {
                self.hotplug.settle();
            }
            let inbox = &mut self.inbox;
            (self.deaf).look(now, &self.seq, &self.synths, &self.hotplug, &mut |synth| {
                inbox.add_synth(now, synth, Link::Back);
            });
            let (next, waiting) = self.turn(now, cycle);
            let Next::Wait(deadline) = next else {
                return Ok(());
            };
            let until = |time: Time| time.since(self.clock.now());
            at_most = match reading {
                Reading::More => Some(Span::ZERO),
                Reading::Done => {
                    let retry = waiting.then_some(RETRY);
                    let due = deadline.into_iter().chain(self.deaf.due_at());
                    due.map(until).chain(retry).min()
                }
            };
        }
    }
}

/// What others may do with a keyboard's port, and with a synth's.
const HEARS: PortCap = PortCap::WRITE.union(PortCap::SUBS_WRITE);
const SENDS: PortCap = PortCap::READ.union(PortCap::SUBS_READ);

fn port(seq: &Seq, name: &str, can: PortCap) -> Result<i32, Broken> {
    let kind = PortType::MIDI_GENERIC | PortType::APPLICATION;
    seq.create_simple_port(&text(name), can, kind)
        .map_err(broken)
}

/// A port that hears what the system says about ports.
fn hear_announcements(seq: &Seq, client: i32) -> Result<(), Broken> {
    let can = PortCap::WRITE | PortCap::NO_EXPORT;
    let port = seq
        .create_simple_port(&text("announcements"), can, PortType::APPLICATION)
        .map_err(broken)?;
    let subscription = PortSubscribe::empty().map_err(broken)?;
    subscription.set_sender(Addr::system_announce());
    subscription.set_dest(Addr { client, port });
    seq.subscribe_port(&subscription).map_err(broken)
}

fn address(addr: Addr) -> Address {
    Address {
        client: addr.client,
        port: addr.port,
    }
}

fn addr(address: Address) -> Addr {
    Addr {
        client: address.client,
        port: address.port,
    }
}

fn text(name: &str) -> CString {
    CString::new(name.replace('\0', " ")).unwrap_or_default()
}

fn broken(error: alsa::Error) -> Broken {
    Broken {
        wrong: format!("The ALSA sequencer refused {} ({error})", error.func()),
        right: "look with `aconnect -l` whether it is full, or start trued again".to_string(),
    }
}

/// Opens a client, after a look at the device: the library would write to stderr by itself if it is not there.
fn open_sequencer() -> Result<Seq, Broken> {
    look_for_sequencer()?;
    Seq::open(None, None, true).map_err(broken)
}

/// # Errors
/// There is none, or this user may not have it.
pub fn look_for_sequencer() -> Result<(), Broken> {
    let device = std::fs::File::options()
        .read(true)
        .write(true)
        .open("/dev/snd/seq");
    match device.map_err(|error| error.kind()) {
        Ok(_) => Ok(()),
        Err(std::io::ErrorKind::PermissionDenied) => Err(Broken {
            wrong: "This user may not use the ALSA sequencer (/dev/snd/seq)".to_string(),
            right: "add the user to the group audio (sudo adduser $USER audio) and log in again"
                .to_string(),
        }),
        Err(_) => Err(Broken {
            wrong: "There is no ALSA sequencer on this machine (/dev/snd/seq)".to_string(),
            right:
                "load it with: sudo modprobe snd-seq (a kernel for cloud machines may not have it)"
                    .to_string(),
        }),
    }
}
