//! Who is connected now, and what a coming or going means: a state machine without ports of its own.
//!
//! Notices may come twice or late (from the port itself and from the system's announcements); only changes are told.

use super::Link;
use super::names::Address;

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

/// What it means.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Change {
    KeyboardLost(usize),
    Synth(usize, Link),
}

/// Ports that can be joined to one of ours; what comes beyond is heard, but its going is not noticed.
const PEERS_MAX: usize = 32;

/// The state.
#[derive(Debug)]
pub struct Hotplug {
    keyboards: Vec<Peers>,
    synths: Vec<Peers>,
    settled: bool,
}

#[derive(Debug)]
struct Peers(Vec<Address>);

impl Peers {
    fn new() -> Peers {
        Peers(Vec::with_capacity(PEERS_MAX))
    }

    /// True if it is new.
    fn add(&mut self, peer: Address) -> bool {
        let new = !self.0.contains(&peer) && self.0.len() < PEERS_MAX;
        if new {
            self.0.push(peer);
        }
        new
    }

    /// True if any was there.
    fn remove(&mut self, leaves: impl Fn(&Address) -> bool) -> bool {
        let before = self.0.len();
        self.0.retain(|peer| !leaves(peer));
        self.0.len() < before
    }
}

impl Hotplug {
    /// The only allocation.
    pub fn new(keyboards: usize, synths: usize) -> Hotplug {
        Hotplug {
            keyboards: (0..keyboards).map(|_| Peers::new()).collect(),
            synths: (0..synths).map(|_| Peers::new()).collect(),
            settled: false,
        }
    }

    /// What was connected as we began has been told; from now on a synth that joins has perhaps just woken.
    pub fn settle(&mut self) {
        self.settled = true;
    }

    /// How many ports hear a synth's port.
    pub fn hearers(&self, synth: usize) -> usize {
        self.synths.get(synth).map_or(0, |peers| peers.0.len())
    }

    pub fn handle(&mut self, notice: Notice, tell: &mut dyn FnMut(Change)) {
        match notice {
            Notice::Joined(End::Keyboard(index), peer) => {
                if let Some(peers) = self.keyboards.get_mut(index) {
                    peers.add(peer);
                }
            }
            Notice::Joined(End::Synth(index), peer) => self.joined(index, peer, tell),
            Notice::Left(End::Keyboard(index), peer) => {
                self.keyboard_left(index, |p| *p == peer, tell);
            }
            Notice::Left(End::Synth(index), peer) => self.synth_left(index, |p| *p == peer, tell),
            Notice::PortGone(peer) => self.gone(|p| *p == peer, tell),
            Notice::ClientGone(client) => self.gone(|p| p.client == client, tell),
        }
    }

    /// A second port that joins a synth's port has heard no set-up, so it is said again for it.
    fn joined(&mut self, index: usize, peer: Address, tell: &mut dyn FnMut(Change)) {
        let Some(peers) = self.synths.get_mut(index) else {
            return;
        };
        if peers.add(peer) {
            let at_start = !self.settled && peers.0.len() == 1;
            let link = if at_start { Link::Up } else { Link::Back };
            tell(Change::Synth(index, link));
        }
    }

    /// Where several keyboards play as one and one goes, nobody can say whose keys were down: all are let go.
    fn keyboard_left(
        &mut self,
        index: usize,
        leaves: impl Fn(&Address) -> bool,
        tell: &mut dyn FnMut(Change),
    ) {
        if let Some(peers) = self.keyboards.get_mut(index)
            && peers.remove(leaves)
        {
            tell(Change::KeyboardLost(index));
        }
    }

    fn synth_left(
        &mut self,
        index: usize,
        leaves: impl Fn(&Address) -> bool,
        tell: &mut dyn FnMut(Change),
    ) {
        if let Some(peers) = self.synths.get_mut(index)
            && peers.remove(leaves)
            && peers.0.is_empty()
        {
            tell(Change::Synth(index, Link::Down));
        }
    }

    fn gone(&mut self, leaves: impl Fn(&Address) -> bool, tell: &mut dyn FnMut(Change)) {
        for index in 0..self.keyboards.len() {
            self.keyboard_left(index, &leaves, tell);
        }
        for index in 0..self.synths.len() {
            self.synth_left(index, &leaves, tell);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const A: Address = Address {
        client: 20,
        port: 0,
    };
    const B: Address = Address {
        client: 24,
        port: 0,
    };
    const B2: Address = Address {
        client: 24,
        port: 1,
    };

    fn run(hotplug: &mut Hotplug, notices: &[Notice]) -> Vec<Change> {
        let mut changes = Vec::new();
        for notice in notices {
            hotplug.handle(*notice, &mut |change| changes.push(change));
        }
        changes
    }

    #[test]
    fn a_keyboard_goes_once_however_often_it_is_said() {
        let mut hotplug = Hotplug::new(2, 1);
        let keys = End::Keyboard(1);
        let changes = run(
            &mut hotplug,
            &[
                Notice::Joined(keys, A),
                Notice::Joined(keys, A),
                Notice::Left(keys, A),
                Notice::Left(keys, A),
                Notice::PortGone(A),
                Notice::ClientGone(A.client),
            ],
        );
        assert_eq!(changes, [Change::KeyboardLost(1)]);
        let changes = run(
            &mut hotplug,
            &[Notice::Joined(keys, A), Notice::ClientGone(A.client)],
        );
        assert_eq!(changes, [Change::KeyboardLost(1)]);
    }

    #[test]
    fn a_synth_is_up_at_the_start_and_back_later() {
        let mut hotplug = Hotplug::new(1, 1);
        let organ = End::Synth(0);
        assert_eq!(
            run(
                &mut hotplug,
                &[Notice::Joined(organ, A), Notice::Joined(organ, A)]
            ),
            [Change::Synth(0, Link::Up)]
        );
        hotplug.settle();
        assert_eq!(
            run(
                &mut hotplug,
                &[Notice::PortGone(A), Notice::Joined(organ, A)]
            ),
            [Change::Synth(0, Link::Down), Change::Synth(0, Link::Back)]
        );
        assert_eq!(hotplug.hearers(0), 1);
    }

    #[test]
    fn a_synth_port_is_down_when_the_last_hearer_goes() {
        let mut hotplug = Hotplug::new(0, 1);
        let organ = End::Synth(0);
        hotplug.settle();
        assert_eq!(
            run(
                &mut hotplug,
                &[
                    Notice::Joined(organ, A),
                    Notice::Joined(organ, B),
                    Notice::Joined(organ, B2),
                    Notice::PortGone(A),
                ]
            ),
            [Change::Synth(0, Link::Back); 3]
        );
        assert_eq!(
            run(&mut hotplug, &[Notice::ClientGone(24)]),
            [Change::Synth(0, Link::Down)]
        );
    }

    #[test]
    fn strangers_are_nobodys_business() {
        let mut hotplug = Hotplug::new(1, 1);
        let notices = [
            Notice::PortGone(A),
            Notice::ClientGone(9),
            Notice::Joined(End::Synth(7), A),
            Notice::Left(End::Keyboard(7), A),
        ];
        assert_eq!(run(&mut hotplug, &notices), []);
    }
}
