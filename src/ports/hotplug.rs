//! Who is connected now, and what a coming or going means: a state machine without ports of its own.
//!
//! Notices may come twice or late (from the port itself and from the system's announcements); only changes are told.
//! Each device that plays gets a seat: a place of its own, so that what it holds and half says is its alone even where
//! several play as one keyboard of the stage file.

use super::Link;
use super::names::Address;
use crate::limits::KEYBOARDS_MAX;

/// One of our ports, by place in the stage file.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum End {
    Keyboard(usize),
    Synth(usize),
}

/// What the system says.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Notice {
    Joined(End, Address),
    Left(End, Address),
    PortGone(Address),
    ClientGone(i32),
}

/// What it means. A seat is a keyboard's place in the stage file, or a place beyond those.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Change {
    Seat {
        seat: usize,
        keyboard: usize,
    },
    KeyboardLost {
        seat: usize,
    },
    Synth(usize, Link),
    /// What came in there is what we sent out; it is not heard.
    Loop {
        keyboard: usize,
    },
}

/// Ports that can be joined to ours; what comes beyond is heard, but its going is not noticed.
pub const PEERS_MAX: usize = 32;

/// The client that gives back all it is given (`SNDRV_SEQ_CLIENT_DUMMY` in the kernel's sound/asequencer.h).
pub const THROUGH: i32 = 14;

/// The state.
#[derive(Debug)]
pub struct Hotplug {
    /// Our own client.
    client: i32,
    keyboards: usize,
    sitting: Vec<Sitting>,
    synths: Vec<Vec<Address>>,
    settled: bool,
}

/// A device of a new rig, as far as it was in the old one.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Renewed {
    pub name: String,
    /// Its place in the old rig, by name.
    pub from: Option<usize>,
    /// It has the same place and wants the same port: it is not to notice anything.
    pub same: bool,
}

/// A device that plays as a keyboard.
#[derive(Clone, Copy, Debug)]
struct Sitting {
    peer: Address,
    keyboard: usize,
    seat: usize,
}

impl Hotplug {
    /// The only allocation.
    pub fn new(client: i32, keyboards: usize, synths: usize) -> Hotplug {
        Hotplug {
            client,
            keyboards,
            sitting: Vec::with_capacity(PEERS_MAX),
            synths: (0..synths).map(|_| Vec::with_capacity(PEERS_MAX)).collect(),
            settled: false,
        }
    }

    /// What was connected as we began has been told; from now on a synth that joins has perhaps just woken.
    pub fn settle(&mut self) {
        self.settled = true;
    }

    /// The ports that hear a synth's port.
    pub fn hearing(&self, synth: usize) -> &[Address] {
        self.synths.get(synth).map_or(&[], Vec::as_slice)
    }

    /// The seat of what plays into a keyboard's port. One that has never joined sits down now: a program may send
    /// straight to a port. `None`: it is not to be heard.
    pub fn seat(
        &mut self,
        keyboard: usize,
        peer: Address,
        tell: &mut dyn FnMut(Change),
    ) -> Option<usize> {
        if self.place(keyboard, peer).is_none() {
            self.sit_down(keyboard, peer, tell);
        }
        if self.is_loop(peer) {
            return None;
        }
        let place = self.place(keyboard, peer);
        Some(place.map_or(keyboard, |place| self.sitting[place].seat))
    }

    pub fn handle(&mut self, notice: Notice, tell: &mut dyn FnMut(Change)) {
        match notice {
            Notice::Joined(End::Keyboard(index), peer) => self.sit_down(index, peer, tell),
            Notice::Joined(End::Synth(index), peer) => self.synth_joined(index, peer, tell),
            Notice::Left(End::Keyboard(index), peer) => {
                self.stand_up(|s| s.keyboard == index && s.peer == peer, tell);
            }
            Notice::Left(End::Synth(index), peer) => self.synth_left(index, |p| *p == peer, tell),
            Notice::PortGone(peer) => self.gone(|p| *p == peer, tell),
            Notice::ClientGone(client) => self.gone(|p| p.client == client, tell),
        }
    }

    /// Notices have been lost: these are all that are joined to a port of ours now.
    pub fn agree(&mut self, end: End, peers: &[Address], tell: &mut dyn FnMut(Change)) {
        match end {
            End::Keyboard(index) => {
                let left = |s: &Sitting| s.keyboard == index && !peers.contains(&s.peer);
                self.stand_up(left, tell);
            }
            End::Synth(index) => self.synth_left(index, |p| !peers.contains(p), tell),
        }
        for peer in peers {
            self.handle(Notice::Joined(end, *peer), tell);
        }
    }

    /// Every device sits down anew, so that nothing is held any more.
    pub fn let_all_go(&self, tell: &mut dyn FnMut(Change)) {
        for (index, sitting) in self.sitting.iter().enumerate() {
            let Sitting { seat, keyboard, .. } = *sitting;
            if !self.sitting[..index].iter().any(|s| s.seat == seat) {
                tell(Change::Seat { seat, keyboard });
            }
        }
    }

    /// Another rig, whose devices keep the ports they had in the old one. All that others held is let go already.
    pub fn rearrange(
        &mut self,
        keyboards: &[Renewed],
        synths: &[Renewed],
        tell: &mut dyn FnMut(Change),
    ) {
        self.keyboards = keyboards.len();
        let mut moved = Vec::new();
        for place in (0..self.sitting.len()).rev() {
            let Sitting {
                peer,
                keyboard,
                seat,
            } = self.sitting[place];
            let to = keyboards.iter().position(|k| k.from == Some(keyboard));
            let same = to.is_some_and(|to| keyboards[to].same);
            // A seat beyond the keyboards may have become the seat of one more.
            if same && (seat == keyboard || seat >= self.keyboards) {
                continue;
            }
            self.sitting.remove(place);
            if same {
                tell(Change::KeyboardLost { seat });
            }
            moved.extend(to.map(|to| (to, peer)));
        }
        for (keyboard, peer) in moved.into_iter().rev() {
            self.sit_down(keyboard, peer, tell);
        }
        let mut old = std::mem::take(&mut self.synths);
        for (index, synth) in synths.iter().enumerate() {
            let peers = synth.from.and_then(|from| old.get_mut(from));
            let peers = peers.map_or_else(|| Vec::with_capacity(PEERS_MAX), std::mem::take);
            if !synth.same && !peers.is_empty() {
                tell(Change::Synth(index, Link::Back));
            }
            self.synths.push(peers);
        }
    }

    fn place(&self, keyboard: usize, peer: Address) -> Option<usize> {
        let is = |s: &Sitting| s.keyboard == keyboard && s.peer == peer;
        self.sitting.iter().position(is)
    }

    /// The keyboard's own seat, else a spare one, else its own shared with whoever has it.
    fn sit_down(&mut self, keyboard: usize, peer: Address, tell: &mut dyn FnMut(Change)) {
        if keyboard >= self.keyboards || self.place(keyboard, peer).is_some() {
            return;
        }
        if self.is_loop(peer) {
            return tell(Change::Loop { keyboard });
        }
        if self.sitting.len() == PEERS_MAX {
            return;
        }
        let spare = (self.keyboards..KEYBOARDS_MAX).rev();
        let free = std::iter::once(keyboard)
            .chain(spare)
            .find(|seat| self.sitting.iter().all(|s| s.seat != *seat));
        let seat = free.unwrap_or(keyboard);
        self.sitting.push(Sitting {
            peer,
            keyboard,
            seat,
        });
        if free.is_some() {
            tell(Change::Seat { seat, keyboard });
        }
    }

    /// Where seats ran out and several share one, nobody can say whose keys were down: all are let go.
    fn stand_up(&mut self, leaves: impl Fn(&Sitting) -> bool, tell: &mut dyn FnMut(Change)) {
        self.sitting.retain(|sitting| {
            let leaves = leaves(sitting);
            if leaves {
                tell(Change::KeyboardLost { seat: sitting.seat });
            }
            !leaves
        });
    }

    /// A second port that joins a synth's port has heard no set-up, so it is said again for it.
    fn synth_joined(&mut self, index: usize, peer: Address, tell: &mut dyn FnMut(Change)) {
        let Some(peers) = self.synths.get_mut(index) else {
            return;
        };
        if peer.client == self.client || peers.contains(&peer) || peers.len() == PEERS_MAX {
            return;
        }
        peers.push(peer);
        let at_start = !self.settled && peers.len() == 1;
        let link = if at_start { Link::Up } else { Link::Back };
        tell(Change::Synth(index, link));
        // What was a source of notes until now gives back ours from now on.
        for place in (0..self.sitting.len()).rev() {
            let Sitting { peer, keyboard, .. } = self.sitting[place];
            if self.is_loop(peer) {
                self.stand_up(|s| s.keyboard == keyboard && s.peer == peer, tell);
                tell(Change::Loop { keyboard });
            }
        }
    }

    fn synth_left(
        &mut self,
        index: usize,
        leaves: impl Fn(&Address) -> bool,
        tell: &mut dyn FnMut(Change),
    ) {
        let Some(peers) = self.synths.get_mut(index) else {
            return;
        };
        let before = peers.len();
        peers.retain(|peer| !leaves(peer));
        if peers.is_empty() && before > 0 {
            tell(Change::Synth(index, Link::Down));
        }
    }

    fn gone(&mut self, leaves: impl Fn(&Address) -> bool, tell: &mut dyn FnMut(Change)) {
        self.stand_up(|s| leaves(&s.peer), tell);
        for index in 0..self.synths.len() {
            self.synth_left(index, &leaves, tell);
        }
    }

    /// Whether what a port sends us is what we sent: it is our own, or gives back what it gets and gets it from us.
    fn is_loop(&self, peer: Address) -> bool {
        let fed = || self.synths.iter().flatten().any(|p| p.client == THROUGH);
        peer.client == self.client || peer.client == THROUGH && fed()
    }
}

#[cfg(test)]
mod tests;
