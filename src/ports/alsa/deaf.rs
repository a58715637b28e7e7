//! Of several programs that hear one synth's port, one may stop reading while the others go on. It must not hold them
//! up, so it goes without what it has no room for; and once it reads again, it alone is silenced and all are set up.
//!
//! Who it is, an event says that is sent to each alone and means nothing to anybody.

use super::addr;
use super::events::to_event;
use crate::limits::{CHANNELS, SYNTHS_MAX};
use crate::ports::hotplug::{Hotplug, PEERS_MAX};
use crate::ports::names::Address;
use crate::time::{Span, Time};
use alsa::Seq;
use alsa::seq::{Event, EventType};

/// How often a port that was full is asked whether it takes anything. It has thrown the rest away by the time that it
/// has taken something twice: the kernel does so at its reader's next read.
const ASK: Span = Span::from_millis(60);
/// Pedal, sostenuto, all notes off.
const HUSH: [u8; 3] = [64, 66, 123];

/// Who has missed something.
#[derive(Debug, Default)]
pub struct Deaf {
    missed: Vec<Missed>,
    ask_at: Option<Time>,
}

#[derive(Clone, Copy, Debug)]
struct Missed {
    synth: usize,
    peer: Address,
    took: u8,
}

impl Deaf {
    /// The only allocation.
    pub fn new() -> Deaf {
        Deaf {
            missed: Vec::with_capacity(SYNTHS_MAX * PEERS_MAX),
            ask_at: None,
        }
    }

    /// When to look again.
    pub fn due_at(&self) -> Option<Time> {
        self.ask_at
    }

    /// One of those that hear a synth's port was full just now.
    pub fn find(&mut self, now: Time, seq: &Seq, port: i32, synth: usize, hotplug: &Hotplug) {
        if self.missed.iter().any(|missed| missed.synth == synth) {
            return; // asked again by and by
        }
        for peer in hotplug.hearing(synth) {
            if !takes(seq, port, *peer) {
                self.missed.push(Missed {
                    synth,
                    peer: *peer,
                    took: 0,
                });
                self.ask_at.get_or_insert(now + ASK);
            }
        }
    }

    /// Silences those that read again, and says of which synths.
    pub fn look(
        &mut self,
        now: Time,
        seq: &Seq,
        ports: &[i32],
        hotplug: &Hotplug,
        tell: &mut dyn FnMut(usize),
    ) {
        if self.ask_at.is_none_or(|at| at > now) {
            return;
        }
        self.missed.retain_mut(|missed| {
            let Some(port) = ports.get(missed.synth) else {
                return false;
            };
            if !hotplug.hearing(missed.synth).contains(&missed.peer) {
                return false; // gone; it is as new when it comes
            }
            if !takes(seq, *port, missed.peer) {
                missed.took = 0;
                return true;
            }
            missed.took += 1;
            if missed.took < 2 {
                return true;
            }
            hush(seq, *port, missed.peer);
            tell(missed.synth);
            false
        });
        self.ask_at = (!self.missed.is_empty()).then_some(now + ASK);
    }
}

/// Whether one port has room for an event.
fn takes(seq: &Seq, port: i32, peer: Address) -> bool {
    let mut event = Event::new(EventType::Usr0, &[0u8; 12]);
    send(seq, port, peer, &mut event)
}

fn hush(seq: &Seq, port: i32, peer: Address) {
    for channel in 0..CHANNELS as u8 {
        for number in HUSH {
            if let Some((mut event, _)) = to_event(&[0xB0 | channel, number, 0]) {
                // If it is full again, it is found out again.
                let _ = send(seq, port, peer, &mut event);
            }
        }
    }
}

fn send(seq: &Seq, port: i32, peer: Address, event: &mut Event<'_>) -> bool {
    event.set_source(port);
    event.set_dest(addr(peer));
    event.set_direct();
    !matches!(
        seq.event_output_direct(event),
        Err(error) if matches!(error.errno(), libc::EAGAIN | libc::ENOMEM)
    )
}
