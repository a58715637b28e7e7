//! What the server says about ports and about itself, on a thread of its own.

use super::Shared;
use crate::ports::hotplug::{Change, End, Hotplug, Notice};
use crate::ports::names::Address;
use jack::{Client, ClientStatus, Control, PortId};
use rtrb::Producer;
use std::sync::Arc;
use std::sync::atomic::Ordering;
use std::sync::{Mutex, PoisonError};
use std::time::Duration;

/// How long a full queue is waited for: many cycles.
const PATIENCE: Duration = Duration::from_millis(500);

/// Turns notices into changes for the process callback, and tells the desk to look.
pub struct Notices {
    /// Our ports, as the library knows them (never dereferenced).
    ports: Vec<(End, usize)>,
    hotplug: Hotplug,
    /// Never locked, because only `&mut self` reaches for it: the jack crate wants handlers that could be shared.
    changes: Mutex<Producer<Change>>,
    shared: Arc<Shared>,
}

/// Addresses of this backend carry no client number; this one is nobody's.
const NO_CLIENT: i32 = -1;

impl Notices {
    pub fn new(
        ports: Vec<(End, usize)>,
        changes: Producer<Change>,
        shared: Arc<Shared>,
    ) -> Notices {
        let count = |keyboards: bool| {
            let is = |(end, _): &&(End, usize)| matches!(end, End::Keyboard(_)) == keyboards;
            ports.iter().filter(is).count()
        };
        // No client of ours to tell loops by: the server itself refuses a graph that runs in a circle.
        let mut hotplug = Hotplug::new(NO_CLIENT, count(true), count(false));
        // Nobody is connected yet, so whoever comes may just have been started.
        hotplug.settle();
        Notices {
            ports,
            hotplug,
            changes: Mutex::new(changes),
            shared,
        }
    }

    fn notice(&mut self, notice: Notice) {
        let changes = self.changes.get_mut();
        let changes = changes.unwrap_or_else(PoisonError::into_inner);
        self.hotplug.handle(notice, &mut |change| {
            let step = Duration::from_millis(1);
            let mut patience = PATIENCE;
            // Full only while the callback does not run at all.
            while changes.push(change).is_err() && !patience.is_zero() {
                std::thread::sleep(step);
                patience = patience.saturating_sub(step);
            }
        });
    }

    fn look(&self) {
        self.shared.tally.changes.fetch_add(1, Ordering::Relaxed);
    }

    fn end_of(&self, client: &Client, id: PortId) -> Option<End> {
        let raw = client.port_by_id(id)?.raw() as usize;
        let own = self.ports.iter().find(|(_, own)| *own == raw)?;
        Some(own.0)
    }
}

/// A port of somebody else's, as long as it is there.
fn peer(id: PortId) -> Address {
    Address {
        client: 0,
        port: id as i32,
    }
}

impl jack::NotificationHandler for Notices {
    // The trait's word for "as in a signal handler"; an atomic and an eventfd are allowed there.
    #[allow(unsafe_code)]
    unsafe fn shutdown(&mut self, _: ClientStatus, _: &str) {
        self.shared.dead.store(true, Ordering::Release);
        self.shared.bell.ring();
    }

    fn port_registration(&mut self, _: &Client, id: PortId, is_there: bool) {
        if !is_there {
            self.notice(Notice::PortGone(peer(id)));
        }
        self.look();
    }

    fn port_rename(&mut self, _: &Client, _: PortId, _: &str, _: &str) -> Control {
        self.look();
        Control::Continue
    }

    fn ports_connected(&mut self, client: &Client, from: PortId, to: PortId, joined: bool) {
        for (own, other) in [(from, to), (to, from)] {
            if let Some(end) = self.end_of(client, own) {
                self.notice(if joined {
                    Notice::Joined(end, peer(other))
                } else {
                    Notice::Left(end, peer(other))
                });
            }
        }
        self.look();
    }
}
