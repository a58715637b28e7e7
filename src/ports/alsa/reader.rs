//! What comes from the sequencer, sorted into the inbox: MIDI by the seat of who sent it, comings and goings by what
//! they mean.

use super::{Tally, address, events};
use crate::ports::Inbox;
use crate::ports::hotplug::{Change, End, Hotplug, Notice, PEERS_MAX};
use crate::ports::names::Address;
use crate::time::Time;
use alsa::Seq;
use alsa::seq::{Addr, Connect, Event, EventType, PortSubscribeIter, QuerySubsType};
use std::sync::atomic::Ordering;

/// Takes one event after another.
pub struct Reader<'a> {
    pub seq: &'a Seq,
    pub now: Time,
    pub client: i32,
    pub keyboards: &'a [i32],
    pub synths: &'a [i32],
    pub hotplug: &'a mut Hotplug,
    pub inbox: &'a mut Inbox,
    pub tally: &'a Tally,
}

impl Reader<'_> {
    pub fn take(&mut self, event: &Event<'_>) {
        match event.get_type() {
            EventType::PortSubscribed | EventType::PortUnsubscribed => {
                if let Some(connection) = event.get_data::<Connect>() {
                    self.connection(connection, event.get_type() == EventType::PortSubscribed);
                }
            }
            EventType::PortExit | EventType::ClientExit => {
                if let Some(gone) = event.get_data::<Addr>() {
                    self.notice(match event.get_type() {
                        EventType::PortExit => Notice::PortGone(address(gone)),
                        _ => Notice::ClientGone(gone.client),
                    });
                }
                self.tally.changes.fetch_add(1, Ordering::Relaxed);
            }
            EventType::PortStart | EventType::PortChange | EventType::ClientStart => {
                self.tally.changes.fetch_add(1, Ordering::Relaxed);
            }
            _ => self.midi(event),
        }
    }

    fn midi(&mut self, event: &Event<'_>) {
        let port = event.get_dest().port;
        let Some(keyboard) = self.keyboards.iter().position(|own| *own == port) else {
            return;
        };
        let mut buffer = events::Buffer::default();
        let bytes = events::to_bytes(event, &mut buffer);
        if bytes.is_empty() {
            return;
        }
        let source = address(event.get_source());
        let seat = self.tell(|hotplug, tell| hotplug.seat(keyboard, source, tell));
        if let Some(seat) = seat
            && !self.inbox.add_midi(self.now, seat, bytes)
        {
            self.tally.too_long.fetch_add(1, Ordering::Relaxed);
        }
    }

    fn connection(&mut self, connection: Connect, joined: bool) {
        let Connect { sender, dest } = connection;
        let place = |ports: &[i32], port: i32| ports.iter().position(|own| *own == port);
        let keyboard = (dest.client == self.client)
            .then(|| place(self.keyboards, dest.port))
            .flatten()
            .map(|index| (End::Keyboard(index), address(sender)));
        let synth = (sender.client == self.client)
            .then(|| place(self.synths, sender.port))
            .flatten()
            .map(|index| (End::Synth(index), address(dest)));
        for (end, peer) in keyboard.into_iter().chain(synth) {
            self.notice(if joined {
                Notice::Joined(end, peer)
            } else {
                Notice::Left(end, peer)
            });
        }
    }

    fn notice(&mut self, notice: Notice) {
        self.tell(|hotplug, tell| hotplug.handle(notice, tell));
    }

    /// Puts what the hot-plug state makes of something into the inbox.
    fn tell<T>(&mut self, act: impl FnOnce(&mut Hotplug, &mut dyn FnMut(Change)) -> T) -> T {
        let (inbox, now, tally) = (&mut *self.inbox, self.now, self.tally);
        act(self.hotplug, &mut |change| put(change, now, inbox, tally))
    }

    /// The kernel has thrown away what we had not read: note-offs among it, perhaps, and comings and goings. Every key
    /// is let go, and who is connected is asked anew. (The answers come from the heap, for this one time.)
    pub fn overrun(&mut self) {
        self.tally.overruns.fetch_add(1, Ordering::Relaxed);
        self.tally.changes.fetch_add(1, Ordering::Relaxed);
        self.tell(|hotplug, tell| hotplug.let_all_go(tell));
        for (index, port) in self.keyboards.iter().enumerate() {
            self.agree(End::Keyboard(index), *port, QuerySubsType::WRITE);
        }
        for (index, port) in self.synths.iter().enumerate() {
            self.agree(End::Synth(index), *port, QuerySubsType::READ);
        }
    }

    fn agree(&mut self, end: End, port: i32, way: QuerySubsType) {
        let client = self.client;
        let mut peers = [Address { client: 0, port: 0 }; PEERS_MAX];
        let mut count = 0;
        for found in PortSubscribeIter::new(self.seq, Addr { client, port }, way).take(PEERS_MAX) {
            peers[count] = address(match end {
                End::Keyboard(_) => found.get_sender(),
                End::Synth(_) => found.get_dest(),
            });
            count += 1;
        }
        self.tell(|hotplug, tell| hotplug.agree(end, &peers[..count], tell));
    }
}

/// Puts a change into the inbox.
pub fn put(change: Change, now: Time, inbox: &mut Inbox, tally: &Tally) {
    match change {
        Change::Seat { seat, keyboard } => inbox.add_seat(now, seat, keyboard),
        Change::KeyboardLost { seat } => inbox.add_keyboard_lost(now, seat),
        Change::Synth(synth, link) => inbox.add_synth(now, synth, link),
        Change::Loop { .. } => {
            tally.loops.fetch_add(1, Ordering::Relaxed);
        }
    }
}
